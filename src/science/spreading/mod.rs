//! Whether a model's directional spreading agrees with the sound that opposing waves radiate.

mod compare;
mod laws;
mod member;
mod options;
mod testability;
mod windows;

pub use compare::compare;
pub use laws::LawTable;
pub use options::SpreadOptions;
pub use testability::testability;
pub use windows::{BandFloor, BandWindows, ModelWindows, comparable};
