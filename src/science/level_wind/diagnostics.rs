//! Does the fit describe the band? Spread by wind class against the scatter model, scale over wind, flattened weights.

use super::bootstrap::{Replicate, values_of};
use super::corner::{OUTLIERS_DB, Scatter, floor_nodes, power_sum_db};
use super::fits::Band;
use super::law::{BIN_WIDTH, Corner, Law, Parameters};
use super::point::PointFit;
use super::solve::{RowMeans, Solver, Stop};
use crate::model::WindClassSummary;
use crate::numerics::quantile::median;

/// 10 and 90 % quantiles of level minus floor that a scatter model predicts at W - F = d, dB.
pub(crate) fn predicted_quantiles_db(scatter: &Scatter, excess_db: f64) -> [f64; 2] {
    /// Nodes of the wind part in its standard deviations (three-point Gauss-Hermite).
    const WIND_NODES: [(f64, f64); 3] =
        [(-1.732_050_807_568_877_2, 1.0 / 6.0), (0.0, 2.0 / 3.0), (1.732_050_807_568_877_2, 1.0 / 6.0)];
    /// Outliers rarer than this do not move a 10 % quantile.
    const NEGLIGIBLE_SHARE: f64 = 2e-3;
    let winds: &[(f64, f64)] = if scatter.wind_sd_db > 0.0 { &WIND_NODES } else { &[(0.0, 1.0)] };
    let mut nodes = Vec::new();
    for (floor, floor_weight) in floor_nodes(scatter) {
        for (wind, wind_weight) in winds {
            nodes.push((power_sum_db(floor, excess_db + scatter.wind_sd_db * wind), floor_weight * wind_weight));
        }
    }
    let cumulative = |level: f64| -> f64 {
        nodes
            .iter()
            .map(|(node, weight)| {
                let tail = |shift: f64| {
                    let z = (level - node - shift) / scatter.total_sd_db.max(0.1);
                    0.5 * libm::erfc(-z / std::f64::consts::SQRT_2)
                };
                if scatter.outlier_share < NEGLIGIBLE_SHARE {
                    return weight * tail(0.0);
                }
                let outliers: f64 = OUTLIERS_DB.iter().map(|shift| tail(*shift)).sum();
                let share = scatter.outlier_share;
                weight * ((1.0 - share) * tail(0.0) + share * outliers / OUTLIERS_DB.len() as f64)
            })
            .sum()
    };
    [0.1, 0.9].map(|probability| {
        let centre = power_sum_db(0.0, excess_db);
        let (mut low, mut high) = (centre - 40.0, centre + 60.0);
        for _ in 0..16 {
            let middle = 0.5 * (low + high);
            if cumulative(middle) < probability { low = middle } else { high = middle }
        }
        0.5 * (low + high)
    })
}

/// Writes the predicted quantiles into the wind classes and says in which share of them the spread of the levels differs: the
/// share of samples below the 10 % or above the 90 % quantile is more than three standard errors off. Classes with few
/// independent samples are not judged. `NaN` when none is.
pub(crate) fn compare_spread(fit: &PointFit, classes: &mut [WindClassSummary]) -> f64 {
    /// Fewest effectively independent samples in a class that is judged.
    const LEAST_SAMPLES: f64 = 10.0;
    const STANDARD_ERRORS: f64 = 3.0;
    let band = &fit.band;
    if band.rows.deployments() > 1 {
        return f64::NAN;
    }
    let scatter = band.table.scatter;
    let (mut judged, mut off) = (0.0, 0.0);
    for class in classes.iter_mut() {
        let x = super::law::x_of(class.wind_speed_m_s);
        let excess = band_excess(band, &fit.at, x);
        let centre = band.form(Law::Knee, Corner::Floor).at_points().level(&fit.at, 0, x).level_db;
        let [low, high] = predicted_quantiles_db(&scatter, excess).map(|level| level + fit.at.floor_db[0]);
        class.predicted_quantile_10_db = Some(low);
        class.predicted_quantile_90_db = Some(high);
        let (mut count, mut below, mut above) = (0.0, 0.0, 0.0);
        for (&sample_x, &level) in band.record.x.iter().zip(&band.record.level_db) {
            if (sample_x - x).abs() <= BIN_WIDTH {
                // About the fitted curve, so that the slope within the class does not count as spread.
                let here = band.form(Law::Knee, Corner::Floor).at_points().level(&fit.at, 0, sample_x).level_db;
                let moved = level - here + centre;
                count += 1.0;
                below += f64::from(u8::from(moved < low));
                above += f64::from(u8::from(moved > high));
            }
        }
        let effective = count / fit.inflation;
        if effective >= LEAST_SAMPLES {
            let allowed = STANDARD_ERRORS * (0.1 * 0.9 / effective).sqrt();
            let differs = |share: f64| (share / count - 0.1).abs() > allowed;
            judged += 1.0;
            off += f64::from(u8::from(differs(below) || differs(above)));
        }
    }
    off / judged
}

fn band_excess(band: &Band, at: &Parameters, x: f64) -> f64 {
    let form = band.form(Law::Knee, Corner::Floor);
    let term = super::law::wind_term(form.law, at.slope, at.bend, at.post_slope, x, super::law::POINT_WIDTH);
    at.wind_db[0] + term.value - at.floor_db[0]
}

/// Ratio of the robust residual scale in the upper to that in the lower third of the winds.
pub(crate) fn scale_ratio(fit: &PointFit) -> f64 {
    let band = &fit.band;
    let fitted = band.fitted(Law::Knee, Corner::Floor, &fit.at);
    let [low, high] = crate::numerics::quantile::quantiles(&band.record.x, [1.0 / 3.0, 2.0 / 3.0]);
    let scale = |inside: &dyn Fn(f64) -> bool| {
        let absolute: Vec<f64> = band
            .record
            .x
            .iter()
            .zip(band.record.level_db.iter().zip(&fitted))
            .filter(|(x, _)| inside(**x))
            .map(|(_, (level, fit))| (level - fit).abs())
            .collect();
        median(&absolute)
    };
    scale(&|x| x > high) / scale(&|x| x < low)
}

/// Whether flattened weights, n^0.5 per row instead of n, move floor, wind part or slope by more than two standard errors.
/// They would not if the law described the band. The onset is left out: it may jump between minima.
pub(crate) fn shape_misfit(fit: &PointFit, replicates: &[Replicate]) -> bool {
    const STANDARD_ERRORS: f64 = 2.0;
    let band = &fit.band;
    let weight: Vec<f64> =
        band.rows.count.iter().zip(&band.rows.weight).map(|(count, weight)| count.sqrt() * weight).collect();
    let rows = RowMeans { starts: &band.rows.starts, weight: &weight, x: &band.rows.x, level_db: &band.row_level_db };
    let mut at = fit.at.clone();
    let stop = Stop { iterations: 60, tolerance: 1e-9 };
    Solver::default().minimise(&rows, &band.form(Law::Knee, Corner::Floor), band.bend(Law::Knee), stop, &mut at);
    let moved = |value: &dyn Fn(&Parameters) -> f64| {
        let values = values_of(replicates, value);
        let mean = values.iter().sum::<f64>() / values.len().max(1) as f64;
        let square: f64 = values.iter().map(|value| (value - mean) * (value - mean)).sum();
        let sd = (square / (values.len().max(2) - 1) as f64).sqrt();
        (value(&at) - value(&fit.at)).abs() > STANDARD_ERRORS * sd
    };
    moved(&|at| at.floor_db[0]) || moved(&|at| at.wind_db[0]) || moved(&|at| at.slope)
}
