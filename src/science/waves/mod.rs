//! Surface waves and the sound of opposing waves.

mod band_sea;
mod blend;
mod from_moments;
mod moment_sea;
mod moments;
mod opposing;
mod opposing_seas;
mod radiated;
mod reduce;
mod spreading_law;
mod step_sea;
mod survey;
mod tail;
mod two_lobe;
mod water;
mod wind_sea;
mod window_sea;

pub use band_sea::*;
pub use blend::*;
pub use from_moments::*;
pub use moment_sea::*;
pub use moments::*;
pub use opposing::Opposing;
pub use opposing_seas::*;
pub use radiated::*;
pub use reduce::*;
pub use spreading_law::*;
pub use step_sea::*;
pub use survey::*;
pub use tail::*;
pub use two_lobe::*;
pub use water::*;
pub use wind_sea::*;
pub use window_sea::*;
