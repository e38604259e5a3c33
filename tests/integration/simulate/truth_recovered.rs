//! The fit finds the laws behind the demo. The truth file is made by code that the fit does not share.

use super::support::{number, rows, true_wind};
use crate::support::project;
use std::sync::OnceLock;
use underwind::config::read_study;
use underwind::model::{FittedBand, Verdict};
use underwind::pipeline::{Silent, Stage, bring_together, open_inputs, run};

/// Limits within which floor (dB), slope (dB per decade) and onset (m/s) count as recovered.
const LIMITS: [f64; 3] = [1.0, 3.0, 1.0];

fn fitted() -> &'static [FittedBand] {
    static FITTED: OnceLock<Vec<FittedBand>> = OnceLock::new();
    FITTED.get_or_init(|| {
        let folder = tempfile::tempdir().unwrap();
        let mut study = read_study(&project().join("demo-data/study.toml")).unwrap();
        study.output = folder.path().join("out");
        run(&study, Stage::Fit, &Silent).unwrap().fitted.bands
    })
}

/// The fitted bands, each with its truth.
fn with_truth() -> Vec<(&'static FittedBand, toml::Table)> {
    let text = std::fs::read_to_string(project().join("demo-data/truth.toml")).unwrap();
    let truth: toml::Table = text.parse().unwrap();
    let of = |fitted: &FittedBand| {
        let centre_hz = fitted.band.unwrap().centre_hz;
        let sensors = truth["sensor"].as_array().unwrap();
        let sensor = sensors.iter().find(|sensor| sensor["site"].as_str() == Some(&fitted.site)).unwrap();
        let bands = sensor["band"].as_array().unwrap().iter().map(|band| band.as_table().unwrap());
        // Nominal centres lie within 2 % of the exact ones (IEC 61260-1).
        bands
            .into_iter()
            .find(|band| (number(band, "centre_hz").unwrap() / centre_hz - 1.0).abs() < 0.02)
            .unwrap()
            .clone()
    };
    fitted().iter().map(|fitted| (fitted, of(fitted))).collect()
}

#[test]
fn floor_slope_and_onset_of_the_demo_are_recovered() {
    let [floor_limit_db, slope_limit_db, onset_limit_m_s] = LIMITS;
    let (mut recovered, mut onsets, mut without) = (0, 0, 0);
    for (fitted, truth) in with_truth() {
        let name = format!("{} {}", fitted.site, fitted.band_label());
        let relation = &fitted.relation;
        let near = |what: &str, found: f64, limit: f64| {
            let expected = number(&truth, what).unwrap_or_else(|| panic!("{name}: {what} {found}, but it has none"));
            assert!((found - expected).abs() <= limit, "{name}: {what} {found}, truth {expected}");
        };
        if let Some(floor_db) = relation.floor_db.estimate() {
            near("floor_db", floor_db, floor_limit_db);
        }
        // Where floor and wind part meet only in strong wind, the slope's own interval is wider than the limit.
        if number(&truth, "crossover_m_s").unwrap() < 8.0 {
            near("slope_db_per_decade", relation.slope_db_per_decade.estimate().unwrap(), slope_limit_db);
            assert!(relation.floor_db.estimate().is_some(), "{name}: no floor");
            recovered += 1;
        }
        if relation.verdict == Verdict::Saturation {
            near("onset_m_s", relation.onset_m_s.estimate().unwrap(), onset_limit_m_s);
            onsets += 1;
        }
        if number(&truth, "onset_m_s").is_none() {
            assert!(
                matches!(relation.verdict, Verdict::NoOnset | Verdict::NoSlope),
                "{name}: {}",
                relation.verdict_text()
            );
            without += usize::from(relation.verdict == Verdict::NoOnset);
        }
    }
    // 9 bands of 3 sites whose floor and slope can be resolved, 6 with an onset, 5 that rise without end.
    assert!(recovered == 27 && onsets == 18 && without >= 15, "{recovered} {onsets} {without}");
}

#[test]
fn most_intervals_hold_the_truth() {
    let (mut inside, mut all) = (0, 0);
    for (fitted, truth) in with_truth() {
        let relation = &fitted.relation;
        for (what, found) in [
            ("floor_db", relation.floor_db),
            ("slope_db_per_decade", relation.slope_db_per_decade),
            ("onset_m_s", relation.onset_m_s),
        ] {
            if let (Some((low, high)), Some(expected)) = (found.interval(), number(&truth, what)) {
                all += 1;
                inside += usize::from((low..=high).contains(&expected));
            }
        }
    }
    // 95 % intervals: of some 85, between 76 and 85 in all but 1 of 100 deployments (binomial distribution, closed form).
    assert!(all >= 70 && f64::from(inside as u32) / f64::from(all) >= 0.88, "{inside} of {all}");
}

// The matchups integrate the speed in closed form; the simulator sums it finely, from its own interpolation.
#[test]
fn the_sampled_wind_is_the_true_wind() {
    let study = read_study(&project().join("demo-data/study.toml")).unwrap();
    let matched = bring_together(&study, &open_inputs(&study).unwrap(), &Silent).unwrap();
    let truth = true_wind(&project().join("demo-data"));
    let mut compared = 0;
    for (record, sources) in matched.records.iter().zip(&matched.conditions) {
        for (window, wind) in record.windows.iter().zip(&sources[0].wind) {
            let expected = truth[&(window.start.iso(), record.site.clone())];
            let found = wind.as_ref().unwrap().speed_mean_m_s;
            // A sum over 60 instants is this near to the integral, even where the wind passes through calm.
            assert!(
                (found - expected).abs() < 1e-3 * expected.max(1.0),
                "{} {}: {found} {expected}",
                record.site,
                window.start
            );
            compared += 1;
        }
    }
    let (_, levels) = rows(&project().join("demo-data/levels.csv.gz"));
    assert_eq!(compared, levels.len());
}
