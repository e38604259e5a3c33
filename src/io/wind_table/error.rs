//! What can be wrong with a wind table.

use crate::io::table::{Conflict, TableError};
use std::path::PathBuf;

/// Why a wind table cannot be read.
#[derive(Debug, thiserror::Error)]
pub enum WindTableError {
    /// No file was given.
    #[error("`wind.files` names no file; expected at least one wind table")]
    NoFiles,
    /// Something about the table as such.
    #[error(transparent)]
    Table(#[from] TableError),
    /// Something that neither the file nor the study says.
    #[error("{}: {what} is not stated; set `{key}` to {expected}", path.display())]
    Ask {
        /// The file.
        path: PathBuf,
        /// What is missing, in words.
        what: String,
        /// The key to set.
        key: &'static str,
        /// What it can be set to.
        expected: String,
    },
    /// A setting that cannot be used.
    #[error("`{key}` is \"{found}\"; expected {expected}")]
    Setting {
        /// The key.
        key: &'static str,
        /// As given.
        found: String,
        /// What is allowed.
        expected: &'static str,
    },
    /// A unit in the file that is no speed.
    #[error("{}: column `{column}` is in `{found}`; expected m/s, knots, km/h or mph (set `wind.units` to override)", path.display())]
    Unit {
        /// The file.
        path: PathBuf,
        /// The column.
        column: String,
        /// The unit in the file.
        found: String,
    },
    /// A wind that cannot be one.
    #[error("{}: {place}, column `{column}`: {found} is no {what}; expected {expected} (if it stands for a missing value, add it to `wind.missing_codes`)", path.display())]
    Value {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// The column.
        column: String,
        /// The number in the file.
        found: f64,
        /// What it should be.
        what: &'static str,
        /// What is allowed.
        expected: &'static str,
    },
    /// Two different winds at one time.
    #[error(transparent)]
    TwoWinds(#[from] Box<Conflict>),
    /// A time in several columns that is none.
    #[error("{}: {place}: year, month, day, hour and minute are {found}; expected a day and time that exist, with a year of four digits", path.display())]
    SplitTime {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// As given.
        found: String,
    },
}
