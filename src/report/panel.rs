//! One pair of axes with its frame, and what is drawn inside it, clipped to it.

use super::axis::{Axis, TICK_SIZE};
use super::calendar::DateTick;
use super::colour::{HAIR, INK, MUTED, RULE};
use super::font::{self, Weight};
use super::svg::{Anchor, Canvas, Point, Stroke, Style};

/// Left edge of titles and keys, pixels.
pub(crate) const MARGIN: f64 = 16.0;
/// Size of axis titles and keys.
pub(crate) const TEXT_SIZE: f64 = 12.0;
/// Room for tick labels and title under a panel.
pub(crate) const UNDER_PANEL: f64 = 44.0;
/// Room for the title above a panel.
pub(crate) const OVER_PANEL: f64 = 22.0;

/// A plot area with two axes. The vertical axis runs upwards.
#[derive(Debug, Clone)]
pub(crate) struct Panel {
    pub x: Axis,
    pub y: Axis,
}

impl Panel {
    pub(crate) fn left(&self) -> f64 {
        self.x.from
    }

    pub(crate) fn right(&self) -> f64 {
        self.x.to
    }

    pub(crate) fn top(&self) -> f64 {
        self.y.to
    }

    pub(crate) fn bottom(&self) -> f64 {
        self.y.from
    }

    pub(crate) fn width(&self) -> f64 {
        self.right() - self.left()
    }

    pub(crate) fn height(&self) -> f64 {
        self.bottom() - self.top()
    }

    pub(crate) fn at(&self, x: f64, y: f64) -> (f64, f64) {
        (self.x.px(x), self.y.px(y))
    }

    /// Whether a pixel lies inside the frame, or within two pixels of it.
    pub(crate) fn encloses(&self, pixel: Point) -> bool {
        pixel.0 >= self.left() - 2.0
            && pixel.0 <= self.right() + 2.0
            && pixel.1 >= self.top() - 2.0
            && pixel.1 <= self.bottom() + 2.0
    }

    /// Hair lines at the labelled ticks, to be drawn before the data.
    pub(crate) fn grid(&self, canvas: &mut Canvas) {
        let hair = Stroke::solid(HAIR, 1.0);
        let upright = self.x.ticks.iter().map(|tick| self.x.px(tick.value));
        let mut lines: Vec<_> = upright.map(|x| ((x, self.top()), (x, self.bottom()))).collect();
        let level = self.y.ticks.iter().map(|tick| self.y.px(tick.value));
        lines.extend(level.map(|y| ((self.left(), y), (self.right(), y))));
        canvas.lines(&lines, hair);
    }

    /// Axis lines, ticks and numbers, to be drawn after the data; `x_numbers` off for all but the lowest of a stack.
    pub(crate) fn axes(&self, canvas: &mut Canvas, x_numbers: bool) {
        let rule = Stroke::solid(RULE, 1.0);
        let (left, bottom) = (self.left(), self.bottom());
        let mut lines = vec![((left, bottom), (self.right(), bottom)), ((left, self.top()), (left, bottom))];
        lines.extend(self.x.minor.iter().map(|v| self.x.px(*v)).map(|x| ((x, bottom), (x, bottom + 2.5))));
        lines.extend(self.x.ticks.iter().map(|t| self.x.px(t.value)).map(|x| ((x, bottom), (x, bottom + 5.0))));
        lines.extend(self.y.ticks.iter().map(|t| self.y.px(t.value)).map(|y| ((left - 5.0, y), (left, y))));
        canvas.lines(&lines, rule);
        let style = Style::new(TICK_SIZE, MUTED);
        for tick in &self.x.ticks {
            let x = self.x.px(tick.value);
            if x_numbers {
                canvas.text((x, bottom + 17.0), &tick.label, style.at(Anchor::Middle));
            }
        }
        for tick in &self.y.ticks {
            let y = self.y.px(tick.value);
            canvas.text((left - 8.0, y + 3.8), &tick.label, style.at(Anchor::End));
        }
    }

    /// The second row of calendar labels, under the numbers of the first.
    pub(crate) fn under_dates(&self, canvas: &mut Canvas, dates: &[DateTick]) {
        for date in dates {
            if let Some(under) = &date.under {
                let style = Style::new(TICK_SIZE, MUTED).bold().at(Anchor::Middle);
                // The last one may not leave the page.
                let x = self.x.px(date.ms as f64).min(self.right() + 18.0 - style.width(under) / 2.0);
                canvas.text((x, self.bottom() + 31.0), under, style);
            }
        }
    }

    /// The title of the vertical axis: horizontal, above the panel, so that nobody has to turn the head.
    pub(crate) fn y_title(&self, canvas: &mut Canvas, text: &str, from: f64) {
        canvas.text((from, self.top() - 9.0), text, Style::new(TEXT_SIZE, INK));
    }

    /// The title of the horizontal axis.
    pub(crate) fn x_title(&self, canvas: &mut Canvas, text: &str) {
        let centre = f64::midpoint(self.left(), self.right());
        canvas.text((centre, self.bottom() + 36.0), text, Style::new(TEXT_SIZE, INK).at(Anchor::Middle));
    }

    /// A line through values (not pixels), broken where one is not finite, clipped to the panel.
    pub(crate) fn line(&self, canvas: &mut Canvas, points: impl IntoIterator<Item = (f64, f64)>, stroke: Stroke) {
        let pixels: Vec<(f64, f64)> = points.into_iter().map(|(x, y)| self.at(x, y)).collect();
        for run in pixels.split(|p| !p.0.is_finite() || !p.1.is_finite()) {
            for part in self.clip(run) {
                canvas.polyline(&part, stroke);
            }
        }
    }

    /// The area between low and high over x (values), held inside the panel, broken where one is not finite.
    pub(crate) fn band(
        &self,
        canvas: &mut Canvas,
        points: impl IntoIterator<Item = (f64, f64, f64)>,
        fill: &str,
        opacity: f64,
    ) {
        let hold = |y: f64| y.clamp(self.top(), self.bottom());
        let pixels: Vec<(f64, f64, f64)> =
            points.into_iter().map(|(x, low, high)| (self.x.px(x), self.y.px(low), self.y.px(high))).collect();
        for run in pixels.split(|p| !(p.0.is_finite() && p.1.is_finite() && p.2.is_finite())) {
            let inside = run.iter().filter(|p| p.0 >= self.left() - 0.5 && p.0 <= self.right() + 0.5);
            let mut outline: Vec<(f64, f64)> = inside.clone().map(|p| (p.0, hold(p.1))).collect();
            outline.extend(inside.rev().map(|p| (p.0, hold(p.2))));
            canvas.polygon(&outline, fill, opacity);
        }
    }

    /// Said in the middle of an empty panel.
    pub(crate) fn no_data(&self, canvas: &mut Canvas, why: &str) {
        let centre = (f64::midpoint(self.left(), self.right()), f64::midpoint(self.top(), self.bottom()) + 4.0);
        canvas.text(centre, why, Style::new(TEXT_SIZE, MUTED).at(Anchor::Middle).over_data());
    }

    /// The parts of a pixel line inside the panel (Liang and Barsky's parametric clip of each segment).
    fn clip(&self, run: &[(f64, f64)]) -> Vec<Vec<(f64, f64)>> {
        let mut parts: Vec<Vec<(f64, f64)>> = Vec::new();
        let mut open = false;
        for pair in run.windows(2) {
            let Some((from, to, ends_inside)) = self.clip_segment(pair[0], pair[1]) else {
                open = false;
                continue;
            };
            match parts.last_mut() {
                Some(part) if open => part.push(to),
                _ => parts.push(vec![from, to]),
            }
            open = ends_inside;
        }
        parts
    }

    fn clip_segment(&self, a: Point, b: Point) -> Option<(Point, Point, bool)> {
        let (dx, dy) = (b.0 - a.0, b.1 - a.1);
        let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
        for (step, room) in
            [(-dx, a.0 - self.left()), (dx, self.right() - a.0), (-dy, a.1 - self.top()), (dy, self.bottom() - a.1)]
        {
            if step.abs() < 1e-12 {
                if room < 0.0 {
                    return None;
                }
            } else if step < 0.0 {
                enter = enter.max(room / step);
            } else {
                leave = leave.min(room / step);
            }
        }
        let point = |t: f64| (a.0 + t * dx, a.1 + t * dy);
        (enter <= leave).then(|| (point(enter), point(leave), leave >= 1.0))
    }
}

/// Breaks a text into lines no wider than this; a word that is too long alone stays whole.
pub(crate) fn wrap(text: &str, size: f64, weight: Weight, width_px: f64) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for word in text.split([' ', '\n', '\t']).filter(|w| !w.is_empty()) {
        match lines.last_mut() {
            Some(line) if font::width(&format!("{line} {word}"), size, weight) <= width_px => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines
}

/// The figure's title and its lines of text; gives the y below them.
pub(crate) fn header(canvas: &mut Canvas, width_px: f64, title: &str, lines: &[String]) -> f64 {
    const TITLE_SIZE: f64 = 15.0;
    let room = width_px - 2.0 * MARGIN;
    let mut y = 10.0;
    for line in wrap(title, TITLE_SIZE, Weight::Bold, room) {
        y += 18.0;
        canvas.text((MARGIN, y), &line, Style::new(TITLE_SIZE, INK).bold());
    }
    for line in lines.iter().flat_map(|line| wrap(line, TEXT_SIZE, Weight::Regular, room)) {
        y += 17.0;
        canvas.text((MARGIN, y), &line, Style::new(TEXT_SIZE, MUTED));
    }
    y + 14.0
}

#[cfg(test)]
mod tests {
    use super::super::axis::Labels;
    use super::*;

    fn panel() -> Panel {
        Panel { x: Axis::log(1.0, 100.0, 100.0, 300.0, Labels::Plain), y: Axis::linear(0.0, 10.0, 200.0, 100.0) }
    }

    #[test]
    fn lines_are_cut_at_the_frame() {
        let mut canvas = Canvas::default();
        // Leaves at the top, comes back: two parts.
        panel().line(&mut canvas, [(1.0, 5.0), (10.0, 15.0), (100.0, 5.0)], Stroke::solid(INK, 1.0));
        let body = canvas.into_body();
        assert_eq!(body.matches("<path").count(), 2, "{body}");
        assert!(body.contains("M100 150L150 100\"") && body.contains("M250 100L300 150\""), "{body}");
    }

    #[test]
    fn a_missing_or_impossible_value_breaks_the_line() {
        let mut canvas = Canvas::default();
        let values = [(1.0, 1.0), (2.0, 2.0), (f64::NAN, 3.0), (0.0, 3.0), (-1.0, 3.0), (4.0, 4.0), (5.0, 5.0)];
        panel().line(&mut canvas, values, Stroke::solid(INK, 1.0));
        assert_eq!(canvas.into_body().matches("<path").count(), 2);
    }

    #[test]
    fn text_wraps_at_the_width() {
        let lines = wrap("one two three four", 12.0, Weight::Regular, 60.0);
        assert!(lines.len() > 1 && lines.iter().all(|l| font::width(l, 12.0, Weight::Regular) <= 60.0));
        assert_eq!(wrap("", 12.0, Weight::Regular, 60.0), Vec::<String>::new());
        assert_eq!(wrap("incomprehensibilities", 12.0, Weight::Regular, 10.0).len(), 1);
    }
}
