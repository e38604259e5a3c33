//! Tests of need: does the band need a floor, an onset, separate deployments, a slope at all?
//!
//! The score of a candidate column is projected off the columns of the smaller law, summed over blocks in time, and compared
//! with the same sums under random signs per block; the largest candidate counts (Hansen 1996; Davies 1987 for the problem).

use super::fits::Band;
use super::law::{Corner, Law, Parameters, wind_term};
use super::record::Cells;
use crate::numerics::resample::{generator, signs};
use crate::numerics::symmetric::{Symmetric, solve_factored};

/// Number of random sign patterns.
const PATTERNS: usize = 499;
/// Below this number of blocks nothing is tested.
pub(crate) const LEAST_BLOCKS: usize = 8;

/// Purpose of the random signs, so that tests do not share draws.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Purpose {
    Slope = 11,
    Floor = 12,
    Onset = 13,
    Deployments = 14,
    KneeGivenCurve = 15,
}

/// Which departures count.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Departure {
    /// Only those in the direction of the column.
    OneSided,
    /// Both, each column divided by the spread of its own block sums.
    Studentised,
}

/// Curve of the smaller law at the rows: level, h', and the columns of its Jacobian.
pub(crate) struct NullCurve {
    pub(crate) level_db: Vec<f64>,
    pub(crate) wind_share: Vec<f64>,
    pub(crate) columns: Vec<Vec<f64>>,
}

impl NullCurve {
    /// Of a law at its fit. With `shared` the deployments' columns are added up to one floor and one wind part.
    pub(crate) fn new(band: &Band, law: Law, corner: Corner, at: &Parameters, shared: bool) -> Self {
        let form = band.form(law, corner);
        let deployments = band.rows.deployment_of_row();
        let count = band.rows.len();
        let groups = if shared { 1 } else { band.rows.deployments() };
        let mut columns = vec![vec![0.0; count]; 2 * groups + 3];
        let mut level_db = Vec::with_capacity(count);
        let mut wind_share = Vec::with_capacity(count);
        for row in 0..count {
            let (deployment, x) = (deployments[row], band.rows.x[row]);
            let curve = form.level(at, deployment, x);
            let term = wind_term(law, at.slope, at.bend, at.post_slope, x, form.width);
            let share = curve.wind_share;
            let group = if shared { 0 } else { deployment };
            columns[group][row] = if corner == Corner::Floor { 1.0 - share } else { 0.0 };
            columns[groups + group][row] = share;
            columns[2 * groups][row] = share * term.by_slope;
            columns[2 * groups + 1][row] = if law == Law::Line { 0.0 } else { share * term.by_bend };
            columns[2 * groups + 2][row] = if law == Law::FreeKnee { share * term.by_post_slope } else { 0.0 };
            level_db.push(curve.level_db);
            wind_share.push(share);
        }
        columns.retain(|column| column.iter().map(|value| value.abs()).sum::<f64>() > 1e-9);
        Self { level_db, wind_share, columns }
    }

    /// p value of the test that the columns of candidates are not needed. 1 with too few blocks or no usable column.
    pub(crate) fn p_value(
        &self,
        band: &Band,
        candidates: Vec<Vec<f64>>,
        cells: &Cells,
        departure: Departure,
        seed: u64,
        purpose: Purpose,
    ) -> f64 {
        if cells.count < LEAST_BLOCKS || candidates.is_empty() {
            return 1.0;
        }
        let weight = band.weights();
        let projected = self.project(candidates, &weight, band.record.len());
        let sums = block_sums(band, &self.level_db, &projected, cells, departure);
        largest_of_signs(&sums, cells.count, departure, seed, purpose)
    }

    /// Candidates with the part that the smaller law explains taken off, divided by their norm; those that vanish are left out.
    fn project(&self, candidates: Vec<Vec<f64>>, weight: &[f64], samples: usize) -> Vec<Vec<f64>> {
        let size = self.columns.len();
        let product = |a: &[f64], b: &[f64]| -> f64 { a.iter().zip(b).zip(weight).map(|((a, b), w)| a * b * w).sum() };
        let mut square = Symmetric::zeros(size);
        for row in 0..size {
            for column in 0..=row {
                square.add(row, column, product(&self.columns[row], &self.columns[column]));
            }
        }
        let ridge = 1e-9 * square.trace();
        for index in 0..size {
            square.add(index, index, ridge);
        }
        let Some(factor) = square.cholesky() else { return Vec::new() };
        let least_norm = 1e-6 * (samples as f64).sqrt();
        let mut kept = Vec::new();
        for mut candidate in candidates {
            let right: Vec<f64> = self.columns.iter().map(|column| product(column, &candidate)).collect();
            let solution = solve_factored(&factor, size, &right);
            for (column, share) in self.columns.iter().zip(solution) {
                for (value, by) in candidate.iter_mut().zip(column) {
                    *value -= share * by;
                }
            }
            let norm = product(&candidate, &candidate).sqrt();
            if norm > least_norm {
                for value in &mut candidate {
                    *value /= norm;
                }
                kept.push(candidate);
            }
        }
        kept
    }
}

/// Sums of weighted residuals times candidates by block: entry `block * candidates + candidate`.
fn block_sums(
    band: &Band,
    fitted_db: &[f64],
    candidates: &[Vec<f64>],
    cells: &Cells,
    departure: Departure,
) -> Vec<f64> {
    let count = candidates.len();
    let mut sums = vec![0.0; cells.count * count];
    // By sample would cost samples x candidates; block residuals by row first.
    let rows = band.rows.len();
    let mut residuals = vec![0.0; rows];
    let mut touched = Vec::new();
    let mut flush = |block: usize, residuals: &mut Vec<f64>, touched: &mut Vec<usize>| {
        for &row in touched.iter() {
            for (sum, candidate) in sums[block * count..].iter_mut().zip(candidates) {
                *sum += residuals[row] * candidate[row];
            }
            residuals[row] = 0.0;
        }
        touched.clear();
    };
    let mut block = 0;
    for (sample, &cell) in cells.of_sample.iter().enumerate() {
        if cell != block {
            flush(block, &mut residuals, &mut touched);
            block = cell;
        }
        let row = band.rows.of_sample[sample];
        if !touched.contains(&row) {
            touched.push(row);
        }
        residuals[row] += (band.level_db[sample] - fitted_db[row]) * band.rows.weight[row];
    }
    flush(block, &mut residuals, &mut touched);
    if departure == Departure::Studentised {
        for candidate in 0..count {
            let column = || (0..cells.count).map(|block| block * count + candidate);
            let norm = column().map(|index| sums[index] * sums[index]).sum::<f64>().sqrt().max(1e-12);
            for index in column() {
                sums[index] /= norm;
            }
        }
    }
    sums
}

/// Share of sign patterns whose largest sum is at least that of the data.
fn largest_of_signs(sums: &[f64], blocks: usize, departure: Departure, seed: u64, purpose: Purpose) -> f64 {
    let count = sums.len() / blocks.max(1);
    if count == 0 {
        return 1.0;
    }
    let size = |value: f64| if departure == Departure::Studentised { value.abs() } else { value };
    let largest = |total: &[f64]| total.iter().map(|&value| size(value)).fold(f64::NEG_INFINITY, f64::max);
    let mut total = vec![0.0; count];
    for block in sums.chunks_exact(count) {
        for (total, value) in total.iter_mut().zip(block) {
            *total += value;
        }
    }
    let observed = largest(&total);
    let mut generator = generator(seed, purpose as u64);
    let mut pattern = Vec::new();
    let mut reached = 0;
    for _ in 0..PATTERNS {
        signs(&mut generator, blocks, &mut pattern);
        total.fill(0.0);
        for (block, sign) in sums.chunks_exact(count).zip(&pattern) {
            for (total, value) in total.iter_mut().zip(block) {
                *total += sign * value;
            }
        }
        reached += usize::from(largest(&total) >= observed);
    }
    (1 + reached) as f64 / (PATTERNS + 1) as f64
}

/// p value of the one-sided block sign test that level does not rise with x.
pub(crate) fn p_no_rise(band: &Band, cells: &Cells, seed: u64) -> f64 {
    let count = band.record.len().max(1) as f64;
    let level_mean = band.level_db.iter().sum::<f64>() / count;
    let x_mean = band.record.x.iter().sum::<f64>() / count;
    let mut sums = vec![0.0; cells.count];
    for ((&cell, &level), &x) in cells.of_sample.iter().zip(&band.level_db).zip(&band.record.x) {
        sums[cell] += (level - level_mean) * (x - x_mean);
    }
    largest_of_signs(&sums, cells.count, Departure::OneSided, seed, Purpose::Slope)
}

/// p value of the test that deployments share floor and wind part. `at` are the pooled parameters, repeated.
pub(crate) fn p_deployments(band: &Band, at: &Parameters, cells: &Cells, seed: u64) -> f64 {
    let null = NullCurve::new(band, Law::Knee, Corner::Floor, at, true);
    let deployments = band.rows.deployment_of_row();
    let mut candidates = Vec::new();
    for deployment in 0..band.rows.deployments() {
        let only = |value: &dyn Fn(f64) -> f64| -> Vec<f64> {
            null.wind_share
                .iter()
                .zip(&deployments)
                .map(|(&share, &of_row)| if of_row == deployment { value(share) } else { 0.0 })
                .collect()
        };
        candidates.push(only(&|share| 1.0 - share));
        candidates.push(only(&|share| share));
    }
    null.p_value(band, candidates, cells, Departure::Studentised, seed, Purpose::Deployments)
}
