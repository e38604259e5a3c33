//! The jobs: read, compute, write. One file a job.

mod check;
mod check_spectra;
mod exclusion;
mod fitting;
mod inputs;
mod look_up;
mod look_up_moments;
mod look_up_sea;
mod look_up_waves;
mod matching;
mod progress;
mod provenance;
mod reporting;
mod run;
mod sampling;
mod sea;
mod sensitivity;
mod simulate;
mod spectra_sampling;
mod spreading;

pub use check::{CheckReport, check_study};
pub use check_spectra::SpectraCheck;
pub use fitting::{fit_matched, fit_pairs, relations_json, write_relations};
pub use inputs::{Inputs, OpenLevels, OpenSpectra, OpenWind, open_inputs, open_sites};
pub use look_up::{Answer, LookUp, look_up_levels, look_up_sites, look_up_wind};
pub use look_up_sea::look_up_spectrum;
pub use look_up_waves::look_up_waves;
pub use matching::{Counts, Matched, bring_together, write_tables};
pub use progress::{Progress, Silent};
pub use provenance::{InputRecord, PROGRAM};
pub use run::{Outcome, Stage, make_folder, run};
pub use sampling::sample_wind;
pub use sea::Sea;
pub use simulate::simulate_study;
pub use spectra_sampling::{SpectraRules, sample_spectra};
