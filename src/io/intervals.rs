//! Lists of spans of time with their reasons: service visits, ice, a sensor on deck.

use crate::io::delimited::TextOptions;
use crate::io::table::{MissingTexts, Plain, PlainTable, PlainValues, TableError, TextColumn};
use crate::io::time_text::TimeRules;
use crate::units::{Instant, Window};
use std::path::{Path, PathBuf};

/// One row of a list.
#[derive(Debug, Clone, PartialEq)]
pub struct ListedInterval {
    /// The span, half open.
    pub window: Window,
    /// Why; empty where the list does not say it.
    pub reason: String,
    /// Site; empty: all.
    pub site: String,
    /// Sensor; empty: all.
    pub sensor: String,
    /// Frequencies from and to, Hz; `None`: all.
    pub band_hz: Option<(f64, f64)>,
}

/// Why a list cannot be read.
#[derive(Debug, thiserror::Error)]
pub enum IntervalError {
    /// Something about the table as such.
    #[error(transparent)]
    Table(#[from] TableError),
    /// An end before its start.
    #[error("{}: {place}: the interval ends at {end}, not after its start {start}", path.display())]
    Order {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// Start.
        start: Instant,
        /// End.
        end: Instant,
    },
    /// Frequencies that are no band.
    #[error("{}: {place}: the band is `{low}` to `{high}`; expected two frequencies in Hz, the lower first, or none", path.display())]
    Band {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// Text of the lower edge.
        low: String,
        /// Text of the upper edge.
        high: String,
    },
}

/// Reads a list (CSV or Parquet): columns start, end; optional reason, site, sensor, `band_low_hz`, `band_high_hz`. Gives the
/// rows and remarks.
///
/// # Errors
/// When a row cannot be read, ends before it starts, or names an impossible band.
pub fn read_intervals(path: &Path) -> Result<(Vec<ListedInterval>, Vec<String>), IntervalError> {
    let table = PlainTable::open(path, &TextOptions::default(), "exclude")?;
    let need = |known: &[&str], role| {
        table
            .find_plain(None, known, role, "exclude.intervals")?
            .ok_or_else(|| table.no_column(role, known, "exclude.intervals"))
    };
    let may = |known: &[&str], role| table.find_plain(None, known, role, "exclude.intervals");
    let mut wanted = vec![
        (need(&["start", "start_utc", "start_time"], "the start")?, Plain::Time),
        (need(&["end", "end_utc", "end_time"], "the end")?, Plain::Time),
    ];
    let optional = [
        may(&["reason", "comment", "why"], "the reason")?,
        may(&["site", "site_id"], "the site")?,
        may(&["sensor", "sensor_id"], "the sensor")?,
        may(&["band_low_hz"], "the lower edge")?,
        may(&["band_high_hz"], "the upper edge")?,
    ];
    wanted.extend(optional.iter().flatten().map(|column| (*column, Plain::Text)));
    let (values, rows, remarks) = table.read(&wanted, TimeRules::default(), &MissingTexts::default())?;
    let mut notes = table.notes().to_vec();
    if remarks.naive {
        notes.push(format!("{}: times without zone are taken as UTC", path.display()));
    }
    let mut times: Vec<Vec<i64>> = Vec::new();
    let mut texts: Vec<TextColumn> = Vec::new();
    for values in values {
        match values {
            PlainValues::Time(ms) => times.push(ms),
            PlainValues::Text(distinct, codes) => texts.push(TextColumn { texts: distinct, codes }),
            PlainValues::Number(_) => {}
        }
    }
    // Where each optional column landed among the texts that were read.
    let mut next = 0..texts.len();
    let at: Vec<Option<usize>> = optional.iter().map(|column| column.and_then(|_| next.next())).collect();
    let text = |role: usize, row: usize| at[role].map_or("", |column| texts[column].text(row)).trim();
    let mut intervals = Vec::with_capacity(rows.len());
    for (row, number) in rows.iter().enumerate() {
        let place = format!("{} {number}", table.row_word());
        let (start, end) = (Instant(times[0][row]), Instant(times[1][row]));
        let window = Window::new(start, end)
            .filter(|window| window.length_ms() > 0)
            .ok_or_else(|| IntervalError::Order { path: path.to_owned(), place: place.clone(), start, end })?;
        let (low, high) = (text(3, row), text(4, row));
        let band_hz = match (low, high) {
            ("", "") => None,
            _ => Some(band(low, high).ok_or_else(|| IntervalError::Band {
                path: path.to_owned(),
                place,
                low: low.to_owned(),
                high: high.to_owned(),
            })?),
        };
        intervals.push(ListedInterval {
            window,
            reason: text(0, row).to_owned(),
            site: text(1, row).to_owned(),
            sensor: text(2, row).to_owned(),
            band_hz,
        });
    }
    Ok((intervals, notes))
}

fn band(low: &str, high: &str) -> Option<(f64, f64)> {
    let (low, high) = (low.parse::<f64>().ok()?, high.parse::<f64>().ok()?);
    (low >= 0.0 && low < high && high.is_finite()).then_some((low, high))
}
