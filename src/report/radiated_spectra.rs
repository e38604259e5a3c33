//! Measured and radiated spectra by wind class: what the sea should sound like, and what was heard.

use super::axis::{Axis, Labels, padded_range};
use super::colour::{CLASSES, INK, MUTED};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::number;
use super::panel::{MARGIN, OVER_PANEL, Panel, UNDER_PANEL, header};
use super::svg::{Canvas, Stroke, Style};

/// Medians of one wind class.
#[derive(Debug, Clone, PartialEq)]
pub struct RadiatedClass {
    /// Its edges in words: `3 to 8 m/s`.
    pub name: String,
    /// Number of windows in it.
    pub count: usize,
    /// Median measured level, dB, in step with the frequencies; NaN where missing.
    pub measured_db: Vec<f64>,
    /// Median radiated level with the site offset, dB; NaN where undefined.
    pub radiated_db: Vec<f64>,
    /// From this place on the radiated level comes from the laid-on tail; the number of frequencies for none.
    pub tail_from: usize,
}

/// Spectra of one site and model.
#[derive(Debug, Clone, PartialEq)]
pub struct RadiatedSpectra {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Quantity and reference.
    pub level_label: String,
    /// Band centres, Hz, rising.
    pub frequency_hz: Vec<f64>,
    /// From calm to strong.
    pub classes: Vec<RadiatedClass>,
}

/// Draws the measured medians as full lines and the radiated ones as dashed lines of the same colour, dotted in the tail.
pub fn radiated_spectra(input: &RadiatedSpectra) -> Figure {
    const WIDTH: f64 = 720.0;
    const HEIGHT: f64 = 360.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let measured = input.classes.iter().flat_map(|c| &c.measured_db).copied();
    let (floor, _) = padded_range(measured.clone(), 0.0);
    // Radiated levels fall without end below the noise: the axis ends a little below what was heard.
    let radiated = input.classes.iter().flat_map(|c| &c.radiated_db).copied().map(move |level| level.max(floor - 12.0));
    let (low, high) = padded_range(measured.chain(radiated).collect::<Vec<_>>().into_iter(), 0.04);
    let y = Axis::linear(low, high, top + HEIGHT, top);
    let left = MARGIN + y.label_width() + 12.0;
    let frequencies = input.frequency_hz.iter().copied().filter(|f| *f > 0.0 && f.is_finite());
    let (first, last) = frequencies.fold((f64::INFINITY, 0.0_f64), |(a, b), f| (a.min(f), b.max(f)));
    let (first, last) = if first > last { (0.5, 10.0) } else { (first / 1.12, last * 1.12) };
    let panel = Panel { x: Axis::log(first, last, left, WIDTH - MARGIN - 8.0, Labels::Kilo), y };
    panel.grid(&mut canvas);
    for (i, class) in input.classes.iter().enumerate() {
        let colour = colour(i, input.classes.len());
        let line = |values: &[f64], from: usize, to: usize| -> Vec<(f64, f64)> {
            input.frequency_hz.iter().copied().zip(values.iter().copied()).take(to).skip(from).collect()
        };
        let count = input.frequency_hz.len();
        let tail = class.tail_from.min(count);
        panel.line(&mut canvas, line(&class.measured_db, 0, count), Stroke::solid(colour, 2.0));
        panel.line(&mut canvas, line(&class.radiated_db, 0, (tail + 1).min(count)), Stroke::dashed(colour, 1.8, "7 4"));
        panel.line(&mut canvas, line(&class.radiated_db, tail, count), Stroke::dashed(colour, 1.5, "2 3"));
        let dots: Vec<(f64, f64)> = line(&class.measured_db, 0, count)
            .into_iter()
            .map(|(f, l)| panel.at(f, l))
            .filter(|p| panel.encloses(*p))
            .collect();
        canvas.dots(&dots, 2.2, colour, 1.0);
    }
    if !input.classes.iter().any(|c| c.measured_db.iter().any(|v| v.is_finite())) {
        panel.no_data(&mut canvas, "no data");
    }
    panel.axes(&mut canvas, true);
    panel.y_title(&mut canvas, &input.level_label, MARGIN);
    panel.x_title(&mut canvas, "Frequency of the sound (Hz)");
    let mut entries: Vec<(Sample, String)> = vec![
        (Sample::Line(Stroke::solid(INK, 2.0)), "measured".to_owned()),
        (
            Sample::Line(Stroke::dashed(INK, 1.8, "7 4")),
            "radiated by the model's waves, with the site offset".to_owned(),
        ),
        (Sample::Line(Stroke::dashed(INK, 1.5, "2 3")), "from the laid-on tail".to_owned()),
    ];
    for (i, class) in input.classes.iter().enumerate() {
        let text = format!("{}, N = {}", class.name, number::count(class.count));
        entries.push((Sample::Area(colour(i, input.classes.len()), 1.0), text));
    }
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &entries);
    canvas.text((MARGIN, bottom + 8.0), "Lines: medians over the windows of a wind class.", Style::new(11.0, MUTED));
    Figure::new(&input.title, WIDTH, bottom + 20.0, canvas)
}

fn colour(index: usize, count: usize) -> &'static str {
    let last = CLASSES.len() - 1;
    CLASSES[if count < 2 { last } else { index * last / (count - 1) }]
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    #[test]
    fn classes_and_nothing_are_drawn() {
        let class = |i: i32| RadiatedClass {
            name: format!("{i} m/s"),
            count: 100,
            measured_db: (0..10).map(|k| 90.0 - 5.0 * f64::from(k) + f64::from(i)).collect(),
            radiated_db: (0..10).map(|k| if k == 9 { f64::NEG_INFINITY } else { 88.0 - 6.0 * f64::from(k) }).collect(),
            tail_from: 6,
        };
        let figure = RadiatedSpectra {
            title: "Spectra".to_owned(),
            notes: Vec::new(),
            level_label: "Spectral density level (dB re 1 µPa² Hz⁻¹)".to_owned(),
            frequency_hz: (0..10).map(|k| 0.5 * libm::pow(10.0, f64::from(k) / 10.0)).collect(),
            classes: (0..4).map(class).collect(),
        };
        assert!(assert_sound(&radiated_spectra(&figure)).contains("from the laid-on tail"));
        let none = RadiatedSpectra { frequency_hz: Vec::new(), classes: Vec::new(), ..figure };
        assert!(assert_sound(&radiated_spectra(&none)).contains(">no data<"));
    }
}
