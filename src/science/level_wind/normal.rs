//! Normal equations of a curve at rows, in arrow form: blocks of single deployments and a block that they share.

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
        for column in &mut self.columns {
            column.resize(count, 0.0);
        }
        let bare = top_offset_db(form.table);
        let with_floor = form.corner == Corner::Floor;
        for (deployment, edges) in rows.starts.windows(2).enumerate() {
            let (floor, wind_db) = (at.floor_db[deployment], at.wind_db[deployment]);
            // Slices of one length, so that the loop needs no bounds checks.
            let (start, length) = (edges[0], edges[1] - edges[0]);
            let xs = &rows.x[start..][..length];
            let levels = &rows.level_db[start..][..length];
            let residuals = &mut self.residual_db[start..][..length];
            let [by_floor, by_wind, by_slope, by_bend, by_post] =
                self.columns.each_mut().map(|column| &mut column[start..][..length]);
            for row in 0..length {
                let term = wind_term(law, at.slope, at.bend, at.post_slope, xs[row], form.width);
                let wind = wind_db + term.value;
                let (fitted, share) = if with_floor {
                    let (above, share) = form.table.value_and_slope(wind - floor);
                    (floor + above, share)
                } else {
                    (wind + bare, 1.0)
                };
                residuals[row] = levels[row] - fitted;
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
    bend_free: bool,
    residual_db: &[f64],
    columns: &[Vec<f64>; COLUMNS],
) {
    // Only the columns of free parameters are summed: most fits hold the bend.
    let parts = (normal, weighted, rows, form, residual_db, columns);
    match (form.law, bend_free) {
        (Law::Line, _) | (Law::Knee | Law::Quadratic | Law::Threshold, false) => sum_columns(parts, [0, 1, 2]),
        (Law::Knee | Law::Quadratic | Law::Threshold, true) => sum_columns(parts, [0, 1, 2, 3]),
        (Law::FreeKnee, false) => sum_columns(parts, [0, 1, 2, 4]),
        (Law::FreeKnee, true) => sum_columns(parts, [0, 1, 2, 3, 4]),
    }
}

/// What [`sum`] works on.
type Parts<'a> = (&'a mut Normal, &'a mut Vec<f64>, &'a RowMeans<'a>, &'a Form<'a>, &'a [f64], &'a [Vec<f64>; COLUMNS]);

/// Products of weights and values.
fn weigh(weighted: &mut Vec<f64>, weight: &[f64], values: &[f64]) {
    weighted.clear();
    weighted.extend(weight.iter().zip(values).map(|(weight, value)| weight * value));
}

/// The columns picked; the first two are floor and wind part.
fn sum_columns<const USED: usize>(parts: Parts<'_>, pick: [usize; USED]) {
    let (normal, weighted, rows, form, residual_db, columns) = parts;
    normal.local.clear();
    normal.sum_squares = 0.0;
    normal.square = [[0.0; SHARED]; SHARED];
    normal.gradient = [0.0; SHARED];
    for edges in rows.starts.windows(2) {
        let range = edges[0]..edges[1];
        let weight = &rows.weight[range.clone()];
        let residual = &residual_db[range.clone()];
        let columns: [&[f64]; USED] = pick.map(|index| &columns[index][range.clone()]);
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
        normal.local.push(distribute(
            &square,
            &gradient,
            pick,
            form.segments,
            &mut normal.square,
            &mut normal.gradient,
        ));
    }
}

/// Splits a deployment's normal equations into its own and the shared part.
fn distribute<const USED: usize>(
    square: &[[f64; USED]; USED],
    gradient: &[f64; USED],
    pick: [usize; USED],
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
        shared_gradient[pick[row] - 2] += gradient[row];
        local.coupling[0][pick[row] - 2] = square[row][0];
        local.coupling[1][pick[row] - 2] = square[row][1];
        for column in 2..=row {
            shared_square[pick[row] - 2][pick[column] - 2] += square[row][column];
        }
    }
    if matches!(segments, Segments::Floor | Segments::Offset) {
        shared_gradient[WIND] += gradient[1];
        shared_square[WIND][WIND] += square[1][1];
        for row in 2..USED {
            shared_square[WIND][pick[row] - 2] += square[row][1];
        }
        local.coupling[0][WIND] = square[1][0];
    }
    if segments == Segments::Offset {
        // The deployment's own parameter moves floor and wind part together.
        local.square[0] += 2.0 * square[1][0] + square[1][1];
        local.gradient[0] += gradient[1];
        local.coupling[0][WIND] += square[1][1];
        for row in 2..USED {
            local.coupling[0][pick[row] - 2] += square[row][1];
        }
    }
    local
}
