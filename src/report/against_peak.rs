//! Anything against f / fp of the wind sea: overlap of the model with published laws, what the sound implies, lobes.

use super::axis::{Axis, Labels, padded_range};
use super::colour::{INK, MUTED, RAMP, RULE, SHADE, series};
use super::estimate::Estimate;
use super::figure::Figure;
use super::mark::{Along, Sample, Shape, estimate, keys};
use super::panel::{MARGIN, OVER_PANEL, Panel, UNDER_PANEL, header};
use super::statistics::quantile_sorted;
use super::svg::{Canvas, Stroke, Style};

/// Title of an axis of overlap.
pub const OVERLAP_LABEL: &str = "Overlap of opposing waves (dB re isotropic)";
/// Dashes of the published laws.
const DASHES: [&str; 4] = ["7 3", "2 3", "9 3 2 3", "4 2"];

/// A line, such as a published law.
#[derive(Debug, Clone, PartialEq)]
pub struct PeakCurve {
    /// Its name in the key.
    pub name: String,
    /// f / fp and value.
    pub points: Vec<(f64, f64)>,
}

/// Marks with intervals, such as what the sound implies.
#[derive(Debug, Clone, PartialEq)]
pub struct PeakSeries {
    /// Its name in the key.
    pub name: String,
    /// f / fp and what is known there.
    pub points: Vec<(f64, Estimate)>,
}

/// Values of many windows against f / fp.
#[derive(Debug, Clone, PartialEq)]
pub struct AgainstPeak {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Quantity and unit, such as [`OVERLAP_LABEL`].
    pub label: String,
    /// What the windows are, for the key: `model, by window`.
    pub windows_name: String,
    /// f / fp and value of each window; none for no cloud.
    pub windows: Vec<(f64, f64)>,
    /// Lines.
    pub curves: Vec<PeakCurve>,
    /// Marks.
    pub series: Vec<PeakSeries>,
    /// What an open mark means: `not identified`.
    pub open_name: String,
    /// Range of f / fp that sound can judge, shaded; `None` for none.
    pub judged: Option<(f64, f64)>,
    /// Ends of the value axis; `None` takes those of the data (1 to 99 % of the windows).
    pub range: Option<(f64, f64)>,
}

/// Draws windows as cells (darker where more), their medians and quartiles by f / fp, curves and marks.
pub fn against_peak(input: &AgainstPeak) -> Figure {
    const WIDTH: f64 = 720.0;
    const HEIGHT: f64 = 340.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let (low, high) = input.range.unwrap_or_else(|| value_range(input));
    let y = Axis::linear(low, high, top + HEIGHT, top);
    let left = MARGIN + y.label_width() + 12.0;
    let (first, last) = x_range(input);
    let panel = Panel { x: Axis::log(first, last, left, WIDTH - MARGIN - 8.0, Labels::Plain), y };
    if let Some((from, to)) = input.judged {
        let (from, to) = (panel.x.px(from.max(first)), panel.x.px(to.min(last)));
        canvas.rect((from, panel.top()), (to - from, panel.height()), SHADE, 0.55);
    }
    panel.grid(&mut canvas);
    let most = super::peak_cells::cells(&mut canvas, &panel, &input.windows);
    for (i, curve) in input.curves.iter().enumerate() {
        panel.line(&mut canvas, curve.points.iter().copied(), curve_stroke(i));
    }
    let quartiles = quartiles(input, first, last);
    for (x, [lower, median, upper]) in &quartiles {
        let (x, low, high) = (panel.x.px(*x), panel.y.px(*lower), panel.y.px(*upper));
        let hold = |y: f64| y.clamp(panel.top(), panel.bottom());
        canvas.line((x, hold(low)), (x, hold(high)), Stroke::solid(INK, 1.3));
        if panel.y.holds(*median) {
            canvas.circle((x, panel.y.px(*median)), 2.8, super::colour::PAPER, Stroke::solid(INK, 1.3));
        }
    }
    for (i, series_in) in input.series.iter().enumerate() {
        let aside = (i as f64 - (input.series.len() as f64 - 1.0) / 2.0) * 6.0;
        for (x, value) in &series_in.points {
            let at = panel.x.px(*x);
            if at.is_finite() && at >= panel.left() && at <= panel.right() {
                estimate(&mut canvas, &panel.y, Along::Up(at + aside), value, (Shape::of(i), series(i)));
            }
        }
    }
    if input.windows.is_empty() && input.series.iter().all(|s| s.points.is_empty()) {
        panel.no_data(&mut canvas, "no data");
    }
    panel.axes(&mut canvas, true);
    panel.y_title(&mut canvas, &input.label, MARGIN);
    panel.x_title(&mut canvas, "Frequency over that of the wind-sea peak");
    let entries = key(input, most, !quartiles.is_empty());
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &entries);
    if input.judged.is_some() {
        canvas.text(
            (MARGIN, bottom + 10.0),
            "Shaded: where published laws part enough for sound to judge.",
            Style::new(11.0, MUTED),
        );
        return Figure::new(&input.title, WIDTH, bottom + 22.0, canvas);
    }
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

fn curve_stroke(index: usize) -> Stroke {
    Stroke::dashed(if index.is_multiple_of(2) { RULE } else { MUTED }, 1.8, DASHES[index % DASHES.len()])
}

fn x_range(input: &AgainstPeak) -> (f64, f64) {
    let windows = input.windows.iter().map(|p| p.0);
    let marks = input.series.iter().flat_map(|s| &s.points).map(|p| p.0);
    let all = windows.chain(marks).filter(|x| x.is_finite() && *x > 0.0);
    let (low, high) = all.fold((f64::INFINITY, 0.0_f64), |(a, b), x| (a.min(x), b.max(x)));
    if low > high {
        return (0.5, 10.0);
    }
    ((low * 0.9).clamp(0.1, 1.0), (high * 1.1).clamp(4.0, 30.0))
}

fn value_range(input: &AgainstPeak) -> (f64, f64) {
    let mut windows: Vec<f64> = input.windows.iter().map(|p| p.1).filter(|v| v.is_finite()).collect();
    windows.sort_by(f64::total_cmp);
    let ends = if windows.is_empty() {
        Vec::new()
    } else {
        vec![quantile_sorted(&windows, 0.01), quantile_sorted(&windows, 0.99)]
    };
    let marks = input.series.iter().flat_map(|s| &s.points).flat_map(|p| p.1.numbers());
    padded_range(ends.into_iter().chain(marks).collect::<Vec<_>>().into_iter(), 0.06)
}

/// Medians and quartiles in twelve equal steps of the logarithm of f / fp, where ten windows or more lie.
fn quartiles(input: &AgainstPeak, first: f64, last: f64) -> Vec<(f64, [f64; 3])> {
    const STEPS: usize = 12;
    let width = libm::log(last / first) / STEPS as f64;
    let mut found = Vec::new();
    for step in 0..STEPS {
        let (from, to) = (first * libm::exp(step as f64 * width), first * libm::exp((step + 1) as f64 * width));
        let inside = input.windows.iter().filter(|p| p.0 >= from && p.0 < to).map(|p| p.1);
        let mut values: Vec<f64> = inside.filter(|v| v.is_finite()).collect();
        if values.len() >= 10 {
            values.sort_by(f64::total_cmp);
            found.push(((from * to).sqrt(), [0.25, 0.5, 0.75].map(|p| quantile_sorted(&values, p))));
        }
    }
    found
}

fn key(input: &AgainstPeak, most: usize, quartiles: bool) -> Vec<(Sample, String)> {
    let mut entries = Vec::new();
    if most > 0 {
        entries.push((Sample::Area(RAMP[5], 1.0), format!("{}: darker where more", input.windows_name)));
    }
    if quartiles {
        entries.push((Sample::Quartiles, "their median and quartiles".to_owned()));
    }
    for (i, series_in) in input.series.iter().enumerate() {
        entries.push((Sample::Mark(Shape::of(i), series(i), true), series_in.name.clone()));
    }
    for (i, curve) in input.curves.iter().enumerate() {
        entries.push((Sample::Line(curve_stroke(i)), curve.name.clone()));
    }
    if input.series.iter().flat_map(|s| &s.points).any(|p| matches!(p.1, Estimate::Unresolved { .. })) {
        entries.push((Sample::Mark(Shape::of(0), series(0), false), format!("open: {}", input.open_name)));
    }
    entries
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input(count: usize) -> AgainstPeak {
        AgainstPeak {
            title: "Overlap".to_owned(),
            notes: Vec::new(),
            label: OVERLAP_LABEL.to_owned(),
            windows_name: "model, by window".to_owned(),
            windows: (0..count)
                .map(|i| (0.8 + (i * 37 % 97) as f64 / 12.0, -30.0 + (i * 53 % 301) as f64 / 10.0))
                .collect(),
            curves: vec![PeakCurve { name: "a law".to_owned(), points: vec![(1.0, -40.0), (9.0, 0.0)] }],
            series: vec![PeakSeries {
                name: "implied by sound".to_owned(),
                points: vec![(1.7, Estimate::value(-12.0, -17.0, -7.0)), (5.0, Estimate::NotResolved)],
            }],
            open_name: "not identified".to_owned(),
            judged: Some((1.5, 3.0)),
            range: None,
        }
    }

    #[test]
    fn any_number_of_windows_is_drawn() {
        for count in [0, 1, 20, 5000] {
            let svg = assert_sound(&against_peak(&input(count)));
            assert!(svg.contains("implied by sound") && svg.contains("a law"));
        }
        let mut empty = input(0);
        empty.series.clear();
        assert!(assert_sound(&against_peak(&empty)).contains(">no data<"));
        let mut odd = input(30);
        odd.windows.extend([(f64::NAN, 1.0), (2.0, f64::NEG_INFINITY), (f64::INFINITY, 0.0), (-1.0, 3.0)]);
        odd.range = Some((-60.0, 6.0));
        assert_sound(&against_peak(&odd));
    }
}
