//! The stated law of a band: floor and wind part add in power.

use super::settings::checked;
use crate::units::{db_of_power, power_of_db};
use serde::{Deserialize, Serialize};

/// Winds below this count as it, m/s: a logarithm needs a bound, and the floor is all that is heard there.
const LEAST_WIND_M_S: f64 = 0.1;

/// `[[simulate.band]]`: the law of one band.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct BandLaw {
    /// Nominal decidecade centre, Hz.
    #[serde(deserialize_with = "checked::centre_hz")]
    pub centre_hz: f64,
    /// Band level of the floor, dB re 1 uPa^2.
    #[serde(deserialize_with = "checked::level_db")]
    pub floor_db: f64,
    /// Rise of the wind part per factor ten in wind speed, dB.
    #[serde(deserialize_with = "checked::slope_db_per_decade")]
    pub slope_db_per_decade: f64,
    /// Wind speed at which floor and wind part are equal, m/s (along the law below the onset).
    #[serde(deserialize_with = "checked::crossover_m_s")]
    pub crossover_m_s: f64,
    /// Wind speed above which the slope changes, m/s; absent: the wind part rises without end.
    #[serde(default, deserialize_with = "checked::onset_m_s", skip_serializing_if = "Option::is_none")]
    pub onset_m_s: Option<f64>,
    /// Slope above the onset, dB per decade; 0 is saturation.
    #[serde(default, deserialize_with = "checked::any_slope_db_per_decade")]
    pub post_onset_slope_db_per_decade: f64,
    /// Added to the level of every ship, dB: how loud ships are in this band.
    #[serde(default, deserialize_with = "checked::gain_db")]
    pub ship_gain_db: f64,
}

impl BandLaw {
    /// The wind part alone at 10 m/s, along the law below the onset, dB.
    pub fn wind_component_at_10_m_s_db(&self) -> f64 {
        self.floor_db + self.slope_db_per_decade * libm::log10(10.0 / self.crossover_m_s)
    }

    /// The same law with its floor moved and its wind part kept: a noisier or quieter place.
    #[must_use]
    pub fn with_floor_moved(&self, by_db: f64) -> Self {
        let floor_db = self.floor_db + by_db;
        // The crossover is where the unchanged wind part meets the new floor.
        let crossover_m_s = if self.slope_db_per_decade > 0.0 {
            self.crossover_m_s * libm::pow(10.0, by_db / self.slope_db_per_decade)
        } else {
            self.crossover_m_s
        };
        Self { floor_db, crossover_m_s, ..self.clone() }
    }
}

/// The wind part alone at a wind speed, dB.
pub fn wind_part_db(law: &BandLaw, wind_speed_m_s: f64) -> f64 {
    let speed = wind_speed_m_s.max(LEAST_WIND_M_S);
    let onset = law.onset_m_s.unwrap_or(f64::INFINITY);
    let rising = law.slope_db_per_decade * libm::log10(speed.min(onset) / law.crossover_m_s);
    let beyond = if speed > onset { law.post_onset_slope_db_per_decade * libm::log10(speed / onset) } else { 0.0 };
    law.floor_db + rising + beyond
}

/// Level at a wind speed with this floor (dB): the powers of floor and wind part add.
pub fn law_level_db(law: &BandLaw, floor_db: f64, wind_speed_m_s: f64) -> f64 {
    db_of_power(power_of_db(floor_db) + power_of_db(wind_part_db(law, wind_speed_m_s)))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn law() -> BandLaw {
        BandLaw {
            centre_hz: 1000.0,
            floor_db: 70.0,
            slope_db_per_decade: 30.0,
            crossover_m_s: 4.0,
            onset_m_s: Some(12.0),
            post_onset_slope_db_per_decade: 0.0,
            ship_gain_db: 0.0,
        }
    }

    // Closed forms: two equal powers are 10 log10 2 = 3.0103 dB above one.
    #[test]
    fn equal_powers_add_three_decibels() {
        assert!((law_level_db(&law(), 70.0, 4.0) - 73.010_299_956_639_81).abs() < 1e-9);
        let doubled = wind_part_db(&law(), 8.0) - wind_part_db(&law(), 4.0);
        assert!((doubled - 30.0 * 2f64.log10()).abs() < 1e-9);
        assert!((law().wind_component_at_10_m_s_db() - wind_part_db(&law(), 10.0)).abs() < 1e-12);
    }

    #[test]
    fn the_slope_changes_at_the_onset_and_nothing_jumps() {
        assert!((wind_part_db(&law(), 24.0) - wind_part_db(&law(), 12.0)).abs() < 1e-12);
        let falling = BandLaw { post_onset_slope_db_per_decade: -20.0, ..law() };
        let fall = wind_part_db(&falling, 24.0) - wind_part_db(&falling, 12.0);
        assert!((fall + 20.0 * 2f64.log10()).abs() < 1e-9);
        assert!((wind_part_db(&falling, 12.0 + 1e-9) - wind_part_db(&falling, 12.0)).abs() < 1e-6);
    }

    #[test]
    fn moving_the_floor_keeps_the_wind_part() {
        let moved = law().with_floor_moved(6.0);
        for wind_speed in [1.0, 5.0, 12.0, 20.0] {
            assert!((wind_part_db(&moved, wind_speed) - wind_part_db(&law(), wind_speed)).abs() < 1e-9);
        }
        assert!((moved.floor_db - 76.0).abs() < 1e-12);
    }
}
