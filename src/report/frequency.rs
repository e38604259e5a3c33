//! Anything known per band, against frequency: slope, onset, floor spectrum.

use super::axis::{Axis, Labels, padded_range};
use super::colour::{INK, MUTED, RULE, series};
use super::estimate::Estimate;
use super::figure::Figure;
use super::mark::{Along, Sample, Shape, estimate, keys};
use super::panel::{MARGIN, OVER_PANEL, Panel, TEXT_SIZE, UNDER_PANEL, header};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// Title of a slope axis.
pub const SLOPE_LABEL: &str = "Slope (dB per decade of wind speed)";
/// Title of an onset axis.
pub const ONSET_LABEL: &str = "Saturation onset (m/s, wind at 10 m)";

/// One band's value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FrequencyPoint {
    /// Band centre, Hz.
    pub frequency_hz: f64,
    /// What is known there, in the unit of the panel.
    pub estimate: Estimate,
}

/// One line of marks, such as a site.
#[derive(Debug, Clone, PartialEq)]
pub struct FrequencySeries {
    /// Its name in the key.
    pub name: String,
    /// Its bands.
    pub points: Vec<FrequencyPoint>,
    /// Whether resolved neighbours are joined by a line, as for a spectrum.
    pub joined: bool,
}

/// One panel of the stack.
#[derive(Debug, Clone, PartialEq)]
pub struct FrequencyPanel {
    /// Quantity, unit and reference, such as [`SLOPE_LABEL`] or `Floor (dB re 1 µPa² Hz⁻¹)`.
    pub label: String,
    /// Its series; the same name has the same colour and mark in all panels of a figure.
    pub series: Vec<FrequencySeries>,
    /// Horizontal reference lines: value and name, such as the highest wind of the record.
    pub references: Vec<(f64, String)>,
}

/// Panels over one frequency axis.
#[derive(Debug, Clone, PartialEq)]
pub struct AgainstFrequency {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// From top to bottom.
    pub panels: Vec<FrequencyPanel>,
}

/// Draws the panels over one logarithmic frequency axis. Resolved values are filled marks with their intervals, bounds are
/// arrows, values that are not resolved are open, and bands where nothing is known are crosses at the foot.
pub fn against_frequency(input: &AgainstFrequency) -> Figure {
    const WIDTH: f64 = 720.0;
    let mut canvas = Canvas::default();
    let mut top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let height = if input.panels.len() < 2 { 320.0 } else { 210.0 };
    let (low, high) = frequency_range(input);
    let names = names(input);
    let axes: Vec<Axis> = (0..input.panels.len())
        .map(|i| {
            let panel_top = top + i as f64 * (height + OVER_PANEL + 20.0);
            let (low, high) = value_range(&input.panels[i]);
            Axis::linear(low, high, panel_top + height, panel_top)
        })
        .collect();
    let left = MARGIN + 12.0 + axes.iter().map(Axis::label_width).fold(0.0, f64::max);
    let last = axes.len().saturating_sub(1);
    for (i, (y, content)) in axes.into_iter().zip(&input.panels).enumerate() {
        let x = Axis::log(low, high, left, WIDTH - MARGIN - 8.0, Labels::Kilo);
        let panel = Panel { x, y };
        panel.grid(&mut canvas);
        for (value, name) in &content.references {
            panel.line(&mut canvas, [(low, *value), (high, *value)], Stroke::dashed(RULE, 1.2, "2 3"));
            if panel.y.holds(*value) {
                let at = (panel.right() - 4.0, panel.y.px(*value) - 4.0);
                canvas.text(at, name, Style::new(11.0, MUTED).at(Anchor::End).over_data());
            }
        }
        for series in &content.series {
            draw_series(&mut canvas, &panel, series, &names);
        }
        if content.series.iter().all(|s| s.points.is_empty()) {
            panel.no_data(&mut canvas, "no data");
        }
        panel.axes(&mut canvas, i == last);
        panel.y_title(&mut canvas, &content.label, MARGIN);
        if i == last {
            panel.x_title(&mut canvas, "Frequency (Hz)");
        }
        top = panel.bottom() + UNDER_PANEL + 4.0;
    }
    if input.panels.is_empty() {
        canvas.text((MARGIN, top), "no data", Style::new(TEXT_SIZE, MUTED));
    }
    let bottom = keys(&mut canvas, top, WIDTH - MARGIN, &key(input, &names));
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

fn draw_series(canvas: &mut Canvas, panel: &Panel, series_in: &FrequencySeries, names: &[&str]) {
    let index = names.iter().position(|n| *n == series_in.name).unwrap_or(0);
    let colour = series(index);
    // Marks of several series at one frequency stand side by side.
    let step = if names.len() < 4 { 5.0 } else { 3.5 };
    let aside = (index as f64 - (names.len() as f64 - 1.0) / 2.0) * step;
    let mut points: Vec<&FrequencyPoint> =
        series_in.points.iter().filter(|p| p.frequency_hz.is_finite() && p.frequency_hz > 0.0).collect();
    points.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
    if series_in.joined {
        let line: Vec<(f64, f64)> = points
            .iter()
            .map(|p| match p.estimate {
                Estimate::Value { value, .. } => (panel.x.px(p.frequency_hz) + aside, panel.y.px(value)),
                _ => (f64::NAN, f64::NAN),
            })
            .collect();
        canvas.polyline(&line, Stroke::solid(colour, 1.2));
    }
    for point in points {
        let along = Along::Up(panel.x.px(point.frequency_hz) + aside);
        estimate(canvas, &panel.y, along, &point.estimate, (Shape::of(index), colour));
    }
}

fn frequency_range(input: &AgainstFrequency) -> (f64, f64) {
    let all = input.panels.iter().flat_map(|p| &p.series).flat_map(|s| &s.points).map(|p| p.frequency_hz);
    let (low, high) =
        all.filter(|f| f.is_finite() && *f > 0.0).fold((f64::INFINITY, 0.0_f64), |(a, b), f| (a.min(f), b.max(f)));
    if low > high {
        return (10.0, 10_000.0);
    }
    // A tenth of a decade of room on both sides, and a decade for a single band.
    let room = if high < 2.0 * low { 3.0 } else { 1.26 };
    (low / room, high * room)
}

fn value_range(panel: &FrequencyPanel) -> (f64, f64) {
    let estimates = || panel.series.iter().flat_map(|s| &s.points).map(|p| p.estimate);
    let mut centres: Vec<f64> = Vec::new();
    let mut ends: Vec<f64> = Vec::new();
    for estimate in estimates() {
        match estimate {
            Estimate::Value { value, .. } | Estimate::Unresolved { value, .. } => centres.push(value),
            Estimate::Above(bound) | Estimate::Below(bound) => centres.push(bound),
            Estimate::NotResolved => {}
        }
        ends.extend(estimate.numbers());
    }
    // A few endless intervals must not flatten everything: the axis reaches at most twice the spread of the values beyond.
    let (low, high) = padded_range(centres.iter().copied(), 0.0);
    let reach = 2.0 * (high - low);
    let ends = ends.into_iter().map(|v| v.clamp(low - reach, high + reach));
    // Room for the arrows of bounds and for the crosses at the foot.
    let length = (high - low).max(1e-9);
    let arrows: Vec<f64> = estimates()
        .filter_map(|e| match e {
            Estimate::Above(bound) => Some(bound + 0.16 * length),
            Estimate::Below(bound) => Some(bound - 0.16 * length),
            Estimate::NotResolved => Some(low - 0.06 * length),
            Estimate::Value { .. } | Estimate::Unresolved { .. } => None,
        })
        .collect();
    let references = panel.references.iter().map(|r| r.0).filter(|v| *v >= low - reach && *v <= high + reach);
    padded_range(ends.chain(references).chain(arrows).collect::<Vec<_>>().into_iter(), 0.10)
}

fn names(input: &AgainstFrequency) -> Vec<&str> {
    let mut names: Vec<&str> = Vec::new();
    for series in input.panels.iter().flat_map(|p| &p.series) {
        if !names.contains(&series.name.as_str()) {
            names.push(&series.name);
        }
    }
    names
}

fn key(input: &AgainstFrequency, names: &[&str]) -> Vec<(Sample, String)> {
    let mut entries: Vec<(Sample, String)> = Vec::new();
    for (i, name) in names.iter().enumerate() {
        entries.push((Sample::Mark(Shape::of(i), series(i), true), (*name).to_owned()));
    }
    let all = || input.panels.iter().flat_map(|p| &p.series).flat_map(|s| &s.points).map(|p| p.estimate);
    if all().any(|e| matches!(e, Estimate::Value { low, high, .. } if low.is_finite() && high.is_finite())) {
        entries.push((Sample::UprightBar(INK), "interval".to_owned()));
    }
    if all().any(|e| matches!(e, Estimate::Above(_) | Estimate::Below(_))) {
        entries.push((Sample::Bound(INK), "bound: the value lies beyond".to_owned()));
    }
    if all().any(|e| matches!(e, Estimate::Unresolved { .. })) {
        entries.push((Sample::Mark(Shape::Circle, INK, false), "open: not resolved".to_owned()));
    }
    if all().any(|e| e == Estimate::NotResolved) {
        entries.push((Sample::Cross(INK), "no value".to_owned()));
    }
    entries
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input(estimates: &[Estimate]) -> AgainstFrequency {
        let points = estimates
            .iter()
            .enumerate()
            .map(|(i, e)| FrequencyPoint { frequency_hz: libm::pow(10.0, 1.0 + i as f64 / 10.0), estimate: *e })
            .collect();
        let series = FrequencySeries { name: "a & b".to_owned(), points, joined: true };
        AgainstFrequency {
            title: "Onset".to_owned(),
            notes: Vec::new(),
            panels: vec![FrequencyPanel {
                label: ONSET_LABEL.to_owned(),
                series: vec![series],
                references: vec![(15.0, "highest wind".to_owned())],
            }],
        }
    }

    #[test]
    fn all_outcomes_are_drawn_and_explained() {
        let all = [
            Estimate::value(10.0, 9.0, 11.0),
            Estimate::Unresolved { value: 8.0, low: -1e9, high: f64::INFINITY },
            Estimate::Above(12.0),
            Estimate::Below(4.0),
            Estimate::NotResolved,
            Estimate::value(9.0, f64::NAN, f64::NAN),
        ];
        let svg = assert_sound(&against_frequency(&input(&all)));
        for text in ["a &amp; b", "interval", "bound: the value lies beyond", "open: not resolved", "no value"] {
            assert!(svg.contains(text), "{text}");
        }
        // Only what is drawn is explained.
        assert!(!assert_sound(&against_frequency(&input(&all[..1]))).contains("not resolved"));
    }

    #[test]
    fn nothing_and_one_band_are_drawn() {
        assert!(assert_sound(&against_frequency(&input(&[]))).contains("no data"));
        assert_sound(&against_frequency(&input(&[Estimate::NotResolved])));
        assert_sound(&against_frequency(&input(&[Estimate::point(5.0)])));
        let none = AgainstFrequency { title: "x".to_owned(), notes: Vec::new(), panels: Vec::new() };
        assert!(assert_sound(&against_frequency(&none)).contains("no data"));
    }
}
