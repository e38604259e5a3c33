//! One band while it is being fitted: its data, pseudo-values and corner table, and the fits of the laws to them.

use super::corner::CornerTable;
use super::law::{BIN_WIDTH, CURVATURE_BOUNDS, Corner, Law, Parameters, wind_term};
use super::options::Segments;
use super::record::{Record, Rows};
use super::solve::{Bend, Form, RowMeans, Solver, Stop};
use super::start;
use crate::numerics::ramp_table::RampTable;

/// A fit and its weighted sum of squares.
#[derive(Debug, Clone)]
pub(crate) struct Fit {
    pub(crate) at: Parameters,
    pub(crate) sum_squares: f64,
}

/// Which starts are tried beside the one given.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Starts {
    /// None.
    Given,
    /// A plain straight line.
    AndLine,
}

/// The data of a band as the fits see them.
#[derive(Debug, Clone)]
pub(crate) struct Band {
    pub(crate) record: Record,
    pub(crate) rows: Rows,
    pub(crate) segments: Segments,
    /// Pseudo-values: levels whose plain means estimate the robust location, dB.
    pub(crate) level_db: Vec<f64>,
    /// Their means by row.
    pub(crate) row_level_db: Vec<f64>,
    pub(crate) table: CornerTable,
    /// How far to both sides a hard corner is rounded in a class of winds; nothing where the corner is soft.
    pub(crate) hard_corner_rounding_db: Option<f64>,
    pub(crate) least_floor_db: f64,
    /// Onsets that are tried, in x, increasing.
    pub(crate) onsets: Vec<f64>,
}

impl Band {
    /// Replaces the pseudo-values.
    pub(crate) fn set_levels(&mut self, level_db: Vec<f64>) {
        self.row_level_db = self.rows.means(&level_db);
        self.level_db = level_db;
    }

    /// Regroups the rows.
    pub(crate) fn set_segments(&mut self, segments: Segments) {
        self.segments = segments;
        self.rows = Rows::new(&self.record, segments != Segments::Pooled);
        self.row_level_db = self.rows.means(&self.level_db);
    }

    /// How the curve is made, in classes of wind.
    pub(crate) fn form(&self, law: Law, corner: Corner) -> Form<'_> {
        Form {
            law,
            corner,
            table: &self.table.h,
            width: BIN_WIDTH,
            segments: self.segments,
            least_floor_db: self.least_floor_db,
        }
    }

    /// Range of the bend of a law.
    pub(crate) fn bend(&self, law: Law) -> Bend {
        match law {
            Law::Line => Bend::Fixed,
            Law::Quadratic => Bend::Within(CURVATURE_BOUNDS.0, CURVATURE_BOUNDS.1),
            Law::Knee | Law::FreeKnee => range_of(&self.onsets),
            Law::Threshold => Bend::Within(0.0, self.greatest_threshold_m_s()),
        }
    }

    /// Largest threshold wind that is tried, m/s: 6, or the median wind where it is lower.
    pub(crate) fn greatest_threshold_m_s(&self) -> f64 {
        let median = crate::numerics::quantile::median(&self.record.wind_m_s);
        median.clamp(0.5, 6.0)
    }

    /// Bends from which a law is tried.
    pub(crate) fn bends(&self, law: Law) -> Vec<f64> {
        match law {
            Law::Line => Vec::new(),
            Law::Quadratic => vec![0.0],
            Law::Knee | Law::FreeKnee => self.onsets.clone(),
            Law::Threshold => grid(0.0, self.greatest_threshold_m_s(), 16),
        }
    }

    /// Weight of each row.
    pub(crate) fn weights(&self) -> Vec<f64> {
        self.rows.total_weight()
    }

    /// Residual sum of squares of every fixed onset (or threshold), from high to low, and the joint optimum.
    pub(crate) fn fit(&self, law: Law, corner: Corner, start: &Parameters, starts: Starts) -> Fit {
        self.fit_profile(law, corner, start, starts).0
    }

    /// As [`Self::fit`], with the profile over [`Self::bends`].
    pub(crate) fn fit_profile(&self, law: Law, corner: Corner, start: &Parameters, starts: Starts) -> (Fit, Vec<f64>) {
        let weight = self.weights();
        let rows =
            RowMeans { starts: &self.rows.starts, weight: &weight, x: &self.rows.x, level_db: &self.row_level_db };
        let form = self.form(law, corner);
        let bends = self.bends(law);
        let mut profile = vec![f64::INFINITY; bends.len()];
        let mut solver = Solver::default();
        let mut best = None;
        let mut candidates = vec![start.clone()];
        if starts == Starts::AndLine {
            candidates.push(start::line(&self.record, &self.level_db, start));
        }
        for candidate in candidates {
            let fit = match law {
                Law::Line | Law::Quadratic => {
                    let mut at = candidate;
                    if law == Law::Quadratic {
                        at.bend = 0.0;
                    }
                    let sum_squares = solver.minimise(&rows, &form, self.bend(law), FINE, &mut at);
                    Fit { at, sum_squares }
                }
                Law::Knee | Law::FreeKnee | Law::Threshold => {
                    self.profile(&mut solver, &rows, &form, &bends, candidate, &mut profile)
                }
            };
            if best.as_ref().is_none_or(|best: &Fit| fit.sum_squares < best.sum_squares) {
                best = Some(fit);
            }
        }
        let best = best.unwrap_or_else(|| Fit { at: start.clone(), sum_squares: f64::INFINITY });
        (best, profile)
    }

    fn profile(
        &self,
        solver: &mut Solver,
        rows: &RowMeans<'_>,
        form: &Form<'_>,
        bends: &[f64],
        mut at: Parameters,
        profile: &mut [f64],
    ) -> Fit {
        const COARSE: Stop = Stop { iterations: 25, tolerance: 1e-7 };
        let mut best = Fit { at: at.clone(), sum_squares: f64::INFINITY };
        for (bend, least) in bends.iter().zip(profile).rev() {
            at.bend = *bend;
            let sum_squares = solver.minimise(rows, form, Bend::Fixed, COARSE, &mut at);
            *least = least.min(sum_squares);
            if sum_squares < best.sum_squares {
                best.sum_squares = sum_squares;
                best.at.copy_from(&at);
            }
        }
        let mut joint = best.at.clone();
        let sum_squares = solver.minimise(rows, form, self.bend(form.law), FINE, &mut joint);
        if sum_squares < best.sum_squares { Fit { at: joint, sum_squares } } else { best }
    }

    /// Improves a fit from where it is.
    pub(crate) fn polish(&self, law: Law, corner: Corner, at: &mut Parameters) -> f64 {
        const STOP: Stop = Stop { iterations: 25, tolerance: 1e-9 };
        let weight = self.weights();
        let rows =
            RowMeans { starts: &self.rows.starts, weight: &weight, x: &self.rows.x, level_db: &self.row_level_db };
        Solver::default().minimise(&rows, &self.form(law, corner), self.bend(law), STOP, at)
    }

    /// Improves a fit on all samples instead of classes of wind. Classes of finite width move an estimate by a fraction of its
    /// standard error; this takes that off.
    pub(crate) fn polish_samples(&self, law: Law, corner: Corner, at: &Parameters) -> Parameters {
        const STOP: Stop = Stop { iterations: 20, tolerance: 1e-9 };
        let mut starts = vec![0; self.rows.deployments() + 1];
        let mut order: Vec<usize> = (0..self.record.len()).collect();
        if self.rows.deployments() > 1 {
            order.sort_by_key(|&sample| self.rows.deployment_of_sample[sample]);
        }
        for &deployment in &self.rows.deployment_of_sample {
            starts[deployment + 1] += 1;
        }
        for index in 1..starts.len() {
            starts[index] += starts[index - 1];
        }
        let in_order = |values: &[f64]| order.iter().map(|&sample| values[sample]).collect::<Vec<f64>>();
        let weight: Vec<f64> = order.iter().map(|&sample| self.rows.weight[self.rows.of_sample[sample]]).collect();
        let samples = RowMeans {
            starts: &starts,
            weight: &weight,
            x: &in_order(&self.record.x),
            level_db: &in_order(&self.level_db),
        };
        let mut polished = at.clone();
        // A knee that is sharp between samples has many shallow minima; rounding it over a few samples leaves one.
        let form = Form { width: 0.25 * BIN_WIDTH, ..self.form(law, corner) };
        let mut improve =
            |form: &Form<'_>| Solver::default().minimise(&samples, form, self.bend(law), STOP, &mut polished);
        match self.sharp_table(0.25).zip(self.sharp_table(SHARP)) {
            // A hard corner as well.
            Some((rounded, sharp)) => {
                improve(&Form { table: &rounded, ..form });
                improve(&Form { table: &sharp, width: SHARP * BIN_WIDTH, ..form });
            }
            None => {
                improve(&form);
            }
        }
        polished
    }

    /// The table of a hard corner that is rounded over this share of a class; nothing where the corner is soft.
    pub(crate) fn sharp_table(&self, share: f64) -> Option<RampTable> {
        let rounding_db = self.hard_corner_rounding_db?;
        Some(CornerTable::hard(1.0, share * rounding_db).h)
    }

    /// Fitted level at every sample, dB.
    pub(crate) fn fitted(&self, law: Law, corner: Corner, at: &Parameters) -> Vec<f64> {
        let form = self.form(law, corner).at_points();
        self.record
            .x
            .iter()
            .zip(&self.rows.deployment_of_sample)
            .map(|(&x, &deployment)| form.level(at, deployment, x).level_db)
            .collect()
    }

    /// d = W - F of every row at its mean x.
    pub(crate) fn row_excess(&self, law: Law, at: &Parameters) -> Vec<f64> {
        self.rows
            .deployment_of_row()
            .iter()
            .zip(&self.rows.x)
            .map(|(&deployment, &x)| {
                let term = wind_term(law, at.slope, at.bend, at.post_slope, x, super::law::POINT_WIDTH);
                at.wind_db[deployment] + term.value - at.floor_db[deployment]
            })
            .collect()
    }

    /// Root mean square over samples of what a fit leaves of the row means, dB.
    pub(crate) fn row_misfit_db(&self, law: Law, corner: Corner, at: &Parameters) -> f64 {
        let form = self.form(law, corner);
        let deployments = self.rows.deployment_of_row();
        let sum: f64 = (0..self.rows.len())
            .map(|row| {
                let off = self.row_level_db[row] - form.level(at, deployments[row], self.rows.x[row]).level_db;
                self.rows.count[row] * off * off
            })
            .sum();
        (sum / self.record.len().max(1) as f64).sqrt()
    }
}

/// Share of a class over which a corner or a knee is rounded where single samples are meant.
pub(crate) const SHARP: f64 = 0.02;

/// When the last iteration of a fit ends.
const FINE: Stop = Stop { iterations: 60, tolerance: 1e-10 };

fn range_of(grid: &[f64]) -> Bend {
    match (grid.first(), grid.last()) {
        (Some(&low), Some(&high)) => Bend::Within(low, high),
        _ => Bend::Fixed,
    }
}

/// Equally spaced values from `low` to `high`, ends included; at least 0.03 wide.
pub(crate) fn grid(low: f64, high: f64, count: usize) -> Vec<f64> {
    const LEAST_WIDTH: f64 = 0.03;
    let width = (high - low).max(LEAST_WIDTH);
    (0..count).map(|index| low + width * index as f64 / (count - 1).max(1) as f64).collect()
}
