//! A quantity that is known, bounded, or not resolved.

use super::NotResolved;
use serde::{Deserialize, Serialize};

/// A quantity with its 95 % interval, a bound, or the reason why it has no value.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Resolved {
    /// A value; the ends are absent when no interval was computed.
    Value {
        /// Best estimate.
        estimate: f64,
        /// Lower end of the 95 % interval.
        low: Option<f64>,
        /// Upper end of the 95 % interval.
        high: Option<f64>,
    },
    /// At least this much.
    AtLeast(f64),
    /// At most this much.
    AtMost(f64),
    /// No value, and why.
    NotResolved(NotResolved),
}

impl Resolved {
    /// A value without an interval.
    pub fn point(estimate: f64) -> Self {
        Self::Value { estimate, low: None, high: None }
    }

    /// A value with its interval.
    pub fn with_interval(estimate: f64, low: f64, high: f64) -> Self {
        Self::Value { estimate, low: Some(low), high: Some(high) }
    }

    /// The best estimate, if there is one.
    pub fn estimate(&self) -> Option<f64> {
        match self {
            Self::Value { estimate, .. } => Some(*estimate),
            Self::AtLeast(_) | Self::AtMost(_) | Self::NotResolved(_) => None,
        }
    }

    /// The 95 % interval, if there is one.
    pub fn interval(&self) -> Option<(f64, f64)> {
        match self {
            Self::Value { low: Some(low), high: Some(high), .. } => Some((*low, *high)),
            Self::Value { .. } | Self::AtLeast(_) | Self::AtMost(_) | Self::NotResolved(_) => None,
        }
    }

    /// The same with every number changed by an increasing function (such as a change of unit).
    #[must_use]
    pub fn map(self, change: impl Fn(f64) -> f64) -> Self {
        match self {
            Self::Value { estimate, low, high } => {
                Self::Value { estimate: change(estimate), low: low.map(&change), high: high.map(&change) }
            }
            Self::AtLeast(bound) => Self::AtLeast(change(bound)),
            Self::AtMost(bound) => Self::AtMost(change(bound)),
            Self::NotResolved(why) => Self::NotResolved(why),
        }
    }
}
