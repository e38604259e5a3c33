//! The truth file: the laws by site and band, the winds they met, and the settings.

use super::{INVENTED, SensorTruth};
use crate::science::simulate::{BandLaw, Settings, Windows, law_level_db};
use serde::Serialize;

#[derive(Serialize)]
struct Truth<'a> {
    comment: &'static str,
    seed: u64,
    first_window: String,
    windows: usize,
    sensor: Vec<AtSensor<'a>>,
    /// The settings again, with the seed that was used.
    settings: Settings,
}

#[derive(Serialize)]
struct AtSensor<'a> {
    site: &'a str,
    sensor: &'a str,
    windows_with_levels: usize,
    median_wind_m_s: f64,
    wind_q99_m_s: f64,
    greatest_wind_m_s: f64,
    band: Vec<Band>,
}

#[derive(Serialize)]
struct Band {
    centre_hz: f64,
    floor_db: f64,
    slope_db_per_decade: f64,
    crossover_m_s: f64,
    wind_component_at_10_m_s_db: f64,
    level_at_10_m_s_db: f64,
    #[serde(skip_serializing_if = "Option::is_none")]
    onset_m_s: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    post_onset_slope_db_per_decade: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    share_above_onset: Option<f64>,
}

pub(super) fn truth_text(
    settings: &Settings,
    seed: u64,
    windows: Windows,
    truths: &[SensorTruth<'_>],
) -> Result<String, String> {
    let truth = Truth {
        comment: INVENTED,
        seed,
        first_window: windows.start.iso(),
        windows: windows.count,
        sensor: truths.iter().map(sensor).collect(),
        settings: Settings { seed, ..settings.clone() },
    };
    toml::to_string(&truth).map_err(|error| format!("the truth cannot be written: {error}"))
}

fn sensor<'a>(truth: &SensorTruth<'a>) -> AtSensor<'a> {
    let has_level = |window: usize| truth.levels_db.iter().any(|levels| !levels[window].is_nan());
    let mut winds: Vec<f64> = (0..truth.speeds_m_s.len())
        .filter(|window| has_level(*window))
        .map(|window| truth.speeds_m_s[window])
        .collect();
    winds.sort_unstable_by(f64::total_cmp);
    let at = |share: f64| {
        let place = (share * winds.len() as f64) as usize;
        winds.get(place.min(winds.len().saturating_sub(1))).map_or(0.0, |speed| (speed * 1e3).round() / 1e3)
    };
    AtSensor {
        site: &truth.site.id,
        sensor: &truth.sensor.id,
        windows_with_levels: winds.len(),
        median_wind_m_s: at(0.5),
        wind_q99_m_s: at(0.99),
        greatest_wind_m_s: at(1.0),
        band: truth.laws.iter().map(|law| band(law, &winds)).collect(),
    }
}

fn band(law: &BandLaw, winds: &[f64]) -> Band {
    let round = |value: f64| (value * 1e4).round() / 1e4;
    let above = |onset: f64| winds.iter().filter(|speed| **speed > onset).count() as f64 / winds.len().max(1) as f64;
    Band {
        centre_hz: law.centre_hz,
        floor_db: round(law.floor_db),
        slope_db_per_decade: law.slope_db_per_decade,
        crossover_m_s: round(law.crossover_m_s),
        wind_component_at_10_m_s_db: round(law.wind_component_at_10_m_s_db()),
        level_at_10_m_s_db: round(law_level_db(law, law.floor_db, 10.0)),
        onset_m_s: law.onset_m_s,
        post_onset_slope_db_per_decade: law.onset_m_s.map(|_| law.post_onset_slope_db_per_decade),
        share_above_onset: law.onset_m_s.map(|onset| round(above(onset))),
    }
}
