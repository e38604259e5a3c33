//! What can be wrong with a Parquet file.

use std::path::PathBuf;

/// Why a Parquet file cannot be read.
#[derive(Debug, thiserror::Error)]
pub enum ParquetError {
    /// The file cannot be opened or read.
    #[error("{}: cannot be read", path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// What the system says.
        #[source]
        source: std::io::Error,
    },
    /// The file does not end as a Parquet file does.
    #[error("{}: the Parquet file is cut short ({found}); expected a whole file (copy it again)", path.display())]
    Truncated {
        /// The file.
        path: PathBuf,
        /// What is wrong.
        found: String,
    },
    /// The library cannot make sense of it.
    #[error("{}: the Parquet file is damaged or uses a feature that cannot be read", path.display())]
    Damaged {
        /// The file.
        path: PathBuf,
        /// What the library says.
        #[source]
        source: Box<dyn std::error::Error + Send + Sync>,
    },
    /// A page whose header contradicts the footer, or whose bytes do not match their checksum.
    #[error("{}: column `{column}`: a page of the Parquet file is damaged ({found}); expected a whole file (copy it again)", path.display())]
    Page {
        /// The file.
        path: PathBuf,
        /// The column.
        column: String,
        /// What is wrong.
        found: String,
    },
    /// A column of a type that is no table value.
    #[error("{}: column `{column}` is of type {found}; expected {expected}", path.display())]
    Type {
        /// The file.
        path: PathBuf,
        /// The column.
        column: String,
        /// Its type.
        found: String,
        /// What is wanted.
        expected: &'static str,
    },
    /// No rows.
    #[error("{}: the Parquet file has no rows", path.display())]
    NoRows {
        /// The file.
        path: PathBuf,
    },
}
