//! A gridded value at a site: which nodes, with which weights, and how they are brought together.

mod combine;
mod scattered;
mod stencil;

pub use combine::{NodeWinds, SiteStep, wind_at_site};
pub use stencil::{distance_km, stencil};
