//! Wind at a site and its mean speed over windows, computed here in a way of its own: by fine sums, not by the closed form
//! that matchups use.

use crate::units::Instant;

/// Instants in a window at which the speed is taken for its mean.
const PARTS: usize = 60;

/// The wind at a site at the steps of a field; NaN where there is none.
#[derive(Debug, Clone)]
pub struct SiteWind {
    /// Steps, increasing.
    pub steps: Vec<Instant>,
    /// Component towards the east, m/s.
    pub eastward_m_s: Vec<f64>,
    /// Component towards the north, m/s.
    pub northward_m_s: Vec<f64>,
    /// Steps farther apart than this are a gap, ms.
    pub max_gap_ms: i64,
}

impl SiteWind {
    /// Speed at an instant, m/s: components linear between steps; NaN in gaps and outside.
    fn speed_m_s(&self, instant: f64) -> f64 {
        let after = self.steps.partition_point(|step| (step.0 as f64) < instant);
        if after < self.steps.len() && (self.steps[after].0 as f64 - instant).abs() < 0.5 {
            return libm::hypot(self.eastward_m_s[after], self.northward_m_s[after]);
        }
        if after == 0 || after == self.steps.len() {
            return f64::NAN;
        }
        let (from, to) = (self.steps[after - 1].0, self.steps[after].0);
        if to - from > self.max_gap_ms {
            return f64::NAN;
        }
        let share = (instant - from as f64) / (to - from) as f64;
        let between = |values: &[f64]| values[after - 1] * (1.0 - share) + values[after] * share;
        libm::hypot(between(&self.eastward_m_s), between(&self.northward_m_s))
    }
}

/// Mean speed over the window of this length that starts at an instant, m/s; NaN where part of it has no wind.
pub fn mean_speed_m_s(wind: &SiteWind, start: Instant, length_ms: i64) -> f64 {
    let part_ms = length_ms as f64 / PARTS as f64;
    let sum: f64 = (0..PARTS).map(|part| wind.speed_m_s(start.0 as f64 + part_ms * (part as f64 + 0.5))).sum();
    sum / PARTS as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::HOUR_MS;

    fn wind(eastward_m_s: &[f64], northward_m_s: &[f64], step_ms: i64) -> SiteWind {
        SiteWind {
            steps: (0..eastward_m_s.len()).map(|k| Instant(k as i64 * step_ms)).collect(),
            eastward_m_s: eastward_m_s.to_vec(),
            northward_m_s: northward_m_s.to_vec(),
            max_gap_ms: 2 * HOUR_MS,
        }
    }

    // Closed forms.
    #[test]
    fn the_mean_speed_of_winds_that_are_known() {
        // Steady.
        assert!((mean_speed_m_s(&wind(&[3.0, 3.0], &[4.0, 4.0], HOUR_MS), Instant(0), HOUR_MS) - 5.0).abs() < 1e-12);
        // Through calm from -6 to 6 m/s: the mean of |u| is 3 m/s.
        assert!((mean_speed_m_s(&wind(&[-6.0, 6.0], &[0.0, 0.0], HOUR_MS), Instant(0), HOUR_MS) - 3.0).abs() < 1e-9);
        // From (0, 1) to (1, 1): the integral of sqrt(1 + s^2) over [0, 1] is (sqrt 2 + asinh 1) / 2 = 1.147794.
        let slanting = mean_speed_m_s(&wind(&[0.0, 1.0], &[1.0, 1.0], HOUR_MS), Instant(0), HOUR_MS);
        assert!((slanting - 1.147_793_574_696_319).abs() < 1e-5, "{slanting}");
    }

    #[test]
    fn no_wind_is_invented_in_gaps_and_outside() {
        let gap = wind(&[5.0, 5.0], &[0.0, 0.0], 3 * HOUR_MS);
        assert!(mean_speed_m_s(&gap, Instant(0), HOUR_MS).is_nan());
        let short = wind(&[5.0, 5.0], &[0.0, 0.0], HOUR_MS);
        assert!(mean_speed_m_s(&short, Instant(HOUR_MS / 2), HOUR_MS).is_nan());
        let hole = wind(&[5.0, f64::NAN, 5.0], &[0.0; 3], HOUR_MS);
        assert!(mean_speed_m_s(&hole, Instant(0), HOUR_MS).is_nan());
    }
}
