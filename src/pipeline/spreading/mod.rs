//! `spread`: the sound that opposing waves radiate against what was measured, per site, sensor and model.

mod compare;
mod figures;
mod outputs;
mod page;

pub(super) use compare::compare_spreading;
pub(super) use figures::{SpreadFigures, spread_figures};
pub use outputs::spreading_json;
pub(super) use outputs::write_spreading;
pub(super) use page::spreading_section;
