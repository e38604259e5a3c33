//! The page as data: sections with text, tables, figures and warnings. [`crate::report::html()`] turns it into one file.

use super::figure::Figure;

/// A whole page.
#[derive(Debug, Clone, PartialEq)]
pub struct Document {
    /// Title of the page.
    pub title: String,
    /// One line under the title, such as the period and the sites.
    pub subtitle: String,
    /// The answer in a few sentences, before everything else.
    pub summary: Vec<String>,
    /// Warnings that concern the whole page, right after the summary.
    pub warnings: Vec<String>,
    /// The sections.
    pub sections: Vec<Section>,
    /// The last line, such as the program and its version.
    pub footer: String,
}

/// A section with its parts and sections of its own.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Section {
    /// Heading.
    pub title: String,
    /// Its parts in order.
    pub blocks: Vec<Block>,
    /// Sections inside it.
    pub sections: Vec<Section>,
}

/// A part of a section. All text is plain: it is escaped, never read as markup.
#[derive(Debug, Clone, PartialEq)]
pub enum Block {
    /// A paragraph.
    Text(String),
    /// A list of short sentences.
    Points(Vec<String>),
    /// Something the reader must know before using the numbers.
    Warning(String),
    /// How a number was made: a heading and its paragraphs, set apart.
    Method {
        /// What is explained, such as `How the floor was estimated`.
        title: String,
        /// Its paragraphs.
        text: Vec<String>,
    },
    /// A table.
    Table(Table),
    /// A figure.
    Figure {
        /// The drawing.
        figure: Figure,
        /// What it shows and how to read it.
        caption: String,
        /// Where the same figure was written as files, such as `figures/north_125hz.svg`; shown as text.
        file: Option<String>,
    },
    /// Text as it is, such as the resolved study.
    Verbatim(String),
}

/// A table with its caption.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Table {
    /// What it holds.
    pub caption: String,
    /// Its columns.
    pub columns: Vec<Column>,
    /// Its rows: one cell for each column; missing cells stay empty.
    pub rows: Vec<Vec<String>>,
    /// A remark under it; empty for none.
    pub note: String,
}

/// A column of a table.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// Its heading.
    pub title: String,
    /// Its unit, under the heading; empty for none.
    pub unit: String,
    /// How its cells stand.
    pub kind: ColumnKind,
}

/// How the cells of a column stand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ColumnKind {
    /// Names the row: at the left, in bold.
    RowName,
    /// Words: at the left.
    Text,
    /// Numbers: at the right, in figures of equal width.
    Number,
}

impl Column {
    /// A column that names its row.
    pub fn row_name(title: &str) -> Self {
        Self { title: title.to_owned(), unit: String::new(), kind: ColumnKind::RowName }
    }

    /// A column of words.
    pub fn text(title: &str) -> Self {
        Self { title: title.to_owned(), unit: String::new(), kind: ColumnKind::Text }
    }

    /// A column of numbers with its unit.
    pub fn number(title: &str, unit: &str) -> Self {
        Self { title: title.to_owned(), unit: unit.to_owned(), kind: ColumnKind::Number }
    }
}

impl Section {
    /// A section without sections of its own.
    pub fn new(title: &str, blocks: Vec<Block>) -> Self {
        Self { title: title.to_owned(), blocks, sections: Vec::new() }
    }
}
