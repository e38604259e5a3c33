//! How the level of a band depends on the wind speed overhead: the result of a fit.

mod curve;
mod names;
mod parts;
mod resolved;
mod whole;

pub use curve::*;
pub use names::*;
pub use parts::*;
pub use resolved::*;
pub use whole::*;
