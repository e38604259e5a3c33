//! Where the iteration starts: a hard hinge by exhaustive search, which cannot fail, and a plain straight line.

use super::law::{BIN_LOW, BIN_WIDTH, BINS, GREATEST_SLOPE, Parameters};
use super::record::Record;
use crate::numerics::least_squares::straight_line;
use crate::numerics::quantile::{quantile, quantile_sorted};

/// Median level of the samples in each sample's class of wind, dB.
pub(crate) fn class_medians(record: &Record) -> Vec<f64> {
    let mut levels: Vec<Vec<f64>> = vec![Vec::new(); BINS];
    for (&bin, &level) in record.bin.iter().zip(&record.level_db) {
        levels[bin].push(level);
    }
    let medians: Vec<f64> = levels
        .iter_mut()
        .map(|levels| {
            levels.sort_unstable_by(f64::total_cmp);
            quantile_sorted(levels, 0.5)
        })
        .collect();
    record.bin.iter().map(|&bin| medians[bin]).collect()
}

/// Least squares of constant, slope, constant with both corners on edges of wind classes: every pair of edges in constant
/// time from running sums. Falls back to the mean where no pair gives a rise.
pub(crate) fn hinge(record: &Record, level_db: &[f64]) -> Parameters {
    let sums = RunningSums::new(record, level_db);
    let first = record.bin.iter().copied().min().unwrap_or(0);
    let last = record.bin.iter().copied().max().unwrap_or(0);
    let edge = |index: usize| BIN_LOW + BIN_WIDTH * index as f64;
    let (total, total_level) = (sums.at(BINS)[COUNT], sums.at(BINS)[LEVEL]);
    // Decrease of the sum of squares, slope, constant, corners.
    let mut best: Option<(f64, f64, f64, f64, f64)> = None;
    for low in first..last.saturating_sub(1) {
        for high in low + 2..=last {
            let (x1, x2) = (edge(low), edge(high));
            let rise = x2 - x1;
            let inside = sums.between(low, high);
            let above = total - sums.at(high)[COUNT];
            let above_level = total_level - sums.at(high)[LEVEL];
            let c = inside[X] - x1 * inside[COUNT] + rise * above;
            let cc = inside[XX] - 2.0 * x1 * inside[X] + x1 * x1 * inside[COUNT] + rise * rise * above;
            let cz = inside[XLEVEL] - x1 * inside[LEVEL] + rise * above_level;
            let square = cc - c * c / total;
            if square <= 1e-12 {
                continue;
            }
            let product = cz - c * total_level / total;
            let slope = product / square;
            let gain = slope * product;
            if slope > 0.0 && best.is_none_or(|(best_gain, ..)| gain > best_gain) {
                best = Some((gain, slope, (total_level - slope * c) / total, x1, x2));
            }
        }
    }
    if let Some((_, slope, floor, x1, x2)) = best {
        let slope = slope.min(0.8 * GREATEST_SLOPE);
        return shape(floor, floor - slope * x1, slope, x2);
    }
    let mean = total_level / total.max(1.0);
    shape(mean, mean - 3.0, 0.1, quantile(&record.x, 0.9))
}

/// A straight line through all samples, with a floor a little below the lowest levels; the bend is kept from `like`.
pub(crate) fn line(record: &Record, level_db: &[f64], like: &Parameters) -> Parameters {
    let line = straight_line(&record.x, level_db);
    let mean = level_db.iter().sum::<f64>() / level_db.len().max(1) as f64;
    let (intercept, slope) = line.map_or((mean, 0.1), |line| (line.intercept, line.slope));
    let count = like.floor_db.len();
    Parameters {
        floor_db: vec![quantile(level_db, 0.02) - 1.0; count],
        wind_db: vec![intercept; count],
        slope: slope.clamp(0.5, GREATEST_SLOPE),
        ..like.clone()
    }
}

fn shape(floor: f64, wind: f64, slope: f64, bend: f64) -> Parameters {
    Parameters { floor_db: vec![floor], wind_db: vec![wind], slope, bend, post_slope: 0.0 }
}

const COUNT: usize = 0;
const X: usize = 1;
const XX: usize = 2;
const LEVEL: usize = 3;
const XLEVEL: usize = 4;

/// Sums over the classes below an edge.
struct RunningSums(Vec<[f64; 5]>);

impl RunningSums {
    fn new(record: &Record, level_db: &[f64]) -> Self {
        let mut per_bin = [[0.0; 5]; BINS];
        for ((&bin, &x), &level) in record.bin.iter().zip(&record.x).zip(level_db) {
            for (sum, value) in per_bin[bin].iter_mut().zip([1.0, x, x * x, level, x * level]) {
                *sum += value;
            }
        }
        let mut running = vec![[0.0; 5]];
        let mut sum = [0.0; 5];
        for bin in per_bin {
            for (sum, value) in sum.iter_mut().zip(bin) {
                *sum += value;
            }
            running.push(sum);
        }
        Self(running)
    }

    fn at(&self, edge: usize) -> &[f64; 5] {
        &self.0[edge]
    }

    fn between(&self, low: usize, high: usize) -> [f64; 5] {
        std::array::from_fn(|index| self.0[high][index] - self.0[low][index])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_hinge_with_corners_on_edges_is_found() {
        let (x1, x2) = (BIN_LOW + 40.0 * BIN_WIDTH, BIN_LOW + 80.0 * BIN_WIDTH);
        let wind: Vec<f64> =
            (0..2000).map(|index| super::super::law::wind_of(BIN_LOW + 0.0009 * f64::from(index))).collect();
        let times: Vec<i64> = (0..2000).collect();
        let level: Vec<f64> =
            wind.iter().map(|&wind| 55.0 + 20.0 * (super::super::law::x_of(wind).clamp(x1, x2) - x1)).collect();
        let record = Record::new(&times, &wind, &level, None);
        let found = hinge(&record, &record.level_db);
        assert!((found.floor_db[0] - 55.0).abs() < 1e-6 && (found.slope - 20.0).abs() < 1e-6);
        assert!((found.bend - x2).abs() < 1e-9);
    }
}
