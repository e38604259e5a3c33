//! What can be wrong with a delimited text file as such.

use std::path::PathBuf;

/// Why a delimited text file cannot be read.
#[derive(Debug, thiserror::Error)]
pub enum DelimitedError {
    /// The file cannot be opened or read.
    #[error("{}: cannot be read", path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// What the system says.
        #[source]
        source: std::io::Error,
    },
    /// The file is another kind of file.
    #[error("{}: this is {found}; expected {expected}", path.display())]
    OtherKind {
        /// The file.
        path: PathBuf,
        /// What its first bytes look like.
        found: &'static str,
        /// What was wanted.
        expected: &'static str,
    },
    /// A compressed file ends early or is damaged.
    #[error("{}: the gzip data are cut short or damaged after line {line}; expected a whole file (copy it again)", path.display())]
    Gzip {
        /// The file.
        path: PathBuf,
        /// Last line that was read whole.
        line: u64,
        /// What the decompressor says.
        #[source]
        source: std::io::Error,
    },
    /// A file without any row.
    #[error("{}: the file has no rows at all; expected a header line and data", path.display())]
    Empty {
        /// The file.
        path: PathBuf,
    },
    /// A header without data.
    #[error("{}: there is a header (line {line}) and no data row after it", path.display())]
    HeaderOnly {
        /// The file.
        path: PathBuf,
        /// Line of the header.
        line: u64,
    },
    /// The first row holds data.
    #[error("{}: line {line} holds data (`{found}`); expected column names: add a header line", path.display())]
    NoHeader {
        /// The file.
        path: PathBuf,
        /// Line of the first row.
        line: u64,
        /// Its text, shortened.
        found: String,
    },
    /// A row with another number of cells than the header.
    #[error("{}: line {line} has {found} cells; expected {expected} as in the header (line {header_line})", path.display())]
    Ragged {
        /// The file.
        path: PathBuf,
        /// The row's line.
        line: u64,
        /// Cells in the row.
        found: usize,
        /// Cells in the header.
        expected: usize,
        /// The header's line.
        header_line: u64,
    },
    /// A quoted cell that never ends.
    #[error("{}: the quoted cell that begins in line {line} never ends; expected a closing \"", path.display())]
    OpenQuote {
        /// The file.
        path: PathBuf,
        /// Line where it begins.
        line: u64,
    },
    /// A line too long to be a row.
    #[error("{}: line {line} is longer than {limit_mb} MB; expected a text table", path.display())]
    LongLine {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// The limit.
        limit_mb: usize,
    },
    /// A text cell that is not valid in the file's encoding.
    #[error("{}: line {line}, column `{column}`: the text is not valid UTF-8; set `{key}` (for example \"latin-1\")", path.display())]
    Encoding {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// Name of the column, or its number.
        column: String,
        /// The key to set.
        key: String,
    },
    /// Bytes that no text has.
    #[error("{}: line {line} holds zero bytes; expected text (if it is UTF-16, set `{key}` to \"utf-16le\" or \"utf-16be\")", path.display())]
    ZeroBytes {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// The key to set.
        key: String,
    },
    /// An encoding that is not known.
    #[error(
        "`{key}` is \"{found}\", which is no known text encoding; expected for example \"utf-8\", \"latin-1\" or \"utf-16le\""
    )]
    UnknownEncoding {
        /// The key.
        key: String,
        /// As given.
        found: String,
    },
    /// A setting of the text that cannot be used.
    #[error("`{key}` is {found}; expected {expected}")]
    Setting {
        /// The key.
        key: String,
        /// As given.
        found: String,
        /// What is allowed.
        expected: &'static str,
    },
}
