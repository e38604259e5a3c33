//! Lists of sites with their sensors, and tracks of moving ones.

mod coordinate;
mod error;
mod list;
mod rows;
mod suspicion;
mod track;

pub use coordinate::{Axis, CoordinateProblem, parse_coordinate};
pub use error::SiteError;
pub use list::{SiteColumns, SiteList, SiteOptions, find_site, read_sites};
pub use track::{TrackList, read_track};
