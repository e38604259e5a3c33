//! The study file: strict TOML sections, then one step that checks them against each other.
//!
//! Everything that the input files' metadata states is read from them; the study file adds what they leave out or get
//! wrong. Unknown keys are errors. Paths are relative to the study file. Every error names the file and the line.

mod error;
mod exclude;
mod fit;
mod levels;
mod matching;
mod place;
mod set;
mod sites;
mod spectra;
mod spreading;
mod study;
mod wind;

pub use error::StudyError;
pub use exclude::{ExcludeInput, ExcludeWhat};
pub use fit::{FloorBy, OffsetBy, RelationSection, SegmentBy, check_replicates, segment_choice};
pub use levels::{LevelsInput, level_options_from};
pub use matching::{MatchSection, WindowSpeed};
pub use sites::SitesInput;
pub use spectra::{SpectraInput, spectra_options_from};
pub use spreading::SpreadingSection;
pub use study::{ReportSection, Study, TableFormat, read_study};
pub use wind::{WindInput, WindOrigin, wave_options_from, wind_options_from};
