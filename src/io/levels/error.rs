//! What can be wrong with a level table.

use crate::io::delimited::DelimitedError;
use crate::io::parquet::ParquetError;
use crate::io::table::BadCell;
use crate::model::BandError;
use std::path::PathBuf;

/// Why level tables cannot be read. One line each: file, place, what was found, what was expected, which key helps.
#[derive(Debug, thiserror::Error)]
pub enum LevelError {
    /// No file was given.
    #[error("`levels.files` names no file; expected at least one level table")]
    NoFiles,
    /// Something about the text as such.
    #[error(transparent)]
    Text(#[from] DelimitedError),
    /// Something about a Parquet file as such.
    #[error(transparent)]
    Parquet(#[from] ParquetError),
    /// Things that neither the file nor the study says, all at once.
    #[error("{}: not stated: {}", path.display(), joined(asks))]
    Ask {
        /// The file.
        path: PathBuf,
        /// What is missing.
        asks: Vec<Asked>,
    },
    /// A setting that cannot be used.
    #[error("`{key}` is {found}; expected {expected}")]
    Setting {
        /// The key.
        key: &'static str,
        /// As given.
        found: String,
        /// What is allowed.
        expected: String,
    },
    /// A column that is not there.
    #[error("{}: there is no column `{wanted}` (`{key}`); the columns are {found}", path.display())]
    NoColumn {
        /// The file.
        path: PathBuf,
        /// The name looked for.
        wanted: String,
        /// The key that named it.
        key: &'static str,
        /// The columns there are.
        found: String,
    },
    /// No column has the look of what is needed.
    #[error("{}: no column is recognised as {role}; the columns are {found}; set `{key}`", path.display())]
    NoRole {
        /// The file.
        path: PathBuf,
        /// What is needed, in words.
        role: &'static str,
        /// The columns there are.
        found: String,
        /// The key to set.
        key: &'static str,
    },
    /// Two columns could be the same thing.
    #[error("{}: columns `{first}` and `{second}` could both be {role}; set `{key}`", path.display())]
    Ambiguous {
        /// The file.
        path: PathBuf,
        /// One.
        first: String,
        /// The other.
        second: String,
        /// What, in words.
        role: &'static str,
        /// The key to set.
        key: &'static str,
    },
    /// Two columns with one name or one band.
    #[error("{}: {what} occurs twice, in columns {first} and {second} (line {line}); expected it once", path.display())]
    Duplicate {
        /// The file.
        path: PathBuf,
        /// The name or the band.
        what: String,
        /// Number of the first column, from 1.
        first: usize,
        /// Number of the second column, from 1.
        second: usize,
        /// Line of the header.
        line: u64,
    },
    /// A band that cannot be understood.
    #[error("{}: {place}: {source}", path.display())]
    Band {
        /// The file.
        path: PathBuf,
        /// Line or column.
        place: String,
        /// Why.
        source: BandError,
    },
    /// A cell that cannot be read.
    #[error(transparent)]
    Cell(#[from] Box<BadCell>),
    /// A level no hydrophone hears.
    #[error("{}: {place}, column `{column}`: `{found}` would be {level_db:.0} dB re 1 uPa; expected -100 to 300 dB (if it stands for a missing value, add it to `levels.missing_codes`; else check `levels.reference` and `levels.scale`)", path.display())]
    Implausible {
        /// The file.
        path: PathBuf,
        /// "line 12" or "row 12".
        place: String,
        /// Name of the column.
        column: String,
        /// Text of the cell.
        found: String,
        /// What it comes to.
        level_db: f64,
    },
    /// A window that ends before it starts.
    #[error("{}: {place}: the window ends ({end}) before it starts ({start}); expected a start before the end", path.display())]
    ReversedWindow {
        /// The file.
        path: PathBuf,
        /// "line 12" or "row 12".
        place: String,
        /// Start as read.
        start: String,
        /// End as read.
        end: String,
    },
    /// Files of one study say different things.
    #[error("{}: {what} is {found}, but {} says {expected}; expected the same in all files of one level table", path.display(), first.display())]
    Disagree {
        /// The file.
        path: PathBuf,
        /// The earlier file.
        first: PathBuf,
        /// What, in words.
        what: &'static str,
        /// In this file.
        found: String,
        /// In the earlier one.
        expected: String,
    },
}

/// Something that must be stated.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Asked {
    /// What, in words.
    pub what: String,
    /// The key to set.
    pub key: &'static str,
    /// What it can be set to.
    pub expected: String,
}

fn joined(asks: &[Asked]) -> String {
    let texts: Vec<String> =
        asks.iter().map(|ask| format!("{} (set `{}` to {})", ask.what, ask.key, ask.expected)).collect();
    texts.join("; ")
}
