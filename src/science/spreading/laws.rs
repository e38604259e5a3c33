//! Expected overlap of the published laws against f / fp, in a table: how far they part decides what sound can judge.

use crate::science::waves::SpreadingLaw;

const FIRST_X: f64 = 0.5;
const LAST_X: f64 = 12.0;
const POINTS: usize = 160;

/// Overlap of each published law, dB re isotropic, on a logarithmic scale of f / fp.
#[derive(Debug, Clone)]
pub struct LawTable {
    overlap_db: Vec<[f64; SpreadingLaw::ALL.len()]>,
}

impl LawTable {
    /// The laws for wind seas of this inverse wave age U10 / cp.
    pub fn new(inverse_wave_age: f64) -> Self {
        let overlap_db = (0..POINTS)
            .map(|i| {
                let x = FIRST_X * libm::pow(LAST_X / FIRST_X, i as f64 / (POINTS - 1) as f64);
                SpreadingLaw::ALL.map(|law| law.at(x.min(law.reaches_to()), inverse_wave_age).overlap_db())
            })
            .collect();
        Self { overlap_db }
    }

    /// Overlap of every law at x = f / fp, in the order of [`SpreadingLaw::ALL`], dB re isotropic; beyond the data of a law its
    /// last value.
    pub fn at(&self, x: f64) -> [f64; SpreadingLaw::ALL.len()] {
        let position = libm::log(x / FIRST_X) / libm::log(LAST_X / FIRST_X) * (POINTS - 1) as f64;
        let position = position.clamp(0.0, (POINTS - 1) as f64);
        let below = (position.floor() as usize).min(POINTS - 2);
        let share = position - below as f64;
        std::array::from_fn(|law| {
            let (a, b) = (self.overlap_db[below][law], self.overlap_db[below + 1][law]);
            a + share * (b - a)
        })
    }

    /// Largest difference between the laws at x = f / fp, dB; NaN for a NaN.
    pub fn range_db(&self, x: f64) -> f64 {
        let (low, high) = self.ends_db(x);
        high - low
    }

    /// Midway between the lowest and the highest law at x = f / fp, dB re isotropic.
    pub fn middle_db(&self, x: f64) -> f64 {
        let (low, high) = self.ends_db(x);
        0.5 * (low + high)
    }

    fn ends_db(&self, x: f64) -> (f64, f64) {
        if x.is_nan() {
            return (f64::NAN, f64::NAN);
        }
        let laws = self.at(x);
        (laws.iter().copied().fold(f64::INFINITY, f64::min), laws.iter().copied().fold(f64::NEG_INFINITY, f64::max))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    // Physics reference: "for f > 4 fp every published law sits within about 3 dB of isotropic"; "between 1.5 and 3 fp the
    // laws differ by 10 to 25 dB".
    #[test]
    fn laws_part_below_three_peaks_and_meet_above_four() {
        let table = LawTable::new(1.0);
        for x in [1.5, 1.8, 2.0] {
            assert!(table.range_db(x) > 8.0, "{x}: {}", table.range_db(x));
        }
        for x in [4.0, 5.0, 7.0] {
            assert!(table.at(x).iter().all(|overlap| overlap.abs() < 3.5), "{x}: {:?}", table.at(x));
        }
        assert!((table.at(2.0)[0] - SpreadingLaw::Mitsuyasu1975.at(2.0, 1.0).overlap_db()).abs() < 0.05);
        assert!(table.range_db(f64::NAN).is_nan());
    }
}
