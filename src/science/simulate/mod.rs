//! A deployment with known truth: an invented wind field, and levels from stated laws. Shares no code with the fit.

mod levels;
mod random;
mod settings;
mod wind;

pub use levels::{ShipVisit, law_level_db, simulate_levels, simulate_ships};
pub use settings::{BandLaw, Settings, WindOrigin};
pub use wind::{PACKED_FILL, PACKED_SCALE_M_S, SiteWind, WindField, hourly_speed_m_s};
