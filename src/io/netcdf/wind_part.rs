//! One variable of one file: units, packing, placement, times.

use super::error::NetcdfError;
use super::header::Variable;
use super::layout::{Placement, placement};
use super::packing::Packing;
use super::read::Reader;
use super::time_axis;
use super::wind::WindKind;
use super::wind_options::{DirectionSense, WindOptions, speed_unit_m_s};
use crate::model::{Flag, FlagSet, Grid};
use crate::units::Instant;

/// A valid range that leaves less than this of the winds is worth a remark, m/s.
const NARROWEST_RANGE_M_S: f64 = 5.0;

/// One variable of one file: a run of steps of one component.
#[derive(Debug)]
pub(super) struct Part {
    pub(super) reader: usize,
    pub(super) variable: String,
    pub(super) component: usize,
    pub(super) placement: Placement,
    pub(super) packing: Packing,
    /// For each stored step its place among the source's steps.
    pub(super) merged: Vec<Option<usize>>,
    pub(super) to_unit: f64,
    /// Stored steps that the archive may still replace; empty where none is known.
    pub(super) preliminary: Vec<bool>,
}

/// Understands one variable of one file; with it come the instants of its stored steps.
pub(super) fn part(
    readers: &[Reader],
    index: usize,
    variable: &Variable,
    component: usize,
    kind: WindKind,
    options: &WindOptions,
    notes: &mut Vec<String>,
    flags: &mut FlagSet,
) -> Result<(Part, Vec<Option<Instant>>), NetcdfError> {
    let reader = &readers[index];
    let refuse = |problem: String| NetcdfError::Variable {
        path: reader.header.path.clone(),
        variable: variable.name.clone(),
        problem,
    };
    let is_direction = kind == WindKind::SpeedAndDirection && component == 1;
    let units = options.units.as_deref().filter(|_| !is_direction).or_else(|| variable.text("units"));
    let to_unit = match (is_direction, units) {
        (false, Some(text)) => speed_unit_m_s(text).ok_or_else(|| {
            refuse(format!(
                "it is in `{text}`; expected a speed such as m s-1, knots or km/h (set `wind.units` to override)"
            ))
        })?,
        (false, None) => {
            return Err(refuse("it has no units; expected a speed such as m s-1 (set `wind.units`)".to_owned()));
        }
        (true, text) => direction_to_from_degrees(variable, text, options).map_err(refuse)?,
    };
    let placement = placement(reader, variable, options)?;
    notes.extend(placement.notes.iter().cloned());
    let packing = Packing::of(&reader.header, variable)?;
    notes.extend(packing.notes.iter().cloned());
    if let Some(method) = method_over_time(variable) {
        flags.insert(Flag::AveragedField);
        notes.push(format!(
            "variable `{}` holds the {method} over time (cell_methods), not values at an instant",
            variable.name
        ));
    }
    if matches!(variable.text("standard_name"), Some("x_wind" | "y_wind"))
        && matches!(placement.grid, Grid::Axes { .. })
    {
        notes.push(format!(
            "variable `{}` is along the grid's axes; on axes of latitude and longitude that is east and north",
            variable.name
        ));
    }
    if let (Some((low, high)), false) = (packing.valid_span(), is_direction)
        && (high - low) * to_unit < NARROWEST_RANGE_M_S
    {
        notes.push(format!(
            "variable `{}`: its valid range, in packed units, leaves only winds from {low} to {high}; all others are missing (a range meant in unpacked units?)",
            variable.name
        ));
    }
    let preliminary;
    let steps = match (&placement.time, placement.step) {
        (Some(name), Some(place)) => {
            let name = options.time.clone().unwrap_or_else(|| name.clone());
            let time = reader
                .header
                .variable(&name)
                .filter(|time| time.number_type().is_some())
                .ok_or_else(|| refuse(format!("there is no time variable `{name}` for it (set `wind.time`)")))?;
            if reader.header.shape(time).iter().filter(|length| **length != 1).count() > 1 {
                return Err(refuse(format!(
                    "its time `{name}` has several dimensions (a forecast with lead times?); choose one lead time first"
                )));
            }
            let long = time.text("long_name").unwrap_or_default().to_lowercase();
            let is_start = time.text("standard_name") == Some("forecast_reference_time")
                || ["initial time", "reference time", "start of the forecast"].iter().any(|words| long.contains(words));
            if is_start && options.time.is_none() && !is_analysis(reader, variable) {
                return Err(refuse(format!(
                    "its time `{name}` is when forecasts start, not when they are valid (set `wind.time` to the variable of valid times)"
                )));
            }
            if reader.header.shape(time).first() == Some(&0) {
                return Err(refuse(format!("it has no step: its time `{name}` has length zero")));
            }
            preliminary = preliminary_steps(reader, variable, place);
            let axis = time_axis::decode(reader, time, options.time_units.as_deref(), options.calendar.as_deref())?;
            notes.extend(axis.notes);
            let count = reader.header.shape(variable)[place] as usize;
            if axis.steps.len() != count {
                return Err(refuse(format!("it has {count} steps, but its time `{name}` has {}", axis.steps.len())));
            }
            axis.steps
        }
        _ => return Err(refuse("it has no dimension of time (set `wind.time`)".to_owned())),
    };
    let part = Part {
        reader: index,
        variable: variable.name.clone(),
        component,
        placement,
        packing,
        merged: Vec::new(),
        to_unit,
        preliminary,
    };
    Ok((part, steps))
}

/// Whether all lead times that a file states are zero, so that a forecast's start is also when it is valid.
fn is_analysis(reader: &Reader, variable: &Variable) -> bool {
    let named = variable.text("coordinates").unwrap_or_default();
    let of_field: Vec<&str> = named.split_whitespace().chain(reader.header.dimension_names(variable)).collect();
    let leads = reader.header.variables.iter().filter(|other| {
        of_field.contains(&other.name.as_str()) && other.text("standard_name") == Some("forecast_period")
    });
    let leads: Vec<f64> = leads.flat_map(|lead| reader.coordinate(lead).unwrap_or(vec![f64::NAN])).collect();
    !leads.is_empty() && leads.iter().all(|lead| *lead == 0.0)
}

/// Which stored steps are preliminary: archives write the version of each step along the time, 1 for final data and 5 for
/// preliminary ("0001", "0005" as texts).
fn preliminary_steps(reader: &Reader, variable: &Variable, step: usize) -> Vec<bool> {
    let along = [variable.dimensions[step]];
    let Some(version) = reader.header.variable("expver").filter(|version| version.dimensions == along) else {
        return Vec::new();
    };
    let is_preliminary: Vec<bool> = if version.number_type().is_some() {
        reader.coordinate(version).unwrap_or_default().iter().map(|version| (version - 5.0).abs() < 0.5).collect()
    } else {
        reader.texts(version).iter().map(|version| version.trim().parse() == Ok(5)).collect()
    };
    if is_preliminary.contains(&true) { is_preliminary } else { Vec::new() }
}

/// What turns a direction's numbers into degrees, with its sense in the sign: positive for coming-from, negative for going-to.
fn direction_to_from_degrees(variable: &Variable, units: Option<&str>, options: &WindOptions) -> Result<f64, String> {
    let degrees = match units.map(str::to_lowercase).as_deref() {
        Some("radian" | "radians" | "rad") => 180.0 / std::f64::consts::PI,
        Some(text) if text.starts_with("deg") || matches!(text, "arc_degree" | "arc_degrees" | "°") => 1.0,
        Some(other) => return Err(format!("its units are `{other}`; expected degrees or radians")),
        None => return Err("it has no units; expected degrees or radians".to_owned()),
    };
    let standard = variable.text("standard_name").unwrap_or_default();
    let long = variable.text("long_name").unwrap_or_default().to_lowercase();
    let of_grid = long.contains("grid")
        && ["relative to", "respect to", "grid north", "from grid"].iter().any(|w| long.contains(w));
    if of_grid && options.direction_sense.is_none() {
        return Err("it counts from the grid's axes, not from north; expected a direction from true north (where both are the same, set `wind.direction_sense` to \"from\" or \"to\")".to_owned());
    }
    let sense = options.direction_sense.or(match standard {
        "wind_from_direction" => Some(DirectionSense::From),
        "wind_to_direction" => Some(DirectionSense::To),
        _ => sense_in_words(&long),
    });
    match sense {
        Some(DirectionSense::From) => Ok(degrees),
        Some(DirectionSense::To) => Ok(-degrees),
        None => Err("nothing says whether it is where the wind comes from or goes to (set `wind.direction_sense` to \"from\" or \"to\")".to_owned()),
    }
}

/// The sense that a long name states. Only whole phrases count: "clockwise from north" and "relative to north" say where an
/// angle starts, not where a wind goes.
pub(super) fn sense_in_words(long: &str) -> Option<DirectionSense> {
    const FROM: [&str; 7] =
        ["from direction", "coming from", "comes from", "blows from", "blowing from", "from which", "direction from"];
    const TO: [&str; 7] = ["to direction", "going to", "goes to", "blowing to", "blows to", "to which", "direction to"];
    let mut said = long.to_owned();
    for start in ["clockwise from", "anticlockwise from", "degrees from", "relative to", "respect to", "referenced to"]
    {
        // Cut the words that name the start of the angle, up to the next comma or bracket.
        while let Some(at) = said.find(start) {
            let end = said[at..].find([',', ')', ';']).map_or(said.len(), |length| at + length);
            said.replace_range(at..end, "");
        }
    }
    let has = |phrases: &[&str]| phrases.iter().any(|phrase| said.contains(phrase));
    match (has(&FROM), has(&TO) || said.contains("toward")) {
        (true, false) => Some(DirectionSense::From),
        (false, true) => Some(DirectionSense::To),
        _ => None,
    }
}

/// The method by which values stand for a span of time (CF `cell_methods`): mean, maximum ...; `None` for values at an instant.
fn method_over_time(variable: &Variable) -> Option<String> {
    let text = variable.text("cell_methods")?.to_lowercase().replace(": ", ":");
    let words: Vec<&str> = text.split_whitespace().collect();
    let of_time = words.iter().find(|word| word.split(':').any(|part| matches!(part, "time" | "t")))?;
    let method = of_time.rsplit(':').next()?.trim();
    (!matches!(method, "" | "point" | "time")).then(|| method.to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_whole_phrases_state_a_sense() {
        for (long, sense) in [
            ("wind from direction", Some(DirectionSense::From)),
            ("direction from which the wind blows", Some(DirectionSense::From)),
            ("direction the wind is coming from, clockwise from north", Some(DirectionSense::From)),
            ("going to, degrees clockwise from north", Some(DirectionSense::To)),
            ("blows towards, clockwise from north", Some(DirectionSense::To)),
            ("wind direction relative to true north", None),
            ("wind direction (degrees clockwise from north)", None),
            ("wind direction", None),
        ] {
            assert_eq!(sense_in_words(long), sense, "{long}");
        }
    }
}
