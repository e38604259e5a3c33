//! All check cases through the program: `fit --matchups CASE.csv`, read back from `relation.json`. Expected values, their
//! tolerances and references are in `tests/fixtures/estimator/expected.json`.

use super::simulator::{self, Truth};
use crate::support::{project, rows, underwind};
use serde_json::Value;
use std::fmt::Write as _;
use underwind::model::{Relation, Resolved};

fn expected() -> Value {
    let text = std::fs::read_to_string(project().join("tests/fixtures/estimator/expected.json")).unwrap();
    serde_json::from_str(&text).unwrap()
}

/// Runs the program on a case and reads its only relation.
fn fit(name: &str, more: &[&str]) -> Relation {
    let folder = tempfile::tempdir().unwrap();
    let table = project().join(format!("tests/fixtures/estimator/{name}.csv"));
    let arguments = [&["fit", "--matchups", table.to_str().unwrap(), "-o", "out"], more].concat();
    underwind(folder.path(), &arguments).succeeds();
    let text = std::fs::read_to_string(folder.path().join("out/relation.json")).unwrap();
    let bands: Vec<Value> = serde_json::from_str(&text).unwrap();
    assert_eq!(bands.len(), 1);
    serde_json::from_value(bands[0]["relation"].clone()).unwrap()
}

/// What the relation says for a key of a case; several numbers where there are several deployments.
fn found(relation: &Relation, key: &str) -> Vec<f64> {
    let selected = relation.selected.as_ref();
    let many = |value: Resolved, of_deployment: &dyn Fn(usize) -> Resolved| -> Vec<f64> {
        if relation.deployments.is_empty() {
            value.estimate().into_iter().collect()
        } else {
            (0..relation.deployments.len()).filter_map(|index| of_deployment(index).estimate()).collect()
        }
    };
    let straight = matches!(relation.verdict.name(), "no onset");
    match (key, selected) {
        // A straight law is compared with the reference's straight law.
        ("floor_db", Some(fit)) if straight => fit.floor_db.clone(),
        ("wind_component_at_10_m_s_db", Some(fit)) if straight => fit.wind_component_at_10_m_s_db.clone(),
        ("slope_db_per_decade", Some(fit)) if straight => vec![fit.slope_db_per_decade],
        ("level_at_1_dB", Some(fit)) => vec![fit.wind_component_at_10_m_s_db[0] - fit.slope_db_per_decade],
        ("floor_db", _) => many(relation.floor_db, &|index| relation.deployments[index].floor_db),
        ("wind_component_at_10_m_s_db", _) => {
            many(relation.wind_component_at_10_m_s_db, &|index| relation.deployments[index].wind_component_at_10_m_s_db)
        }
        ("slope_db_per_decade", _) => relation.slope_db_per_decade.estimate().into_iter().collect(),
        ("onset_m_s", _) => relation.onset_m_s.estimate().into_iter().collect(),
        ("level_dB", _) => relation.level_at_10_m_s_db.estimate().into_iter().collect(),
        ("lower_break_m_s", _) => {
            let value = |resolved: Resolved| resolved.estimate().unwrap();
            let decades = (value(relation.floor_db) - value(relation.wind_component_at_10_m_s_db))
                / value(relation.slope_db_per_decade);
            vec![10.0 * 10.0_f64.powf(decades)]
        }
        (other, _) => panic!("no such key: {other}"),
    }
}

#[test]
fn every_check_case_holds_through_the_program() {
    // Words of the cases for verdicts, and ours.
    let verdicts = [
        ("saturation", "saturation"),
        ("none", "no onset"),
        ("slope decreases", "slope decreases"),
        ("no slope", "no slope"),
        ("no fit", "not fitted"),
        ("(hinge family; not scored)", "saturation"),
    ];
    let cases = expected();
    let cases = cases.as_object().unwrap();
    assert_eq!(cases.len(), 14);
    let mut compared = 0;
    for (name, case) in cases {
        // Where the reference is a least-squares fit to scattered levels, so is ours.
        let least_squares = ["c04_noisy_iid", "c05_no_saturation", "c11_nan_and_gaps"].contains(&name.as_str());
        let relation = fit(name, if least_squares { &["--loss", "least_squares"] } else { &[] });
        let wanted = verdicts.iter().find(|(theirs, _)| case["verdict"] == *theirs).unwrap().1;
        assert_eq!(relation.verdict.name(), wanted, "{name}");
        for (key, tolerance) in case["tol"].as_object().into_iter().flatten().filter(|(key, _)| *key != "sse_rel") {
            let wanted: Vec<f64> = match &case[key] {
                Value::Array(values) => values.iter().map(|value| value.as_f64().unwrap()).collect(),
                value => vec![value.as_f64().unwrap()],
            };
            let found = found(&relation, key);
            assert_eq!(found.len(), wanted.len(), "{name} {key}: {relation:?}");
            for (found, wanted) in found.iter().zip(&wanted) {
                let tolerance = tolerance.as_f64().unwrap();
                assert!((found - wanted).abs() <= tolerance, "{name} {key}: {found}, not {wanted} +- {tolerance}");
                compared += 1;
            }
        }
        if let Some(family) = case["scatter_family"].as_str() {
            assert_eq!(relation.scatter.unwrap().family.name(), family, "{name}");
        }
        for key in case["intervals_must_contain_truth"].as_array().into_iter().flatten() {
            let value = if key == "onset_m_s" { relation.onset_m_s } else { relation.slope_db_per_decade };
            let (low, high) = value.interval().unwrap();
            assert!((low..=high).contains(&case["truth"][key.as_str().unwrap()].as_f64().unwrap()), "{name} {key}");
        }
    }
    assert!(compared >= 40, "{compared}");
    // Rules that the cases state in words.
    assert!(matches!(fit("c08_floor_never_reached", &[]).floor_db, Resolved::AtMost(bound) if bound < 59.5));
    assert!(matches!(fit("c02_exact_log", &[]).floor_db, Resolved::AtMost(_)));
    assert_eq!(fit("c10_n_below_10", &[]).slope_db_per_decade.estimate(), None);
    assert_eq!(fit("c18_gain_step", &[]).deployment_difference.unwrap().name(), "gain step");
    assert_eq!(fit("c03_exact_hinge", &[]).scatter.unwrap().family.name(), "hard corner");
}

/// Levels in several bands over one wind, either as the simulator adds them in power or cut from below at the floor.
fn table(path: &std::path::Path, hard: bool) {
    let mut text = String::from("time_h,band_centre_hz,wind_speed_m_s,level_db\n");
    for band in 0_u32..12 {
        let truth = Truth::default();
        let drawn = simulator::record(truth, 8760, 7000 + u64::from(band));
        for (hour, (wind, level)) in drawn.wind_m_s.iter().zip(&drawn.level_db).enumerate() {
            let scatter = level - simulator::mean_level_db(&truth, *wind);
            let wind_part = 60.0 + 30.0 * (wind.min(12.0) / 3.5).log10();
            let level = if hard { wind_part.max(60.0) + scatter } else { *level };
            writeln!(text, "{hour},{},{wind:.4},{level:.4}", 100 * (band + 1)).unwrap();
        }
    }
    std::fs::write(path, text).unwrap();
}

/// Truths of the simulator: floor 60 dB, 30 dB per decade, crossover 3.5 m/s, onset 12 m/s.
#[test]
fn a_hard_corner_is_told_from_a_sum_of_powers() {
    let folder = tempfile::tempdir().unwrap();
    let families = |hard: bool| -> Vec<(String, f64)> {
        table(&folder.path().join("pairs.csv"), hard);
        underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--replicates", "0", "-o", "out"]).succeeds();
        rows(&folder.path().join("out/relation.csv"))
            .into_iter()
            .map(|row| (row["scatter"].clone(), row["floor_db"].parse().unwrap()))
            .collect()
    };
    let soft = families(false);
    assert!(soft.iter().all(|(family, _)| family != "hard corner"), "{soft:?}");
    let hard = families(true);
    assert!(hard.iter().filter(|(family, _)| family == "hard corner").count() >= 10, "{hard:?}");
    let mean = hard.iter().map(|(_, floor)| floor - 60.0).sum::<f64>() / hard.len() as f64;
    assert!(mean.abs() < 0.35, "{hard:?}");
}
