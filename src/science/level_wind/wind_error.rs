//! What a random error of the wind speed does to the estimates, and a correction for a known size of that error.
//!
//! Observed wind = true wind + normal error of a known standard deviation (a classical error). `P[b, k]`, the probability of true
//! wind k given observed class b, follows from the observed distribution by Richardson-Lucy steps (Richardson 1972; Lucy
//! 1974), and the mean level of a class is `sum_k P[b, k] f(u_k)` (Carroll et al. 2006 for the setting). The size of the error
//! must come from elsewhere: a wind error and a random floor round the corner in the same way.

use super::fits::Band;
use super::law::{BIN_HIGH, BIN_LOW, BIN_WIDTH, BINS, Corner, GREATEST_SLOPE, Law, Parameters, wind_of};
use super::normal::Linearised;
use super::options::Options;
use super::point::{PointFit, check};
use super::record::Record;
use super::solve::{Form, RowMeans};
use crate::model::WindErrorEstimate;
use crate::numerics::quantile::quantile;
use crate::numerics::symmetric::Symmetric;

/// Plain estimates of the fit with floor and knee, and the corrected ones for 0.75, 1 and 1.25 times
/// `options.wind_error_sd_m_s`. `None` without that size, or where nothing can be fitted.
pub fn correct_for_wind_error(
    times_ms: &[i64],
    wind_speed_m_s: &[f64],
    levels_db: &[f64],
    deployment: Option<&[u32]>,
    options: &Options,
) -> Option<[WindErrorEstimate; 4]> {
    let sd = options.wind_error_sd_m_s.filter(|sd| *sd > 0.0 && sd.is_finite())?;
    let record = Record::new(times_ms, wind_speed_m_s, levels_db, deployment);
    check(&record).ok()?;
    let fit = PointFit::new(record, options);
    let estimate = |sd: f64, at: &Parameters| WindErrorEstimate {
        wind_error_sd_m_s: sd,
        floor_db: at.floor_db.clone(),
        wind_component_at_10_m_s_db: at.wind_db.clone(),
        slope_db_per_decade: at.slope,
        onset_m_s: wind_of(at.bend),
    };
    let corrected = |share: f64| {
        let mixing = Mixing::new(&fit.band, share * sd);
        estimate(share * sd, &mixing.fit(&fit.band, &fit.at))
    };
    Some([estimate(0.0, &fit.at), corrected(0.75), corrected(1.0), corrected(1.25)])
}

/// True winds stand on a grid twice as fine as the classes.
const TRUE_WINDS: usize = 2 * BINS;

/// Probability of each true wind given the observed class.
struct Mixing {
    /// x of the true winds.
    x: Vec<f64>,
    /// By class: probability of each true wind.
    share: Vec<Vec<f64>>,
}

impl Mixing {
    fn new(band: &Band, sd_m_s: f64) -> Self {
        const STEPS: usize = 60;
        let x: Vec<f64> = (0..TRUE_WINDS)
            .map(|index| BIN_LOW + (BIN_HIGH - BIN_LOW) * (index as f64 + 0.5) / TRUE_WINDS as f64)
            .collect();
        let winds: Vec<f64> = x.iter().map(|&x| wind_of(x)).collect();
        let mut counts = vec![0.0; BINS];
        band.record.bin.iter().for_each(|&bin| counts[bin] += 1.0);
        // Probability of each class given the true wind; the outer classes take the tails.
        let kernel: Vec<Vec<f64>> = (0..BINS)
            .map(|bin| {
                let low = if bin == 0 { f64::NEG_INFINITY } else { wind_of(BIN_LOW + BIN_WIDTH * bin as f64) };
                let high =
                    if bin == BINS - 1 { f64::INFINITY } else { wind_of(BIN_LOW + BIN_WIDTH * (bin + 1) as f64) };
                winds.iter().map(|wind| normal((high - wind) / sd_m_s) - normal((low - wind) / sd_m_s)).collect()
            })
            .collect();
        let total: f64 = counts.iter().sum();
        let mut density = vec![1.0 / TRUE_WINDS as f64; TRUE_WINDS];
        for _ in 0..STEPS {
            let mut next = vec![0.0; TRUE_WINDS];
            for (count, row) in counts.iter().zip(&kernel).filter(|(count, _)| **count > 0.0) {
                let expected: f64 = row.iter().zip(&density).map(|(k, p)| k * p).sum();
                let ratio = count / total / expected.max(1e-300);
                next.iter_mut().zip(row).for_each(|(next, k)| *next += k * ratio);
            }
            density.iter_mut().zip(next).for_each(|(density, factor)| *density *= factor);
        }
        let share = kernel
            .iter()
            .map(|row| {
                let joint: Vec<f64> = row.iter().zip(&density).map(|(k, p)| k * p).collect();
                let sum: f64 = joint.iter().sum::<f64>().max(1e-300);
                joint.iter().map(|value| value / sum).collect()
            })
            .collect();
        Self { x, share }
    }

    /// Weighted least squares of the mixed curve to the row means, from several onsets.
    fn fit(&self, band: &Band, start: &Parameters) -> Parameters {
        let mut best = (f64::INFINITY, start.clone());
        for share in [-1.0, 0.1, 0.4, 0.7, 0.95] {
            let mut at = start.clone();
            if share >= 0.0 {
                at.bend = quantile(&band.onsets, share);
            }
            let sum_squares = self.descend(band, &mut at);
            if sum_squares < best.0 {
                best = (sum_squares, at);
            }
        }
        best.1
    }

    /// Damped Gauss-Newton steps within the bounds.
    fn descend(&self, band: &Band, at: &mut Parameters) -> f64 {
        const STEPS: usize = 60;
        let mut damping = 1e-3;
        let (mut current, mut square, mut gradient) = self.normal(band, at);
        for _ in 0..STEPS {
            let mut accepted = false;
            for _ in 0..8 {
                let mut matrix = square.clone();
                for index in 0..matrix.size() {
                    matrix.add(index, index, damping * square.get(index, index) + 1e-9);
                }
                if let Some(step) = matrix.solve(&gradient) {
                    let trial = stepped(band, at, &step);
                    let next = self.normal(band, &trial);
                    if next.0 <= current {
                        let gain = current - next.0;
                        (current, square, gradient) = next;
                        *at = trial;
                        damping *= 0.15;
                        accepted = gain > 1e-9 * current;
                        break;
                    }
                }
                damping = damping * 8.0 + 1e-6;
            }
            if !accepted {
                break;
            }
        }
        current
    }

    /// Sum of squares, normal matrix and gradient of the mixed curve; parameters in the order of [`stepped`].
    fn normal(&self, band: &Band, at: &Parameters) -> (f64, Symmetric, Vec<f64>) {
        let deployments = band.rows.deployments();
        let form = band.form(Law::Knee, Corner::Floor);
        let size = 2 * deployments + 2;
        let (mut sum, mut square, mut gradient) = (0.0, Symmetric::zeros(size), vec![0.0; size]);
        let row_deployment = band.rows.deployment_of_row();
        for deployment in 0..deployments {
            let curve = self.curve(&form, at, deployment);
            for row in (0..band.rows.len()).filter(|&row| row_deployment[row] == deployment) {
                let share = &self.share[band.rows.bin[row]];
                let mixed = |values: &[f64]| -> f64 { share.iter().zip(values).map(|(p, value)| p * value).sum() };
                // `residual_db` is minus the curve, since the levels were zero.
                let off = band.row_level_db[row] + mixed(&curve.residual_db);
                let weight = band.rows.count[row] * band.rows.weight[row];
                sum += weight * off * off;
                let by = [
                    (deployment, mixed(&curve.columns[0])),
                    (deployments + deployment, mixed(&curve.columns[1])),
                    (2 * deployments, mixed(&curve.columns[2])),
                    (2 * deployments + 1, mixed(&curve.columns[3])),
                ];
                for (index, &(row, a)) in by.iter().enumerate() {
                    gradient[row] += weight * a * off;
                    for &(column, b) in &by[..=index] {
                        square.add(row, column, weight * a * b);
                    }
                }
            }
        }
        (sum, square, gradient)
    }

    /// The curve of a deployment at the true winds.
    fn curve(&self, form: &Form<'_>, at: &Parameters, deployment: usize) -> Linearised {
        let zeros = vec![0.0; self.x.len()];
        let one =
            Parameters { floor_db: vec![at.floor_db[deployment]], wind_db: vec![at.wind_db[deployment]], ..at.clone() };
        let rows = RowMeans { starts: &[0, self.x.len()], weight: &zeros, x: &self.x, level_db: &zeros };
        let mut curve = Linearised::default();
        curve.fill(&rows, &Form { width: 0.5 * BIN_WIDTH, ..*form }, &one);
        curve
    }
}

fn stepped(band: &Band, at: &Parameters, step: &[f64]) -> Parameters {
    let deployments = at.floor_db.len();
    let mut next = at.clone();
    for index in 0..deployments {
        next.floor_db[index] = (at.floor_db[index] + step[index]).max(band.least_floor_db);
        next.wind_db[index] += step[deployments + index];
    }
    next.slope = (at.slope + step[2 * deployments]).clamp(0.0, GREATEST_SLOPE);
    let (low, high) = (band.onsets.first(), band.onsets.last());
    if let (Some(&low), Some(&high)) = (low, high) {
        next.bend = (at.bend + step[2 * deployments + 1]).clamp(low, high);
    }
    next
}

/// Distribution function of the standard normal variable.
fn normal(z: f64) -> f64 {
    0.5 * libm::erfc(-z / std::f64::consts::SQRT_2)
}
