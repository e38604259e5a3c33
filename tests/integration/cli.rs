//! What the shell sees: exit statuses, quiet pipes, help.

use crate::support::{project, underwind};
use std::process::{Command, Stdio};

#[test]
fn a_wrong_command_line_ends_with_status_2() {
    let run = underwind(project(), &["chck", "study.toml"]);
    assert_eq!(run.status, 2);
    assert!(run.stderr.contains("check"), "{}", run.stderr);
    assert_eq!(underwind(project(), &["fit"]).status, 2);
    let arguments = ["sample", "wind", "x.nc", "--latitude", "north"];
    assert_eq!(underwind(project(), &arguments).status, 2);
}

#[test]
fn a_look_up_that_is_incomplete_says_what_it_needs() {
    underwind(project(), &["sample", "wind", "demo-data/wind.nc"]).fails(2, &["this look-up needs --latitude"]);
    underwind(project(), &["sample", "sites", "demo-data/sites.csv", "--site", "nowhere"]).fails(4, &["nowhere"]);
    let run =
        underwind(project(), &["sample", "sites", "demo-data/sites.csv", "--site", "basin", "--quantity", "depth"]);
    assert!(run.succeeds().stdout.starts_with("depth = 1450 m"));
}

#[test]
fn help_names_every_command_the_exit_statuses_and_the_caution() {
    let help = underwind(project(), &["--help"]).succeeds().stdout;
    let help = help.split_whitespace().collect::<Vec<_>>().join(" ");
    for word in ["check", "sample", "match", "fit", "report", "run", "simulate", "Exit status", "qualified people"] {
        assert!(help.contains(word), "{word}");
    }
}

#[test]
fn every_flag_and_reason_is_explained() {
    let text = underwind(project(), &["check", "--reasons"]).succeeds().stdout;
    for flag in underwind::model::Flag::ALL {
        assert!(text.contains(flag.name()) && text.contains(flag.sentence()));
    }
    for why in underwind::model::Missing::ALL {
        assert!(text.contains(why.name()) && text.contains(why.sentence()));
    }
}

#[test]
fn a_closed_pipe_ends_quietly() {
    let mut child = Command::new(env!("CARGO_BIN_EXE_underwind"))
        .args(["check", "--reasons"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert!(output.status.success(), "{output:?}");
    assert!(output.stderr.is_empty(), "{}", String::from_utf8_lossy(&output.stderr));
}

#[test]
fn no_colour_where_it_is_not_a_terminal() {
    let run = underwind(project(), &["check", "nothing.toml"]).fails(3, &["error: study file nothing.toml"]);
    assert!(!run.stderr.contains('\u{1b}'));
}

#[test]
fn a_folder_that_cannot_be_written_ends_with_status_6() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("taken"), "a file").unwrap();
    let output = folder.path().join("taken");
    underwind(project(), &["match", "demo-data/study.toml", "--quiet", "--output", output.to_str().unwrap()])
        .fails(6, &["taken: cannot be made"]);
}
