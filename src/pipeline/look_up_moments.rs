//! `sample spectrum` on the texts of a buoy archive: directional moments alone.

use super::look_up::{Answer, LookUp, instant, needed};
use crate::Error;
use crate::io::buoy_spectra::read_buoy_spectra;
use crate::model::{Missing, MomentSeries};
use crate::science::waves::{MomentSea, moment_sea, shapes_of_moments};
use crate::units::Instant;
use std::f64::consts::TAU;

/// Spectra farther apart than this are not bridged, ms.
const MAX_GAP_MS: i64 = 2 * 3_600_000;
/// Frequencies are printed with three decimals, Hz.
const SAME_HZ: f64 = 6e-4;

/// A quantity of the sea at an instant; `unit` is that of the quantity.
///
/// # Errors
/// When a text cannot be read, or the question is incomplete.
pub(super) fn look_up_moments(question: &LookUp, quantity: &str, unit: &str) -> Result<Answer, Error> {
    let time = instant(&needed(question.time.clone(), "--time")?)?;
    let series = read_buoy_spectra(&question.files)?;
    let mut answer = match steps(&series, time) {
        Err(why) => {
            let span = series.steps.first().zip(series.steps.last());
            let detail = span.map_or(String::new(), |(first, last)| format!("the spectra run from {first} to {last}"));
            Answer::missing(quantity, unit, why, &detail)
        }
        Ok(steps) => match moment_sea(&series, &steps) {
            Err(why) => Answer::missing(quantity, unit, why, ""),
            Ok(sea) => of_sea(question, quantity, unit, &series, &sea)?,
        },
    };
    answer.inputs = serde_json::json!({
        "files": question.files,
        "frequencies": series.frequency_hz.len(),
        "spectra": series.steps.len(),
        "notes": series.notes,
    });
    Ok(answer)
}

/// The steps around an instant with their weights.
fn steps(series: &MomentSeries, time: Instant) -> Result<Vec<(usize, f64)>, Missing> {
    let after = series.steps.partition_point(|step| *step < time);
    let Some(next) = series.steps.get(after) else { return Err(Missing::OutsideTime) };
    if *next == time {
        return Ok(vec![(after, 1.0)]);
    }
    let Some(before) = after.checked_sub(1) else { return Err(Missing::OutsideTime) };
    let (start, end) = (series.steps[before].0, next.0);
    if end - start > MAX_GAP_MS {
        return Err(Missing::TimeGap);
    }
    let share = (time.0 - start) as f64 / (end - start) as f64;
    Ok(vec![(before, 1.0 - share), (after, share)])
}

fn of_sea(
    question: &LookUp,
    quantity: &str,
    unit: &str,
    series: &MomentSeries,
    sea: &MomentSea,
) -> Result<Answer, Error> {
    let at = |values: &[f64]| -> Result<Option<f64>, Error> {
        let hz = needed(question.frequency_hz, "--frequency-hz")?;
        Ok(series.frequency_hz.iter().position(|f| (f - hz).abs() < SAME_HZ).map(|k| values[k]))
    };
    let found: Result<f64, Missing> = match quantity {
        "sea_surface_wave_significant_height" => Ok(sea.hs_m),
        "sea_surface_wave_period_at_variance_spectral_density_maximum" => Ok(1.0 / sea.peak_bin_hz),
        "sea_surface_wave_frequency_at_variance_spectral_density_maximum" => Ok(sea.peak_bin_hz),
        "sea_surface_wave_mean_period_from_variance_spectral_density_first_frequency_moment" => Ok(sea.periods_s[0]),
        "sea_surface_wave_mean_period_from_variance_spectral_density_second_frequency_moment" => Ok(sea.periods_s[1]),
        "sea_surface_wave_mean_period_from_variance_spectral_density_inverse_frequency_moment" => Ok(sea.periods_s[2]),
        "sea_surface_wave_from_direction" => Ok(sea.mean_from_deg),
        "sea_surface_wave_to_direction" => Ok((sea.mean_from_deg + 180.0).rem_euclid(360.0)),
        "sea_surface_wave_directional_spread" => Ok(sea.spread_deg),
        "sea_surface_wave_variance_spectral_density" => at(&sea.density_m2_hz)?.ok_or(Missing::NoFrequency),
        "sea_surface_wave_mean_from_direction" => at(&sea.from_deg)?.ok_or(Missing::NoFrequency),
        _ => Err(Missing::MomentsOnly),
    };
    let detail = match (quantity, &found) {
        ("overlap_2pi", _) => {
            let moments = at(&sea.r1)?.zip(at(&sea.centred_r2)?);
            let range =
                moments.and_then(|(r1, r2)| shapes_of_moments(r1, Some(r2).filter(|r2| r2.is_finite())).ends_db());
            match range {
                Some((low, high)) => {
                    let per_rad = |db: f64| libm::pow(10.0, db / 10.0) / TAU;
                    format!(
                        "between {:.3e} and {:.3e} 1/rad over shapes with these moments, never a value in a verdict",
                        per_rad(low),
                        per_rad(high)
                    )
                }
                None => "no shape has these moments".to_owned(),
            }
        }
        (_, Err(Missing::NoFrequency)) => "the frequency is not one of the buoy's".to_owned(),
        _ => String::new(),
    };
    Ok(match found {
        Ok(value) if value.is_finite() => Answer::value(quantity, value, unit),
        Ok(_) => Answer::missing(quantity, unit, Missing::IncompleteSpectrum, "too much energy has no direction"),
        Err(why) => Answer::missing(quantity, unit, why, &detail),
    })
}
