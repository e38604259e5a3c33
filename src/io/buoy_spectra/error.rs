//! What can be wrong with a buoy's text.

use std::path::PathBuf;

/// Why texts of a buoy archive cannot be used. One line each.
#[derive(Debug, thiserror::Error)]
pub enum BuoyError {
    /// The file cannot be read.
    #[error("{}: cannot be read: {source}", path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// The system's cause.
        source: std::io::Error,
    },
    /// A line that does not fit.
    #[error("{}, line {line}: {problem}", path.display())]
    Line {
        /// The file.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// What was found and what was expected.
        problem: String,
    },
    /// The header names none of the columns.
    #[error("{}: its first line names none of spec_1, alpha1_1, alpha2_1, r1_1, r2_1; expected a buoy archive's text of density, direction or spread by frequency", path.display())]
    Header {
        /// The file.
        path: PathBuf,
    },
    /// A kind of text twice, or the density missing.
    #[error("{problem}")]
    Files {
        /// What was found and what was expected.
        problem: String,
    },
}
