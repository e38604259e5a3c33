//! A sea that follows the wind, with a stated law of spreading, and the sound that it radiates.
//!
//! The wind sea is that of a fully developed sea under a wind that lags behind the real one, so it veers with it and is always
//! one system. A steady swell may come with it. Integrals over band and directions are fine sums of their own, not the
//! tables that comparisons use.

use crate::model::{Band, SpectrumAxes};
use crate::science::waves::{Distribution, Radiator, SpreadingLaw, WindSeaSpectrum};
use serde::{Deserialize, Serialize};
use std::f64::consts::TAU;

/// Winds below this make the same sea, m/s.
const LEAST_SEA_WIND_M_S: f64 = 1.5;

/// `[simulate.sea]`: how the sea follows the wind and spreads.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct SeaSettings {
    /// Law of spreading of the sea.
    pub law: SpreadingLaw,
    /// How much narrower (above 1) or wider (below 1) the written spectra are than the sea that is heard: a factor in the
    /// inverse variance of the directions.
    pub model_narrowing: f64,
    /// Constant error of the written density, dB.
    pub model_density_error_db: f64,
    /// The sea follows the wind with this time constant, h.
    pub lag_h: f64,
    /// Significant height of the swell, m; 0 for none.
    pub swell_hs_m: f64,
    /// Peak frequency of the swell, Hz.
    pub swell_peak_hz: f64,
    /// Direction the swell comes from, degrees.
    pub swell_from_deg: f64,
    /// The written spectra end in an f^-5 tail with frozen directions from this multiple of the wind sea's mean frequency (m0 / m-1)
    /// on;
    /// absent: no tail.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub tail_after_mean: Option<f64>,
}

impl Default for SeaSettings {
    fn default() -> Self {
        Self {
            law: SpreadingLaw::DonelanBanner,
            model_narrowing: 1.0,
            model_density_error_db: 0.0,
            lag_h: 3.0,
            swell_hs_m: 0.0,
            swell_peak_hz: 0.08,
            swell_from_deg: 240.0,
            tail_after_mean: None,
        }
    }
}

/// The wind sea at one step.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SeaStep {
    /// Its frequency spectrum.
    pub spectrum: WindSeaSpectrum,
    /// Its mean direction of travel, rad clockwise from true north.
    pub to_rad: f64,
}

/// Mean frequency m0 / m-1, to which wave models tie their tails, over the peak frequency of a Pierson-Moskowitz spectrum:
/// (5/4)^(1/4) / Gamma(5/4) (closed form).
pub const MEAN_OVER_PEAK: f64 = 1.166_5;

/// The wind sea at every step of a wind (components in m/s towards east and north, equal steps): a first-order lag of the
/// components. Steps without wind keep the sea as it was.
pub fn sea_steps(
    eastward_m_s: &[f64],
    northward_m_s: &[f64],
    step_h: f64,
    settings: &SeaSettings,
    radiator: &Radiator,
) -> Vec<SeaStep> {
    let fresh = 1.0 - libm::exp(-step_h / settings.lag_h.max(1e-6));
    let mut lagged: Option<(f64, f64)> = None;
    eastward_m_s
        .iter()
        .zip(northward_m_s)
        .map(|(east, north)| {
            if east.is_finite() && north.is_finite() {
                lagged =
                    Some(lagged.map_or((*east, *north), |(u, v)| (u + fresh * (east - u), v + fresh * (north - v))));
            }
            let (u, v) = lagged.unwrap_or((0.0, LEAST_SEA_WIND_M_S));
            let wind_m_s = libm::hypot(u, v).max(LEAST_SEA_WIND_M_S);
            SeaStep {
                spectrum: WindSeaSpectrum::fully_developed(wind_m_s, &radiator.water),
                to_rad: libm::atan2(u, v).rem_euclid(TAU),
            }
        })
        .collect()
}

/// Directions of wind sea and swell at one frequency, with their densities, m2/Hz.
struct Mixture {
    wind_sea: (f64, Distribution, f64),
    swell: (f64, Distribution, f64),
}

impl Mixture {
    fn at(step: &SeaStep, settings: &SeaSettings, narrowing: f64, wave_hz: f64) -> Self {
        let x = wave_hz / step.spectrum.peak_hz;
        let law = settings.law.at(x.min(settings.law.reaches_to()), 1.0).narrowed(narrowing);
        let swell = WindSeaSpectrum { alpha: 1.0, peak_hz: settings.swell_peak_hz, gamma: 3.3, ..step.spectrum };
        // m0 with this enhancement is 1.525 times that without (numerical integral).
        let scale = settings.swell_hs_m * settings.swell_hs_m / 16.0 / (1.525 * swell.m0_without_enhancement_m2());
        Self {
            wind_sea: (step.spectrum.density_m2_hz(wave_hz), law, step.to_rad),
            swell: (
                scale * swell.density_m2_hz(wave_hz),
                Distribution::CosinePower { s: 15.0 },
                (settings.swell_from_deg + 180.0).to_radians(),
            ),
        }
    }

    /// Density towards a direction, m2/Hz/rad.
    fn density(&self, to_rad: f64) -> f64 {
        [&self.wind_sea, &self.swell]
            .into_iter()
            .filter(|(density, ..)| *density > 0.0)
            .map(|(density, law, mean)| density * law.per_rad(to_rad - mean))
            .sum()
    }
}

/// The spectrum that the model writes for a step, m2/Hz/rad, frequency by frequency: with the settings' error of density and
/// spreading, and its tail.
pub fn model_spectrum(step: &SeaStep, settings: &SeaSettings, axes: &SpectrumAxes, out: &mut [f64]) {
    let error = libm::pow(10.0, 0.1 * settings.model_density_error_db);
    let tail_hz =
        settings.tail_after_mean.map_or(f64::INFINITY, |after| after * MEAN_OVER_PEAK * step.spectrum.peak_hz);
    let mut last_computed = axes.frequency_hz[0];
    for (frequency, row) in axes.frequency_hz.iter().zip(out.chunks_exact_mut(axes.directions())) {
        if *frequency <= tail_hz {
            last_computed = *frequency;
        }
        let fall = libm::pow(last_computed / frequency, 5.0);
        let mixture = Mixture::at(step, settings, settings.model_narrowing, last_computed);
        for (density, to) in row.iter_mut().zip(&axes.direction_to_rad) {
            *density = error * fall * mixture.density(*to);
        }
    }
}

/// Band level that the sea of each step radiates, dB re 1 uPa^2.
pub fn radiated_levels_db(steps: &[SeaStep], settings: &SeaSettings, band: Band, radiator: &Radiator) -> Vec<f64> {
    const PARTS: usize = 10;
    const HALF_CIRCLE: usize = 36;
    let width_hz = band.width_hz() / PARTS as f64;
    let step_rad = std::f64::consts::PI / HALF_CIRCLE as f64;
    steps
        .iter()
        .map(|step| {
            let power: f64 = (0..PARTS)
                .map(|part| {
                    let sound_hz = band.low_hz + (part as f64 + 0.5) * width_hz;
                    let mixture = Mixture::at(step, settings, 1.0, 0.5 * sound_hz);
                    let overlap: f64 = (0..HALF_CIRCLE)
                        .map(|i| {
                            let to = i as f64 * step_rad;
                            2.0 * mixture.density(to) * mixture.density(to + std::f64::consts::PI) * step_rad
                        })
                        .sum();
                    radiator.density_pa2_hz(sound_hz, overlap) * width_hz
                })
                .sum();
            10.0 * libm::log10(1e12 * power)
        })
        .collect()
}

/// Adds what the sea radiates to levels in power, dB; `offset_db` is what the site's bottom adds. A NaN level stays NaN.
pub fn add_radiated(level_db: &mut [f64], radiated_db: &[f64], offset_db: f64) {
    for (level, radiated) in level_db.iter_mut().zip(radiated_db) {
        let sum = libm::pow(10.0, 0.1 * *level) + libm::pow(10.0, 0.1 * (radiated + offset_db));
        *level = 10.0 * libm::log10(sum);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::DirectionalSpectrum;
    use crate::science::waves::{BandSettings, Opposing, RadiatedBands, ReduceOptions, Reducer, Water};

    fn axes() -> SpectrumAxes {
        let frequency_hz = (0..36).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
        SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
    }

    // Closed forms: full development gives Hs = 0.2092 (1.0602 U)^2 / g; the direction is that of the wind.
    #[test]
    fn the_written_sea_has_the_height_and_direction_of_its_wind() {
        let (axes, settings, radiator) = (axes(), SeaSettings::default(), Radiator::default());
        let steps = sea_steps(&[10.0; 30], &[0.0; 30], 1.0, &settings, &radiator);
        let mut density = vec![0.0; axes.cells()];
        model_spectrum(&steps[29], &settings, &axes, &mut density);
        let reducer = Reducer::new(&axes, &Water::default(), ReduceOptions::default());
        let state = reducer.sea_state(DirectionalSpectrum::new(&axes, &density).unwrap(), None).unwrap();
        assert!((state.hs_m - 2.40).abs() < 0.02, "{}", state.hs_m);
        assert!((state.mean_from_deg - 270.0).abs() < 1e-6, "{}", state.mean_from_deg);
        assert_eq!(state.tail_start_hz, None);
    }

    #[test]
    fn the_sea_lags_behind_the_wind() {
        let mut east = vec![5.0; 20];
        east.extend([10.0; 20]);
        let steps = sea_steps(&east, &[0.0; 40], 1.0, &SeaSettings::default(), &Radiator::default());
        let at = |hour: usize| steps[hour].spectrum.peak_hz;
        // One time constant (3 h) after the step the sea is that of 5 + 5 (1 - 1/e) = 8.161 m/s.
        let wind = WindSeaSpectrum::fully_developed(8.161, &Water::default());
        assert!((at(22) / wind.peak_hz - 1.0).abs() < 1e-3);
        assert!(at(19) > at(20) && at(20) > at(39));
    }

    /// Two ways to the same level: the fine sums of the simulation, and the tables of the comparison.
    #[test]
    fn what_is_heard_is_what_the_written_spectrum_radiates() {
        let (axes, radiator) = (axes(), Radiator::default());
        let settings = SeaSettings { swell_hs_m: 1.0, swell_peak_hz: 0.15, ..SeaSettings::default() };
        let steps = sea_steps(&[6.0; 10], &[3.0; 10], 1.0, &settings, &radiator);
        let band = Band::from_edges(0.9, 1.15).unwrap();
        let heard = radiated_levels_db(&steps, &settings, band, &radiator)[9];
        let mut density = vec![0.0; axes.cells()];
        model_spectrum(&steps[9], &settings, &axes, &mut density);
        let table = Opposing::new(&axes);
        let source: Vec<f64> = density.chunks_exact(36).map(|row| table.own(row)).collect();
        let mut out = [Err(crate::model::NotRadiated::NoSpectrum)];
        RadiatedBands::new(&axes, &radiator, &[band], BandSettings::default()).levels(&source, None, &mut out);
        let radiated = out[0].unwrap().band_level_db;
        assert!((heard - radiated).abs() < 0.1, "{heard} {radiated}");
    }

    #[test]
    fn the_tail_is_found_again_and_a_narrower_model_radiates_less() {
        let (axes, radiator) = (axes(), Radiator::default());
        let settings = SeaSettings { tail_after_mean: Some(2.5), ..SeaSettings::default() };
        let steps = sea_steps(&[9.0; 4], &[0.0; 4], 1.0, &settings, &radiator);
        let mut density = vec![0.0; axes.cells()];
        model_spectrum(&steps[3], &settings, &axes, &mut density);
        let reducer = Reducer::new(&axes, &Water::default(), ReduceOptions::default());
        let state = reducer.sea_state(DirectionalSpectrum::new(&axes, &density).unwrap(), None).unwrap();
        let expected = 2.5 * MEAN_OVER_PEAK * steps[3].spectrum.peak_hz;
        let found = state.tail_start_hz.unwrap();
        assert!(found <= expected * 1.01 && found > expected / 1.22, "{found} {expected}");

        let mut narrow = vec![0.0; axes.cells()];
        model_spectrum(&steps[3], &SeaSettings { model_narrowing: 3.0, ..settings }, &axes, &mut narrow);
        let table = Opposing::new(&axes);
        let at = |density: &[f64]| table.own(&density[20 * 36..21 * 36]);
        assert!(at(&narrow) < 0.1 * at(&density));
    }

    // Physics reference: 2.5 times the mean frequency is 0.75, 0.38 and 0.25 Hz at 5, 10 and 15 m/s.
    #[test]
    fn the_tail_begins_where_wave_models_begin_it() {
        for (wind_m_s, start_hz) in [(5.0, 0.75), (10.0, 0.38), (15.0, 0.25)] {
            let sea = WindSeaSpectrum::fully_developed(wind_m_s, &Water::default());
            assert!((2.5 * MEAN_OVER_PEAK * sea.peak_hz - start_hz).abs() < 0.006);
        }
    }

    #[test]
    fn powers_add() {
        let mut level = [60.0, f64::NAN];
        add_radiated(&mut level, &[57.0, 57.0], 3.0);
        assert!((level[0] - 63.010_299_957).abs() < 1e-8 && level[1].is_nan());
    }
}
