//! A short simulation study: bias, coverage and verdict rates over a few dozen records. The long run is
//! `cargo bench --bench fit -- study`.

use super::simulator::{Floor, Law, Scatter, Truth, record};
use rayon::prelude::*;
use underwind::model::{DeploymentDifference, Relation, Resolved, Verdict};
use underwind::science::level_wind::{Options, fit_band};

fn fits(truth: Truth, count: usize, runs: u64) -> Vec<Relation> {
    let options = Options { replicates: 160, ..Options::default() };
    (0..runs)
        .into_par_iter()
        .map(|run| {
            let simulated = record(truth, count, 7000 + run);
            fit_band(&simulated.times_ms, &simulated.wind_m_s, &simulated.level_db, None, &options)
        })
        .collect()
}

fn share(relations: &[Relation], holds: impl Fn(&Relation) -> bool) -> f64 {
    relations.iter().filter(|relation| holds(relation)).count() as f64 / relations.len() as f64
}

fn covers(value: Resolved, truth: f64) -> bool {
    value.interval().is_some_and(|(low, high)| (low..=high).contains(&truth))
}

fn mean(relations: &[Relation], value: impl Fn(&Relation) -> Option<f64>) -> f64 {
    let values: Vec<f64> = relations.iter().filter_map(value).collect();
    values.iter().sum::<f64>() / values.len() as f64
}

/// A knee at 12 m/s in 40 records of 4000 hours. Bounds are three binomial standard errors (or three standard errors of the
/// mean) below what the long run found.
#[test]
fn a_true_onset_is_found_and_covered() {
    let relations = fits(Truth::default(), 4000, 40);
    assert!(share(&relations, |r| r.verdict == Verdict::Saturation) > 0.6);
    assert!(share(&relations, |r| covers(r.slope_db_per_decade, 30.0)) >= 0.82);
    assert!(share(&relations, |r| covers(r.floor_db, 60.0)) >= 0.82);
    assert!((mean(&relations, |r| r.slope_db_per_decade.estimate()) - 30.0).abs() < 0.8);
    assert!((mean(&relations, |r| r.floor_db.estimate()) - 60.0).abs() < 0.35);
    assert!((mean(&relations, |r| r.diagnostics.fitted_onset_m_s) - 12.0).abs() < 0.35);
}

#[test]
fn a_straight_law_is_never_called_saturation() {
    let truth = Truth { law: Law::Knee { slope: 30.0, onset_m_s: f64::INFINITY, post_slope: 0.0 }, ..Truth::default() };
    let relations = fits(truth, 2000, 40);
    assert!(share(&relations, |r| r.verdict == Verdict::Saturation) < 0.03);
    assert!(share(&relations, |r| matches!(r.onset_m_s, Resolved::AtLeast(_))) > 0.75);
}

#[test]
fn smooth_curvature_is_seldom_called_saturation() {
    for law in [Law::Curve, Law::Whitecap] {
        let relations = fits(Truth { law, ..Truth::default() }, 4000, 20);
        assert!(share(&relations, |r| r.verdict == Verdict::Saturation) <= 0.1, "{law:?}");
    }
}

#[test]
fn a_random_floor_and_ships_do_not_bend_the_slope() {
    for scatter in [Scatter::RandomFloor, Scatter::Ships, Scatter::Outliers] {
        let relations = fits(Truth { scatter, ..Truth::default() }, 4000, 20);
        assert!((mean(&relations, |r| r.slope_db_per_decade.estimate()) - 30.0).abs() < 1.5, "{scatter:?}");
        assert!((mean(&relations, |r| r.floor_db.estimate()) - 60.0).abs() < 0.8, "{scatter:?}");
    }
}

#[test]
fn without_a_floor_there_is_an_upper_bound() {
    let relations = fits(Truth { floor: Floor::Absent, ..Truth::default() }, 3000, 30);
    // The test of the floor has level 5 %: of 30 records at most 6 may show one (7 or more by chance: 4e-4).
    assert!(share(&relations, |r| matches!(r.floor_db, Resolved::AtMost(_))) >= 0.8);
    assert!(share(&relations, |r| covers(r.slope_db_per_decade, 30.0)) >= 0.8);
}

#[test]
fn a_floor_that_differs_between_segments_is_named() {
    let simulated = record(Truth { floor: Floor::Seasonal(2.5), ..Truth::default() }, 8760, 77);
    let options = Options { replicates: 160, ..Options::default() };
    let relation =
        fit_band(&simulated.times_ms, &simulated.wind_m_s, &simulated.level_db, Some(&simulated.deployment), &options);
    assert_eq!(relation.deployment_difference, Some(DeploymentDifference::Floor));
    let [first, second] = [0, 1].map(|index| relation.deployments[index].floor_db.estimate().unwrap());
    // Truth 5 dB; three standard errors of a difference at this length are about 1.8 dB.
    assert!((first - second - 5.0).abs() < 1.8, "{first} {second}");
}
