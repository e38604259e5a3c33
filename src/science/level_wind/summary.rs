//! From fits to the numbers and tables of a relation.

use super::corner::{plain_table, top_offset_db};
use super::fits::Band;
use super::law::{BIN_LOW, BIN_WIDTH, BINS, Corner, Law, Parameters, wind_of};
use super::point::PointFit;
use super::record::Record;
use crate::model::{
    CurveBandPoint, DeploymentFit, MeanCurve, RelationDiagnostics, Resolved, ScatterEstimate, ScatterFamily,
    WindClassSummary, WindPart,
};
use crate::numerics::quantile::{median, quantile_sorted};

/// The mean curve of a fit in one deployment.
pub(crate) fn mean_curve(band: &Band, law: Law, corner: Corner, at: &Parameters, deployment: usize) -> MeanCurve {
    let bare = corner == Corner::Bare;
    MeanCurve {
        floor_db: (!bare).then(|| at.floor_db[deployment]),
        wind_component_at_10_m_s_db: at.wind_db[deployment] + if bare { top_offset_db(&band.table.h) } else { 0.0 },
        slope_db_per_decade: at.slope,
        wind_part: match law {
            Law::Line => WindPart::Line,
            Law::Knee => WindPart::Knee { onset_m_s: wind_of(at.bend), post_onset_slope_db_per_decade: 0.0 },
            Law::FreeKnee => {
                WindPart::Knee { onset_m_s: wind_of(at.bend), post_onset_slope_db_per_decade: at.post_slope }
            }
            Law::Quadratic => WindPart::Quadratic { curvature_db_per_decade2: at.bend },
            Law::Threshold => WindPart::Threshold { threshold_m_s: at.bend },
        },
        corner: band.table.h.clone(),
    }
}

/// A curve at one level.
pub(crate) fn constant_curve(level_db: f64) -> MeanCurve {
    MeanCurve {
        floor_db: None,
        wind_component_at_10_m_s_db: level_db,
        slope_db_per_decade: 0.0,
        wind_part: WindPart::Constant,
        corner: plain_table(),
    }
}

/// Wind speeds at which a curve is tabulated, m/s: equal steps of the logarithm over the winds that were used.
pub(crate) fn curve_winds(record: &Record) -> Vec<f64> {
    const POINTS: usize = 61;
    let low = record.x.iter().copied().fold(f64::INFINITY, f64::min);
    let high = record.x.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if record.x.is_empty() {
        return Vec::new();
    }
    (0..POINTS).map(|index| wind_of(low + (high - low) * index as f64 / (POINTS - 1) as f64)).collect()
}

/// A curve without interval on its grid.
pub(crate) fn curve_points(record: &Record, curve: &MeanCurve) -> Vec<CurveBandPoint> {
    curve_winds(record)
        .into_iter()
        .map(|wind| CurveBandPoint {
            wind_speed_m_s: wind,
            level_db: curve.level_db(wind),
            low_db: None,
            high_db: None,
        })
        .collect()
}

/// The data by classes of wind speed, two classes of the fit together.
pub(crate) fn wind_classes(record: &Record, curve: &MeanCurve) -> Vec<WindClassSummary> {
    const TOGETHER: usize = 2;
    let mut levels: Vec<Vec<f64>> = vec![Vec::new(); BINS / TOGETHER];
    let mut sums = vec![0.0; BINS / TOGETHER];
    for ((&bin, &level), &x) in record.bin.iter().zip(&record.level_db).zip(&record.x) {
        levels[bin / TOGETHER].push(level);
        sums[bin / TOGETHER] += x;
    }
    let width = BIN_WIDTH * TOGETHER as f64;
    let mut classes = Vec::new();
    for (index, levels) in levels.iter_mut().enumerate().filter(|(_, levels)| !levels.is_empty()) {
        levels.sort_unstable_by(f64::total_cmp);
        let low = BIN_LOW + width * index as f64;
        classes.push(WindClassSummary {
            wind_speed_m_s: wind_of(low + 0.5 * width),
            lower_edge_m_s: wind_of(low),
            upper_edge_m_s: wind_of(low + width),
            samples: levels.len(),
            median_level_db: quantile_sorted(levels, 0.5),
            quantile_10_level_db: quantile_sorted(levels, 0.1),
            quantile_90_level_db: quantile_sorted(levels, 0.9),
            fitted_level_db: curve.level_db(wind_of(sums[index] / levels.len() as f64)),
            predicted_quantile_10_db: None,
            predicted_quantile_90_db: None,
        });
    }
    classes
}

/// The scatter model as it is reported.
pub(crate) fn scatter_of(fit: &PointFit) -> ScatterEstimate {
    let scatter = fit.band.table.scatter;
    let found = fit.scatter.as_ref();
    ScatterEstimate {
        family: match found {
            Some(found) => found.family,
            None if fit.hard_corner => ScatterFamily::HardCorner,
            None => ScatterFamily::FixedPowerSum,
        },
        floor_sd_db: scatter.floor_sd_db,
        wind_part_sd_db: scatter.wind_sd_db,
        total_sd_db: scatter.total_sd_db,
        ship_share: scatter.ship_share,
        ship_mean_excess_db: if scatter.ship_share > 0.0 { scatter.ship_mean_db } else { 0.0 },
        outlier_share: scatter.outlier_share,
        gain_random_floor: found.and_then(|found| found.gain_random_floor),
        gain_ships: found.and_then(|found| found.gain_ships),
    }
}

/// What can be said of a record before any fit.
pub(crate) fn record_diagnostics(record: &Record) -> RelationDiagnostics {
    RelationDiagnostics {
        samples: record.len(),
        rows_left_out: record.left_out,
        least_wind_m_s: record.wind_m_s.iter().copied().reduce(f64::min),
        greatest_wind_m_s: record.wind_m_s.iter().copied().reduce(f64::max),
        ..RelationDiagnostics::default()
    }
}

/// Figures of a point estimate.
pub(crate) fn point_diagnostics(fit: &PointFit) -> RelationDiagnostics {
    let band = &fit.band;
    let record = &band.record;
    let fitted = band.fitted(Law::Knee, Corner::Floor, &fit.at);
    let residual: Vec<f64> = record.level_db.iter().zip(&fitted).map(|(level, fit)| level - fit).collect();
    let scale = super::robust::sample_scale_db(band, Law::Knee, &fit.at);
    let rejected = residual.iter().zip(&scale).filter(|(residual, scale)| residual.abs() > 4.685 * **scale).count();
    let count = record.len() as f64;
    let absolute: Vec<f64> = residual.iter().map(|value| value.abs()).collect();
    RelationDiagnostics {
        effective_samples: Some(count / fit.inflation),
        block_length_h: Some(fit.block_h),
        blocks: (fit.block_h > 0.0).then(|| record.span_h() / fit.block_h),
        residual_scale_db: Some(1.4826 * median(&absolute)),
        residual_rms_db: Some((residual.iter().map(|value| value * value).sum::<f64>() / count).sqrt()),
        rejected_share: Some(rejected as f64 / count),
        p_deployments: fit.p_deployments,
        least_onset_m_s: band.onsets.first().copied().map(wind_of),
        greatest_onset_m_s: band.onsets.last().copied().map(wind_of),
        fitted_onset_m_s: Some(wind_of(fit.at.bend)),
        ..record_diagnostics(record)
    }
}

/// One entry per deployment, without intervals.
pub(crate) fn deployment_points(fit: &PointFit, at: &Parameters) -> Vec<DeploymentFit> {
    let record = &fit.band.record;
    if fit.band.rows.deployments() < 2 {
        return Vec::new();
    }
    record
        .labels
        .iter()
        .enumerate()
        .map(|(index, &label)| {
            let winds: Vec<f64> = record
                .wind_m_s
                .iter()
                .zip(&record.deployment)
                .filter(|(_, of_sample)| **of_sample == index)
                .map(|(wind, _)| *wind)
                .collect();
            DeploymentFit {
                deployment: label,
                samples: winds.len(),
                median_wind_m_s: median(&winds),
                floor_db: Resolved::point(at.floor_db[index]),
                wind_component_at_10_m_s_db: Resolved::point(at.wind_db[index]),
            }
        })
        .collect()
}
