//! Plain data with its invariants: what crosses between readers, science, figures and tables.

mod band;
mod exclusion;
mod field;
mod fitted;
mod level;
mod matchup;
mod outcome;
mod radiated;
mod relation;
mod scattered;
mod sea_state;
mod sensitivity;
mod series;
mod site;
mod spectra_series;
mod spectrum;
mod spreading;
mod table;

pub use band::*;
pub use exclusion::*;
pub use field::*;
pub use fitted::*;
pub use level::*;
pub use matchup::*;
pub use outcome::*;
pub use radiated::*;
pub use relation::*;
pub use scattered::*;
pub use sea_state::*;
pub use sensitivity::*;
pub use series::*;
pub use site::*;
pub use spectra_series::*;
pub use spectrum::*;
pub use spreading::*;
pub use table::*;
