//! What a study file adds about level tables.

use crate::io::delimited::TextOptions;
use crate::model::{BandScheme, LevelKind, LevelScale, PressureReference, Stamp};

/// How a table is laid out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Layout {
    /// One level a row, its band in a column.
    Long,
    /// One column a band.
    Wide,
}

impl Layout {
    /// Its name in words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Long => "long",
            Self::Wide => "wide",
        }
    }
}

/// Names of columns, where they are not recognised by themselves. Matched without regard to case and blanks around them.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct LevelColumns {
    /// Time stamp of the row.
    pub time: Option<String>,
    /// Site name.
    pub site: Option<String>,
    /// Band (long tables).
    pub band: Option<String>,
    /// Level (long tables).
    pub level: Option<String>,
    /// First instant of the row's window.
    pub window_start: Option<String>,
    /// End of the row's window.
    pub window_end: Option<String>,
    /// Quality flag.
    pub qc: Option<String>,
}

/// The edges of a band that is no band of a scheme.
#[derive(Debug, Clone, PartialEq)]
pub struct BandEdges {
    /// Name of the column (wide), text of the band's cells (long), or "" for the one band of a table without band column.
    pub name: String,
    /// Lower edge, Hz.
    pub low_hz: f64,
    /// Upper edge, Hz.
    pub high_hz: f64,
}

/// All that a study file can say about level tables. Whatever is `None` and not in the files either is asked for.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct LevelOptions {
    /// Long or wide; `None`: by the columns.
    pub layout: Option<Layout>,
    /// Names of columns.
    pub columns: LevelColumns,
    /// The site of all rows, where no column names it.
    pub site: Option<String>,
    /// Reference of the levels.
    pub reference: Option<PressureReference>,
    /// Band levels or spectral density levels.
    pub kind: Option<LevelKind>,
    /// Decibels or linear; `None`: decibels, unless the unit in the header says otherwise.
    pub scale: Option<LevelScale>,
    /// Scheme of bands that are given by their centre.
    pub bands: Option<BandScheme>,
    /// Bands given by edges; they go before the scheme.
    pub band_edges: Vec<BandEdges>,
    /// A prefix of band columns in a wide table (`L_` in `L_63`), where it is an unusual one.
    pub band_prefix: Option<String>,
    /// Length of a row's window, s.
    pub window_s: Option<f64>,
    /// Which instant of the window the time stamp is.
    pub stamp: Option<Stamp>,
    /// Zone of times that carry none: "UTC" or a fixed offset such as "+02:00".
    pub time_zone: Option<String>,
    /// Unit of times that are numbers: "s", "ms", "us", "ns", `spreadsheet_days`, `day_number`.
    pub time_unit: Option<String>,
    /// Order of day and month: "dmy" or "mdy".
    pub date_order: Option<String>,
    /// Texts or numbers that stand for a missing level.
    pub missing_codes: Vec<String>,
    /// Values of the quality column that keep a row.
    pub qc_keep: Vec<String>,
    /// Delimiter, decimal mark, encoding, comments of delimited text.
    pub text: TextOptions,
}
