//! Results as plain tables: names with units, and one sentence of meaning for each column.

mod checks;
mod conditions;
mod matchups;
mod opposing;
mod relation;
mod replicates;
mod sampled;
mod sea;
mod segments;
mod sensitivity;
mod spreading;

pub use checks::{bands_together_table, wind_error_table};
pub use conditions::conditions_table;
pub use matchups::matchups_table;
pub use opposing::*;
pub use relation::relation_table;
pub use replicates::replicates_table;
pub use sampled::sampled_table;
pub use segments::segments_table;
pub use sensitivity::sensitivity_table;
pub use spreading::{spreading_table, testability_table};
