//! Opens a delimited text: finds its dialect, preamble, header and units row, and leaves the rows to be streamed.

use super::dialect::{guess_separator, is_comma_number, key_of};
use super::rows::{Separator, shorten};
use super::source::{TextSource, open_text};
use super::{Cell, DecimalMark, DelimitedError, Rows, TextOptions, parse_number};
use crate::io::time_text::looks_like_time;
use std::io::Read;
use std::path::Path;

/// A delimited text whose header is read and whose rows are next.
pub(crate) struct Opened {
    /// Column names, without blanks around them; empty ones stay empty.
    pub(crate) names: Vec<String>,
    /// Line of the header.
    pub(crate) header_line: u64,
    /// Texts of a units row under the header, one a column; empty where there is none.
    pub(crate) units: Vec<String>,
    /// Comment lines before the first data row, without their prefix.
    pub(crate) preamble: Vec<String>,
    /// The first data rows as text, for whoever must decide what columns mean. They are streamed again by `rows`.
    pub(crate) sample: Vec<Vec<String>>,
    /// Decimal mark.
    pub(crate) decimal: DecimalMark,
    /// The data rows, from the first.
    pub(crate) rows: Rows,
    /// What was found out and is worth telling.
    pub(crate) notes: Vec<String>,
}

/// Bytes looked at before anything is decided.
const LOOK: usize = 1 << 19;

/// Opens a text table. `section` is the section of the study file whose keys messages name.
pub(crate) fn open(path: &Path, options: &TextOptions, section: &str) -> Result<Opened, DelimitedError> {
    let encoding_key = key_of(section, "encoding");
    let TextSource { mut reader, compressed, note } = open_text(path, options.encoding.as_deref(), &encoding_key)?;
    let mut look = Vec::with_capacity(LOOK);
    reader
        .by_ref()
        .take(LOOK as u64)
        .read_to_end(&mut look)
        .map_err(|source| super::source::read_error(path, compressed, 0, source))?;
    if look.starts_with(b"\xef\xbb\xbf") {
        look.drain(..3);
    }
    let cut = look.len() >= LOOK;
    let text = String::from_utf8_lossy(&look).into_owned();
    if let Some(at) = text.find('\0') {
        let line = 1 + text[..at].matches('\n').count() as u64;
        return Err(DelimitedError::ZeroBytes { path: path.to_owned(), line, key: encoding_key });
    }
    let mut lines: Vec<&str> = text.lines().collect();
    if cut && lines.len() > 1 {
        lines.pop();
    }
    let prefix = options.comment_prefix();
    let is_comment = |line: &str| !prefix.is_empty() && line.starts_with(prefix);
    let content: Vec<&str> =
        lines.iter().copied().filter(|line| !is_comment(line) && !line.trim().is_empty()).take(50).collect();
    let separator = match options.separator(section)? {
        Some(separator) => separator,
        None => guess_separator(&content),
    };
    // A second reader over the same first bytes, so that the sample does not use up the stream.
    let again = Box::new(std::io::Cursor::new(text.clone().into_bytes()));
    let mut first_rows = Rows::new(path, again, false, separator, prefix);
    let whole = Box::new(std::io::Cursor::new(look).chain(reader));
    let mut rows = Rows::new(path, whole, compressed, separator, prefix);

    let mut head = Head { path, separator, prefix, lines: &lines, notes: note.into_iter().collect() };
    let (names, header_line, units) = head.header(&mut first_rows, &mut rows)?;
    let mut sample = Vec::new();
    // The last row of a cut text may be cut itself.
    let limit = if cut { content.len().saturating_sub(3) } else { 50 };
    while sample.len() < limit {
        match first_rows.next() {
            Ok(Some(row)) => {
                sample.push((0..row.len()).map(|i| String::from_utf8_lossy(row.cell(i)).into_owned()).collect());
            }
            // An error will be met again, with its line, when the rows are streamed.
            Ok(None) | Err(_) => break,
        }
    }
    if sample.is_empty() {
        return Err(DelimitedError::HeaderOnly { path: path.to_owned(), line: header_line });
    }
    let mut notes = head.notes;
    let decimal = match options.decimal(section)? {
        Some(mark) => mark,
        None => guess_decimal(&sample, separator, &mut notes),
    };
    let preamble = lines
        .iter()
        .take_while(|line| is_comment(line) || line.trim().is_empty())
        .filter(|line| is_comment(line))
        .map(|line| line.trim_start_matches(prefix).trim().to_owned())
        .collect();
    Ok(Opened { names, header_line, units, preamble, sample, decimal, rows, notes })
}

/// A decimal comma is believed where cells that are not separated by commas hold it and none holds a point number.
fn guess_decimal(sample: &[Vec<String>], separator: Separator, notes: &mut Vec<String>) -> DecimalMark {
    if separator == Separator::Byte(b',') {
        return DecimalMark::Point;
    }
    let cells = || sample.iter().flatten().map(String::as_bytes);
    let commas = cells().filter(|cell| is_comma_number(cell)).count();
    let points = cells()
        .filter(|cell| cell.contains(&b'.') && matches!(parse_number(cell, DecimalMark::Point), Cell::Number(_)))
        .count();
    if commas > 0 && points == 0 {
        notes.push("numbers are read with a decimal comma".to_owned());
        DecimalMark::Comma
    } else {
        DecimalMark::Point
    }
}

struct Head<'a> {
    path: &'a Path,
    separator: Separator,
    prefix: &'a str,
    lines: &'a [&'a str],
    notes: Vec<String>,
}

impl Head<'_> {
    /// Names, line and units of the header; both row readers stand behind it afterwards.
    fn header(&mut self, first: &mut Rows, rows: &mut Rows) -> Result<(Vec<String>, u64, Vec<String>), DelimitedError> {
        let Some(row) = first.next()? else { return Err(DelimitedError::Empty { path: self.path.to_owned() }) };
        let (line, count) = (row.line, row.len());
        let cells: Vec<String> = (0..count).map(|i| String::from_utf8_lossy(row.cell(i)).into_owned()).collect();
        if is_data(&cells) {
            // A header may stand in the comment lines above, with as many names as the row has cells.
            let Some((names, header_line, units)) = self.header_in_comments(line, count) else {
                let found = shorten(&cells.join(","));
                return Err(DelimitedError::NoHeader { path: self.path.to_owned(), line, found });
            };
            // The row is data: start again before it.
            let again = Box::new(std::io::Cursor::new(self.lines.join("\n").into_bytes()));
            *first = Rows::new(self.path, again, false, self.separator, self.prefix);
            return Ok((names, header_line, units));
        }
        rows.next()?;
        let names = without_empty_tail(cells);
        let mut units = Vec::new();
        let checkpoint = first.next()?.map(|row| {
            let texts: Vec<String> =
                (0..row.len()).map(|i| String::from_utf8_lossy(row.cell(i)).into_owned()).collect();
            (row.line, texts)
        });
        if let Some((units_line, texts)) = checkpoint {
            let words = texts.iter().filter(|text| !text.is_empty()).count();
            let is_value = |text: &String| {
                looks_like_time(text.as_bytes())
                    || is_comma_number(text.as_bytes())
                    || !matches!(parse_number(text.as_bytes(), DecimalMark::Point), Cell::Text | Cell::Empty)
            };
            if words > 0 && texts.len() <= count && !texts.iter().any(is_value) && has_unit(&texts) {
                rows.next()?;
                self.notes.push(format!("line {units_line} is read as a row of units"));
                units = texts;
            } else {
                let again = Box::new(std::io::Cursor::new(self.lines.join("\n").into_bytes()));
                *first = Rows::new(self.path, again, false, self.separator, self.prefix);
                first.next()?;
            }
        }
        Ok((names, line, units))
    }

    /// The last comment lines above the first data row that have as many words as the row has cells: names, then units.
    fn header_in_comments(&self, data_line: u64, count: usize) -> Option<(Vec<String>, u64, Vec<String>)> {
        let mut found: Vec<(u64, Vec<String>)> = Vec::new();
        for (index, line) in self.lines.iter().enumerate().take(data_line as usize - 1) {
            let Some(text) = line.strip_prefix(self.prefix).filter(|_| !self.prefix.is_empty()) else { continue };
            let cells: Vec<String> = match self.separator {
                Separator::Blanks => text.split_whitespace().map(str::to_owned).collect(),
                Separator::Byte(byte) => text.split(byte as char).map(|cell| cell.trim().to_owned()).collect(),
            };
            if cells.len() == count && !is_data(&cells) {
                found.push((index as u64 + 1, cells));
            }
        }
        let mut found = found.into_iter();
        let (line, names) = found.next()?;
        let units = found.next().map(|(_, units)| units).unwrap_or_default();
        Some((names, line, units))
    }
}

/// Whether a first row holds data: an ISO time in it, or a number first and at least as many numbers as words. (Numbers
/// after a word or an empty name are bands: `time,63,125`.)
fn is_data(cells: &[String]) -> bool {
    let number = |cell: &String| {
        is_comma_number(cell.as_bytes()) || matches!(parse_number(cell.as_bytes(), DecimalMark::Point), Cell::Number(_))
    };
    let filled = cells.iter().filter(|cell| !cell.is_empty()).count();
    cells.iter().any(|cell| looks_like_time(cell.as_bytes()))
        || (cells.first().is_some_and(number) && cells.iter().filter(|cell| number(cell)).count() * 2 >= filled)
}

/// A row of units names at least one unit of the trade.
fn has_unit(texts: &[String]) -> bool {
    const UNITS: &[&str] = &[
        "db", "hz", "khz", "s", "utc", "m/s", "m s-1", "pa", "iso", "deg", "degree", "degrees", "m", "1", "-",
        "iso 8601", "kn", "knots", "kt", "km/h", "degt",
    ];
    texts.iter().any(|text| {
        let lower = text.trim_matches(|c| matches!(c, '(' | ')' | '[' | ']')).to_lowercase();
        UNITS.contains(&lower.as_str()) || lower.starts_with("db ") || lower.contains("pa")
    })
}

fn without_empty_tail(mut names: Vec<String>) -> Vec<String> {
    while names.last().is_some_and(String::is_empty) {
        names.pop();
    }
    names
}

/// A column name as a plain word: lower case, with one underscore for any run of other characters.
pub(crate) fn plain_name(name: &str) -> String {
    let mut plain = String::new();
    for c in name.trim().to_lowercase().chars() {
        if c.is_alphanumeric() {
            plain.push(c);
        } else if !plain.ends_with('_') && !plain.is_empty() {
            plain.push('_');
        }
    }
    plain.trim_end_matches('_').to_owned()
}
