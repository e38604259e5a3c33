//! All integration tests: one program, so that the heavy libraries are linked once.
#![expect(clippy::unwrap_used, reason = "a test may stop at the first surprise")]

mod cli;
mod demo;
mod estimator;
mod exclusion;
mod faults;
mod grids;
mod layering;
mod real_data;
mod sensitivity;
mod simulate;
mod spectra;
mod spreading;
mod study_file;
mod support;
mod tables;
mod waves;
