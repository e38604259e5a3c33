//! Simulated deployments: the truth is recovered, files are reproducible, and what is stated is what is written.

mod refusals;
mod reproducible;
mod stated_law;
mod study_wind;
mod support;
mod truth_recovered;
