//! Quantities with their units: instants and windows, angles, levels, frequencies.
//!
//! Nothing here knows a sea. Bulk numbers stay `f64` in structs and names that say the unit; these types stand where a
//! number crosses an edge and a mix-up would be silent.

mod angle;
mod frequency;
mod level;
mod time;

pub use angle::{ComingFrom, Compass, GoingTo, UnitsError};
pub use frequency::Hertz;
pub use level::{Decibels, db_of_power, mean_power_db, power_of_db};
pub use time::{HOUR_MS, Instant, InstantError, SECOND_MS, Window};
