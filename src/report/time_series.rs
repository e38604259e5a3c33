//! Wind and levels over the record, with gaps left open and excluded periods shaded.

use super::axis::{Axis, Tick, padded_range};
use super::calendar::{self, DateTick, plain_date};
use super::colour::{INK, MUTED, SHADE, series};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::panel::{MARGIN, OVER_PANEL, Panel, TEXT_SIZE, UNDER_PANEL, header};
use super::statistics::thin;
use super::svg::{Anchor, Canvas, Stroke, Style};

/// One line of a panel.
#[derive(Debug, Clone, PartialEq)]
pub struct TimeLine {
    /// Name in the key.
    pub name: String,
    /// Instants, ms since 1970 UTC, in time order.
    pub time_ms: Vec<i64>,
    /// Values in step with the instants; NaN where missing.
    pub value: Vec<f64>,
    /// A step longer than this is a gap and is not bridged, ms.
    pub gap_ms: i64,
}

/// One panel of the stack.
#[derive(Debug, Clone, PartialEq)]
pub struct TimePanel {
    /// Quantity, unit and reference.
    pub label: String,
    /// Its lines.
    pub lines: Vec<TimeLine>,
}

/// A shaded period.
#[derive(Debug, Clone, PartialEq)]
pub struct ShadedPeriod {
    /// First instant, ms since 1970 UTC.
    pub start_ms: i64,
    /// First instant after it.
    pub end_ms: i64,
    /// Why, such as `service visit`.
    pub reason: String,
}

/// Panels over one time axis.
#[derive(Debug, Clone, PartialEq)]
pub struct TimeSeries {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// From top to bottom.
    pub panels: Vec<TimePanel>,
    /// Excluded periods, shaded in all panels; each reason gets a letter and a line in the key.
    pub shaded: Vec<ShadedPeriod>,
}

/// Draws the panels over one calendar axis. A long record is thinned to one column per pixel: the line is the median of
/// the column, the pale area behind it reaches from the lowest to the highest value.
pub fn time_series(input: &TimeSeries) -> Figure {
    const WIDTH: f64 = 960.0;
    const HEIGHT: f64 = 130.0;
    let mut canvas = Canvas::default();
    let mut top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let (start, end) = time_range(input);
    let reasons = reasons(input);
    let axes: Vec<Axis> = input
        .panels
        .iter()
        .enumerate()
        .map(|(i, panel)| {
            let panel_top = top + i as f64 * (HEIGHT + OVER_PANEL + 20.0);
            let values = panel.lines.iter().flat_map(|l| &l.value).copied();
            let (low, high) = padded_range(values, 0.06);
            Axis::linear(low, high, panel_top + HEIGHT, panel_top)
        })
        .collect();
    let left = MARGIN + 12.0 + axes.iter().map(Axis::label_width).fold(0.0, f64::max);
    let right = WIDTH - MARGIN - 6.0;
    let dates = calendar::ticks(start, end, right - left);
    let last = axes.len().saturating_sub(1);
    let mut colours = 0;
    for (i, (y, content)) in axes.into_iter().zip(&input.panels).enumerate() {
        let panel = Panel { x: time_axis(start, end, left, right, &dates), y };
        shade(&mut canvas, &panel, input, &reasons, i == 0);
        panel.grid(&mut canvas);
        let first_colour = colours;
        for line in &content.lines {
            draw_line(&mut canvas, &panel, line, series(colours));
            colours += 1;
        }
        if !content.lines.iter().any(|l| l.value.iter().any(|v| v.is_finite())) {
            panel.no_data(&mut canvas, "no data");
        }
        panel.axes(&mut canvas, i == last);
        panel.y_title(&mut canvas, &content.label, MARGIN);
        name_lines(&mut canvas, &panel, content, first_colour);
        if i == last {
            panel.under_dates(&mut canvas, &dates);
            canvas.text(
                (right, panel.bottom() + UNDER_PANEL),
                "Time (UTC)",
                Style::new(TEXT_SIZE, INK).at(Anchor::End),
            );
        }
        top = panel.bottom() + UNDER_PANEL + 6.0;
    }
    if input.panels.is_empty() {
        canvas.text((MARGIN, top), "no data", Style::new(TEXT_SIZE, MUTED));
    }
    let mut entries: Vec<(Sample, String)> = reasons
        .iter()
        .enumerate()
        .map(|(i, reason)| (Sample::Area(SHADE, 1.0), format!("{}: {reason}", letter(i))))
        .collect();
    if input.panels.iter().flat_map(|p| &p.lines).any(|l| l.value.len() > 1500) {
        entries.push((Sample::Area("#c9ced2", 1.0), "lowest to highest value in a column; line: median".to_owned()));
    }
    let bottom = keys(&mut canvas, top + 2.0, WIDTH - MARGIN, &entries);
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

/// A linear axis in ms with calendar ticks.
pub(crate) fn time_axis(start_ms: i64, end_ms: i64, left: f64, right: f64, dates: &[DateTick]) -> Axis {
    let ticks = dates.iter().map(|d| Tick { value: d.ms as f64, label: d.label.clone() }).collect();
    Axis::with_ticks(start_ms as f64, end_ms as f64, left, right, ticks)
}

fn draw_line(canvas: &mut Canvas, panel: &Panel, line: &TimeLine, colour: &'static str) {
    let column_ms = (panel.x.high - panel.x.low) / panel.width();
    let runs = thin(&line.time_ms, &line.value, line.gap_ms, column_ms);
    let runs = runs.into_iter().filter(|run| run.iter().all(|p| panel.x.holds(p.ms)));
    let runs: Vec<_> = runs.collect();
    let mut singles = Vec::new();
    for run in &runs {
        if let [only] = run[..] {
            singles.push(panel.at(only.ms, only.middle));
            if only.high > only.low {
                panel.line(canvas, [(only.ms, only.low), (only.ms, only.high)], Stroke::solid(colour, 1.0));
            }
            continue;
        }
        if run.iter().any(|p| p.high > p.low) {
            panel.band(canvas, run.iter().map(|p| (p.ms, p.low, p.high)), colour, 0.25);
        }
        panel.line(canvas, run.iter().map(|p| (p.ms, p.middle)), Stroke::solid(colour, 1.1));
    }
    canvas.dots(&singles, 1.5, colour, 1.0);
}

/// Names of several lines, in their colours, at the right of the panel's title row.
fn name_lines(canvas: &mut Canvas, panel: &Panel, content: &TimePanel, first_colour: usize) {
    let style = Style::new(TEXT_SIZE, INK);
    let y = panel.top() - 9.0;
    let used = MARGIN + style.width(&content.label) + 24.0;
    let total: f64 = content.lines.iter().map(|l| style.width(&l.name) + 42.0).sum();
    let mut x = (panel.right() - total).max(used);
    for (i, line) in content.lines.iter().enumerate().filter(|(_, l)| !l.name.is_empty()) {
        canvas.line((x, y - 4.0), (x + 20.0, y - 4.0), Stroke::solid(series(first_colour + i), 2.4));
        canvas.text((x + 26.0, y), &line.name, style);
        x += style.width(&line.name) + 42.0;
    }
}

fn shade(canvas: &mut Canvas, panel: &Panel, input: &TimeSeries, reasons: &[&str], named: bool) {
    let mut free_from = f64::NEG_INFINITY;
    for period in &input.shaded {
        let (from, to) = (panel.x.px(period.start_ms as f64), panel.x.px(period.end_ms as f64));
        let (from, to) = (from.clamp(panel.left(), panel.right()), to.clamp(panel.left(), panel.right()));
        // A period of minutes in a year must still be seen.
        canvas.rect((from, panel.top()), ((to - from).max(1.0), panel.height()), SHADE, 1.0);
        let centre = f64::midpoint(from, to).clamp(panel.left() + 6.0, panel.right() - 6.0);
        if named && centre > free_from {
            let place = reasons.iter().position(|r| *r == period.reason).unwrap_or(0);
            let style = Style::new(10.0, MUTED).bold().at(Anchor::Middle);
            canvas.text((centre, panel.top() + 10.0), &letter(place), style);
            free_from = centre + 14.0;
        }
    }
}

fn reasons(input: &TimeSeries) -> Vec<&str> {
    let mut reasons: Vec<&str> = Vec::new();
    for period in &input.shaded {
        if !reasons.contains(&period.reason.as_str()) {
            reasons.push(&period.reason);
        }
    }
    reasons
}

/// A, B, ..., Z, A1, B1, ...
fn letter(index: usize) -> String {
    let c = char::from(b'A' + (index % 26) as u8);
    if index < 26 { c.to_string() } else { format!("{c}{}", index / 26) }
}

fn time_range(input: &TimeSeries) -> (i64, i64) {
    let lines = input.panels.iter().flat_map(|p| &p.lines);
    let ends = lines.flat_map(|l| l.time_ms.first().into_iter().chain(l.time_ms.last()).copied());
    let periods = input.shaded.iter().flat_map(|p| [p.start_ms, p.end_ms]);
    let range = |times: &mut dyn Iterator<Item = i64>| {
        let usual = times.filter(|t| calendar::is_usual(*t));
        usual.fold(None, |range: Option<(i64, i64)>, t| Some(range.map_or((t, t), |(a, b)| (a.min(t), b.max(t)))))
    };
    let found = range(&mut { ends }).or_else(|| range(&mut { periods }));
    match found {
        Some((start, end)) if start < end => (start, end),
        // One instant alone stands in the middle of an hour.
        Some((start, _)) => (start - 1_800_000, start + 1_800_000),
        None => (0, 86_400_000),
    }
}

/// The record's first and last day in words, for titles: `3 May 2021 to 9 Sep 2021`.
pub fn date_span(start_ms: i64, end_ms: i64) -> String {
    let short = end_ms.saturating_sub(start_ms) < 3 * 86_400_000;
    format!("{} to {}", plain_date(start_ms, short), plain_date(end_ms, short))
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    const HOUR_MS: i64 = 3_600_000;

    fn line(hours: i64) -> TimeLine {
        TimeLine {
            name: "125 Hz".to_owned(),
            time_ms: (0..hours).map(|h| 1_600_000_000_000 + h * HOUR_MS).collect(),
            value: (0..hours).map(|h| 70.0 + (h * 37 % 101) as f64 / 10.0).collect(),
            gap_ms: 2 * HOUR_MS,
        }
    }

    fn series_of(line: TimeLine) -> TimeSeries {
        let shaded = vec![ShadedPeriod {
            start_ms: 1_600_000_000_000 - 5 * HOUR_MS,
            end_ms: 1_600_000_000_000 + 5 * HOUR_MS,
            reason: "service <visit>".to_owned(),
        }];
        let panel = TimePanel { label: "Level (dB re 1 µPa²)".to_owned(), lines: vec![line] };
        TimeSeries { title: "Record".to_owned(), notes: Vec::new(), panels: vec![panel.clone(), panel], shaded }
    }

    #[test]
    fn records_of_any_length_are_drawn_small() {
        for hours in [0, 1, 2, 48, 24 * 120, 24 * 365 * 20] {
            let svg = assert_sound(&time_series(&series_of(line(hours))));
            assert!(svg.contains("A: service &lt;visit&gt;"));
            assert_eq!(svg.contains(">no data<"), hours == 0);
        }
    }

    #[test]
    fn a_gap_stays_open() {
        // 100 hours, then 100 hours of nothing, then 100 hours: two lines in each of the two panels.
        let mut gap = line(200);
        for ms in &mut gap.time_ms[100..] {
            *ms += 100 * HOUR_MS;
        }
        let count = |line: TimeLine| {
            let svg = assert_sound(&time_series(&series_of(line)));
            svg.matches("stroke-linejoin").count()
        };
        assert_eq!(count(line(200)), 2);
        assert_eq!(count(gap), 4);
        let mut missing = line(200);
        missing.value[50] = f64::NAN;
        assert_eq!(count(missing), 4);
    }

    #[test]
    fn impossible_times_are_left_out() {
        let mut odd = line(3);
        odd.time_ms = vec![i64::MIN, 0, i64::MAX];
        assert_sound(&time_series(&series_of(odd)));
        let none = TimeSeries { title: "x".to_owned(), notes: vec![], panels: vec![], shaded: vec![] };
        assert!(assert_sound(&time_series(&none)).contains("no data"));
    }
}
