//! Where and when sound could judge spreading: share of windows by month and band, one panel a site.

use super::colour::{CLASSES, HAIR, INK, MUTED, PAPER, RULE};
use super::figure::Figure;
use super::mark::{Sample, keys};
use super::number;
use super::panel::{MARGIN, TEXT_SIZE, header};
use super::svg::{Anchor, Canvas, Stroke, Style};

/// Lower ends of the shades, share of windows.
const STEPS: [f64; 5] = [0.5, 0.3, 0.2, 0.1, 0.03];

/// One cell of the map.
#[derive(Debug, Clone, PartialEq)]
pub struct TestabilityCell {
    /// Share of the windows in which sound could judge, 0 to 1; NaN without windows.
    pub share: f64,
    /// What kept most others out, in a word or two, for the widest cells; empty for none.
    pub reason: String,
}

/// One site (and sensor).
#[derive(Debug, Clone, PartialEq)]
pub struct TestabilitySite {
    /// Its name.
    pub name: String,
    /// Band centres, Hz, rising: the rows from the bottom.
    pub bands_hz: Vec<f64>,
    /// Months in words: the columns.
    pub months: Vec<String>,
    /// Cells, month by month within each band.
    pub cells: Vec<Vec<TestabilityCell>>,
}

/// The map.
#[derive(Debug, Clone, PartialEq)]
pub struct TestabilityMap {
    /// Title.
    pub title: String,
    /// Sentences under the title.
    pub notes: Vec<String>,
    /// One panel each.
    pub sites: Vec<TestabilitySite>,
}

/// Draws a table of shaded cells for each site, the share in percent written in each.
pub fn testability_map(input: &TestabilityMap) -> Figure {
    const WIDTH: f64 = 720.0;
    const ROW: f64 = 22.0;
    let mut canvas = Canvas::default();
    let mut y = header(&mut canvas, WIDTH, &input.title, &input.notes);
    let label = Style::new(11.0, MUTED);
    for site in &input.sites {
        y += 18.0;
        canvas.text((MARGIN, y), &site.name, Style::new(TEXT_SIZE, INK).bold());
        y += 6.0;
        let room = site.bands_hz.iter().map(|f| label.width(&number::frequency(*f))).fold(30.0, f64::max) + 10.0;
        let reasons = site.cells.iter().flatten().any(|c| !c.reason.is_empty());
        let row = if reasons { ROW + 9.0 } else { ROW };
        let width = ((WIDTH - 2.0 * MARGIN - room) / site.months.len().max(1) as f64).min(96.0);
        for (rank, (band, cells)) in site.bands_hz.iter().zip(&site.cells).enumerate() {
            let top = y + (site.bands_hz.len() - 1 - rank) as f64 * row;
            let middle = top + row / 2.0 + 4.0;
            canvas.text((MARGIN + room - 8.0, middle), &number::frequency(*band), label.at(Anchor::End));
            for (month, cell) in cells.iter().enumerate() {
                let left = MARGIN + room + month as f64 * width;
                draw_cell(&mut canvas, (left, top, width, row), cell);
            }
        }
        y += site.bands_hz.len() as f64 * row;
        for (month, name) in site.months.iter().enumerate() {
            let at = (MARGIN + room + (month as f64 + 0.5) * width, y + 14.0);
            canvas.text(at, name, label.at(Anchor::Middle));
        }
        y += 22.0;
    }
    if input.sites.iter().all(|s| s.cells.iter().all(Vec::is_empty)) {
        canvas.text((MARGIN, y + 16.0), "no data", Style::new(TEXT_SIZE, MUTED));
        y += 22.0;
    }
    let mut entries: Vec<(Sample, String)> = ["50 % and more", "30 to 50 %", "20 to 30 %", "10 to 20 %", "3 to 10 %"]
        .into_iter()
        .enumerate()
        .map(|(i, text)| (Sample::Area(colour_of(STEPS[i]).0, 1.0), text.to_owned()))
        .collect();
    entries.push((Sample::Area(PAPER, 1.0), "below 3 %".to_owned()));
    let bottom = keys(&mut canvas, y + 6.0, WIDTH - MARGIN, &entries);
    Figure::new(&input.title, WIDTH, bottom + 8.0, canvas)
}

/// Fill and colour of the text on it.
fn colour_of(share: f64) -> (&'static str, &'static str) {
    match STEPS.iter().position(|step| share >= *step) {
        Some(shade) => (CLASSES[5 - shade], if shade < 3 { PAPER } else { INK }),
        None => (PAPER, MUTED),
    }
}

fn draw_cell(canvas: &mut Canvas, (left, top, width, height): (f64, f64, f64, f64), cell: &TestabilityCell) {
    let corners = [(left, top), (left + width, top), (left + width, top + height), (left, top + height)];
    if cell.share.is_nan() {
        canvas.outlined(&corners, HAIR, Stroke::solid(PAPER, 1.0));
        return;
    }
    let (fill, ink) = colour_of(cell.share);
    canvas.outlined(&corners, fill, Stroke::solid(RULE, 0.6));
    let middle = left + width / 2.0;
    let text = format!("{:.0} %", 100.0 * cell.share);
    let style = Style::new(11.0, ink).at(Anchor::Middle);
    if width > style.width(&text) + 2.0 {
        let lift = if cell.reason.is_empty() { 4.0 } else { -1.0 };
        canvas.text((middle, top + height / 2.0 + lift), &text, style);
    }
    let small = Style::new(9.0, ink).at(Anchor::Middle);
    if width > small.width(&cell.reason) + 2.0 {
        canvas.text((middle, top + height / 2.0 + 10.0), &cell.reason, small);
    }
}

#[cfg(test)]
mod tests {
    use super::super::figure::assert_sound;
    use super::*;

    #[test]
    fn every_month_and_band_has_its_cell() {
        let cell = |month: usize, band: usize| TestabilityCell {
            share: if month == 3 { f64::NAN } else { (month * band) as f64 / 40.0 },
            reason: if band == 0 { "floor".to_owned() } else { String::new() },
        };
        let map = TestabilityMap {
            title: "Testability".to_owned(),
            notes: vec!["Share of hours".to_owned()],
            sites: vec![TestabilitySite {
                name: "reef, H1".to_owned(),
                bands_hz: vec![0.63, 1.0, 2.0],
                months: (1..=12).map(|m| format!("2031-{m:02}")).collect(),
                cells: (0..3).map(|band| (0..12).map(|month| cell(month, band)).collect()).collect(),
            }],
        };
        let svg = assert_sound(&testability_map(&map));
        assert!(svg.contains("55 %") && svg.contains(">2031-12<"));
        assert!(assert_sound(&testability_map(&TestabilityMap { sites: Vec::new(), ..map })).contains(">no data<"));
    }
}
