//! The embedded font: measuring text, and handing the faces to the renderer.
//!
//! Text is measured from the same glyph widths that the renderer and the browser use, so that labels never
//! overlap because a letter is wider than its bytes suggest (a superscript minus takes three bytes).

use std::sync::{Arc, LazyLock};

use resvg::usvg::fontdb;

/// The family name inside the embedded files.
pub(crate) const FAMILY: &str = "Underwind Sans";
/// What `font-family` lists: the embedded family first, then what a viewer may have.
pub(crate) const FAMILY_LIST: &str = "Underwind Sans, Noto Sans, Open Sans, sans-serif";

const REGULAR: &[u8] = include_bytes!("font/regular.ttf");
const BOLD: &[u8] = include_bytes!("font/bold.ttf");
const REGULAR_WOFF2: &[u8] = include_bytes!("font/regular.woff2");
const BOLD_WOFF2: &[u8] = include_bytes!("font/bold.woff2");

/// Width of a character that the font lacks, in thousandths of the size: wide enough to be safe.
const UNKNOWN_ADVANCE: u16 = 1000;

/// The two weights that are embedded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Weight {
    Regular,
    Bold,
}

/// Width of a text in pixels at a size in pixels, without kerning (the embedded font has none).
pub(crate) fn width(text: &str, size_px: f64, weight: Weight) -> f64 {
    static TABLES: LazyLock<[Advances; 2]> = LazyLock::new(|| [Advances::read(REGULAR), Advances::read(BOLD)]);
    let table = match weight {
        Weight::Regular => &TABLES[0],
        Weight::Bold => &TABLES[1],
    };
    let total: f64 = text.chars().map(|c| f64::from(table.of(c))).sum();
    total * size_px / table.units_per_em
}

/// The faces for the renderer; no font of the machine is ever looked at.
pub(crate) fn database() -> Arc<fontdb::Database> {
    static DATABASE: LazyLock<Arc<fontdb::Database>> = LazyLock::new(|| {
        let mut database = fontdb::Database::new();
        database.load_font_data(REGULAR.to_vec());
        database.load_font_data(BOLD.to_vec());
        database.set_sans_serif_family(FAMILY);
        Arc::new(database)
    });
    Arc::clone(&DATABASE)
}

/// The `@font-face` rules that carry the font inside an SVG or HTML file.
pub(crate) fn face_rules() -> &'static str {
    static RULES: LazyLock<String> = LazyLock::new(|| {
        let rule = |weight: &str, data: &[u8]| {
            format!(
                "@font-face{{font-family:\"{FAMILY}\";font-weight:{weight};src:url(data:font/woff2;base64,{}) format(\"woff2\")}}\n",
                base64(data)
            )
        };
        rule("400", REGULAR_WOFF2) + &rule("700", BOLD_WOFF2)
    });
    &RULES
}

/// Base64 as RFC 4648 section 4 defines it, with padding.
pub(crate) fn base64(data: &[u8]) -> String {
    const LETTERS: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let mut text = String::with_capacity(data.len().div_ceil(3) * 4);
    for chunk in data.chunks(3) {
        let bytes = [chunk[0], chunk.get(1).copied().unwrap_or(0), chunk.get(2).copied().unwrap_or(0)];
        let word = u32::from(bytes[0]) << 16 | u32::from(bytes[1]) << 8 | u32::from(bytes[2]);
        for place in 0..4 {
            if place <= chunk.len() {
                text.push(char::from(LETTERS[(word >> (18 - 6 * place)) as usize & 63]));
            } else {
                text.push('=');
            }
        }
    }
    text
}

/// Advance width per character, read from the `cmap` (format 4) and `hmtx` tables.
struct Advances {
    units_per_em: f64,
    /// Sorted by character.
    widths: Vec<(char, u16)>,
}

impl Advances {
    fn of(&self, c: char) -> u16 {
        self.widths.binary_search_by_key(&c, |entry| entry.0).map_or(UNKNOWN_ADVANCE, |at| self.widths[at].1)
    }

    /// The files are ours and fixed, so a malformed one is a defect that the tests below catch.
    fn read(font: &[u8]) -> Self {
        let widths = read_widths(font).unwrap_or_default();
        let units = table(font, *b"head").and_then(|head| u16_at(head, 18)).unwrap_or(1000);
        Self { units_per_em: f64::from(units), widths }
    }
}

fn u16_at(data: &[u8], at: usize) -> Option<u16> {
    Some(u16::from_be_bytes([*data.get(at)?, *data.get(at + 1)?]))
}

fn u32_at(data: &[u8], at: usize) -> Option<usize> {
    Some(usize::from(u16_at(data, at)?) << 16 | usize::from(u16_at(data, at + 2)?))
}

/// One table of the font file.
fn table(font: &[u8], tag: [u8; 4]) -> Option<&[u8]> {
    let count = usize::from(u16_at(font, 4)?);
    let record = (0..count).map(|i| 12 + 16 * i).find(|&at| font.get(at..at + 4) == Some(&tag))?;
    let start = u32_at(font, record + 8)?;
    font.get(start..start + u32_at(font, record + 12)?)
}

fn read_widths(font: &[u8]) -> Option<Vec<(char, u16)>> {
    let metrics = table(font, *b"hmtx")?;
    let count = usize::from(u16_at(table(font, *b"hhea")?, 34)?);
    let cmap = table(font, *b"cmap")?;
    let records = usize::from(u16_at(cmap, 2)?);
    let map =
        (0..records).filter_map(|i| cmap.get(u32_at(cmap, 4 + 8 * i + 4)?..)).find(|map| u16_at(map, 0) == Some(4))?;
    let segments = usize::from(u16_at(map, 6)?) / 2;
    let mut widths = Vec::new();
    for segment in 0..segments {
        let end = u16_at(map, 14 + 2 * segment)?;
        let start = u16_at(map, 16 + 2 * (segments + segment))?;
        let delta = u16_at(map, 16 + 2 * (2 * segments + segment))?;
        let offset_at = 16 + 2 * (3 * segments + segment);
        let offset = usize::from(u16_at(map, offset_at)?);
        for code in start..=end {
            if code == u16::MAX {
                break;
            }
            let glyph = if offset == 0 {
                code.wrapping_add(delta)
            } else {
                match u16_at(map, offset_at + offset + 2 * usize::from(code - start))? {
                    0 => 0,
                    glyph => glyph.wrapping_add(delta),
                }
            };
            let at = usize::from(glyph).min(count - 1);
            if let Some(c) = char::from_u32(u32::from(code)) {
                widths.push((c, u16_at(metrics, 4 * at)?));
            }
        }
    }
    widths.sort_unstable_by_key(|entry| entry.0);
    Some(widths)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Reference: the text layout of usvg 0.49, an independent reading of the same font.
    #[test]
    fn measured_width_agrees_with_the_renderers_layout() {
        for (weight, name) in [(Weight::Regular, "400"), (Weight::Bold, "700")] {
            // Letters that start and end on a full stem, so that ink box and advance box differ little.
            let text = "HLevel (dB re 1 µPa² Hz⁻¹), 10⁻³ − 5 °C ≤ ≥ → αβΩ 60.1 – 60.7H";
            let svg = format!(
                "<svg xmlns='http://www.w3.org/2000/svg' width='900' height='40'><text x='10' y='30' font-size='20' \
                 font-weight='{name}' font-family='{FAMILY}'>{text}</text></svg>"
            );
            let options = resvg::usvg::Options { fontdb: database(), ..Default::default() };
            let tree = resvg::usvg::Tree::from_str(&svg, &options).unwrap();
            let ink = f64::from(tree.root().bounding_box().width());
            let advance = width(text, 20.0, weight);
            assert!((advance - ink).abs() < 4.5, "{advance} {ink}");
        }
    }

    #[test]
    fn every_sign_that_figures_use_is_in_the_font() {
        let table = Advances::read(REGULAR);
        assert_eq!(table.widths.len(), 315);
        for c in "µ²³⁻¹⁰–−·×°±≤≥≈→←↑↓αβφ½".chars() {
            assert!(table.widths.iter().any(|entry| entry.0 == c), "{c}");
        }
        assert_eq!(table.of('\u{4e2d}'), UNKNOWN_ADVANCE);
    }

    /// Reference: the test vectors of RFC 4648, section 10.
    #[test]
    fn base64_follows_the_standard() {
        for (plain, coded) in
            [("", ""), ("f", "Zg=="), ("fo", "Zm8="), ("foo", "Zm9v"), ("foob", "Zm9vYg=="), ("foobar", "Zm9vYmFy")]
        {
            assert_eq!(base64(plain.as_bytes()), coded);
        }
    }
}
