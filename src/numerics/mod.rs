//! Mathematics with no sea in it.

pub mod autocovariance;
pub mod axis;
pub mod dot;
pub mod least_squares;
pub mod multiple_tests;
pub mod quantile;
pub mod ramp_table;
pub mod resample;
pub mod student_t;
pub mod symmetric;
