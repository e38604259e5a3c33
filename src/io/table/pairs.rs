//! Tables of pairs of wind speed and level, for fitting without a study.

use super::error::{BadCell, TableError};
use super::read::{MissingTexts, Plain, PlainTable, PlainValues};
use crate::io::delimited::TextOptions;
use crate::io::time_text::{TimeRules, TimeUnit};
use std::path::Path;

/// Names of the columns, where they are not the usual ones. Matched without regard to case.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct PairColumns {
    /// Time.
    pub time: Option<String>,
    /// Wind speed, m/s.
    pub wind_speed: Option<String>,
    /// Level, dB.
    pub level: Option<String>,
    /// Site.
    pub site: Option<String>,
    /// Mid-band frequency, Hz.
    pub band: Option<String>,
    /// Deployment.
    pub deployment: Option<String>,
}

/// How to read a table of pairs.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct PairOptions {
    /// Names of columns.
    pub columns: PairColumns,
    /// Unit of times that are numbers.
    pub time_unit: Option<TimeUnit>,
    /// Delimiter, decimal mark, encoding, comments of delimited text.
    pub text: TextOptions,
}

/// A text for each row.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct TextColumn {
    /// The distinct texts, in the order of their first row.
    pub texts: Vec<String>,
    /// One index into `texts` a row; `u32::MAX` is missing.
    pub codes: Vec<u32>,
}

impl TextColumn {
    /// The text of a row; empty where it is missing.
    pub fn text(&self, row: usize) -> &str {
        self.codes.get(row).and_then(|code| self.texts.get(*code as usize)).map_or("", String::as_str)
    }
}

/// Pairs of wind speed and level as plain columns of equal length.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Pairs {
    /// Milliseconds since 1970-01-01T00:00:00Z, or since the table's own zero where `relative`.
    pub time_ms: Vec<i64>,
    /// Whether times are hours since an unnamed instant (`time_h`).
    pub relative: bool,
    /// Wind speed, m/s; NaN where missing.
    pub wind_speed_m_s: Vec<f64>,
    /// Level, dB; NaN where missing.
    pub level_db: Vec<f64>,
    /// Site of each row.
    pub site: Option<TextColumn>,
    /// Mid-band frequency of each row, Hz.
    pub band_centre_hz: Option<Vec<f64>>,
    /// Deployment of each row.
    pub deployment: Option<TextColumn>,
    /// Wind source of each row.
    pub source: Option<TextColumn>,
    /// Sensor of each row.
    pub sensor: Option<TextColumn>,
    /// Whether a row is used, where the table says so (`use`).
    pub used: Option<Vec<bool>>,
    /// Line (text, from 1 with the header) or row (Parquet, from 1) of each row.
    pub row: Vec<u64>,
    /// Remarks.
    pub notes: Vec<String>,
}

const TIME: &[&str] = &["time", "window_start_utc", "time_utc", "window_start"];
const WIND: &[&str] = &["wind_speed_m_s", "wind_speed_mean_m_s"];

/// Reads a table of pairs from delimited text or Parquet.
///
/// # Errors
/// When a column is missing or a cell cannot be read; the message names file, line and column.
pub fn read_pairs(path: &Path, options: &PairOptions) -> Result<Pairs, TableError> {
    let table = PlainTable::open(path, &options.text, "--")?;
    let columns = &options.columns;
    let needed = |named: &Option<String>, known: &[&str], role, key: &str| {
        table.find(named.as_deref(), known, role, key)?.ok_or_else(|| table.no_column(role, known, key))
    };
    let hours = if columns.time.is_none() { table.find(None, &["time_h"], "the time", "--time-column")? } else { None };
    let instants = table.find(columns.time.as_deref(), TIME, "the time", "--time-column")?;
    let (time, relative) = match (instants, hours) {
        (Some(column), _) => ((column, Plain::Time), false),
        (None, Some(column)) => ((column, Plain::Number), true),
        (None, None) => {
            return Err(table.no_column("the time", &["time", "window_start_utc", "time_h"], "--time-column"));
        }
    };
    let wind = needed(&columns.wind_speed, WIND, "the wind speed in m/s", "--wind-column")?;
    let level = needed(&columns.level, &["level_db"], "the level in dB", "--level-column")?;
    let site = table.find(columns.site.as_deref(), &["site", "site_id"], "the site", "--site-column")?;
    let band = table.find(columns.band.as_deref(), &["band_centre_hz", "band_hz"], "the band", "--band-column")?;
    let deployment =
        table.find(columns.deployment.as_deref(), &["deployment"], "the deployment", "--deployment-column")?;
    let source = table.find(None, &["source"], "the wind source", "source")?;
    let sensor = table.find(None, &["sensor"], "the sensor", "sensor")?;
    let used = table.find(None, &["use"], "whether the row is used", "use")?;

    let mut wanted = vec![time, (wind, Plain::Number), (level, Plain::Number)];
    let mut ask = |column: Option<usize>, plain| {
        column.map(|column| {
            wanted.push((column, plain));
            wanted.len() - 1
        })
    };
    let site = ask(site, Plain::Text);
    let band = ask(band, Plain::Number);
    let deployment = ask(deployment, Plain::Text);
    let source = ask(source, Plain::Text);
    let sensor = ask(sensor, Plain::Text);
    let used = ask(used, Plain::Text);

    let rules = TimeRules { unit: options.time_unit, ..TimeRules::default() };
    let (values, row, remarks) = table.read(&wanted, rules, &MissingTexts::default())?;
    let number = |at: usize| match &values[at] {
        PlainValues::Number(numbers) => numbers.clone(),
        _ => Vec::new(),
    };
    let text = |at: Option<usize>| {
        at.and_then(|at| match &values[at] {
            PlainValues::Text(texts, codes) => Some(TextColumn { texts: texts.clone(), codes: codes.clone() }),
            _ => None,
        })
    };
    let time_ms = match &values[0] {
        PlainValues::Time(ms) => ms.clone(),
        PlainValues::Number(hours) => ms_of_hours(path, hours, &row)?,
        PlainValues::Text(..) => Vec::new(),
    };
    let used = text(used).map(|column| truths(path, &column, &row)).transpose()?;
    let mut notes = table.notes().to_vec();
    if remarks.naive && !relative {
        notes.push("times without zone are taken as UTC".to_owned());
    }
    Ok(Pairs {
        time_ms,
        relative,
        wind_speed_m_s: number(1),
        level_db: number(2),
        site: text(site),
        band_centre_hz: band.map(number),
        deployment: text(deployment),
        source: text(source),
        sensor: text(sensor),
        used,
        row,
        notes,
    })
}

/// Milliseconds of hours since a table's own zero.
fn ms_of_hours(path: &Path, hours: &[f64], row: &[u64]) -> Result<Vec<i64>, TableError> {
    let ms = |(at, hours): (usize, &f64)| {
        if hours.is_finite() {
            return Ok((hours * 3.6e6).round() as i64);
        }
        let expected = "hours as a number in every row".to_owned();
        Err(bad_cell(path, row[at], "time_h", hours.to_string(), "time", expected))
    };
    hours.iter().enumerate().map(ms).collect()
}

/// Yes or no for each row.
fn truths(path: &Path, column: &TextColumn, row: &[u64]) -> Result<Vec<bool>, TableError> {
    let read = |(at, _): (usize, &u32)| match column.text(at).to_ascii_lowercase().as_str() {
        "true" | "1" | "yes" => Ok(true),
        "false" | "0" | "no" => Ok(false),
        other => Err(bad_cell(path, row[at], "use", other.to_owned(), "yes or no", "true or false".to_owned())),
    };
    column.codes.iter().enumerate().map(read).collect()
}

fn bad_cell(path: &Path, row: u64, column: &str, found: String, what: &'static str, expected: String) -> TableError {
    let (path, place, column) = (path.to_owned(), format!("line {row}"), column.to_owned());
    Box::new(BadCell { path, place, column, found, what, expected, key: None }).into()
}
