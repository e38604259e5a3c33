//! Wind from tables: buoys, stations, ship logs.

mod columns;
mod error;
mod read;
mod unit;

pub use error::WindTableError;
pub use read::{WindColumns, WindTable, WindTableOptions, read_wind_table};
pub use unit::speed_factor;
