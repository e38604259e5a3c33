//! Which law predicts best: errors in held-out blocks of time.

use super::fits::SHARP;
use super::fits::{Band, Fit};
use super::law::{CURVATURE_BOUNDS, Corner, Law, Parameters};
use super::record::Cells;
use super::robust::huber;
use super::solve::{Bend, Form, RowMeans, Solver, Stop};
use crate::numerics::quantile::quantile;

/// Every fifth block is held out in turn.
const FOLDS: usize = 5;

/// Sums by fold and row.
pub(crate) struct Folds {
    count: Vec<Vec<f64>>,
    x: Vec<Vec<f64>>,
    level: Vec<Vec<f64>>,
    cells: Cells,
}

impl Folds {
    /// Blocks of a length in hours are dealt to the folds in turn.
    pub(crate) fn new(band: &Band, block_h: f64) -> Self {
        let zeros = || vec![vec![0.0; band.rows.len()]; FOLDS];
        let cells = band.record.cells(block_h, 0);
        let mut folds = Self { count: zeros(), x: zeros(), level: zeros(), cells };
        for sample in 0..band.record.len() {
            let (fold, row) = (folds.cells.of_sample[sample] % FOLDS, band.rows.of_sample[sample]);
            folds.count[fold][row] += 1.0;
            folds.x[fold][row] += band.record.x[sample];
            folds.level[fold][row] += band.level_db[sample];
        }
        folds
    }

    /// Number of blocks.
    pub(crate) fn blocks(&self) -> usize {
        self.cells.count
    }

    /// Predictions of a law in held-out folds. Fits start from the fit of all data and, where the law has a bend, from
    /// other bends: without them a knee fitted to most of the data is often missed.
    pub(crate) fn predictions(&self, band: &Band, law: Law, corner: Corner, full: &Fit) -> Predictions {
        const STOP: Stop = Stop { iterations: 40, tolerance: 1e-7 };
        let bends = band.bends(law);
        let others: Vec<f64> = match law {
            Law::Line | Law::Quadratic => Vec::new(),
            Law::Knee | Law::FreeKnee | Law::Threshold => {
                [0.3, 0.6, 0.9].iter().map(|&share| quantile(&bends, share)).collect()
            }
        };
        let bend = match law {
            Law::Quadratic => Bend::Within(CURVATURE_BOUNDS.0, CURVATURE_BOUNDS.1),
            _ => band.bend(law),
        };
        let form = band.form(law, corner);
        let deployments = band.rows.deployment_of_row();
        let mut solver = Solver::default();
        let mut predictions = Predictions { error: 0.0, level_db: Vec::new(), at: Vec::new() };
        for fold in 0..FOLDS {
            let training = self.training(band, fold);
            let rows = RowMeans {
                starts: &band.rows.starts,
                weight: &training.weight,
                x: &training.x,
                level_db: &training.level_db,
            };
            let mut best = (f64::INFINITY, full.at.clone());
            for start in std::iter::once(full.at.bend).chain(others.iter().copied()) {
                let mut at = full.at.with_bend(start);
                let sum_squares = solver.minimise(&rows, &form, bend, STOP, &mut at);
                if sum_squares < best.0 {
                    best = (sum_squares, at);
                }
            }
            let level_db: Vec<f64> = deployments
                .iter()
                .zip(&band.rows.x)
                .map(|(&deployment, &x)| form.level(&best.1, deployment, x).level_db)
                .collect();
            predictions.error += self.held_out_error(band, fold, &level_db);
            predictions.level_db.push(level_db);
            predictions.at.push(best.1);
        }
        predictions
    }

    /// Gain of one law over another in units of its standard error: the difference of their errors of prediction, from
    /// paired differences of the held-out blocks.
    pub(crate) fn gain(&self, band: &Band, from: &Predictions, to: &Predictions) -> f64 {
        let mut per_block = vec![0.0; self.cells.count];
        for (sample, &block) in self.cells.of_sample.iter().enumerate() {
            let (fold, row) = (block % FOLDS, band.rows.of_sample[sample]);
            let (worse, better) = (from.level_db[fold][row], to.level_db[fold][row]);
            // (z - f1)^2 - (z - f2)^2, which is linear in z and so adds up over samples.
            let difference = (worse - better) * (worse + better - 2.0 * band.level_db[sample]);
            per_block[block] += band.rows.weight[row] * difference;
        }
        in_standard_errors(&per_block)
    }

    /// As [`Self::gain`], for fits with different corners: each has its own pseudo-values, so the levels themselves are
    /// compared, with Huber's loss of the residuals in units of a scale.
    pub(crate) fn gain_of_corner(
        &self,
        (from_band, from_law, from): (&Band, Law, &Predictions),
        (to_band, to_law, to): (&Band, Law, &Predictions),
        scale_db: f64,
    ) -> f64 {
        let mut per_block = vec![0.0; self.cells.count];
        let losses = |band: &Band, law: Law, predictions: &Predictions| -> Vec<f64> {
            let sharp = band.sharp_table(SHARP);
            let form = Form { table: sharp.as_ref().unwrap_or(&band.table.h), ..band.form(law, Corner::Floor) };
            let form = form.at_points();
            let record = &band.record;
            (0..record.len())
                .map(|sample| {
                    let at = &predictions.at[self.cells.of_sample[sample] % FOLDS];
                    let fitted = form.level(at, band.rows.deployment_of_sample[sample], record.x[sample]).level_db;
                    huber((record.level_db[sample] - fitted) / scale_db)
                })
                .collect()
        };
        let (from, to) = (losses(from_band, from_law, from), losses(to_band, to_law, to));
        for (sample, &block) in self.cells.of_sample.iter().enumerate() {
            per_block[block] += from[sample] - to[sample];
        }
        in_standard_errors(&per_block)
    }

    fn training(&self, band: &Band, held_out: usize) -> Training {
        let rows = band.rows.len();
        let mut training = Training { weight: vec![0.0; rows], x: band.rows.x.clone(), level_db: vec![0.0; rows] };
        for row in 0..rows {
            let sum =
                |of: &[Vec<f64>]| (0..FOLDS).filter(|&fold| fold != held_out).map(|fold| of[fold][row]).sum::<f64>();
            let count = sum(&self.count);
            if count > 0.0 {
                training.weight[row] = count * band.rows.weight[row];
                training.x[row] = sum(&self.x) / count;
                training.level_db[row] = sum(&self.level) / count;
            }
        }
        training
    }

    fn held_out_error(&self, band: &Band, fold: usize, predicted_db: &[f64]) -> f64 {
        let mut error = 0.0;
        for (row, predicted) in predicted_db.iter().enumerate() {
            let count = self.count[fold][row];
            if count > 0.0 {
                let off = self.level[fold][row] / count - predicted;
                error += count * band.rows.weight[row] * off * off;
            }
        }
        error
    }
}

/// Mean of independent gains over its standard error.
fn in_standard_errors(gains: &[f64]) -> f64 {
    let count = gains.len() as f64;
    let mean = gains.iter().sum::<f64>() / count;
    let variance = gains.iter().map(|gain| (gain - mean) * (gain - mean)).sum::<f64>() / (count - 1.0).max(1.0);
    mean * count.sqrt() / variance.sqrt().max(1e-12)
}

/// Predictions of held-out folds.
pub(crate) struct Predictions {
    /// Weighted sum of squared errors of row means.
    pub(crate) error: f64,
    /// Level by fold and row, dB.
    level_db: Vec<Vec<f64>>,
    /// Parameters by fold.
    at: Vec<Parameters>,
}

struct Training {
    weight: Vec<f64>,
    x: Vec<f64>,
    level_db: Vec<f64>,
}
