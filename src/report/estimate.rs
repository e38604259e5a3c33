//! An estimate as figures and tables show it: a value with its interval, a bound, or nothing resolved.

use super::number;

/// What is known of a quantity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Estimate {
    /// A resolved value with its interval; `low` and `high` are NaN when no interval was computed.
    Value {
        /// Best estimate.
        value: f64,
        /// Lower end of the interval.
        low: f64,
        /// Upper end of the interval.
        high: f64,
    },
    /// A best number that the data do not resolve: drawn open, and said so.
    Unresolved {
        /// Best number.
        value: f64,
        /// Lower end of the interval.
        low: f64,
        /// Upper end of the interval.
        high: f64,
    },
    /// It lies above this value.
    Above(f64),
    /// It lies below this value.
    Below(f64),
    /// Nothing can be said.
    NotResolved,
}

impl Estimate {
    /// A value without an interval; `NotResolved` when it is not finite.
    pub fn point(value: f64) -> Self {
        Self::value(value, f64::NAN, f64::NAN)
    }

    /// A value with its interval; `NotResolved` when it is not finite.
    pub fn value(value: f64, low: f64, high: f64) -> Self {
        if value.is_finite() { Self::Value { value, low, high } } else { Self::NotResolved }
    }

    /// All finite numbers in it, for the range of an axis.
    pub(crate) fn numbers(&self) -> impl Iterator<Item = f64> {
        match *self {
            Self::Value { value, low, high } | Self::Unresolved { value, low, high } => [value, low, high],
            Self::Above(bound) | Self::Below(bound) => [bound, f64::NAN, f64::NAN],
            Self::NotResolved => [f64::NAN; 3],
        }
        .into_iter()
        .filter(|v| v.is_finite())
    }

    /// The text for a table cell or a label: `9.8 (9.1 to 10.6) m/s`, `above 11.3 m/s`, `not resolved`.
    /// `decimals` is used where no interval says better.
    pub fn text(&self, unit: &str, decimals: usize) -> String {
        match *self {
            Self::Value { value, low, high } => number::with_interval(value, low, high, unit, decimals),
            Self::Unresolved { value, low, high } => {
                format!("{}, not resolved", number::with_interval(value, low, high, unit, decimals))
            }
            Self::Above(bound) => format!("above {}", number::quantity(bound, decimals, unit)),
            Self::Below(bound) => format!("below {}", number::quantity(bound, decimals, unit)),
            Self::NotResolved => "not resolved".to_owned(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_outcome_has_its_own_words() {
        assert_eq!(Estimate::value(9.81, 9.1, 10.6).text("m/s", 1), "9.8 (9.1 to 10.6)\u{a0}m/s");
        assert_eq!(Estimate::Above(11.31).text("m/s", 1), "above 11.3\u{a0}m/s");
        assert_eq!(Estimate::Below(4.0).text("m/s", 1), "below 4.0\u{a0}m/s");
        assert_eq!(Estimate::point(f64::NAN).text("m/s", 1), "not resolved");
        assert_eq!(Estimate::value(1.0, f64::NAN, 3.0).numbers().collect::<Vec<_>>(), [1.0, 3.0]);
    }
}
