//! Where the dimensions of a density lie in its variable, and where its spectra are.

use super::axes::{is_direction, is_frequency, standard_name};
use super::options::SpectraOptions;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::{Header, Variable};
use crate::io::netcdf::read::Reader;
use crate::io::netcdf::time_axis::looks_like_time;
use crate::model::Grid;
use crate::numerics::axis::Axis;

/// The places of a density's dimensions.
#[derive(Debug, Clone)]
pub(super) struct Placement {
    pub(super) step: Option<usize>,
    pub(super) frequency: usize,
    /// `None` for spectra without directions (moments).
    pub(super) direction: Option<usize>,
    pub(super) row: Option<usize>,
    pub(super) column: Option<usize>,
    pub(super) station: Option<usize>,
    /// Index of each dimension of length one, or of the chosen member; 0 for the others.
    pub(super) fixed: Vec<u64>,
    pub(super) notes: Vec<String>,
}

/// Where spectra are.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Sites {
    /// A grid of latitudes and longitudes.
    Grid(Grid),
    /// Stations; positions that drift have one for each step.
    Stations {
        /// How many.
        count: usize,
        /// Degrees north, step by step where they drift, station by station.
        latitude_deg: Vec<f64>,
        /// Degrees east.
        longitude_deg: Vec<f64>,
        /// Whether there is a position for each step.
        drifting: bool,
    },
}

fn is_latitude(name: &str, variable: Option<&Variable>) -> bool {
    variable.is_some_and(|variable| {
        standard_name(variable) == "latitude"
            || variable.text("units").is_some_and(|units| units.to_lowercase().replace('s', "").starts_with("degree_n"))
    }) || matches!(name.to_lowercase().as_str(), "latitude" | "lat" | "lats" | "nlat")
}

fn is_longitude(name: &str, variable: Option<&Variable>) -> bool {
    variable.is_some_and(|variable| {
        standard_name(variable) == "longitude"
            || variable.text("units").is_some_and(|units| units.to_lowercase().replace('s', "").starts_with("degree_e"))
    }) || matches!(name.to_lowercase().as_str(), "longitude" | "lon" | "lons" | "long" | "nlon")
}

fn is_time(header: &Header, name: &str, options: &SpectraOptions) -> bool {
    if options.time.as_deref() == Some(name) {
        return true;
    }
    match header.variable(name) {
        Some(variable) => looks_like_time(variable) || standard_name(variable) == "time",
        None => matches!(name.to_lowercase().as_str(), "time" | "valid_time" | "t" | "times"),
    }
}

/// Finds the places of a density's dimensions; `directional`: it must have one of direction.
pub(super) fn placement(
    reader: &Reader,
    variable: &Variable,
    directional: bool,
    options: &SpectraOptions,
) -> Result<Placement, NetcdfError> {
    let header = &reader.header;
    let refuse = |problem: String| reader.of_variable(variable, problem);
    let (names, shape) = (header.dimension_names(variable), header.shape(variable));
    let (mut step, mut frequency, mut direction, mut row, mut column) = (None, None, None, None, None);
    let mut rest = Vec::new();
    for (place, name) in names.iter().enumerate() {
        let along = header.variable(name);
        let option = |key: &Option<String>| {
            key.as_deref().is_some_and(|key| {
                key == *name || header.variable(key).is_some_and(|v| header.dimension_names(v) == [*name])
            })
        };
        let slot = if option(&options.frequency) || (options.frequency.is_none() && is_frequency(name, along)) {
            &mut frequency
        } else if option(&options.direction) || (options.direction.is_none() && is_direction(name, along)) {
            &mut direction
        } else if is_time(header, name, options) {
            &mut step
        } else if option(&options.latitude) || is_latitude(name, along) {
            &mut row
        } else if option(&options.longitude) || is_longitude(name, along) {
            &mut column
        } else {
            rest.push(place);
            continue;
        };
        if slot.replace(place).is_some() {
            return Err(refuse(format!(
                "two of its dimensions ({}) could be the same axis (set `spectra.frequency`, `spectra.direction`, `spectra.time`)",
                names.join(", ")
            )));
        }
    }
    let lacking = |what: &str, key: &str| {
        refuse(format!("none of its dimensions ({}) is recognised as {what} (set `spectra.{key}`)", names.join(", ")))
    };
    let frequency = frequency.ok_or_else(|| lacking("frequency", "frequency"))?;
    if directional && direction.is_none() {
        return Err(lacking("direction", "direction"));
    }
    let mut placement = Placement {
        step,
        frequency,
        direction,
        row,
        column,
        station: None,
        fixed: vec![0; names.len()],
        notes: Vec::new(),
    };
    for place in rest {
        placement.take_rest(reader, variable, options, place, (names[place], shape[place]))?;
    }
    if placement.row.is_some() != placement.column.is_some() {
        return Err(lacking("latitude and longitude together", "latitude"));
    }
    Ok(placement)
}

impl Placement {
    /// A dimension that is no axis of the spectrum: the stations, a chosen member, or one of length one.
    fn take_rest(
        &mut self,
        reader: &Reader,
        variable: &Variable,
        options: &SpectraOptions,
        place: usize,
        (name, length): (&str, u64),
    ) -> Result<(), NetcdfError> {
        let header = &reader.header;
        let refuse = |problem: String| reader.of_variable(variable, problem);
        let lower = name.to_lowercase();
        let is_member = matches!(lower.as_str(), "number" | "member" | "realization" | "ensemble")
            || header.variable(name).is_some_and(|v| standard_name(v) == "realization");
        if is_member && (length > 1 || options.member.is_some()) {
            let members = match header.variable(name) {
                Some(member) if member.number_type().is_some() => reader.coordinate(member)?,
                _ => (0..length).map(|k| k as f64).collect(),
            };
            let Some(wanted) = options.member else {
                return Err(refuse(format!(
                    "it has {length} ensemble members along `{name}` (set `spectra.member` to one of them)"
                )));
            };
            let Some(index) = members.iter().position(|value| (value - wanted as f64).abs() < 1e-6) else {
                return Err(refuse(format!("it has no member {wanted}; members are {members:?} (`spectra.member`)")));
            };
            self.fixed[place] = index as u64;
            return Ok(());
        }
        let has_position = header
            .variables
            .iter()
            .any(|other| is_latitude(&other.name, Some(other)) && header.dimension_names(other).contains(&name));
        let is_station = ["station", "site", "point", "buoy", "location", "trajectory", "platform", "node"]
            .iter()
            .any(|word| lower.contains(word));
        if self.station.is_none() && self.row.is_none() && (has_position || is_station) {
            self.station = Some(place);
            return Ok(());
        }
        if length == 1 {
            return Ok(());
        }
        Err(refuse(format!(
            "its dimension `{name}` has {length} values and is neither time, frequency, direction, latitude, longitude nor a list of stations (select one of them first)"
        )))
    }

    /// Where the spectra of this variable are.
    pub(super) fn sites(
        &mut self,
        reader: &Reader,
        variable: &Variable,
        options: &SpectraOptions,
    ) -> Result<Sites, NetcdfError> {
        match (self.row, self.column) {
            (Some(row), Some(column)) => grid(reader, variable, (row, column), options),
            _ => self.stations(reader, variable, options),
        }
    }

    fn stations(
        &mut self,
        reader: &Reader,
        variable: &Variable,
        options: &SpectraOptions,
    ) -> Result<Sites, NetcdfError> {
        let header = &reader.header;
        let refuse = |problem: String| reader.of_variable(variable, problem);
        let shape = header.shape(variable);
        let count = self.station.map_or(1, |place| shape[place] as usize);
        let steps = self.step.map_or(1, |place| shape[place] as usize);
        if let (Some(latitude), Some(longitude)) = (options.latitude_deg, options.longitude_deg) {
            if count != 1 {
                return Err(refuse(format!(
                    "it has {count} stations; `spectra.latitude_deg` and `spectra.longitude_deg` give the place of a single one"
                )));
            }
            return Ok(Sites::Stations {
                count,
                latitude_deg: vec![latitude],
                longitude_deg: vec![longitude],
                drifting: false,
            });
        }
        let find = |named: &Option<String>, is: fn(&str, Option<&Variable>) -> bool| match named {
            Some(name) => header.variable(name),
            None => header.variables.iter().find(|other| other.number_type().is_some() && is(&other.name, Some(other))),
        };
        let (Some(latitude), Some(longitude)) =
            (find(&options.latitude, is_latitude), find(&options.longitude, is_longitude))
        else {
            if count == 1 {
                self.notes.push(
                    "the file does not say where its station is (set `spectra.latitude_deg` and `spectra.longitude_deg`)"
                        .to_owned(),
                );
                return Ok(Sites::Stations { count, latitude_deg: vec![], longitude_deg: vec![], drifting: false });
            }
            return Err(refuse(format!(
                "nothing says where its {count} stations are: there is no latitude and longitude (set `spectra.latitude` and `spectra.longitude`)"
            )));
        };
        let mut drifting = false;
        let mut positions = Vec::new();
        for coordinate in [latitude, longitude] {
            let values = reader.coordinate(coordinate)?;
            let along: Vec<Option<usize>> = coordinate
                .dimensions
                .iter()
                .map(|dimension| variable.dimensions.iter().position(|own| own == dimension))
                .collect();
            let moves = self.step.is_some() && along.contains(&self.step);
            drifting |= moves;
            let expected = if moves { steps } else { 1 }
                * if self.station.is_some() && along.contains(&self.station) { count } else { 1 };
            let ordered = along.first() == Some(&self.step) || !moves || along.len() == 1;
            if values.len() != expected || !ordered || (expected == 1 && count > 1) {
                return Err(refuse(format!(
                    "the positions in `{}` do not follow its steps and stations: {} values for {steps} steps and {count} stations",
                    coordinate.name,
                    values.len()
                )));
            }
            positions.push((values, moves));
        }
        let spread = |(values, moves): &(Vec<f64>, bool)| -> Vec<f64> {
            match (drifting, moves) {
                (true, false) => (0..steps).flat_map(|_| values.iter().copied()).collect(),
                (true, true) if values.len() == steps && count > 1 => {
                    values.iter().flat_map(|value| std::iter::repeat_n(*value, count)).collect()
                }
                _ => values.clone(),
            }
        };
        Ok(Sites::Stations {
            count,
            latitude_deg: spread(&positions[0]),
            longitude_deg: spread(&positions[1]),
            drifting,
        })
    }
}

fn grid(
    reader: &Reader,
    variable: &Variable,
    (row, column): (usize, usize),
    options: &SpectraOptions,
) -> Result<Sites, NetcdfError> {
    let header = &reader.header;
    let names = header.dimension_names(variable);
    let values = |place: usize, named: &Option<String>, key: &str| -> Result<(String, Vec<f64>), NetcdfError> {
        let name = named.clone().unwrap_or_else(|| names[place].to_owned());
        let coordinate = header.variable(&name).ok_or_else(|| {
            reader.of_variable(variable, format!("there is no variable `{name}` for it (set `spectra.{key}`)"))
        })?;
        let values = reader.coordinate(coordinate)?;
        if values.len() as u64 != header.shape(variable)[place] {
            return Err(reader.of_variable(
                variable,
                format!(
                    "it has {} nodes along `{name}`, which has {} values",
                    header.shape(variable)[place],
                    values.len()
                ),
            ));
        }
        Ok((name, values))
    };
    let wrong =
        |name: String, problem: String| NetcdfError::Variable { path: header.path.clone(), variable: name, problem };
    let (latitude_name, latitudes) = values(row, &options.latitude, "latitude")?;
    let (longitude_name, longitudes) = values(column, &options.longitude, "longitude")?;
    if let Some(value) = latitudes.iter().find(|value| value.abs() > 90.001) {
        return Err(wrong(latitude_name, format!("it has the value {value}; expected latitudes of -90 to 90 degrees")));
    }
    Ok(Sites::Grid(Grid::Axes {
        latitude: Axis::linear(&latitudes).map_err(|error| wrong(latitude_name, format!("it is no axis: {error}")))?,
        longitude: Axis::longitude(&longitudes)
            .map_err(|error| wrong(longitude_name, format!("it is no axis: {error}")))?,
    }))
}
