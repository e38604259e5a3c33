//! The science: from plain data to plain data. No files, no printing, no clock.

pub mod exclusion;
pub mod level_wind;
pub mod matchup;
pub mod sample;
pub mod simulate;
pub mod spreading;
pub mod waves;
