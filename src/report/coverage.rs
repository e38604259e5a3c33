//! Which hours have data: one strip per site, days along, hours of the day down.

use super::axis::Axis;
use super::calendar;
use super::colour::{INK, MUTED, PAPER, RULE, SERIES};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::panel::{MARGIN, Panel, TEXT_SIZE, UNDER_PANEL, header};
use super::svg::{Anchor, Canvas, Stroke, Style};
use super::time_series::time_axis;

const HOUR_MS: i64 = 3_600_000;
const DAY_MS: i64 = 24 * HOUR_MS;
/// Used hours, from a quarter to whole.
const USED: [&str; 4] = ["#cfe0e0", "#a3c7c6", "#78adac", "#549898"];
const EXCLUDED: &str = SERIES[3];
const OTHER: &str = "#d3d6d8";

/// What a span of the record is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CoverageKind {
    /// Used in the fit.
    Used,
    /// There is a level, but a rule excludes it.
    Excluded,
    /// There is a level, but nothing to match it with (no wind), or it is not usable.
    Unmatched,
}

/// A span of the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct CoverageSpan {
    /// First instant, ms since 1970 UTC.
    pub start_ms: i64,
    /// First instant after it.
    pub end_ms: i64,
    /// What it is.
    pub kind: CoverageKind,
}

/// One strip.
#[derive(Debug, Clone, PartialEq)]
pub struct CoverageRow {
    /// Site or sensor.
    pub name: String,
    /// Its spans, in any order; windows may be given one by one.
    pub spans: Vec<CoverageSpan>,
}

/// The strips of a study.
#[derive(Debug, Clone, PartialEq)]
pub struct Coverage {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// One strip each.
    pub rows: Vec<CoverageRow>,
}

/// Draws one strip per site: each column is a day (or a few, in a long record), each line an hour of the day (UTC), so
/// that a recorder which sleeps at night or loses weeks shows at a glance.
pub fn coverage(input: &Coverage) -> Figure {
    const WIDTH: f64 = 960.0;
    const STRIP: f64 = 60.0;
    const GAP: f64 = 16.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + 22.0;
    let spans = || input.rows.iter().flat_map(|r| &r.spans).filter(|s| is_drawn(s));
    let (Some(start), Some(end)) = (spans().map(|s| s.start_ms).min(), spans().map(|s| s.end_ms).max()) else {
        canvas.text((MARGIN, top), "no data", Style::new(TEXT_SIZE, MUTED));
        return Figure::new(&input.title, WIDTH, top + 20.0, canvas);
    };
    let name_style = Style::new(TEXT_SIZE, INK).bold();
    let room = input.rows.iter().map(|r| name_style.width(&r.name)).fold(0.0, f64::max).min(260.0);
    let (left, right) = (MARGIN + room + 34.0, WIDTH - MARGIN - 6.0);
    let first_day = start.div_euclid(DAY_MS);
    let days = (end - 1).div_euclid(DAY_MS) - first_day + 1;
    // At least 1.5 pixels for a column.
    let days_per_column = ((days as f64 * 1.5 / (right - left)).ceil() as i64).max(1);
    let columns = ((days + days_per_column - 1) / days_per_column).clamp(1, 2000) as usize;
    let (from, to) = (first_day * DAY_MS, (first_day + columns as i64 * days_per_column) * DAY_MS);
    let dates = calendar::ticks(from, to, right - left);
    canvas.text((MARGIN, top - 8.0), "Hour of day (UTC), by date", Style::new(TEXT_SIZE, INK));
    let mut bottom = top;
    for (i, row) in input.rows.iter().enumerate() {
        let strip_top = top + i as f64 * (STRIP + GAP);
        // Hours run down the strip, so the axis runs from 24 at its foot.
        let panel = Panel {
            x: time_axis(from, to, left, right, &dates),
            y: Axis::with_ticks(0.0, 24.0, strip_top + STRIP, strip_top, Vec::new()),
        };
        let shares = shares(row, from, days_per_column, columns);
        draw_strip(&mut canvas, &panel, &shares, columns);
        let rule = Stroke::solid(RULE, 1.0);
        let (l, r, t, b) = (panel.left(), panel.right(), panel.top(), panel.bottom());
        canvas.lines(&[((l, t), (r, t)), ((l, b), (r, b)), ((l, t), (l, b)), ((r, t), (r, b))], rule);
        canvas.text((MARGIN, strip_top + STRIP / 2.0 + 4.0), &row.name, name_style);
        let hour = Style::new(9.5, MUTED).at(Anchor::End);
        for (label, share) in [("0", 0.0), ("12", 0.5), ("24", 1.0)] {
            canvas.text((l - 5.0, t + share * STRIP + 3.4), label, hour);
        }
        if i + 1 == input.rows.len() {
            panel.axes(&mut canvas, true);
            panel.under_dates(&mut canvas, &dates);
        }
        bottom = panel.bottom();
    }
    let mut entries: Vec<(Sample, String)> = vec![(Sample::Area(USED[3], 1.0), "used".to_owned())];
    entries.push((Sample::Area(USED[1], 1.0), "used in part".to_owned()));
    if spans().any(|s| s.kind == CoverageKind::Excluded) {
        entries.push((Sample::Area(EXCLUDED, 1.0), "excluded by a rule".to_owned()));
    }
    if spans().any(|s| s.kind == CoverageKind::Unmatched) {
        entries.push((Sample::Area(OTHER, 1.0), "level without match".to_owned()));
    }
    entries.push((Sample::Area(PAPER, 1.0), "no level".to_owned()));
    let bottom = keys(&mut canvas, bottom + UNDER_PANEL, WIDTH - MARGIN, &entries);
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

/// Not empty, and in the range of the calendar.
fn is_drawn(span: &CoverageSpan) -> bool {
    span.end_ms > span.start_ms && calendar::is_usual(span.start_ms) && calendar::is_usual(span.end_ms)
}

/// Shares of each hour that are used, excluded and unmatched, column by column.
fn shares(row: &CoverageRow, from_ms: i64, days_per_column: i64, columns: usize) -> Vec<[f64; 3]> {
    let mut cells = vec![[0.0_f64; 3]; columns * 24];
    let whole = (HOUR_MS * days_per_column) as f64;
    for span in row.spans.iter().filter(|s| is_drawn(s)) {
        let kind = match span.kind {
            CoverageKind::Used => 0,
            CoverageKind::Excluded => 1,
            CoverageKind::Unmatched => 2,
        };
        let mut at = span.start_ms.max(from_ms);
        while at < span.end_ms {
            let hour_end = (at.div_euclid(HOUR_MS) + 1) * HOUR_MS;
            let until = hour_end.min(span.end_ms);
            let column = ((at - from_ms) / (DAY_MS * days_per_column)) as usize;
            let hour = at.rem_euclid(DAY_MS) / HOUR_MS;
            let Some(cell) = cells.get_mut(column * 24 + hour as usize) else { break };
            cell[kind] += (until - at) as f64 / whole;
            at = until;
        }
    }
    cells
}

fn draw_strip(canvas: &mut Canvas, panel: &Panel, shares: &[[f64; 3]], columns: usize) {
    let (w, h) = (panel.width() / columns as f64, panel.height() / 24.0);
    let looks = [USED[0], USED[1], USED[2], USED[3], EXCLUDED, OTHER];
    let mut rects: Vec<Vec<(f64, f64, f64, f64)>> = vec![Vec::new(); looks.len()];
    let look = |cell: &[f64; 3]| -> Option<usize> {
        let [used, excluded, other] = *cell;
        if used + excluded + other < 0.01 {
            None
        } else if used >= excluded && used >= other {
            Some(if used > 0.95 { 3 } else { ((used * 4.0) as usize).min(2) })
        } else {
            Some(if excluded >= other { 4 } else { 5 })
        }
    };
    // Equal neighbours along an hour become one rectangle; whole equal columns become one as well.
    let column_looks: Vec<Vec<Option<usize>>> =
        (0..columns).map(|c| shares[c * 24..c * 24 + 24].iter().map(look).collect()).collect();
    let mut column = 0;
    while column < columns {
        let run = (column..columns).take_while(|&c| column_looks[c] == column_looks[column]).count();
        let x = panel.left() + column as f64 * w;
        let mut hour = 0;
        while hour < 24 {
            let what = column_looks[column][hour];
            let hours = (hour..24).take_while(|&k| column_looks[column][k] == what).count();
            if let Some(index) = what {
                let size = (run as f64 * w + 0.15, hours as f64 * h);
                rects[index].push((x, panel.top() + hour as f64 * h, size.0, size.1));
            }
            hour += hours;
        }
        column += run;
    }
    for (index, colour) in looks.iter().enumerate() {
        canvas.rects(&rects[index], colour);
    }
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    #[test]
    fn shares_add_up_to_the_time_covered() {
        let span = CoverageSpan { start_ms: 90 * 60_000, end_ms: DAY_MS + 30 * 60_000, kind: CoverageKind::Used };
        let cells = shares(&CoverageRow { name: String::new(), spans: vec![span] }, 0, 1, 2);
        let total: f64 = cells.iter().map(|c| c[0]).sum();
        assert!((total - 23.0).abs() < 1e-9, "24.5 h less 1.5 h");
        assert!((cells[1][0] - 0.5).abs() < 1e-9 && (cells[24][0] - 0.5).abs() < 1e-9 && cells[0][0] < 1e-9);
    }

    #[test]
    fn strips_of_any_length_are_drawn_small() {
        let strip = |hours: i64| CoverageRow {
            name: "north & co".to_owned(),
            spans: (0..hours)
                .filter(|h| h % 7 != 3)
                .map(|h| CoverageSpan {
                    start_ms: h * HOUR_MS,
                    end_ms: (h + 1) * HOUR_MS,
                    kind: if h % 50 < 5 { CoverageKind::Excluded } else { CoverageKind::Used },
                })
                .collect(),
        };
        for hours in [1, 24, 3000, 24 * 365 * 10] {
            let rows = vec![strip(hours), strip(hours / 2)];
            let svg = assert_sound(&coverage(&Coverage { title: "Coverage".to_owned(), notes: vec![], rows }));
            assert!(svg.contains("excluded by a rule") && !svg.contains("level without match"));
        }
        let odd = CoverageSpan { start_ms: i64::MIN, end_ms: i64::MAX, kind: CoverageKind::Used };
        let rows = vec![CoverageRow { name: String::new(), spans: vec![odd] }];
        let svg = assert_sound(&coverage(&Coverage { title: "Coverage".to_owned(), notes: vec![], rows }));
        assert!(svg.contains("no data"));
    }
}
