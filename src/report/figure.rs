//! A finished drawing, as SVG text and as PNG bytes.

use resvg::{tiny_skia, usvg};

use super::font;
use super::svg::{Canvas, escape, root};

/// Why a drawing could not be turned into an image.
#[derive(Debug, thiserror::Error)]
pub enum FigureError {
    /// The renderer did not accept the drawing: a defect of this program.
    #[error("figure `{title}`: the drawing could not be read back: {reason}")]
    Render {
        /// The figure's title.
        title: String,
        /// What the renderer said.
        reason: String,
    },
    /// The image would be empty or too large.
    #[error("figure `{title}`: an image of {width} x {height} pixels cannot be made; expected 1 to 20000 on each side")]
    Size {
        /// The figure's title.
        title: String,
        /// Pixels across.
        width: u32,
        /// Pixels down.
        height: u32,
    },
}

/// A finished drawing. The same input always gives the same bytes.
#[derive(Debug, Clone, PartialEq)]
pub struct Figure {
    /// The title, also the text alternative for readers who cannot see the drawing.
    title: String,
    width_px: f64,
    height_px: f64,
    body: String,
}

impl Figure {
    pub(crate) fn new(title: &str, width_px: f64, height_px: f64, canvas: Canvas) -> Self {
        Self { title: title.to_owned(), width_px, height_px, body: canvas.into_body() }
    }

    /// The title.
    pub fn title(&self) -> &str {
        &self.title
    }

    /// Width and height in CSS pixels (1/96 inch in print).
    pub fn size_px(&self) -> (f64, f64) {
        (self.width_px, self.height_px)
    }

    /// An SVG file on its own, with the font inside, for papers and browsers.
    pub fn svg(&self) -> String {
        format!(
            "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n{}\n<title>{}</title>\n<style>{}</style>\n{}</svg>\n",
            root(self.width_px, self.height_px, ""),
            escape(&self.title),
            font::face_rules(),
            self.body_on_white()
        )
    }

    /// The `svg` element for a page that already carries the font; it has no `id`, so it can stand anywhere.
    pub(crate) fn inline_svg(&self) -> String {
        let extra = format!(" role=\"img\" aria-label=\"{}\"", escape(&self.title));
        format!("{}\n{}</svg>", root(self.width_px, self.height_px, &extra), self.body_on_white())
    }

    /// PNG bytes; `scale` 1 gives one pixel per CSS pixel, 2 or 3 suits print (192 or 288 pixels per inch).
    ///
    /// # Errors
    /// When the size is outside 1 to 20,000 pixels, or the renderer refuses the drawing (a defect).
    pub fn png(&self, scale: f64) -> Result<Vec<u8>, FigureError> {
        let render = |reason: String| FigureError::Render { title: self.title.clone(), reason };
        let (width, height) = ((self.width_px * scale).ceil() as u32, (self.height_px * scale).ceil() as u32);
        if !(1..=20_000).contains(&width) || !(1..=20_000).contains(&height) {
            return Err(FigureError::Size { title: self.title.clone(), width, height });
        }
        let options = usvg::Options {
            fontdb: font::database(),
            font_family: font::FAMILY.to_owned(),
            ..usvg::Options::default()
        };
        let plain = format!("{}{}</svg>", root(self.width_px, self.height_px, ""), self.body_on_white());
        let tree = usvg::Tree::from_str(&plain, &options).map_err(|e| render(e.to_string()))?;
        let mut pixels =
            tiny_skia::Pixmap::new(width, height).ok_or_else(|| render("no memory for the image".to_owned()))?;
        let transform = tiny_skia::Transform::from_scale(scale as f32, scale as f32);
        resvg::render(&tree, transform, &mut pixels.as_mut());
        pixels.encode_png().map_err(|e| render(e.to_string()))
    }

    fn body_on_white(&self) -> String {
        format!("<path d=\"M0 0h{}v{}H0z\" fill=\"#ffffff\"/>\n{}", self.width_px, self.height_px, self.body)
    }
}

/// What every figure must hold, for the tests of this folder.
#[cfg(test)]
pub(crate) fn assert_sound(figure: &Figure) -> String {
    let svg = figure.svg();
    let document = usvg::roxmltree::Document::parse(&svg).expect("well-formed");
    let (width, height) = figure.size_px();
    for node in document.descendants().filter(usvg::roxmltree::Node::is_element) {
        for attribute in node.attributes() {
            // Every coordinate is a number of a page, not of a number type's limits.
            let value = attribute.value();
            assert!(!value.contains("NaN") && !value.contains("inf"), "{} = {value}", attribute.name());
            if attribute.name() == "d" {
                let longest = value.split(|c: char| !c.is_ascii_digit()).map(str::len).max().unwrap_or(0);
                assert!(longest < 6, "{value}");
            }
        }
        if node.has_tag_name("text") {
            let number = |name| node.attribute(name).and_then(|v| v.parse::<f64>().ok()).expect("a number");
            let weight =
                if node.attribute("font-weight").is_some() { font::Weight::Bold } else { font::Weight::Regular };
            let text = node.text().unwrap_or("");
            let length = font::width(text, number("font-size"), weight);
            let left = match node.attribute("text-anchor") {
                Some("middle") => number("x") - length / 2.0,
                Some("end") => number("x") - length,
                _ => number("x"),
            };
            let inside = left >= 0.0 && left + length <= width + 0.5 && (8.0..=height).contains(&number("y"));
            assert!(inside, "{:?}: `{text}` leaves the page of {width} x {height}: {left} + {length}", figure.title);
        }
    }
    assert_eq!(figure.png(0.25).expect("renders")[..4], [0x89, b'P', b'N', b'G']);
    assert!(svg.len() < 400_000, "{}: {} bytes", figure.title, svg.len());
    svg
}

#[cfg(test)]
mod tests {
    use super::super::colour::INK;
    use super::super::svg::{Canvas, Style};
    use super::*;

    fn one_label(text: &str) -> Figure {
        let mut canvas = Canvas::default();
        canvas.text((10.0, 30.0), text, Style::new(20.0, INK));
        Figure::new("a <title> & \"quote\"", 300.0, 40.0, canvas)
    }

    fn dark_pixels(figure: &Figure) -> usize {
        let png = figure.png(1.0).unwrap();
        let image = tiny_skia::Pixmap::decode_png(&png).unwrap();
        image.pixels().iter().filter(|p| p.red() < 200).count()
    }

    /// Without a font the renderer drops text with no error; then no dark pixel is left.
    #[test]
    fn text_is_visible_in_the_image() {
        assert_eq!(dark_pixels(&one_label(" ")), 0);
        let drawn = dark_pixels(&one_label("dB re 1 µPa² Hz⁻¹"));
        assert!(drawn > 300, "{drawn} dark pixels");
        // Each special sign leaves ink of its own.
        for sign in ["µ", "²", "⁻", "−", "≤", "→", "–"] {
            assert!(dark_pixels(&one_label(&sign.repeat(8))) > 8, "{sign}");
        }
    }

    #[test]
    fn the_file_is_well_formed_and_carries_its_font() {
        let svg = one_label("5 < 6 & 'seven'").svg();
        let document = usvg::roxmltree::Document::parse(&svg).unwrap();
        let texts: Vec<_> = document.descendants().filter(|n| n.has_tag_name("text")).collect();
        assert_eq!(texts[0].text(), Some("5 < 6 & 'seven'"));
        assert!(svg.contains("font/woff2;base64,d09GMg"), "the signature of a WOFF2 file");
        assert!(svg.len() < 45_000);
    }

    #[test]
    fn an_impossible_size_is_an_error() {
        assert!(matches!(one_label("x").png(0.0), Err(FigureError::Size { .. })));
        assert!(matches!(one_label("x").png(1e6), Err(FigureError::Size { .. })));
    }
}
