//! What can be wrong with a list of sites or a track.

use crate::io::sites::CoordinateProblem;
use crate::io::table::{Conflict, TableError};
use crate::model::PointError;
use std::path::PathBuf;

/// Why sites cannot be read. Rows are named by their line in the file.
#[derive(Debug, thiserror::Error)]
pub enum SiteError {
    /// Something about the table as such.
    #[error(transparent)]
    Table(#[from] TableError),
    /// A coordinate that cannot be read.
    #[error("{}: {place}: {axis} `{found}` {problem}", path.display())]
    Coordinate {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// "latitude" or "longitude".
        axis: &'static str,
        /// Text of the cell.
        found: String,
        /// What is wrong.
        problem: CoordinateProblem,
    },
    /// Coordinates that are no position.
    #[error("{}: {place}: {problem}", path.display())]
    Position {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// What is wrong.
        problem: PointError,
    },
    /// A position far from all others that would be among them with a sign or the order changed.
    #[error("{}: {place}: the position {found} lies {distance_deg:.0} degrees from the other sites, which {remedy} would not; expected a site near the others (set `{key}` to false if it is right)", path.display())]
    Suspicious {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// The position.
        found: String,
        /// How far, degrees.
        distance_deg: f64,
        /// What would bring it back.
        remedy: &'static str,
        /// The key to set.
        key: &'static str,
    },
    /// A depth that is none.
    #[error("{}: {place}: the depth is `{found}`; expected metres below the surface, 0 to 11000, positive down", path.display())]
    Depth {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// Text of the cell.
        found: String,
    },
    /// A row without a site name.
    #[error("{}: {place}: the site name is empty; expected a name in every row", path.display())]
    NoName {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
    },
    /// A site, or a sensor of a site, that occurs twice.
    #[error("{}: {place}: {what} was already in {first}; expected each once (several sensors of a site need a sensor column, several deployments a start and an end)", path.display())]
    Twice {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// What, with its name.
        what: String,
        /// The earlier row.
        first: String,
    },
    /// A site with two positions, or a track at two places at one time.
    #[error(transparent)]
    TwoPlaces(#[from] Box<Conflict>),
    /// A time of a deployment that cannot be read, or a deployment that ends before it starts.
    #[error("{}: {place}: {what} is `{found}`; expected {expected}", path.display())]
    Time {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// What, in words.
        what: &'static str,
        /// Text of the cell.
        found: String,
        /// What is allowed.
        expected: String,
    },
    /// A site that is not in the list.
    #[error("{}: there is no site `{wanted}`{}; the sites are {known}", path.display(), hint(suggestion.as_deref()))]
    Unknown {
        /// The file.
        path: PathBuf,
        /// The name looked for.
        wanted: String,
        /// The nearest name.
        suggestion: Option<String>,
        /// The names there are.
        known: String,
    },
    /// A track that moves too fast.
    #[error("{}: {place}: the track moves {distance_km:.0} km in {seconds:.0} s before this row; expected less than {limit_m_s} m/s (a lost sign, or swapped columns?)", path.display())]
    TooFast {
        /// The file.
        path: PathBuf,
        /// The row.
        place: String,
        /// Distance along the sphere, km.
        distance_km: f64,
        /// Time between the rows, s.
        seconds: f64,
        /// The limit, m/s.
        limit_m_s: f64,
    },
}

fn hint(suggestion: Option<&str>) -> String {
    suggestion.map_or_else(String::new, |name| format!(" (did you mean `{name}`?)"))
}
