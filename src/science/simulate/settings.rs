//! What is to be simulated: the `[simulate]` section of a study file.

use crate::model::BandScheme;
use crate::units::{Hertz, Instant};
use serde::{Deserialize, Serialize};

/// Where the wind of a simulated deployment comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum WindOrigin {
    /// An invented field.
    #[default]
    Invented,
    /// The wind inputs of the study.
    Study,
}

/// The law of one band.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct BandLaw {
    /// Nominal decidecade centre, Hz.
    pub centre_hz: f64,
    /// Level of the floor, dB re 1 uPa^2.
    pub floor_db: f64,
    /// Rise of the wind part per factor ten in wind speed, dB.
    pub slope_db_per_decade: f64,
    /// Wind speed at which floor and wind part are equal, m/s.
    pub crossover_m_s: f64,
    /// Wind speed above which the wind part is constant, m/s; none: it rises without end.
    pub onset_m_s: Option<f64>,
    /// Slope above the onset, dB per decade.
    #[serde(default)]
    pub post_onset_slope_db_per_decade: f64,
    /// Added to the level of every ship, dB: how loud ships are in this band.
    #[serde(default)]
    pub ship_gain_db: f64,
}

/// `[simulate]`. All that has a default may be left out.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Settings {
    /// Seed of everything random.
    pub seed: u64,
    /// First instant, ISO 8601.
    pub start: String,
    /// Length, days.
    pub days: u32,
    /// Where the wind comes from.
    pub wind: WindOrigin,
    /// Median wind speed of the invented field, m/s.
    pub median_wind_m_s: f64,
    /// Time scale of the invented weather, h.
    pub wind_time_scale_h: f64,
    /// Spacing of the invented grid, degrees.
    pub resolution_deg: f64,
    /// Width of the grid beyond the outermost sites, degrees.
    pub margin_deg: f64,
    /// Standard deviation of slow fluctuations of the whole level, dB.
    pub slow_noise_sd_db: f64,
    /// Their time scale, h.
    pub slow_noise_h: f64,
    /// Standard deviation of independent noise of each level, dB.
    pub white_noise_sd_db: f64,
    /// Standard deviation of the floor, dB.
    pub floor_sd_db: f64,
    /// Time scale of the floor, h.
    pub floor_h: f64,
    /// Mean time between ships, h; 0: none.
    pub ship_gap_h: f64,
    /// Length of a passage, h.
    pub ship_duration_h: f64,
    /// Least and greatest level of a ship over the floor at its nearest, dB.
    pub ship_peak_db: [f64; 2],
    /// Share of the hours that are lost in gaps.
    pub gap_share: f64,
    /// The laws, one a band.
    pub band: Vec<BandLaw>,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            seed: 1,
            start: "2031-01-01T00:00:00Z".to_owned(),
            days: 120,
            wind: WindOrigin::Invented,
            median_wind_m_s: 7.5,
            wind_time_scale_h: 24.0,
            resolution_deg: 0.5,
            margin_deg: 0.75,
            slow_noise_sd_db: 1.5,
            slow_noise_h: 8.0,
            white_noise_sd_db: 0.7,
            floor_sd_db: 0.0,
            floor_h: 24.0,
            ship_gap_h: 0.0,
            ship_duration_h: 3.0,
            ship_peak_db: [5.0, 18.0],
            gap_share: 0.02,
            band: Vec::new(),
        }
    }
}

impl Settings {
    /// Checks every value.
    ///
    /// # Errors
    /// A sentence that names the key, what was found and what is expected.
    pub fn check(&self) -> Result<(), String> {
        let within = |key: &str, value: f64, low: f64, high: f64| {
            if (low..=high).contains(&value) {
                Ok(())
            } else {
                Err(format!("`simulate.{key}` is {value}; expected {low} to {high}"))
            }
        };
        self.start().map(|_| ())?;
        within("days", f64::from(self.days), 1.0, 3660.0)?;
        within("median_wind_m_s", self.median_wind_m_s, 0.5, 20.0)?;
        within("wind_time_scale_h", self.wind_time_scale_h, 3.0, 240.0)?;
        within("resolution_deg", self.resolution_deg, 0.05, 5.0)?;
        within("margin_deg", self.margin_deg, 0.0, 20.0)?;
        for (key, value) in [
            ("slow_noise_sd_db", self.slow_noise_sd_db),
            ("white_noise_sd_db", self.white_noise_sd_db),
            ("floor_sd_db", self.floor_sd_db),
        ] {
            within(key, value, 0.0, 20.0)?;
        }
        for (key, value) in
            [("slow_noise_h", self.slow_noise_h), ("floor_h", self.floor_h), ("ship_duration_h", self.ship_duration_h)]
        {
            within(key, value, 0.5, 1000.0)?;
        }
        within("ship_gap_h", self.ship_gap_h, 0.0, 10_000.0)?;
        within("ship_peak_db[0]", self.ship_peak_db[0], 0.0, 60.0)?;
        within("ship_peak_db[1]", self.ship_peak_db[1], self.ship_peak_db[0], 60.0)?;
        within("gap_share", self.gap_share, 0.0, 0.9)?;
        if self.band.is_empty() {
            return Err("`simulate.band` is empty; expected at least one [[simulate.band]]".to_owned());
        }
        for law in &self.band {
            Hertz::new(law.centre_hz)
                .map_err(|error| error.to_string())
                .and_then(|centre| BandScheme::Decidecade.band(centre).map_err(|error| error.to_string()))
                .map_err(|problem| format!("`simulate.band.centre_hz`: {problem}"))?;
            within("band.floor_db", law.floor_db, -50.0, 250.0)?;
            within("band.slope_db_per_decade", law.slope_db_per_decade, 0.0, 150.0)?;
            within("band.crossover_m_s", law.crossover_m_s, 0.1, 100.0)?;
            if let Some(onset) = law.onset_m_s {
                within("band.onset_m_s", onset, 0.5, 75.0)?;
            }
            within("band.post_onset_slope_db_per_decade", law.post_onset_slope_db_per_decade, -150.0, 150.0)?;
            within("band.ship_gain_db", law.ship_gain_db, -60.0, 60.0)?;
        }
        Ok(())
    }

    /// First instant.
    ///
    /// # Errors
    /// When the text is no time.
    pub fn start(&self) -> Result<Instant, String> {
        Instant::parse(&self.start).map_err(|error| format!("`simulate.start`: {error}"))
    }

    /// Number of hours.
    pub fn hours(&self) -> usize {
        self.days as usize * 24
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn impossible_values_are_named() {
        let law = BandLaw {
            centre_hz: 63.0,
            floor_db: 80.0,
            slope_db_per_decade: 25.0,
            crossover_m_s: 4.0,
            onset_m_s: None,
            post_onset_slope_db_per_decade: 0.0,
            ship_gain_db: 0.0,
        };
        let good = Settings { band: vec![law], ..Settings::default() };
        assert_eq!(good.check(), Ok(()));
        let bad = Settings { gap_share: 2.0, ..good.clone() };
        assert_eq!(bad.check().unwrap_err(), "`simulate.gap_share` is 2; expected 0 to 0.9");
        let bad = Settings { start: "soon".into(), ..good };
        assert!(bad.check().unwrap_err().starts_with("`simulate.start`: `soon` is no time"));
    }
}
