//! Robust fit by pseudo-values: z = f + s psi(r / s) / mean psi', refitted by least squares until it settles (Huber 1981).

use super::fits::{Band, Starts};
use super::law::{Corner, Law, Parameters};
use super::options::Loss;
use crate::numerics::quantile::median;

/// Whether the iteration came to rest.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Settled {
    Yes,
    No,
}

/// Iterates pseudo-values and fit; the band ends with the pseudo-values of the last fit.
pub(crate) fn settle(band: &mut Band, at: &mut Parameters, loss: Loss) -> Settled {
    const ITERATIONS: usize = 12;
    const TOLERANCE: f64 = 1e-4;
    let (law, corner) = (Law::Knee, Corner::Floor);
    let mut settled = Settled::No;
    for iteration in 0..ITERATIONS {
        let scale = sample_scale_db(band, law, at);
        let levels = pseudo_values(band, law, corner, at, &scale, loss);
        band.set_levels(levels);
        let before = at.clone();
        // A full search now and then, so that a better onset is not missed.
        if iteration == 0 || iteration == 6 {
            let starts = if iteration == 0 { Starts::AndLine } else { Starts::Given };
            *at = band.fit(law, corner, at, starts).at;
        } else {
            band.polish(law, corner, at);
        }
        if at.distance(&before) < TOLERANCE || (loss == Loss::LeastSquares && iteration > 0) {
            settled = Settled::Yes;
            break;
        }
    }
    let scale = sample_scale_db(band, law, at);
    let levels = pseudo_values(band, law, corner, at, &scale, loss);
    band.set_levels(levels);
    settled
}

/// Fits another law robustly, with pseudo-values about its own curve; the scale at every sample is given.
pub(crate) fn settle_law(
    band: &Band,
    law: Law,
    corner: Corner,
    start: &Parameters,
    scale_db: &[f64],
    loss: Loss,
) -> Parameters {
    const ITERATIONS: usize = 30;
    const TOLERANCE: f64 = 1e-9;
    let mut own = band.clone();
    let mut at = start.clone();
    for _ in 0..ITERATIONS {
        let levels = pseudo_values(&own, law, corner, &at, scale_db, loss);
        own.set_levels(levels);
        let before = at.clone();
        own.polish(law, corner, &mut at);
        if at.distance(&before) < TOLERANCE {
            break;
        }
    }
    at
}

/// Scale of the scatter at every sample, dB.
pub(crate) fn sample_scale_db(band: &Band, law: Law, at: &Parameters) -> Vec<f64> {
    band.rows.sample_excess(&band.record, law, at).iter().map(|&excess| band.table.scale_at(excess)).collect()
}

/// Pseudo-values of the levels about a fit.
pub(crate) fn pseudo_values(
    band: &Band,
    law: Law,
    corner: Corner,
    at: &Parameters,
    scale_db: &[f64],
    loss: Loss,
) -> Vec<f64> {
    /// Least mean of psi': below it the loss would hardly see the data.
    const LEAST_MEAN_SLOPE: f64 = 0.1;
    let fitted = band.fitted(law, corner, at);
    let mut slopes = 0.0;
    let mut values: Vec<f64> = Vec::with_capacity(fitted.len());
    for ((&level, &fitted), &scale) in band.record.level_db.iter().zip(&fitted).zip(scale_db) {
        let (psi, slope) = loss.psi((level - fitted) / scale);
        slopes += slope;
        values.push(psi);
    }
    let mean_slope = (slopes / values.len().max(1) as f64).max(LEAST_MEAN_SLOPE);
    for ((value, fitted), scale) in values.iter_mut().zip(&fitted).zip(scale_db) {
        *value = fitted + scale * *value / mean_slope;
    }
    values
}

/// Huber's loss of a residual in units of the scale.
pub(crate) fn huber(residual: f64) -> f64 {
    const LIMIT: f64 = 1.345;
    let off = residual.abs();
    if off < LIMIT { 0.5 * off * off } else { LIMIT * off - 0.5 * LIMIT * LIMIT }
}

/// Robust scale of the residuals of the levels, 1.4826 times their median absolute value (consistent for normal scatter),
/// at least 0.1 dB.
pub(crate) fn residual_scale_db(band: &Band, law: Law, corner: Corner, at: &Parameters) -> f64 {
    const LEAST_SCALE_DB: f64 = 0.1;
    let absolute: Vec<f64> =
        band.record.level_db.iter().zip(band.fitted(law, corner, at)).map(|(level, fit)| (level - fit).abs()).collect();
    (1.4826 * median(&absolute)).max(LEAST_SCALE_DB)
}
