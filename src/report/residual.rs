//! What the fit leaves over: against time, and by classes such as hour, month and wind direction.

use super::axis::{Axis, padded_range};
use super::calendar;
use super::colour::{CURVE, INK, MUTED, RAMP, RULE, series};
use super::estimate::Estimate;
use super::figure::Figure;
use super::mark::{Along, Sample, Shape, estimate, keys};
use super::number;
use super::panel::{MARGIN, OVER_PANEL, Panel, TEXT_SIZE, UNDER_PANEL, header};
use super::statistics::{quantile_sorted, shade_of};
use super::svg::{Anchor, Canvas, Stroke, Style};
use super::time_series::time_axis;

const DAY_MS: f64 = 86_400_000.0;

/// The residual of one class.
#[derive(Debug, Clone, PartialEq)]
pub struct ResidualClass {
    /// Its label, such as `00`, `Jan`, `NE`.
    pub label: String,
    /// Windows in it.
    pub count: usize,
    /// Its mean or median residual with interval, dB.
    pub residual_db: Estimate,
    /// Whether the class differs from the others after correction for many tests.
    pub stands_out: bool,
}

/// One family of classes.
#[derive(Debug, Clone, PartialEq)]
pub struct ResidualFamily {
    /// What the classes are, such as `Hour of day (UTC)` or `Wind from`.
    pub label: String,
    /// In order.
    pub classes: Vec<ResidualClass>,
}

/// Residuals of one band.
#[derive(Debug, Clone, PartialEq)]
pub struct Residuals {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Instants, ms since 1970 UTC, in time order.
    pub time_ms: Vec<i64>,
    /// Level minus fitted level, dB, in step with the instants.
    pub residual_db: Vec<f64>,
    /// Class panels under the time panel, two in a row.
    pub families: Vec<ResidualFamily>,
}

/// Draws residuals against time (cells, with a running median) and per class (mark with interval, zero line).
pub fn residuals(input: &Residuals) -> Figure {
    const WIDTH: f64 = 840.0;
    const TIME_HEIGHT: f64 = 190.0;
    const CLASS_HEIGHT: f64 = 150.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let points: Vec<(i64, f64)> = input
        .time_ms
        .iter()
        .copied()
        .zip(input.residual_db.iter().copied())
        .filter(|p| p.1.is_finite() && calendar::is_usual(p.0))
        .collect();
    let window_days = draw_time(&mut canvas, &points, top, TIME_HEIGHT, WIDTH);

    let row_top = top + TIME_HEIGHT + UNDER_PANEL + OVER_PANEL + 10.0;
    let pitch = (WIDTH - 2.0 * MARGIN) / 2.0;
    let numbers = input.families.iter().flat_map(|f| &f.classes).flat_map(|c| c.residual_db.numbers());
    let (low, high) = padded_range(numbers.chain([-0.5, 0.5]).collect::<Vec<_>>().into_iter(), 0.10);
    for (i, family) in input.families.iter().enumerate() {
        let panel_top = row_top + (i / 2) as f64 * (CLASS_HEIGHT + UNDER_PANEL + OVER_PANEL + 6.0);
        let left = MARGIN + (i % 2) as f64 * pitch;
        let y = Axis::linear(low, high, panel_top + CLASS_HEIGHT, panel_top);
        let inner = left + y.label_width() + 12.0;
        let x = Axis::with_ticks(0.0, family.classes.len().max(1) as f64, inner, left + pitch - 20.0, Vec::new());
        draw_family(&mut canvas, &Panel { x, y }, family, left);
    }
    let rows = input.families.len().div_ceil(2) as f64;
    let bottom = row_top + rows * (CLASS_HEIGHT + UNDER_PANEL + OVER_PANEL + 6.0) - OVER_PANEL - 12.0;
    let entries = key(input, points.len(), window_days);
    let bottom = keys(&mut canvas, bottom, WIDTH - MARGIN, &entries);
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

/// The time panel; gives the length of the running median in days.
fn draw_time(canvas: &mut Canvas, points: &[(i64, f64)], top: f64, height: f64, width: f64) -> f64 {
    let mut sorted: Vec<f64> = points.iter().map(|p| p.1).collect();
    sorted.sort_by(f64::total_cmp);
    let ends = [quantile_sorted(&sorted, 0.001), quantile_sorted(&sorted, 0.999), -1.0, 1.0];
    let (low, high) = padded_range(ends.into_iter(), 0.05);
    let y = Axis::linear(low, high, top + height, top);
    let (left, right) = (MARGIN + y.label_width() + 12.0, width - MARGIN - 8.0);
    let (start, end) = match (points.first(), points.last()) {
        (Some(first), Some(last)) if last.0 > first.0 => (first.0, last.0),
        (Some(first), _) => (first.0.saturating_sub(1_800_000), first.0.saturating_add(1_800_000)),
        _ => (0, 86_400_000),
    };
    let dates = if points.is_empty() { Vec::new() } else { calendar::ticks(start, end, right - left) };
    let panel = Panel { x: time_axis(start, end, left, right, &dates), y };
    panel.grid(canvas);
    cells(canvas, &panel, points);
    panel.line(canvas, [(panel.x.low, 0.0), (panel.x.high, 0.0)], Stroke::solid(RULE, 1.2));
    let span_days = (end - start) as f64 / DAY_MS;
    // About one twentieth of the record, in whole days when it is long enough.
    let days = if span_days >= 40.0 { (span_days / 20.0).round().min(30.0) } else { span_days / 20.0 };
    let medians = running_median(points, days * DAY_MS);
    panel.line(canvas, medians, Stroke::solid(CURVE, 2.0));
    if points.is_empty() {
        panel.no_data(canvas, "no data");
    }
    panel.axes(canvas, true);
    panel.under_dates(canvas, &dates);
    panel.y_title(canvas, "Residual: level minus fit (dB)", MARGIN);
    canvas.text((right, panel.bottom() + UNDER_PANEL), "Time (UTC)", Style::new(TEXT_SIZE, INK).at(Anchor::End));
    days
}

/// Medians of windows of this length, half overlapping; NaN (a break) where fewer than five values lie.
fn running_median(points: &[(i64, f64)], length_ms: f64) -> Vec<(f64, f64)> {
    let (Some(first), Some(last), true) = (points.first(), points.last(), length_ms >= 1.0) else {
        return Vec::new();
    };
    let count = ((last.0 - first.0) as f64 / length_ms * 2.0).ceil().clamp(1.0, 400.0) as usize;
    (0..count)
        .map(|i| {
            let from = first.0 as f64 + i as f64 * length_ms / 2.0;
            let start = points.partition_point(|p| (p.0 as f64) < from);
            let stop = points.partition_point(|p| (p.0 as f64) < from + length_ms);
            let mut values: Vec<f64> = points[start..stop].iter().map(|p| p.1).collect();
            values.sort_by(f64::total_cmp);
            let median = if values.len() < 5 { f64::NAN } else { quantile_sorted(&values, 0.5) };
            (from + length_ms / 2.0, median)
        })
        .collect()
}

fn cells(canvas: &mut Canvas, panel: &Panel, points: &[(i64, f64)]) {
    if points.len() < 400 {
        let dots: Vec<_> = points.iter().map(|p| panel.at(p.0 as f64, p.1)).collect();
        let inside: Vec<_> = dots.into_iter().filter(|p| panel.encloses(*p)).collect();
        canvas.dots(&inside, 1.8, RAMP[7], 0.65);
        return;
    }
    let (columns, rows) = ((panel.width() / 6.0) as usize, (panel.height() / 6.0) as usize);
    let (w, h) = (panel.width() / columns as f64, panel.height() / rows as f64);
    let mut counts = vec![0_usize; columns * rows];
    for &(ms, residual) in points {
        let (x, y) = panel.at(ms as f64, residual);
        let row = ((y - panel.top()) / h).floor();
        if row >= 0.0 && row < rows as f64 {
            let column = (((x - panel.left()) / w) as usize).min(columns - 1);
            counts[row as usize * columns + column] += 1;
        }
    }
    let most = counts.iter().copied().max().unwrap_or(0);
    for (shade, colour) in RAMP.iter().enumerate() {
        let rects: Vec<_> = (0..counts.len())
            .filter(|i| shade_of(counts[*i], most, RAMP.len()) == Some(shade))
            .map(|i| {
                let corner = (panel.left() + (i % columns) as f64 * w, panel.top() + (i / columns) as f64 * h);
                (corner.0, corner.1, w + 0.15, h + 0.15)
            })
            .collect();
        canvas.rects(&rects, colour);
    }
}

fn draw_family(canvas: &mut Canvas, panel: &Panel, family: &ResidualFamily, left: f64) {
    panel.grid(canvas);
    panel.line(canvas, [(panel.x.low, 0.0), (panel.x.high, 0.0)], Stroke::solid(RULE, 1.2));
    let style = Style::new(10.5, MUTED).at(Anchor::Middle);
    let widest = family.classes.iter().map(|c| style.width(&c.label)).fold(0.0, f64::max);
    let pitch = panel.width() / family.classes.len().max(1) as f64;
    let every = ((widest + 5.0) / pitch).ceil().max(1.0) as usize;
    for (i, class) in family.classes.iter().enumerate() {
        let x = panel.x.px(i as f64 + 0.5);
        let (shape, colour) = if class.stands_out { (Shape::Diamond, series(1)) } else { (Shape::Circle, series(0)) };
        if class.count > 0 {
            estimate(canvas, &panel.y, Along::Up(x), &class.residual_db, (shape, colour));
        }
        if i % every == 0 {
            canvas.text((x, panel.bottom() + 16.0), &class.label, style);
        }
    }
    if family.classes.iter().all(|c| c.count == 0) {
        panel.no_data(canvas, "no data");
    }
    panel.axes(canvas, false);
    panel.y_title(canvas, &format!("{}: residual (dB)", family.label), left);
    let counts = family.classes.iter().map(|c| c.count).filter(|n| *n > 0);
    if let (Some(least), Some(most)) = (counts.clone().min(), counts.max()) {
        let text = if least == most {
            format!("{} windows in each class", number::count(least))
        } else {
            format!("{} to {} windows in a class", number::count(least), number::count(most))
        };
        canvas.text((panel.right(), panel.bottom() + 31.0), &text, Style::new(10.5, MUTED).at(Anchor::End));
    }
}

fn key(input: &Residuals, count: usize, days: f64) -> Vec<(Sample, String)> {
    let mut entries = Vec::new();
    if count >= 400 {
        entries.push((Sample::Area(RAMP[5], 1.0), "windows: darker where more".to_owned()));
    } else if count > 0 {
        entries.push((Sample::Dot(RAMP[7], 0.65), "one window".to_owned()));
    }
    if count >= 5 {
        let length = if days >= 1.0 {
            number::quantity(days, usize::from(days < 2.0), "days")
        } else {
            number::quantity(days * 24.0, 1, "h")
        };
        entries.push((Sample::Line(Stroke::solid(CURVE, 2.0)), format!("running median over {length}")));
    }
    if input.families.iter().any(|f| !f.classes.is_empty()) {
        entries.push((Sample::Mark(Shape::Circle, series(0), true), "class, with interval".to_owned()));
    }
    if input.families.iter().flat_map(|f| &f.classes).any(|c| c.stands_out) {
        entries.push((Sample::Mark(Shape::Diamond, series(1), true), "class that stands out".to_owned()));
    }
    entries
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input(count: i64) -> Residuals {
        let class = |i: usize| ResidualClass {
            label: format!("{i:02}"),
            count: 10 * i,
            residual_db: Estimate::value(0.1 * i as f64, -1.0, 2.0),
            stands_out: i == 3,
        };
        Residuals {
            title: "Residuals".to_owned(),
            notes: Vec::new(),
            time_ms: (0..count).map(|h| 1_600_000_000_000 + h * 3_600_000).collect(),
            residual_db: (0..count).map(|h| (h * 37 % 101) as f64 / 25.0 - 2.0).collect(),
            families: vec![
                ResidualFamily { label: "Hour of day (UTC)".to_owned(), classes: (0..24).map(class).collect() },
                ResidualFamily { label: "Wind from".to_owned(), classes: Vec::new() },
                ResidualFamily { label: "Month".to_owned(), classes: (0..12).map(class).collect() },
            ],
        }
    }

    #[test]
    fn any_length_is_drawn() {
        for count in [0, 1, 3, 399, 400, 8760, 200_000] {
            let svg = assert_sound(&residuals(&input(count)));
            assert_eq!(svg.matches(">no data<").count(), 1 + usize::from(count == 0), "{count}");
            assert!(svg.contains("class that stands out"));
        }
        let mut odd = input(500);
        odd.residual_db[3] = f64::MAX;
        odd.residual_db[4] = f64::NEG_INFINITY;
        odd.time_ms[499] = i64::MAX;
        assert_sound(&residuals(&odd));
    }

    #[test]
    fn the_running_median_is_the_median_and_breaks_at_gaps() {
        let points: Vec<(i64, f64)> = (0..40).chain(120..160).map(|i| (i * 1000, 7.0)).collect();
        let medians = running_median(&points, 20_000.0);
        assert!(medians.iter().any(|m| m.1.is_nan()));
        assert!(medians.iter().filter(|m| m.1.is_finite()).all(|m| (m.1 - 7.0).abs() < 1e-12));
    }
}
