//! Names and numbers in words, as figures and page use them.

use crate::model::{LevelKind, Resolved, Verdict};
use crate::report::Estimate;

/// Quantity and reference of a level, as an axis says it.
pub(in crate::pipeline) fn level_label(kind: LevelKind) -> &'static str {
    match kind {
        LevelKind::BandLevel => "Band level (dB re 1 µPa²)",
        LevelKind::SpectralDensityLevel => "Spectral density level (dB re 1 µPa² Hz⁻¹)",
    }
}

/// The reference alone.
pub(in crate::pipeline) fn reference(kind: LevelKind) -> &'static str {
    match kind {
        LevelKind::BandLevel => "dB re 1 µPa²",
        LevelKind::SpectralDensityLevel => "dB re 1 µPa² Hz⁻¹",
    }
}

/// A result as figures show it.
pub(in crate::pipeline) fn estimate(value: Resolved) -> Estimate {
    match value {
        Resolved::Value { estimate, low, high } => {
            Estimate::value(estimate, low.unwrap_or(f64::NAN), high.unwrap_or(f64::NAN))
        }
        Resolved::AtLeast(bound) => Estimate::Above(bound),
        Resolved::AtMost(bound) => Estimate::Below(bound),
        Resolved::NotResolved(_) => Estimate::NotResolved,
    }
}

/// An onset as figures show it: without intervals nothing is resolved.
pub(in crate::pipeline) fn onset(value: Resolved, verdict: Verdict) -> Estimate {
    match (value, verdict) {
        (Resolved::Value { estimate, .. }, Verdict::PointOnly) => {
            Estimate::Unresolved { value: estimate, low: f64::NAN, high: f64::NAN }
        }
        _ => estimate(value),
    }
}

/// A name as part of a file name: letters, digits and dashes alone.
pub(in crate::pipeline) fn file_part(name: &str) -> String {
    name.chars().map(|c| if c.is_ascii_alphanumeric() { c.to_ascii_lowercase() } else { '-' }).collect()
}
