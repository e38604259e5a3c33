//! Frequencies.

use super::UnitsError;
use serde::{Deserialize, Serialize};

/// A frequency in hertz, above zero and finite.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize, Deserialize)]
#[serde(try_from = "f64", into = "f64")]
pub struct Hertz(f64);

impl Hertz {
    /// From a number of hertz.
    ///
    /// # Errors
    /// When the number is not finite or not above zero.
    pub fn new(hz: f64) -> Result<Self, UnitsError> {
        if hz.is_finite() && hz > 0.0 {
            Ok(Self(hz))
        } else {
            Err(UnitsError { quantity: "frequency", found: hz, expected: "a number of hertz above 0" })
        }
    }

    /// The number of hertz.
    pub fn hz(self) -> f64 {
        self.0
    }
}

impl TryFrom<f64> for Hertz {
    type Error = UnitsError;

    fn try_from(hz: f64) -> Result<Self, UnitsError> {
        Self::new(hz)
    }
}

impl From<Hertz> for f64 {
    fn from(frequency: Hertz) -> f64 {
        frequency.0
    }
}
