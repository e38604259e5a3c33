//! Rows of a delimited text, one at a time, with the line they begin in. Memory is one block and the longest row.

use super::source::read_error;
use super::split::{Found, split_blanks, split_bytes};
use super::{DelimitedError, trim};
use std::io::Read;
use std::path::{Path, PathBuf};

/// Bytes read at once.
const BLOCK: usize = 1 << 18;
/// Longer lines are no table.
const LINE_LIMIT: usize = 64 << 20;

/// One row: its cells as bytes.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Row<'a> {
    bytes: &'a [u8],
    /// Start and end of each cell within `bytes`.
    cells: &'a [(u32, u32)],
    /// Line where the row begins, from 1.
    pub(crate) line: u64,
}

impl<'a> Row<'a> {
    /// Number of cells.
    pub(crate) fn len(&self) -> usize {
        self.cells.len()
    }

    /// A cell without the blanks around it; empty beyond the end.
    pub(crate) fn cell(&self, index: usize) -> &'a [u8] {
        let raw = self.raw(index);
        match raw {
            [first, .., last] if !first.is_ascii_whitespace() && !last.is_ascii_whitespace() => raw,
            _ => trim(raw),
        }
    }

    /// A cell as it stands; empty beyond the end.
    pub(crate) fn raw(&self, index: usize) -> &'a [u8] {
        self.cells.get(index).and_then(|&(start, end)| self.bytes.get(start as usize..end as usize)).unwrap_or_default()
    }

    /// A cell as text for messages, shortened.
    pub(crate) fn shown(&self, index: usize) -> String {
        shorten(&String::from_utf8_lossy(self.cell(index)))
    }

    /// Checks the number of cells against the header's; blank cells beyond it do not count.
    pub(crate) fn check_width(&self, path: &Path, expected: usize, header_line: u64) -> Result<(), DelimitedError> {
        let more_are_blank = (expected..self.len()).all(|index| self.cell(index).is_empty());
        if self.len() >= expected && more_are_blank {
            return Ok(());
        }
        Err(DelimitedError::Ragged { path: path.to_owned(), line: self.line, found: self.len(), expected, header_line })
    }

    /// Whether all cells are blank.
    pub(crate) fn is_blank(&self) -> bool {
        (0..self.len()).all(|index| self.cell(index).is_empty())
    }
}

/// A text for a message: at most 60 characters.
pub(crate) fn shorten(text: &str) -> String {
    if text.chars().count() <= 60 {
        return text.to_owned();
    }
    let mut short: String = text.chars().take(57).collect();
    short.push_str("...");
    short
}

/// What separates the cells.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Separator {
    /// One byte.
    Byte(u8),
    /// Any run of blanks and tabs.
    Blanks,
}

/// Reads rows one by one.
pub(crate) struct Rows {
    path: PathBuf,
    input: Box<dyn Read + Send>,
    compressed: bool,
    separator: Separator,
    comment: Vec<u8>,
    buffer: Vec<u8>,
    start: usize,
    filled: usize,
    ended: bool,
    line: u64,
    cells: Vec<(u32, u32)>,
    unquoted: Vec<u8>,
    blanks: u64,
}

impl Rows {
    /// Rows of a stream of bytes. An empty comment prefix means that there are no comments.
    pub(crate) fn new(
        path: &Path,
        input: Box<dyn Read + Send>,
        compressed: bool,
        separator: Separator,
        comment: &str,
    ) -> Self {
        Self {
            path: path.to_owned(),
            input,
            compressed,
            separator,
            comment: comment.as_bytes().to_vec(),
            buffer: Vec::new(),
            start: 0,
            filled: 0,
            ended: false,
            line: 1,
            cells: Vec::new(),
            unquoted: Vec::new(),
            blanks: 0,
        }
    }

    /// Rows that had separators and nothing else, passed over so far.
    pub(crate) fn blank_rows(&self) -> u64 {
        self.blanks
    }

    /// The next row that is neither blank nor a comment; `None` at the end.
    pub(crate) fn next(&mut self) -> Result<Option<Row<'_>>, DelimitedError> {
        loop {
            if self.start == self.filled && !self.fill()? {
                return Ok(None);
            }
            let line = self.line;
            if !self.comment.is_empty() && self.begins_comment()? {
                self.skip_line()?;
                continue;
            }
            let from_scratch = match self.find()? {
                Found::Quoted => {
                    self.read_quoted(line)?;
                    true
                }
                Found::Row { end, next } => {
                    let begin = self.start;
                    self.start = next;
                    self.line += 1;
                    if end == begin {
                        continue;
                    }
                    // Cells are counted from the row's first byte.
                    let bytes = self.buffer.get(begin..end).unwrap_or_default();
                    let row = Row { bytes, cells: &self.cells, line };
                    if row.cell(0).is_empty() && row.is_blank() {
                        self.blanks += u64::from(row.len() > 1);
                        continue;
                    }
                    // Borrowed again, since the compiler cannot see that the loop ends here.
                    let bytes = self.buffer.get(begin..end).unwrap_or_default();
                    return Ok(Some(Row { bytes, cells: &self.cells, line }));
                }
                Found::More => unreachable!("find() reads on until a row ends"),
            };
            if from_scratch {
                return Ok(Some(Row { bytes: &self.unquoted, cells: &self.cells, line }));
            }
        }
    }

    /// Reads more bytes behind those that are not used yet; false at the end of the input.
    fn fill(&mut self) -> Result<bool, DelimitedError> {
        if self.ended {
            return Ok(false);
        }
        if self.start > 0 {
            self.buffer.copy_within(self.start..self.filled, 0);
            self.filled -= self.start;
            self.start = 0;
        }
        if self.filled > LINE_LIMIT {
            return Err(DelimitedError::LongLine {
                path: self.path.clone(),
                line: self.line,
                limit_mb: LINE_LIMIT >> 20,
            });
        }
        if self.buffer.len() < self.filled + BLOCK {
            self.buffer.resize(self.filled + BLOCK, 0);
        }
        let room = self.buffer.get_mut(self.filled..).unwrap_or_default();
        let count = loop {
            match self.input.read(room) {
                Err(error) if error.kind() == std::io::ErrorKind::Interrupted => {}
                Err(error) => return Err(read_error(&self.path, self.compressed, self.line - 1, error)),
                Ok(count) => break count,
            }
        };
        self.filled += count;
        self.ended = count == 0;
        Ok(count > 0)
    }

    fn begins_comment(&mut self) -> Result<bool, DelimitedError> {
        loop {
            let have = self.buffer.get(self.start..self.filled).unwrap_or_default();
            if have.len() >= self.comment.len() || self.ended {
                return Ok(have.starts_with(&self.comment));
            }
            self.fill()?;
        }
    }

    fn skip_line(&mut self) -> Result<(), DelimitedError> {
        loop {
            let have = self.buffer.get(self.start..self.filled).unwrap_or_default();
            if let Some(at) = have.iter().position(|byte| *byte == b'\n') {
                self.start += at + 1;
                self.line += 1;
                return Ok(());
            }
            if self.ended {
                self.start = self.filled;
                self.line += 1;
                return Ok(());
            }
            self.fill()?;
        }
    }

    fn find(&mut self) -> Result<Found, DelimitedError> {
        loop {
            let have = self.buffer.get(self.start..self.filled).unwrap_or_default();
            let found = match self.separator {
                Separator::Byte(separator) => split_bytes(have, separator, self.ended, &mut self.cells),
                Separator::Blanks => split_blanks(have, self.ended, &mut self.cells),
            };
            match found {
                Found::More => {
                    self.fill()?;
                }
                Found::Quoted => return Ok(Found::Quoted),
                Found::Row { end, next } => return Ok(Found::Row { end: self.start + end, next: self.start + next }),
            }
        }
    }

    /// The careful way for a row with quoted cells, which may hold separators, doubled quotes and line ends.
    fn read_quoted(&mut self, line: u64) -> Result<(), DelimitedError> {
        self.cells.clear();
        self.unquoted.clear();
        let separator = match self.separator {
            Separator::Byte(separator) => separator,
            Separator::Blanks => b' ',
        };
        let mut begin = 0_u32;
        let mut within = false;
        let mut was_quoted = false;
        loop {
            let Some(byte) = self.next_byte()? else {
                if within {
                    return Err(DelimitedError::OpenQuote { path: self.path.clone(), line });
                }
                break;
            };
            if within {
                if byte != b'"' {
                    self.line += u64::from(byte == b'\n');
                    self.unquoted.push(byte);
                } else if self.peek_byte()? == Some(b'"') {
                    self.start += 1;
                    self.unquoted.push(b'"');
                } else {
                    within = false;
                }
            } else if byte == b'"' && !was_quoted && trim(self.cell_so_far(begin)).is_empty() {
                // Blanks before the opening quote do not belong to the cell.
                self.unquoted.truncate(begin as usize);
                within = true;
                was_quoted = true;
            } else if byte == separator || byte == b'\n' {
                self.end_cell(&mut begin);
                was_quoted = false;
                if byte == b'\n' {
                    self.line += 1;
                    return Ok(());
                }
            } else {
                self.unquoted.push(byte);
            }
        }
        self.end_cell(&mut begin);
        self.line += 1;
        Ok(())
    }

    fn cell_so_far(&self, begin: u32) -> &[u8] {
        self.unquoted.get(begin as usize..).unwrap_or_default()
    }

    fn end_cell(&mut self, begin: &mut u32) {
        let end = self.unquoted.len() as u32;
        self.cells.push((*begin, end));
        *begin = end;
    }

    fn peek_byte(&mut self) -> Result<Option<u8>, DelimitedError> {
        if self.start == self.filled && !self.fill()? {
            return Ok(None);
        }
        Ok(self.buffer.get(self.start).copied())
    }

    fn next_byte(&mut self) -> Result<Option<u8>, DelimitedError> {
        let byte = self.peek_byte()?;
        self.start += usize::from(byte.is_some());
        Ok(byte)
    }
}
