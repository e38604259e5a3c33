//! What must not change overlap, sea state and radiated level, and what must change them by a known amount.

use proptest::prelude::*;
use std::f64::consts::{PI, TAU};
use underwind::model::{Band, DirectionalSpectrum, NotRadiated, SeaState, SpectrumAxes, circle_order};
use underwind::science::waves::{
    BandSettings, Distribution, Opposing, RadiatedBands, Radiator, ReduceOptions, Reducer, Water, WindOver,
    WindSeaSpectrum,
};

const FREQUENCIES: usize = 30;

fn frequencies() -> Vec<f64> {
    (0..FREQUENCIES).map(|k| 0.05 * 1.1_f64.powi(k as i32)).collect()
}

fn axes(directions: usize, start_rad: f64) -> SpectrumAxes {
    let step = TAU / directions as f64;
    SpectrumAxes::new(frequencies(), None, (0..directions).map(|i| start_rad + i as f64 * step).collect()).unwrap()
}

/// A wind sea and a swell from elsewhere.
fn sea(axes: &SpectrumAxes, mean_to: f64, s: f64, swell_to: f64, swell_share: f64) -> Vec<f64> {
    let wind_sea = WindSeaSpectrum::fully_developed(9.0, &Water::default());
    let swell = WindSeaSpectrum { peak_hz: 0.08, gamma: 3.3, alpha: 1e-4 * swell_share, ..wind_sea };
    let (broad, narrow) = (Distribution::CosinePower { s }, Distribution::CosinePower { s: 8.0 });
    let density = |f: f64, to: f64| {
        wind_sea.density_m2_hz(f) * broad.per_rad(to - mean_to) + swell.density_m2_hz(f) * narrow.per_rad(to - swell_to)
    };
    axes.frequency_hz
        .iter()
        .flat_map(|f| axes.direction_to_rad.iter().map(|to| density(*f, *to)).collect::<Vec<_>>())
        .collect()
}

fn state(axes: &SpectrumAxes, density: &[f64], wind: Option<WindOver>) -> SeaState {
    let reducer = Reducer::new(axes, &Water::default(), ReduceOptions::default());
    reducer.sea_state(DirectionalSpectrum::new(axes, density).unwrap(), wind).unwrap()
}

fn level(axes: &SpectrumAxes, density: &[f64]) -> f64 {
    let table = Opposing::new(axes);
    let source: Vec<f64> = density.chunks_exact(axes.directions()).map(|row| table.own(row)).collect();
    let band = Band::from_edges(0.9, 1.2).unwrap();
    let mut out = [Err(NotRadiated::NoSpectrum)];
    RadiatedBands::new(axes, &Radiator::default(), &[band], BandSettings::default()).levels(&source, None, &mut out);
    out[0].unwrap().band_level_db
}

fn close(a: f64, b: f64, tolerance: f64) -> bool {
    (a - b).abs() <= tolerance * a.abs().max(b.abs()) || (a.is_nan() && b.is_nan())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    /// Turning everything turns the directions and nothing else; exchanging from and to turns by half a circle.
    #[test]
    fn turning_the_sea_turns_only_directions(
        mean in 0.0..TAU, s in 1.0..8.0_f64, swell in 0.0..TAU, steps in 0_usize..36
    ) {
        let axes = axes(36, 0.02);
        let before = sea(&axes, mean, s, swell, 1.0);
        let mut after = before.clone();
        for row in after.chunks_exact_mut(36) {
            row.rotate_right(steps);
        }
        let turn_deg = steps as f64 * 10.0;
        let wind = |from_deg: f64| Some(WindOver { speed_m_s: 9.0, from_deg });
        let from_deg = (mean + PI).to_degrees();
        let (a, b) = (state(&axes, &before, wind(from_deg)), state(&axes, &after, wind(from_deg + turn_deg)));
        for k in 0..FREQUENCIES {
            let overlaps = |s: &SeaState| (s.by_frequency.overlap_2pi_bins_per_rad[k], s.by_frequency.overlap_2pi_fourier_per_rad[k]);
            prop_assert!(close(overlaps(&a).0, overlaps(&b).0, 1e-12));
            // The Fourier sum of a narrow sea is a small difference of large numbers.
            prop_assert!((overlaps(&a).1 - overlaps(&b).1).abs() < 1e-12 || overlaps(&a).1.is_nan());
        }
        prop_assert!((level(&axes, &before) - level(&axes, &after)).abs() < 1e-9);
        prop_assert!(close(a.hs_m, b.hs_m, 1e-12) && close(a.spread_deg, b.spread_deg, 1e-9));
        let turned = (b.mean_from_deg - a.mean_from_deg - turn_deg).rem_euclid(360.0);
        prop_assert!(turned.min(360.0 - turned) < 1e-7, "{turned}");
        let (wind_a, wind_b) = (a.wind_sea.unwrap(), b.wind_sea.unwrap());
        prop_assert!(close(wind_a.hs_m, wind_b.hs_m, 1e-9) && close(wind_a.peak_hz, wind_b.peak_hz, 1e-9));
    }

    /// Any stored order, with 360 beside 0, gives the same.
    #[test]
    fn the_stored_order_of_directions_does_not_matter(mean in 0.0..TAU, start in 0_usize..36, backwards: bool) {
        let axes = axes(36, 0.0);
        let density = sea(&axes, mean, 2.0, 1.0, 1.0);
        let mut order: Vec<usize> = (0..36).map(|i| (i + start) % 36).collect();
        if backwards {
            order.reverse();
        }
        let mut stored_rad: Vec<f64> = order.iter().map(|i| axes.direction_to_rad[*i]).collect();
        stored_rad.push(stored_rad[0] + TAU);
        order.push(order[0]);
        let sorted = circle_order(&stored_rad);
        prop_assert_eq!(sorted.len(), 36);
        let read: Vec<f64> = density.chunks_exact(36).flat_map(|row| sorted.iter().map(|i| row[order[*i]]).collect::<Vec<_>>()).collect();
        prop_assert_eq!(read, density);
    }

    /// Twice the density is 6.02 dB more sound (closed form: F_p goes with E^2).
    #[test]
    fn doubling_the_density_raises_the_level_by_six_decibels(mean in 0.0..TAU, s in 1.0..4.0_f64) {
        let axes = axes(24, 0.1);
        let single = sea(&axes, mean, s, 0.0, 0.0);
        let double: Vec<f64> = single.iter().map(|d| 2.0 * d).collect();
        prop_assert!((level(&axes, &double) - level(&axes, &single) - 6.020_599_913).abs() < 1e-8);
        let (a, b) = (state(&axes, &single, None), state(&axes, &double, None));
        prop_assert!(close(b.hs_m, a.hs_m * 2f64.sqrt(), 1e-12) && close(a.peak_hz, b.peak_hz, 1e-12));
        prop_assert!(a.wind_sea.is_none() && a.swell_hs_m.is_nan());
    }

    /// Never above the integral of D^2 (Cauchy and Schwarz), never above N / 4 pi, never negative by bins.
    #[test]
    fn the_overlap_keeps_its_bounds(row in prop::collection::vec(0.0..1.0_f64, 36)) {
        let axes = axes(36, 0.0);
        let step = TAU / 36.0;
        let total: f64 = row.iter().sum::<f64>() * step;
        prop_assume!(total > 1e-6);
        let normed: Vec<f64> = row.iter().map(|d| d / total).collect();
        let table = Opposing::new(&axes);
        let overlap = table.own(&normed);
        let square: f64 = normed.iter().map(|d| d * d * step).sum();
        prop_assert!(overlap >= 0.0 && overlap <= square * (1.0 + 1e-12) && overlap <= 36.0 / (4.0 * PI) + 1e-9);
        // Over half of the circle it is exactly half.
        let half: f64 = (0..18).map(|i| normed[i] * normed[i + 18] * step).sum();
        prop_assert!((2.0 * half - overlap).abs() <= 1e-12 * overlap);
        // Bins and the whole Fourier sum differ by the last harmonic alone.
        let last: f64 = normed.iter().enumerate().map(|(i, d)| if i % 2 == 0 { d * step } else { -d * step }).sum();
        prop_assert!((overlap - table.by_fourier(&normed, &normed) - last * last / TAU).abs() < 1e-10);
    }
}

/// Wind sea is judged by the wind along the waves: waves against the wind never belong to it.
#[test]
fn the_wind_sea_is_split_by_wave_age() {
    let axes = axes(36, 0.0);
    let density = sea(&axes, 0.0, 3.0, PI, 30.0);
    // A sea that 9 m/s developed under a wind that has risen to 12 m/s: all of its peak is driven.
    let wind = WindOver { speed_m_s: 12.0, from_deg: 180.0 };
    let found = state(&axes, &density, Some(wind));
    let wind_sea = found.wind_sea.unwrap();
    // A fully developed sea of 9 m/s peaks at 0.8772 g / (2 pi 1.0602 x 9) = 0.1435 Hz; the swell at 0.08 Hz is higher.
    assert!((wind_sea.peak_hz - 0.1435).abs() < 0.01, "{wind_sea:?}");
    assert!((found.peak_hz - 0.08).abs() < 0.006 && found.swell_hs_m > 0.5 * found.hs_m, "{found:?}");
    assert!((wind_sea.mean_from_deg - 180.0).abs() < 1.0);
    // Deep water: c_p = g / (2 pi f).
    assert!((wind_sea.wave_age - 9.80665 / (TAU * wind_sea.peak_hz * 12.0)).abs() < 0.01);
    // Against the wind nothing is wind sea.
    let calm = state(&axes, &density, Some(WindOver { speed_m_s: 1.0, from_deg: 180.0 }));
    assert!(calm.wind_sea.is_none());
    let total = found.m0_m2;
    let parts = (wind_sea.hs_m.powi(2) + found.swell_hs_m.powi(2)) / 16.0;
    assert!((parts / total - 1.0).abs() < 1e-12);
}

/// A steady sea without opposing energy has no overlap, and every pair of opposite directions holds a zero.
#[test]
fn a_sea_without_opposing_energy_says_so() {
    let axes = axes(24, 0.0);
    let one_side: Vec<f64> = (0..FREQUENCIES)
        .flat_map(|_| {
            axes.direction_to_rad
                .iter()
                .map(|to| if to.cos() > 1e-9 { to.cos().powi(2) } else { 0.0 })
                .collect::<Vec<_>>()
        })
        .collect();
    let found = state(&axes, &one_side, None);
    assert!(found.by_frequency.overlap_2pi_bins_per_rad.iter().all(|overlap| *overlap == 0.0));
    assert!(found.by_frequency.zero_pair_share.iter().all(|share| *share > 0.999));
}
