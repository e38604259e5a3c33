//! Lag, wind error, bands together, residual classes, drift, diagnostics.

use super::simulator::{Law, Scatter, Truth, record};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};
use underwind::model::{RelationWarning, Resolved, Verdict};
use underwind::science::level_wind::{
    KeepReplicates, Options, ScreenOptions, SiteRecord, common_onset, correct_for_wind_error, drift_db_per_year,
    fit_band, fit_site, residual_classes, residuals, screen_short_events, search_lag,
};

fn options() -> Options {
    Options { replicates: 100, ..Options::default() }
}

#[test]
fn a_shifted_clock_is_found_and_no_shift_is_left_alone() {
    for (scatter, truth_steps) in
        [(Scatter::Total { memory_h: 8.0 }, 2_i32), (Scatter::RandomFloor, -3), (Scatter::Ships, 0)]
    {
        let simulated = record(Truth { scatter, ..Truth::default() }, 4000, 21);
        let shift = i64::from(truth_steps) * 3_600_000;
        // Levels stamped late by this much.
        let times: Vec<i64> = simulated.times_ms.iter().map(|time| time + shift).collect();
        let mut all_times = simulated.times_ms.clone();
        all_times.extend(&times);
        let missing = vec![f64::NAN; 4000];
        let wind: Vec<f64> = simulated.wind_m_s.iter().chain(&missing).copied().collect();
        let level: Vec<f64> = missing.iter().chain(&simulated.level_db).copied().collect();
        // A table that holds wind and level in one row, as the search expects.
        let (times, wind, level) = joined(&all_times, &wind, &level);
        let search = search_lag(&times, &wind, &level, 6, 100.0).unwrap();
        assert_eq!(search.steps, truth_steps, "{:?}", search.losses);
        assert!((search.step_h - 1.0).abs() < 1e-9);
        assert_eq!(search.losses.len(), 13);
    }
}

/// One row per time, with what is known then.
fn joined(times: &[i64], wind: &[f64], level: &[f64]) -> (Vec<i64>, Vec<f64>, Vec<f64>) {
    let mut rows = std::collections::BTreeMap::new();
    for ((&time, &wind), &level) in times.iter().zip(wind).zip(level) {
        let row = rows.entry(time).or_insert((f64::NAN, f64::NAN));
        if wind.is_finite() {
            row.0 = wind;
        }
        if level.is_finite() {
            row.1 = level;
        }
    }
    (rows.keys().copied().collect(), rows.values().map(|row| row.0).collect(), rows.values().map(|row| row.1).collect())
}

#[test]
fn short_records_have_no_lag() {
    let simulated = record(Truth::default(), 90, 1);
    assert_eq!(search_lag(&simulated.times_ms, &simulated.wind_m_s, &simulated.level_db, 6, 10.0), None);
    assert_eq!(search_lag(&[], &[], &[], 6, 10.0), None);
}

#[test]
fn a_known_wind_error_is_taken_off() {
    // Classical error of 1.2 m/s on 20,000 hours: the plain fit is off by about +1.0 dB, -2.2 dB/decade and +0.7 m/s, the
    // corrected one by less than half of that (figures of the method's own study).
    let simulated = record(Truth::default(), 20_000, 31);
    let mut random = ChaCha8Rng::seed_from_u64(5);
    let error = Normal::new(0.0, 1.2).unwrap();
    let observed: Vec<f64> =
        simulated.wind_m_s.iter().map(|wind| (wind + error.sample(&mut random)).max(0.0)).collect();
    let options = Options { wind_error_sd_m_s: Some(1.2), ..options() };
    let [plain, small, right, large] =
        correct_for_wind_error(&simulated.times_ms, &observed, &simulated.level_db, None, &options).unwrap();
    let off = |estimate: &underwind::model::WindErrorEstimate| {
        (estimate.floor_db[0] - 60.0, estimate.slope_db_per_decade - 30.0, estimate.onset_m_s - 12.0)
    };
    assert!(off(&plain).0 > 0.5 && off(&plain).1 < -1.0, "{:?}", off(&plain));
    assert!(off(&right).0.abs() < 0.5 && off(&right).1.abs() < 1.6, "{:?}", off(&right));
    assert!(off(&right).2.abs() < 0.5 * off(&plain).2.abs().max(0.6), "{:?} {:?}", off(&right), off(&plain));
    assert!(small.floor_db[0] > right.floor_db[0] && right.floor_db[0] > large.floor_db[0]);
    let none = Options { wind_error_sd_m_s: None, ..options };
    assert_eq!(correct_for_wind_error(&simulated.times_ms, &observed, &simulated.level_db, None, &none), None);
}

#[test]
fn bands_with_one_onset_share_it_and_others_do_not() {
    let knee = |onset_m_s: f64| Law::Knee { slope: 30.0, onset_m_s, post_slope: 0.0 };
    let wind = record(Truth::default(), 9000, 41);
    let run = |onsets: [f64; 3]| {
        let levels: Vec<Vec<f64>> = onsets
            .iter()
            .enumerate()
            .map(|(band, &onset)| {
                // The same wind (drawn first), scatter of its own.
                let mut simulated = record(Truth { law: knee(onset), ..Truth::default() }, 9000, 41);
                let other = record(Truth::default(), 9000, 500 + band as u64);
                for (row, level) in simulated.level_db.iter_mut().enumerate() {
                    let mean = super::simulator::mean_level_db(
                        &Truth { law: knee(onset), ..Truth::default() },
                        simulated.wind_m_s[row],
                    );
                    let off =
                        other.level_db[row] - super::simulator::mean_level_db(&Truth::default(), other.wind_m_s[row]);
                    *level = mean + off;
                }
                simulated.level_db
            })
            .collect();
        let site = SiteRecord {
            times_ms: &wind.times_ms,
            wind_speed_m_s: &wind.wind_m_s,
            deployment: None,
            levels_db: levels.iter().map(Vec::as_slice).collect(),
        };
        common_onset(&fit_site(&site, &Options { keep_replicates: KeepReplicates::Yes, ..options() }))
    };
    let same = run([12.0; 3]).unwrap();
    let (low, high) = same.onset_m_s.interval().unwrap();
    assert!(low < 12.3 && high > 11.7 && high - low < 2.0, "{low} {high}");
    assert!(same.p_equal > 0.01, "{}", same.p_equal);
    assert_eq!(same.degrees, same.bands.len() - 1);
    let different = run([9.0, 11.5, 14.0]).unwrap();
    assert!(different.p_equal < 1e-3, "{}", different.p_equal);
}

#[test]
fn a_class_that_is_louder_is_found_and_others_are_not() {
    let mut simulated = record(Truth::default(), 8760, 51);
    // Twelve months of 730 hours; the fourth is 3 dB louder.
    let month: Vec<Option<u32>> = (0..8760).map(|hour| Some(hour / 730)).collect();
    for row in 3 * 730..4 * 730 {
        simulated.level_db[row] += 3.0;
    }
    let relation = fit_band(&simulated.times_ms, &simulated.wind_m_s, &simulated.level_db, None, &options());
    let residual = residuals(&simulated.wind_m_s, &simulated.level_db, None, &relation);
    let block_h = 2.0 * relation.diagnostics.block_length_h.unwrap();
    let classes = residual_classes(&simulated.times_ms, &residual, &month, block_h.min(100.0), 1);
    assert_eq!(classes.len(), 12);
    for class in &classes {
        assert_eq!(class.class == 3, class.p_holm < 0.01, "{class:?}");
        assert!(class.p_holm >= class.p_value);
    }
    let loud = classes.iter().find(|class| class.class == 3).unwrap();
    assert!(loud.low_db < 2.75 && loud.high_db > 2.5, "{loud:?}");
}

#[test]
fn a_drift_is_measured() {
    let mut simulated = record(Truth::default(), 17_520, 61);
    let fit = |level: &[f64]| {
        let relation = fit_band(&simulated.times_ms, &simulated.wind_m_s, level, None, &options());
        let residual = residuals(&simulated.wind_m_s, level, None, &relation);
        drift_db_per_year(&simulated.times_ms, &residual, 100.0, 1).unwrap()
    };
    let contains =
        |value: Resolved, truth: f64| value.interval().is_some_and(|(low, high)| low < truth && truth < high);
    let plain = fit(&simulated.level_db);
    assert!(contains(plain, 0.0), "{plain:?}");
    let drifting: Vec<f64> =
        simulated.level_db.iter().enumerate().map(|(hour, level)| level + 2.0 * hour as f64 / 8766.0).collect();
    let found = fit(&drifting);
    assert!(contains(found, 2.0) && !contains(found, 0.0), "{found:?}");
    simulated.times_ms.clear();
    assert_eq!(drift_db_per_year(&[], &[], 100.0, 1), None);
}

#[test]
fn spread_and_shape_raise_no_warning_where_the_model_is_right() {
    let mut warned = 0;
    for seed in 0..6 {
        let simulated = record(Truth { scatter: Scatter::RandomFloor, ..Truth::default() }, 8760, 700 + seed);
        let relation = fit_band(&simulated.times_ms, &simulated.wind_m_s, &simulated.level_db, None, &options());
        warned += usize::from(relation.warnings.contains(&RelationWarning::ScatterMisfit));
        assert!(
            relation.wind_classes.iter().all(|class| class.predicted_quantile_90_db > class.predicted_quantile_10_db)
        );
        assert!(relation.diagnostics.residual_scale_ratio.unwrap() < 0.8, "the floor scatters more than the wind part");
    }
    assert!(warned <= 1);
}

#[test]
fn a_deployment_has_its_own_curve() {
    let simulated = record(Truth { gain_step_db: 4.0, ..Truth::default() }, 8760, 71);
    let relation = fit_band(
        &simulated.times_ms,
        &simulated.wind_m_s,
        &simulated.level_db,
        Some(&simulated.deployment),
        &options(),
    );
    assert_ne!(relation.verdict, Verdict::NotFitted);
    let (first, second) = (relation.curve_of(0).unwrap(), relation.curve_of(1).unwrap());
    for wind in [2.0, 8.0, 15.0] {
        assert!((second.level_db(wind) - first.level_db(wind) - 4.0).abs() < 1.2);
    }
    let residual = residuals(&simulated.wind_m_s, &simulated.level_db, Some(&simulated.deployment), &relation);
    let half_mean = |rows: std::ops::Range<usize>| residual[rows.clone()].iter().sum::<f64>() / rows.len() as f64;
    assert!(half_mean(0..4380).abs() < 0.3 && half_mean(4380..8760).abs() < 0.3);
}

#[test]
fn short_coherent_events_are_marked_and_weather_is_kept() {
    let bands = |scatter: Scatter| -> (Vec<i64>, Vec<Vec<f64>>) {
        // The same seed gives the same wind and the same ships in every band.
        let levels: Vec<Vec<f64>> = (0..6)
            .map(|band| {
                let truth = Truth { crossover_m_s: 3.0 + f64::from(band), scatter, ..Truth::default() };
                record(truth, 4000, 81).level_db
            })
            .collect();
        (record(Truth::default(), 4000, 81).times_ms, levels)
    };
    let run = |scatter: Scatter| {
        let (times, levels) = bands(scatter);
        let columns: Vec<&[f64]> = levels.iter().map(Vec::as_slice).collect();
        (screen_short_events(&times, &columns, &ScreenOptions::default()), levels)
    };
    // Loud ships: rows that a ship raises by more than 8 dB in at least four of the six bands.
    let (found, with_ships) = run(Scatter::Ships);
    let (calm, without) = run(Scatter::Total { memory_h: 8.0 });
    let raised = |row: usize| (0..6).filter(|&band| with_ships[band][row] - without[band][row] > 8.0).count();
    let loud: Vec<usize> = (0..4000).filter(|&row| raised(row) >= 4).collect();
    assert!(loud.len() > 50, "{}", loud.len());
    let caught = loud.iter().filter(|&&row| found.marked[row]).count() as f64 / loud.len() as f64;
    assert!(caught > 0.6, "{caught}");
    // Scatter that is common to all bands is the hardest case for coherence; few hours of it are short enough.
    let wrong = calm.marked.iter().filter(|marked| **marked).count() as f64 / 4000.0;
    assert!(wrong < 0.06, "{wrong}");
    // A storm of two days is not a ship.
    let times: Vec<i64> = (0..500).map(|hour| hour * 3_600_000).collect();
    let storm: Vec<f64> =
        (0..500).map(|hour| if (200..248).contains(&hour) { 80.0 } else { 60.0 + f64::from(hour % 3) }).collect();
    let screened = screen_short_events(&times, &[&storm, &storm, &storm], &ScreenOptions::default());
    assert!(screened.marked.iter().all(|marked| !marked));
    assert_eq!(screen_short_events(&times, &[&storm], &ScreenOptions::default()).events, 0);
    assert_eq!(screen_short_events(&[], &[], &ScreenOptions::default()).events, 0);
}
