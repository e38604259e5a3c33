//! Circular moving-block bootstrap in time (Künsch 1989; Politis and Romano 1992), with one set of draws for all bands of a
//! site.
//!
//! A replicate is a weight per cell of time. Rows are summed over cells with these weights, and the law is fitted to the
//! weighted row means from several starts. The scatter model is carried along without refitting: its score sums per cell give
//! a linear change of its parameters, and that a change of the corner table.

use super::corner::{CornerTable, Scatter};
use super::draws::{Draws, Entries, add_scaled};
use super::fits::Band;
use super::law::{Corner, Law, Parameters, wind_of};
use super::normal::{COLUMNS, Linearised};
use super::options::Loss;
use super::point::ScatterFit;
use super::scatter::{GREATEST, LEAST, STEP, free_parameters};
use super::solve::{Bend, Form, RowMeans, Solver, Stop};
use crate::numerics::quantile::quantile;
use crate::numerics::symmetric::Symmetric;
use rayon::prelude::*;
use std::sync::Arc;

/// What replicates of all bands with the same samples and rows share.
#[derive(Debug)]
pub(crate) struct SharedRows {
    entries: Entries,
    /// Samples per replicate and row.
    count: Vec<f64>,
    /// Mean x per replicate and row.
    x: Vec<f64>,
}

impl SharedRows {
    /// For the samples and rows of a band.
    pub(crate) fn new(band: &Band, draws: &Draws) -> Self {
        let entries = Entries::new(band, draws);
        let rows = band.rows.len();
        let count = entries.sums(std::iter::repeat_n(1.0, band.record.len()), rows, draws);
        let mut x = entries.sums(band.record.x.iter().copied(), rows, draws);
        divide(&mut x, &count);
        Self { entries, count, x }
    }
}

fn divide(sums: &mut [f64], counts: &[f64]) {
    for (sum, count) in sums.iter_mut().zip(counts) {
        if *count > 0.0 {
            *sum /= count;
        }
    }
}

/// The replicates of a band before any law is fitted.
#[derive(Debug)]
pub(crate) struct Replicas<'a> {
    pub(crate) draws: &'a Draws,
    shared: Arc<SharedRows>,
    /// Mean pseudo-value per replicate and row, dB.
    level_db: Vec<f64>,
    /// Changes of the scatter parameters per replicate, and the change of h for each.
    changes: Vec<Vec<f64>>,
    table_changes: Vec<Vec<f64>>,
}

/// Parameters of one replicate and its curve at the winds asked for.
#[derive(Debug, Clone)]
pub(crate) struct Replicate {
    pub(crate) at: Parameters,
    pub(crate) curve_db: Vec<f64>,
}

impl<'a> Replicas<'a> {
    pub(crate) fn new(
        band: &Band,
        scatter: Option<&ScatterFit>,
        shared: Arc<SharedRows>,
        draws: &'a Draws,
        loss: Loss,
    ) -> Self {
        let mut level_db = shared.entries.sums(band.level_db.iter().copied(), band.rows.len(), draws);
        divide(&mut level_db, &shared.count);
        let mut replicas = Self { draws, shared, level_db, changes: Vec::new(), table_changes: Vec::new() };
        if let Some(scatter) = scatter {
            replicas.carry_scatter(band, scatter, loss);
        }
        replicas
    }

    /// Linear changes of the scatter parameters per replicate: inverse information times the weighted sum of scores.
    fn carry_scatter(&mut self, band: &Band, fit: &ScatterFit, loss: Loss) {
        let maximum = &fit.maximum;
        let family_free = free_parameters(fit.family);
        // Parameters at a bound stay there.
        let free: Vec<usize> = (0..family_free.len())
            .filter(|&index| {
                let parameter = family_free[index];
                let value = maximum.parameters[parameter];
                parameter > 5 || (value > LEAST[parameter] + 1e-4 && value < GREATEST[parameter] - 1e-4)
            })
            .collect();
        let lanes = free.len();
        let mut cell_scores = vec![0.0; self.draws.cells * lanes];
        for (sample, &(group, cell)) in fit.counts.of_sample.iter().enumerate() {
            let time_cell = self.draws.cell_of_row[band.record.source_row[sample]] as usize;
            for (lane, &index) in free.iter().enumerate() {
                cell_scores[time_cell * lanes + lane] += maximum.evaluation.scores[index][group][cell];
            }
        }
        for lane in 0..lanes {
            let mean = (0..self.draws.cells).map(|cell| cell_scores[cell * lanes + lane]).sum::<f64>()
                / self.draws.cells as f64;
            (0..self.draws.cells).for_each(|cell| cell_scores[cell * lanes + lane] -= mean);
        }
        let full = fit.counts.information(&maximum.evaluation);
        let norm: Vec<f64> = free.iter().map(|&index| full.get(index, index).max(1e-9).sqrt()).collect();
        let mut information = Symmetric::zeros(lanes);
        for row in 0..lanes {
            for column in 0..=row {
                information.add(row, column, full.get(free[row], free[column]) / (norm[row] * norm[column]));
            }
            information.add(row, row, 1e-6);
        }
        let inverse = information.pseudo_inverse(1e-5);
        let sums = self.draws.cell_sums(&cell_scores, lanes);
        for (lane, &index) in free.iter().enumerate() {
            let parameter = family_free[index];
            if parameter > 5 {
                continue;
            }
            let value = maximum.parameters[parameter];
            let changes: Vec<f64> = sums
                .chunks_exact(lanes)
                .map(|sums| {
                    let change: f64 =
                        (0..lanes).map(|other| sums[other] / norm[other] * inverse.get(other, lane)).sum();
                    (value + change / norm[lane]).clamp(LEAST[parameter], GREATEST[parameter]) - value
                })
                .collect();
            self.table_changes.push(table_change(&band.table, parameter, &changes, loss));
            self.changes.push(changes);
        }
    }

    /// Mean pseudo-value of every replicate, dB.
    pub(crate) fn mean_levels(&self) -> Vec<f64> {
        let rows = self.level_db.len() / self.draws.replicates.max(1);
        self.level_db
            .chunks_exact(rows.max(1))
            .zip(self.shared.count.chunks_exact(rows.max(1)))
            .map(|(levels, counts)| {
                let total: f64 = counts.iter().sum();
                levels.iter().zip(counts).map(|(level, count)| level * count).sum::<f64>() / total.max(1.0)
            })
            .collect()
    }

    /// Fits a law to every replicate from the fit of all data and, for a knee, from other onsets; `curve_x` are the points
    /// (in the first deployment) at which the curves are evaluated.
    pub(crate) fn fit(
        &self,
        band: &Band,
        law: Law,
        corner: Corner,
        start: &Parameters,
        curve_x: &[f64],
    ) -> Vec<Replicate> {
        let job =
            Job { law, corner, bend: band.bend(law), start, starts: onset_starts(band, law, corner, start), curve_x };
        (0..self.draws.replicates)
            .into_par_iter()
            .with_min_len(64)
            .map_init(|| Worker::new(band), |worker, replicate| self.fit_one(worker, band, &job, replicate))
            .collect()
    }

    fn fit_one(&self, worker: &mut Worker, band: &Band, job: &Job<'_>, replicate: usize) -> Replicate {
        const STOP: Stop = Stop { iterations: 30, tolerance: 1e-5 };
        let rows = band.rows.len();
        let range = replicate * rows..(replicate + 1) * rows;
        for ((weight, count), row_weight) in
            worker.weight.iter_mut().zip(&self.shared.count[range.clone()]).zip(&band.rows.weight)
        {
            *weight = count * row_weight;
        }
        if job.corner == Corner::Floor && !self.changes.is_empty() {
            let plain = band.table.h.values();
            worker.table.update(|values| {
                values.copy_from_slice(plain);
                for (change, table) in self.changes.iter().zip(&self.table_changes) {
                    add_scaled(values, table, change[replicate]);
                }
            });
        }
        let means = RowMeans {
            starts: &band.rows.starts,
            weight: &worker.weight,
            x: &self.shared.x[range.clone()],
            level_db: &self.level_db[range],
        };
        let form = Form { table: &worker.table, ..band.form(job.law, job.corner) };
        worker.candidates.clear();
        for start in &job.starts {
            // The curve at the replicate's own mean x: first order in the difference.
            for (row, residual) in worker.residual_db.iter_mut().enumerate() {
                let moved = start.slope_at_row[row] * (means.x[row] - band.rows.x[row]);
                *residual = means.level_db[row] - start.fitted_db[row] - moved;
            }
            let mut stepped = start.at.clone();
            let predicted =
                worker.solver.linear_step(&means, &form, &worker.residual_db, &start.columns, &start.at, &mut stepped);
            worker.candidates.push((predicted, stepped));
        }
        let mut best = job.start.clone();
        let mut least = f64::INFINITY;
        for index in promising(&worker.candidates) {
            worker.trial.copy_from(index.map_or(job.start, |index| &worker.candidates[index].1));
            let sum_squares = worker.solver.minimise(&means, &form, job.bend, STOP, &mut worker.trial);
            if sum_squares < least {
                least = sum_squares;
                best.copy_from(&worker.trial);
            }
        }
        let points = form.at_points();
        let curve_db = job.curve_x.iter().map(|&x| points.level(&best, 0, x).level_db).collect();
        Replicate { at: best, curve_db }
    }
}

/// What all replicates of a fit share.
struct Job<'a> {
    law: Law,
    corner: Corner,
    bend: Bend,
    /// The fit of all data.
    start: &'a Parameters,
    starts: Vec<OnsetStart>,
    curve_x: &'a [f64],
}

/// The fit of all data at a fixed onset, and its linear approximation at the rows.
struct OnsetStart {
    at: Parameters,
    fitted_db: Vec<f64>,
    columns: [Vec<f64>; COLUMNS],
    /// Derivative of the curve by x at each row.
    slope_at_row: Vec<f64>,
}

/// Starts of replicates of a knee: fits of all data at onsets over the whole range.
fn onset_starts(band: &Band, law: Law, corner: Corner, start: &Parameters) -> Vec<OnsetStart> {
    const ONSETS: usize = 9;
    if !matches!(law, Law::Knee | Law::FreeKnee) {
        return Vec::new();
    }
    let weight = band.weights();
    let rows = RowMeans { starts: &band.rows.starts, weight: &weight, x: &band.rows.x, level_db: &band.row_level_db };
    let form = band.form(law, corner);
    let mut solver = Solver::default();
    let mut at = start.clone();
    (0..ONSETS)
        .rev()
        .map(|index| {
            const STOP: Stop = Stop { iterations: 25, tolerance: 1e-7 };
            at.bend = quantile(&band.onsets, index as f64 / (ONSETS - 1) as f64);
            solver.minimise(&rows, &form, Bend::Fixed, STOP, &mut at);
            let mut curve = Linearised::default();
            curve.fill(&rows, &form, &at);
            let fitted_db = band.row_level_db.iter().zip(&curve.residual_db).map(|(level, off)| level - off).collect();
            let post = if law == Law::FreeKnee { at.post_slope } else { 0.0 };
            let slope_at_row = band
                .rows
                .x
                .iter()
                .zip(&curve.columns[1])
                .map(|(&x, share)| share * if x < at.bend { at.slope } else { post })
                .collect();
            OnsetStart { at: at.clone(), fitted_db, columns: curve.columns, slope_at_row }
        })
        .collect()
}

/// Which starts are worth an iteration: the best of the linear predictions, and a second one away from it that comes close.
/// `None` stands for the fit of all data, where there are no predictions.
fn promising(candidates: &[(f64, Parameters)]) -> Vec<Option<usize>> {
    /// Share of the range of the predictions within which a second minimum counts as close.
    const CLOSE: f64 = 0.05;
    let by_size = |&a: &usize, &b: &usize| candidates[a].0.total_cmp(&candidates[b].0);
    let Some(best) = (0..candidates.len()).min_by(by_size) else { return vec![None] };
    let least = candidates[best].0;
    let most = candidates.iter().map(|(predicted, _)| *predicted).fold(least, f64::max);
    let is_minimum = |index: usize| {
        let here = candidates[index].0;
        (index == 0 || candidates[index - 1].0 >= here) && candidates.get(index + 1).is_none_or(|next| next.0 >= here)
    };
    let second = (0..candidates.len())
        .filter(|&index| index.abs_diff(best) > 1 && is_minimum(index))
        .filter(|&index| candidates[index].0 <= least + CLOSE * (most - least))
        .min_by(by_size);
    std::iter::once(Some(best)).chain(second.map(Some)).collect()
}

/// Buffers of one thread.
struct Worker {
    solver: Solver,
    weight: Vec<f64>,
    table: crate::numerics::ramp_table::RampTable,
    trial: Parameters,
    residual_db: Vec<f64>,
    candidates: Vec<(f64, Parameters)>,
}

impl Worker {
    fn new(band: &Band) -> Self {
        let empty = Parameters { floor_db: Vec::new(), wind_db: Vec::new(), slope: 0.0, bend: 0.0, post_slope: 0.0 };
        Self {
            solver: Solver::default(),
            weight: vec![0.0; band.rows.len()],
            table: band.table.h.clone(),
            trial: empty,
            residual_db: vec![0.0; band.rows.len()],
            candidates: Vec::new(),
        }
    }
}

/// Derivative of h by a scatter parameter, from a step as large as the replicates move it.
fn table_change(table: &CornerTable, parameter: usize, changes: &[f64], loss: Loss) -> Vec<f64> {
    let mean = changes.iter().sum::<f64>() / changes.len().max(1) as f64;
    let variance =
        changes.iter().map(|change| (change - mean) * (change - mean)).sum::<f64>() / changes.len().max(1) as f64;
    let mut step = (0.3 * variance.sqrt()).max(STEP[parameter]);
    let mut values = table.scatter.to_array();
    if values[parameter] + step > GREATEST[parameter] {
        step = -step;
    }
    values[parameter] += step;
    let moved = table.values_for(Scatter::from_array(values), loss);
    moved.iter().zip(table.h.values()).map(|(moved, plain)| (moved - plain) / step).collect()
}

/// Moves replicates by the difference between two fits of all data, so that they surround the better one. Bends stay within
/// `bends`, so that those at an edge remain there.
pub(crate) fn move_replicates(
    replicates: &mut [Replicate],
    from: &Parameters,
    to: &Parameters,
    bends: Bend,
    curve_shift_db: &[f64],
) {
    for replicate in replicates {
        let at = &mut replicate.at;
        for index in 0..at.floor_db.len() {
            at.floor_db[index] += to.floor_db[index] - from.floor_db[index];
            at.wind_db[index] += to.wind_db[index] - from.wind_db[index];
        }
        at.slope += to.slope - from.slope;
        at.post_slope += to.post_slope - from.post_slope;
        if let Bend::Within(low, high) = bends {
            let inside = at.bend > low && at.bend < high;
            if inside {
                at.bend = (at.bend + to.bend - from.bend).clamp(low, high);
            }
        }
        for (level, shift) in replicate.curve_db.iter_mut().zip(curve_shift_db) {
            *level += shift;
        }
    }
}

/// Winds in m/s of an interval in x.
pub(crate) fn winds_of((low, high): (f64, f64)) -> (f64, f64) {
    (wind_of(low), wind_of(high))
}

/// One number of every replicate.
pub(crate) fn values_of(replicates: &[Replicate], value: impl Fn(&Parameters) -> f64) -> Vec<f64> {
    replicates.iter().map(|replicate| value(&replicate.at)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::science::level_wind::options::Options;
    use crate::science::level_wind::point::PointFit;
    use crate::science::level_wind::record::Record;

    /// Winds over the whole range in slow waves, a knee at 12 m/s, and a pseudo-random scatter with some memory.
    fn point_fit(count: usize) -> (Vec<i64>, PointFit) {
        let mut state = 99_u64;
        let mut random = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
        };
        let (mut slow, mut phase) = (0.0, 0.0);
        let (mut wind, mut level) = (Vec::new(), Vec::new());
        for _ in 0..count {
            phase += 0.13 + 0.1 * random();
            slow = 0.9 * slow + 2.0 * random();
            let now = 9.0 + 7.0 * libm::sin(phase) + 3.0 * random();
            let now = now.max(0.6);
            let power = 1e6 + libm::pow(10.0, 7.36 + 3.0 * libm::log10(now.min(12.0) / 10.0));
            wind.push(now);
            level.push(10.0 * libm::log10(power) + slow + 3.0 * random());
        }
        let times: Vec<i64> = (0..count as i64).map(|hour| hour * 3_600_000).collect();
        let fit = PointFit::new(Record::new(&times, &wind, &level, None), &Options::default());
        (times, fit)
    }

    #[test]
    fn replicate_fits_are_as_good_as_an_exhaustive_search() {
        let (times, fit) = point_fit(1200);
        let band = &fit.band;
        let draws = Draws::new(&times, &vec![true; times.len()], 2.0 * fit.block_h, 60, 3);
        let shared = Arc::new(SharedRows::new(band, &draws));
        let replicas = Replicas::new(band, None, Arc::clone(&shared), &draws, Loss::Tukey);
        for law in [Law::Knee, Law::FreeKnee] {
            let start = band.fit(law, Corner::Floor, &fit.at, super::super::fits::Starts::AndLine).at;
            let found = replicas.fit(band, law, Corner::Floor, &start, &[]);
            let rows = band.rows.len();
            let mut worse = 0;
            for (replicate, found) in found.iter().enumerate() {
                let range = replicate * rows..(replicate + 1) * rows;
                let weight: Vec<f64> =
                    shared.count[range.clone()].iter().zip(&band.rows.weight).map(|(n, w)| n * w).collect();
                let means = RowMeans {
                    starts: &band.rows.starts,
                    weight: &weight,
                    x: &shared.x[range.clone()],
                    level_db: &replicas.level_db[range],
                };
                let stop = Stop { iterations: 60, tolerance: 1e-9 };
                let mut solver = Solver::default();
                let mut search = |start: &Parameters| {
                    let mut at = start.clone();
                    solver.minimise(&means, &band.form(law, Corner::Floor), band.bend(law), stop, &mut at)
                };
                let exhaustive =
                    band.onsets.iter().map(|&onset| search(&start.with_bend(onset))).fold(f64::INFINITY, f64::min);
                worse += usize::from(search(&found.at) > exhaustive * 1.002);
            }
            assert!(worse <= 2, "{law:?}: {worse} of 60 replicates missed the minimum");
        }
    }

    #[test]
    fn row_sums_are_weighted_sums_of_samples() {
        let (times, fit) = point_fit(300);
        let band = &fit.band;
        let draws = Draws::new(&times, &vec![true; times.len()], 20.0, 5, 3);
        let shared = SharedRows::new(band, &draws);
        let rows = band.rows.len();
        for replicate in 0..5 {
            let mut direct = vec![0.0; rows];
            for sample in 0..band.record.len() {
                let cell = draws.cell_of_row[band.record.source_row[sample]] as usize;
                direct[band.rows.of_sample[sample]] += draws.weights_of(cell)[replicate];
            }
            for (sum, direct) in shared.count[replicate * rows..].iter().zip(direct) {
                assert!((sum - direct).abs() < 1e-9);
            }
        }
    }

    #[test]
    fn intervals_are_widened_for_few_blocks() {
        let draws = Draws::new(&[0, 3_600_000_000], &[true, true], 100.0, 3, 1);
        let values: Vec<f64> = (0..1001).map(f64::from).collect();
        let (low, high) = draws.interval(&values, 0.95);
        assert!(low < 25.0 && high > 975.0 && (low + high - 1000.0).abs() < 1e-9);
    }
}
