//! `fit --sensitivity`: what other choices do to the result.

use crate::support::{project, rows, underwind};
use std::collections::BTreeMap;

fn number(row: &BTreeMap<String, String>, name: &str) -> Option<f64> {
    row[name].parse().ok()
}

/// Each refit must be what the same choice gives as a study of its own: the two ways share no code but the fit.
#[test]
fn every_choice_is_the_fit_that_it_says_it_is() {
    let folder = tempfile::tempdir().unwrap();
    let study = std::fs::read_to_string(project().join("demo-data/study.toml")).unwrap();
    let here = format!("{}/demo-data/", project().display());
    let study = study.replace("\"wind.nc\"", &format!("\"{here}wind.nc\""));
    let study = study.replace("\"levels.csv.gz\"", &format!("\"{here}levels.csv.gz\""));
    let study = study.replace("\"sites.csv\"", &format!("\"{here}sites.csv\""));
    let with = |name: &str, lines: &str| {
        std::fs::write(folder.path().join(format!("{name}.toml")), format!("{study}\n{lines}\n")).unwrap();
    };
    let fit = |arguments: &[&str]| underwind(folder.path(), &[&["fit"], arguments, &["--quiet"]].concat()).succeeds();
    let relation = "[relation]\nreplicates = 100\n";
    with("base", relation);
    with("nearest", &format!("{relation}[match]\nspatial = \"nearest\"\nmax_distance_km = 50"));
    with("components", &format!("{relation}[match]\nwind_speed = \"speed_of_mean\""));
    with("squares", &format!("{relation}loss = \"least_squares\""));
    let told = fit(&["base.toml", "--sensitivity", "-o", "all"]).stdout;
    assert!(told.contains("wind at the site: nearest node within 50 km"), "{told}");
    let all = rows(&folder.path().join("all/sensitivity.csv"));
    assert!(all.iter().all(|row| row["choice"] != "wind source"), "the demo has one wind source");
    for (name, taken) in [
        ("nearest", "nearest node within 50 km"),
        ("components", "speed of the mean components"),
        ("squares", "least squares"),
    ] {
        fit(&[&format!("{name}.toml"), "-o", name]);
        let expected = rows(&folder.path().join(name).join("relation.csv"));
        let found: Vec<_> = all.iter().filter(|row| row["taken"] == taken).collect();
        assert_eq!(found.len(), expected.len());
        for expected in &expected {
            let key = ["site", "sensor", "band_centre_hz"];
            let row = found.iter().find(|row| key.iter().all(|name| row[*name] == expected[*name])).unwrap();
            for name in ["floor_db", "slope_db_per_decade", "onset_m_s", "verdict"] {
                assert_eq!(row[name], expected[name], "{taken}, {name}");
            }
            let shift = number(row, "floor_db").zip(number(row, "study_floor_db")).map(|(a, b)| a - b);
            match (shift, number(row, "floor_shift_db")) {
                (Some(shift), Some(told)) => assert!((shift - told).abs() < 1e-9),
                (None, None) => {}
                other => panic!("{other:?}"),
            }
        }
    }
    assert!(folder.path().join("all/figures/simulated_basin_h1_sensitivity.png").exists());
}

#[test]
fn a_table_of_pairs_has_no_choices_to_try() {
    let folder = tempfile::tempdir().unwrap();
    underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--sensitivity"]).fails(2, &["--sensitivity"]);
}
