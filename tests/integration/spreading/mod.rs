//! The comparison of a model's spreading with sound, on simulated deployments with known truth. The long study is
//! `cargo bench --bench spreading`.

mod behaviour;
mod deployments;
mod statistics;
