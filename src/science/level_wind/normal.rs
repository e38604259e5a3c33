//! Normal equations of a curve at rows, in arrow form: blocks of single deployments and a block that they share.

#![expect(clippy::needless_range_loop, reason = "rows and columns of small matrices read best by index")]

use super::corner::top_offset_db;
use super::law::{Corner, Law, Parameters, wind_term};
use super::options::Segments;
use super::solve::{Form, RowMeans};
use crate::numerics::dot::dot;

/// Number of shared parameters: slope, bend, slope above the onset, common wind part.
pub(crate) const SHARED: usize = 4;
pub(crate) const SLOPE: usize = 0;
pub(crate) const BEND: usize = 1;
pub(crate) const POST: usize = 2;
pub(crate) const WIND: usize = 3;

/// Normal equations of one deployment.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Local {
    /// Entries (0,0), (0,1), (1,1).
    pub(crate) square: [f64; 3],
    pub(crate) gradient: [f64; 2],
    pub(crate) coupling: [[f64; SHARED]; 2],
}

#[derive(Debug, Clone, Default)]
pub(crate) struct Normal {
    pub(crate) sum_squares: f64,
    pub(crate) local: Vec<Local>,
    pub(crate) square: [[f64; SHARED]; SHARED],
    pub(crate) gradient: [f64; SHARED],
}

/// Columns of the normal equations, one entry per row: floor, wind part, slope, bend, slope above the onset.
pub(crate) const COLUMNS: usize = 5;

/// A curve at the rows: residuals and Jacobian, ready for sums.
#[derive(Debug, Clone, Default)]
pub(crate) struct Linearised {
    pub(crate) residual_db: Vec<f64>,
    pub(crate) columns: [Vec<f64>; COLUMNS],
}

impl Linearised {
    /// Residuals and Jacobian at the parameters.
    pub(crate) fn fill(&mut self, rows: &RowMeans<'_>, form: &Form<'_>, at: &Parameters) {
        self.residual_db.clear();
        self.columns.iter_mut().for_each(Vec::clear);
        // Each law gets its own loop without a branch on the law.
        match form.law {
            Law::Line => self.fill_law(Law::Line, rows, form, at),
            Law::Knee => self.fill_law(Law::Knee, rows, form, at),
            Law::FreeKnee => self.fill_law(Law::FreeKnee, rows, form, at),
            Law::Quadratic => self.fill_law(Law::Quadratic, rows, form, at),
            Law::Threshold => self.fill_law(Law::Threshold, rows, form, at),
        }
    }

    #[inline(always)]
    #[expect(clippy::inline_always, reason = "the innermost loop: the law must be known when it is compiled")]
    fn fill_law(&mut self, law: Law, rows: &RowMeans<'_>, form: &Form<'_>, at: &Parameters) {
        let count = rows.x.len();
        self.residual_db.resize(count, 0.0);
        self.columns.iter_mut().for_each(|column| column.resize(count, 0.0));
        let [by_floor, by_wind, by_slope, by_bend, by_post] = &mut self.columns;
        let bare = top_offset_db(form.table);
        let with_floor = form.corner == Corner::Floor;
        for (deployment, edges) in rows.starts.windows(2).enumerate() {
            let (floor, wind_db) = (at.floor_db[deployment], at.wind_db[deployment]);
            for row in edges[0]..edges[1] {
                let term = wind_term(law, at.slope, at.bend, at.post_slope, rows.x[row], form.width);
                let wind = wind_db + term.value;
                let (fitted, share) = if with_floor {
                    let (above, share) = form.table.value_and_slope(wind - floor);
                    (floor + above, share)
                } else {
                    (wind + bare, 1.0)
                };
                self.residual_db[row] = rows.level_db[row] - fitted;
                by_floor[row] = 1.0 - share;
                by_wind[row] = share;
                by_slope[row] = share * term.by_slope;
                if law != Law::Line {
                    by_bend[row] = share * term.by_bend;
                }
                if law == Law::FreeKnee {
                    by_post[row] = share * term.by_post_slope;
                }
            }
        }
    }
}

/// Normal equations of a law with these residuals and columns.
pub(crate) fn sum(
    normal: &mut Normal,
    weighted: &mut Vec<f64>,
    rows: &RowMeans<'_>,
    form: &Form<'_>,
    residual_db: &[f64],
    columns: &[Vec<f64>; COLUMNS],
) {
    match form.law {
        Law::Line => sum_columns::<3>(normal, weighted, rows, form, residual_db, columns),
        Law::Knee | Law::Quadratic | Law::Threshold => {
            sum_columns::<4>(normal, weighted, rows, form, residual_db, columns);
        }
        Law::FreeKnee => sum_columns::<5>(normal, weighted, rows, form, residual_db, columns),
    }
}

/// Products of weights and values.
fn weigh(weighted: &mut Vec<f64>, weight: &[f64], values: &[f64]) {
    weighted.clear();
    weighted.extend(weight.iter().zip(values).map(|(weight, value)| weight * value));
}

/// The first `USED` columns.
fn sum_columns<const USED: usize>(
    normal: &mut Normal,
    weighted: &mut Vec<f64>,
    rows: &RowMeans<'_>,
    form: &Form<'_>,
    residual_db: &[f64],
    columns: &[Vec<f64>; COLUMNS],
) {
    normal.local.clear();
    normal.sum_squares = 0.0;
    normal.square = [[0.0; SHARED]; SHARED];
    normal.gradient = [0.0; SHARED];
    for edges in rows.starts.windows(2) {
        let range = edges[0]..edges[1];
        let weight = &rows.weight[range.clone()];
        let residual = &residual_db[range.clone()];
        let columns: [&[f64]; USED] = std::array::from_fn(|index| &columns[index][range.clone()]);
        weigh(weighted, weight, residual);
        normal.sum_squares += dot(weighted, residual);
        let gradient = columns.map(|column| dot(weighted, column));
        let mut square = [[0.0; USED]; USED];
        for row in 0..USED {
            weigh(weighted, weight, columns[row]);
            for column in 0..=row {
                square[row][column] = dot(weighted, columns[column]);
            }
        }
        normal.local.push(distribute(&square, &gradient, form.segments, &mut normal.square, &mut normal.gradient));
    }
}

/// Splits a deployment's normal equations into its own and the shared part.
fn distribute<const USED: usize>(
    square: &[[f64; USED]; USED],
    gradient: &[f64; USED],
    segments: Segments,
    shared_square: &mut [[f64; SHARED]; SHARED],
    shared_gradient: &mut [f64; SHARED],
) -> Local {
    let mut local = Local {
        square: [square[0][0], square[1][0], square[1][1]],
        gradient: [gradient[0], gradient[1]],
        ..Local::default()
    };
    for row in 2..USED {
        shared_gradient[row - 2] += gradient[row];
        local.coupling[0][row - 2] = square[row][0];
        local.coupling[1][row - 2] = square[row][1];
        for column in 2..=row {
            shared_square[row - 2][column - 2] += square[row][column];
        }
    }
    if matches!(segments, Segments::Floor | Segments::Offset) {
        shared_gradient[WIND] += gradient[1];
        shared_square[WIND][WIND] += square[1][1];
        for row in 2..USED {
            shared_square[WIND][row - 2] += square[row][1];
        }
        local.coupling[0][WIND] = square[1][0];
    }
    if segments == Segments::Offset {
        // The deployment's own parameter moves floor and wind part together.
        local.square[0] += 2.0 * square[1][0] + square[1][1];
        local.gradient[0] += gradient[1];
        local.coupling[0][WIND] += square[1][1];
        for row in 2..USED {
            local.coupling[0][row - 2] += square[row][1];
        }
    }
    local
}
