//! Polar view of a directional spectrum: where waves come from, on rings of frequency, with the wind.

use super::colour::{CLASSES, CURVE, HAIR, INK, MUTED, PAPER, RULE};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::number;
use super::panel::{MARGIN, header};
use super::svg::{Anchor, Canvas, Stroke, Style};
use crate::model::SpectrumAxes;
use std::f64::consts::{PI, TAU};

/// Decibels between two shades.
const SHADE_STEP_DB: f64 = 5.0;

/// A spectrum to look at.
#[derive(Debug, Clone, PartialEq)]
pub struct PolarSpectrum {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Its axes.
    pub axes: SpectrumAxes,
    /// Density, m2/Hz/rad, frequency by frequency.
    pub density_m2_hz_rad: Vec<f64>,
    /// Wind: speed (m/s) and the direction it comes from (degrees).
    pub wind: Option<(f64, f64)>,
    /// Peak frequency of the wind sea, Hz: a dashed ring.
    pub wind_sea_peak_hz: Option<f64>,
    /// Largest frequency drawn, Hz.
    pub highest_hz: f64,
}

/// Draws the spectrum by the direction waves come from, north up, the radius growing with the logarithm of frequency; seven
/// shades of 5 dB below the maximum. The arrow points the way the wind blows.
pub fn polar_spectrum(input: &PolarSpectrum) -> Figure {
    const WIDTH: f64 = 520.0;
    const RADIUS: f64 = 190.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + 22.0;
    let centre = (WIDTH / 2.0, top + RADIUS);
    let frequency = &input.axes.frequency_hz;
    let lowest = input.axes.frequency_edges_hz.first().copied().unwrap_or(0.04).max(1e-4);
    let highest = input.highest_hz.min(input.axes.frequency_edges_hz.last().copied().unwrap_or(1.0)).max(lowest * 1.5);
    // The first ring keeps a hole, so that low frequencies can be seen.
    let radius = |f: f64| RADIUS * (0.12 + 0.88 * libm::log(f / lowest) / libm::log(highest / lowest));
    let at = |f: f64, from: f64| {
        let r = radius(f);
        (centre.0 + r * libm::sin(from), centre.1 - r * libm::cos(from))
    };
    let most = input.density_m2_hz_rad.iter().copied().filter(|d| d.is_finite()).fold(0.0, f64::max);
    let directions = input.axes.directions();
    for (shade, colour) in CLASSES.iter().rev().enumerate() {
        for (k, f) in frequency.iter().enumerate().filter(|(_, f)| **f <= highest) {
            let (inner, outer) =
                (input.axes.frequency_edges_hz[k].max(lowest), input.axes.frequency_edges_hz[k + 1].min(highest));
            if inner >= outer || *f <= 0.0 {
                continue;
            }
            for i in 0..directions {
                let density = input.density_m2_hz_rad.get(k * directions + i).copied().unwrap_or(f64::NAN);
                let below_db = -10.0 * libm::log10(density / most);
                let here = below_db >= 0.0 && (below_db / SHADE_STEP_DB) as usize == shade;
                if here {
                    let from = input.axes.direction_to_rad[i] + PI;
                    let half = 0.5 * input.axes.direction_width_rad[i] + 0.002;
                    canvas.polygon(&sector(&at, inner, outer * 1.008, from - half, from + half), colour, 1.0);
                }
            }
        }
    }
    rings(&mut canvas, centre, &radius, lowest, highest, RADIUS);
    if let Some(peak) = input.wind_sea_peak_hz.filter(|f| *f > lowest && *f < highest) {
        let ring: Vec<(f64, f64)> = (0..=72).map(|i| at(peak, f64::from(i) * TAU / 72.0)).collect();
        canvas.polyline(&ring, Stroke::dashed(CURVE, 1.4, "4 3"));
    }
    if let Some((speed, from_deg)) = input.wind {
        wind_arrow(&mut canvas, centre, RADIUS, from_deg.to_radians(), speed);
    }
    if most <= 0.0 {
        canvas.text(centre, "no energy", Style::new(12.0, MUTED).at(Anchor::Middle).over_data());
    }
    let foot = centre.1 + RADIUS + 34.0;
    let mut entries: Vec<(Sample, String)> = CLASSES
        .iter()
        .rev()
        .enumerate()
        .map(|(i, colour)| {
            (Sample::Area(colour, 1.0), format!("{}", -SHADE_STEP_DB * (i + 1) as f64).replace('-', "\u{2212}"))
        })
        .collect();
    if input.wind_sea_peak_hz.is_some() {
        entries.push((Sample::Line(Stroke::dashed(CURVE, 1.4, "4 3")), "wind-sea peak".to_owned()));
    }
    canvas.text((MARGIN, foot), "Density down to this many decibels below its maximum:", Style::new(11.0, MUTED));
    let bottom = keys(&mut canvas, foot + 4.0, WIDTH - MARGIN, &entries);
    canvas.text(
        (MARGIN, bottom + 8.0),
        "Waves come from where they are drawn; the arrow points the way the wind blows.",
        Style::new(11.0, MUTED),
    );
    Figure::new(&input.title, WIDTH, bottom + 20.0, canvas)
}

/// A cell of the ring in a few straight pieces.
fn sector(at: &dyn Fn(f64, f64) -> (f64, f64), inner: f64, outer: f64, from: f64, to: f64) -> Vec<(f64, f64)> {
    const PIECES: i32 = 3;
    let angle = |i: i32| from + (to - from) * f64::from(i) / f64::from(PIECES);
    let mut points: Vec<_> = (0..=PIECES).map(|i| at(inner, angle(i))).collect();
    points.extend((0..=PIECES).rev().map(|i| at(outer, angle(i))));
    points
}

fn rings(canvas: &mut Canvas, centre: (f64, f64), radius: &dyn Fn(f64) -> f64, lowest: f64, highest: f64, outer: f64) {
    for f in [0.05, 0.1, 0.2, 0.5, 1.0, 2.0].into_iter().filter(|f| *f > lowest * 1.05 && *f < highest * 0.97) {
        let ring: Vec<(f64, f64)> = (0..=72)
            .map(|i| {
                let angle = f64::from(i) * TAU / 72.0;
                (centre.0 + radius(f) * libm::sin(angle), centre.1 - radius(f) * libm::cos(angle))
            })
            .collect();
        canvas.polyline(&ring, Stroke::solid(HAIR, 1.0));
        let label = (centre.0 + radius(f) * 0.707 + 2.0, centre.1 + radius(f) * 0.707 + 2.0);
        canvas.text(label, &number::frequency(f), Style::new(10.5, MUTED).over_data());
    }
    let edge: Vec<(f64, f64)> = (0..=72)
        .map(|i| {
            let angle = f64::from(i) * TAU / 72.0;
            (centre.0 + outer * libm::sin(angle), centre.1 - outer * libm::cos(angle))
        })
        .collect();
    canvas.polyline(&edge, Stroke::solid(RULE, 1.0));
    for (name, angle) in [("N", 0.0), ("E", 0.5 * PI), ("S", PI), ("W", 1.5 * PI)] {
        let (sine, cosine) = (libm::sin(angle), libm::cos(angle));
        let tick = |r: f64| (centre.0 + r * sine, centre.1 - r * cosine);
        canvas.line(tick(outer), tick(outer + 5.0), Stroke::solid(RULE, 1.0));
        let at = tick(outer + 14.0);
        canvas.text((at.0, at.1 + 4.0), name, Style::new(12.0, INK).at(Anchor::Middle));
    }
}

/// From the rim towards the centre, with its speed at the tail.
fn wind_arrow(canvas: &mut Canvas, centre: (f64, f64), outer: f64, from: f64, speed_m_s: f64) {
    let (sine, cosine) = (libm::sin(from), libm::cos(from));
    let along = |r: f64, aside: f64| (centre.0 + r * sine + aside * cosine, centre.1 - r * cosine + aside * sine);
    let (tail, tip) = (outer * 0.97, outer * 0.60);
    canvas.line(along(tail, 0.0), along(tip + 8.0, 0.0), Stroke::solid(PAPER, 6.0));
    canvas.line(along(tail, 0.0), along(tip + 8.0, 0.0), Stroke::solid(INK, 2.6));
    canvas.outlined(
        &[along(tip, 0.0), along(tip + 13.0, -6.0), along(tip + 13.0, 6.0)],
        INK,
        Stroke::solid(PAPER, 1.0),
    );
    let label = along(tail - 4.0, 16.0);
    canvas.text(
        (label.0, label.1 + 4.0),
        &number::quantity(speed_m_s, 1, "m/s"),
        Style::new(11.0, INK).at(Anchor::Middle).over_data(),
    );
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    fn input() -> PolarSpectrum {
        let frequency_hz: Vec<f64> = (0..30).map(|k| 0.04 * libm::pow(1.1, f64::from(k))).collect();
        let directions: Vec<f64> = (0..24).map(|i| f64::from(i) * TAU / 24.0).collect();
        let axes = SpectrumAxes::new(frequency_hz, None, directions).unwrap();
        let density = axes
            .frequency_hz
            .iter()
            .flat_map(|f| {
                let shape = libm::exp(-(libm::log(f / 0.12)) * (libm::log(f / 0.12)) * 6.0);
                axes.direction_to_rad
                    .iter()
                    .map(|to| shape * libm::pow(0.5 + 0.5 * libm::cos(to - 1.0), 3.0))
                    .collect::<Vec<_>>()
            })
            .collect();
        PolarSpectrum {
            title: "Spectrum".to_owned(),
            notes: vec!["2031-01-01 00:00 UTC".to_owned()],
            axes,
            density_m2_hz_rad: density,
            wind: Some((9.0, 237.0)),
            wind_sea_peak_hz: Some(0.12),
            highest_hz: 0.6,
        }
    }

    #[test]
    fn a_spectrum_and_an_empty_one_are_drawn() {
        let svg = assert_sound(&polar_spectrum(&input()));
        assert!(svg.contains("wind-sea peak"));
        let empty = PolarSpectrum { density_m2_hz_rad: vec![0.0; 720], wind: None, wind_sea_peak_hz: None, ..input() };
        assert!(assert_sound(&polar_spectrum(&empty)).contains(">no energy<"));
        assert_sound(&polar_spectrum(&PolarSpectrum { density_m2_hz_rad: vec![f64::NAN; 720], ..input() }));
    }

    /// The peak of waves going to 1 rad (57 degrees) lies at the lower left: they come from 237 degrees.
    #[test]
    fn waves_are_drawn_where_they_come_from() {
        let figure = polar_spectrum(&input());
        let svg = figure.svg();
        let darkest = CLASSES[CLASSES.len() - 1];
        let first =
            svg.lines().find(|line| line.contains("<path") && line.contains(darkest)).expect("the darkest cell");
        let start = first.split("d=\"M").nth(1).unwrap();
        let x: f64 = start.split(' ').next().unwrap().parse().unwrap();
        assert!(x < figure.size_px().0 / 2.0, "{first}");
    }
}
