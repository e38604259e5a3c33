//! How a field lies in its variable: which dimension is time, row, column, and what to fix of the others.

use super::error::NetcdfError;
use super::header::{Header, Variable};
use super::read::Reader;
use super::scattered::places;
use super::time_axis::looks_like_time;
use super::wind_options::WindOptions;
use crate::model::{Grid, Layout};
use crate::numerics::axis::Axis;

/// The places of the dimensions of a field.
#[derive(Debug, Clone)]
pub(super) struct Placement {
    pub(super) step: Option<usize>,
    pub(super) row: Option<usize>,
    pub(super) column: Option<usize>,
    /// Indices of the other dimensions; several alternatives are tried in order until one has a value (final versions before
    /// preliminary ones).
    pub(super) fixed: Vec<Vec<u64>>,
    /// Name of the time variable.
    pub(super) time: Option<String>,
    pub(super) grid: Grid,
    pub(super) height_m: Option<f64>,
    pub(super) notes: Vec<String>,
}

/// What a dimension is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Axes {
    Time,
    Latitude,
    Longitude,
    Height,
    Member,
    Version,
    Lead,
    Other,
}

fn lower(text: Option<&str>) -> String {
    text.unwrap_or_default().to_lowercase()
}

/// What a dimension is, from its coordinate variable and its name.
fn axis_of(header: &Header, dimension: &str, options: &WindOptions) -> Axes {
    let is = |option: &Option<String>| option.as_deref() == Some(dimension);
    if is(&options.time) {
        return Axes::Time;
    }
    if is(&options.latitude) {
        return Axes::Latitude;
    }
    if is(&options.longitude) {
        return Axes::Longitude;
    }
    if let Some(variable) = header.variable(dimension) {
        let standard = lower(variable.text("standard_name"));
        let units = lower(variable.text("units"));
        match standard.as_str() {
            "time" => return Axes::Time,
            "latitude" => return Axes::Latitude,
            "longitude" => return Axes::Longitude,
            "height" => return Axes::Height,
            "realization" => return Axes::Member,
            "forecast_period" => return Axes::Lead,
            // Kept apart from real latitudes, whose units some files give them.
            "grid_latitude" | "grid_longitude" | "projection_x_coordinate" | "projection_y_coordinate" => {
                return Axes::Other;
            }
            _ => {}
        }
        if looks_like_time(variable) {
            return Axes::Time;
        }
        match units.as_str() {
            "degrees_north" | "degree_north" | "degrees_n" | "degree_n" | "degreen" | "degreesn" => {
                return Axes::Latitude;
            }
            "degrees_east" | "degree_east" | "degrees_e" | "degree_e" | "degreee" | "degreese" => {
                return Axes::Longitude;
            }
            _ => {}
        }
        if lower(variable.text("axis")) == "t" {
            return Axes::Time;
        }
    }
    match dimension.to_lowercase().as_str() {
        "time" | "valid_time" | "t" | "timestep" | "times" | "date" => Axes::Time,
        "lat" | "latitude" | "nlat" | "lats" => Axes::Latitude,
        "lon" | "longitude" | "nlon" | "lons" | "long" => Axes::Longitude,
        "height" | "heightaboveground" | "level" | "lev" | "z" | "altitude" | "height_10m" => Axes::Height,
        "number" | "member" | "realization" | "ensemble" | "ens" => Axes::Member,
        "expver" => Axes::Version,
        "step" | "lead_time" | "leadtime" | "forecast_period" => Axes::Lead,
        _ => Axes::Other,
    }
}

/// The dimension along which a field's time runs, with the variable that holds it: the one that the study names; valid
/// times, along whichever dimension; the coordinate of a dimension of times; else a time among the field's `coordinates`.
fn time_of(header: &Header, variable: &Variable, options: &WindOptions) -> Option<(usize, String)> {
    let (names, shape) = (header.dimension_names(variable), header.shape(variable));
    // The dimension of a variable that has one, besides such of length one.
    let along = |name: &str| -> Option<usize> {
        let of_time = header.variable(name).filter(|time| time.number_type().is_some())?;
        let own: Vec<usize> =
            of_time.dimensions.iter().filter_map(|at| variable.dimensions.iter().position(|d| d == at)).collect();
        let long: Vec<usize> = own.iter().copied().filter(|place| shape[*place] > 1).collect();
        match (of_time.dimensions.len() == own.len(), &long[..], &own[..]) {
            (true, [place], _) | (true, [], [.., place]) => Some(*place),
            _ => None,
        }
    };
    if let Some(named) = &options.time {
        let place = along(named).or_else(|| names.iter().position(|name| name == named))?;
        return Some((place, named.clone()));
    }
    if let Some(place) = along("valid_time") {
        return Some((place, "valid_time".to_owned()));
    }
    if let Some(place) = names.iter().position(|name| axis_of(header, name, options) == Axes::Time) {
        return Some((place, names[place].to_owned()));
    }
    let coordinates = variable.text("coordinates").unwrap_or_default();
    coordinates.split_whitespace().find_map(|name| {
        let time = header.variable(name).filter(|time| looks_like_time(time))?;
        let is_start = lower(time.text("standard_name")) == "forecast_reference_time";
        along(name).filter(|_| !is_start).map(|place| (place, name.to_owned()))
    })
}

/// Finds the placement of a field.
pub(super) fn placement(reader: &Reader, variable: &Variable, options: &WindOptions) -> Result<Placement, NetcdfError> {
    let header = &reader.header;
    let refuse =
        |problem: String| NetcdfError::Variable { path: header.path.clone(), variable: variable.name.clone(), problem };
    let names = header.dimension_names(variable);
    let mut axes = [None; 3];
    if let Some(pressure) = scalar(reader, variable, "air_pressure") {
        return Err(refuse(format!("it is at an air pressure of {pressure}; expected a wind near the surface")));
    }
    let height_m = scalar(reader, variable, "height").or_else(|| super::roles::height_in_name_m(variable));
    let mut rest = Rest { fixed: vec![vec![0_u64; names.len()]], height_m, notes: Vec::new() };
    let time = time_of(header, variable, options);
    let scattered = places(reader, variable, options)?;
    let own = |place: usize| scattered.as_ref().is_some_and(|found| found.row == Some(place) || found.column == place);
    if let Some((of_time, _)) = time.as_ref().filter(|(place, _)| own(*place)) {
        return Err(refuse(format!(
            "its latitude and longitude change along `{}`, its time; expected nodes that stay (give the wind of a ship or a drifting buoy as a table)",
            names[*of_time]
        )));
    }
    for (place, name) in names.iter().enumerate() {
        if own(place) {
            continue;
        }
        let axis = match (&time, axis_of(header, name, options)) {
            (Some((of_time, _)), _) if *of_time == place => Axes::Time,
            // The start of the one forecast in the file; the time runs along another dimension.
            (Some(_), Axes::Time) if header.shape(variable)[place] == 1 => Axes::Other,
            (_, axis) => axis,
        };
        let wanted = match axis {
            Axes::Time => Some(0),
            Axes::Latitude => Some(1),
            Axes::Longitude => Some(2),
            _ => None,
        };
        if let Some(wanted) = wanted {
            if axes[wanted].is_some() {
                return Err(refuse(format!(
                    "two of its dimensions ({}) could be the same axis; set `wind.time`, `wind.latitude`, `wind.longitude`",
                    names.join(", ")
                )));
            }
            axes[wanted] = Some(place);
            continue;
        }
        let is_valid_time = time.as_ref().is_some_and(|(_, name)| name == "valid_time");
        rest.take(reader, variable, options, (place, axis), is_valid_time)?;
    }
    let Rest { fixed, height_m, mut notes } = rest;
    if let (Some(wanted_m), Some(found_m)) = (options.height_m, height_m)
        && (wanted_m - found_m).abs() > 1e-6
    {
        return Err(refuse(format!("it is at {found_m} m, but `wind.height_m` asks for {wanted_m} m")));
    }
    let [step, row, column] = axes;
    let time = match (time, step) {
        (Some((_, name)), _) => Some(name),
        (None, place) => place.map(|place| names[place].to_owned()),
    };
    let (row, column, grid) = match scattered {
        Some(found) => {
            notes.extend(found.note);
            (found.row, Some(found.column), found.grid)
        }
        None => (row, column, grid(reader, variable, &names, row, column, options)?),
    };
    Ok(Placement { step, row, column, fixed, time, grid, height_m, notes })
}

/// What is fixed of a field's further dimensions, as they are gone through.
struct Rest {
    fixed: Vec<Vec<u64>>,
    height_m: Option<f64>,
    notes: Vec<String>,
}

impl Rest {
    /// Takes a dimension that is neither time, latitude nor longitude: of length one, or one of its values is chosen.
    fn take(
        &mut self,
        reader: &Reader,
        variable: &Variable,
        options: &WindOptions,
        (place, axis): (usize, Axes),
        is_valid_time: bool,
    ) -> Result<(), NetcdfError> {
        let header = &reader.header;
        let refuse = |problem: String| NetcdfError::Variable {
            path: header.path.clone(),
            variable: variable.name.clone(),
            problem,
        };
        let (names, shape) = (header.dimension_names(variable), header.shape(variable));
        let name = names[place];
        let Self { fixed, height_m, notes } = self;
        let values = || -> Result<Vec<f64>, NetcdfError> {
            match header.variable(name) {
                Some(coordinate) if coordinate.number_type().is_some() => reader.coordinate(coordinate),
                _ => Ok((0..shape[place]).map(|index| index as f64).collect()),
            }
        };
        let mut choose = |chosen: Vec<u64>| {
            *fixed = chosen
                .iter()
                .flat_map(|index| {
                    fixed.iter().map(|indices| {
                        let mut indices = indices.clone();
                        indices[place] = *index;
                        indices
                    })
                })
                .collect();
        };
        match (axis, shape[place]) {
            (Axes::Height, 1) => {
                if header.variable(name).is_some() {
                    let scale_m = length_unit_m(header, name).map_err(refuse)?;
                    *height_m = values()?.first().map(|height| height * scale_m).or(*height_m);
                }
            }
            (Axes::Lead, 1) => {
                let lead = values()?.first().copied().filter(|_| header.variable(name).is_some()).unwrap_or(0.0);
                // Where the time is stated to be the valid time, the lead is settled.
                if lead != 0.0 && options.time.is_none() && !is_valid_time {
                    return Err(refuse(format!(
                        "it is a forecast of lead time {lead} (`{name}`), so that its times may be those of the forecast's start; set `wind.time` to the variable of valid times"
                    )));
                }
            }
            (_, 1) => {}
            (Axes::Height, _) => {
                let scale_m = length_unit_m(header, name).map_err(refuse)?;
                let heights: Vec<f64> = values()?.iter().map(|height| height * scale_m).collect();
                let wanted_m = options.height_m.unwrap_or(10.0);
                let Some(index) = heights.iter().position(|height| (height - wanted_m).abs() < 1e-6) else {
                    return Err(refuse(format!(
                        "it has the heights {heights:?} m, none of them {wanted_m} m (set `wind.height_m`)"
                    )));
                };
                *height_m = Some(wanted_m);
                choose(vec![index as u64]);
            }
            (Axes::Member, count) => {
                let members = values()?;
                let Some(member) = options.member else {
                    return Err(refuse(format!(
                        "it has {count} ensemble members ({} to {}); set `wind.member`",
                        members[0],
                        members[members.len() - 1]
                    )));
                };
                let Some(index) = members.iter().position(|value| (value - member as f64).abs() < 1e-6) else {
                    return Err(refuse(format!("it has no member {member}; members are {members:?} (`wind.member`)")));
                };
                choose(vec![index as u64]);
            }
            (Axes::Version, count) => {
                // Archives number final data 1 and preliminary data 5: the smaller goes first.
                let versions = values()?;
                let mut order: Vec<u64> = (0..count).collect();
                order.sort_by(|a, b| versions[*a as usize].total_cmp(&versions[*b as usize]));
                notes.push(format!(
                    "variable `{}`: final values go before preliminary ones along `{name}`",
                    variable.name
                ));
                choose(order);
            }
            (Axes::Lead, count) => {
                return Err(refuse(format!(
                    "it is a forecast with {count} lead times along `{name}`, whose valid times overlap; choose one lead time a valid time first"
                )));
            }
            (_, count) => {
                return Err(refuse(layout_problem(header, name, count)));
            }
        }
        Ok(())
    }
}

/// Metres a unit of a vertical coordinate.
///
/// # Errors
/// A sentence, when the coordinate is no height: pressure and model levels must not pass for metres.
fn length_unit_m(header: &Header, dimension: &str) -> Result<f64, String> {
    let coordinate = header.variable(dimension);
    let units = coordinate.and_then(|coordinate| coordinate.text("units"));
    match units.map(str::to_lowercase).as_deref() {
        Some("m" | "metre" | "metres" | "meter" | "meters") => Ok(1.0),
        Some("km" | "kilometre" | "kilometres" | "kilometer" | "kilometers") => Ok(1000.0),
        found => Err(format!(
            "its dimension `{dimension}` is a vertical axis in {}; expected heights in metres (select the 10 m wind first, or name another variable)",
            found.map_or_else(|| "no stated unit".to_owned(), |unit| format!("`{unit}`"))
        )),
    }
}

/// Why a field with a further dimension cannot be sampled.
fn layout_problem(header: &Header, dimension: &str, count: u64) -> String {
    let of_dimension: Vec<&Variable> = header
        .variables
        .iter()
        .filter(|other| {
            matches!(lower(other.text("standard_name")).as_str(), "latitude" | "longitude")
                || matches!(
                    other.name.to_lowercase().as_str(),
                    "lat" | "lon" | "latitude" | "longitude" | "xlat" | "xlong"
                )
        })
        .collect();
    let ranks: Vec<usize> = of_dimension.iter().map(|other| other.dimensions.len()).collect();
    let standard = header.variable(dimension).and_then(|variable| variable.text("standard_name")).unwrap_or_default();
    let layout = match standard {
        "grid_latitude" | "grid_longitude" => Some(Layout::RotatedPole),
        "projection_x_coordinate" | "projection_y_coordinate" => Some(Layout::Projected),
        _ if ranks.iter().any(|rank| *rank >= 2) => Some(Layout::Curvilinear),
        _ if ranks.contains(&1)
            && of_dimension.iter().any(|other| header.dimension_names(other).contains(&dimension)) =>
        {
            let name = dimension.to_lowercase();
            Some(if name.contains("stat") || name.contains("site") { Layout::Stations } else { Layout::Nodes })
        }
        _ => None,
    };
    match layout {
        Some(layout) => not_sampled(layout),
        None => format!(
            "its dimension `{dimension}` has {count} values and is neither time, latitude nor longitude (set `wind.time`, `wind.latitude` or `wind.longitude`, or select one of them first)"
        ),
    }
}

fn not_sampled(layout: Layout) -> String {
    let article = if layout == Layout::Nodes { "" } else { "a " };
    format!(
        "it lies on {article}{}, which is not sampled; expected latitude and longitude as axes (regrid it first)",
        layout.name()
    )
}

/// A scalar coordinate of a variable.
fn scalar(reader: &Reader, variable: &Variable, standard_name: &str) -> Option<f64> {
    let names = variable.text("coordinates")?;
    names.split_whitespace().find_map(|name| {
        let coordinate = reader.header.variable(name)?;
        let count: u64 = reader.header.shape(coordinate).iter().product();
        (coordinate.text("standard_name") == Some(standard_name) && count == 1)
            .then(|| reader.coordinate(coordinate).ok()?.first().copied())?
            .map(|value| if coordinate.text("units") == Some("km") { value * 1000.0 } else { value })
    })
}

fn grid(
    reader: &Reader,
    variable: &Variable,
    names: &[&str],
    row: Option<usize>,
    column: Option<usize>,
    options: &WindOptions,
) -> Result<Grid, NetcdfError> {
    let header = &reader.header;
    let values = |place: Option<usize>,
                  named: &Option<String>,
                  standard: &str,
                  short: &[&str]|
     -> Result<(String, Vec<f64>), NetcdfError> {
        let name = match (place, named) {
            (_, Some(named)) => named.clone(),
            (Some(place), None) => names[place].to_owned(),
            (None, None) => {
                let found = header.variables.iter().find(|other| {
                    other.text("standard_name") == Some(standard) || short.contains(&other.name.to_lowercase().as_str())
                });
                found.map_or_else(|| standard.to_owned(), |found| found.name.clone())
            }
        };
        let refuse = |problem: String| NetcdfError::Variable {
            path: header.path.clone(),
            variable: variable.name.clone(),
            problem,
        };
        let coordinate = header.variable(&name).ok_or_else(|| {
            refuse(format!("there is no {standard} variable `{name}` for it (set `wind.{standard}`)"))
        })?;
        if coordinate.dimensions.len() > 1 {
            return Err(refuse(not_sampled(Layout::Curvilinear)));
        }
        if coordinate.text("units").is_some_and(|units| units.to_lowercase().starts_with("rad")) {
            return Err(refuse(format!("its {standard} `{name}` is in radians; expected degrees")));
        }
        let values = reader.coordinate(coordinate)?;
        let wanted = place.map_or(1, |place| header.shape(variable)[place]);
        if values.len() as u64 != wanted {
            return Err(refuse(format!(
                "it has {wanted} nodes along {standard}, but `{name}` has {} values (set `wind.{standard}`)",
                values.len()
            )));
        }
        Ok((name, values))
    };
    let (latitude_name, latitudes) = values(row, &options.latitude, "latitude", &["lat", "latitude"])?;
    let (longitude_name, longitudes) = values(column, &options.longitude, "longitude", &["lon", "longitude"])?;
    let wrong = |name: &str, error: crate::numerics::axis::AxisError| NetcdfError::Variable {
        path: header.path.clone(),
        variable: name.to_owned(),
        problem: format!("it is no axis: {error}"),
    };
    if let Some(value) = latitudes.iter().find(|value| value.abs() > 90.001) {
        return Err(NetcdfError::Variable {
            path: header.path.clone(),
            variable: latitude_name,
            problem: format!("it has the value {value}; expected latitudes of -90 to 90 degrees"),
        });
    }
    Ok(Grid::Axes {
        latitude: Axis::linear(&latitudes).map_err(|error| wrong(&latitude_name, error))?,
        longitude: Axis::longitude(&longitudes).map_err(|error| wrong(&longitude_name, error))?,
    })
}
