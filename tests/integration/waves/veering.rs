//! Opposing seas over whole simulated records, at stored steps.

use std::f64::consts::TAU;
use underwind::model::{DirectionalSpectrum, OpposingSeas, SpectrumAxes};
use underwind::science::simulate::{SeaSettings, model_spectrum, sea_steps};
use underwind::science::waves::{Opposing, OpposingOptions, Radiator, SpreadingLaw, Water, opposing_seas};

/// Ten days of a wind that veers through all directions, stands, backs and drops, hourly; spectra every three hours.
fn record(settings: &SeaSettings) -> Vec<(SpectrumAxes, Option<OpposingSeas>)> {
    let frequency_hz = (0..30).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
    let axes = SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap();
    let hours = 240;
    let wind = |hour: i32| {
        let t = f64::from(hour);
        // A whole turn in a day, a front of 120 degrees in three hours on the sixth day, and lulls.
        let turned = TAU * t / 24.0 + if hour > 130 { TAU / 3.0 * ((t - 130.0) / 3.0).min(1.0) } else { 0.0 };
        let speed = 7.0 + 5.0 * (t / 17.0).sin();
        (speed * turned.sin(), speed * turned.cos())
    };
    let (east, north): (Vec<f64>, Vec<f64>) = (0..hours).map(wind).unzip();
    let steps = sea_steps(&east, &north, 1.0, settings, &Radiator::default());
    let water = Water::default();
    let phase_speed_m_s: Vec<f64> = axes.frequency_hz.iter().map(|f| water.phase_speed_m_s(*f)).collect();
    let table = Opposing::new(&axes);
    let mut density = vec![0.0; axes.cells()];
    (0..steps.len())
        .step_by(3)
        .map(|hour| {
            model_spectrum(&steps[hour], settings, &axes, &mut density);
            let along = |i: usize| {
                let to = axes.direction_to_rad[i];
                1.2 * (east[hour] * to.sin() + north[hour] * to.cos())
            };
            let driven = |k: usize, i: usize| along(i) > phase_speed_m_s[k];
            let spectrum = DirectionalSpectrum::new(&axes, &density).unwrap();
            let found = opposing_seas(spectrum, &table, Some(&driven), &OpposingOptions::default());
            (axes.clone(), found)
        })
        .collect()
}

#[test]
fn a_single_sea_that_veers_never_appears() {
    for law in SpreadingLaw::ALL {
        let found = record(&SeaSettings { law, ..SeaSettings::default() });
        assert_eq!(found.len(), 80);
        assert!(found.iter().all(|(_, seas)| seas.is_none()), "{law:?}");
    }
}

#[test]
fn a_swell_that_the_wind_sea_meets_head_on_appears_and_only_then() {
    let settings = SeaSettings { swell_hs_m: 1.5, swell_peak_hz: 0.1, swell_from_deg: 200.0, ..SeaSettings::default() };
    let found: Vec<OpposingSeas> = record(&settings).into_iter().filter_map(|(_, seas)| seas).collect();
    // The sea turns once a day: it runs against the swell for part of each turn.
    assert!(found.len() > 8 && found.len() < 50, "{}", found.len());
    for seas in &found {
        let swell = seas.systems.iter().find(|s| (s.from_deg - 200.0).abs() < 25.0).expect("the swell");
        assert!((swell.peak_hz - 0.1).abs() < 0.02 && (swell.hs_m - 1.5).abs() < 0.3, "{seas:?}");
    }
}
