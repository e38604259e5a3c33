//! Which columns of a table are the wind.

use super::error::WindTableError;
use super::read::WindTableOptions;
use super::unit::{speed_factor, unit_in_name};
use crate::io::delimited::plain_name;
use crate::io::table::PlainTable;
use std::path::Path;

/// Where the time of a row is.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum TimeColumns {
    /// One column.
    One(usize),
    /// Year, month, day, hour and, where there is one, minute.
    Split([usize; 4], Option<usize>),
}

/// The wind's columns, with metres per second in one unit of each speed.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct WindRoles {
    pub(super) time: TimeColumns,
    pub(super) speed: Option<(usize, f64)>,
    /// The direction and whether it is where the wind comes from.
    pub(super) direction: Option<(usize, bool)>,
    pub(super) components: Option<[(usize, f64); 2]>,
    pub(super) height_m: f64,
    pub(super) notes: Vec<String>,
}

const TIME: &[&str] =
    &["time", "time_utc", "utc", "datetime", "date_time", "timestamp", "datetime_utc", "timestamp_utc"];
const SPEED: &[&str] = &["wind_speed", "wspd", "windspeed", "wind_spd", "sfcwind", "speed"];
const DIRECTION: &[&str] =
    &["wind_from_direction", "wind_to_direction", "wind_direction", "wdir", "winddirection", "wind_dir", "direction"];
const EASTWARD: &[&str] =
    &["eastward_wind", "wind_eastward", "u10", "u", "wind_u", "u_wind", "eastward", "uas", "ugrd"];
const NORTHWARD: &[&str] =
    &["northward_wind", "wind_northward", "v10", "v", "wind_v", "v_wind", "northward", "vas", "vgrd"];

/// Names for the parts of a time, with their case: in one common form "MM" is the month and "mm" the minute.
const PARTS: [&[&str]; 5] = [
    &["YY", "YYYY", "yyyy", "year", "Year", "YEAR", "yr"],
    &["MM", "month", "Month", "MONTH", "mo"],
    &["DD", "dd", "day", "Day", "DAY", "dy"],
    &["hh", "HH", "hour", "Hour", "HOUR", "hr"],
    &["mm", "minute", "Minute", "MINUTE", "min", "mn"],
];

/// A name without its unit and height: the word, and the height in metres if it ends in one.
fn word_and_height(name: &str) -> (String, Option<f64>) {
    let cut = name.find(['(', '[']).map_or(name, |at| &name[..at]);
    let mut plain = plain_name(cut);
    for unit in ["_m_s", "_kn", "_kt", "_kts", "_knots", "_km_h", "_kmh", "_mph", "_mps", "_deg", "_degrees", "_degt"] {
        if let Some(rest) = plain.strip_suffix(unit) {
            plain = rest.to_owned();
            break;
        }
    }
    if let Some(rest) = plain.strip_suffix('m')
        && let Some(at) = rest.rfind(|c: char| !c.is_ascii_digit())
        && let Ok(height_m) = rest[at + 1..].parse::<f64>()
    {
        return (rest[..=at].trim_end_matches('_').to_owned(), Some(height_m));
    }
    (plain, None)
}

struct Finder<'a> {
    path: &'a Path,
    table: &'a PlainTable,
    options: &'a WindTableOptions,
}

/// A candidate column with the height in its name.
type Candidate = (usize, Option<f64>);

impl Finder<'_> {
    fn candidates(
        &self,
        named: Option<&str>,
        known: &[&str],
        role: &'static str,
        key: &str,
    ) -> Result<Vec<Candidate>, WindTableError> {
        if named.is_some() {
            let column = self.table.find(named, &[], role, key)?;
            return Ok(column
                .map(|column| (column, word_and_height(&self.table.names()[column]).1))
                .into_iter()
                .collect());
        }
        for candidate in known {
            let found: Vec<Candidate> = (self.table.names().iter().enumerate())
                .filter_map(|(index, name)| {
                    let (word, height_m) = word_and_height(name);
                    (word == *candidate).then_some((index, height_m))
                })
                .collect();
            if !found.is_empty() {
                return Ok(found);
            }
        }
        Ok(Vec::new())
    }

    /// The one candidate at the height, and that height where its name states it.
    fn at_height(&self, candidates: &[Candidate], height_m: Option<f64>) -> Result<Option<Candidate>, WindTableError> {
        match (candidates, height_m) {
            ([], _) => Ok(None),
            ([one], _) => Ok(Some(*one)),
            (many, Some(wanted)) => {
                let found = many.iter().find(|(_, height)| height.is_some_and(|height| (height - wanted).abs() < 1e-6));
                found.map(|candidate| Some(*candidate)).ok_or_else(|| self.ask_height(many))
            }
            (many, None) => Err(self.ask_height(many)),
        }
    }

    fn ask_height(&self, candidates: &[Candidate]) -> WindTableError {
        let names: Vec<String> =
            candidates.iter().map(|(index, _)| format!("`{}`", self.table.names()[*index])).collect();
        WindTableError::Ask {
            path: self.path.to_owned(),
            what: format!("which of the columns {} to use", names.join(", ")),
            key: "wind.height_m",
            expected: "one of their heights (or name the column)".to_owned(),
        }
    }

    /// Metres per second in one unit of a column: as set, else from the units row, the comments or the name.
    fn factor(&self, column: usize) -> Result<f64, WindTableError> {
        let name = &self.table.names()[column];
        if let Some(units) = &self.options.units {
            return speed_factor(units).ok_or_else(|| WindTableError::Setting {
                key: "wind.units",
                found: units.clone(),
                expected: "\"m/s\", \"knots\", \"km/h\" or \"mph\"",
            });
        }
        let stated = self
            .table
            .units()
            .get(column)
            .filter(|unit| !unit.is_empty())
            .cloned()
            .or_else(|| self.in_comments(name).map(|fields| fields.1));
        if let Some(unit) = stated {
            return speed_factor(&unit).ok_or_else(|| WindTableError::Unit {
                path: self.path.to_owned(),
                column: name.clone(),
                found: unit,
            });
        }
        unit_in_name(name).ok_or_else(|| WindTableError::Ask {
            path: self.path.to_owned(),
            what: format!("the unit of column `{name}`"),
            key: "wind.units",
            expected: "\"m/s\", \"knots\", \"km/h\" or \"mph\"".to_owned(),
        })
    }

    /// Standard name and unit of a variable from comment lines of the form `name;standard_name;...;unit`.
    fn in_comments(&self, name: &str) -> Option<(String, String)> {
        self.table.preamble().iter().find_map(|line| {
            let fields: Vec<&str> = line.split(';').map(str::trim).collect();
            match fields.as_slice() {
                [variable, standard, .., unit] if variable.eq_ignore_ascii_case(name) => {
                    Some(((*standard).to_owned(), (*unit).to_owned()))
                }
                _ => None,
            }
        })
    }

    /// Whether a direction is where the wind comes from.
    fn comes_from(&self, column: usize) -> Result<bool, WindTableError> {
        match self.options.direction_sense.as_deref() {
            Some("from") => return Ok(true),
            Some("to") => return Ok(false),
            Some(other) => {
                return Err(WindTableError::Setting {
                    key: "wind.direction_sense",
                    found: other.to_owned(),
                    expected: "\"from\" or \"to\"",
                });
            }
            None => {}
        }
        let name = &self.table.names()[column];
        let standard = self.in_comments(name).map(|fields| fields.0).unwrap_or_default();
        for text in [plain_name(name), standard] {
            if text.contains("from_direction") || text.contains("direction_from") {
                return Ok(true);
            }
            if text.contains("to_direction") || text.contains("direction_to") {
                return Ok(false);
            }
        }
        Err(WindTableError::Ask {
            path: self.path.to_owned(),
            what: format!("the sense of direction of column `{name}`"),
            key: "wind.direction_sense",
            expected: "\"from\" or \"to\"".to_owned(),
        })
    }

    fn time(&self) -> Result<TimeColumns, WindTableError> {
        let named = self.options.columns.time.as_deref();
        if let Some(column) = self.table.find_plain(named, TIME, "the time", "wind.time")? {
            return Ok(TimeColumns::One(column));
        }
        let part = |names: &[&str]| self.table.names().iter().position(|name| names.contains(&name.trim()));
        match PARTS.map(part) {
            [Some(year), Some(month), Some(day), Some(hour), minute] => {
                Ok(TimeColumns::Split([year, month, day, hour], minute))
            }
            _ => Err(self.table.no_column("the time", &TIME[..3], "wind.time").into()),
        }
    }
}

/// Finds the wind's columns.
pub(super) fn roles(path: &Path, table: &PlainTable, options: &WindTableOptions) -> Result<WindRoles, WindTableError> {
    let finder = Finder { path, table, options };
    let columns = &options.columns;
    let speeds = finder.candidates(columns.speed.as_deref(), SPEED, "the wind speed", "wind.speed")?;
    let eastward = finder.candidates(columns.eastward.as_deref(), EASTWARD, "the eastward wind", "wind.eastward")?;
    let northward =
        finder.candidates(columns.northward.as_deref(), NORTHWARD, "the northward wind", "wind.northward")?;
    let directions =
        finder.candidates(columns.direction.as_deref(), DIRECTION, "the wind direction", "wind.direction")?;
    let with_components = !eastward.is_empty() && !northward.is_empty();
    if speeds.is_empty() && !with_components {
        return Err(table
            .no_column("the wind speed", &["wind_speed_m_s", "wspd", "eastward_wind and northward_wind"], "wind.speed")
            .into());
    }
    let main = if with_components { &eastward } else { &speeds };
    let (_, stated_m) = finder.at_height(main, options.height_m)?.expect("there is a candidate");
    let height_m = options.height_m.or(stated_m).ok_or_else(|| WindTableError::Ask {
        path: path.to_owned(),
        what: "the height of the wind above the surface".to_owned(),
        key: "wind.height_m",
        expected: "metres".to_owned(),
    })?;
    let mut notes = Vec::new();
    if let (Some(stated_m), None) = (stated_m, options.height_m) {
        notes.push(format!("the height of the wind is taken from the column name: {stated_m} m"));
    }
    let at = Some(height_m);
    let components = if with_components {
        let (east, _) = finder.at_height(&eastward, at)?.expect("there is a candidate");
        let (north, _) = finder.at_height(&northward, at)?.expect("there is a candidate");
        Some([(east, finder.factor(east)?), (north, finder.factor(north)?)])
    } else {
        None
    };
    let speed = match finder.at_height(&speeds, at)? {
        None => None,
        Some((column, _)) => Some((column, finder.factor(column)?)),
    };
    let direction = match (components, finder.at_height(&directions, at)?) {
        (None, Some((column, _))) => Some((column, finder.comes_from(column)?)),
        _ => None,
    };
    if components.is_none() && direction.is_none() {
        notes.push("the table has no wind direction; components are missing".to_owned());
    }
    Ok(WindRoles { time: finder.time()?, speed, direction, components, height_m, notes })
}
