//! Axes of frequency and direction as a file states them, turned into the program's one convention.

use super::options::{DirectionRotation, SpectraOptions};
use super::units::{FrequencyUnit, direction_unit_rad, frequency_unit};
use crate::io::netcdf::DirectionSense;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::{Header, Variable};
use crate::io::netcdf::read::Reader;
use crate::io::netcdf::wind_part::sense_in_words;
use crate::model::{SpectrumAxes, circle_order};
use std::f64::consts::{FRAC_PI_2, PI, TAU};

/// One archive of wave spectra writes index numbers on its axes; its own description gives 30 frequencies from
/// 0.03453 Hz in ratio 1.1 and 24 directions from 7.5 degrees, 0 going to the north (common practice of that archive).
const INDEXED_NAME: &str = "d2fd";
const INDEXED_FREQUENCIES: usize = 30;
const INDEXED_DIRECTIONS: usize = 24;

/// Axes with the place of each of their values in the file.
#[derive(Debug, Clone)]
pub(super) struct StoredAxes {
    pub(super) axes: SpectrumAxes,
    /// Stored index of each frequency of the axes.
    pub(super) frequency_order: Vec<usize>,
    /// Stored index of each direction of the axes.
    pub(super) direction_order: Vec<usize>,
    /// What was understood.
    pub(super) words: String,
    pub(super) notes: Vec<String>,
}

/// A standard name with blanks or capitals put right.
pub(super) fn standard_name(variable: &Variable) -> String {
    variable.text("standard_name").unwrap_or_default().trim().to_lowercase().replace(' ', "_")
}

/// Whether a variable is an axis of wave frequency (or period).
pub(super) fn is_frequency(name: &str, variable: Option<&Variable>) -> bool {
    let standard = variable.map(standard_name).unwrap_or_default();
    matches!(standard.as_str(), "wave_frequency" | "sea_surface_wave_frequency" | "sea_surface_wave_period")
        || matches!(
            name.to_lowercase().as_str(),
            "frequency"
                | "freq"
                | "frequencies"
                | "freqs"
                | "f"
                | "nfreq"
                | "nf"
                | "wave_frequency"
                | "wavefrequency"
                | "waveperiod"
                | "period"
                | "omega"
        )
}

/// Whether a variable is an axis of wave direction.
pub(super) fn is_direction(name: &str, variable: Option<&Variable>) -> bool {
    let standard = variable.map(standard_name).unwrap_or_default();
    matches!(standard.as_str(), "sea_surface_wave_to_direction" | "sea_surface_wave_from_direction")
        || matches!(
            name.to_lowercase().as_str(),
            "direction" | "dir" | "directions" | "dirs" | "theta" | "ndir" | "nd" | "wave_direction" | "wavedirection"
        )
}

/// Reads the axes of a density: `frequency` and `direction` are the names of its dimensions.
pub(super) fn stored_axes(
    reader: &Reader,
    density: &Variable,
    (frequency, frequencies): (&str, usize),
    (direction, directions): (&str, usize),
    options: &SpectraOptions,
) -> Result<StoredAxes, NetcdfError> {
    let mut notes = Vec::new();
    let indexed = density.name.eq_ignore_ascii_case(INDEXED_NAME)
        && frequencies == INDEXED_FREQUENCIES
        && directions == INDEXED_DIRECTIONS;
    let (centres, edges) = frequencies_hz(reader, density, frequency, frequencies, indexed, options, &mut notes)?;
    let (to_rad, sense) = directions_to_rad(reader, density, direction, directions, indexed, options, &mut notes)?;
    let mut frequency_order: Vec<usize> = (0..centres.len()).collect();
    frequency_order.sort_by(|a, b| centres[*a].total_cmp(&centres[*b]));
    let direction_order = circle_order(&to_rad);
    if direction_order.len() < to_rad.len() {
        notes.push(format!(
            "{} of {} directions of `{direction}` are stored twice (a whole turn apart); each counts once",
            to_rad.len() - direction_order.len(),
            to_rad.len()
        ));
    }
    let refuse = |problem: String| reader.of_variable(density, problem);
    if frequency_order.len() < 2 || direction_order.len() < 2 {
        return Err(refuse(format!(
            "it has {} frequencies and {} directions; expected at least two of each, since the width of a single bin is not stated",
            frequency_order.len(),
            direction_order.len()
        )));
    }
    let sorted_edges = edges.map(|edges| sorted_edges(&edges, &frequency_order)).transpose().map_err(refuse)?;
    let on_circle = |stored: &usize| {
        let turned = to_rad[*stored].rem_euclid(TAU);
        if TAU - turned < 1e-4 { 0.0 } else { turned }
    };
    let axes = SpectrumAxes::new(
        frequency_order.iter().map(|stored| centres[*stored]).collect(),
        sorted_edges,
        direction_order.iter().map(on_circle).collect(),
    )
    .map_err(|error| refuse(error.to_string()))?;
    if !axes.full_circle {
        notes.push(
            "the directions are a sector: energy outside it is not there, and opposing waves cannot be judged"
                .to_owned(),
        );
    } else if !axes.even_steps {
        notes.push("the directions have uneven steps: each bin reaches half the way to its neighbours".to_owned());
    }
    let words = format!(
        "{} frequencies from {:.4} to {:.4} Hz (`{frequency}`), {} directions (`{direction}`, {sense})",
        axes.frequencies(),
        axes.frequency_hz[0],
        axes.frequency_hz[axes.frequencies() - 1],
        axes.directions()
    );
    Ok(StoredAxes { axes, frequency_order, direction_order, words, notes })
}

/// Edges of neighbouring bins brought together: one more than bins, in the order of the axis.
fn sorted_edges(edges: &[(f64, f64)], order: &[usize]) -> Result<Vec<f64>, String> {
    let sorted: Vec<(f64, f64)> = order
        .iter()
        .map(|stored| (edges[*stored].0.min(edges[*stored].1), edges[*stored].0.max(edges[*stored].1)))
        .collect();
    let mut all = vec![sorted[0].0];
    for (k, pair) in sorted.windows(2).enumerate() {
        let (above, below) = (pair[0].1, pair[1].0);
        if (above - below).abs() > 0.01 * (above - pair[0].0).abs() {
            return Err(format!(
                "the edges of its frequency bins {k} and {} do not meet ({above} and {below} Hz)",
                k + 1
            ));
        }
        all.push(0.5 * (above + below));
    }
    all.push(sorted[sorted.len() - 1].1);
    Ok(all)
}

type Frequencies = (Vec<f64>, Option<Vec<(f64, f64)>>);

fn frequencies_hz(
    reader: &Reader,
    density: &Variable,
    dimension: &str,
    count: usize,
    indexed: bool,
    options: &SpectraOptions,
    notes: &mut Vec<String>,
) -> Result<Frequencies, NetcdfError> {
    let refuse = |problem: String| reader.of_variable(density, problem);
    if let Some(stated) = &options.frequency_hz {
        if stated.len() != count {
            return Err(refuse(format!(
                "it has {count} frequencies, but `spectra.frequency_hz` gives {}",
                stated.len()
            )));
        }
        return Ok((stated.clone(), None));
    }
    let name = options.frequency.as_deref().unwrap_or(dimension);
    let variable = coordinate(&reader.header, name, dimension, is_frequency);
    let values = variable.map(|variable| reader.coordinate(variable)).transpose()?;
    let units = options.frequency_units.as_deref().or_else(|| variable.and_then(|variable| variable.text("units")));
    let unit = match units.map(|text| (text, frequency_unit(text))) {
        Some((_, Some(unit))) => unit,
        other => {
            if indexed && values.as_ref().is_none_or(|values| is_index(values)) {
                notes.push("its axis of frequency holds index numbers; taken as 0.03453 Hz times 1.1^(n-1), as the archive that uses the name `d2fd` describes it (set `spectra.frequency_hz` to override)".to_owned());
                return Ok(((0..count).map(|n| 0.034_53 * 1.1_f64.powi(n as i32)).collect(), None));
            }
            let found = match other {
                Some((text, _)) => format!("in `{text}`"),
                None => "without a unit".to_owned(),
            };
            return Err(refuse(format!(
                "its axis of frequency `{name}` is {found}; expected Hz, s-1, rad s-1 or a period in s (set `spectra.frequency_units` or, for index numbers, `spectra.frequency_hz`)"
            )));
        }
    };
    let (Some(variable), Some(values)) = (variable, values) else {
        return Err(refuse(format!("there is no variable of its frequencies `{name}` (set `spectra.frequency_hz`)")));
    };
    if values.len() != count {
        return Err(refuse(format!("it has {count} frequencies, but `{name}` has {} values", values.len())));
    }
    if let FrequencyUnit::Frequency(scale) = unit
        && (scale - 1.0 / TAU).abs() < 1e-12
        && options.density_units.is_none()
        && !density.text("units").is_some_and(|text| text.to_lowercase().contains("hz"))
    {
        return Err(refuse(format!(
            "its axis `{name}` is angular frequency, and its own units do not say whether it is a density over Hz or over rad/s (set `spectra.density_units`, such as \"m2 Hz-1 rad-1\")"
        )));
    }
    let to_hz = |value: f64| match unit {
        FrequencyUnit::Frequency(scale) => value * scale,
        FrequencyUnit::Period(scale) => 1.0 / (value * scale),
    };
    if matches!(unit, FrequencyUnit::Period(_)) {
        notes.push(format!("the axis `{name}` holds periods; the density is taken as one over frequency"));
    }
    let edges =
        edges(reader, variable, count)?.map(|pairs| pairs.iter().map(|(a, b)| (to_hz(*a), to_hz(*b))).collect());
    Ok((values.into_iter().map(to_hz).collect(), edges))
}

/// The variable that a study or a dimension names, or the one along the dimension that is recognised.
fn coordinate<'a>(
    header: &'a Header,
    name: &str,
    dimension: &str,
    is: fn(&str, Option<&Variable>) -> bool,
) -> Option<&'a Variable> {
    let numbers = |variable: &&Variable| variable.number_type().is_some();
    header.variable(name).filter(numbers).or_else(|| {
        header
            .variables
            .iter()
            .filter(numbers)
            .find(|variable| header.dimension_names(variable) == [dimension] && is(&variable.name, Some(variable)))
    })
}

/// Whether values just count: 0, 1, 2 ... or 1, 2, 3 ...
fn is_index(values: &[f64]) -> bool {
    let start = values.first().copied().unwrap_or(f64::NAN);
    matches!(start.total_cmp(&start.trunc()), std::cmp::Ordering::Equal)
        && (0.0..=1.0).contains(&start)
        && values.iter().enumerate().all(|(k, value)| (value - start - k as f64).abs() < 1e-9)
}

/// Lower and upper edges of the bins: by the bounds that CF names, or by variables beside the axis.
fn edges(reader: &Reader, axis: &Variable, count: usize) -> Result<Option<Vec<(f64, f64)>>, NetcdfError> {
    if let Some(bounds) = axis.text("bounds").and_then(|name| reader.header.variable(name)) {
        let values = reader.coordinate(bounds)?;
        if values.len() != 2 * count {
            return Err(
                reader.of_variable(bounds, format!("it has {} values; expected two for each frequency", values.len()))
            );
        }
        return Ok(Some(values.chunks_exact(2).map(|pair| (pair[0], pair[1])).collect()));
    }
    let find = |standard: &str, suffixes: [&str; 3]| {
        reader.header.variables.iter().find(|other| {
            other.dimensions == axis.dimensions
                && other.number_type().is_some()
                && (standard_name(other) == standard
                    || suffixes.iter().any(|suffix| other.name.eq_ignore_ascii_case(&format!("{}{suffix}", axis.name))))
        })
    };
    let lower = find("frequency_of_lower_band", ["1", "_lower", "_low"]);
    let upper = find("frequency_of_upper_band", ["2", "_upper", "_high"]);
    match (lower, upper) {
        (Some(lower), Some(upper)) => {
            Ok(Some(reader.coordinate(lower)?.into_iter().zip(reader.coordinate(upper)?).collect()))
        }
        _ => Ok(None),
    }
}

fn directions_to_rad(
    reader: &Reader,
    density: &Variable,
    dimension: &str,
    count: usize,
    indexed: bool,
    options: &SpectraOptions,
    notes: &mut Vec<String>,
) -> Result<(Vec<f64>, String), NetcdfError> {
    let refuse = |problem: String| reader.of_variable(density, problem);
    let name = options.direction.as_deref().unwrap_or(dimension);
    let variable = coordinate(&reader.header, name, dimension, is_direction);
    let values = variable.map(|variable| reader.coordinate(variable)).transpose()?;
    let described = variable.map(|variable| {
        format!("{} {}", standard_name(variable).replace('_', " "), variable.text("long_name").unwrap_or_default())
            .to_lowercase()
    });
    let described = described.unwrap_or_default();
    let units = options.direction_units.as_deref().or_else(|| variable.and_then(|variable| variable.text("units")));
    let mut archive = false;
    let radians: Vec<f64> = if let Some(stated) = &options.direction_deg {
        stated.iter().map(|degrees| degrees.to_radians()).collect()
    } else {
        match (values, units.and_then(direction_unit_rad)) {
            (Some(values), Some(scale)) => values.into_iter().map(|value| value * scale).collect(),
            (values, None) if indexed && values.as_ref().is_none_or(|values| is_index(values)) => {
                archive = true;
                notes.push("its axis of direction holds index numbers; taken as 7.5 degrees in steps of 15, 0 going to the north, as the archive that uses the name `d2fd` describes it (set `spectra.direction_deg` to override)".to_owned());
                (0..count).map(|n| (7.5 + 15.0 * n as f64).to_radians()).collect()
            }
            (Some(values), None) if units.is_none() && closes(&values, 360.0) => {
                notes.push(format!("the axis `{name}` has no unit; its steps close the circle in degrees"));
                values.into_iter().map(f64::to_radians).collect()
            }
            (Some(values), None) if units.is_none() && closes(&values, TAU) => {
                notes.push(format!("the axis `{name}` has no unit; its steps close the circle in radians"));
                values
            }
            (Some(_), None) => {
                return Err(refuse(format!(
                    "its axis of direction `{name}` is {}; expected degrees or radians (set `spectra.direction_units` or, for index numbers, `spectra.direction_deg`)",
                    units.map_or_else(|| "without a unit".to_owned(), |text| format!("in `{text}`"))
                )));
            }
            (None, _) => {
                return Err(refuse(format!(
                    "there is no variable of its directions `{name}` (set `spectra.direction_deg`)"
                )));
            }
        }
    };
    if radians.len() != count {
        return Err(refuse(format!("it has {count} directions, but {} are given for it", radians.len())));
    }
    if let Some(bad) = radians.iter().find(|value| !value.is_finite() || value.abs() > 4.0 * PI) {
        return Err(refuse(format!(
            "its axis of direction `{name}` holds {bad} rad; expected angles within two turns (is its unit right? set `spectra.direction_units`)"
        )));
    }
    let rotation = options.direction_rotation.unwrap_or_else(|| {
        let counter = ["counterclockwise", "counter-clockwise", "counter clockwise", "anticlockwise", "anti-clockwise"];
        if counter.iter().any(|word| described.contains(word)) || described.contains("cartesian") {
            DirectionRotation::CounterclockwiseFromEast
        } else {
            DirectionRotation::ClockwiseFromNorth
        }
    });
    let sense = options.direction_sense.or_else(|| archive.then_some(DirectionSense::To)).or_else(|| {
        match variable.map(standard_name).as_deref() {
            Some("sea_surface_wave_to_direction") => Some(DirectionSense::To),
            Some("sea_surface_wave_from_direction") => Some(DirectionSense::From),
            _ => sense_in_words(&described).or_else(|| sense_of_waves(&described)),
        }
    });
    let Some(sense) = sense else {
        return Err(refuse(format!(
            "nothing says whether its directions `{name}` are where waves come from or go to (set `spectra.direction_sense` to \"from\" or \"to\")"
        )));
    };
    let turn = if sense == DirectionSense::From { PI } else { 0.0 };
    let to = radians.into_iter().map(|angle| match rotation {
        DirectionRotation::ClockwiseFromNorth => angle + turn,
        DirectionRotation::CounterclockwiseFromEast => FRAC_PI_2 - angle + turn,
    });
    let words = format!(
        "{}, {}",
        if sense == DirectionSense::From { "coming from" } else { "going to" },
        match rotation {
            DirectionRotation::ClockwiseFromNorth => "clockwise from north",
            DirectionRotation::CounterclockwiseFromEast => "counter-clockwise from east",
        }
    );
    Ok((to.collect(), words))
}

/// The sense that words about waves state, beyond those about any direction.
fn sense_of_waves(described: &str) -> Option<DirectionSense> {
    let has = |phrases: [&str; 4]| phrases.iter().any(|phrase| described.contains(phrase));
    let to = has(["go to", "travel to", "propagate to", "move to"]);
    let from = has(["come from", "arrive from", "waves from", "arriving from"]);
    match (to, from) {
        (true, false) => Some(DirectionSense::To),
        (false, true) => Some(DirectionSense::From),
        _ => None,
    }
}

/// Whether equal steps of the values make a whole turn.
fn closes(values: &[f64], turn: f64) -> bool {
    let step = turn / values.len() as f64;
    let steps = |values: &[f64]| {
        values.windows(2).all(|pair| {
            let apart = (pair[1] - pair[0]).rem_euclid(turn);
            (apart - step).abs() < 0.01 * step || (turn - apart - step).abs() < 0.01 * step
        })
    };
    values.len() > 2 && steps(values)
}
