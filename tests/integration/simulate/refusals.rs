//! What cannot be simulated is refused in one line.

use super::support::{BAND, study};
use crate::support::{underwind, write};

fn refused(text: &str, parts: &[&str]) {
    let folder = tempfile::tempdir().unwrap();
    write(folder.path(), "plan.toml", text);
    underwind(folder.path(), &["simulate", "plan.toml", "-o", "made"]).fails(3, parts);
    assert!(!folder.path().join("made").exists(), "a refused plan leaves a folder");
}

#[test]
fn impossible_plans_are_refused_with_their_line() {
    let without = study("", BAND).split("[simulate]").next().unwrap().to_owned();
    refused(&without, &["plan.toml", "there is no `[simulate]`"]);
    refused(&study("", "days = 3\n"), &["plan.toml, line 9", "at least one `[[simulate.band]]`"]);
    refused(
        &study("", &format!("gap_share = 7\n{BAND}")),
        &["plan.toml, line 10", "7 is not allowed; expected a share of 0 to 0.9"],
    );
    refused(&study("", &format!("ships = 7\n{BAND}")), &["plan.toml, line 10", "unknown key `ships`"]);
    refused(&study("", &BAND.replace("1000", "1100")), &["line 11", "1100 Hz is no decidecade centre"]);
    refused(&study("", &format!("{BAND}{BAND}")), &["the band at 1000 Hz is there twice"]);
    refused(
        &study("", &format!("floor_offset_db = {{ B = 1 }}\n{BAND}")),
        &["names the site `B`, which the study does not have"],
    );
    refused(&study("", &format!("wind = \"study\"\n{BAND}")), &["there is no `[[wind]]`"]);
}

#[test]
fn a_field_too_large_for_memory_is_refused() {
    let settings = format!("days = 3000\nresolution_deg = 0.02\nmargin_deg = 10\n{BAND}");
    refused(&study("", &settings), &["the wind field would have", "`simulate.resolution_deg`"]);
}
