//! Plain data with its invariants: what crosses between readers, science, figures and tables.

mod band;
mod field;
mod fitted;
mod level;
mod matchup;
mod outcome;
mod relation;
mod series;
mod site;
mod table;

pub use band::*;
pub use field::*;
pub use fitted::*;
pub use level::*;
pub use matchup::*;
pub use outcome::*;
pub use relation::*;
pub use series::*;
pub use site::*;
pub use table::*;
