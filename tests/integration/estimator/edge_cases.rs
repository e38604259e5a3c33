//! Records that cannot be fitted, or hardly: a named answer, never a panic.

use super::simulator::{Truth, record};
use proptest::prelude::*;
use underwind::model::{NotResolved, Relation, RelationWarning, Verdict};
use underwind::science::level_wind::{
    Loss, Options, ScatterModel, Segments, SiteRecord, common_onset, correct_for_wind_error, drift_db_per_year,
    fit_band, fit_site, residual_classes, residuals, search_lag,
};

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

fn odd_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => 0.1..30.0_f64,
        3 => 40.0..90.0_f64,
        1 => prop_oneof![
            Just(f64::NAN),
            Just(f64::INFINITY),
            Just(f64::NEG_INFINITY),
            Just(0.0),
            Just(-3.0),
            Just(1e308),
            Just(-1e308),
            Just(5e-324),
        ],
    ]
}

fn odd_time() -> impl Strategy<Value = i64> {
    prop_oneof![8 => (0_i64..5000).prop_map(|hour| hour * HOUR_MS), 1 => any::<i64>()]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 60, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn no_input_panics(
        rows in prop::collection::vec((odd_time(), odd_number(), odd_number(), odd_number(), 0_u32..3), 0..400),
        cut in 0_usize..3,
    ) {
        let times: Vec<i64> = rows.iter().map(|row| row.0).collect();
        let wind: Vec<f64> = rows.iter().map(|row| row.1).collect();
        let level: Vec<f64> = rows.iter().map(|row| row.2).collect();
        let other: Vec<f64> = rows.iter().map(|row| row.3).collect();
        let deployment: Vec<u32> = rows.iter().map(|row| row.4).collect();
        let segments = [Segments::Tested, Segments::FloorAndWindPart, Segments::Offset][cut];
        let options = Options { replicates: 12, segments, wind_error_sd_m_s: Some(1.0), ..Options::default() };
        // Columns of unequal length are cut to the shortest.
        let site = SiteRecord {
            times_ms: &times,
            wind_speed_m_s: &wind[..wind.len() - cut.min(wind.len())],
            deployment: Some(&deployment),
            levels_db: vec![&level, &other],
        };
        let relations = fit_site(&site, &options);
        prop_assert_eq!(relations.len(), 2);
        for relation in &relations {
            prop_assert!(!relation.verdict_text().is_empty());
            prop_assert!(serde_json::to_string(relation).is_ok());
        }
        let residual = residuals(&wind, &level, Some(&deployment), &relations[0]);
        let class: Vec<Option<u32>> = deployment.iter().copied().map(Some).collect();
        residual_classes(&times, &residual, &class, 24.0, 1);
        drift_db_per_year(&times, &residual, 24.0, 1);
        search_lag(&times, &wind, &level, 2, 24.0);
        correct_for_wind_error(&times, &wind, &level, Some(&deployment), &options);
        common_onset(&relations);
    }
}
