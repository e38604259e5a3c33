//! What can be wrong with a gridded file.

use std::path::PathBuf;

/// Why a gridded file cannot be read or understood. One line each: file, variable, what was found, what was expected,
/// which key helps.
#[derive(Debug, thiserror::Error)]
pub enum NetcdfError {
    /// The file cannot be opened or read.
    #[error("{}: cannot be read: {source}", path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// The system's cause.
        source: std::io::Error,
    },
    /// The file is something else.
    #[error("{}: this is {found}; expected NetCDF (classic, 64-bit offset, CDF-5 or NetCDF-4)", path.display())]
    NotNetcdf {
        /// The file.
        path: PathBuf,
        /// What it looks like.
        found: &'static str,
    },
    /// The file is damaged.
    #[error("{}: damaged or cut short: {problem}", path.display())]
    Damaged {
        /// The file.
        path: PathBuf,
        /// What does not fit.
        problem: String,
    },
    /// The library refuses the file.
    #[error("{}: {action}: {problem}", path.display())]
    Library {
        /// The file.
        path: PathBuf,
        /// What was tried.
        action: String,
        /// What the library says.
        problem: String,
    },
    /// A filter that cannot be undone.
    #[error("{}: variable `{variable}` is packed with the filter {filter}; only shuffle, deflate and fletcher32 are understood (repack the file)", path.display())]
    Filter {
        /// The file.
        path: PathBuf,
        /// The variable.
        variable: String,
        /// The filter.
        filter: String,
    },
    /// A variable that is not there.
    #[error("{}: no variable is recognised as {wanted}; candidates are {candidates}; set `{key}`", path.display())]
    NoVariable {
        /// The file.
        path: PathBuf,
        /// What is needed, in words.
        wanted: &'static str,
        /// Variables that could be it.
        candidates: String,
        /// The key to set.
        key: &'static str,
    },
    /// A variable named in the study that no file has.
    #[error("{}: there is no variable `{name}` (`{key}`); the variables are {found}", path.display())]
    NoSuchVariable {
        /// The file.
        path: PathBuf,
        /// The name.
        name: String,
        /// The key.
        key: &'static str,
        /// The variables there are.
        found: String,
    },
    /// Something about a variable that cannot be used.
    #[error("{}: variable `{variable}`: {problem}", path.display())]
    Variable {
        /// The file.
        path: PathBuf,
        /// The variable.
        variable: String,
        /// What was found, what was expected, which key helps.
        problem: String,
    },
    /// Two files that do not fit together.
    #[error("{}: {problem} (compared with {})", path.display(), other.display())]
    Disagree {
        /// The file.
        path: PathBuf,
        /// The file before it.
        other: PathBuf,
        /// What differs.
        problem: String,
    },
    /// A setting that cannot be used.
    #[error("`{key}` is {found}; expected {expected}")]
    Setting {
        /// The key.
        key: &'static str,
        /// As given.
        found: String,
        /// What is allowed.
        expected: &'static str,
    },
    /// No file.
    #[error("`wind.files` names no file; expected at least one NetCDF file")]
    NoFiles,
}
