//! What is to be simulated: the `[simulate]` section of a study file. Values are checked while they are parsed, so that the
//! parser can name the line.

use super::law::BandLaw;
use crate::units::{Instant, SECOND_MS};
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

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

/// `[simulate]`. All but `band` may be left out.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Settings {
    /// Seed of everything random.
    pub seed: u64,
    /// First instant, ISO 8601. Absent: 2031-01-01, or with the study's wind its first step.
    #[serde(deserialize_with = "checked::start", skip_serializing_if = "Option::is_none")]
    pub start: Option<String>,
    /// Length, days. Absent: 120, or with the study's wind up to its last step.
    #[serde(deserialize_with = "checked::days", skip_serializing_if = "Option::is_none")]
    pub days: Option<f64>,
    /// Length of the window of a level, s.
    #[serde(deserialize_with = "checked::window_s")]
    pub window_s: f64,
    /// Where the wind comes from.
    pub wind: WindOrigin,
    /// Median wind speed of the invented field, m/s.
    #[serde(deserialize_with = "checked::median_wind_m_s")]
    pub median_wind_m_s: f64,
    /// Shape of the Weibull distribution of its wind speed; 2 is usual at sea, more is steadier.
    #[serde(deserialize_with = "checked::weibull_shape")]
    pub weibull_shape: f64,
    /// Time scale of the invented weather, h.
    #[serde(deserialize_with = "checked::time_scale_h")]
    pub wind_time_scale_h: f64,
    /// Mean time between fronts, at which the wind veers within an hour or two, h; 0: none.
    #[serde(deserialize_with = "checked::gap_h")]
    pub front_gap_h: f64,
    /// Spacing of the invented grid, degrees.
    #[serde(deserialize_with = "checked::resolution_deg")]
    pub resolution_deg: f64,
    /// Width of the grid beyond the outermost sites, degrees.
    #[serde(deserialize_with = "checked::margin_deg")]
    pub margin_deg: f64,
    /// Nodes farther east of the easternmost site than this are land, degrees (never a node next to a site). Absent: no land.
    #[serde(deserialize_with = "checked::land_beyond_deg", skip_serializing_if = "Option::is_none")]
    pub land_beyond_deg: Option<f64>,
    /// Standard deviation of slow fluctuations of the whole level, dB.
    #[serde(deserialize_with = "checked::sd_db")]
    pub slow_noise_sd_db: f64,
    /// Time after which their correlation is 1/e, h.
    #[serde(deserialize_with = "checked::time_scale_h")]
    pub slow_noise_h: f64,
    /// Standard deviation of independent noise of each level, dB.
    #[serde(deserialize_with = "checked::sd_db")]
    pub white_noise_sd_db: f64,
    /// Standard deviation of fluctuations of the floor alone, dB.
    #[serde(deserialize_with = "checked::sd_db")]
    pub floor_sd_db: f64,
    /// Time after which their correlation is 1/e, h.
    #[serde(deserialize_with = "checked::time_scale_h")]
    pub floor_h: f64,
    /// Mean time between ships, h; 0: none.
    #[serde(deserialize_with = "checked::gap_h")]
    pub ship_gap_h: f64,
    /// Length of a passage, h (each is 0.7 to 1.3 times as long).
    #[serde(deserialize_with = "checked::ship_duration_h")]
    pub ship_duration_h: f64,
    /// Least and greatest level of a ship over the floor at its nearest, dB.
    #[serde(deserialize_with = "checked::ship_peak_db")]
    pub ship_peak_db: [f64; 2],
    /// Share of the windows that are lost in gaps.
    #[serde(deserialize_with = "checked::share")]
    pub gap_share: f64,
    /// Share of levels that are too high for no reason.
    #[serde(deserialize_with = "checked::share")]
    pub outlier_share: f64,
    /// Mean excess of such a level, dB.
    #[serde(deserialize_with = "checked::sd_db")]
    pub outlier_mean_db: f64,
    /// The second deployment of a sensor reads this much too high, the third twice as much, dB.
    #[serde(deserialize_with = "checked::gain_db")]
    pub gain_step_db: f64,
    /// How much higher the floor of a site is in all bands, by site id, dB. The wind part is the same at all sites.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub floor_offset_db: BTreeMap<String, f64>,
    /// The laws, one a band.
    #[serde(deserialize_with = "checked::bands")]
    pub band: Vec<BandLaw>,
}

/// Start of an invented deployment where the study does not say it.
const USUAL_START: &str = "2031-01-01T00:00:00Z";
/// Length of an invented deployment where the study does not say it, days.
const USUAL_DAYS: f64 = 120.0;

impl Default for Settings {
    fn default() -> Self {
        Self {
            seed: 1,
            start: None,
            days: None,
            window_s: 3600.0,
            wind: WindOrigin::Invented,
            median_wind_m_s: 7.5,
            weibull_shape: 2.0,
            wind_time_scale_h: 18.0,
            front_gap_h: 96.0,
            resolution_deg: 0.5,
            margin_deg: 0.75,
            land_beyond_deg: None,
            slow_noise_sd_db: 1.5,
            slow_noise_h: 8.0,
            white_noise_sd_db: 0.7,
            floor_sd_db: 0.0,
            floor_h: 24.0,
            ship_gap_h: 0.0,
            ship_duration_h: 3.0,
            ship_peak_db: [5.0, 18.0],
            gap_share: 0.02,
            outlier_share: 0.0,
            outlier_mean_db: 8.0,
            gain_step_db: 0.0,
            floor_offset_db: BTreeMap::new(),
            band: Vec::new(),
        }
    }
}

impl Settings {
    /// Checks what no single value shows; single values are checked while they are parsed.
    ///
    /// # Errors
    /// A sentence, when there is no band.
    pub fn check(&self) -> Result<(), String> {
        if self.band.is_empty() {
            return Err("`[simulate]` needs at least one `[[simulate.band]]`: the law of a band".to_owned());
        }
        Ok(())
    }

    /// First instant that the settings state; `None` where they leave it open or it is no time.
    pub fn stated_start(&self) -> Option<Instant> {
        self.start.as_deref().and_then(|text| Instant::parse(text).ok())
    }

    /// First instant of an invented deployment.
    pub fn invented_start(&self) -> Instant {
        self.stated_start().or_else(|| Instant::parse(USUAL_START).ok()).unwrap_or(Instant(0))
    }

    /// Length of a window, ms.
    pub fn window_ms(&self) -> i64 {
        ((self.window_s * SECOND_MS as f64).round() as i64).max(1)
    }

    /// Length of an invented deployment, ms: whole windows.
    pub fn invented_length_ms(&self) -> i64 {
        let asked = (self.days.unwrap_or(USUAL_DAYS) * 86_400_000.0) as i64;
        (asked / self.window_ms()).max(1) * self.window_ms()
    }

    /// The laws at a site: those of the bands, with the site's own floor.
    pub fn laws_at(&self, site: &str) -> Vec<BandLaw> {
        let by_db = self.floor_offset_db.get(site).copied().unwrap_or(0.0);
        self.band.iter().map(|law| law.with_floor_moved(by_db)).collect()
    }
}

/// Numbers that are checked while they are parsed.
pub(super) mod checked {
    use super::BandLaw;
    use crate::model::BandScheme;
    use crate::units::{Hertz, Instant};
    use serde::de::Error;
    use serde::{Deserialize, Deserializer};

    macro_rules! number {
        ($name:ident, $low:expr, $high:expr, $expected:literal) => {
            pub(in super::super) fn $name<'de, D: Deserializer<'de>>(deserializer: D) -> Result<f64, D::Error> {
                let value = f64::deserialize(deserializer)?;
                if ($low..=$high).contains(&value) {
                    Ok(value)
                } else {
                    Err(D::Error::custom(format!(concat!("{} is not allowed; expected ", $expected), value)))
                }
            }
        };
        ($name:ident, optional, $low:expr, $high:expr, $expected:literal) => {
            pub(in super::super) fn $name<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Option<f64>, D::Error> {
                number!(inner, $low, $high, $expected);
                inner(deserializer).map(Some)
            }
        };
    }

    number!(level_db, -50.0, 250.0, "a level of -50 to 250 dB");
    number!(slope_db_per_decade, 0.0, 150.0, "a slope of 0 to 150 dB per decade");
    number!(any_slope_db_per_decade, -150.0, 150.0, "a slope of -150 to 150 dB per decade");
    number!(crossover_m_s, 0.1, 1000.0, "a wind speed of 0.1 to 1000 m/s");
    number!(onset_m_s, optional, 0.5, 75.0, "a wind speed of 0.5 to 75 m/s");
    number!(gain_db, -60.0, 60.0, "-60 to 60 dB");
    number!(days, optional, 0.01, 3660.0, "0.01 to 3660 days");
    number!(window_s, 1.0, 86_400.0, "a window of 1 to 86400 s");
    number!(median_wind_m_s, 0.5, 20.0, "a median wind of 0.5 to 20 m/s");
    number!(weibull_shape, 1.0, 6.0, "a shape of 1 to 6");
    number!(time_scale_h, 0.1, 2000.0, "a time scale of 0.1 to 2000 h");
    number!(gap_h, 0.0, 100_000.0, "0 (none) to 100000 h");
    number!(resolution_deg, 0.02, 5.0, "a spacing of 0.02 to 5 degrees");
    number!(margin_deg, 0.0, 20.0, "a width of 0 to 20 degrees");
    number!(land_beyond_deg, optional, 0.0, 40.0, "0 to 40 degrees");
    number!(sd_db, 0.0, 30.0, "0 to 30 dB");
    number!(ship_duration_h, 0.1, 200.0, "a passage of 0.1 to 200 h");
    number!(share, 0.0, 0.9, "a share of 0 to 0.9");

    pub(in super::super) fn centre_hz<'de, D: Deserializer<'de>>(deserializer: D) -> Result<f64, D::Error> {
        let value = f64::deserialize(deserializer)?;
        let centre = Hertz::new(value).map_err(D::Error::custom)?;
        BandScheme::Decidecade.band(centre).map_err(D::Error::custom)?;
        Ok(value)
    }

    pub(in super::super) fn start<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Option<String>, D::Error> {
        let text = String::deserialize(deserializer)?;
        Instant::parse(&text).map_err(D::Error::custom)?;
        Ok(Some(text))
    }

    pub(in super::super) fn ship_peak_db<'de, D: Deserializer<'de>>(deserializer: D) -> Result<[f64; 2], D::Error> {
        let [low, high] = <[f64; 2]>::deserialize(deserializer)?;
        if low.is_finite() && high >= low && high <= 80.0 {
            Ok([low, high])
        } else {
            Err(D::Error::custom(format!(
                "[{low}, {high}] is not allowed; expected the least and the greatest excess, up to 80 dB"
            )))
        }
    }

    pub(in super::super) fn bands<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Vec<BandLaw>, D::Error> {
        let laws = Vec::<BandLaw>::deserialize(deserializer)?;
        for (k, law) in laws.iter().enumerate() {
            let same = |other: &BandLaw| (other.centre_hz / law.centre_hz - 1.0).abs() < 0.1;
            if laws[..k].iter().any(same) {
                let problem = format!("the band at {} Hz is there twice; expected each band once", law.centre_hz);
                return Err(D::Error::custom(problem));
            }
        }
        Ok(laws)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const BAND: &str = "[[band]]\ncentre_hz = 63\nfloor_db = 80\nslope_db_per_decade = 25\ncrossover_m_s = 4\n";

    fn parse(text: &str) -> Result<Settings, String> {
        toml::from_str::<Settings>(text).map_err(|error| error.to_string())
    }

    #[test]
    fn impossible_values_are_refused_where_they_stand() {
        assert_eq!(parse(BAND).unwrap().band.len(), 1);
        for (text, part) in [
            ("gap_share = 2\n", "2 is not allowed; expected a share of 0 to 0.9"),
            ("start = \"soon\"\n", "`soon` is no time"),
            ("ship_peak_db = [9, 3]\n", "expected the least and the greatest"),
            ("median_wind = 8\n", "unknown field `median_wind`"),
            ("days = 0\n", "0 is not allowed; expected 0.01 to 3660 days"),
        ] {
            let error = parse(&format!("{text}{BAND}")).unwrap_err();
            assert!(error.contains(part) && error.contains("line 1"), "{error}");
        }
        let error = parse(&format!("{BAND}{BAND}")).unwrap_err();
        assert!(error.contains("the band at 63 Hz is there twice"), "{error}");
        let error = parse(&BAND.replace("63", "112")).unwrap_err();
        assert!(error.contains("112 Hz is no decidecade centre") && error.contains("line 2"), "{error}");
    }

    #[test]
    fn settings_survive_being_written() {
        let mut settings = parse(BAND).unwrap();
        settings.floor_offset_db.insert("reef".to_owned(), 2.0);
        settings.start = Some("2031-05-04T00:00:00Z".to_owned());
        assert_eq!(parse(&toml::to_string(&settings).unwrap()).unwrap(), settings);
    }
}
