//! The sea at half of each band's frequency, and what it radiates there.

use super::radiated::RadiatedBands;
use super::window_sea::WindowSea;
use crate::model::{Band, BandSea, CROSS_SHARE_LIMIT, NotRadiated, Radiated, RadiationFlag, SpectrumAxes};

/// The same frequency, as a share.
const SAME_FREQUENCY: f64 = 1e-4;

/// A number at a frequency: that of the bin where there is one, else between its neighbours along a straight line in log-log
/// (plainly where one of them is zero). `None` outside the axis.
pub fn at_frequency(axes: &SpectrumAxes, values: &[f64], hz: f64) -> Option<f64> {
    let frequency = &axes.frequency_hz;
    let after = frequency.partition_point(|f| *f < hz);
    for k in [after.saturating_sub(1), after.min(frequency.len() - 1)] {
        if (frequency[k] / hz - 1.0).abs() < SAME_FREQUENCY {
            return Some(values[k]);
        }
    }
    if after == 0 || after == frequency.len() {
        return None;
    }
    let (a, b) = (values[after - 1], values[after]);
    let (low, high) = (frequency[after - 1], frequency[after]);
    if a > 0.0 && b > 0.0 {
        let share = libm::log(hz / low) / libm::log(high / low);
        return Some(libm::exp(libm::log(a) + share * (libm::log(b) - libm::log(a))));
    }
    let share = (hz - low) / (high - low);
    Some(a + share * (b - a))
}

/// The bands of one window, in order, appended to `out`. `room` holds one radiated level a band.
pub fn band_seas(
    sea: &WindowSea,
    axes: &SpectrumAxes,
    bands: &[Band],
    radiating: &mut RadiatedBands,
    room: &mut Vec<Radiated>,
    out: &mut Vec<BandSea>,
) {
    let source = sea.source();
    room.clear();
    // Bands beyond those that radiate (they rise in frequency) have no level.
    room.resize(bands.len(), Err(NotRadiated::BeyondFrequencies));
    radiating.levels(&source, sea.state.tail_start_hz, room);
    let fp = sea.state.wind_sea.map_or(f64::NAN, |wind_sea| wind_sea.peak_hz);
    for (band, radiated) in bands.iter().zip(room.iter()) {
        let hz = 0.5 * band.centre_hz;
        let at = |values: &[f64]| at_frequency(axes, values, hz).unwrap_or(f64::NAN);
        let density = at(&sea.state.by_frequency.density_m2_hz);
        let nearest = WindowSea::nearest_frequency(&axes.frequency_hz, &axes.frequency_edges_hz, hz);
        let cross_share = nearest.map_or(f64::NAN, |k| sea.overlap[k].cross_share());
        let zeros = nearest.map_or(0.0, |k| sea.zero_pair_share[k]);
        let radiated = radiated.map(|level| {
            level
                .flag_if(cross_share > CROSS_SHARE_LIMIT, RadiationFlag::Blended)
                .flag_if(zeros > 0.0, RadiationFlag::LowerBound)
        });
        out.push(BandSea {
            f_over_fp: hz / fp,
            density_m2_hz: density,
            overlap_2pi_per_rad: at(&source) / (density * density),
            cross_share,
            radiated,
        });
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    // Closed form: a power law is a straight line in log-log.
    #[test]
    fn a_power_law_is_met_between_bins() {
        let axes = SpectrumAxes::new(vec![0.1, 0.2, 0.4], None, vec![0.0, 1.5, 3.0, 4.5]).unwrap();
        let values: Vec<f64> = axes.frequency_hz.iter().map(|f| f.powi(-5)).collect();
        let found = at_frequency(&axes, &values, 0.3).unwrap();
        assert!((found / 0.3_f64.powi(-5) - 1.0).abs() < 1e-12);
        assert_eq!(at_frequency(&axes, &values, 0.05), None);
        assert!((at_frequency(&axes, &[0.0, 2.0, 0.0], 0.15).unwrap() - 1.0).abs() < 1e-12);
        assert_eq!(at_frequency(&axes, &[7.0, 2.0, 0.0], 0.100_001), Some(7.0));
    }
}
