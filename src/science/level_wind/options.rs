//! Choices of the fit, with the defaults of the method.

use serde::{Deserialize, Serialize};

/// How far off samples count.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Loss {
    /// Tukey's bisquare with constant 4.685: samples more than 4.685 scales off have no weight.
    #[default]
    Tukey,
    /// Huber's loss with constant 1.345: samples far off count linearly.
    Huber,
    /// Squares: every sample counts fully.
    LeastSquares,
}

/// Which scatter models may shape the corner between floor and wind part.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum ScatterModel {
    /// Estimated from the residuals; the simplest model that the data do not reject.
    #[default]
    Estimated,
    /// Floor and wind part add in power and do not fluctuate against each other.
    FixedPowerSum,
    /// Floor and wind part do not add: the higher one counts. With [`Self::Estimated`] this competes, too.
    HardCorner,
}

/// What may differ between deployments (or any other segments).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Segments {
    /// Nothing: labels are ignored.
    Pooled,
    /// Floor and wind part, if a test at 2 % finds that they differ.
    #[default]
    Tested,
    /// Floor and wind part of every deployment are free.
    FloorAndWindPart,
    /// Only the floor of every deployment is free.
    Floor,
    /// Every deployment has an offset in dB that moves floor and wind part together.
    Offset,
}

/// Whether bootstrap replicates are handed back.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum KeepReplicates {
    /// They are used for intervals and then dropped.
    #[default]
    No,
    /// They are part of the result.
    Yes,
}

/// Choices of the fit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Options {
    /// Loss.
    pub loss: Loss,
    /// Scatter model.
    pub scatter: ScatterModel,
    /// What may differ between deployments.
    pub segments: Segments,
    /// Number of bootstrap replicates; 0 for estimates without intervals or verdict.
    pub replicates: usize,
    /// Seed of all random draws.
    pub seed: u64,
    /// Whether replicates are handed back.
    pub keep_replicates: KeepReplicates,
    /// Standard deviation of the error of the wind speed, m/s, for a corrected estimate beside the plain one
    /// (see [`super::correct_for_wind_error`]). It must be known from elsewhere; the pairs do not tell it.
    pub wind_error_sd_m_s: Option<f64>,
}

impl Default for Options {
    fn default() -> Self {
        Self {
            loss: Loss::default(),
            scatter: ScatterModel::default(),
            segments: Segments::default(),
            replicates: 400,
            seed: 1,
            keep_replicates: KeepReplicates::default(),
            wind_error_sd_m_s: None,
        }
    }
}

impl Loss {
    /// psi at a residual in units of the scale, and its derivative (Huber 1981; Beaton and Tukey 1974).
    #[inline]
    pub(crate) fn psi(self, residual: f64) -> (f64, f64) {
        const TUKEY: f64 = 4.685;
        const HUBER: f64 = 1.345;
        match self {
            Self::Tukey => {
                let u = residual / TUKEY;
                if u.abs() < 1.0 {
                    let t = 1.0 - u * u;
                    (residual * t * t, t * (1.0 - 5.0 * u * u))
                } else {
                    (0.0, 0.0)
                }
            }
            Self::Huber => {
                if residual.abs() <= HUBER {
                    (residual, 1.0)
                } else {
                    (HUBER.copysign(residual), 0.0)
                }
            }
            Self::LeastSquares => (residual, 1.0),
        }
    }
}
