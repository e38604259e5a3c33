//! `sample waves`: gridded integral parameters of the sea.

use super::look_up::{Answer, LookUp, instant, needed};
use super::progress::Silent;
use super::sampling::sample_wind;
use crate::Error;
use crate::config::wave_options_from;
use crate::io::netcdf::{WaveParameter, open_waves};
use crate::model::{Missing, Point, Site, Track};
use crate::science::matchup::wind_at;
use crate::units::{ComingFrom, Compass, Window};

const QUANTITIES: [(&str, &str, WaveParameter); 7] = [
    ("sea_surface_wave_significant_height", "m", WaveParameter::Height),
    ("sea_surface_wave_period_at_variance_spectral_density_maximum", "s", WaveParameter::PeakPeriod),
    (
        "sea_surface_wave_mean_period_from_variance_spectral_density_first_frequency_moment",
        "s",
        WaveParameter::MeanPeriod1,
    ),
    (
        "sea_surface_wave_mean_period_from_variance_spectral_density_second_frequency_moment",
        "s",
        WaveParameter::MeanPeriod2,
    ),
    (
        "sea_surface_wave_mean_period_from_variance_spectral_density_inverse_frequency_moment",
        "s",
        WaveParameter::EnergyPeriod,
    ),
    ("sea_surface_wave_from_direction", "degree", WaveParameter::FromDirection),
    ("sea_surface_wave_directional_spread", "degree", WaveParameter::Spread),
];

/// A parameter of the sea at a place and an instant.
///
/// # Errors
/// When a file cannot be read or understood, or the question is incomplete.
pub fn look_up_waves(question: &LookUp) -> Result<Answer, Error> {
    let (options, variable) = wave_options_from(&question.settings)?;
    let quantity = question.quantity.as_deref().unwrap_or(QUANTITIES[0].0);
    let Some((_, unit, parameter)) = QUANTITIES.iter().find(|(name, _, _)| *name == quantity) else {
        let names: Vec<&str> = QUANTITIES.iter().map(|(name, _, _)| *name).collect();
        return Err(Error::CommandLine(format!(
            "--quantity `{quantity}` is not known here; expected {}",
            names.join(", ")
        )));
    };
    let latitude = needed(question.latitude_deg, "--latitude")?;
    let longitude = needed(question.longitude_deg, "--longitude")?;
    let place = Point::new(latitude, longitude).map_err(|error| Error::CommandLine(error.to_string()))?;
    let time = instant(&needed(question.time.clone(), "--time")?)?;
    let (source, factor) = open_waves(&question.files, *parameter, variable.as_deref(), &options)?;
    let site = Site { id: "here".into(), track: Track::Fixed(place), sensors: Vec::new() };
    let window = Window { start: time, end: time };
    let series = sample_wind(&source, &[site], Some(window), &question.spatial, &Silent)?.remove(0);
    let sampled = wind_at(&series, time);
    let value = sampled.value().map(|sea| match parameter {
        WaveParameter::FromDirection => Compass::<ComingFrom>::of_wind(sea.eastward_mean_m_s, sea.northward_mean_m_s)
            .map_or(f64::NAN, Compass::degrees),
        _ => factor * sea.scalar_speed_mean_m_s,
    });
    let mut answer = match (value, sampled.missing()) {
        (Some(value), _) if value.is_finite() => Answer::value(quantity, value, unit).flagged(sampled.flags()),
        (Some(_), _) => Answer::missing(quantity, unit, Missing::NoEnergy, ""),
        (None, why) => Answer::missing(quantity, unit, why.unwrap_or(Missing::NoValue), ""),
    };
    answer.inputs = serde_json::json!({
        "files": question.files,
        "nodes": series.nodes,
        "notes": source.warnings().iter().filter(|note| !note.contains("the wind")).collect::<Vec<_>>(),
    });
    Ok(answer)
}
