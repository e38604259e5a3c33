//! A deployment with known truth: an invented wind field, and levels from stated laws. Shares no code with the fit or with
//! the sampling of fields.

mod law;
mod levels;
mod random;
mod sea;
mod settings;
mod ships;
mod site_wind;
mod weather;
mod wind_field;

pub use law::{BandLaw, law_level_db, wind_part_db};
pub use levels::{LevelSeries, Windows, lost_windows, simulate_levels};
pub use sea::*;
pub use settings::{Settings, WindOrigin};
pub use ships::{ShipVisit, ship_excess_db, simulate_ships};
pub use site_wind::{SiteWind, mean_speed_m_s};
pub use weather::Weather;
pub use wind_field::{PACKED_FILL, PACKED_SCALE_M_S, WindField};
