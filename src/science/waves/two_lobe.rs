//! Two equal wrapped Gaussians fitted to the distribution over directions at one frequency.
//!
//! The first two harmonics about the mean direction give a start in closed form: with q = exp(-sigma^2 / 2) they are
//! r1 = q cos(delta) and r2 = q^4 cos(2 delta), so u = q^2 solves u^2 - 2 r1^2 u + r2 = 0. Least squares on the bins
//! themselves then moves half-separation, width and middle direction (Levenberg and Marquardt's method).

use super::spreading_law::wrapped_normal_per_rad;
use crate::model::SpectrumAxes;
use std::f64::consts::{PI, TAU};

/// The two lobes at one frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TwoLobes {
    /// Angle of each lobe from the middle direction, rad, 0 to pi / 2.
    pub half_separation_rad: f64,
    /// Standard deviation of each lobe, rad.
    pub width_rad: f64,
    /// Middle direction (going to), rad.
    pub middle_to_rad: f64,
    /// Root mean square of what the two lobes leave over against that of the distribution itself.
    pub misfit: f64,
}

impl TwoLobes {
    /// Whether the sum of the lobes has two maxima: two equal Gaussians do where they are more than their width from the
    /// middle (closed form; exact as long as the lobes do not reach round the circle).
    pub fn two_maxima(&self) -> bool {
        self.half_separation_rad > self.width_rad
    }

    fn per_rad(&self, to_rad: f64) -> f64 {
        let from_middle = to_rad - self.middle_to_rad;
        0.5 * (wrapped_normal_per_rad(from_middle - self.half_separation_rad, self.width_rad)
            + wrapped_normal_per_rad(from_middle + self.half_separation_rad, self.width_rad))
    }
}

/// Narrowest and broadest lobe that the fit tries, rad.
const WIDTHS_RAD: [f64; 2] = [0.02, 3.0];

/// Fits two lobes to the densities of one frequency. `None` for a sector, without energy, or where the sea has no mean
/// direction (first harmonic below 1e-6).
pub fn fit_two_lobes(axes: &SpectrumAxes, row: &[f64]) -> Option<TwoLobes> {
    if !axes.full_circle || row.iter().any(|density| !density.is_finite()) {
        return None;
    }
    let total: f64 = row.iter().zip(&axes.direction_width_rad).map(|(d, w)| d * w).sum();
    if total <= 0.0 {
        return None;
    }
    let share: Vec<f64> = row.iter().map(|density| density / total).collect();
    let mut best = refine(axes, &share, start(axes, &share)?);
    // The middle of two lobes far apart is not well known from harmonics: also start from broad opposite lobes.
    let wide = TwoLobes { half_separation_rad: 1.3, width_rad: 0.4, ..best };
    let other = refine(axes, &share, wide);
    if other.misfit < best.misfit * (1.0 - 1e-9) {
        best = other;
    }
    Some(best)
}

fn start(axes: &SpectrumAxes, share: &[f64]) -> Option<TwoLobes> {
    let harmonic = |n: f64, middle: f64| {
        let terms = share.iter().zip(&axes.direction_to_rad).zip(&axes.direction_width_rad);
        terms.fold((0.0, 0.0), |(cosine, sine), ((d, to), w)| {
            let (s, c) = libm::sincos(n * (to - middle));
            (cosine + d * w * c, sine + d * w * s)
        })
    };
    let (a1, b1) = harmonic(1.0, 0.0);
    if libm::hypot(a1, b1) < 1e-6 {
        return None;
    }
    let middle_to_rad = libm::atan2(b1, a1);
    let (r1, r2) = (harmonic(1.0, middle_to_rad).0, harmonic(2.0, middle_to_rad).0);
    let square = r1 * r1;
    let root = (square * square - r2).max(0.0).sqrt();
    let u = (square + root).clamp(1e-3, 1.0 - 1e-4);
    Some(TwoLobes {
        half_separation_rad: libm::acos((r1 / u.sqrt()).clamp(-1.0, 1.0)).clamp(0.02, 0.5 * PI),
        width_rad: (-libm::log(u)).sqrt().clamp(WIDTHS_RAD[0], WIDTHS_RAD[1]),
        middle_to_rad,
        misfit: f64::NAN,
    })
}

fn misfit(axes: &SpectrumAxes, share: &[f64], lobes: &TwoLobes) -> f64 {
    let (mut left, mut size) = (0.0, 0.0);
    for ((density, to), width) in share.iter().zip(&axes.direction_to_rad).zip(&axes.direction_width_rad) {
        let difference = density - lobes.per_rad(*to);
        left += difference * difference * width;
        size += density * density * width;
    }
    (left / size).sqrt()
}

fn moved(lobes: &TwoLobes, step: [f64; 3]) -> TwoLobes {
    let half = (lobes.half_separation_rad + step[0]).abs();
    TwoLobes {
        half_separation_rad: if half > 0.5 * PI { (PI - half).max(0.0) } else { half },
        width_rad: (lobes.width_rad + step[1]).clamp(WIDTHS_RAD[0], WIDTHS_RAD[1]),
        // Beyond a right angle the two lobes have passed each other: their middle is behind.
        middle_to_rad: lobes.middle_to_rad + step[2] + if half > 0.5 * PI { PI } else { 0.0 },
        misfit: f64::NAN,
    }
}

fn refine(axes: &SpectrumAxes, share: &[f64], start: TwoLobes) -> TwoLobes {
    const DIFFERENCE: f64 = 1e-5;
    let mut best = TwoLobes { misfit: misfit(axes, share, &start), ..start };
    let mut damping = 1e-3;
    for _ in 0..60 {
        let mut normal = [[0.0; 3]; 3];
        let mut gradient = [0.0; 3];
        for ((density, to), width) in share.iter().zip(&axes.direction_to_rad).zip(&axes.direction_width_rad) {
            let value = best.per_rad(*to);
            let slope: [f64; 3] = std::array::from_fn(|part| {
                let mut step = [0.0; 3];
                step[part] = DIFFERENCE;
                let ahead = TwoLobes {
                    half_separation_rad: best.half_separation_rad + step[0],
                    width_rad: best.width_rad + step[1],
                    middle_to_rad: best.middle_to_rad + step[2],
                    misfit: 0.0,
                };
                (ahead.per_rad(*to) - value) / DIFFERENCE
            });
            for i in 0..3 {
                gradient[i] += width * slope[i] * (density - value);
                for j in 0..3 {
                    normal[i][j] += width * slope[i] * slope[j];
                }
            }
        }
        for (i, row) in normal.iter_mut().enumerate() {
            row[i] += damping * row[i] + 1e-12;
        }
        let Some(step) = solve(normal, gradient) else { break };
        let mut trial = moved(&best, step);
        trial.misfit = misfit(axes, share, &trial);
        if trial.misfit < best.misfit {
            let gain = best.misfit - trial.misfit;
            best = trial;
            damping = (damping * 0.3).max(1e-9);
            if gain < 1e-12 {
                break;
            }
        } else {
            damping *= 5.0;
            if damping > 1e8 {
                break;
            }
        }
    }
    TwoLobes { middle_to_rad: best.middle_to_rad.rem_euclid(TAU), ..best }
}

/// Gauss elimination of three equations with the largest pivot.
fn solve(mut a: [[f64; 3]; 3], mut b: [f64; 3]) -> Option<[f64; 3]> {
    for column in 0..3 {
        let pivot = (column..3).max_by(|i, j| a[*i][column].abs().total_cmp(&a[*j][column].abs()))?;
        if a[pivot][column].abs() < 1e-300 {
            return None;
        }
        a.swap(column, pivot);
        b.swap(column, pivot);
        for row in column + 1..3 {
            let factor = a[row][column] / a[column][column];
            let above = a[column];
            for (value, upper) in a[row].iter_mut().zip(above).skip(column) {
                *value -= factor * upper;
            }
            b[row] -= factor * b[column];
        }
    }
    for row in (0..3).rev() {
        for column in row + 1..3 {
            b[row] -= a[row][column] * b[column];
        }
        b[row] /= a[row][row];
    }
    Some(b)
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::{Distribution, SpreadingLaw};
    use super::*;

    fn axes(count: usize) -> SpectrumAxes {
        let directions = (0..count).map(|i| i as f64 * TAU / count as f64).collect();
        SpectrumAxes::new(vec![0.1, 0.2], None, directions).unwrap()
    }

    fn fit(law: Distribution, middle: f64, count: usize) -> TwoLobes {
        let axes = axes(count);
        let row: Vec<f64> = axes.direction_to_rad.iter().map(|to| 3.0 * law.per_rad(to - middle)).collect();
        fit_two_lobes(&axes, &row).unwrap()
    }

    #[test]
    fn known_lobes_are_found_again() {
        for (half_deg, width_deg) in [(70.0, 25.0), (50.0, 20.0), (30.0, 25.0), (80.0, 30.0), (20.0, 12.0)] {
            for middle in [0.0, 1.1, 4.0] {
                let law = Distribution::TwoLobe {
                    half_separation_rad: f64::to_radians(half_deg),
                    width_rad: f64::to_radians(width_deg),
                };
                let found = fit(law, middle, 36);
                assert!((found.half_separation_rad.to_degrees() - half_deg).abs() < 0.05, "{half_deg}: {found:?}");
                assert!((found.width_rad.to_degrees() - width_deg).abs() < 0.05, "{found:?}");
                let turn = (found.middle_to_rad - middle).rem_euclid(TAU);
                assert!(turn.min(TAU - turn) < 1e-3 && found.misfit < 1e-4, "{found:?}");
                assert_eq!(found.two_maxima(), half_deg > width_deg);
            }
        }
    }

    // Ewans 1998 as in the physics reference: 58.7 degrees at 4 fp.
    #[test]
    fn the_course_of_the_published_law_comes_back() {
        let found = fit(SpreadingLaw::Ewans1998.at(4.0, 1.0), 2.0, 36);
        assert!((found.half_separation_rad.to_degrees() - 58.7).abs() < 0.05, "{found:?}");
    }

    #[test]
    fn one_lobe_has_no_two_maxima() {
        let found = fit(Distribution::WrappedNormal { width_rad: 0.5 }, 1.0, 36);
        assert!(!found.two_maxima() && found.misfit < 1e-3, "{found:?}");
        let found = fit(Distribution::CosinePower { s: 4.0 }, 1.0, 36);
        assert!(!found.two_maxima() && found.misfit < 0.05, "{found:?}");
    }

    #[test]
    fn what_cannot_be_fitted_has_no_lobes() {
        let axes = axes(36);
        assert_eq!(fit_two_lobes(&axes, &[0.0; 36]), None);
        assert_eq!(fit_two_lobes(&axes, &[1.0; 36]), None);
        assert_eq!(fit_two_lobes(&axes, &[f64::NAN; 36]), None);
    }
}
