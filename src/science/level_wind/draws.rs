//! Draws of blocks in time for a site, sums over them, and intervals from replicates.

use super::fits::Band;
use crate::numerics::quantile::quantiles;
use crate::numerics::resample::{circular_block_weights, generator};
use crate::numerics::student_t::student_t_quantile;

/// A block is cut into this many cells.
const CELLS_PER_BLOCK: usize = 4;
/// Stream of random numbers for the draws of blocks.
const DRAW_STREAM: u64 = 1;

/// Draws of blocks for a site.
#[derive(Debug)]
pub(crate) struct Draws {
    /// Cell of every row of the input; rows that no band uses have none.
    pub(crate) cell_of_row: Vec<u32>,
    pub(crate) cells: usize,
    pub(crate) block_h: f64,
    pub(crate) replicates: usize,
    /// Weight of each cell in each replicate: entry `cell * replicates + replicate`.
    weights: Vec<f64>,
    widening_95: f64,
    widening_99: f64,
}

impl Draws {
    /// Draws blocks of a length in hours over the rows in `used`.
    pub(crate) fn new(times_ms: &[i64], used: &[bool], block_h: f64, replicates: usize, seed: u64) -> Self {
        let mut order: Vec<usize> = (0..times_ms.len()).filter(|&row| used[row]).collect();
        order.sort_by_key(|&row| times_ms[row]);
        let length = (block_h / CELLS_PER_BLOCK as f64).max(1e-9);
        let mut cell_of_row = vec![u32::MAX; times_ms.len()];
        let first_ms = order.first().map_or(0, |&row| times_ms[row]);
        let mut previous = 0.0;
        let mut cell = 0;
        for row in order {
            let hours = (i128::from(times_ms[row]) - i128::from(first_ms)) as f64 / 3.6e6;
            let index = (hours / length).floor();
            if index > previous {
                // An empty stretch longer than a block must not fill whole blocks.
                cell += (index - previous).min(CELLS_PER_BLOCK as f64 + 1.0) as u32;
                previous = index;
            }
            cell_of_row[row] = cell;
        }
        let cells = cell as usize + 1;
        let block_cells = CELLS_PER_BLOCK.min((cells / 4).max(1));
        let mut weights = vec![0.0; cells * replicates];
        let mut generator = generator(seed, DRAW_STREAM);
        let mut one = vec![0.0; cells];
        for replicate in 0..replicates {
            circular_block_weights(&mut generator, cells, block_cells, &mut one);
            for (cell, weight) in one.iter().enumerate() {
                weights[cell * replicates + replicate] = *weight;
            }
        }
        let blocks = cells as f64 / block_cells as f64;
        Self {
            cell_of_row,
            cells,
            block_h,
            replicates,
            weights,
            widening_95: widening(blocks, 0.95),
            widening_99: widening(blocks, 0.99),
        }
    }

    pub(crate) fn weights_of(&self, cell: usize) -> &[f64] {
        &self.weights[cell * self.replicates..(cell + 1) * self.replicates]
    }

    /// Weighted sums over cells of values per cell and lane: entry `replicate * lanes + lane`.
    pub(crate) fn cell_sums(&self, values: &[f64], lanes: usize) -> Vec<f64> {
        let mut sums = vec![0.0; self.replicates * lanes];
        let mut lane_sums = vec![0.0; self.replicates];
        for lane in 0..lanes {
            lane_sums.fill(0.0);
            for cell in 0..self.cells {
                add_scaled(&mut lane_sums, self.weights_of(cell), values[cell * lanes + lane]);
            }
            for (replicate, value) in lane_sums.iter().enumerate() {
                sums[replicate * lanes + lane] = *value;
            }
        }
        sums
    }

    /// Percentile interval of replicates at level 0.95 or 0.99, widened about the median for the number of blocks: t quantile over normal
    /// quantile, and the square root of blocks / (blocks - 1).
    pub(crate) fn interval(&self, replicates: &[f64], level: f64) -> (f64, f64) {
        self.interval_times(replicates, level, 1.0)
    }

    /// As [`Self::interval`], widened about the median by one more factor.
    pub(crate) fn interval_times(&self, replicates: &[f64], level: f64, factor: f64) -> (f64, f64) {
        let tail = 0.5 * (1.0 - level);
        let factor = factor * self.widening(level);
        let [middle, low, high] = quantiles(replicates, [0.5, tail, 1.0 - tail]);
        (middle + (low - middle) * factor, middle + (high - middle) * factor)
    }

    fn widening(&self, level: f64) -> f64 {
        if level > 0.97 { self.widening_99 } else { self.widening_95 }
    }
}

/// Factor by which a percentile interval of a level is widened about the median.
fn widening(blocks: f64, level: f64) -> f64 {
    /// 97.5 % quantile of the normal distribution. It divides the t quantile of every level, so that intervals wider
    /// than 95 % are widened more than needed; the rules for falling and flat levels were tuned with that.
    const NORMAL_975: f64 = 1.959_964;
    let degrees = (blocks - 1.0).max(2.0);
    let t = student_t_quantile(1.0 - 0.5 * (1.0 - level), degrees);
    t / NORMAL_975 * (blocks / (blocks - 1.0).max(1.0)).sqrt()
}

/// Adds `scale * values` to `sums`.
#[inline]
pub(crate) fn add_scaled(sums: &mut [f64], values: &[f64], scale: f64) {
    for (sum, value) in sums.iter_mut().zip(values) {
        *sum += scale * value;
    }
}

/// Sparse entries (row, cell), ordered by row, and for every sample its entry.
#[derive(Debug)]
pub(crate) struct Entries {
    row: Vec<usize>,
    cell: Vec<usize>,
    pub(crate) of_sample: Vec<u32>,
}

impl Entries {
    pub(crate) fn new(band: &Band, draws: &Draws) -> Self {
        let samples = band.record.len();
        let cell_of = |sample: usize| draws.cell_of_row[band.record.source_row[sample]] as usize;
        // Samples are in order of time, so each row meets its cells in increasing order.
        let mut last_cell = vec![usize::MAX; band.rows.len()];
        let mut in_row = vec![0_usize; band.rows.len() + 1];
        for sample in 0..samples {
            let row = band.rows.of_sample[sample];
            if last_cell[row] != cell_of(sample) {
                last_cell[row] = cell_of(sample);
                in_row[row + 1] += 1;
            }
        }
        for row in 0..band.rows.len() {
            in_row[row + 1] += in_row[row];
        }
        let count = in_row[band.rows.len()];
        let (mut row_of, mut cell_of_entry) = (vec![0; count], vec![0; count]);
        let mut next = in_row;
        last_cell.fill(usize::MAX);
        let mut of_sample = Vec::with_capacity(samples);
        for sample in 0..samples {
            let (row, cell) = (band.rows.of_sample[sample], cell_of(sample));
            if last_cell[row] != cell {
                last_cell[row] = cell;
                row_of[next[row]] = row;
                cell_of_entry[next[row]] = cell;
                next[row] += 1;
            }
            of_sample.push((next[row] - 1) as u32);
        }
        Self { row: row_of, cell: cell_of_entry, of_sample }
    }

    /// Weighted sums of values by replicate and row: entry `replicate * rows + row`.
    pub(crate) fn sums(&self, values: impl Iterator<Item = f64>, rows: usize, draws: &Draws) -> Vec<f64> {
        let mut per_entry = vec![0.0; self.row.len()];
        for (value, &entry) in values.zip(&self.of_sample) {
            per_entry[entry as usize] += value;
        }
        let mut sums = vec![0.0; draws.replicates * rows];
        let mut row_sums = vec![0.0; draws.replicates];
        let mut entry = 0;
        for row in 0..rows {
            row_sums.fill(0.0);
            while entry < self.row.len() && self.row[entry] == row {
                add_scaled(&mut row_sums, draws.weights_of(self.cell[entry]), per_entry[entry]);
                entry += 1;
            }
            for (replicate, sum) in row_sums.iter().enumerate() {
                sums[replicate * rows + row] = *sum;
            }
        }
        sums
    }
}
