//! What separates cells, which decimal mark is used, what begins a comment: stated, or found in the first lines.

use super::rows::Separator;
use super::{DecimalMark, DelimitedError};

/// The name of a setting for messages: a key of a section of the study file, or an option of the command line where the
/// section is "--".
pub(crate) fn key_of(section: &str, name: &str) -> String {
    match (section, name) {
        ("--", _) => format!("--{}", name.replace('_', "-")),
        // The section of gridded and tabular wind has one key for both.
        ("wind", "time_unit") => "wind.time_units".to_owned(),
        _ => format!("{section}.{name}"),
    }
}

/// How a text table is written, where the file does not show it. `None` everywhere is the usual case.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct TextOptions {
    /// Cell separator: ",", ";", "\t" (or "tab"), "|", or " " (or "blank") for any run of blanks.
    pub delimiter: Option<String>,
    /// Decimal mark: "." or ",".
    pub decimal_mark: Option<String>,
    /// Text encoding by its usual name: "utf-8", "latin-1", "utf-16le" ...
    pub encoding: Option<String>,
    /// What begins a comment line; "" for no comments. Without it: "#".
    pub comment: Option<String>,
}

impl TextOptions {
    /// The comment prefix.
    pub(super) fn comment_prefix(&self) -> &str {
        self.comment.as_deref().unwrap_or("#")
    }

    /// The separator, where it is stated.
    pub(super) fn separator(&self, section: &str) -> Result<Option<Separator>, DelimitedError> {
        let Some(text) = &self.delimiter else { return Ok(None) };
        match text.as_str() {
            "tab" | "\\t" => Ok(Some(Separator::Byte(b'\t'))),
            " " | "blank" | "space" => Ok(Some(Separator::Blanks)),
            one if one.len() == 1 && !matches!(one, "\"" | "\n" | "\r") => Ok(Some(Separator::Byte(one.as_bytes()[0]))),
            other => Err(DelimitedError::Setting {
                key: key_of(section, "delimiter"),
                found: format!("\"{other}\""),
                expected: "one character such as \",\", \";\" or \"tab\", or \"blank\"",
            }),
        }
    }

    /// The decimal mark, where it is stated.
    pub(super) fn decimal(&self, section: &str) -> Result<Option<DecimalMark>, DelimitedError> {
        match self.decimal_mark.as_deref() {
            None => Ok(None),
            Some(".") => Ok(Some(DecimalMark::Point)),
            Some(",") => Ok(Some(DecimalMark::Comma)),
            Some(other) => Err(DelimitedError::Setting {
                key: key_of(section, "decimal_mark"),
                found: format!("\"{other}\""),
                expected: "\".\" or \",\"",
            }),
        }
    }
}

/// Counts a byte outside quotes.
fn count_outside_quotes(line: &str, wanted: char) -> usize {
    let mut quoted = false;
    line.chars()
        .filter(|character| {
            quoted ^= *character == '"';
            !quoted && *character == wanted
        })
        .count()
}

/// Finds the separator in the first lines (without comments and blank lines). A candidate must be in most lines in the
/// same number; semicolons and tabs win over commas, which may be decimal marks.
pub(super) fn guess_separator(lines: &[&str]) -> Separator {
    let score = |wanted: char| -> (usize, usize) {
        let counts: Vec<usize> = lines.iter().map(|line| count_outside_quotes(line, wanted)).collect();
        let mut sorted = counts.clone();
        sorted.sort_unstable();
        let usual = sorted.get(sorted.len() / 2).copied().unwrap_or(0);
        (counts.iter().filter(|count| **count == usual && usual > 0).count(), usual)
    };
    for candidate in [';', '\t', '|'] {
        let (agreeing, usual) = score(candidate);
        if usual > 0 && agreeing * 10 >= lines.len() * 8 && lines.first().is_some_and(|line| line.contains(candidate)) {
            return Separator::Byte(candidate as u8);
        }
    }
    if lines.iter().any(|line| count_outside_quotes(line, ',') > 0) {
        return Separator::Byte(b',');
    }
    let words: Vec<usize> = lines.iter().map(|line| line.split_whitespace().count()).collect();
    match words.as_slice() {
        [first, rest @ ..] if *first > 2 && rest.iter().all(|count| count == first) => Separator::Blanks,
        _ => Separator::Byte(b','),
    }
}

/// Whether a cell is a number with a decimal comma: digits, one comma, digits.
pub(super) fn is_comma_number(cell: &[u8]) -> bool {
    let cell = cell.strip_prefix(b"-").unwrap_or(cell);
    let mut parts = cell.split(|byte| *byte == b',');
    let digits = |part: Option<&[u8]>| part.is_some_and(|part| !part.is_empty() && part.iter().all(u8::is_ascii_digit));
    digits(parts.next()) && digits(parts.next()) && parts.next().is_none()
}
