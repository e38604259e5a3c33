//! How often each wind speed occurs, per source, with speeds of interest marked.

use super::axis::Axis;
use super::colour::{INK, MUTED, ONSET, series};
use super::estimate::Estimate;
use super::figure::Figure;
use super::mark::{Along, Sample, arrow, keys};
use super::number;
use super::panel::{MARGIN, OVER_PANEL, Panel, UNDER_PANEL, header};
use super::statistics::quantile_sorted;
use super::svg::{Anchor, Canvas, Stroke, Style};

const DASHES: [&str; 4] = ["", "7 3", "2 2", "9 3 2 3"];

/// The winds of one source at one site.
#[derive(Debug, Clone, PartialEq)]
pub struct WindSample {
    /// Name in the key, such as the source's id.
    pub name: String,
    /// Wind speeds, m/s; those that are not finite or negative are left out.
    pub wind_m_s: Vec<f64>,
}

/// A speed to mark, such as an onset or a percentile.
#[derive(Debug, Clone, PartialEq)]
pub struct WindMark {
    /// What it is, such as `onset, 125 Hz`.
    pub name: String,
    /// The speed, m/s; `NotResolved` is left out.
    pub wind_m_s: Estimate,
}

/// The distribution of wind speed.
#[derive(Debug, Clone, PartialEq)]
pub struct WindDistribution {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// One or more sources.
    pub samples: Vec<WindSample>,
    /// Speeds to mark; more than about eight become crowded.
    pub marks: Vec<WindMark>,
}

/// Draws the share of windows in each class of 0.5 or 1 m/s; the first source filled, further ones as outlines.
pub fn wind_distribution(input: &WindDistribution) -> Figure {
    const WIDTH: f64 = 720.0;
    const HEIGHT: f64 = 260.0;
    const MARK_ROW: f64 = 15.0;
    let mut canvas = Canvas::default();
    let clean: Vec<Vec<f64>> = input
        .samples
        .iter()
        .map(|s| {
            let mut winds: Vec<f64> = s.wind_m_s.iter().copied().filter(|w| w.is_finite() && *w >= 0.0).collect();
            winds.sort_by(f64::total_cmp);
            winds
        })
        .collect();
    let marks: Vec<&WindMark> = input.marks.iter().filter(|m| m.wind_m_s != Estimate::NotResolved).collect();
    let head = header(&mut canvas, WIDTH, &input.title, &input.notes);
    let top = head + OVER_PANEL + MARK_ROW * marks.len() as f64 + 6.0;
    let most = clean.iter().filter_map(|w| w.last()).fold(0.0_f64, |a, b| a.max(*b));
    let far = marks.iter().flat_map(|m| m.wind_m_s.numbers()).fold(most, f64::max);
    let high = if far > 0.0 { (far * 1.02).ceil().clamp(10.0, 1e4) } else { 20.0 };
    let least_count = clean.iter().map(Vec::len).filter(|n| *n > 0).min().unwrap_or(0);
    // Enough windows in a class to be smooth, and few enough classes to be seen.
    let bin = if high > 60.0 {
        high / 40.0
    } else if least_count >= 2000 && high <= 40.0 {
        0.5
    } else {
        1.0
    };
    let shares: Vec<Vec<f64>> = clean.iter().map(|w| shares_percent(w, bin, high)).collect();
    let tallest = shares.iter().flatten().copied().fold(0.0, f64::max);
    let y = Axis::linear(0.0, if tallest > 0.0 { tallest * 1.08 } else { f64::NAN }, top + HEIGHT, top);
    let left = MARGIN + y.label_width() + 12.0;
    let x = Axis::linear(0.0, high, left, WIDTH - MARGIN - 8.0);
    let panel = Panel { x, y };
    panel.grid(&mut canvas);
    for (i, heights) in shares.iter().enumerate() {
        draw_histogram(&mut canvas, &panel, heights, bin, i);
    }
    if least_count == 0 && clean.iter().all(Vec::is_empty) {
        panel.no_data(&mut canvas, "no data");
    }
    for (i, mark) in marks.iter().enumerate() {
        draw_mark(&mut canvas, &panel, mark, panel.top() - 8.0 - MARK_ROW * (marks.len() - 1 - i) as f64);
    }
    panel.axes(&mut canvas, true);
    let label = format!("Share of windows (% in classes of {} m/s)", number::fixed(bin, usize::from(bin < 1.0)));
    canvas.text((MARGIN, head + 13.0), &label, Style::new(12.0, INK));
    panel.x_title(&mut canvas, "Wind speed at 10 m (m/s)");
    let entries: Vec<(Sample, String)> = input
        .samples
        .iter()
        .zip(&clean)
        .enumerate()
        .map(|(i, (sample, winds))| {
            let text = format!(
                "{}: N = {}, median {}, 90 % below {}",
                sample.name,
                number::count(winds.len()),
                number::quantity(quantile_sorted(winds, 0.5), 1, "m/s"),
                number::quantity(quantile_sorted(winds, 0.9), 1, "m/s")
            );
            let look = Stroke::dashed(series(i), 1.8, DASHES[i % 4]);
            (if i == 0 { Sample::LineInBand(look, series(0), 0.2) } else { Sample::Line(look) }, text)
        })
        .collect();
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &entries);
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

fn shares_percent(winds: &[f64], bin: f64, high: f64) -> Vec<f64> {
    let count = (high / bin).ceil().clamp(1.0, 500.0) as usize;
    let mut shares = vec![0.0; count];
    for wind in winds {
        shares[((wind / bin) as usize).min(count - 1)] += 100.0 / winds.len() as f64;
    }
    shares
}

fn draw_histogram(canvas: &mut Canvas, panel: &Panel, heights: &[f64], bin: f64, index: usize) {
    if heights.iter().all(|h| *h <= 0.0) {
        return;
    }
    let mut outline = vec![panel.at(0.0, 0.0)];
    for (i, height) in heights.iter().enumerate() {
        let right = ((i + 1) as f64 * bin).min(panel.x.high);
        outline.extend([panel.at(i as f64 * bin, *height), panel.at(right, *height)]);
    }
    outline.push(panel.at((heights.len() as f64 * bin).min(panel.x.high), 0.0));
    if index == 0 {
        canvas.polygon(&outline, series(0), 0.2);
    }
    canvas.polyline(&outline, Stroke::dashed(series(index), 1.8, DASHES[index % 4]));
}

fn draw_mark(canvas: &mut Canvas, panel: &Panel, mark: &WindMark, y: f64) {
    let (at, bound) = match mark.wind_m_s {
        Estimate::Value { value, low, high } | Estimate::Unresolved { value, low, high } => {
            if low.is_finite() && high.is_finite() {
                let (from, to) = (panel.x.px(low).max(panel.left()), panel.x.px(high).min(panel.right()));
                canvas.rect((from, y - 2.0), (to - from, 3.0), ONSET, 0.35);
            }
            (panel.x.px(value), 0.0)
        }
        Estimate::Above(bound) => (panel.x.px(bound), 1.0),
        Estimate::Below(bound) => (panel.x.px(bound), -1.0),
        Estimate::NotResolved => return,
    };
    canvas.line((at, y - 4.0), (at, panel.bottom()), Stroke::dashed(ONSET, 1.1, "3 3"));
    if bound != 0.0 {
        arrow(canvas, Along::Right(y - 1.0), at, bound, ONSET);
    }
    let text = format!("{} {}", mark.name, mark.wind_m_s.text("m/s", 1));
    let style = Style::new(11.0, MUTED);
    // Text on the side where there is room, clear of the arrow.
    let gap = if bound == 0.0 { 6.0 } else { 26.0 };
    if at + gap + style.width(&text) < panel.right() {
        canvas.text((at + gap, y + 2.0), &text, style.over_data());
    } else {
        canvas.text((at - gap, y + 2.0), &text, style.at(Anchor::End).over_data());
    }
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input(winds: Vec<f64>, marks: Vec<WindMark>) -> WindDistribution {
        let samples = vec![WindSample { name: "hindcast".to_owned(), wind_m_s: winds }];
        WindDistribution { title: "Winds".to_owned(), notes: Vec::new(), samples, marks }
    }

    #[test]
    fn shares_add_up_to_a_hundred_percent() {
        let shares = shares_percent(&[0.0, 0.4, 0.5, 3.2, 9.99], 0.5, 10.0);
        assert!((shares.iter().sum::<f64>() - 100.0).abs() < 1e-9);
        assert!((shares[0] - 40.0).abs() < 1e-9 && (shares[1] - 20.0).abs() < 1e-9 && (shares[19] - 20.0).abs() < 1e-9);
    }

    #[test]
    fn any_winds_and_marks_are_drawn() {
        let mark = |name: &str, wind_m_s| WindMark { name: name.to_owned(), wind_m_s };
        let marks = vec![
            mark("onset, 125 Hz", Estimate::value(10.0, 9.0, 11.5)),
            mark("onset, 63 Hz", Estimate::Above(19.5)),
            mark("onset, 8 kHz", Estimate::Below(0.5)),
            mark("left out", Estimate::NotResolved),
        ];
        let winds: Vec<f64> = (0..5000).map(|i| f64::from(i % 200) / 10.0).collect();
        let svg = assert_sound(&wind_distribution(&input(winds, marks.clone())));
        assert!(svg.contains("onset, 63 Hz above 19.5\u{a0}m/s") && !svg.contains("left out"));
        assert!(svg.contains("N = 5000"));
        assert_sound(&wind_distribution(&input(vec![f64::NAN, -1.0, 1e6], marks)));
        assert!(assert_sound(&wind_distribution(&input(vec![], vec![]))).contains("no data"));
    }
}
