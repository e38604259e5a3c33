//! Windows of one class, sorted for weighted medians, and which windows were left out and why.

use super::laws::LawTable;
use super::options::SpreadOptions;
use super::windows::{BandWindows, Floor, ModelWindows, comparable};
use crate::model::{NotIdentified, SpreadClass};
use crate::numerics::quantile::median;
use std::collections::BTreeMap;

/// The windows of a class.
#[derive(Debug, Clone)]
pub(super) struct Members {
    /// Measured minus radiated (dB) with the bootstrap cell of the window, sorted by the former.
    residuals: Vec<(f64, usize)>,
    pub windows: usize,
    pub episodes: usize,
    pub measured_db: f64,
    pub radiated_db: f64,
    pub overlap_db: f64,
    pub x: f64,
    pub unused: Vec<(NotIdentified, usize)>,
}

/// How time is cut into the cells and blocks of the bootstrap.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cells {
    start_ms: i64,
    cell_ms: i64,
    pub count: usize,
    pub block_cells: usize,
}

impl Cells {
    /// Sixteen cells a block.
    pub(super) fn new(times_ms: &[i64], options: &SpreadOptions) -> Self {
        const BLOCK_CELLS: usize = 16;
        let cell_ms = ((options.block_h * 3_600_000.0 / BLOCK_CELLS as f64) as i64).max(1);
        let (first, last) = (times_ms.first().copied().unwrap_or(0), times_ms.last().copied().unwrap_or(0));
        let count = ((last - first) / cell_ms + 1) as usize;
        Self { start_ms: first, cell_ms, count, block_cells: BLOCK_CELLS }
    }

    fn of(self, time_ms: i64) -> usize {
        ((time_ms - self.start_ms) / self.cell_ms) as usize
    }
}

impl Members {
    /// Windows of a class. With `laws_instead` the overlap of the model gives way to the middle of the published laws: what its
    /// density alone would radiate.
    pub(super) fn gather(
        windows: &BandWindows<'_>,
        model: &ModelWindows<'_>,
        class: SpreadClass,
        floor: Floor,
        cells: Cells,
        laws_instead: Option<&LawTable>,
    ) -> Self {
        let mut residuals = Vec::new();
        let (mut measured, mut radiated, mut overlap, mut x) = (Vec::new(), Vec::new(), Vec::new(), Vec::new());
        let mut unused: BTreeMap<NotIdentified, usize> = BTreeMap::new();
        let mut count = 0;
        for (i, time) in windows.times_ms.iter().enumerate() {
            let level = windows.level_db[i];
            if !level.is_finite() || !class.holds(model.f_over_fp[i], windows.wind_speed_m_s[i]) {
                continue;
            }
            count += 1;
            match comparable(&model.radiated[i], model.f_over_fp[i]) {
                Ok(expected) => {
                    let x_here = model.f_over_fp[i];
                    let other_overlap = laws_instead.map_or(0.0, |laws| laws.middle_db(x_here) - model.overlap_db[i]);
                    let residual = floor.above_db(level) - expected.band_level_db - other_overlap;
                    residuals.push((residual, cells.of(*time)));
                    measured.push(level);
                    radiated.push(expected.band_level_db);
                    overlap.push(model.overlap_db[i]);
                    x.push(model.f_over_fp[i]);
                }
                Err(why) => *unused.entry(why).or_insert(0) += 1,
            }
        }
        residuals.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
        let mut blocks: Vec<usize> = residuals.iter().map(|(_, cell)| cell / cells.block_cells).collect();
        blocks.sort_unstable();
        blocks.dedup();
        let mut unused: Vec<_> = unused.into_iter().collect();
        unused.sort_by_key(|(why, count)| (std::cmp::Reverse(*count), *why));
        Self {
            residuals,
            windows: count,
            episodes: blocks.len(),
            measured_db: median(&measured),
            radiated_db: median(&radiated),
            overlap_db: median(&overlap),
            x: median(&x),
            unused,
        }
    }

    pub(super) fn used(&self) -> usize {
        self.residuals.len()
    }

    pub(super) fn enough(&self, options: &SpreadOptions) -> bool {
        self.used() >= options.least_windows && self.episodes >= options.least_episodes
    }

    /// Median residual, dB.
    pub(super) fn median_db(&self) -> f64 {
        self.weighted_median_db(|_| 1.0)
    }

    /// Median residual when every cell counts this often; NaN where nothing is left.
    pub(super) fn weighted_median_db(&self, weight: impl Fn(usize) -> f64) -> f64 {
        let total: f64 = self.residuals.iter().map(|(_, cell)| weight(*cell)).sum();
        let mut below = 0.0;
        for (at, (residual, cell)) in self.residuals.iter().enumerate() {
            below += weight(*cell);
            // Midway between two where the halves meet exactly.
            if (below - 0.5 * total).abs() < 1e-9 * total {
                let next = self.residuals[at + 1..].iter().find(|(_, cell)| weight(*cell) > 0.0);
                return next.map_or(*residual, |(next, _)| 0.5 * (residual + next));
            }
            if below > 0.5 * total {
                return *residual;
            }
        }
        f64::NAN
    }

    /// Whether the windows lie far enough above the floor.
    pub(super) fn clear_of(&self, floor: Floor, options: &SpreadOptions) -> bool {
        // Without any floor the level itself is NaN and nothing can be too near to it.
        floor.level_db.is_nan() || self.measured_db >= floor.level_db + options.floor_margin_db
    }
}
