//! The whole job on the demo deployment, whose truth is known because it was simulated.

use crate::support::{project, underwind, write};
use std::collections::BTreeMap;
use std::path::Path;
use std::sync::OnceLock;

/// The demo's outputs, made once for all tests here.
fn outputs() -> &'static Path {
    static FOLDER: OnceLock<tempfile::TempDir> = OnceLock::new();
    FOLDER
        .get_or_init(|| {
            let folder = tempfile::tempdir().unwrap();
            let output = folder.path().join("out");
            underwind(project(), &["run", "demo-data/study.toml", "--quiet", "--output", output.to_str().unwrap()])
                .succeeds();
            folder
        })
        .path()
}

fn relations() -> Vec<serde_json::Value> {
    let text = std::fs::read_to_string(outputs().join("out/relation.json")).unwrap();
    serde_json::from_str::<Vec<serde_json::Value>>(&text).unwrap()
}

/// The estimate of a quantity, where it has one.
fn estimate(relation: &serde_json::Value, quantity: &str) -> Option<f64> {
    relation["relation"][quantity]["value"]["estimate"].as_f64()
}

/// The truth of each band, by its exact centre rounded to 1 Hz.
fn truth() -> BTreeMap<i64, toml::Table> {
    let text = std::fs::read_to_string(project().join("demo-data/truth.toml")).unwrap();
    let table: toml::Table = text.parse().unwrap();
    let bands = table["settings"]["band"].as_array().unwrap().clone();
    bands
        .into_iter()
        .map(|band| {
            let band = band.as_table().unwrap().clone();
            let nominal = number(&band, "centre_hz").unwrap();
            // Exact decidecade centre (IEC 61260-1): 1000 x 10^(n/10) Hz.
            let exact = 1000.0 * 10f64.powf((10.0 * (nominal / 1000.0).log10()).round() / 10.0);
            (exact.round() as i64, band)
        })
        .collect()
}

fn number(table: &toml::Table, key: &str) -> Option<f64> {
    let value = table.get(key)?;
    value.as_float().or_else(|| value.as_integer().map(|n| n as f64))
}

#[test]
fn the_fit_recovers_the_simulated_truth() {
    let truth = truth();
    let (mut floors, mut slopes, mut onsets, mut without) = (0, 0, 0, 0);
    let relations = relations();
    assert_eq!(relations.len(), 3 * truth.len());
    for relation in &relations {
        let centre = relation["band"]["centre_hz"].as_f64().unwrap().round() as i64;
        let band = &truth[&centre];
        let name = format!("{} {centre} Hz", relation["site"]);
        let slope_db = number(band, "slope_db_per_decade").unwrap();
        if let Some(floor_db) = estimate(relation, "floor_db") {
            let expected = number(band, "floor_db").unwrap();
            assert!((floor_db - expected).abs() < 1.0, "{name}: floor {floor_db} for {expected}");
            floors += 1;
        }
        // Where the wind part hardly leaves the floor (crossover above the usual winds), the slope's own interval says so.
        if number(band, "crossover_m_s").unwrap() < 8.0 {
            let slope = estimate(relation, "slope_db_per_decade").unwrap();
            assert!((slope - slope_db).abs() < 3.0, "{name}: slope {slope} for {slope_db}");
            slopes += 1;
        }
        let verdict = relation["relation"]["verdict"].as_str().unwrap();
        match (number(band, "onset_m_s"), estimate(relation, "onset_m_s")) {
            (Some(expected), Some(onset)) if verdict == "saturation" => {
                assert!((onset - expected).abs() < 1.0, "{name}: onset {onset} for {expected}");
                onsets += 1;
            }
            (None, onset) => {
                assert!(verdict != "saturation" && onset.is_none(), "{name}: onset {onset:?} where there is none");
                without += usize::from(relation["relation"]["onset_m_s"]["at_least"].is_f64());
            }
            _ => {}
        }
    }
    assert!(floors >= 24 && slopes >= 24 && onsets >= 9 && without >= 12, "{floors} {slopes} {onsets} {without}");
}

#[test]
fn a_band_without_onset_says_so_in_the_terminal() {
    let folder = tempfile::tempdir().unwrap();
    let output = folder.path().join("out");
    let run = underwind(project(), &["fit", "demo-data/study.toml", "--quiet", "--output", output.to_str().unwrap()])
        .succeeds();
    assert!(run.stdout.contains("onset not resolved: above"), "{}", run.stdout);
    assert!(run.stdout.contains("saturation, onset"), "{}", run.stdout);
    assert!(run.stderr.is_empty(), "{}", run.stderr);
}

#[test]
fn every_output_is_there_and_complete() {
    let out = outputs().join("out");
    for name in [
        "sampled.parquet",
        "sampled.csv",
        "conditions.parquet",
        "conditions.csv",
        "matchups.parquet",
        "matchups.csv",
        "relation.parquet",
        "relation.csv",
        "relation.json",
        "matchups_columns.csv",
        "report.html",
        "provenance.json",
        "figures/map.svg",
        "figures/map.png",
    ] {
        assert!(out.join(name).metadata().is_ok_and(|m| m.len() > 300), "{name}");
    }
    let provenance: serde_json::Value =
        serde_json::from_str(&std::fs::read_to_string(out.join("provenance.json")).unwrap()).unwrap();
    assert_eq!(provenance["inputs"].as_array().unwrap().len(), 3);
    // 64 hexadecimal digits (FIPS 180-4).
    assert_eq!(provenance["inputs"][0]["sha256"].as_str().unwrap().len(), 64);
    let used = provenance["pairs_used"].as_u64().unwrap();
    let rows = std::fs::read_to_string(out.join("matchups.csv")).unwrap().lines().count() as u64 - 1;
    let unused: u64 = provenance["pairs_not_used"].as_object().unwrap().values().map(|n| n.as_u64().unwrap()).sum();
    assert_eq!(used + unused, rows);
    let page = std::fs::read_to_string(out.join("report.html")).unwrap();
    assert!(!page.contains("http://") || !page.contains("src=\"http"), "the page loads something from a network");
    assert!(page.contains("no aid to navigation"));
}

/// All files of a folder with their bytes.
fn bytes(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let mut all = BTreeMap::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            all.extend(bytes(&path));
        } else {
            all.insert(path.file_name().unwrap().to_string_lossy().into_owned(), std::fs::read(&path).unwrap());
        }
    }
    all
}

#[test]
fn any_number_of_threads_gives_the_same_bytes() {
    let folder = tempfile::tempdir().unwrap();
    let run = |threads: &str| -> BTreeMap<String, Vec<u8>> {
        let output = folder.path().join(threads);
        let output = output.to_str().unwrap();
        underwind(project(), &["run", "demo-data/study.toml", "--quiet", "--threads", threads, "--output", output])
            .succeeds();
        bytes(Path::new(output))
    };
    let one = run("1");
    for threads in ["2", "4"] {
        for (name, other) in run(threads) {
            assert!(one[&name] == other, "{name} differs between 1 and {threads} threads");
        }
    }
}

#[test]
fn the_demo_is_made_by_its_settings() {
    let folder = tempfile::tempdir().unwrap();
    let output = folder.path().join("again");
    underwind(project(), &["simulate", "demo-data/simulate.toml", "--output", output.to_str().unwrap()]).succeeds();
    for name in ["levels.csv.gz", "sites.csv", "truth.toml", "study.toml"] {
        let (made, kept) =
            (std::fs::read(output.join(name)).unwrap(), std::fs::read(project().join("demo-data").join(name)).unwrap());
        assert!(made == kept, "{name} is not what simulate.toml makes");
    }
    let other = folder.path().join("other");
    underwind(project(), &["simulate", "demo-data/simulate.toml", "--seed", "32", "--output", other.to_str().unwrap()])
        .succeeds();
    assert!(
        std::fs::read(output.join("levels.csv.gz")).unwrap() != std::fs::read(other.join("levels.csv.gz")).unwrap()
    );
}

#[test]
fn a_table_of_pairs_is_fitted_without_a_study() {
    let matchups = outputs().join("out/matchups.csv");
    let arguments = [
        "fit",
        "--matchups",
        matchups.to_str().unwrap(),
        "--level-column",
        "band_level_db",
        "--wind-column",
        "wind_speed_mean_m_s",
        "--json",
    ];
    let run = underwind(outputs(), &arguments).succeeds();
    let fitted: Vec<serde_json::Value> = serde_json::from_str(&run.stdout).unwrap();
    let relations = relations();
    assert_eq!(fitted.len(), relations.len());
    for (pairs, study) in fitted.iter().zip(&relations) {
        let mut expected = study["relation"].clone();
        // The table holds only rows that are used; how many were left out is known to the study alone.
        expected["diagnostics"]["rows_left_out"] = pairs["relation"]["diagnostics"]["rows_left_out"].clone();
        assert_eq!(pairs["relation"], expected, "{} {}", study["site"], study["band"]["centre_hz"]);
    }
}

#[test]
fn inputs_that_share_no_time_end_with_status_5_and_say_when_each_runs() {
    let folder = tempfile::tempdir().unwrap();
    let demo = project().join("demo-data");
    let study = std::fs::read_to_string(demo.join("study.toml")).unwrap();
    let moved = study
        .replace("sites.csv", demo.join("sites.csv").to_str().unwrap())
        .replace("wind.nc", demo.join("wind.nc").to_str().unwrap());
    write(folder.path(), "study.toml", &moved.replace("levels.csv.gz", "levels.csv"));
    write(
        folder.path(),
        "levels.csv",
        "time,site,63 Hz\n1999-01-01T00:00:00Z,basin,90.1\n1999-01-01T01:00:00Z,basin,90.4\n",
    );
    underwind(folder.path(), &["run", "study.toml"]).fails(
        5,
        &["nothing in common", "levels run from 1999-01-01T00:00:00Z to 1999-01-01T02:00:00Z", "outside_time 2"],
    );
    assert!(!folder.path().join("out").exists(), "nothing is written");
}
