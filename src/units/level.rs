//! Levels in decibels. Levels add and average in power, never in decibels.

use std::ops::{Add, Neg, Sub};

/// A difference of levels, in dB.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Decibels(pub f64);

impl Add for Decibels {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Self(self.0 + other.0)
    }
}

impl Sub for Decibels {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Self(self.0 - other.0)
    }
}

impl Neg for Decibels {
    type Output = Self;
    fn neg(self) -> Self {
        Self(-self.0)
    }
}

/// Power ratio of a level: 10^(L/10).
pub fn power_of_db(level_db: f64) -> f64 {
    libm::pow(10.0, level_db / 10.0)
}

/// Level of a power ratio: 10 log10(p); minus infinity for zero.
pub fn db_of_power(power: f64) -> f64 {
    10.0 * libm::log10(power)
}

/// Level of the mean power of several levels (ISO 18405: an average of mean-square pressures, not of decibels).
/// `None` when there are none.
pub fn mean_power_db(levels_db: &[f64]) -> Option<f64> {
    if levels_db.is_empty() {
        return None;
    }
    // Relative to the loudest, so that no level overflows.
    let loudest = levels_db.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if !loudest.is_finite() {
        return Some(loudest);
    }
    let sum: f64 = levels_db.iter().map(|level| power_of_db(level - loudest)).sum();
    Some(loudest + db_of_power(sum / levels_db.len() as f64))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_equal_levels_average_to_themselves_and_a_silent_one_costs_3_db() {
        assert!((mean_power_db(&[60.0, 60.0]).unwrap() - 60.0).abs() < 1e-12);
        // 10 log10(1/2) = -3.0103 dB, closed form.
        assert!((mean_power_db(&[60.0, f64::NEG_INFINITY]).unwrap() - (60.0 - 3.010_299_956_639_812)).abs() < 1e-12);
        assert!(mean_power_db(&[]).is_none());
    }

    #[test]
    fn extreme_levels_do_not_overflow() {
        assert!((mean_power_db(&[5000.0, 5000.0]).unwrap() - 5000.0).abs() < 1e-9);
    }
}
