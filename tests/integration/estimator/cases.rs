//! The check cases of the method: columns in CSV, expected values and their references in `expected.json`. References are
//! closed forms (noise-free cases), scipy, statsmodels, or rules, as each case says.

use serde_json::Value;
use std::path::PathBuf;
use underwind::model::{DeploymentDifference, Relation, Resolved, ScatterFamily, Verdict};
use underwind::science::level_wind::{Loss, Options, fit_band};

pub(crate) struct Columns {
    pub(crate) times_ms: Vec<i64>,
    pub(crate) wind_m_s: Vec<f64>,
    pub(crate) level_db: Vec<f64>,
    pub(crate) deployment: Vec<u32>,
}

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/fixtures/estimator")
}

/// Columns of a case; empty cells and `nan` become NaN, deployments are numbered as they come.
pub(crate) fn columns(name: &str) -> Columns {
    let text = std::fs::read_to_string(folder().join(format!("{name}.csv"))).unwrap();
    let mut columns =
        Columns { times_ms: Vec::new(), wind_m_s: Vec::new(), level_db: Vec::new(), deployment: Vec::new() };
    let mut labels: Vec<String> = Vec::new();
    for line in text.lines().skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        columns.times_ms.push((cells[0].parse::<f64>().unwrap() * 3.6e6) as i64);
        columns.wind_m_s.push(cells[1].parse().unwrap_or(f64::NAN));
        columns.level_db.push(cells[2].parse().unwrap_or(f64::NAN));
        let label = (*cells.get(3).unwrap_or(&"")).to_owned();
        let known = labels.iter().position(|known| *known == label).unwrap_or_else(|| {
            labels.push(label);
            labels.len() - 1
        });
        columns.deployment.push(u32::try_from(known).unwrap());
    }
    columns
}

fn expected(name: &str) -> Value {
    let text = std::fs::read_to_string(folder().join("expected.json")).unwrap();
    serde_json::from_str::<Value>(&text).unwrap()[name].clone()
}

fn fit(name: &str, loss: Loss) -> Relation {
    let columns = columns(name);
    let options = Options { loss, ..Options::default() };
    fit_band(&columns.times_ms, &columns.wind_m_s, &columns.level_db, Some(&columns.deployment), &options)
}

/// Compares a number with the expected one within the tolerance that the case states.
fn check(name: &str, key: &str, found: f64) {
    let case = expected(name);
    let (wanted, tolerance) = (case[key].as_f64().unwrap(), case["tol"][key].as_f64().unwrap());
    assert!((found - wanted).abs() <= tolerance, "{name} {key}: {found}, expected {wanted} +- {tolerance}");
}

fn check_floor_and_knee(name: &str, relation: &Relation, keys: &[&str]) {
    for key in keys {
        let value = match *key {
            "floor_db" => relation.floor_db,
            "wind_component_at_10_m_s_db" => relation.wind_component_at_10_m_s_db,
            "slope_db_per_decade" => relation.slope_db_per_decade,
            "onset_m_s" => relation.onset_m_s,
            other => panic!("no such key: {other}"),
        };
        check(name, key, value.estimate().unwrap_or_else(|| panic!("{name} {key} is {value:?}")));
    }
}

const ALL: [&str; 4] = ["floor_db", "wind_component_at_10_m_s_db", "slope_db_per_decade", "onset_m_s"];

#[test]
fn noise_free_floor_slope_and_onset_are_recovered() {
    let relation = fit("c01_exact_floor_log_sat", Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    check_floor_and_knee("c01_exact_floor_log_sat", &relation, &ALL);
}

#[test]
fn a_noise_free_hard_corner_is_recovered() {
    let name = "c03_exact_hinge";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    assert_eq!(relation.scatter.unwrap().family, ScatterFamily::HardCorner);
    check_floor_and_knee(name, &relation, &["floor_db", "slope_db_per_decade", "onset_m_s"]);
    let [floor, wind, slope] = [relation.floor_db, relation.wind_component_at_10_m_s_db, relation.slope_db_per_decade]
        .map(|v| v.estimate().unwrap());
    check(name, "lower_break_m_s", 10.0_f64.powf(1.0 + (floor - wind) / slope));
}

#[test]
fn a_noise_free_straight_line_is_recovered_without_floor_or_onset() {
    let name = "c02_exact_log";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::NoOnset);
    assert!(matches!(relation.floor_db, Resolved::AtMost(_)));
    let selected = relation.selected.unwrap();
    check(name, "slope_db_per_decade", selected.slope_db_per_decade);
    let level_at_1 = selected.wind_component_at_10_m_s_db[0] - selected.slope_db_per_decade;
    check(name, "level_at_1_dB", level_at_1);
}

#[test]
fn least_squares_agrees_with_scipy() {
    for name in ["c04_noisy_iid", "c11_nan_and_gaps"] {
        let relation = fit(name, Loss::LeastSquares);
        assert_eq!(relation.verdict, Verdict::Saturation);
        check_floor_and_knee(name, &relation, &ALL);
        assert_eq!(relation.diagnostics.samples, 1500);
        // The sum of squares over all samples is that of the reference's optimum within the stated share.
        let columns = columns(name);
        let squares: f64 = columns
            .wind_m_s
            .iter()
            .zip(&columns.level_db)
            .filter(|(wind, level)| wind.is_finite() && level.is_finite())
            .map(|(wind, level)| (level - relation.level_db(*wind).unwrap()).powi(2))
            .sum();
        let case = expected(name);
        let wanted = case["sse"].as_f64().unwrap();
        let share = case["tol"]["sse_rel"].as_f64().unwrap();
        assert!((squares / wanted - 1.0).abs() <= share, "{name}: {squares} {wanted}");
    }
}

#[test]
fn missing_rows_and_gaps_change_nothing() {
    let (plain, gaps) = (fit("c04_noisy_iid", Loss::Tukey), fit("c11_nan_and_gaps", Loss::Tukey));
    assert_eq!(gaps.diagnostics.rows_left_out, 214);
    for (a, b) in [(plain.floor_db, gaps.floor_db), (plain.slope_db_per_decade, gaps.slope_db_per_decade)] {
        assert!((a.estimate().unwrap() - b.estimate().unwrap()).abs() < 1e-9);
    }
}

#[test]
fn without_saturation_only_a_lower_bound_is_given() {
    let name = "c05_no_saturation";
    let relation = fit(name, Loss::LeastSquares);
    assert_eq!(relation.verdict, Verdict::NoOnset);
    assert!(matches!(relation.onset_m_s, Resolved::AtLeast(_)));
    let selected = relation.selected.unwrap();
    check(name, "floor_db", selected.floor_db[0]);
    check(name, "wind_component_at_10_m_s_db", selected.wind_component_at_10_m_s_db[0]);
    check(name, "slope_db_per_decade", selected.slope_db_per_decade);
}

#[test]
fn a_floor_that_is_never_reached_is_bounded_from_above() {
    let name = "c08_floor_never_reached";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    check_floor_and_knee(name, &relation, &ALL[1..]);
    // The case says: the bound must lie below 59.5 dB.
    assert!(matches!(relation.floor_db, Resolved::AtMost(bound) if bound < 59.5), "{:?}", relation.floor_db);
}

#[test]
fn constant_wind_gives_a_constant() {
    let relation = fit("c09_constant_wind", Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::NoSlope);
    check("c09_constant_wind", "level_dB", relation.level_at_10_m_s_db.estimate().unwrap());
    assert_eq!(relation.slope_db_per_decade.estimate(), None);
}

#[test]
fn eight_rows_are_not_fitted() {
    let relation = fit("c10_n_below_10", Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::NotFitted);
    assert_eq!(relation.slope_db_per_decade.estimate(), None);
}

#[test]
fn a_random_floor_is_recognised_and_does_not_bend_the_estimates() {
    let name = "c13_random_floor";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    assert_eq!(relation.scatter.unwrap().family.name(), "random floor");
    check_floor_and_knee(name, &relation, &["floor_db", "slope_db_per_decade", "onset_m_s"]);
    contains_truth(name, relation.slope_db_per_decade, "slope_db_per_decade");
    contains_truth(name, relation.onset_m_s, "onset_m_s");
}

fn contains_truth(name: &str, found: Resolved, key: &str) {
    let truth = expected(name)["truth"][key].as_f64().unwrap();
    let (low, high) = found.interval().unwrap();
    assert!((low..=high).contains(&truth), "{name} {key}: {low} to {high}, truth {truth}");
}

#[test]
fn ships_added_in_power_do_not_lift_the_floor() {
    let name = "c14_ships_in_power";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    assert_eq!(relation.scatter.unwrap().family.name(), "random floor with ships");
    check_floor_and_knee(name, &relation, &["floor_db", "slope_db_per_decade", "onset_m_s"]);
}

#[test]
fn a_low_onset_is_found_and_never_called_falling() {
    let name = "c16_low_onset_15_percent";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    check_floor_and_knee(name, &relation, &["floor_db", "slope_db_per_decade", "onset_m_s"]);
}

#[test]
fn curvature_is_not_called_saturation() {
    let relation = fit("c17_curvature_no_knee", Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::SlopeDecreases);
    assert_eq!(relation.onset_m_s.estimate(), None);
    // Floor and local slope come from the curved law; reference scipy, tolerance three standard errors of the fit.
    let reference = &expected("c17_curvature_no_knee")["quadratic"];
    let near = |found: f64, key: &str, tolerance: f64| {
        assert!((found - reference[key].as_f64().unwrap()).abs() < tolerance, "{key}: {found}");
    };
    near(relation.floor_db.estimate().unwrap(), "floor_db", 0.3);
    near(relation.slope_db_per_decade.estimate().unwrap(), "slope_at_10_m_s", 1.0);
}

#[test]
fn a_gain_step_between_deployments_is_named() {
    let name = "c18_gain_step";
    let relation = fit(name, Loss::Tukey);
    assert_eq!(relation.verdict, Verdict::Saturation);
    assert_eq!(relation.deployment_difference, Some(DeploymentDifference::GainStep));
    check_floor_and_knee(name, &relation, &["slope_db_per_decade", "onset_m_s"]);
    let case = expected(name);
    for (index, deployment) in relation.deployments.iter().enumerate() {
        for (key, found) in
            [("floor_db", deployment.floor_db), ("wind_component_at_10_m_s_db", deployment.wind_component_at_10_m_s_db)]
        {
            let (wanted, tolerance) = (case[key][index].as_f64().unwrap(), case["tol"][key].as_f64().unwrap());
            let found = found.estimate().unwrap();
            assert!((found - wanted).abs() <= tolerance, "{key} {index}: {found} {wanted}");
        }
    }
}
