//! Overlap of two equal lobes over half-separation and width, with the path that a model's spectra take.

use super::axis::Axis;
use super::colour::{CLASSES, CURVE, INK, MUTED, PAPER};
use super::figure::Figure;
use super::mark::{Sample, Shape, keys};
use super::number;
use super::panel::{MARGIN, OVER_PANEL, Panel, UNDER_PANEL, header};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// Lower ends of the shades, dB re isotropic, from dark to light; the last takes all below.
const STEPS_DB: [f64; 6] = [3.0, 0.0, -3.0, -6.0, -12.0, -24.0];

/// Two lobes fitted at one f / fp.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LobePoint {
    /// f / fp of the wind sea.
    pub x: f64,
    /// Half of the angle between the lobes, degrees.
    pub half_separation_deg: f64,
    /// Standard deviation of each lobe, degrees.
    pub width_deg: f64,
}

/// A named path of lobes, such as a model's medians or a published law.
#[derive(Debug, Clone, PartialEq)]
pub struct LobePath {
    /// Its name in the key.
    pub name: String,
    /// Points in the order of f / fp.
    pub points: Vec<LobePoint>,
}

/// The map and the paths on it.
#[derive(Debug, Clone, PartialEq)]
pub struct OverlapMap {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// Overlap (dB re isotropic) of lobes of this half-separation (degrees, 0 to 90, equal steps; outer) and width (degrees, 5
    /// to 50, equal steps; inner).
    pub overlap_db: Vec<Vec<f64>>,
    /// Paths; the first is drawn with a full line.
    pub paths: Vec<LobePath>,
}

/// Range of widths on the map, degrees.
pub const MAP_WIDTHS_DEG: (f64, f64) = (5.0, 50.0);
/// Range of half-separations on the map, degrees.
pub const MAP_HALF_SEPARATIONS_DEG: (f64, f64) = (0.0, 90.0);

/// Draws the overlap in shades, and each path with its f / fp written at some of its points.
pub fn overlap_map(input: &OverlapMap) -> Figure {
    const WIDTH: f64 = 640.0;
    const HEIGHT: f64 = 330.0;
    let mut canvas = Canvas::default();
    let top = header(&mut canvas, WIDTH, &input.title, &input.notes) + OVER_PANEL;
    let y = Axis::linear(MAP_WIDTHS_DEG.0, MAP_WIDTHS_DEG.1, top + HEIGHT, top);
    let left = MARGIN + y.label_width() + 12.0;
    let (low, high) = MAP_HALF_SEPARATIONS_DEG;
    let panel = Panel { x: Axis::linear(low, high, left, WIDTH - MARGIN - 8.0), y };
    shades(&mut canvas, &panel, &input.overlap_db);
    for (i, path) in input.paths.iter().enumerate() {
        draw_path(&mut canvas, &panel, path, i);
    }
    if input.overlap_db.is_empty() && input.paths.iter().all(|p| p.points.is_empty()) {
        panel.no_data(&mut canvas, "no data");
    }
    panel.axes(&mut canvas, true);
    panel.y_title(&mut canvas, "Width of each lobe (degrees)", MARGIN);
    panel.x_title(&mut canvas, "Half of the angle between the lobes (degrees)");
    let mut entries: Vec<(Sample, String)> = Vec::new();
    for (i, path) in input.paths.iter().enumerate() {
        entries.push((Sample::Mark(Shape::of(i), colour(i), i == 0), format!("{}, with f / fp", path.name)));
    }
    for (shade, text) in [
        "above 3 dB",
        "0 to 3",
        "\u{2212}3 to 0",
        "\u{2212}6 to \u{2212}3",
        "\u{2212}12 to \u{2212}6",
        "\u{2212}24 to \u{2212}12",
        "below \u{2212}24 dB",
    ]
    .into_iter()
    .enumerate()
    {
        entries.push((Sample::Area(shade_colour(shade), 1.0), text.to_owned()));
    }
    let bottom = keys(&mut canvas, panel.bottom() + UNDER_PANEL + 4.0, WIDTH - MARGIN, &entries);
    canvas.text((MARGIN, bottom + 8.0), "Shades: overlap of opposing waves re isotropic.", Style::new(11.0, MUTED));
    Figure::new(&input.title, WIDTH, bottom + 20.0, canvas)
}

/// Light enough in the middle for a path to be seen: only the ends are dark.
fn shade_colour(shade: usize) -> &'static str {
    CLASSES[CLASSES.len() - 1 - shade.min(CLASSES.len() - 1)]
}

fn shades(canvas: &mut Canvas, panel: &Panel, overlap_db: &[Vec<f64>]) {
    let columns = overlap_db.len().max(1) as f64;
    for shade in 0..=STEPS_DB.len() {
        let mut rects = Vec::new();
        for (i, column) in overlap_db.iter().enumerate() {
            let rows = column.len().max(1) as f64;
            for (j, value) in column.iter().enumerate() {
                let of = STEPS_DB.iter().position(|step| value >= step).unwrap_or(STEPS_DB.len());
                if of == shade && !value.is_nan() {
                    let (w, h) = (panel.width() / columns, panel.height() / rows);
                    rects.push((panel.left() + i as f64 * w, panel.bottom() - (j + 1) as f64 * h, w + 0.2, h + 0.2));
                }
            }
        }
        canvas.rects(&rects, shade_colour(shade));
    }
}

fn colour(index: usize) -> &'static str {
    if index == 0 { CURVE } else { INK }
}

fn draw_path(canvas: &mut Canvas, panel: &Panel, path: &LobePath, index: usize) {
    let line = || path.points.iter().map(|p| (p.half_separation_deg, p.width_deg));
    let dash = if index == 0 { "" } else { "6 3" };
    panel.line(canvas, line(), Stroke::solid(PAPER, 4.5));
    panel.line(canvas, line(), Stroke::dashed(colour(index), 2.0, dash));
    let mut written: Vec<(f64, f64)> = Vec::new();
    for point in &path.points {
        let at = panel.at(point.half_separation_deg, point.width_deg);
        if !panel.encloses(at) {
            continue;
        }
        Shape::of(index).draw(canvas, at, 3.4, colour(index), index == 0);
        let free = written.iter().all(|w| libm::hypot(w.0 - at.0, w.1 - at.1) > 26.0);
        if free && at.0 < panel.right() - 24.0 {
            let style = Style::new(10.5, INK).over_data().at(Anchor::Start);
            canvas.text((at.0 + 6.0, at.1 - 5.0), &number::fixed(point.x, 1), style);
            written.push(at);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    #[test]
    fn paths_are_drawn_on_the_shades() {
        let path = |name: &str, shift: f64| LobePath {
            name: name.to_owned(),
            points: (0..8)
                .map(|i| LobePoint {
                    x: 1.0 + f64::from(i),
                    half_separation_deg: 10.0 * f64::from(i) + shift,
                    width_deg: 20.0 + f64::from(i) + shift,
                })
                .collect(),
        };
        let map = OverlapMap {
            title: "Lobes".to_owned(),
            notes: Vec::new(),
            overlap_db: (0..30).map(|i| (0..20).map(|j| f64::from(i - 25) + f64::from(j) / 4.0).collect()).collect(),
            paths: vec![path("model", 0.0), path("a law", 4.0)],
        };
        let svg = assert_sound(&overlap_map(&map));
        assert!(svg.contains("a law, with f / fp") && svg.contains(">1.0<"));
        let empty = OverlapMap { overlap_db: Vec::new(), paths: Vec::new(), ..map };
        assert!(assert_sound(&overlap_map(&empty)).contains(">no data<"));
    }
}
