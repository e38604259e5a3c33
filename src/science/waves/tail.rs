//! Where the computed spectrum ends and a laid-on tail begins.
//!
//! Wave models compute up to some multiple of the mean or peak frequency and fill the rest of the file with f^-4 or f^-5 and
//! the directions of the last computed bin. Sound there tests the tail's assumption, not the model.

use crate::model::DirectionalSpectrum;

/// Fewest bins that make a tail.
const LEAST_BINS: usize = 4;

/// How constant a tail must be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TailTolerance {
    /// Largest relative change of f^4 E or f^5 E along the tail.
    pub density: f64,
    /// Largest share of the energy of one frequency that lies in other directions than in the last bin.
    pub directions: f64,
}

impl Default for TailTolerance {
    fn default() -> Self {
        // Packing into 16 bits of log10 moves a density by up to 0.05 %, float32 by less; a published wind-sea law moves 1 %
        // of the energy within one or two bins.
        Self { density: 0.02, directions: 0.01 }
    }
}

/// Lowest frequency (Hz) from which on f^4 E or f^5 E, and the distribution over directions, stay constant up to the last
/// bin with energy. `None` where fewer than four bins do.
pub fn tail_start_hz(
    spectrum: DirectionalSpectrum<'_>,
    density_m2_hz: &[f64],
    tolerance: TailTolerance,
) -> Option<f64> {
    let frequency = &spectrum.axes.frequency_hz;
    let last = density_m2_hz.iter().rposition(|density| *density > 0.0)?;
    let start = [4, 5].into_iter().filter_map(|power| {
        let level = |k: usize| density_m2_hz[k] * frequency[k].powi(power);
        let top = level(last);
        let steady = |k: usize| {
            (level(k) / top - 1.0).abs() <= tolerance.density
                && moved_share(spectrum, density_m2_hz, k, last) <= tolerance.directions
        };
        let mut start = last;
        while start > 0 && steady(start - 1) {
            start -= 1;
        }
        (last + 1 - start >= LEAST_BINS).then_some(start)
    });
    start.min().map(|k| frequency[k])
}

/// Share of the energy at frequency `k` that lies elsewhere than at frequency `last`: half the integral of the absolute
/// difference of the two distributions.
fn moved_share(spectrum: DirectionalSpectrum<'_>, density: &[f64], k: usize, last: usize) -> f64 {
    let rows = spectrum.row(k).iter().zip(spectrum.row(last));
    let differences = rows.zip(&spectrum.axes.direction_width_rad);
    0.5 * differences.map(|((a, b), width)| (a / density[k] - b / density[last]).abs() * width).sum::<f64>()
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::SpreadingLaw;
    use super::super::{MomentTables, Moments, Water, WindSeaSpectrum};
    use super::*;
    use crate::model::SpectrumAxes;
    use std::f64::consts::TAU;

    fn axes() -> SpectrumAxes {
        let frequency_hz = (0..36).map(|k| 0.035 * 1.1_f64.powi(k)).collect();
        SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
    }

    /// A wind sea of 10 m/s with Banner's law, from `tail_hz` on with a frozen tail of this power.
    fn spectrum(axes: &SpectrumAxes, tail: Option<(f64, i32)>) -> Vec<f64> {
        let sea = WindSeaSpectrum::fully_developed(10.0, &Water::default());
        let computed = |f: f64| {
            let law = SpreadingLaw::DonelanBanner.at(f / sea.peak_hz, 1.0);
            axes.direction_to_rad.iter().map(move |to| sea.density_m2_hz(f) * law.per_rad(to - 1.0)).collect::<Vec<_>>()
        };
        axes.frequency_hz
            .iter()
            .flat_map(|f| match tail {
                Some((start, power)) if *f > start => {
                    computed(start).into_iter().map(|d| d * (start / f).powi(power)).collect()
                }
                _ => computed(*f),
            })
            .collect()
    }

    fn found(axes: &SpectrumAxes, densities: &[f64]) -> Option<f64> {
        let spectrum = DirectionalSpectrum::new(axes, densities).unwrap();
        let mut moments = Moments::zeros(axes.frequencies());
        MomentTables::new(axes, &Water::default()).moments(spectrum, None, &mut moments);
        tail_start_hz(spectrum, &moments.density, TailTolerance::default())
    }

    #[test]
    fn a_tail_is_found_where_it_begins_and_a_computed_sea_has_none() {
        let axes = axes();
        for start in [axes.frequency_hz[20], axes.frequency_hz[27]] {
            for power in [4, 5] {
                let densities = spectrum(&axes, Some((start, power)));
                let tail = found(&axes, &densities).unwrap();
                assert!((tail / start - 1.0).abs() < 0.11, "{power}: found {tail}, laid on from {start}");
                // Rounding to 32 bits, as files hold it, hides nothing.
                let rounded: Vec<f64> = densities.iter().map(|d| f64::from(*d as f32)).collect();
                assert_eq!(found(&axes, &rounded), Some(tail));
            }
        }
        assert_eq!(found(&axes, &spectrum(&axes, None)), None);
    }
}
