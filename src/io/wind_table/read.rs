//! Reading wind tables into one series.

use super::columns::{TimeColumns, WindRoles, roles};
use super::error::WindTableError;
use crate::io::delimited::{DecimalMark, TextOptions, plain_number};
use crate::io::table::{Conflict, MissingTexts, Plain, PlainTable, PlainValues};
use crate::io::time_text::TimeRules;
use crate::model::{FlagSet, Missing, SourceId, WindSeries};
use crate::units::{ComingFrom, Compass, GoingTo, Instant};
use std::path::{Path, PathBuf};

/// Names of columns, where they are not recognised by themselves. Matched without regard to case.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct WindColumns {
    /// Time.
    pub time: Option<String>,
    /// Speed.
    pub speed: Option<String>,
    /// Direction.
    pub direction: Option<String>,
    /// Component towards the east.
    pub eastward: Option<String>,
    /// Component towards the north.
    pub northward: Option<String>,
}

/// How to read wind tables. Whatever is `None` and not in the files either is asked for.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct WindTableOptions {
    /// Names of columns.
    pub columns: WindColumns,
    /// Unit of speeds: "m/s", "knots", "km/h" or "mph".
    pub units: Option<String>,
    /// Sense of directions: "from" or "to".
    pub direction_sense: Option<String>,
    /// Height of the wind above the surface, m.
    pub height_m: Option<f64>,
    /// How to read times.
    pub times: TimeRules,
    /// Texts or numbers that stand for missing values.
    pub missing_codes: Vec<String>,
    /// Delimiter, decimal mark, encoding, comments of delimited text.
    pub text: TextOptions,
}

/// Wind at the steps of a table. All vectors have one entry a step; missing numbers are NaN.
#[derive(Debug, Clone, PartialEq)]
pub struct WindTable {
    /// Steps, strictly increasing.
    pub steps: Vec<Instant>,
    /// Component towards the east, m/s; NaN throughout where the table has no direction.
    pub eastward_m_s: Vec<f64>,
    /// Component towards the north, m/s.
    pub northward_m_s: Vec<f64>,
    /// Speed, m/s.
    pub speed_m_s: Vec<f64>,
    /// Why a step has no value.
    pub missing: Vec<Option<Missing>>,
    /// Height above the surface, m.
    pub height_m: f64,
    /// Remarks.
    pub notes: Vec<String>,
}

impl WindTable {
    /// The series of this wind at a site.
    pub fn series(&self, source: &SourceId, site: &str, max_gap_ms: i64) -> WindSeries {
        WindSeries {
            source: source.clone(),
            site: site.to_owned(),
            steps: self.steps.clone(),
            eastward_m_s: self.eastward_m_s.clone(),
            northward_m_s: self.northward_m_s.clone(),
            scalar_speed_m_s: self.speed_m_s.clone(),
            flags: vec![FlagSet::default(); self.steps.len()],
            missing: self.missing.clone(),
            nodes: Vec::new(),
            height_m: Some(self.height_m),
            max_gap_ms,
        }
    }
}

/// The text that buoy archives write for a missing value (common practice).
const MISSING_TEXT: &str = "MM";
/// No mean wind is stronger, m/s (common practice: the strongest gusts on record are about 110 m/s).
const STRONGEST_M_S: f64 = 100.0;

/// One row with its place.
#[derive(Debug, Clone)]
struct Step {
    time: Instant,
    east: f64,
    north: f64,
    speed: f64,
    file: usize,
    row: u64,
}

/// Reads wind tables, delimited text or Parquet, into one series. Rows may come in any order; repeated rows count once.
///
/// # Errors
/// When a file cannot be read, when height, unit or the sense of a direction are stated nowhere, when a value is no wind,
/// and when two rows give different winds at one time.
pub fn read_wind_table(files: &[PathBuf], options: &WindTableOptions) -> Result<WindTable, WindTableError> {
    if files.is_empty() {
        return Err(WindTableError::NoFiles);
    }
    let mut steps: Vec<Step> = Vec::new();
    let mut words: Vec<&'static str> = Vec::new();
    let (mut notes, mut height_m) = (Vec::new(), f64::NAN);
    for (file, path) in files.iter().enumerate() {
        let table = PlainTable::open(path, &options.text, "wind")?;
        let found = roles(path, &table, options)?;
        height_m = found.height_m;
        words.push(table.row_word());
        for note in table.notes().iter().chain(&found.notes) {
            if !notes.contains(note) {
                notes.push(note.clone());
            }
        }
        read_file(path, file, &table, &found, options, &mut steps, &mut notes)?;
    }
    if steps.windows(2).any(|pair| pair[1].time < pair[0].time) {
        notes.push("the rows are not in order of time; they were sorted".to_owned());
        steps.sort_by_key(|step| step.time);
    }
    let (steps, merged) = merged(steps, files, &words)?;
    if merged > 0 {
        notes.push(format!("{merged} rows repeat a time and its wind; they count once"));
    }
    let without_direction = steps.iter().all(|step| step.east.is_nan());
    let missing = |step: &Step| {
        let none = step.speed.is_nan() || (step.east.is_nan() && !without_direction);
        none.then_some(Missing::NoValue)
    };
    Ok(WindTable {
        steps: steps.iter().map(|step| step.time).collect(),
        eastward_m_s: steps.iter().map(|step| step.east).collect(),
        northward_m_s: steps.iter().map(|step| step.north).collect(),
        speed_m_s: steps.iter().map(|step| step.speed).collect(),
        missing: steps.iter().map(missing).collect(),
        height_m,
        notes,
    })
}

fn read_file(
    path: &Path,
    file: usize,
    table: &PlainTable,
    found: &WindRoles,
    options: &WindTableOptions,
    steps: &mut Vec<Step>,
    notes: &mut Vec<String>,
) -> Result<(), WindTableError> {
    let mut wanted: Vec<(usize, Plain)> = match &found.time {
        TimeColumns::One(column) => vec![(*column, Plain::Time)],
        TimeColumns::Split(parts, minute) => {
            parts.iter().chain(minute.iter()).map(|column| (*column, Plain::Number)).collect()
        }
    };
    let parts = wanted.len();
    let mut ask = |column: usize| {
        wanted.push((column, Plain::Number));
        wanted.len() - 1
    };
    let speed = found.speed.map(|(column, factor)| (ask(column), column, factor));
    let direction = found.direction.map(|(column, from)| (ask(column), column, from));
    let components = found.components.map(|columns| columns.map(|(column, factor)| (ask(column), column, factor)));
    let number = |code: &String| plain_number(code.as_bytes(), DecimalMark::Point);
    let mut missing = MissingTexts {
        texts: options.missing_codes.iter().filter(|code| number(code).is_none()).cloned().collect(),
        numbers: options.missing_codes.iter().filter_map(number).collect(),
    };
    missing.texts.push(MISSING_TEXT.to_owned());
    let (values, rows, remarks) = table.read(&wanted, options.times, &missing)?;
    let split = matches!(found.time, TimeColumns::Split(..));
    let note = "times without zone are taken as UTC (set `wind.time_zone` if they are not)".to_owned();
    if (remarks.naive || split) && options.times.zone_minutes.is_none() && !notes.contains(&note) {
        notes.push(note);
    }
    let numbers = |at: usize| match values.get(at) {
        Some(PlainValues::Number(numbers)) => numbers.as_slice(),
        _ => &[],
    };
    for (index, &row) in rows.iter().enumerate() {
        let place = || format!("{} {row}", table.row_word());
        let time = if let (PlainValues::Time(ms), false) = (&values[0], split) {
            Instant(ms[index])
        } else {
            let parts: Vec<f64> = (0..parts).map(|part| numbers(part)[index]).collect();
            split_time(&parts, options.times).ok_or_else(|| WindTableError::SplitTime {
                path: path.to_owned(),
                place: place(),
                found: parts.iter().map(f64::to_string).collect::<Vec<_>>().join(" "),
            })?
        };
        let wrong = |column: usize, found: f64, what, expected| WindTableError::Value {
            path: path.to_owned(),
            place: place(),
            column: table.names()[column].clone(),
            found,
            what,
            expected,
        };
        let mut step = Step { time, east: f64::NAN, north: f64::NAN, speed: f64::NAN, file, row };
        if let Some((at, column, factor)) = speed {
            let raw = numbers(at)[index];
            step.speed = raw * factor;
            if !(raw.is_nan() || (0.0..=STRONGEST_M_S).contains(&step.speed)) || is_nines(raw) {
                return Err(wrong(column, raw, "wind speed", "0 to 100 m/s"));
            }
        }
        if let Some((at, column, from)) = direction {
            let raw = numbers(at)[index];
            if !(raw.is_nan() || (-180.0..=360.0).contains(&raw)) {
                return Err(wrong(column, raw, "direction", "0 to 360 degrees"));
            }
            (step.east, step.north) = from_direction(raw, from, step.speed);
        }
        if let Some([(east, east_column, east_factor), (north, north_column, north_factor)]) = components {
            let (raw_east, raw_north) = (numbers(east)[index], numbers(north)[index]);
            for (raw, factor, column) in [(raw_east, east_factor, east_column), (raw_north, north_factor, north_column)]
            {
                if !(raw.is_nan() || (raw * factor).abs() <= STRONGEST_M_S) {
                    return Err(wrong(column, raw, "wind component", "-100 to 100 m/s"));
                }
            }
            (step.east, step.north) = (raw_east * east_factor, raw_north * north_factor);
            if step.east.is_nan() || step.north.is_nan() {
                (step.east, step.north) = (f64::NAN, f64::NAN);
            }
            if speed.is_none() {
                step.speed = libm::hypot(step.east, step.north);
            }
        }
        steps.push(step);
    }
    Ok(())
}

/// 99 and 99.9, which archives write for a missing speed and which no mean wind reaches.
fn is_nines(raw: f64) -> bool {
    (raw - 99.0).abs() < 1e-9 || (raw - 99.9).abs() < 1e-9 || (raw - 99.99).abs() < 1e-9
}

/// Components of a wind by its direction; calm has none of the latter and needs none.
fn from_direction(degrees: f64, from: bool, speed: f64) -> (f64, f64) {
    if speed == 0.0 {
        return (0.0, 0.0);
    }
    let compass = if from {
        Compass::<ComingFrom>::from_degrees(degrees).ok()
    } else {
        Compass::<GoingTo>::from_degrees(degrees).ok().map(Compass::<GoingTo>::reversed)
    };
    compass.map_or((f64::NAN, f64::NAN), |compass| compass.components(speed))
}

/// An instant from year, month, day, hour and minute.
fn split_time(parts: &[f64], rules: TimeRules) -> Option<Instant> {
    let whole = |index: usize| match parts.get(index) {
        None => Some(0),
        Some(part) if part.fract() == 0.0 && (0.0..10_000.0).contains(part) => Some(*part as u32),
        Some(_) => None,
    };
    let year = whole(0)?;
    if year < 1000 {
        return None;
    }
    let date = chrono::NaiveDate::from_ymd_opt(year as i32, whole(1)?, whole(2)?)?;
    let time = date.and_hms_opt(whole(3)?, whole(4)?, 0)?;
    let shift_ms = i64::from(rules.zone_minutes.unwrap_or(0)) * 60_000;
    Some(Instant(time.and_utc().timestamp_millis() - shift_ms))
}

/// Steps with rows of one time merged, and how many were.
fn merged(steps: Vec<Step>, files: &[PathBuf], words: &[&'static str]) -> Result<(Vec<Step>, usize), WindTableError> {
    let mut kept: Vec<Step> = Vec::with_capacity(steps.len());
    let mut count = 0;
    let same = |a: f64, b: f64| (a.is_nan() && b.is_nan()) || (a - b).abs() < 1e-9;
    for step in steps {
        match kept.last_mut() {
            Some(last) if last.time == step.time => {
                if same(last.speed, step.speed) && same(last.east, step.east) && same(last.north, step.north) {
                    count += 1;
                } else if last.speed.is_nan() && last.east.is_nan() {
                    // A row without wind yields to one with.
                    *last = step;
                    count += 1;
                } else if step.speed.is_nan() && step.east.is_nan() {
                    count += 1;
                } else {
                    let shown =
                        |step: &Step| format!("{:.3} m/s ({:.3} east, {:.3} north)", step.speed, step.east, step.north);
                    let first_file = if last.file == step.file {
                        String::new()
                    } else {
                        format!(" of {}", files[last.file].display())
                    };
                    return Err(Box::new(Conflict {
                        path: files[step.file].clone(),
                        place: format!("{} {}", words[step.file], step.row),
                        what: format!("the wind at {}", step.time.iso()),
                        found: shown(&step),
                        expected: shown(last),
                        first: format!("{} {}{first_file}", words[last.file], last.row),
                        rule: "one wind at a time",
                    })
                    .into());
                }
            }
            _ => kept.push(step),
        }
    }
    Ok((kept, count))
}
