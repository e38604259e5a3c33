//! Rows of marks with intervals: what each choice does to the results, or the offset of each deployment.

use super::axis::{Axis, padded_range};
use super::colour::{HAIR, INK, MUTED, RULE, series};
use super::estimate::Estimate;
use super::figure::Figure;
use super::mark::{Along, Sample, Shape, estimate, keys};
use super::panel::{MARGIN, Panel, TEXT_SIZE, header, wrap};
use super::svg::{Canvas, Stroke, Style};

/// One quantity: a panel of the figure.
#[derive(Debug, Clone, PartialEq)]
pub struct IntervalColumn {
    /// Quantity and unit, such as `Floor (dB re 1 µPa²)`.
    pub label: String,
    /// The result as chosen: its interval is shaded down all rows. `NotResolved` shades nothing.
    pub base: Estimate,
}

/// One row.
#[derive(Debug, Clone, PartialEq)]
pub struct IntervalRow {
    /// The group, written once above its rows, such as `wind source`; empty for none.
    pub group: String,
    /// The row's label, such as `nearest node`.
    pub label: String,
    /// Whether this is the choice of the study (drawn as a diamond).
    pub chosen: bool,
    /// One for each column.
    pub values: Vec<Estimate>,
}

/// Rows of marks with intervals.
#[derive(Debug, Clone, PartialEq)]
pub struct IntervalRows {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// What a mark with its bar is called in the key, such as `value with interval`.
    pub mark_name: String,
    /// What the shaded interval is called in the key, such as `result of the study and its interval`.
    pub base_name: String,
    /// The quantities, side by side.
    pub columns: Vec<IntervalColumn>,
    /// The rows, from top to bottom; rows of one group follow each other.
    pub rows: Vec<IntervalRow>,
}

/// Draws one row for each choice (or deployment) and one panel for each quantity.
pub fn interval_rows(input: &IntervalRows) -> Figure {
    const WIDTH: f64 = 840.0;
    const ROW: f64 = 19.0;
    let mut canvas = Canvas::default();
    let head = header(&mut canvas, WIDTH, &input.title, &input.notes) + 8.0;
    if input.rows.is_empty() || input.columns.is_empty() {
        canvas.text((MARGIN, head + 14.0), "no data", Style::new(TEXT_SIZE, MUTED));
        return Figure::new(&input.title, WIDTH, head + 34.0, canvas);
    }
    let (group_style, row_style) = (Style::new(TEXT_SIZE, INK).bold(), Style::new(TEXT_SIZE, INK));
    let widths = input.rows.iter().flat_map(|r| [group_style.width(&r.group), 12.0 + row_style.width(&r.label)]);
    let room = widths.fold(0.0, f64::max).min(300.0);
    let pitch = (WIDTH - 2.0 * MARGIN - room - 12.0) / input.columns.len() as f64;
    let labels: Vec<Vec<String>> =
        input.columns.iter().map(|c| wrap(&c.label, TEXT_SIZE, super::font::Weight::Regular, pitch - 24.0)).collect();
    let label_rows = labels.iter().map(Vec::len).max().unwrap_or(1);
    let top = head + 16.0 * label_rows as f64 + 6.0;

    // Places of the rows, with a line for each new group.
    let mut y = top + 4.0;
    let mut places = Vec::new();
    let mut group = "";
    for row in &input.rows {
        if row.group != group {
            group = &row.group;
            y += if places.is_empty() { 14.0 } else { 20.0 };
            canvas.text((MARGIN, y + 3.0), group, group_style);
        }
        y += ROW;
        places.push(y);
        canvas.text((MARGIN + if row.group.is_empty() { 0.0 } else { 12.0 }, y + 4.0), &row.label, row_style);
    }
    let bottom = y + 14.0;
    for (i, column) in input.columns.iter().enumerate() {
        let left = MARGIN + room + 24.0 + i as f64 * pitch;
        let values = || input.rows.iter().filter_map(|r| r.values.get(i));
        let numbers: Vec<f64> = values().flat_map(Estimate::numbers).chain(column.base.numbers()).collect();
        let (low, high) = padded_range(numbers.iter().copied(), 0.0);
        // Room for the arrows of bounds.
        let arrows = values().filter_map(|value| match value {
            Estimate::Above(bound) => Some(bound + 0.14 * (high - low)),
            Estimate::Below(bound) => Some(bound - 0.14 * (high - low)),
            Estimate::NotResolved => Some(low - 0.08 * (high - low)),
            Estimate::Value { .. } | Estimate::Unresolved { .. } => None,
        });
        let (low, high) = padded_range(numbers.iter().copied().chain(arrows).collect::<Vec<_>>().into_iter(), 0.08);
        let panel = Panel {
            x: Axis::linear(low, high, left, left + pitch - 24.0),
            y: Axis::with_ticks(0.0, 1.0, bottom, top, Vec::new()),
        };
        panel.grid(&mut canvas);
        base(&mut canvas, &panel, &column.base);
        for (row, y) in input.rows.iter().zip(&places) {
            canvas.line((panel.left(), *y), (panel.right(), *y), Stroke::dashed(HAIR, 1.0, "1 3"));
            let look = if row.chosen { (Shape::Diamond, series(1)) } else { (Shape::Circle, series(0)) };
            if let Some(value) = row.values.get(i) {
                estimate(&mut canvas, &panel.x, Along::Right(*y), value, look);
            }
        }
        let foot = ((panel.left(), bottom), (panel.right(), bottom));
        canvas.line(foot.0, foot.1, Stroke::solid(RULE, 1.0));
        panel.axes(&mut canvas, true);
        for (k, line) in labels[i].iter().enumerate() {
            canvas.text((left, head + 16.0 * (k + label_rows - labels[i].len()) as f64 + 10.0), line, row_style);
        }
    }
    let bottom = keys(&mut canvas, bottom + 28.0, WIDTH - MARGIN, &key(input));
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

fn base(canvas: &mut Canvas, panel: &Panel, base: &Estimate) {
    let hold = |value: f64| panel.x.px(value).clamp(panel.left(), panel.right());
    match *base {
        Estimate::Value { value, low, high } | Estimate::Unresolved { value, low, high } => {
            if low.is_finite() && high.is_finite() {
                canvas.rect((hold(low), panel.top()), (hold(high) - hold(low), panel.height()), series(1), 0.12);
            }
            canvas.line((hold(value), panel.top()), (hold(value), panel.bottom()), Stroke::solid(series(1), 1.0));
        }
        Estimate::Above(bound) | Estimate::Below(bound) => {
            let stroke = Stroke::dashed(series(1), 1.0, "4 3");
            canvas.line((hold(bound), panel.top()), (hold(bound), panel.bottom()), stroke);
        }
        Estimate::NotResolved => {}
    }
}

fn key(input: &IntervalRows) -> Vec<(Sample, String)> {
    let mut entries = Vec::new();
    if input.rows.iter().any(|r| r.chosen) {
        entries.push((Sample::Mark(Shape::Diamond, series(1), true), "as chosen in the study".to_owned()));
    }
    if input.rows.iter().any(|r| !r.chosen) {
        entries.push((Sample::Mark(Shape::Circle, series(0), true), input.mark_name.clone()));
    }
    let all = || input.rows.iter().flat_map(|r| &r.values);
    if all().any(|e| matches!(e, Estimate::Above(_) | Estimate::Below(_))) {
        entries.push((Sample::Bound(INK), "bound".to_owned()));
    }
    if all().any(|e| matches!(e, Estimate::Unresolved { .. })) {
        entries.push((Sample::Mark(Shape::Circle, INK, false), "not resolved".to_owned()));
    }
    if all().any(|e| *e == Estimate::NotResolved) {
        entries.push((Sample::Cross(INK), "no value".to_owned()));
    }
    if input.columns.iter().any(|c| c.base != Estimate::NotResolved) && !input.base_name.is_empty() {
        entries.push((Sample::LineInBand(Stroke::solid(series(1), 1.0), series(1), 0.12), input.base_name.clone()));
    }
    entries
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    #[test]
    fn rows_of_every_outcome_are_drawn() {
        let row = |group: &str, label: &str, value| IntervalRow {
            group: group.to_owned(),
            label: label.to_owned(),
            chosen: label == "bilinear",
            values: vec![value, value],
        };
        let column = |label: &str, base| IntervalColumn { label: label.to_owned(), base };
        let mut input = IntervalRows {
            title: "Choices".to_owned(),
            notes: Vec::new(),
            mark_name: "value with interval".to_owned(),
            base_name: "result of the study".to_owned(),
            columns: vec![
                column(
                    "Floor of the band in decibels with a very long label (dB re 1 µPa²)",
                    Estimate::value(1.0, 0.0, 2.0),
                ),
                column("Onset (m/s)", Estimate::Above(12.0)),
            ],
            rows: vec![
                row("Interpolation", "bilinear", Estimate::value(1.0, 0.5, 1.5)),
                row("Interpolation", "nearest <node>", Estimate::Above(3.0)),
                row("Lag", "1 h", Estimate::NotResolved),
                row("Lag", "2 h", Estimate::Unresolved { value: 2.0, low: f64::NEG_INFINITY, high: 9.0 }),
            ],
        };
        let svg = assert_sound(&interval_rows(&input));
        assert!(svg.contains("nearest &lt;node&gt;") && svg.matches(">Interpolation<").count() == 1);
        input.rows[1].values.clear();
        assert_sound(&interval_rows(&input));
        input.rows.clear();
        assert!(assert_sound(&interval_rows(&input)).contains("no data"));
    }
}
