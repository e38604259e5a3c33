//! How long residuals remember: block lengths, effective number of samples, independent storms.

use super::law::{Corner, Law, Parameters};
use super::record::{Cells, Record, Rows};
use super::solve::Form;
use crate::numerics::autocovariance::Autocovariance;

/// Block length in samples for a circular block bootstrap: Politis and White 2004 with the correction of Patton, Politis and
/// White 2009. At least 1.
pub(crate) fn politis_white(series: &mut Autocovariance) -> f64 {
    let count = series.count();
    if count < 10 {
        return 1.0;
    }
    let n = count as f64;
    let run = libm::log10(n).ceil().max(5.0) as usize;
    let most_lag = n.sqrt().ceil() as usize + run;
    let greatest_block = (3.0 * n.sqrt()).min(n / 3.0).ceil();
    let last_lag = (2 * most_lag).min(count - 2);
    let variance = series.at(0);
    if variance <= 0.0 {
        return 1.0;
    }
    let critical = 2.0 * (libm::log10(n) / n).sqrt() * variance;
    // First lag after which `run` autocorrelations in a row are not significant.
    let mut cut = most_lag;
    let mut quiet = 0;
    for lag in 1..=most_lag {
        if series.at(lag.min(last_lag)).abs() < critical {
            quiet += 1;
            if quiet == run {
                cut = lag - run;
                break;
            }
        } else {
            quiet = 0;
        }
    }
    let window = (2 * cut.max(1)).min(last_lag);
    let mut weighted = 0.0;
    let mut spectrum = variance;
    for lag in 1..=window {
        let taper = flat_top(lag as f64 / window as f64);
        let covariance = series.at(lag);
        weighted += 2.0 * taper * lag as f64 * covariance;
        spectrum += 2.0 * taper * covariance;
    }
    if spectrum <= 0.0 {
        return 1.0;
    }
    let ratio = 2.0 * weighted * weighted / (4.0 / 3.0 * spectrum * spectrum);
    (libm::cbrt(ratio) * libm::cbrt(n)).clamp(1.0, greatest_block.max(1.0))
}

/// Flat-top lag window: 1 up to one half, then falling to 0 at 1.
fn flat_top(share: f64) -> f64 {
    (2.0 * (1.0 - share)).clamp(0.0, 1.0)
}

/// Variance inflation of a mean by dependence, at least 1.
pub(crate) fn variance_inflation(series: &[f64]) -> f64 {
    let mut covariance = Autocovariance::new(series);
    let length = politis_white(&mut covariance);
    let window = ((4.0 * length).max(10.0)).min((series.len() / 4) as f64) as usize;
    let variance = covariance.at(0).max(1e-12);
    let sum: f64 = (1..=window).map(|lag| flat_top(lag as f64 / window as f64) * covariance.at(lag) / variance).sum();
    (1.0 + 2.0 * sum).max(1.0)
}

/// Block length in samples: the longest of the scores of floor, slope, level above the onset and of the residual itself.
pub(crate) fn block_length_samples(
    record: &Record,
    rows: &Rows,
    level_db: &[f64],
    form: &Form<'_>,
    at: &Parameters,
) -> f64 {
    let form = form.at_points();
    let knee = if matches!(form.law, Law::Knee | Law::FreeKnee) { at.bend } else { f64::INFINITY };
    let count = record.len();
    let mut scores = [(); 4].map(|()| Vec::with_capacity(count));
    for ((&x, &deployment), &level) in record.x.iter().zip(&rows.deployment_of_sample).zip(level_db) {
        let curve = form.level(at, deployment, x);
        let residual = level - curve.level_db;
        let floor_share = if form.corner == Corner::Floor { 1.0 - curve.wind_share } else { 0.0 };
        scores[0].push(residual * floor_share);
        scores[1].push(residual * curve.wind_share * x.min(knee));
        scores[2].push(if x > knee { residual } else { 0.0 });
        scores[3].push(residual);
    }
    scores.iter().map(|score| politis_white(&mut Autocovariance::new(score))).fold(1.0, f64::max)
}

/// Kish's count: the number of equal parts that would be as informative as these shares, (sum n)^2 / sum n^2.
pub(crate) fn kish_count(shares: &[f64]) -> f64 {
    let sum: f64 = shares.iter().sum();
    let squares: f64 = shares.iter().map(|share| share * share).sum();
    if sum > 0.0 { sum * sum / squares } else { 0.0 }
}

/// Which side of a wind speed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Side {
    Below,
    Above,
}

/// Kish's count of blocks with winds on one side of x.
pub(crate) fn independent_storms(record: &Record, cells: &Cells, x: f64, side: Side) -> f64 {
    let mut shares = vec![0.0; cells.count];
    for (&cell, &value) in cells.of_sample.iter().zip(&record.x) {
        let counts = match side {
            Side::Below => value < x,
            Side::Above => value > x,
        };
        if counts {
            shares[cell] += 1.0;
        }
    }
    kish_count(&shares)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn kish_counts_equal_shares() {
        assert!((kish_count(&[2.0, 2.0, 0.0, 2.0]) - 3.0).abs() < 1e-12);
        assert!(kish_count(&[]).abs() < 1e-12);
    }

    #[test]
    fn white_noise_needs_short_blocks_and_slow_noise_long_ones() {
        // A fixed pseudo-random series (multiplicative congruence), and its first-order autoregression.
        let mut state = 12_345_u64;
        let mut previous = 0.0;
        let (mut white, mut slow) = (Vec::new(), Vec::new());
        for _ in 0..4000 {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            let noise = (state >> 11) as f64 / (1_u64 << 53) as f64 - 0.5;
            previous = 0.95 * previous + noise;
            white.push(noise);
            slow.push(previous);
        }
        assert!(politis_white(&mut Autocovariance::new(&white)) < 6.0);
        assert!(politis_white(&mut Autocovariance::new(&slow)) > 30.0);
        // A first-order autoregression with coefficient 0.95 has (1 + 0.95) / (1 - 0.95) = 39 times the variance.
        let inflation = variance_inflation(&slow);
        assert!((20.0..70.0).contains(&inflation), "{inflation}");
        assert!(variance_inflation(&white) < 1.5);
    }
}
