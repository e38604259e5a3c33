//! Weighted least squares of the mean curve on rows: Levenberg-Marquardt with bounds.
//!
//! Floors and wind parts belong to one deployment each, the shape (slope, bend, slope above the onset) to all. The normal
//! equations therefore have an arrow form, and the deployments are eliminated one by one (Schur complement), so that the
//! cost grows with the number of deployments and not with its cube.

#![expect(clippy::needless_range_loop, reason = "rows and columns of small matrices read best by index")]

use super::corner::top_offset_db;
use super::law::{Corner, GREATEST_SLOPE, Law, Parameters, wind_term};
use super::normal::{BEND, COLUMNS, Linearised, Local, Normal, POST, SHARED, SLOPE, WIND, sum};
use super::options::Segments;
use crate::numerics::ramp_table::RampTable;

/// What is fitted: rows ordered by deployment, each with its weight, mean x and mean level.
#[derive(Debug, Clone, Copy)]
pub(crate) struct RowMeans<'a> {
    /// First row of each deployment, and the number of rows.
    pub(crate) starts: &'a [usize],
    /// Weight; rows without weight are skipped.
    pub(crate) weight: &'a [f64],
    /// Mean x.
    pub(crate) x: &'a [f64],
    /// Mean level, dB.
    pub(crate) level_db: &'a [f64],
}

/// How the mean curve is made from the parameters.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Form<'a> {
    pub(crate) law: Law,
    pub(crate) corner: Corner,
    /// h.
    pub(crate) table: &'a RampTable,
    /// Width of a class in x.
    pub(crate) width: f64,
    /// What may differ between deployments.
    pub(crate) segments: Segments,
    /// Least floor, dB.
    pub(crate) least_floor_db: f64,
}

/// Level and its derivatives with respect to wind part (h') at one x.
#[derive(Debug, Clone, Copy)]
pub(crate) struct CurveAt {
    pub(crate) level_db: f64,
    /// h': 1 where the wind part alone counts, 0 at the floor.
    pub(crate) wind_share: f64,
}

impl Form<'_> {
    /// The same curve at single wind speeds.
    #[must_use]
    pub(crate) fn at_points(self) -> Self {
        Self { width: super::law::POINT_WIDTH, ..self }
    }

    /// Level at x in a deployment.
    pub(crate) fn level(&self, at: &Parameters, deployment: usize, x: f64) -> CurveAt {
        let term = wind_term(self.law, at.slope, at.bend, at.post_slope, x, self.width);
        let wind = at.wind_db[deployment] + term.value;
        match self.corner {
            Corner::Floor => {
                let floor = at.floor_db[deployment];
                let (above, wind_share) = self.table.value_and_slope(wind - floor);
                CurveAt { level_db: floor + above, wind_share }
            }
            Corner::Bare => CurveAt { level_db: wind + top_offset_db(self.table), wind_share: 1.0 },
        }
    }
}

/// Whether the bend is part of the fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Bend {
    /// It stays.
    Fixed,
    /// It is fitted within these bounds.
    Within(f64, f64),
}

/// When the iteration ends.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Stop {
    pub(crate) iterations: usize,
    /// Relative decrease of the sum of squares below which it ends.
    pub(crate) tolerance: f64,
}

/// Buffers of the iteration, to be used again.
#[derive(Debug, Clone)]
pub(crate) struct Solver {
    current: Normal,
    next: Normal,
    linearised: Linearised,
    weighted: Vec<f64>,
    trial: Parameters,
    local_step: Vec<[f64; 2]>,
    shared_step: [f64; SHARED],
    reduced: Vec<[[f64; SHARED + 1]; 2]>,
}

impl Default for Solver {
    fn default() -> Self {
        Self {
            current: Normal::default(),
            next: Normal::default(),
            linearised: Linearised::default(),
            weighted: Vec::new(),
            trial: Parameters { floor_db: Vec::new(), wind_db: Vec::new(), slope: 0.0, bend: 0.0, post_slope: 0.0 },
            local_step: Vec::new(),
            shared_step: [0.0; SHARED],
            reduced: Vec::new(),
        }
    }
}

/// Which parameters are free.
#[derive(Debug, Clone, Copy)]
struct Free {
    floor: bool,
    local_wind: bool,
    shared: [bool; SHARED],
}

impl Free {
    fn of(form: &Form<'_>, bend: Bend) -> Self {
        let bend_free = matches!(bend, Bend::Within(..)) && form.law != Law::Line;
        let common_wind = matches!(form.segments, Segments::Floor | Segments::Offset);
        Self {
            floor: form.corner == Corner::Floor || form.segments == Segments::Offset,
            local_wind: !common_wind,
            // Without a floor an offset per deployment already carries the level.
            shared: [
                true,
                bend_free,
                form.law == Law::FreeKnee,
                common_wind && !(form.segments == Segments::Offset && form.corner == Corner::Bare),
            ],
        }
    }
}

impl Solver {
    /// Improves `at` and gives the weighted sum of squares there. The start must respect the bounds, except that of the bend.
    pub(crate) fn minimise(
        &mut self,
        rows: &RowMeans<'_>,
        form: &Form<'_>,
        bend: Bend,
        stop: Stop,
        at: &mut Parameters,
    ) -> f64 {
        let free = Free::of(form, bend);
        let mut damping = 1e-3;
        self.linearised.fill(rows, form, at);
        let (residual, columns) = (&self.linearised.residual_db, &self.linearised.columns);
        sum(&mut self.current, &mut self.weighted, rows, form, free.shared[BEND], residual, columns);
        for _ in 0..stop.iterations {
            let mut accepted = false;
            for _ in 0..6 {
                if self.step(free, damping, bend, at) {
                    self.apply(form, bend, free, at);
                    self.linearised.fill(rows, form, &self.trial);
                    let (residual, columns) = (&self.linearised.residual_db, &self.linearised.columns);
                    sum(&mut self.next, &mut self.weighted, rows, form, free.shared[BEND], residual, columns);
                    if self.next.sum_squares <= self.current.sum_squares {
                        accepted = true;
                        break;
                    }
                }
                damping = damping * 8.0 + 1e-6;
            }
            if !accepted {
                break;
            }
            let decrease = self.current.sum_squares - self.next.sum_squares;
            let before = self.current.sum_squares;
            std::mem::swap(&mut self.current, &mut self.next);
            at.copy_from(&self.trial);
            damping *= 0.15;
            if decrease <= stop.tolerance * before + 1e-12 {
                break;
            }
        }
        self.current.sum_squares
    }

    /// Takes one undamped step from a curve whose residuals and Jacobian are known, with the bend held, and gives the sum of
    /// squares that the linear approximation predicts there.
    pub(crate) fn linear_step(
        &mut self,
        rows: &RowMeans<'_>,
        form: &Form<'_>,
        residual_db: &[f64],
        columns: &[Vec<f64>; COLUMNS],
        at: &Parameters,
        stepped: &mut Parameters,
    ) -> f64 {
        sum(&mut self.current, &mut self.weighted, rows, form, false, residual_db, columns);
        let free = Free::of(form, Bend::Fixed);
        if !self.step(free, 1e-9, Bend::Fixed, at) {
            stepped.copy_from(at);
            return self.current.sum_squares;
        }
        self.apply(form, Bend::Fixed, free, at);
        stepped.copy_from(&self.trial);
        let mut gain = 0.0;
        for (gradient, step) in self.current.gradient.iter().zip(&self.shared_step) {
            gain += gradient * step;
        }
        for (local, step) in self.current.local.iter().zip(&self.local_step) {
            gain += local.gradient[0] * step[0] + local.gradient[1] * step[1];
        }
        self.current.sum_squares - gain
    }

    /// Solves for the damped step; `false` when the system is singular. Shared parameters that lie at a bound and would
    /// leave it are held.
    fn step(&mut self, mut free: Free, damping: f64, bend: Bend, at: &Parameters) -> bool {
        let bounds = shape_bounds(bend);
        let values = [at.slope, at.bend, at.post_slope];
        loop {
            let Some(shared) = self.eliminate(free, damping) else { return false };
            let mut held = false;
            for index in 0..3 {
                let (low, high) = bounds[index];
                let leaves =
                    (values[index] <= low && shared[index] < 0.0) || (values[index] >= high && shared[index] > 0.0);
                if free.shared[index] && leaves {
                    free.shared[index] = false;
                    held = true;
                }
            }
            if !held {
                self.back_substitute(&shared);
                return true;
            }
        }
    }

    /// Eliminates the deployments and solves for the shared step.
    fn eliminate(&mut self, free: Free, damping: f64) -> Option<[f64; SHARED]> {
        let raise = |diagonal: f64| diagonal + damping * diagonal + 1e-9;
        let mut matrix = [[0.0; SHARED]; SHARED];
        let mut right = [0.0; SHARED];
        for row in 0..SHARED {
            if !free.shared[row] {
                continue;
            }
            right[row] = self.current.gradient[row];
            for column in 0..=row {
                if free.shared[column] {
                    matrix[row][column] = self.current.square[row][column];
                }
            }
            matrix[row][row] = raise(matrix[row][row]);
        }
        self.reduced.clear();
        for local in &self.current.local {
            let reduced = reduce(local, free, raise)?;
            for row in 0..SHARED {
                if !free.shared[row] {
                    continue;
                }
                let (c0, c1) = (local.coupling[0][row], local.coupling[1][row]);
                right[row] -= c0 * reduced[0][SHARED] + c1 * reduced[1][SHARED];
                for column in 0..=row {
                    matrix[row][column] -= c0 * reduced[0][column] + c1 * reduced[1][column];
                }
            }
            self.reduced.push(reduced);
        }
        solve_shared(&matrix, &right, free.shared)
    }

    fn back_substitute(&mut self, shared: &[f64; SHARED]) {
        self.local_step.clear();
        for reduced in &self.reduced {
            let mut step = [reduced[0][SHARED], reduced[1][SHARED]];
            for (value, row) in step.iter_mut().zip(reduced) {
                for index in 0..SHARED {
                    *value -= row[index] * shared[index];
                }
            }
            self.local_step.push(step);
        }
        self.shared_step = *shared;
    }

    /// Puts the stepped parameters, cut at the bounds, into `trial`.
    fn apply(&mut self, form: &Form<'_>, bend: Bend, free: Free, at: &Parameters) {
        let shared = self.shared_step;
        let trial = &mut self.trial;
        trial.copy_from(at);
        let cut = |value: f64, (low, high): (f64, f64)| value.max(low).min(high);
        let bounds = shape_bounds(bend);
        trial.slope = cut(at.slope + shared[SLOPE], bounds[SLOPE]);
        if free.shared[BEND] {
            trial.bend = cut(at.bend + shared[BEND], bounds[BEND]);
        }
        trial.post_slope = cut(at.post_slope + shared[POST], bounds[POST]);
        for (index, step) in self.local_step.iter().enumerate() {
            trial.floor_db[index] += step[0];
            trial.wind_db[index] += match form.segments {
                Segments::Offset => step[0] + shared[WIND],
                Segments::Floor => shared[WIND],
                Segments::Pooled | Segments::Tested | Segments::FloorAndWindPart => step[1],
            };
            if form.corner == Corner::Floor {
                trial.floor_db[index] = trial.floor_db[index].max(form.least_floor_db);
            }
        }
    }
}

fn shape_bounds(bend: Bend) -> [(f64, f64); 3] {
    let bend = match bend {
        Bend::Fixed => (f64::NEG_INFINITY, f64::INFINITY),
        Bend::Within(low, high) => (low, high),
    };
    [(0.0, GREATEST_SLOPE), bend, (-GREATEST_SLOPE, GREATEST_SLOPE)]
}

/// Inverse of a deployment's own block times its coupling to the shared parameters and (last column) its gradient.
#[inline]
fn reduce(local: &Local, free: Free, raise: impl Fn(f64) -> f64) -> Option<[[f64; SHARED + 1]; 2]> {
    const LEAST_PIVOT: f64 = 1e-14;
    let a = if free.floor { raise(local.square[0]) } else { 1.0 };
    let b = if free.floor && free.local_wind { local.square[1] } else { 0.0 };
    let c = if free.local_wind { raise(local.square[2]) } else { 1.0 };
    if a.is_nan() || a <= LEAST_PIVOT {
        return None;
    }
    let rest = c - b * b / a;
    if rest.is_nan() || rest <= LEAST_PIVOT {
        return None;
    }
    let mut out = [[0.0; SHARED + 1]; 2];
    for column in 0..=SHARED {
        let (mut u, mut v) = if column == SHARED {
            (local.gradient[0], local.gradient[1])
        } else {
            (local.coupling[0][column], local.coupling[1][column])
        };
        if !free.floor {
            u = 0.0;
        }
        if !free.local_wind {
            v = 0.0;
        }
        let second = (v - b / a * u) / rest;
        out[1][column] = second;
        out[0][column] = (u - b * second) / a;
    }
    Some(out)
}

fn solve_shared(
    matrix: &[[f64; SHARED]; SHARED],
    right: &[f64; SHARED],
    free: [bool; SHARED],
) -> Option<[f64; SHARED]> {
    let mut factor = [[0.0; SHARED]; SHARED];
    let mut solution = *right;
    for row in 0..SHARED {
        if !free[row] {
            solution[row] = 0.0;
            continue;
        }
        for column in 0..=row {
            if !free[column] {
                continue;
            }
            let mut sum = matrix[row][column];
            for inner in 0..column {
                sum -= factor[row][inner] * factor[column][inner];
            }
            if row == column {
                if sum.is_nan() || sum <= 1e-14 {
                    return None;
                }
                factor[row][row] = sum.sqrt();
            } else {
                factor[row][column] = sum / factor[column][column];
            }
        }
        for inner in 0..row {
            solution[row] -= factor[row][inner] * solution[inner];
        }
        solution[row] /= factor[row][row];
    }
    for row in (0..SHARED).rev() {
        if !free[row] {
            continue;
        }
        for inner in row + 1..SHARED {
            solution[row] -= factor[inner][row] * solution[inner];
        }
        solution[row] /= factor[row][row];
    }
    Some(solution)
}
