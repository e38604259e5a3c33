//! Marks for estimates, and the key that explains the marks.

use super::colour::{INK, MUTED, PAPER, RAMP, RULE};
use super::estimate::Estimate;
use super::number;
use super::panel::{MARGIN, TEXT_SIZE};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// The shape of a mark; series differ in shape as well as in colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Shape {
    Circle,
    Square,
    Diamond,
    Triangle,
}

impl Shape {
    /// The shape of a series by its place.
    pub(crate) fn of(index: usize) -> Self {
        [Self::Circle, Self::Square, Self::Diamond, Self::Triangle][index % 4]
    }

    /// Draws it: filled, or open with a white inside.
    pub(crate) fn draw(self, canvas: &mut Canvas, (x, y): (f64, f64), size: f64, colour: &'static str, filled: bool) {
        let fill = if filled { colour } else { PAPER };
        let stroke = Stroke::solid(colour, 1.5);
        match self {
            Self::Circle => canvas.circle((x, y), size, fill, stroke),
            Self::Square => {
                let s = 0.88 * size;
                canvas.outlined(&[(x - s, y - s), (x + s, y - s), (x + s, y + s), (x - s, y + s)], fill, stroke);
            }
            Self::Diamond => {
                let s = 1.28 * size;
                canvas.outlined(&[(x, y - s), (x + s, y), (x, y + s), (x - s, y)], fill, stroke);
            }
            Self::Triangle => {
                let s = 1.15 * size;
                canvas.outlined(&[(x, y - s), (x + s, y + 0.8 * s), (x - s, y + 0.8 * s)], fill, stroke);
            }
        }
    }
}

/// Along which way an estimate is drawn, and the pixel of the other coordinate.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Along {
    /// Values run upwards at this x.
    Up(f64),
    /// Values run to the right at this y.
    Right(f64),
}

impl Along {
    fn point(self, value_px: f64, aside: f64) -> (f64, f64) {
        match self {
            Self::Up(x) => (x + aside, value_px),
            Self::Right(y) => (value_px, y + aside),
        }
    }

    /// Pixel step of growing values.
    fn growing(self) -> f64 {
        match self {
            Self::Up(_) => -1.0,
            Self::Right(_) => 1.0,
        }
    }
}

/// Draws an estimate on an axis: a filled mark with its interval; open and dashed when not resolved; an arrow from the
/// bound towards where the value must lie; a cross at the low end of the axis when nothing is known.
pub(crate) fn estimate(
    canvas: &mut Canvas,
    axis: &super::axis::Axis,
    along: Along,
    what: &Estimate,
    (shape, colour): (Shape, &'static str),
) {
    const SIZE: f64 = 3.6;
    let (least, most) = (axis.from.min(axis.to), axis.from.max(axis.to));
    let hold = |px: f64| px.clamp(least, most);
    match *what {
        Estimate::Value { value, low, high } | Estimate::Unresolved { value, low, high } => {
            let resolved = matches!(what, Estimate::Value { .. });
            if low.is_finite() && high.is_finite() {
                let stroke = if resolved { Stroke::solid(colour, 1.5) } else { Stroke::dashed(colour, 1.2, "3 2") };
                let (from, to) = (axis.px(low), axis.px(high));
                if from.is_finite() && to.is_finite() {
                    canvas.line(along.point(hold(from), 0.0), along.point(hold(to), 0.0), stroke);
                }
            }
            let at = axis.px(value);
            if at.is_finite() && at >= least - 0.5 && at <= most + 0.5 {
                shape.draw(canvas, along.point(at, 0.0), SIZE, colour, resolved);
            }
        }
        Estimate::Above(bound) => arrow(canvas, along, hold(axis.px(bound)), along.growing(), colour),
        Estimate::Below(bound) => arrow(canvas, along, hold(axis.px(bound)), -along.growing(), colour),
        Estimate::NotResolved => {
            let at = axis.from + along.growing() * 7.0;
            let stroke = Stroke::solid(colour, 1.3);
            for (p, q) in [(-3.0, 3.0), (3.0, -3.0)] {
                canvas.line(along.point(at - 3.0, p), along.point(at + 3.0, q), stroke);
            }
        }
    }
}

/// A bound: a bar across at the bound and an arrow from it.
pub(crate) fn arrow(canvas: &mut Canvas, along: Along, at: f64, step: f64, colour: &'static str) {
    const LENGTH: f64 = 18.0;
    let stroke = Stroke::solid(colour, 1.5);
    let tip = at + step * LENGTH;
    canvas.line(along.point(at, -4.5), along.point(at, 4.5), stroke);
    canvas.line(along.point(at, 0.0), along.point(tip - step * 4.0, 0.0), stroke);
    canvas.outlined(
        &[along.point(tip, 0.0), along.point(tip - step * 6.0, -3.2), along.point(tip - step * 6.0, 3.2)],
        colour,
        Stroke::solid(colour, 0.0),
    );
}

/// Slanted lines over a region where a value must lie: left, top, right, bottom.
pub(crate) fn hatch(canvas: &mut Canvas, (left, top, right, bottom): (f64, f64, f64, f64), colour: &'static str) {
    const STEP: f64 = 9.0;
    if !(left.is_finite() && right.is_finite() && right > left && bottom > top) {
        return;
    }
    let height = bottom - top;
    let count = ((right - left + height) / STEP).ceil() as usize;
    let mut lines = Vec::new();
    for i in 1..count.min(400) {
        // A line that rises to the right, from the left or lower edge to the upper or right edge.
        let c = i as f64 * STEP;
        let start = if c <= height { (left, top + c) } else { (left + c - height, bottom) };
        let end = if c <= right - left { (left + c, top) } else { (right, top + c - (right - left)) };
        lines.push((start, end));
    }
    canvas.lines(&lines, Stroke::solid(colour, 0.6));
}

/// A sample of what a figure draws.
#[derive(Debug, Clone)]
pub(crate) enum Sample {
    Line(Stroke),
    /// A line inside its interval band.
    LineInBand(Stroke, &'static str, f64),
    Area(&'static str, f64),
    Dot(&'static str, f64),
    Mark(Shape, &'static str, bool),
    /// A mark on a bar: median and quartiles.
    Quartiles,
    UprightBar(&'static str),
    Bound(&'static str),
    Cross(&'static str),
    Hatch(&'static str),
    /// Cell shades from 1 to this count.
    Ramp(usize),
}

/// Draws the key in rows from `top`; gives the y below it.
pub(crate) fn keys(canvas: &mut Canvas, top: f64, right: f64, entries: &[(Sample, String)]) -> f64 {
    const ROW: f64 = 19.0;
    let style = Style::new(TEXT_SIZE, INK);
    let (mut x, mut y) = (MARGIN, top + 12.0);
    for (sample, text) in entries {
        let length = sample_width(sample);
        let needed = length + 7.0 + style.width(text);
        if x > MARGIN && x + needed > right {
            x = MARGIN;
            y += ROW;
        }
        draw_sample(canvas, sample, (x, y - 4.0), length);
        canvas.text((x + length + 7.0, y), text, style);
        x += needed + 20.0;
    }
    if entries.is_empty() { top } else { y + 8.0 }
}

fn sample_width(sample: &Sample) -> f64 {
    match sample {
        Sample::Ramp(most) => {
            let style = Style::new(TEXT_SIZE, MUTED);
            style.width("1") + 8.0 * RAMP.len() as f64 + style.width(&number::count(*most)) + 10.0
        }
        Sample::Dot(..)
        | Sample::Mark(..)
        | Sample::Quartiles
        | Sample::UprightBar(_)
        | Sample::Bound(_)
        | Sample::Cross(_) => 12.0,
        _ => 26.0,
    }
}

fn draw_sample(canvas: &mut Canvas, sample: &Sample, (x, y): (f64, f64), length: f64) {
    let middle = x + length / 2.0;
    match *sample {
        Sample::Line(stroke) => canvas.line((x, y), (x + length, y), stroke),
        Sample::LineInBand(stroke, fill, opacity) => {
            canvas.rect((x, y - 5.5), (length, 11.0), fill, opacity);
            canvas.line((x, y), (x + length, y), stroke);
        }
        Sample::Area(PAPER, _) => {
            let (right, top, foot) = (x + length, y - 5.5, y + 5.5);
            canvas.outlined(&[(x, top), (right, top), (right, foot), (x, foot)], PAPER, Stroke::solid(RULE, 1.0));
        }
        Sample::Area(fill, opacity) => canvas.rect((x, y - 5.5), (length, 11.0), fill, opacity),
        Sample::Dot(fill, opacity) => canvas.dots(&[(middle, y)], 2.2, fill, opacity),
        Sample::Mark(shape, colour, filled) => shape.draw(canvas, (middle, y), 3.6, colour, filled),
        Sample::Quartiles => {
            canvas.line((middle, y - 7.0), (middle, y + 7.0), Stroke::solid(INK, 1.3));
            canvas.circle((middle, y), 2.8, PAPER, Stroke::solid(INK, 1.3));
        }
        Sample::UprightBar(colour) => {
            canvas.line((middle, y - 7.0), (middle, y + 7.0), Stroke::solid(colour, 1.5));
        }
        Sample::Bound(colour) => arrow(canvas, Along::Up(middle), y + 8.0, -1.0, colour),
        Sample::Cross(colour) => {
            let stroke = Stroke::solid(colour, 1.3);
            canvas.line((middle - 3.0, y - 3.0), (middle + 3.0, y + 3.0), stroke);
            canvas.line((middle - 3.0, y + 3.0), (middle + 3.0, y - 3.0), stroke);
        }
        Sample::Hatch(colour) => hatch(canvas, (x, y - 6.0, x + length, y + 6.0), colour),
        Sample::Ramp(most) => {
            let style = Style::new(TEXT_SIZE, MUTED);
            let start = x + style.width("1") + 5.0;
            canvas.text((x, y + 4.0), "1", style);
            for (i, colour) in RAMP.iter().enumerate() {
                canvas.rect((start + 8.0 * i as f64, y - 5.5), (8.0, 11.0), colour, 1.0);
            }
            let end = start + 8.0 * RAMP.len() as f64 + 5.0;
            canvas.text((end, y + 4.0), &number::count(most), style.at(Anchor::Start));
        }
    }
}
