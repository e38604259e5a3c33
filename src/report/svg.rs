//! The drawing surface: a few shapes and text, written as SVG elements.
//!
//! Nothing here uses an `id`, a style sheet or a script, so that any number of drawings can stand in one page. A
//! shape with a coordinate that is not finite is left out: a NaN never reaches the file.

use std::fmt::Write as _;

use super::font::{self, FAMILY_LIST, Weight};

/// Pixels from the left and from the top.
pub(crate) type Point = (f64, f64);

/// A line's look.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Stroke {
    pub colour: &'static str,
    pub width: f64,
    /// Dash pattern as SVG writes it; empty for a solid line.
    pub dash: &'static str,
}

impl Stroke {
    pub(crate) const fn solid(colour: &'static str, width: f64) -> Self {
        Self { colour, width, dash: "" }
    }

    pub(crate) const fn dashed(colour: &'static str, width: f64, dash: &'static str) -> Self {
        Self { colour, width, dash }
    }
}

/// Where a text sits from its point.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Anchor {
    Start,
    Middle,
    End,
}

/// A text's look.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Style {
    pub size: f64,
    pub weight: Weight,
    pub colour: &'static str,
    pub anchor: Anchor,
    /// A white ground behind the letters, for text over data.
    pub ground: bool,
}

impl Style {
    pub(crate) const fn new(size: f64, colour: &'static str) -> Self {
        Self { size, weight: Weight::Regular, colour, anchor: Anchor::Start, ground: false }
    }

    pub(crate) const fn bold(mut self) -> Self {
        self.weight = Weight::Bold;
        self
    }

    pub(crate) const fn at(mut self, anchor: Anchor) -> Self {
        self.anchor = anchor;
        self
    }

    pub(crate) const fn over_data(mut self) -> Self {
        self.ground = true;
        self
    }

    /// Width of a text in this style, in pixels.
    pub(crate) fn width(&self, text: &str) -> f64 {
        font::width(text, self.size, self.weight)
    }
}

/// Collects elements in drawing order.
#[derive(Debug, Default)]
pub(crate) struct Canvas {
    body: String,
}

impl Canvas {
    pub(crate) fn into_body(self) -> String {
        self.body
    }

    pub(crate) fn line(&mut self, from: (f64, f64), to: (f64, f64), stroke: Stroke) {
        if finite(&[from, to]) {
            let _ = write!(
                self.body,
                "<line x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\"{}/>",
                N(from.0),
                N(from.1),
                N(to.0),
                N(to.1),
                stroke_attributes(stroke)
            );
            self.body.push('\n');
        }
    }

    /// An open line through points; runs are broken at points that are not finite.
    pub(crate) fn polyline(&mut self, points: &[(f64, f64)], stroke: Stroke) {
        for run in points.split(|p| !finite(&[*p])).filter(|run| run.len() > 1) {
            let _ = writeln!(
                self.body,
                "<path d=\"{}\" fill=\"none\" stroke-linejoin=\"round\"{}/>",
                path_data(run),
                stroke_attributes(stroke)
            );
        }
    }

    /// A filled shape without outline.
    pub(crate) fn polygon(&mut self, points: &[(f64, f64)], fill: &str, opacity: f64) {
        if points.len() > 2 && finite(points) {
            let _ = writeln!(self.body, "<path d=\"{}Z\" fill=\"{fill}\"{}/>", path_data(points), Opacity(opacity));
        }
    }

    /// A closed shape with fill and outline.
    pub(crate) fn outlined(&mut self, points: &[(f64, f64)], fill: &str, stroke: Stroke) {
        if points.len() > 2 && finite(points) {
            let _ = writeln!(
                self.body,
                "<path d=\"{}Z\" fill=\"{fill}\"{}/>",
                path_data(points),
                stroke_attributes(stroke)
            );
        }
    }

    /// A filled rectangle: left, top, width, height.
    pub(crate) fn rect(&mut self, corner: (f64, f64), size: (f64, f64), fill: &str, opacity: f64) {
        if finite(&[corner, size]) && size.0 > 0.0 && size.1 > 0.0 {
            let _ = writeln!(
                self.body,
                "<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" fill=\"{fill}\"{}/>",
                N(corner.0),
                N(corner.1),
                N(size.0),
                N(size.1),
                Opacity(opacity)
            );
        }
    }

    /// Many rectangles of one fill as a single element: left, top, width, height each.
    pub(crate) fn rects(&mut self, rects: &[(f64, f64, f64, f64)], fill: &str) {
        let mut data = String::new();
        for &(x, y, w, h) in rects {
            if finite(&[(x, y), (w, h)]) {
                let _ = write!(data, "M{} {}h{}v{}h{}z", N(x), N(y), N(w), N(h), N(-w));
            }
        }
        if !data.is_empty() {
            let _ = writeln!(self.body, "<path d=\"{data}\" fill=\"{fill}\"/>");
        }
    }

    /// Many separate straight lines of one look as a single element.
    pub(crate) fn lines(&mut self, lines: &[(Point, Point)], stroke: Stroke) {
        let mut data = String::new();
        for &(from, to) in lines {
            if finite(&[from, to]) {
                let _ = write!(data, "M{} {}L{} {}", N(from.0), N(from.1), N(to.0), N(to.1));
            }
        }
        if !data.is_empty() {
            let _ = writeln!(self.body, "<path d=\"{data}\" fill=\"none\"{}/>", stroke_attributes(stroke));
        }
    }

    pub(crate) fn circle(&mut self, centre: (f64, f64), radius: f64, fill: &str, stroke: Stroke) {
        if finite(&[centre]) {
            let _ = writeln!(
                self.body,
                "<circle cx=\"{}\" cy=\"{}\" r=\"{}\" fill=\"{fill}\"{}/>",
                N(centre.0),
                N(centre.1),
                N(radius),
                stroke_attributes(stroke)
            );
        }
    }

    /// Many filled dots of one look as a single element.
    pub(crate) fn dots(&mut self, centres: &[(f64, f64)], radius: f64, fill: &str, opacity: f64) {
        let mut data = String::new();
        for &(x, y) in centres {
            if finite(&[(x, y)]) {
                let _ = write!(data, "M{} {}h0", N(x), N(y));
            }
        }
        if !data.is_empty() {
            let _ = writeln!(
                self.body,
                "<path d=\"{data}\" fill=\"none\" stroke=\"{fill}\" stroke-width=\"{}\" stroke-linecap=\"round\"{}/>",
                N(2.0 * radius),
                StrokeOpacity(opacity)
            );
        }
    }

    /// Text on its baseline.
    pub(crate) fn text(&mut self, at: (f64, f64), text: &str, style: Style) {
        if !finite(&[at]) || text.is_empty() {
            return;
        }
        let anchor = match style.anchor {
            Anchor::Start => "",
            Anchor::Middle => " text-anchor=\"middle\"",
            Anchor::End => " text-anchor=\"end\"",
        };
        let weight = if style.weight == Weight::Bold { " font-weight=\"700\"" } else { "" };
        let (x, y) = (N(at.0), N(at.1));
        let escaped = escape(text);
        let size = N(style.size);
        if style.ground {
            let width = style.width(text);
            let left = match style.anchor {
                Anchor::Start => at.0,
                Anchor::Middle => at.0 - width / 2.0,
                Anchor::End => at.0 - width,
            };
            let box_size = (width + 6.0, style.size * 1.3);
            self.rect((left - 3.0, at.1 - style.size * 0.98), box_size, "#ffffff", 0.82);
        }
        let _ = writeln!(
            self.body,
            "<text x=\"{x}\" y=\"{y}\" font-size=\"{size}\" fill=\"{}\"{weight}{anchor}>{escaped}</text>",
            style.colour
        );
    }
}

/// The opening of the root element; `extra` holds further attributes.
pub(crate) fn root(width: f64, height: f64, extra: &str) -> String {
    format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{w}\" height=\"{h}\" viewBox=\"0 0 {w} {h}\" font-family=\"{FAMILY_LIST}\"{extra}>",
        w = N(width),
        h = N(height)
    )
}

/// Escapes text for SVG and HTML, in content and in quoted attributes; characters that XML 1.0 forbids become U+FFFD.
pub(crate) fn escape(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            '\'' => escaped.push_str("&#39;"),
            '\t' | '\n' | '\r' => escaped.push(c),
            c if c.is_control() || matches!(c, '\u{fffe}' | '\u{ffff}') => escaped.push('\u{fffd}'),
            c => escaped.push(c),
        }
    }
    escaped
}

fn finite(points: &[(f64, f64)]) -> bool {
    points.iter().all(|p| p.0.is_finite() && p.1.is_finite())
}

fn path_data(points: &[(f64, f64)]) -> String {
    let mut data = String::new();
    for (i, p) in points.iter().enumerate() {
        let _ = write!(data, "{}{} {}", if i == 0 { "M" } else { "L" }, N(p.0), N(p.1));
    }
    data
}

fn stroke_attributes(stroke: Stroke) -> String {
    if stroke.width <= 0.0 {
        return String::new();
    }
    let mut text = format!(" stroke=\"{}\" stroke-width=\"{}\"", stroke.colour, N(stroke.width));
    if !stroke.dash.is_empty() {
        let _ = write!(text, " stroke-dasharray=\"{}\"", stroke.dash);
    }
    text
}

/// A coordinate or width with at most one decimal (a tenth of a pixel) and no negative zero.
struct N(f64);

impl std::fmt::Display for N {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let text = format!("{:.1}", self.0);
        let text = text.strip_suffix(".0").unwrap_or(&text);
        f.write_str(if text == "-0" { "0" } else { text })
    }
}

struct Opacity(f64);

impl std::fmt::Display for Opacity {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.0 < 1.0 { write!(f, " fill-opacity=\"{:.2}\"", self.0) } else { Ok(()) }
    }
}

struct StrokeOpacity(f64);

impl std::fmt::Display for StrokeOpacity {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.0 < 1.0 { write!(f, " stroke-opacity=\"{:.2}\"", self.0) } else { Ok(()) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_not_finite_is_left_out() {
        let mut canvas = Canvas::default();
        let stroke = Stroke::solid("#000000", 1.0);
        canvas.line((f64::NAN, 0.0), (1.0, 1.0), stroke);
        canvas.rect((0.0, 0.0), (f64::INFINITY, 1.0), "#000000", 1.0);
        canvas.circle((0.0, f64::NAN), 1.0, "#000000", stroke);
        canvas.text((f64::NAN, 0.0), "x", Style::new(10.0, "#000000"));
        canvas.polygon(&[(0.0, 0.0), (1.0, f64::NAN), (1.0, 1.0)], "#000000", 1.0);
        assert_eq!(canvas.into_body(), "");

        let mut canvas = Canvas::default();
        canvas.polyline(&[(0.0, 0.0), (1.0, 0.0), (f64::NAN, 0.0), (3.0, 0.0), (4.0, -0.001)], stroke);
        let body = canvas.into_body();
        assert!(body.contains("M0 0L1 0\"") && body.contains("M3 0L4 0\""), "{body}");
    }

    #[test]
    fn text_is_escaped() {
        assert_eq!(escape("a<b> & \"c\" 'd' \u{1}"), "a&lt;b&gt; &amp; &quot;c&quot; &#39;d&#39; \u{fffd}");
    }
}
