//! The overlap of opposing waves: the integral of A(t) B(t + pi) over 0 to 2 pi, for one sea with itself and for two.
//!
//! By bins where every direction has an exact opposite (an even number of equal steps): step x sum `A_i B_(i + N/2)`. By the
//! Fourier sum (1 / 2 pi) sum over n of (-1)^n `A_n` conj(`B_n`) otherwise: with an odd number of directions the opposite falls
//! between two bins, and averaging those multiplies the harmonics by cos(n step / 2), which raises narrow seas by decibels.

use crate::model::SpectrumAxes;
use std::f64::consts::{PI, TAU};

/// How directions oppose each other; made once for an axis.
#[derive(Debug, Clone)]
pub struct Opposing {
    directions: usize,
    /// Half the number of directions and their step, where opposite bins exist.
    bins: Option<(usize, f64)>,
    /// `kernel[i * directions + j]`: what the product of directions i and j adds in the Fourier sum. Empty for a sector.
    kernel: Vec<f64>,
}

impl Opposing {
    /// The table of an axis.
    pub fn new(axes: &SpectrumAxes) -> Self {
        let directions = axes.directions();
        let bins = (axes.even_steps && directions.is_multiple_of(2)).then(|| (directions / 2, TAU / directions as f64));
        let kernel = if axes.full_circle { fourier_kernel(axes) } else { Vec::new() };
        Self { directions, bins, kernel }
    }

    /// Whether the directions go all the way round, so that opposing waves can be judged at all.
    pub fn is_known(&self) -> bool {
        !self.kernel.is_empty()
    }

    /// Overlap of two rows of densities by the better of the two ways for this axis; NaN for a sector. Symmetric in its
    /// arguments.
    pub fn overlap<T: Copy + Into<f64>>(&self, first: &[T], second: &[T]) -> f64 {
        match self.bins {
            Some(_) => self.by_bins(first, second),
            None => self.by_fourier(first, second),
        }
    }

    /// Overlap from pairs of opposite bins; NaN where the axis has none.
    pub fn by_bins<T: Copy + Into<f64>>(&self, first: &[T], second: &[T]) -> f64 {
        let Some((half, step)) = self.bins else { return f64::NAN };
        let (first_low, first_high) = first.split_at(half);
        let (second_low, second_high) = second.split_at(half);
        step * (product_sum(first_low, second_high) + product_sum(first_high, second_low))
    }

    /// Overlap of a row with itself, by the better way; half the work of [`Self::overlap`].
    pub fn own<T: Copy + Into<f64>>(&self, row: &[T]) -> f64 {
        match self.bins {
            Some((half, step)) => {
                let (low, high) = row.split_at(half);
                2.0 * step * product_sum(low, high)
            }
            None => self.by_fourier(row, row),
        }
    }

    /// Overlap from the Fourier sum over the harmonics that the directions resolve; NaN for a sector.
    pub fn by_fourier<T: Copy + Into<f64>>(&self, first: &[T], second: &[T]) -> f64 {
        if self.kernel.is_empty() {
            return f64::NAN;
        }
        let rows = self.kernel.chunks_exact(self.directions);
        first.iter().zip(rows).map(|(value, row)| (*value).into() * product_sum(row, second)).sum()
    }

    /// The part of a row's overlap that pairs bins of one label with bins of another.
    pub fn joint(&self, row: &[f64], labels: &[usize], first: usize, second: usize) -> f64 {
        if let Some((half, step)) = self.bins {
            let pairs = (0..half).filter(|i| {
                let (a, b) = (labels[*i], labels[i + half]);
                (a == first && b == second) || (a == second && b == first)
            });
            return 2.0 * step * pairs.map(|i| row[i] * row[i + half]).sum::<f64>();
        }
        let only = |label: usize| -> Vec<f64> {
            row.iter().zip(labels).map(|(density, of)| if *of == label { *density } else { 0.0 }).collect()
        };
        2.0 * self.by_fourier(&only(first), &only(second))
    }

    /// Share of the pairs of opposite bins in which at least one density is zero; NaN where the axis has no such pairs.
    pub fn zero_pair_share(&self, row: &[f64]) -> f64 {
        let Some((half, _)) = self.bins else { return f64::NAN };
        let zeros = (0..half).filter(|i| row[*i] == 0.0 || row[i + half] == 0.0).count();
        zeros as f64 / half as f64
    }
}

/// Sum of products in four interleaved parts: the same order on every machine, and wide registers can be used.
fn product_sum<A: Copy + Into<f64>, B: Copy + Into<f64>>(first: &[A], second: &[B]) -> f64 {
    const LANES: usize = 4;
    let mut parts = [0.0_f64; LANES];
    let (whole_a, rest_a) = first.as_chunks::<LANES>();
    let (whole_b, rest_b) = second.as_chunks::<LANES>();
    for (a, b) in whole_a.iter().zip(whole_b) {
        for lane in 0..LANES {
            parts[lane] += a[lane].into() * b[lane].into();
        }
    }
    let rest: f64 = rest_a.iter().zip(rest_b).map(|(a, b)| (*a).into() * (*b).into()).sum();
    (parts[0] + parts[1]) + (parts[2] + parts[3]) + rest
}

/// Harmonics below half a turn of the widest step are resolved.
fn fourier_kernel(axes: &SpectrumAxes) -> Vec<f64> {
    let count = axes.directions();
    let widest =
        if axes.even_steps { TAU / count as f64 } else { axes.direction_width_rad.iter().copied().fold(0.0, f64::max) };
    // The last harmonic of an even number of directions is its own mirror image and stays out.
    let harmonics = ((PI / widest - 1e-6).ceil() as usize).saturating_sub(1).min((count - 1) / 2);
    let mut kernel = Vec::with_capacity(count * count);
    for i in 0..count {
        for j in 0..count {
            let turn = axes.direction_to_rad[i] - axes.direction_to_rad[j];
            let sum: f64 =
                (1..=harmonics).map(|n| (if n % 2 == 0 { 2.0 } else { -2.0 }) * libm::cos(n as f64 * turn)).sum();
            kernel.push(axes.direction_width_rad[i] * axes.direction_width_rad[j] * (1.0 + sum) / TAU);
        }
    }
    kernel
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::Distribution;
    use super::*;

    fn axes(count: usize, start: f64) -> SpectrumAxes {
        let directions = (0..count).map(|i| start + i as f64 * TAU / count as f64).collect();
        SpectrumAxes::new(vec![0.1, 0.2], None, directions).unwrap()
    }

    fn row(law: Distribution, axes: &SpectrumAxes, mean: f64) -> Vec<f64> {
        axes.direction_to_rad.iter().map(|to| law.per_rad(to - mean)).collect()
    }

    // Closed forms (physics reference rows "overlap I_2pi ..."): isotropic and cos^2s s = 2 to 1e-9, two lobes 70/25 to
    // 1e-3, on 24, 36 and 72 directions and any starting offset.
    #[test]
    fn closed_forms_on_any_even_grid() {
        let two_lobe = Distribution::TwoLobe { half_separation_rad: 70f64.to_radians(), width_rad: 25f64.to_radians() };
        for (law, expected, tolerance) in [
            (Distribution::Isotropic, 0.159_154_943_1, 1e-9),
            (Distribution::CosinePower { s: 2.0 }, 0.026_525_823_85, 1e-9),
            (two_lobe, 0.170_452_393_1, 1e-3),
        ] {
            for count in [24, 36, 72] {
                for start in [0.0, 0.03, 0.08] {
                    let axes = axes(count, start);
                    let table = Opposing::new(&axes);
                    let row = row(law, &axes, 1.0);
                    for found in [table.by_bins(&row, &row), table.own(&row), table.by_fourier(&row, &row)] {
                        assert!((found / expected - 1.0).abs() < tolerance, "{law:?} {count}: {found}");
                    }
                }
            }
        }
    }

    // The physics reference finds +2.73 dB for cos^2s s = 10 on 25 directions with averaged neighbours; the Fourier sum has
    // none of it (closed form 8.614331502e-07).
    #[test]
    fn an_odd_number_of_directions_has_no_bias() {
        let axes = axes(25, 0.02);
        let table = Opposing::new(&axes);
        let narrow = row(Distribution::CosinePower { s: 10.0 }, &axes, 0.4);
        assert!((table.own(&narrow) / 8.614_331_502e-7 - 1.0).abs() < 1e-6);
        assert!(table.by_bins(&narrow, &narrow).is_nan());
    }

    // Closed form: two opposed bins of N have N / 4 pi (physics reference, 36 bins: 2.864788976).
    #[test]
    fn two_opposed_bins_are_the_most_there_is() {
        let axes = axes(36, 0.0);
        let mut row = vec![0.0; 36];
        row[3] = 0.5 / axes.direction_width_rad[3];
        row[21] = row[3];
        let table = Opposing::new(&axes);
        assert!((table.own(&row) - 2.864_788_976).abs() < 1e-9);
        assert!((table.zero_pair_share(&row) - 17.0 / 18.0).abs() < 1e-15);
    }

    #[test]
    fn a_sector_has_no_overlap() {
        let axes =
            SpectrumAxes::new(vec![0.1, 0.2], None, (0..19).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap();
        let table = Opposing::new(&axes);
        assert!(!table.is_known() && table.own(&[1.0; 19]).is_nan());
    }
}
