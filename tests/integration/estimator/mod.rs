//! The fit of level against wind: check cases, invariances, independent references, a short simulation study.

mod cases;
mod edge_cases;
mod further;
mod independent;
mod program_cases;
mod properties;
mod simulator;
mod study;
mod through_the_program;
