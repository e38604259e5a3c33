//! Spectra by wind class: percentiles of level per band, for calm to strong wind.

use super::axis::{Axis, Labels, padded_range};
use super::colour::{CLASSES, INK, MUTED};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::number;
use super::panel::{MARGIN, OVER_PANEL, Panel, UNDER_PANEL, header};
use super::svg::{Canvas, Stroke, Style};

/// Dashes repeat so that neighbours differ also where the colours are close.
const DASHES: [&str; 3] = ["", "8 3", "3 3"];

/// The level percentiles of one wind class.
#[derive(Debug, Clone, PartialEq)]
pub struct WindClassSpectrum {
    /// Short name, written at the line: `calm`, `strong`, `Beaufort 4`.
    pub name: String,
    /// Its edges in words, for the key: `below 3 m/s`, `3 to 8 m/s`.
    pub edges: String,
    /// Number of windows in it.
    pub count: usize,
    /// Band centres, Hz, rising.
    pub frequency_hz: Vec<f64>,
    /// 10 % percentile of level, dB, in step with the frequencies; NaN where missing.
    pub p10_db: Vec<f64>,
    /// Median level, dB.
    pub p50_db: Vec<f64>,
    /// 90 % percentile of level, dB.
    pub p90_db: Vec<f64>,
}

/// All classes of one site.
#[derive(Debug, Clone, PartialEq)]
pub struct SpectraByWindClass {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Quantity and reference, such as `Spectral density level (dB re 1 µPa² Hz⁻¹)`.
    pub level_label: String,
    /// From calm to strong.
    pub classes: Vec<WindClassSpectrum>,
}

/// Draws medians per class with the 10 to 90 % range shaded; with more than four classes only those of the first and last.
pub fn spectra_by_wind_class(input: &SpectraByWindClass) -> Figure {
    const WIDTH: f64 = 720.0;
    const HEIGHT: f64 = 360.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let classes = &input.classes;
    let levels = classes.iter().flat_map(|c| c.p10_db.iter().chain(&c.p50_db).chain(&c.p90_db)).copied();
    let (low, high) = padded_range(levels, 0.05);
    let y = Axis::linear(low, high, top + HEIGHT, top);
    let style = Style::new(11.0, INK);
    let room = classes.iter().map(|c| style.width(&c.name)).fold(0.0, f64::max);
    let frequencies = classes.iter().flat_map(|c| &c.frequency_hz).copied().filter(|f| *f > 0.0 && f.is_finite());
    let (first, last) = frequencies.fold((f64::INFINITY, 0.0_f64), |(a, b), f| (a.min(f), b.max(f)));
    let (first, last) = if first > last { (10.0, 10_000.0) } else { (first / 1.12, last * 1.12) };
    let left = MARGIN + y.label_width() + 12.0;
    let x = Axis::log(first, last, left, WIDTH - MARGIN - room - 16.0, Labels::Kilo);
    let panel = Panel { x, y };
    panel.grid(&mut canvas);
    let shaded = |i: usize| classes.len() <= 4 || i == 0 || i + 1 == classes.len();
    for (i, class) in classes.iter().enumerate().filter(|(i, _)| shaded(*i)) {
        let band = class.frequency_hz.iter().zip(class.p10_db.iter().zip(&class.p90_db));
        panel.band(&mut canvas, band.map(|(f, (a, b))| (*f, *a, *b)), colour(i, classes.len()), 0.18);
    }
    for (i, class) in classes.iter().enumerate() {
        let line = class.frequency_hz.iter().zip(&class.p50_db).map(|(f, l)| (*f, *l));
        panel.line(&mut canvas, line, stroke(i, classes.len()));
    }
    name_lines(&mut canvas, &panel, classes, style);
    if !classes.iter().any(|c| c.p50_db.iter().any(|v| v.is_finite())) {
        panel.no_data(&mut canvas, "no data");
    }
    panel.axes(&mut canvas, true);
    panel.y_title(&mut canvas, &input.level_label, MARGIN);
    panel.x_title(&mut canvas, "Frequency (Hz)");
    let mut entries: Vec<(Sample, String)> = Vec::new();
    for (i, class) in classes.iter().enumerate() {
        let text = format!("{}: {}, N = {}", class.name, class.edges, number::count(class.count));
        entries.push((Sample::Line(stroke(i, classes.len())), text));
    }
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &entries);
    let note = if classes.len() > 4 {
        "Lines: median. Shaded: 10 to 90 % of windows, first and last class only."
    } else {
        "Lines: median. Shaded: 10 to 90 % of windows."
    };
    canvas.text((MARGIN, bottom + 8.0), note, Style::new(11.0, MUTED));
    Figure::new(&input.title, WIDTH, bottom + 20.0, canvas)
}

/// Class names at the right end of their lines, moved apart where they would touch.
fn name_lines(canvas: &mut Canvas, panel: &Panel, classes: &[WindClassSpectrum], style: Style) {
    let mut names: Vec<(f64, &str, usize)> = Vec::new();
    for (i, class) in classes.iter().enumerate() {
        if let Some(level) = class.p50_db.iter().rev().find(|v| v.is_finite()) {
            names.push((panel.y.px(*level).clamp(panel.top(), panel.bottom()), &class.name, i));
        }
    }
    names.sort_by(|a, b| a.0.total_cmp(&b.0));
    for _ in 0..60 {
        for i in 1..names.len() {
            let overlap = 12.5 - (names[i].0 - names[i - 1].0);
            if overlap > 0.0 {
                names[i - 1].0 -= overlap / 2.0;
                names[i].0 += overlap / 2.0;
            }
        }
    }
    for (y, name, i) in names {
        let line = stroke(i, classes.len());
        canvas.line((panel.right() + 2.0, y), (panel.right() + 10.0, y), Stroke::solid(line.colour, 3.0));
        canvas.text((panel.right() + 14.0, y + 4.0), name, style);
    }
}

fn colour(index: usize, count: usize) -> &'static str {
    // Few classes use the far ends of the scale.
    let place = if count < 2 { 3 } else { (index * (CLASSES.len() - 1) + (count - 1) / 2) / (count - 1) };
    CLASSES[place.min(CLASSES.len() - 1)]
}

fn stroke(index: usize, count: usize) -> Stroke {
    let dash = if count > 3 { DASHES[index % 3] } else { "" };
    Stroke::dashed(colour(index, count), 2.0, dash)
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input(classes: usize) -> SpectraByWindClass {
        let frequency_hz: Vec<f64> = (0..20).map(|i| libm::pow(10.0, 1.0 + f64::from(i) / 10.0)).collect();
        let level = |class: usize, add: f64| {
            frequency_hz.iter().map(move |f| 80.0 - 5.0 * libm::log10(*f) + class as f64 + add)
        };
        SpectraByWindClass {
            title: "Spectra".to_owned(),
            notes: Vec::new(),
            level_label: "Level (dB re 1 µPa²)".to_owned(),
            classes: (0..classes)
                .map(|i| WindClassSpectrum {
                    name: format!("class {i}"),
                    edges: format!("{i} to {} m/s", i + 1),
                    count: 12_000,
                    frequency_hz: frequency_hz.clone(),
                    p10_db: level(i, -3.0).collect(),
                    p50_db: level(i, 0.0).collect(),
                    p90_db: level(i, 3.0).collect(),
                })
                .collect(),
        }
    }

    #[test]
    fn classes_are_named_and_counted() {
        for count in [1, 3, 4, 7, 13] {
            let svg = assert_sound(&spectra_by_wind_class(&input(count)));
            assert_eq!(svg.matches("N = 12\u{a0}000").count(), count);
        }
        assert!(assert_sound(&spectra_by_wind_class(&input(0))).contains("no data"));
        let mut gaps = input(3);
        gaps.classes[1].p50_db.fill(f64::NAN);
        gaps.classes[0].p90_db[4] = f64::NAN;
        gaps.classes[2].p10_db.truncate(3);
        assert_sound(&spectra_by_wind_class(&gaps));
    }

    #[test]
    fn classes_of_any_count_use_different_colours_or_dashes() {
        for count in 2..=13 {
            let looks: Vec<_> = (0..count).map(|i| (stroke(i, count).colour, stroke(i, count).dash)).collect();
            assert!((1..count).all(|i| looks[i] != looks[i - 1]), "{looks:?}");
        }
    }
}
