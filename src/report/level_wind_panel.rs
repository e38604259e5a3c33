//! What stands inside the frame of a level against wind panel: cells, floor, curve, onset, medians.

use super::colour::{CURVE, FLOOR, INK, ONSET, PAPER, RAMP};
use super::estimate::Estimate;
use super::level_wind::{CurvePoint, LevelAgainstWind};
use super::mark::{Along, arrow, hatch};
use super::panel::{Panel, TEXT_SIZE};
use super::statistics::{quantile_sorted, shade_of};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// Fewer points than this are drawn one by one.
const FEW_POINTS: usize = 400;

/// How much a panel shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Detail {
    Full,
    Small,
}

/// Everything inside a panel; gives the largest count of a cell, 0 when points are drawn singly.
pub(crate) fn draw_panel(
    canvas: &mut Canvas,
    panel: &Panel,
    input: &LevelAgainstWind,
    points: &[(f64, f64)],
    detail: Detail,
) -> usize {
    let full = detail == Detail::Full;
    panel.grid(canvas);
    let most = if points.len() < FEW_POINTS {
        let pixels: Vec<_> = points.iter().map(|&(w, l)| panel.at(w, l)).filter(|p| panel.encloses(*p)).collect();
        canvas.dots(&pixels, if full { 2.0 } else { 1.1 }, RAMP[7], 0.65);
        0
    } else {
        cells(canvas, panel, points, if full { (9.0, 6.0) } else { (6.0, 4.5) })
    };
    floor(canvas, panel, input, full);
    let curve = sparse(panel, &input.curve);
    panel.band(canvas, curve.iter().map(|c| (c.wind_m_s, c.low_db, c.high_db)), CURVE, 0.22);
    onset(canvas, panel, input, full);
    // A white edge lifts the curve off the darkest cells, also on a grey printer.
    let width = if full { 2.4 } else { 1.8 };
    for stroke in [Stroke::solid(PAPER, width + 1.8), Stroke::solid(CURVE, width)] {
        panel.line(canvas, curve.iter().map(|c| (c.wind_m_s, c.level_db)), stroke);
    }
    medians(canvas, panel, points, full);
    if full {
        floor_label(canvas, panel, input);
    }
    if points.is_empty() {
        panel.no_data(canvas, "no data");
    }
    most
}

/// The curve with at most one point per 2.5 pixels, its first and last kept.
fn sparse(panel: &Panel, curve: &[CurvePoint]) -> Vec<CurvePoint> {
    let mut kept: Vec<CurvePoint> = Vec::new();
    let mut last = f64::NEG_INFINITY;
    for (i, point) in curve.iter().enumerate() {
        let x = panel.x.px(point.wind_m_s);
        if i == 0 || i + 1 == curve.len() || !x.is_finite() || x - last >= 2.5 {
            kept.push(*point);
            last = x;
        }
    }
    kept
}

/// Counts in cells of about this size in pixels; one path for each shade.
fn cells(canvas: &mut Canvas, panel: &Panel, points: &[(f64, f64)], cell: (f64, f64)) -> usize {
    let (columns, rows) = ((panel.width() / cell.0).round() as usize, (panel.height() / cell.1).round() as usize);
    let (w, h) = (panel.width() / columns as f64, panel.height() / rows as f64);
    let mut counts = vec![0_usize; columns * rows];
    for &(wind, level) in points {
        let (x, y) = panel.at(wind, level);
        let (column, row) = (((x - panel.left()) / w).floor(), ((y - panel.top()) / h).floor());
        if column >= 0.0 && row >= 0.0 && row <= rows as f64 && column <= columns as f64 {
            counts[(row as usize).min(rows - 1) * columns + (column as usize).min(columns - 1)] += 1;
        }
    }
    let most = counts.iter().copied().max().unwrap_or(0);
    for (shade, colour) in RAMP.iter().enumerate() {
        let mut rects = Vec::new();
        for row in 0..rows {
            let mut column = 0;
            while column < columns {
                let of = |c: usize| shade_of(counts[row * columns + c], most, RAMP.len());
                if of(column) != Some(shade) {
                    column += 1;
                    continue;
                }
                let run = (column..columns).take_while(|&c| of(c) == Some(shade)).count();
                let corner = (panel.left() + column as f64 * w, panel.top() + row as f64 * h);
                // A hair of overlap hides the seams that viewers draw between neighbours.
                rects.push((corner.0, corner.1, run as f64 * w + 0.15, h + 0.15));
                column += run;
            }
        }
        canvas.rects(&rects, colour);
    }
    most
}

fn floor(canvas: &mut Canvas, panel: &Panel, input: &LevelAgainstWind, full: bool) {
    let (value, resolved) = match input.floor_db {
        Estimate::Value { value, low, high } | Estimate::Unresolved { value, low, high } => {
            let ends = [(panel.x.low, low, high), (panel.x.high, low, high)];
            panel.band(canvas, ends, FLOOR, 0.10);
            (value, matches!(input.floor_db, Estimate::Value { .. }))
        }
        Estimate::Above(bound) | Estimate::Below(bound) => (bound, false),
        Estimate::NotResolved => return,
    };
    if !panel.y.holds(value) {
        return;
    }
    let dash = if resolved { "7 4" } else { "2 4" };
    let stroke = Stroke::dashed(FLOOR, if full { 1.6 } else { 1.1 }, dash);
    panel.line(canvas, [(panel.x.low, value), (panel.x.high, value)], stroke);
    let y = panel.y.px(value);
    match input.floor_db {
        Estimate::Below(_) => arrow(canvas, Along::Up(panel.right() - 14.0), y, 1.0, FLOOR),
        Estimate::Above(_) => arrow(canvas, Along::Up(panel.right() - 14.0), y, -1.0, FLOOR),
        _ => {}
    }
}

/// Over everything else, under the floor line at its right end, where the levels are well above it.
fn floor_label(canvas: &mut Canvas, panel: &Panel, input: &LevelAgainstWind) {
    let value = match input.floor_db {
        Estimate::Value { value, .. } | Estimate::Unresolved { value, .. } => value,
        Estimate::Above(bound) | Estimate::Below(bound) => bound,
        Estimate::NotResolved => return,
    };
    if !panel.y.holds(value) {
        return;
    }
    let name = if input.floor_name.is_empty() { "floor" } else { &input.floor_name };
    let y = panel.y.px(value);
    let at = (panel.right() - 26.0, if y + 18.0 < panel.bottom() { y + 16.0 } else { y - 7.0 });
    let text = format!("{name} {}", input.floor_db.text("dB", 1));
    canvas.text(at, &text, Style::new(TEXT_SIZE, INK).at(Anchor::End).over_data());
}

fn onset(canvas: &mut Canvas, panel: &Panel, input: &LevelAgainstWind, full: bool) {
    let (top, bottom) = (panel.top(), panel.bottom());
    let hold = |value: f64| panel.x.px(value.max(1e-9)).clamp(panel.left(), panel.right());
    let name = if input.onset_name.is_empty() { "onset" } else { &input.onset_name };
    let width = if full { 1.8 } else { 1.3 };
    let at = match input.onset_m_s {
        Estimate::Value { value, low, high } | Estimate::Unresolved { value, low, high } => {
            let resolved = matches!(input.onset_m_s, Estimate::Value { .. });
            if low.is_finite() && high.is_finite() {
                canvas.rect((hold(low), top), (hold(high) - hold(low), bottom - top), ONSET, 0.13);
            }
            let stroke = if resolved { Stroke::solid(ONSET, width) } else { Stroke::dashed(ONSET, width, "3 3") };
            canvas.line((hold(value), top), (hold(value), bottom), stroke);
            hold(value)
        }
        Estimate::Above(bound) => {
            hatch(canvas, (hold(bound), top, panel.right(), bottom), ONSET);
            canvas.line((hold(bound), top), (hold(bound), bottom), Stroke::solid(ONSET, width));
            arrow(canvas, Along::Right(top + 10.0), hold(bound), 1.0, ONSET);
            hold(bound)
        }
        Estimate::Below(bound) => {
            hatch(canvas, (panel.left(), top, hold(bound), bottom), ONSET);
            canvas.line((hold(bound), top), (hold(bound), bottom), Stroke::solid(ONSET, width));
            arrow(canvas, Along::Right(top + 10.0), hold(bound), -1.0, ONSET);
            hold(bound)
        }
        Estimate::NotResolved => return,
    };
    if full {
        let text = format!("{name} {}", input.onset_m_s.text("m/s", 1));
        let style = Style::new(TEXT_SIZE, ONSET).bold().at(Anchor::Middle);
        let half = style.width(&text) / 2.0;
        let x = at.clamp(panel.left() + half, (panel.right() - half).max(panel.left() + half));
        canvas.text((x, top - 7.0), &text, style);
    }
}

/// Medians with quartile bars in bins of equal ratio, where at least ten points (five for few) lie.
fn medians(canvas: &mut Canvas, panel: &Panel, points: &[(f64, f64)], full: bool) {
    let count = if full { 22 } else { 10 };
    let least = if points.len() < FEW_POINTS { 5 } else { 10 };
    let mut bins: Vec<Vec<(f64, f64)>> = vec![Vec::new(); count];
    for &(wind, level) in points {
        let share = (panel.x.px(wind) - panel.left()) / panel.width();
        if (0.0..=1.0).contains(&share) {
            bins[((share * count as f64).floor() as usize).min(count - 1)].push((wind, level));
        }
    }
    for bin in bins.iter().filter(|bin| bin.len() >= least) {
        let sorted = |pick: fn(&(f64, f64)) -> f64| {
            let mut values: Vec<f64> = bin.iter().map(pick).collect();
            values.sort_by(f64::total_cmp);
            values
        };
        let (winds, levels) = (sorted(|p| p.0), sorted(|p| p.1));
        let wind = quantile_sorted(&winds, 0.5);
        let (q25, q75) = (quantile_sorted(&levels, 0.25), quantile_sorted(&levels, 0.75));
        panel.line(canvas, [(wind, q25), (wind, q75)], Stroke::solid(INK, if full { 1.3 } else { 0.9 }));
        let centre = panel.at(wind, quantile_sorted(&levels, 0.5));
        let (radius, edge) = if full { (2.8, 1.3) } else { (1.7, 1.0) };
        if panel.encloses(centre) {
            canvas.circle(centre, radius, PAPER, Stroke::solid(INK, edge));
        }
    }
}
