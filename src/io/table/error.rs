//! What can go wrong with tables that are written, and with plain tables that are read.

use crate::io::delimited::DelimitedError;
use crate::io::parquet::ParquetError;
use crate::io::replace_file::WriteError;
use std::path::PathBuf;

/// Why a table cannot be written or read.
#[derive(Debug, thiserror::Error)]
pub enum TableError {
    /// Something about the file to write.
    #[error(transparent)]
    Write(#[from] WriteError),
    /// Something about the text as such.
    #[error(transparent)]
    Text(#[from] DelimitedError),
    /// Something about a Parquet file as such.
    #[error(transparent)]
    Parquet(#[from] ParquetError),
    /// The name does not say which format to write.
    #[error("{}: the name ends in {found}; expected a name that ends in .csv or .parquet", path.display())]
    Extension {
        /// The file.
        path: PathBuf,
        /// Its extension, or "nothing".
        found: String,
    },
    /// A table with other columns than the first.
    #[error("{}: a part of the table has the columns {found}; expected {expected} as in its first part", path.display())]
    Columns {
        /// The file.
        path: PathBuf,
        /// Columns of this part.
        found: String,
        /// Columns of the first.
        expected: String,
    },
    /// A table without columns.
    #[error("{}: the table has no columns", path.display())]
    NoColumns {
        /// The file.
        path: PathBuf,
    },
    /// The Parquet library cannot encode a column.
    #[error("{}: the table cannot be encoded as Parquet", path.display())]
    Encode {
        /// The file.
        path: PathBuf,
        /// What the library says.
        #[source]
        source: Box<dyn std::error::Error + Send + Sync>,
    },
    /// A column that is needed is not there.
    #[error("{}: no column is recognised as {role} ({names}); the columns are {found}; set `{key}`", path.display())]
    NoColumn {
        /// The file.
        path: PathBuf,
        /// What is needed, in words.
        role: &'static str,
        /// Names that would be recognised.
        names: String,
        /// The columns there are.
        found: String,
        /// The key or option that names it.
        key: String,
    },
    /// Two columns for one thing.
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
        /// The key or option that names it.
        key: String,
    },
    /// A cell that cannot be read.
    #[error(transparent)]
    Cell(#[from] Box<BadCell>),
}

/// A cell that cannot be read as what its column holds.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{}: {place}, column `{column}`: `{found}` is no {what}; expected {expected}{}", path.display(), remedy(key.as_deref()))]
pub struct BadCell {
    /// The file.
    pub path: PathBuf,
    /// "line 12" or "row 12".
    pub place: String,
    /// Name of the column.
    pub column: String,
    /// Text of the cell.
    pub found: String,
    /// What it should be.
    pub what: &'static str,
    /// What is allowed.
    pub expected: String,
    /// A key that may help.
    pub key: Option<String>,
}

/// Two rows that say different things where only one can hold.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{}: {place}: {what} is {found}, but {expected} in {first}; expected {rule}", path.display())]
pub struct Conflict {
    /// The file.
    pub path: PathBuf,
    /// The later row.
    pub place: String,
    /// What they speak of.
    pub what: String,
    /// In the later row.
    pub found: String,
    /// In the earlier row.
    pub expected: String,
    /// The earlier row.
    pub first: String,
    /// What may be.
    pub rule: &'static str,
}

fn remedy(key: Option<&str>) -> String {
    key.map_or_else(String::new, |key| format!(" (set `{key}`)"))
}
