//! Directional spectra: readers, sampling, the reference set and real files.

mod hazards;
mod reference;
mod sampling;
mod study;
mod support;
mod waves;
