//! What directional moments alone tell of a sea: density, height, direction and spread; of the overlap only a range over
//! several shapes of the distribution. (A truncated Fourier sum goes negative, and maximum entropy invents lobes: neither is
//! used.)

use super::reduce::{from_direction_deg, peak, spread_deg};
use crate::model::{Missing, MomentSeries};

/// Energy without a direction up to this share of the whole is left out of mean directions.
const LEAST_DIRECTED_SHARE: f64 = 0.95;

/// A sea from moments; missing numbers are NaN.
#[derive(Debug, Clone, PartialEq)]
pub struct MomentSea {
    /// Significant height, m.
    pub hs_m: f64,
    /// Mean periods m0/m1, sqrt(m0/m2), m-1/m0, s.
    pub periods_s: [f64; 3],
    /// Frequency of the largest density, Hz.
    pub peak_bin_hz: f64,
    /// Mean direction that waves come from, degrees; NaN where too much energy has no direction.
    pub mean_from_deg: f64,
    /// Directional spread of the whole sea, degrees.
    pub spread_deg: f64,
    /// Density, m2/Hz.
    pub density_m2_hz: Vec<f64>,
    /// Moments r1, by frequency.
    pub r1: Vec<f64>,
    /// Moments r2 about the mean direction, by frequency.
    pub centred_r2: Vec<f64>,
    /// Mean direction from, degrees, by frequency.
    pub from_deg: Vec<f64>,
}

/// Weights of the trapezoid rule on uneven frequencies, Hz.
fn weights(frequency: &[f64]) -> Vec<f64> {
    let last = frequency.len().saturating_sub(1);
    (0..frequency.len()).map(|k| 0.5 * (frequency[(k + 1).min(last)] - frequency[k.saturating_sub(1)])).collect()
}

/// The sea at an instant, linear between two steps with these weights.
///
/// # Errors
/// The reason, where a density is missing or there is no energy.
pub fn moment_sea(series: &MomentSeries, steps: &[(usize, f64)]) -> Result<MomentSea, Missing> {
    let count = series.frequency_hz.len();
    let (mut density, mut a1, mut b1) = (vec![0.0; count], vec![0.0; count], vec![0.0; count]);
    let (mut a2, mut b2, mut directed) = (vec![0.0; count], vec![0.0; count], vec![0.0; count]);
    for (step, weight) in steps {
        let of = |column: &[f64], k: usize| series.of_step(column, *step).get(k).copied().unwrap_or(f64::NAN);
        for k in 0..count {
            let e = weight * of(&series.density_m2_hz, k);
            density[k] += e;
            let (r1, from) = (of(&series.r1, k), of(&series.mean_from_deg, k));
            if !(r1.is_finite() && from.is_finite()) {
                continue;
            }
            let (sine, cosine) = libm::sincos((from + 180.0).to_radians());
            directed[k] += e;
            a1[k] += e * r1 * cosine;
            b1[k] += e * r1 * sine;
            let (r2, principal) = (of(&series.r2, k), of(&series.principal_from_deg, k));
            let (sine, cosine) = libm::sincos(2.0 * principal.to_radians());
            a2[k] += e * r2 * cosine;
            b2[k] += e * r2 * sine;
        }
    }
    if density.iter().any(|e| e.is_nan()) {
        return Err(Missing::IncompleteSpectrum);
    }
    let weights = weights(&series.frequency_hz);
    let integral = |values: &[f64], power: i32| -> f64 {
        values.iter().zip(&weights).zip(&series.frequency_hz).map(|((v, w), f)| v * w * f.powi(power)).sum()
    };
    let m0 = integral(&density, 0);
    let (peak_bin_hz, _) = peak(&series.frequency_hz, &density).ok_or(Missing::NoEnergy)?;
    let known = integral(&directed, 0);
    let enough = known >= LEAST_DIRECTED_SHARE * m0;
    let (a, b) = (integral(&a1, 0), integral(&b1, 0));
    let over = |values: (f64, f64), e: f64| if e > 0.0 { libm::hypot(values.0, values.1) / e } else { f64::NAN };
    Ok(MomentSea {
        hs_m: 4.0 * m0.sqrt(),
        periods_s: [m0 / integral(&density, 1), (m0 / integral(&density, 2)).sqrt(), integral(&density, -1) / m0],
        peak_bin_hz,
        mean_from_deg: if enough { from_direction_deg(a, b) } else { f64::NAN },
        spread_deg: if enough { spread_deg(a, b, known) } else { f64::NAN },
        r1: (0..count).map(|k| over((a1[k], b1[k]), directed[k])).collect(),
        centred_r2: (0..count)
            .map(|k| {
                let (sine, cosine) = libm::sincos(2.0 * libm::atan2(b1[k], a1[k]));
                if directed[k] > 0.0 { (a2[k] * cosine + b2[k] * sine) / directed[k] } else { f64::NAN }
            })
            .collect(),
        from_deg: (0..count).map(|k| from_direction_deg(a1[k], b1[k])).collect(),
        density_m2_hz: density,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::Instant;

    // Closed forms: a single frequency pair of equal density 2 m2/Hz over 0.1 Hz has m0 0.2, and all energy from 90 degrees with
    // r1 = 0.5 has a spread of sqrt(2 (1 - 0.5)) = 1 rad (Kuik et al. 1988).
    #[test]
    fn plain_moments_give_plain_numbers() {
        let series = MomentSeries {
            frequency_hz: vec![0.1, 0.2],
            steps: vec![Instant(0)],
            density_m2_hz: vec![2.0, 2.0],
            mean_from_deg: vec![90.0, 90.0],
            principal_from_deg: vec![90.0, 90.0],
            r1: vec![0.5, 0.5],
            r2: vec![0.25, 0.25],
            notes: Vec::new(),
        };
        let sea = moment_sea(&series, &[(0, 1.0)]).unwrap();
        assert!((sea.hs_m - 4.0 * 0.2_f64.sqrt()).abs() < 1e-12);
        assert!((sea.mean_from_deg - 90.0).abs() < 1e-9 && (sea.spread_deg - 1f64.to_degrees()).abs() < 1e-9);
        assert!((sea.centred_r2[0] - 0.25).abs() < 1e-12);
        let missing = MomentSeries { density_m2_hz: vec![2.0, f64::NAN], ..series };
        assert_eq!(moment_sea(&missing, &[(0, 1.0)]), Err(Missing::IncompleteSpectrum));
    }
}
