//! Level against wind speed: one band in full, or all bands of a site as small panels.

use super::axis::{Axis, Labels, padded_range, round_log};
use super::colour::{CURVE, FLOOR, INK, MUTED, ONSET, RAMP};
use super::estimate::Estimate;
use super::figure::Figure;
use super::level_wind_panel::{Detail, draw_panel};
use super::mark::{Sample, keys};
use super::panel::{MARGIN, OVER_PANEL, Panel, TEXT_SIZE, UNDER_PANEL, header};
use super::statistics::quantile_sorted;
use super::svg::{Anchor, Canvas, Stroke, Style};

/// Winds below this are drawn at it: on a log axis a calm has no place of its own.
const LEAST_WIND_M_S: f64 = 0.5;
const WIND_TITLE: &str = "Wind speed at 10 m (m/s)";

/// One point of a fitted curve.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CurvePoint {
    /// Wind speed at 10 m, m/s.
    pub wind_m_s: f64,
    /// Fitted level, dB.
    pub level_db: f64,
    /// Lower end of the pointwise interval, dB; NaN without one.
    pub low_db: f64,
    /// Upper end of the pointwise interval, dB; NaN without one.
    pub high_db: f64,
}

/// What is drawn of one band of one site.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelAgainstWind {
    /// Title, such as `Site north, 125 Hz decidecade band`.
    pub title: String,
    /// Short name for a small panel, such as `125 Hz`.
    pub short_title: String,
    /// Quantity and reference of the level, such as `Level (dB re 1 µPa²)`.
    pub level_label: String,
    /// Title of the wind axis; empty for `Wind speed at 10 m (m/s)`.
    pub wind_label: String,
    /// Wind speed of each point, m/s, in step with `level_db`; pairs with a value that is not finite are left out.
    pub wind_m_s: Vec<f64>,
    /// Level of each point, dB.
    pub level_db: Vec<f64>,
    /// The fitted curve in order of wind; empty when there is none.
    pub curve: Vec<CurvePoint>,
    /// The floor, dB.
    pub floor_db: Estimate,
    /// What the floor is called, such as `floor` or `sea floor at or below`; empty for `floor`.
    pub floor_name: String,
    /// The saturation onset, m/s; `NotResolved` draws nothing.
    pub onset_m_s: Estimate,
    /// What the onset is called; empty for `onset`.
    pub onset_name: String,
    /// Sentences under the title: the verdict, the slope, N.
    pub notes: Vec<String>,
    /// One short line for a small panel, such as `onset above 11.3 m/s`.
    pub short_note: String,
}

/// One band in full.
pub fn level_against_wind(input: &LevelAgainstWind) -> Figure {
    const WIDTH: f64 = 720.0;
    const HEIGHT: f64 = 380.0;
    let mut canvas = Canvas::default();
    let points = finite_pairs(input);
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL + 16.0;
    let (low, high) = level_range(&points, input);
    let (wind_low, wind_high) = wind_range([&points[..]].into_iter(), [input].into_iter());
    let y = Axis::linear(low, high, top + HEIGHT, top);
    let left = MARGIN + y.label_width() + 12.0;
    let x = Axis::log(wind_low, wind_high, left, WIDTH - MARGIN - 8.0, Labels::Plain);
    let panel = Panel { x, y };
    let most = draw_panel(&mut canvas, &panel, input, &points, Detail::Full);
    panel.axes(&mut canvas, true);
    // The onset's label takes the line directly above the frame.
    canvas.text((MARGIN, panel.top() - 25.0), &input.level_label, Style::new(TEXT_SIZE, INK));
    let wind_title = if input.wind_label.is_empty() { WIND_TITLE } else { &input.wind_label };
    panel.x_title(&mut canvas, wind_title);
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &key(&[input], most));
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

/// All bands of a site as small panels with one wind axis and the same decibels per length, so that slopes compare.
pub fn level_against_wind_grid(title: &str, notes: &[String], bands: &[LevelAgainstWind]) -> Figure {
    const WIDTH: f64 = 960.0;
    const ROW: f64 = 186.0;
    const PANEL: f64 = 118.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, title, notes) + 6.0;
    if bands.is_empty() {
        canvas.text((MARGIN, top + 20.0), "no data: no band to draw", Style::new(TEXT_SIZE, MUTED));
        return Figure::new(title, WIDTH, top + 40.0, canvas);
    }
    let points: Vec<Vec<(f64, f64)>> = bands.iter().map(finite_pairs).collect();
    let ranges: Vec<(f64, f64)> = points.iter().zip(bands).map(|(p, b)| level_range(p, b)).collect();
    let span = ranges.iter().map(|r| r.1 - r.0).fold(1.0, f64::max);
    let (wind_low, wind_high) = wind_range(points.iter().map(Vec::as_slice), bands.iter());
    let columns = bands.len().clamp(1, 5);
    let pitch = (WIDTH - 2.0 * MARGIN) / columns as f64;
    canvas.text((MARGIN, top + 6.0), &bands[0].level_label, Style::new(TEXT_SIZE, INK));
    let mut most = 0;
    let rows = bands.len().div_ceil(columns);
    for (i, band) in bands.iter().enumerate() {
        let (row, column) = (i / columns, i % columns);
        let panel_top = top + 48.0 + row as f64 * ROW;
        let centre = f64::midpoint(ranges[i].0, ranges[i].1);
        let y = Axis::linear(centre - span / 2.0, centre + span / 2.0, panel_top + PANEL, panel_top);
        let panel_left = MARGIN + column as f64 * pitch + 32.0;
        let x = Axis::log(wind_low, wind_high, panel_left, panel_left + pitch - 48.0, Labels::Plain);
        let panel = Panel { x, y };
        most = most.max(draw_panel(&mut canvas, &panel, band, &points[i], Detail::Small));
        panel.axes(&mut canvas, true);
        let y = panel.top() - 7.0;
        canvas.text((panel.left(), y - 13.0), &band.short_title, Style::new(TEXT_SIZE, INK).bold());
        canvas.text((panel.left(), y), &band.short_note, Style::new(10.5, MUTED));
    }
    let bottom = top + 48.0 + rows as f64 * ROW - 14.0;
    let wind_title = if bands[0].wind_label.is_empty() { WIND_TITLE } else { &bands[0].wind_label };
    canvas.text((WIDTH / 2.0, bottom), wind_title, Style::new(TEXT_SIZE, INK).at(Anchor::Middle));
    let all: Vec<&LevelAgainstWind> = bands.iter().collect();
    let bottom = keys(&mut canvas, bottom + 12.0, WIDTH - MARGIN, &key(&all, most));
    Figure::new(title, WIDTH, bottom + 8.0, canvas)
}

/// Pairs that can be drawn; calms are moved to the least wind.
fn finite_pairs(input: &LevelAgainstWind) -> Vec<(f64, f64)> {
    let pairs = input.wind_m_s.iter().zip(&input.level_db);
    let fine = pairs.filter(|(wind, level)| wind.is_finite() && level.is_finite() && **wind >= 0.0);
    fine.map(|(wind, level)| (wind.max(LEAST_WIND_M_S), *level)).collect()
}

/// All points but the outermost 0.05 % on each side, the curve and the floor.
fn level_range(points: &[(f64, f64)], input: &LevelAgainstWind) -> (f64, f64) {
    let mut levels: Vec<f64> = points.iter().map(|p| p.1).collect();
    levels.sort_by(f64::total_cmp);
    let ends = if levels.is_empty() {
        [f64::NAN; 2]
    } else {
        [quantile_sorted(&levels, 0.0005), quantile_sorted(&levels, 0.9995)]
    };
    let floor: Vec<f64> = input.floor_db.numbers().collect();
    let curve = input.curve.iter().map(|c| c.level_db);
    padded_range(ends.into_iter().chain(curve).chain(floor), 0.06)
}

fn wind_range<'a>(
    points: impl Iterator<Item = &'a [(f64, f64)]>,
    inputs: impl Iterator<Item = &'a LevelAgainstWind>,
) -> (f64, f64) {
    let mut winds: Vec<f64> = points.flat_map(|p| p.iter().map(|point| point.0)).collect();
    winds.sort_by(f64::total_cmp);
    let onsets: Vec<f64> = inputs.flat_map(|i| i.onset_m_s.numbers().collect::<Vec<_>>()).collect();
    let (Some(&first), Some(&last)) = (winds.first(), winds.last()) else {
        return (1.0, 30.0);
    };
    // A few calms must not stretch the axis: below 1 m/s only where at least 1 % of the points lie there.
    let calm = quantile_sorted(&winds, 0.01);
    let low = if first >= 1.0 { first } else { calm.clamp(LEAST_WIND_M_S, 1.0) };
    let high = onsets.into_iter().filter(|v| *v < 100.0).fold(last, f64::max);
    let low = round_log(low.max(LEAST_WIND_M_S), false);
    (low, round_log(high.max(2.0 * low), true))
}

fn key(inputs: &[&LevelAgainstWind], most: usize) -> Vec<(Sample, String)> {
    let mut entries = Vec::new();
    let any = |test: fn(&LevelAgainstWind) -> bool| inputs.iter().any(|i| test(i));
    let some_points = any(|i| !i.wind_m_s.is_empty());
    if most > 0 {
        entries.push((Sample::Ramp(most), "windows in a cell".to_owned()));
    } else if some_points {
        entries.push((Sample::Dot(RAMP[7], 0.65), "one window".to_owned()));
    }
    if some_points {
        entries.push((Sample::Quartiles, "median and quartiles of a wind bin".to_owned()));
    }
    let band = any(|i| i.curve.iter().any(|c| c.low_db.is_finite()));
    if any(|i| !i.curve.is_empty()) {
        let stroke = Stroke::solid(CURVE, 2.4);
        entries.push(if band {
            (Sample::LineInBand(stroke, CURVE, 0.22), "fitted curve, 95 % interval".to_owned())
        } else {
            (Sample::Line(stroke), "fitted curve".to_owned())
        });
    }
    if any(|i| i.floor_db != Estimate::NotResolved) {
        entries.push((Sample::Line(Stroke::dashed(FLOOR, 1.6, "7 4")), "floor".to_owned()));
    }
    if any(|i| matches!(i.onset_m_s, Estimate::Value { .. } | Estimate::Unresolved { .. })) {
        entries.push((Sample::LineInBand(Stroke::solid(ONSET, 1.8), ONSET, 0.13), "onset and interval".to_owned()));
    }
    if any(|i| matches!(i.onset_m_s, Estimate::Above(_) | Estimate::Below(_))) {
        entries.push((Sample::Hatch(ONSET), "where the onset may lie".to_owned()));
    }
    entries
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    /// Winds over the whole range and levels of a law with a floor, repeatable without a random number.
    fn band(count: usize) -> LevelAgainstWind {
        let wind_m_s: Vec<f64> = (0..count).map(|i| 0.3 + 24.0 * (i as f64 * 0.618_034).fract()).collect();
        let law = |wind: f64| 60.0 + 10.0 * libm::log10(1.0 + libm::pow(wind / 5.0, 2.2));
        let level_db = wind_m_s.iter().enumerate().map(|(i, w)| law(*w) + 4.0 * ((i * 37 % 101) as f64 / 101.0 - 0.5));
        LevelAgainstWind {
            title: "Site a, 125 Hz".to_owned(),
            short_title: "125 Hz".to_owned(),
            level_label: "Level (dB re 1 µPa²)".to_owned(),
            wind_label: String::new(),
            level_db: level_db.collect(),
            wind_m_s,
            curve: (0..=100)
                .map(|i| 0.5 * libm::pow(50.0, f64::from(i) / 100.0))
                .map(|w| CurvePoint { wind_m_s: w, level_db: law(w), low_db: law(w) - 0.5, high_db: law(w) + 0.5 })
                .collect(),
            floor_db: Estimate::value(60.0, 59.4, 60.6),
            floor_name: String::new(),
            onset_m_s: Estimate::value(11.0, 10.0, 12.5),
            onset_name: String::new(),
            notes: vec!["A verdict & a <note>.".to_owned()],
            short_note: "onset 11.0 m/s".to_owned(),
        }
    }

    #[test]
    fn each_outcome_is_drawn_as_what_it_is() {
        let mut input = band(3000);
        let svg = assert_sound(&level_against_wind(&input));
        assert!(
            svg.contains("onset 11.0 (10.0 to 12.5)\u{a0}m/s") && svg.contains("floor 60.0 (59.4 to 60.6)\u{a0}dB")
        );
        assert!(svg.contains("A verdict &amp; a &lt;note&gt;."));
        input.onset_m_s = Estimate::Above(11.3);
        let above = assert_sound(&level_against_wind(&input));
        assert!(above.contains("onset above 11.3\u{a0}m/s") && above.contains("where the onset may lie"));
        input.onset_m_s = Estimate::NotResolved;
        assert!(!assert_sound(&level_against_wind(&input)).contains("onset above"));
        assert_eq!(level_against_wind(&input), level_against_wind(&input.clone()));
    }

    #[test]
    fn odd_input_is_drawn_without_panic() {
        for count in [0, 1, 2, 50, 399, 400] {
            let mut input = band(count);
            assert_sound(&level_against_wind(&input));
            input.curve.clear();
            (input.floor_db, input.onset_m_s) = (Estimate::NotResolved, Estimate::NotResolved);
            let svg = assert_sound(&level_against_wind(&input));
            assert_eq!(svg.contains(">no data<"), count == 0, "{count}");
        }
        let mut input = band(600);
        input.wind_m_s[0] = f64::NAN;
        input.wind_m_s[1] = -3.0;
        input.wind_m_s[2] = 1e9;
        input.level_db[3] = f64::INFINITY;
        input.level_db[4] = 1e300;
        input.level_db[5] = f64::MAX;
        input.level_db[6] = f64::MIN;
        assert_sound(&level_against_wind(&input));
        input.onset_m_s = Estimate::Below(0.0);
        input.floor_db = Estimate::Below(f64::NAN);
        assert_sound(&level_against_wind(&input));
    }

    #[test]
    fn thirty_bands_of_a_year_stay_small() {
        let bands: Vec<LevelAgainstWind> = (0..30).map(|_| band(8760)).collect();
        let svg = assert_sound(&level_against_wind_grid("All bands", &[], &bands));
        assert_eq!(svg.matches(">125 Hz<").count(), 30);
        assert!(assert_sound(&level_against_wind_grid("No band", &[], &[])).contains("no data"));
        assert_sound(&level_against_wind_grid("One band", &[], &bands[..1]));
        assert_sound(&level_against_wind_grid("An empty band", &[], &[band(0)]));
    }

    #[test]
    fn the_median_mark_sits_at_the_median() {
        // All winds at 10 m/s, levels 50 to 60: the median 55 lies at half the height of the cells.
        let mut input = band(0);
        input.wind_m_s = vec![10.0; 11];
        input.level_db = (50..=60).map(f64::from).collect();
        input.curve.clear();
        (input.floor_db, input.onset_m_s) = (Estimate::NotResolved, Estimate::NotResolved);
        let svg = level_against_wind(&input).svg();
        let document = resvg::usvg::roxmltree::Document::parse(&svg).unwrap();
        let circles: Vec<f64> = document
            .descendants()
            .filter(|n| n.has_tag_name("circle"))
            .filter_map(|n| n.attribute("cy").and_then(|v| v.parse().ok()))
            .collect();
        let tick = |label: &str| -> f64 {
            let mut texts = document.descendants().filter(|n| n.has_tag_name("text") && n.text() == Some(label));
            texts.next().and_then(|n| n.attribute("y")).and_then(|v| v.parse().ok()).unwrap()
        };
        // One mark in the panel and one in the key; tick labels sit 3.8 pixels below their tick.
        assert!((circles[0] - (f64::midpoint(tick("50"), tick("60")) - 3.8)).abs() < 0.2, "{circles:?}");
        assert_eq!(circles.len(), 2);
    }
}
