//! Spectra within a study: columns of conditions and matchups, and the spreading command.

use super::support::fixture;
use crate::support::{shared, underwind, write};
use std::collections::HashMap;
use std::path::Path;

const STUDY: &str = r#"
[study]
name = "trial"
tables = ["csv"]
[[site]]
id = "A"
latitude_deg = 46.0
longitude_deg = -31.0
depth_m = 2000
[[wind]]
id = "buoy"
table = ["wind.csv"]
height_m = 10
units = "m/s"
direction_sense = "from"
max_gap_h = 6
[[spectra]]
id = "sea"
files = ["plain.nc"]
[[levels]]
files = ["levels.csv"]
reference = "1 uPa"
kind = "spectral_density_level"
window_s = 0
stamp = "start"
"#;

fn folder() -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    std::fs::copy(fixture("plain.nc"), folder.path().join("plain.nc")).unwrap();
    write(folder.path(), "study.toml", STUDY);
    // Wind along the wind sea (60 + 8 t - 5 degrees, going to): from the south-west.
    let wind: Vec<String> = (0..10).map(|hour| format!("2031-01-10T{hour:02}:00:00Z,15,251")).collect();
    write(folder.path(), "wind.csv", &format!("time,wind_speed,wind_from_direction\n{}\n", wind.join("\n")));
    let levels = ["00", "03", "06"].map(|hour| format!("A,2031-01-10T{hour}:00:00Z,0.2685,0.3320737,100.0"));
    let header = "site,time,band_low_hz,band_high_hz,level_db";
    write(folder.path(), "levels.csv", &format!("{header}\n{}\n", levels.join("\n")));
    folder
}

fn rows(path: &Path) -> Vec<HashMap<String, String>> {
    let text = std::fs::read_to_string(path).unwrap();
    let mut lines = text.lines();
    let names: Vec<String> = lines.next().unwrap().split(',').map(str::to_owned).collect();
    lines.map(|line| names.iter().cloned().zip(line.split(',').map(str::to_owned)).collect()).collect()
}

// Expected numbers: numpy, as in `make_spectra.py` (node 46 N, 31 W at the third step; the band's half is the seventh
// frequency).
#[test]
fn conditions_and_matchups_hold_the_sea() {
    let folder = folder();
    underwind(folder.path(), &["match", "study.toml", "--quiet"]).succeeds();
    let all: serde_json::Value =
        serde_json::from_str(&std::fs::read_to_string(fixture("expected.json")).unwrap()).unwrap();
    let expected = |quantity: &str| {
        let of = |case: &&serde_json::Value| {
            case["files"][0] == "plain.nc" && case["hour"] == 6.0 && case["quantity"] == quantity
        };
        all["cases"].as_array().unwrap().iter().find(of).unwrap()["value"].as_f64().unwrap()
    };
    let close = |text: &str, expected: f64| {
        let found: f64 = text.parse().unwrap();
        assert!((found / expected - 1.0).abs() < 1e-5, "{found} for {expected}");
    };
    let conditions = rows(&folder.path().join("out/conditions.csv"));
    let at = &conditions[2];
    assert_eq!(at["window_start_utc"], "2031-01-10T06:00:00Z");
    close(&at["wave_height_m"], expected("sea_surface_wave_significant_height"));
    close(&at["wave_from_direction_deg"], expected("sea_surface_wave_from_direction"));
    close(&at["directional_spread_deg"], expected("sea_surface_wave_directional_spread"));
    let matchups = rows(&folder.path().join("out/matchups.csv"));
    let row = &matchups[2];
    close(&row["elevation_density_m2_hz"], expected("sea_surface_wave_variance_spectral_density"));
    close(&row["overlap_2pi_per_rad"], expected("overlap_2pi"));
    let fp: f64 = at["wind_sea_peak_hz"].parse().unwrap();
    close(&row["f_over_fp"], 0.149_299 / fp);
    // Closed form (physics reference, eq. B) at the band's centre, within what the band's slope can do.
    let e = expected("sea_surface_wave_variance_spectral_density");
    let source = e * e * expected("overlap_2pi") / 2.0;
    let f_s: f64 = 0.298_598;
    let pressure = 4.0 * std::f64::consts::PI.powi(3) * 1025_f64.powi(2) * 9.806_65_f64.powi(2) * f_s.powi(3) * source
        / 1500_f64.powi(2);
    let level: f64 = row["radiated_spectral_density_level_db"].parse().unwrap();
    assert!((level - 10.0 * (pressure * 1e12).log10()).abs() < 0.7, "{level}");
    // The dictionary explains every column.
    let dictionary = std::fs::read_to_string(folder.path().join("out/matchups_columns.csv")).unwrap();
    for column in ["f_over_fp", "overlap_2pi_per_rad", "cross_share", "radiated_remarks", "tail_sensitivity_db"] {
        assert!(dictionary.lines().any(|line| line.starts_with(&format!("{column},"))), "{column}");
    }
}

#[test]
fn check_describes_spectra_and_spread_asks_for_them() {
    let folder = folder();
    let check = underwind(folder.path(), &["check", "study.toml"]).succeeds();
    for part in [
        "spectra `sea`: `efth` in m2 s rad-1",
        "10 frequencies from 0.0500 to 0.2580 Hz (`frequency`), 24 directions (`direction`, going to, clockwise from north)",
        "sound of opposing waves: 0.10 to 0.52 Hz; laid-on tail: looked for in every spectrum",
    ] {
        assert!(check.stdout.contains(part), "{part}\n{}", check.stdout);
    }
    write(folder.path(), "none.toml", &STUDY.replace("[[spectra]]\nid = \"sea\"\nfiles = [\"plain.nc\"]\n", ""));
    underwind(folder.path(), &["spread", "none.toml"]).fails(3, &["there is no `[[spectra]]`"]);
    write(folder.path(), "wrong.toml", &STUDY.replace("id = \"sea\"", "id = \"sea\"\nwind = \"model\""));
    underwind(folder.path(), &["check", "wrong.toml"]).fails(3, &["there is no wind `model`", "the winds are buoy"]);
    write(folder.path(), "misspelt.toml", &STUDY.replace("id = \"sea\"", "id = \"sea\"\ndirection_sens = \"to\""));
    underwind(folder.path(), &["check", "misspelt.toml"]).fails(3, &["did you mean `direction_sense`?"]);
}

// Three hours of levels cannot judge anything: "not identified" is the default.
#[test]
fn spread_says_not_identified_where_it_cannot_judge() {
    let folder = folder();
    let run = underwind(folder.path(), &["spread", "study.toml", "--quiet"]).succeeds();
    assert!(
        run.stdout.contains("site A, sensor 1, spectra sea") || run.stdout.contains("spectra sea"),
        "{}",
        run.stdout
    );
    assert!(run.stdout.contains("not identified in"), "{}", run.stdout);
    assert!(!run.stdout.contains("too narrowly"), "{}", run.stdout);
    for file in ["spreading.csv", "testability.csv", "spreading.json", "figures/testability_sea_1.svg"] {
        assert!(folder.path().join("out").join(file).is_file(), "{file}");
    }
    let table = rows(&folder.path().join("out/spreading.csv"));
    assert!(!table.is_empty() && table.iter().all(|row| row["verdict"] == "not_identified"));
}

#[test]
fn the_tiny_set_runs_through() {
    let Some(bench) = shared("bench") else { return };
    let tiny = bench.join("tiny");
    let folder = tempfile::tempdir().unwrap();
    let path = |name: &str| tiny.join(name).display().to_string();
    let text = format!(
        "[study]\nname = \"tiny\"\ntables = [\"csv\"]\n[sites]\nfile = \"{}\"\n[[wind]]\nid = \"model\"\nfiles = [\"{}\"]\n[[spectra]]\nid = \"sea\"\nfiles = [\"{}\"]\n[[levels]]\nfiles = [\"{}\"]\nreference = \"1 uPa\"\nkind = \"band_level\"\nbands = \"decidecade\"\nwindow_s = 3600\nstamp = \"centre\"\n",
        path("sites.csv"),
        path("wind_slab.nc"),
        path("spectra_slab.nc"),
        path("levels.csv")
    );
    write(folder.path(), "study.toml", &text);
    underwind(folder.path(), &["run", "study.toml", "--quiet"]).succeeds();
    let page = std::fs::read_to_string(folder.path().join("out/report.html")).unwrap();
    assert!(page.contains("Directional spreading against sound"));
}
