//! A cloud of windows as cells, darker where more.

use super::colour::RAMP;
use super::panel::Panel;
use super::statistics::shade_of;
use super::svg::Canvas;

/// Size of a cell, pixels.
const CELL: f64 = 6.0;

/// Draws the points (values) that lie inside the panel; gives the largest number in one cell.
pub(crate) fn cells(canvas: &mut Canvas, panel: &Panel, points: &[(f64, f64)]) -> usize {
    let (columns, rows) = ((panel.width() / CELL) as usize + 1, (panel.height() / CELL) as usize + 1);
    let mut counts = vec![0_usize; columns * rows];
    for (x, y) in points {
        let (x, y) = (panel.x.px(*x), panel.y.px(*y));
        let inside = x >= panel.left() && x < panel.right() && y >= panel.top() && y < panel.bottom();
        if inside {
            let (column, row) = (((x - panel.left()) / CELL) as usize, ((y - panel.top()) / CELL) as usize);
            counts[row * columns + column] += 1;
        }
    }
    let most = counts.iter().copied().max().unwrap_or(0);
    for (shade, colour) in RAMP.iter().enumerate() {
        let rects: Vec<_> = (0..counts.len())
            .filter(|i| shade_of(counts[*i], most, RAMP.len()) == Some(shade))
            .map(|i| {
                let corner = (panel.left() + (i % columns) as f64 * CELL, panel.top() + (i / columns) as f64 * CELL);
                let (right, foot) = (panel.right() - corner.0, panel.bottom() - corner.1);
                (corner.0, corner.1, CELL.min(right) + 0.1, CELL.min(foot) + 0.1)
            })
            .collect();
        canvas.rects(&rects, colour);
    }
    most
}
