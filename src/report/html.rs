//! Writes a [`Document`] as one HTML file that needs nothing else: style, font and figures are inside it, and there is
//! no script.

use std::collections::BTreeSet;
use std::fmt::Write as _;

use super::document::{Block, ColumnKind, Document, Section, Table};
use super::font;
use super::svg::escape;

const STYLE: &str = include_str!("page.css");

/// The page as HTML text. The same document always gives the same bytes.
pub fn html(document: &Document) -> String {
    let mut page = Page::default();
    for part in ["top", "contents", "main", "summary"] {
        page.anchors.insert(part.to_owned());
    }
    let title = escape(&document.title);
    let mut main = String::new();
    if !document.summary.is_empty() {
        main.push_str("<div class=\"summary\" id=\"summary\">\n<h2>In short</h2>\n<ul>\n");
        for sentence in &document.summary {
            let _ = writeln!(main, "<li>{}</li>", escape(sentence));
        }
        main.push_str("</ul>\n</div>\n");
    }
    for text in &document.warnings {
        warning(&mut main, text);
    }
    let mut contents = String::new();
    page.sections(&mut main, &mut contents, &document.sections, 2);

    let mut out = String::with_capacity(main.len() + 60_000);
    out.push_str("<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n");
    out.push_str("<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n");
    let _ = writeln!(out, "<title>{title}</title>\n<style>\n{}{STYLE}</style>\n</head>", font::face_rules());
    out.push_str("<body>\n<div class=\"page\" id=\"top\">\n<a class=\"skip\" href=\"#main\">Skip the contents</a>\n");
    let _ = writeln!(out, "<header class=\"head\">\n<h1>{title}</h1>");
    if !document.subtitle.is_empty() {
        let _ = writeln!(out, "<p>{}</p>", escape(&document.subtitle));
    }
    out.push_str("</header>\n<nav id=\"contents\" aria-label=\"Contents\">\n<h2>Contents</h2>\n");
    out.push_str(&contents);
    let _ = write!(out, "</nav>\n<main id=\"main\">\n{main}</main>\n");
    let _ = writeln!(out, "<footer><p>{}</p></footer>", escape(&document.footer));
    out.push_str("</div>\n</body>\n</html>\n");
    out
}

/// What runs through the page: anchors in use and the numbers of tables and figures.
#[derive(Default)]
struct Page {
    anchors: BTreeSet<String>,
    figures: usize,
    tables: usize,
}

impl Page {
    fn sections(&mut self, main: &mut String, contents: &mut String, sections: &[Section], level: usize) {
        if sections.is_empty() {
            return;
        }
        contents.push_str("<ul>\n");
        for section in sections {
            let anchor = self.anchor(&section.title);
            let (title, tag) = (escape(&section.title), level.min(5));
            let _ = write!(contents, "<li><a href=\"#{anchor}\">{title}</a>");
            let _ = writeln!(main, "<section aria-labelledby=\"{anchor}\">\n<h{tag} id=\"{anchor}\">{title}</h{tag}>");
            for block in &section.blocks {
                self.block(main, block, level + 1);
            }
            if !section.sections.is_empty() {
                contents.push('\n');
            }
            self.sections(main, contents, &section.sections, level + 1);
            main.push_str("</section>\n");
            contents.push_str("</li>\n");
        }
        contents.push_str("</ul>\n");
    }

    fn block(&mut self, out: &mut String, block: &Block, level: usize) {
        match block {
            Block::Text(text) => {
                let _ = writeln!(out, "<p>{}</p>", escape(text));
            }
            Block::Points(points) if points.is_empty() => {}
            Block::Points(points) => {
                out.push_str("<ul>\n");
                for point in points {
                    let _ = writeln!(out, "<li>{}</li>", escape(point));
                }
                out.push_str("</ul>\n");
            }
            Block::Warning(text) => warning(out, text),
            Block::Method { title, text } => {
                let tag = level.min(5);
                let _ = writeln!(out, "<div class=\"method\">\n<h{tag}>{}</h{tag}>", escape(title));
                for paragraph in text {
                    let _ = writeln!(out, "<p>{}</p>", escape(paragraph));
                }
                out.push_str("</div>\n");
            }
            Block::Table(table) => self.table(out, table),
            Block::Figure { figure, caption, file } => {
                self.figures += 1;
                let number = self.figures;
                let anchor = self.anchor(&format!("figure {number}"));
                let (width, height) = figure.size_px();
                // In print a tall figure gets a page, others share one.
                let class = if height > width { " class=\"tall\"" } else { "" };
                let _ = write!(
                    out,
                    "<figure id=\"{anchor}\"{class}>\n{}\n<figcaption><b>Figure {number}.</b> {}",
                    figure.inline_svg(),
                    escape(caption)
                );
                if let Some(file) = file {
                    let _ = write!(out, " <span>File: {}</span>", escape(file));
                }
                out.push_str("</figcaption>\n</figure>\n");
            }
            Block::Verbatim(text) => {
                let _ = writeln!(out, "<pre>{}</pre>", escape(text));
            }
        }
    }

    fn table(&mut self, out: &mut String, table: &Table) {
        self.tables += 1;
        let number = self.tables;
        let anchor = self.anchor(&format!("table {number}"));
        // A wide table scrolls inside its box, also by keyboard.
        let _ = writeln!(
            out,
            "<div class=\"wide\" id=\"{anchor}\" tabindex=\"0\" role=\"region\" aria-label=\"Table {number}\">\n<table>\n\
             <caption><b>Table {number}.</b> {}</caption>\n<thead><tr>",
            escape(&table.caption)
        );
        for column in &table.columns {
            let class = match column.kind {
                ColumnKind::RowName => "",
                ColumnKind::Text => " class=\"t\"",
                ColumnKind::Number => " class=\"n\"",
            };
            let _ = write!(out, "<th scope=\"col\"{class}>{}", escape(&column.title));
            if !column.unit.is_empty() {
                let _ = write!(out, " <small>{}</small>", escape(&column.unit));
            }
            out.push_str("</th>");
        }
        out.push_str("</tr></thead>\n<tbody>\n");
        for row in &table.rows {
            out.push_str("<tr>");
            for (i, column) in table.columns.iter().enumerate() {
                let cell = escape(row.get(i).map_or("", String::as_str));
                let _ = match column.kind {
                    ColumnKind::RowName => write!(out, "<th scope=\"row\">{cell}</th>"),
                    ColumnKind::Text => write!(out, "<td class=\"t\">{cell}</td>"),
                    ColumnKind::Number => write!(out, "<td class=\"n\">{cell}</td>"),
                };
            }
            out.push_str("</tr>\n");
        }
        out.push_str("</tbody>\n</table>\n");
        if table.rows.is_empty() {
            out.push_str("<p class=\"note\">No rows.</p>\n");
        }
        if !table.note.is_empty() {
            let _ = writeln!(out, "<p class=\"note\">{}</p>", escape(&table.note));
        }
        out.push_str("</div>\n");
    }

    /// An anchor from a title: small letters, digits and hyphens, and a number where the same one came before.
    fn anchor(&mut self, title: &str) -> String {
        let mut base = String::new();
        for c in title.chars().flat_map(char::to_lowercase) {
            if c.is_ascii_alphanumeric() {
                base.push(c);
            } else if !base.is_empty() && !base.ends_with('-') {
                base.push('-');
            }
        }
        let base = base.trim_end_matches('-');
        // An identifier that starts with a letter is valid everywhere.
        let base =
            if base.starts_with(|c: char| c.is_ascii_alphabetic()) { base.to_owned() } else { format!("s-{base}") };
        let mut anchor = base.clone();
        let mut number = 2;
        while !self.anchors.insert(anchor.clone()) {
            anchor = format!("{base}-{number}");
            number += 1;
        }
        anchor
    }
}

fn warning(out: &mut String, text: &str) {
    let _ = writeln!(out, "<div class=\"warning\" role=\"note\"><p><b>Warning.</b> {}</p></div>", escape(text));
}

#[cfg(test)]
mod tests {
    use super::super::document::Column;
    use super::super::level_wind::level_against_wind_grid;
    use super::*;

    fn document() -> Document {
        let site = |name: &str| Section {
            title: name.to_owned(),
            blocks: vec![
                Block::Figure {
                    figure: level_against_wind_grid("<script>alert(1)</script> & \"more\"", &[], &[]),
                    caption: "a < b & c".to_owned(),
                    file: Some("figures/a&b.svg".to_owned()),
                },
                Block::Table(Table {
                    caption: "Relation".to_owned(),
                    columns: vec![
                        Column::row_name("Band"),
                        Column::number("Floor", "dB re 1 µPa²"),
                        Column::text("Verdict"),
                    ],
                    rows: vec![
                        vec!["125 Hz".to_owned(), "60.1".to_owned(), "<b>".to_owned()],
                        vec!["short".to_owned()],
                    ],
                    note: String::new(),
                }),
            ],
            sections: vec![Section::new("Checks", vec![Block::Warning("mind </div> this".to_owned())])],
        };
        Document {
            title: "A <study> & its page".to_owned(),
            subtitle: "two sites".to_owned(),
            summary: vec!["One.".to_owned()],
            warnings: vec!["Two.".to_owned()],
            sections: vec![site("Site é-1"), site("Site é-1"), site("summary"), site("")],
            footer: "made by a test".to_owned(),
        }
    }

    /// Read as XML after the few tags that HTML leaves open are closed: every tag must nest and every text be escaped.
    fn as_xml(page: &str) -> String {
        let body = page.trim_start_matches("<!DOCTYPE html>\n");
        let body = body.replace("<meta charset=\"utf-8\">", "");
        body.replace("initial-scale=1\">", "initial-scale=1\"/>")
    }

    #[test]
    fn the_page_nests_and_its_anchors_are_unique() {
        let page = html(&document());
        let xml = as_xml(&page);
        let tree = resvg::usvg::roxmltree::Document::parse(&xml).unwrap();
        let ids: Vec<&str> = tree.descendants().filter_map(|n| n.attribute("id")).collect();
        let unique: BTreeSet<&str> = ids.iter().copied().collect();
        assert_eq!(ids.len(), unique.len(), "{ids:?}");
        // Every link leads to an anchor.
        for link in tree.descendants().filter_map(|n| n.attribute("href")) {
            assert!(unique.contains(link.trim_start_matches('#')), "{link}");
        }
        let headings: Vec<_> = tree.descendants().filter(|n| n.has_tag_name("h2")).filter_map(|n| n.text()).collect();
        assert_eq!(headings, ["Contents", "In short", "Site é-1", "Site é-1", "summary"]);
        assert_eq!(tree.descendants().filter(|n| n.has_tag_name("figure")).count(), 4);
    }

    #[test]
    fn text_is_escaped_and_nothing_is_fetched() {
        let page = html(&document());
        assert!(!page.contains("<script") && page.contains("&lt;script&gt;"));
        assert!(page.contains("A &lt;study&gt; &amp; its page"));
        // The only address in the page is the name of the SVG namespace.
        assert_eq!(page.matches("http").count(), page.matches("http://www.w3.org/2000/svg").count());
        assert!(!page.contains("url(\"http") && !page.contains("@import"));
        assert!(page.contains("<td class=\"n\">60.1</td><td class=\"t\">&lt;b&gt;</td>"));
        assert!(page.contains("<th scope=\"row\">short</th><td class=\"n\"></td>"));
    }

    #[test]
    fn an_empty_page_is_still_a_page() {
        let empty = Document {
            title: String::new(),
            subtitle: String::new(),
            summary: vec![],
            warnings: vec![],
            sections: vec![],
            footer: String::new(),
        };
        let page = html(&empty);
        resvg::usvg::roxmltree::Document::parse(&as_xml(&page)).unwrap();
    }
}
