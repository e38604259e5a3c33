//! Parts of a relation beside its parameters: data by class of wind, scatter model, diagnostics, deployments, replicates.

use super::{LevelLaw, Resolved, ScatterFamily};
use serde::{Deserialize, Serialize};

/// The samples of one class of wind speed, and what the fit says of them.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct WindClassSummary {
    /// Centre of the class on a logarithmic scale, m/s.
    pub wind_speed_m_s: f64,
    /// Lower edge, m/s.
    pub lower_edge_m_s: f64,
    /// Upper edge, m/s.
    pub upper_edge_m_s: f64,
    /// Number of samples.
    pub samples: usize,
    /// Median level, dB.
    pub median_level_db: f64,
    /// 10 % quantile of the levels, dB.
    pub quantile_10_level_db: f64,
    /// 90 % quantile of the levels, dB.
    pub quantile_90_level_db: f64,
    /// Fitted level at the mean of the logarithm of the wind, dB.
    pub fitted_level_db: f64,
    /// 10 % quantile that the scatter model predicts, dB.
    pub predicted_quantile_10_db: Option<f64>,
    /// 90 % quantile that the scatter model predicts, dB.
    pub predicted_quantile_90_db: Option<f64>,
}

/// The estimated scatter model: level = 10 log10(10^((F+a)/10) + ship + 10^((W+b)/10)) + c.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ScatterEstimate {
    /// Which parts of the model are used.
    pub family: ScatterFamily,
    /// Standard deviation of a, the floor, dB.
    pub floor_sd_db: f64,
    /// Standard deviation of b, the wind part, dB.
    pub wind_part_sd_db: f64,
    /// Standard deviation of c, the whole level, dB.
    pub total_sd_db: f64,
    /// Share of the time with a passing ship.
    pub ship_share: f64,
    /// Mean level of a ship over the floor, dB.
    pub ship_mean_excess_db: f64,
    /// Share of upward outliers.
    pub outlier_share: f64,
    /// Gain in log-likelihood, corrected for dependence, of the random floor over total scatter.
    pub gain_random_floor: Option<f64>,
    /// Gain in log-likelihood, corrected for dependence, of ships over the model chosen before.
    pub gain_ships: Option<f64>,
}

/// Errors of prediction in held-out blocks, weighted sums of squares (dB squared).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct PredictionErrors {
    /// Of the straight line.
    pub line: f64,
    /// Of the knee.
    pub knee: f64,
    /// Of the quadratic law.
    pub quadratic: f64,
    /// Of the threshold law.
    pub threshold: f64,
}

/// Figures that say how sure a relation can be.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, Default)]
pub struct RelationDiagnostics {
    /// Pairs of wind and level that were used.
    pub samples: usize,
    /// Rows without a usable wind or level.
    pub rows_left_out: usize,
    /// Number of independent samples that carry the same information.
    pub effective_samples: Option<f64>,
    /// Length of an independent block, hours; intervals use twice this length.
    pub block_length_h: Option<f64>,
    /// Length of the blocks that were resampled, hours.
    pub resampled_block_length_h: Option<f64>,
    /// Number of independent blocks in the record.
    pub blocks: Option<f64>,
    /// Robust scale of the residuals, dB.
    pub residual_scale_db: Option<f64>,
    /// Root mean square of the residuals, dB.
    pub residual_rms_db: Option<f64>,
    /// Share of samples that were given no weight.
    pub rejected_share: Option<f64>,
    /// p value of the test against no rise with wind.
    pub p_slope: Option<f64>,
    /// p value of the test against no floor.
    pub p_floor: Option<f64>,
    /// p value of the test against no onset.
    pub p_onset: Option<f64>,
    /// p value of the test against equal deployments.
    pub p_deployments: Option<f64>,
    /// p value of a knee added to the better curved law (not used in the verdict).
    pub p_knee_given_curve: Option<f64>,
    /// Independent blocks with wind below the best onset.
    pub storms_below_onset: Option<f64>,
    /// Independent blocks with wind above the best onset.
    pub storms_above_onset: Option<f64>,
    /// Smallest onset that was tried, m/s.
    pub least_onset_m_s: Option<f64>,
    /// Largest onset that was tried, m/s.
    pub greatest_onset_m_s: Option<f64>,
    /// Best onset of the fit with floor and knee, whatever the verdict, m/s.
    pub fitted_onset_m_s: Option<f64>,
    /// Its 95 % interval, m/s.
    pub fitted_onset_interval_m_s: Option<(f64, f64)>,
    /// Slope of the fit with a knee and without a floor, dB per decade: given where the floor is not resolved.
    pub floorless_slope_db_per_decade: Option<Resolved>,
    /// Errors of prediction in held-out blocks.
    pub prediction_errors: Option<PredictionErrors>,
    /// Gain in prediction of the better curved law over the knee, in standard errors of paired blocks.
    pub curved_gain: Option<f64>,
    /// Ratio of the residual scale in the upper to that in the lower third of the winds.
    pub residual_scale_ratio: Option<f64>,
    /// Least wind that was used, m/s.
    pub least_wind_m_s: Option<f64>,
    /// Greatest wind that was used, m/s.
    pub greatest_wind_m_s: Option<f64>,
    /// Number of bootstrap replicates.
    pub replicates: usize,
}

/// The simplest law that the tests support, with its own estimates (intervals come from the fit with floor and knee).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SelectedFit {
    /// The law.
    pub law: LevelLaw,
    /// Floor of each deployment, dB; empty without a floor.
    pub floor_db: Vec<f64>,
    /// Wind part alone at 10 m/s of each deployment, dB.
    pub wind_component_at_10_m_s_db: Vec<f64>,
    /// Slope, dB per decade.
    pub slope_db_per_decade: f64,
    /// Onset, m/s, where the law has one.
    pub onset_m_s: Option<f64>,
    /// Slope above the onset, dB per decade, where the law has one.
    pub post_onset_slope_db_per_decade: Option<f64>,
}

/// One deployment of a relation.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct DeploymentFit {
    /// Label, as it came in.
    pub deployment: u32,
    /// Samples used.
    pub samples: usize,
    /// Median wind, m/s.
    pub median_wind_m_s: f64,
    /// Its floor, dB.
    pub floor_db: Resolved,
    /// Its wind part alone at 10 m/s, dB.
    pub wind_component_at_10_m_s_db: Resolved,
}

/// Bootstrap replicates of the main parameters, in step; the same draws for all bands of a site.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, Default)]
pub struct Replicates {
    /// Floor of the first deployment, dB.
    pub floor_db: Vec<f64>,
    /// Wind part alone at 10 m/s of the first deployment, dB.
    pub wind_component_at_10_m_s_db: Vec<f64>,
    /// Slope, dB per decade.
    pub slope_db_per_decade: Vec<f64>,
    /// Onset as log10 (U / 10 m/s).
    pub onset_log10: Vec<f64>,
}
