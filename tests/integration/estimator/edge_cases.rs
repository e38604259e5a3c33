//! Records that cannot be fitted, or hardly: a named answer, never a panic.

use super::simulator::{Truth, record};
use underwind::model::{NotResolved, Relation, RelationWarning, Verdict};
use underwind::science::level_wind::{Loss, Options, ScatterModel, Segments, SiteRecord, fit_band, fit_site};

const HOUR_MS: i64 = 3_600_000;

fn fit(wind: &[f64], level: &[f64]) -> Relation {
    let times: Vec<i64> = (0..wind.len() as i64).map(|hour| hour * HOUR_MS).collect();
    fit_band(&times, wind, level, None, &Options { replicates: 50, ..Options::default() })
}

#[test]
fn nothing_in_gives_a_named_nothing_out() {
    assert_eq!(fit(&[], &[]).not_fitted, Some(NotResolved::NoData));
    let relation = fit(&[f64::NAN; 100], &[60.0; 100]);
    assert_eq!((relation.not_fitted, relation.diagnostics.rows_left_out), (Some(NotResolved::NoData), 100));
    let relation = fit(&[5.0; 100], &[f64::NEG_INFINITY; 100]);
    assert_eq!(relation.not_fitted, Some(NotResolved::NoData));
    let site = SiteRecord { times_ms: &[], wind_speed_m_s: &[], deployment: None, levels_db: Vec::new() };
    assert!(fit_site(&site, &Options::default()).is_empty());
}

#[test]
fn one_level_at_all_winds_has_no_slope() {
    let wind: Vec<f64> = (0..500).map(|index| 1.0 + f64::from(index * 37 % 100) * 0.15).collect();
    let relation = fit(&wind, &[63.0; 500]);
    assert_eq!(relation.verdict, Verdict::NoSlope);
    assert!((relation.level_at_10_m_s_db.estimate().unwrap() - 63.0).abs() < 1e-9);
}

#[test]
fn two_levels_or_two_winds_do_not_break_the_fit() {
    let wind: Vec<f64> = (0..400).map(|index| if index % 2 == 0 { 3.0 } else { 12.0 }).collect();
    let level: Vec<f64> = (0..400).map(|index| if index % 2 == 0 { 60.0 } else { 75.0 }).collect();
    let relation = fit(&wind, &level);
    assert!(relation.level_db(12.0).unwrap().is_finite());
    assert!((relation.level_db(12.0).unwrap() - 75.0).abs() < 0.5, "{:?}", relation.level_db(12.0));
}

#[test]
fn one_day_is_fitted_but_nothing_is_resolved() {
    let simulated = record(Truth::default(), 24 * 12, 5);
    // Five-minute windows.
    let times: Vec<i64> = (0..simulated.wind_m_s.len() as i64).map(|index| index * HOUR_MS / 12).collect();
    let wind: Vec<f64> = (0..times.len()).map(|index| 1.5 + 0.04 * index as f64).collect();
    let relation = fit_band(&times, &wind, &simulated.level_db, None, &Options::default());
    assert!(!matches!(relation.verdict, Verdict::Saturation | Verdict::FallsAfterOnset), "{:?}", relation.verdict);
    assert!(relation.diagnostics.effective_samples.is_some());
}

#[test]
fn equal_times_are_fitted_and_warned_about() {
    let simulated = record(Truth::default(), 1000, 6);
    let times = vec![5; 1000];
    let options = Options { replicates: 50, ..Options::default() };
    let relation = fit_band(&times, &simulated.wind_m_s, &simulated.level_db, None, &options);
    assert!(relation.level_db(10.0).unwrap().is_finite());
    assert!(matches!(relation.verdict, Verdict::PointOnly | Verdict::NoSlope), "{:?}", relation.verdict);
}

#[test]
fn a_stray_time_stamp_does_not_exhaust_memory() {
    let simulated = record(Truth::default(), 1000, 7);
    let mut times = simulated.times_ms.clone();
    times[0] = i64::MIN / 2;
    times[999] = i64::MAX / 2;
    let options = Options { replicates: 50, ..Options::default() };
    let relation = fit_band(&times, &simulated.wind_m_s, &simulated.level_db, None, &options);
    assert!(relation.level_db(10.0).unwrap().is_finite());
}

#[test]
fn extreme_values_do_not_panic() {
    let simulated = record(Truth::default(), 600, 8);
    for (index, wind, level) in [(3, 1e300, 60.0), (5, 0.0, -1e6), (7, 5.0, 1e12), (9, f64::MIN_POSITIVE, 400.0)] {
        let (mut winds, mut levels) = (simulated.wind_m_s.clone(), simulated.level_db.clone());
        winds[index] = wind;
        levels[index] = level;
        let relation = fit(&winds, &levels);
        assert!(relation.level_db(10.0).unwrap().is_finite(), "{wind} {level}");
    }
}

#[test]
fn every_choice_of_options_gives_an_answer() {
    let simulated = record(Truth { gain_step_db: 4.0, ..Truth::default() }, 3000, 10);
    for loss in [Loss::Tukey, Loss::Huber, Loss::LeastSquares] {
        for scatter in [ScatterModel::Estimated, ScatterModel::FixedPowerSum] {
            for segments in
                [Segments::Pooled, Segments::Tested, Segments::FloorAndWindPart, Segments::Floor, Segments::Offset]
            {
                let options = Options { loss, scatter, segments, replicates: 40, ..Options::default() };
                let relation = fit_band(
                    &simulated.times_ms,
                    &simulated.wind_m_s,
                    &simulated.level_db,
                    Some(&simulated.deployment),
                    &options,
                );
                let slope = relation.slope_db_per_decade.estimate().unwrap();
                // A gain step that the choice does not allow for bends the fit, but there is an answer.
                assert!((5.0..80.0).contains(&slope), "{options:?}: {slope}");
                if matches!(segments, Segments::FloorAndWindPart | Segments::Offset) {
                    assert!((slope - 30.0).abs() < 9.0, "{options:?}: {slope}");
                    assert!(relation.warnings.contains(&RelationWarning::DeploymentsDiffer), "{options:?}");
                }
            }
        }
    }
}
