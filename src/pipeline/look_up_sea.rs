//! `sample spectrum`: the sea at a place and an instant, through exactly the code that `match` uses.

use super::look_up::{Answer, LookUp, instant, needed, unknown};
use super::look_up_moments::look_up_moments;
use super::progress::Silent;
use super::spectra_sampling::{SpectraRules, sample_spectra};
use crate::Error;
use crate::config::spectra_options_from;
use crate::io::buoy_spectra::is_buoy_text;
use crate::io::netcdf::{SpectraPlace, SpectraSource, open_spectra};
use crate::model::{Missing, NodeId, Point, Sampled, Site, SourceId, SpatialRule, SpectraSeries, SpectrumAxes, Track};
use crate::science::sample::stencil;
use crate::science::waves::{Radiator, ReduceOptions, Reducer, WindowSea, from_direction_deg, sea_over_window};
use crate::units::{Instant, Window};
use std::f64::consts::TAU;

const HEIGHT: &str = "sea_surface_wave_significant_height";
const PEAK_PERIOD: &str = "sea_surface_wave_period_at_variance_spectral_density_maximum";
const PEAK_FREQUENCY: &str = "sea_surface_wave_frequency_at_variance_spectral_density_maximum";
const PERIOD_1: &str = "sea_surface_wave_mean_period_from_variance_spectral_density_first_frequency_moment";
const PERIOD_2: &str = "sea_surface_wave_mean_period_from_variance_spectral_density_second_frequency_moment";
const PERIOD_INVERSE: &str = "sea_surface_wave_mean_period_from_variance_spectral_density_inverse_frequency_moment";
const FROM: &str = "sea_surface_wave_from_direction";
const BAND_FROM: &str = "sea_surface_wave_mean_from_direction";
const TO: &str = "sea_surface_wave_to_direction";
const SPREAD: &str = "sea_surface_wave_directional_spread";
const DENSITY: &str = "sea_surface_wave_variance_spectral_density";
const DIRECTIONAL: &str = "sea_surface_wave_directional_variance_spectral_density";
const OVERLAP: &str = "overlap_2pi";
const CROSS: &str = "cross_share";
const RADIATED: &str = "radiated_level";
const TAIL: &str = "tail_start";

/// The quantities with their units.
const QUANTITIES: [(&str, &str); 16] = [
    (HEIGHT, "m"),
    (PEAK_PERIOD, "s"),
    (PEAK_FREQUENCY, "s-1"),
    (PERIOD_1, "s"),
    (PERIOD_2, "s"),
    (PERIOD_INVERSE, "s"),
    (FROM, "degree"),
    (TO, "degree"),
    (BAND_FROM, "degree"),
    (SPREAD, "degree"),
    (DENSITY, "m2 s"),
    (DIRECTIONAL, "m2 s rad-1"),
    (OVERLAP, "rad-1"),
    (CROSS, "1"),
    (RADIATED, "dB re 1 uPa2/Hz"),
    (TAIL, "s-1"),
];

/// A quantity of the sea at a place and an instant.
///
/// # Errors
/// When a file cannot be read or understood, or the question is incomplete.
pub fn look_up_spectrum(question: &LookUp) -> Result<Answer, Error> {
    let (options, tail_start_hz) = spectra_options_from(&question.settings)?;
    let quantity = question.quantity.as_deref().unwrap_or(HEIGHT);
    let Some((_, unit)) = QUANTITIES.iter().find(|(name, _)| *name == quantity) else {
        let names: Vec<&str> = QUANTITIES.iter().map(|(name, _)| *name).collect();
        return Err(Error::CommandLine(format!(
            "--quantity `{quantity}` is not known here; expected {}",
            names.join(", ")
        )));
    };
    if question.files.iter().any(|path| is_buoy_text(path)) {
        return look_up_moments(question, quantity, unit);
    }
    let time = instant(&needed(question.time.clone(), "--time")?)?;
    let source = open_spectra(SourceId("spectra".into()), &question.files, &options)?;
    let place = match (question.latitude_deg, question.longitude_deg) {
        (Some(latitude), Some(longitude)) => {
            Point::new(latitude, longitude).map_err(|error| Error::CommandLine(error.to_string()))?
        }
        // A single station needs no place to be found.
        _ => match (source.place(), source.stations_at(0).as_slice()) {
            (SpectraPlace::Stations { count: 1, .. }, [station]) => {
                station.unwrap_or(Point::new(0.0, 0.0).map_err(|error| Error::CommandLine(error.to_string()))?)
            }
            _ => return Err(Error::CommandLine("this look-up needs --latitude and --longitude".to_owned())),
        },
    };
    let site = Site { id: "here".into(), track: Track::Fixed(place), sensors: Vec::new() };
    let window = Window { start: time, end: time };
    let rules = SpectraRules {
        reduce: ReduceOptions { tail_start_hz, ..ReduceOptions::default() },
        spatial: question.spatial,
        ..SpectraRules::default()
    };
    let series = sample_spectra(&source, &[site], &[], Some(window), &rules, &Silent)?.remove(0);
    let reducer = Reducer::new(&series.axes, &rules.water, rules.reduce);
    let sampled = sea_over_window(&series, &reducer, window, None);
    let mut answer = answer(question, quantity, unit, &sampled, &series, &source, place)?;
    answer.inputs = serde_json::json!({
        "files": source.files().iter().map(|(path, format)| serde_json::json!({ "file": path, "format": format })).collect::<Vec<_>>(),
        "variable": source.variable_words(),
        "axes": source.axes_words(),
        "nodes": series.nodes,
        "steps": used_steps(&sampled, &series, time).iter().map(|step| step.iso()).collect::<Vec<_>>(),
        "notes": source.warnings(),
    });
    Ok(answer)
}

fn used_steps(sampled: &Sampled<WindowSea>, series: &SpectraSeries, time: Instant) -> Vec<Instant> {
    match sampled.value() {
        Some(sea) => sea.steps.iter().map(|step| series.steps[*step]).collect(),
        None => {
            let after = series.steps.partition_point(|step| *step < time);
            series.steps[after.saturating_sub(1).min(series.steps.len())..(after + 1).min(series.steps.len())].to_vec()
        }
    }
}

fn answer(
    question: &LookUp,
    quantity: &str,
    unit: &str,
    sampled: &Sampled<WindowSea>,
    series: &SpectraSeries,
    source: &SpectraSource,
    place: Point,
) -> Result<Answer, Error> {
    let Some(sea) = sampled.value() else {
        let why = sampled.missing().unwrap_or(Missing::NoSpectrum);
        return Ok(Answer::missing(quantity, unit, why, &detail(source, why)));
    };
    let frequency = || needed(question.frequency_hz, "--frequency-hz");
    let state = &sea.state;
    let found: Result<f64, Missing> = match quantity {
        HEIGHT => Ok(state.hs_m),
        PEAK_PERIOD => Ok(1.0 / state.peak_bin_hz),
        PEAK_FREQUENCY => Ok(state.peak_bin_hz),
        PERIOD_1 => Ok(state.tm01_s),
        PERIOD_2 => Ok(state.tm02_s),
        PERIOD_INVERSE => Ok(state.tm10_s),
        FROM => Ok(state.mean_from_deg),
        TO => Ok((state.mean_from_deg + 180.0).rem_euclid(360.0)),
        SPREAD => Ok(state.spread_deg),
        BAND_FROM => nearest(&series.axes, frequency()?)
            .map(|k| from_direction_deg(sea.moments.a1[k], sea.moments.b1[k]))
            .ok_or(Missing::NoFrequency),
        TAIL => state.tail_start_hz.ok_or(Missing::NoTail),
        DENSITY => at_frequency(&series.axes, &state.by_frequency.density_m2_hz, frequency()?),
        DIRECTIONAL => {
            let direction = needed(question.direction_deg, "--direction-deg")?;
            directional(source, series, sea, question, place, frequency()?, direction)?
        }
        OVERLAP if series.axes.full_circle => {
            let hz = frequency()?;
            let overlap: Vec<f64> = (0..series.axes.frequencies()).map(|k| sea.overlap_2pi_per_rad(k)).collect();
            at_frequency(&series.axes, &overlap, hz)
        }
        CROSS if series.axes.full_circle => {
            let hz = frequency()?;
            nearest(&series.axes, hz).map(|k| sea.overlap[k].cross_share()).ok_or(Missing::NoFrequency)
        }
        RADIATED if series.axes.full_circle => {
            let sound_hz = frequency()?;
            at_frequency(&series.axes, &sea.source(), 0.5 * sound_hz).and_then(|source| {
                if source > 0.0 {
                    Ok(Radiator::default().density_level_db(sound_hz, source))
                } else {
                    Err(Missing::NoOpposingEnergy)
                }
            })
        }
        OVERLAP | CROSS | RADIATED => Err(Missing::SectorOfDirections),
        other => return Err(unknown(other, "a quantity of the sea")),
    };
    Ok(match found {
        Ok(value) if value.is_finite() => Answer::value(quantity, value, unit).flagged(sampled.flags()),
        Ok(_) => Answer::missing(quantity, unit, Missing::NoEnergy, "too little energy at this frequency"),
        Err(why) => Answer::missing(quantity, unit, why, &frequency_detail(why, &series.axes)),
    })
}

fn nearest(axes: &SpectrumAxes, hz: f64) -> Option<usize> {
    WindowSea::nearest_frequency(&axes.frequency_hz, &axes.frequency_edges_hz, hz)
}

fn at_frequency(axes: &SpectrumAxes, values: &[f64], hz: f64) -> Result<f64, Missing> {
    crate::science::waves::at_frequency(axes, values, hz).ok_or(Missing::NoFrequency)
}

/// The density at a frequency and a direction of travel: the bins that hold them.
fn directional(
    source: &SpectraSource,
    series: &SpectraSeries,
    sea: &WindowSea,
    question: &LookUp,
    place: Point,
    hz: f64,
    direction_deg: f64,
) -> Result<Result<f64, Missing>, Error> {
    let axes = &series.axes;
    let Some(k) = nearest(axes, hz) else { return Ok(Err(Missing::NoFrequency)) };
    let wanted = direction_deg.to_radians().rem_euclid(TAU);
    let apart = |to: f64| {
        let turn = (to - wanted).rem_euclid(TAU);
        turn.min(TAU - turn)
    };
    let directions = axes.directions();
    let j = (0..directions)
        .fold(0, |best, j| if apart(axes.direction_to_rad[j]) < apart(axes.direction_to_rad[best]) { j } else { best });
    let time = instant(&needed(question.time.clone(), "--time")?)?;
    let weights = time_weights(series, sea, time);
    let mut sum = 0.0;
    for (step, weight) in weights {
        let at = source.steps().binary_search(&series.steps[step]).unwrap_or(0);
        let window = Window { start: series.steps[step], end: series.steps[step] };
        let nodes: Vec<(NodeId, f64)> = match source.place() {
            SpectraPlace::Grid(grid) => match stencil(grid, place, &question.spatial) {
                Ok(stencil) => stencil.nodes,
                Err(why) => return Ok(Err(why)),
            },
            SpectraPlace::Stations { .. } => super::spectra_sampling::station_nodes(source, place, at),
        };
        let mut sorted: Vec<NodeId> = nodes.iter().filter(|(_, w)| *w > 0.0).map(|(node, _)| *node).collect();
        sorted.sort_unstable();
        let mut densities = Vec::new();
        for slab in source.plan(sorted.len(), Some(window)) {
            let Some(stored) = source.slab_steps(&slab).iter().position(|merged| *merged == Some(at)) else { continue };
            source.decode(&slab, &sorted, &mut densities)?;
            let cells = axes.cells();
            let (mut value, mut total) = (0.0, 0.0);
            for (node, node_weight) in nodes.iter().filter(|(_, w)| *w > 0.0) {
                let number = sorted.binary_search(node).unwrap_or(0);
                let density = densities[(stored * sorted.len() + number) * cells + k * directions + j];
                if density.is_nan() {
                    continue;
                }
                value += node_weight * density;
                total += node_weight;
                if matches!(question.spatial, SpatialRule::Nearest { .. }) {
                    break;
                }
            }
            sum += weight * value / total;
            break;
        }
    }
    Ok(Ok(sum))
}

/// Steps of the series around an instant with their linear weights.
fn time_weights(series: &SpectraSeries, sea: &WindowSea, time: Instant) -> Vec<(usize, f64)> {
    match sea.steps.as_slice() {
        [a, b] => {
            let (start, end) = (series.steps[*a].0, series.steps[*b].0);
            let share = (time.0 - start) as f64 / (end - start) as f64;
            vec![(*a, 1.0 - share), (*b, share)]
        }
        steps => steps.iter().map(|step| (*step, 1.0)).collect(),
    }
}

fn frequency_detail(why: Missing, axes: &SpectrumAxes) -> String {
    match why {
        Missing::NoFrequency => {
            format!("frequencies run from {} to {} Hz", axes.frequency_hz[0], axes.frequency_hz[axes.frequencies() - 1])
        }
        _ => String::new(),
    }
}

/// The limits that a missing value lies outside of.
fn detail(source: &SpectraSource, why: Missing) -> String {
    match (why, source.place()) {
        (Missing::OutsideGrid, SpectraPlace::Grid(grid)) => {
            let [south, north, west, east] = grid.limits();
            format!("the grid runs from {south} to {north} degrees north and from {west} to {east} degrees east")
        }
        (Missing::OutsideTime, _) => match (source.steps().first(), source.steps().last()) {
            (Some(first), Some(last)) => format!("the spectra run from {first} to {last}"),
            _ => String::new(),
        },
        (Missing::TimeGap, _) => format!("the limit is {} h", source.max_gap_ms() as f64 / 3.6e6),
        (Missing::BeyondDistance, _) => format!("the limit is {} km", source.max_distance_km()),
        _ => String::new(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantities_have_their_own_names() {
        let mut names: Vec<&str> = QUANTITIES.iter().map(|(name, _)| *name).collect();
        names.sort_unstable();
        names.dedup();
        assert_eq!(names.len(), QUANTITIES.len());
    }
}
