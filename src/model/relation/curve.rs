//! Fitted mean curves.

use crate::numerics::ramp_table::RampTable;
use serde::{Deserialize, Serialize};

/// The wind part of a mean curve, as a function of x = log10(U / 10 m/s).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum WindPart {
    /// `A + S x`.
    Line,
    /// `A + S min(x, x_onset) + S2 max(x - x_onset, 0)`.
    Knee {
        /// Onset, m/s.
        onset_m_s: f64,
        /// Slope above the onset, dB per decade.
        post_onset_slope_db_per_decade: f64,
    },
    /// `A + S x + Q x^2`.
    Quadratic {
        /// Q, dB per squared decade.
        curvature_db_per_decade2: f64,
    },
    /// `A + S log10((U - U0) / (10 - U0))` above the threshold U0.
    Threshold {
        /// U0, m/s.
        threshold_m_s: f64,
    },
    /// The same level at all winds.
    Constant,
}

/// A fitted mean curve `F + h(W(U) - F)`, which can be evaluated at any wind speed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct MeanCurve {
    /// F, dB; absent when the curve has no floor.
    pub floor_db: Option<f64>,
    /// A, dB: the wind part alone at 10 m/s along the law below the onset.
    pub wind_component_at_10_m_s_db: f64,
    /// S, dB per decade of wind speed.
    pub slope_db_per_decade: f64,
    /// The law of the wind part.
    pub wind_part: WindPart,
    /// h: level minus floor against wind part minus floor, dB.
    pub corner: RampTable,
}

/// Winds below this count as it, m/s.
pub const LEAST_WIND_M_S: f64 = 0.5;

impl MeanCurve {
    /// Fitted level at a wind speed, dB. Winds below 0.5 m/s count as 0.5 m/s. NaN for NaN.
    pub fn level_db(&self, wind_speed_m_s: f64) -> f64 {
        if wind_speed_m_s.is_nan() {
            return f64::NAN;
        }
        let wind = self.wind_part_db(wind_speed_m_s);
        match self.floor_db {
            Some(floor) => floor + self.corner.value_and_slope(wind - floor).0,
            None => wind,
        }
    }

    /// The wind part alone at a wind speed, dB.
    pub fn wind_part_db(&self, wind_speed_m_s: f64) -> f64 {
        let (a, s) = (self.wind_component_at_10_m_s_db, self.slope_db_per_decade);
        let speed = wind_speed_m_s.max(LEAST_WIND_M_S);
        let x = libm::log10(speed / 10.0);
        match self.wind_part {
            WindPart::Line => a + s * x,
            WindPart::Knee { onset_m_s, post_onset_slope_db_per_decade } => {
                let knee = libm::log10(onset_m_s / 10.0);
                a + s * x.min(knee) + post_onset_slope_db_per_decade * (x - knee).max(0.0)
            }
            WindPart::Quadratic { curvature_db_per_decade2 } => a + s * x + curvature_db_per_decade2 * x * x,
            WindPart::Threshold { threshold_m_s } => {
                a + s * libm::log10((speed - threshold_m_s).max(1e-3) / (10.0 - threshold_m_s))
            }
            WindPart::Constant => a,
        }
    }
}

/// One point of a fitted curve with its pointwise 95 % interval.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct CurveBandPoint {
    /// Wind speed, m/s.
    pub wind_speed_m_s: f64,
    /// Fitted level, dB.
    pub level_db: f64,
    /// Lower end, dB; absent without replicates.
    pub low_db: Option<f64>,
    /// Upper end, dB; absent without replicates.
    pub high_db: Option<f64>,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_curve_without_scatter_adds_power() {
        let values =
            (0..91).map(|d| 10.0 * libm::log10(1.0 + libm::pow(10.0, f64::from(d - 45) / 10.0))).collect::<Vec<_>>();
        let curve = MeanCurve {
            floor_db: Some(60.0),
            wind_component_at_10_m_s_db: 70.0,
            slope_db_per_decade: 30.0,
            wind_part: WindPart::Knee { onset_m_s: 12.0, post_onset_slope_db_per_decade: 0.0 },
            corner: RampTable::new(-45.0, 1.0, values),
        };
        // Powers of floor and wind part add: 10 log10(10^6 + 10^7).
        assert!((curve.level_db(10.0) - 10.0 * libm::log10(1.1e7)).abs() < 1e-4);
        assert!((curve.level_db(12.0) - curve.level_db(25.0)).abs() < 1e-12);
        assert!(curve.level_db(f64::NAN).is_nan());
    }
}
