//! Which samples belong together: levels gathered into windows, and the wind over each window.

mod level_windows;
mod window_wind;

pub use level_windows::{BandNumber, LevelWindows, LevelWindowsError, SensorKey};
pub use window_wind::{wind_at, wind_in_window, wind_over_windows};
