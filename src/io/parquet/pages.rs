//! A look at the page headers of a column, before the library believes them: sizes and counts that contradict the footer
//! make it allocate without bound. Headers are Thrift structures in the compact protocol, as the format specifies.

use flate2::Crc;
use std::fs::File;
use std::io::{Read, Seek, SeekFrom};
use std::ops::Range;

/// Larger pages are taken for damage; writers make pages of about a megabyte.
const PAGE_LIMIT: i64 = 512 << 20;
/// Some early writers forgot the dictionary's header in the size of a column (from memory; other readers allow for it too).
const SHORT_BY: u64 = 100;
/// Header bytes read at first, and at most (statistics may hold long texts).
const HEADER_SIZES: [usize; 2] = [1 << 10, 1 << 20];

/// What a page header says.
#[derive(Debug, Default, Clone, Copy, PartialEq, Eq)]
struct PageHeader {
    kind: Option<i64>,
    plain_size: Option<i64>,
    stored_size: Option<i64>,
    crc: Option<i64>,
    values: Option<i64>,
}

/// Kinds of pages.
const INDEX_PAGE: i64 = 1;
const DICTIONARY_PAGE: i64 = 2;

/// Bytes of a header that are read one after another.
struct Cursor<'a> {
    bytes: &'a [u8],
    at: usize,
}

/// The header does not end within the bytes, or is no header.
struct Broken;

impl Cursor<'_> {
    fn byte(&mut self) -> Result<u8, Broken> {
        let byte = *self.bytes.get(self.at).ok_or(Broken)?;
        self.at += 1;
        Ok(byte)
    }

    fn varint(&mut self) -> Result<u64, Broken> {
        let mut value = 0_u64;
        for shift in (0..64).step_by(7) {
            let byte = self.byte()?;
            value |= u64::from(byte & 0x7f) << shift;
            if byte & 0x80 == 0 {
                return Ok(value);
            }
        }
        Err(Broken)
    }

    fn integer(&mut self) -> Result<i64, Broken> {
        let raw = self.varint()?;
        Ok((raw >> 1) as i64 ^ -((raw & 1) as i64))
    }

    fn pass(&mut self, count: u64) -> Result<(), Broken> {
        let count = usize::try_from(count).map_err(|_| Broken)?;
        self.at = self.at.checked_add(count).filter(|at| *at <= self.bytes.len()).ok_or(Broken)?;
        Ok(())
    }

    /// The next field of a structure: its number and type; `None` at its end.
    fn field(&mut self, last: &mut i64) -> Result<Option<(i64, u8)>, Broken> {
        let head = self.byte()?;
        if head == 0 {
            return Ok(None);
        }
        *last = if head >> 4 == 0 { self.integer()? } else { *last + i64::from(head >> 4) };
        Ok(Some((*last, head & 0x0f)))
    }

    /// Passes over a value of a type.
    fn skip(&mut self, kind: u8, depth: usize) -> Result<(), Broken> {
        if depth > 8 {
            return Err(Broken);
        }
        match kind {
            1 | 2 => Ok(()),
            3 => self.pass(1),
            4..=6 => self.varint().map(|_| ()),
            7 => self.pass(8),
            8 => {
                let length = self.varint()?;
                self.pass(length)
            }
            9 | 10 => {
                let head = self.byte()?;
                let count = if head >> 4 == 15 { self.varint()? } else { u64::from(head >> 4) };
                for _ in 0..count {
                    // Truths in a list take a byte each.
                    self.skip(if matches!(head & 0x0f, 1 | 2) { 3 } else { head & 0x0f }, depth + 1)?;
                }
                Ok(())
            }
            12 => {
                let mut last = 0;
                while let Some((_, kind)) = self.field(&mut last)? {
                    self.skip(kind, depth + 1)?;
                }
                Ok(())
            }
            _ => Err(Broken),
        }
    }

    /// A page header.
    fn header(&mut self) -> Result<PageHeader, Broken> {
        let mut header = PageHeader::default();
        let mut last = 0;
        while let Some((number, kind)) = self.field(&mut last)? {
            match (number, kind) {
                (1, 5) => header.kind = Some(self.integer()?),
                (2, 5) => header.plain_size = Some(self.integer()?),
                (3, 5) => header.stored_size = Some(self.integer()?),
                (4, 5) => header.crc = Some(self.integer()?),
                // Headers of a data page, a dictionary page, and a data page of the second version: values come first.
                (5 | 7 | 8, 12) => {
                    let mut inner = 0;
                    while let Some((number, kind)) = self.field(&mut inner)? {
                        if (number, kind) == (1, 5) {
                            header.values = Some(self.integer()?);
                        } else {
                            self.skip(kind, 1)?;
                        }
                    }
                }
                (_, kind) => self.skip(kind, 0)?,
            }
        }
        Ok(header)
    }
}

/// Walks over the pages of a column chunk; says what is wrong.
pub(super) fn check_chunk(file: &mut File, range: Range<u64>, values: i64) -> Result<(), String> {
    let size = file.metadata().map_err(|error| error.to_string())?.len();
    if range.end > size || range.start > range.end {
        return Err(format!("its bytes {} to {} lie outside the file of {size} bytes", range.start, range.end));
    }
    let limit = (range.end + SHORT_BY).min(size);
    let mut at = range.start;
    let mut seen = 0_i64;
    while at < limit && seen < values {
        let (header, length) = read_header(file, at, limit)?;
        let (Some(kind), Some(plain), Some(stored)) = (header.kind, header.plain_size, header.stored_size) else {
            return Err(format!("no page header at byte {at}"));
        };
        let begin = at + length as u64;
        let end = begin.saturating_add(stored.max(0) as u64);
        if stored < 0 || !(0..=PAGE_LIMIT).contains(&plain) || end > limit {
            return Err(format!("the page at byte {at} claims {stored} stored and {plain} plain bytes"));
        }
        if kind != INDEX_PAGE {
            let count = header.values.unwrap_or(-1);
            let is_data = kind != DICTIONARY_PAGE;
            if count < 0 || (is_data && seen + count > values) {
                return Err(format!("the page at byte {at} claims {count} values where {} are left", values - seen));
            }
            seen += if is_data { count } else { 0 };
        }
        if let Some(crc) = header.crc {
            check_crc(file, begin..end, crc)?;
        }
        at = end;
    }
    if seen == values {
        Ok(())
    } else {
        Err(format!("its pages hold {seen} values where the footer promises {values}"))
    }
}

fn read_header(file: &mut File, at: u64, end: u64) -> Result<(PageHeader, usize), String> {
    for size in HEADER_SIZES {
        file.seek(SeekFrom::Start(at)).map_err(|error| error.to_string())?;
        let mut bytes = Vec::with_capacity(size);
        file.take(((end - at) as usize).min(size) as u64).read_to_end(&mut bytes).map_err(|error| error.to_string())?;
        let mut cursor = Cursor { bytes: &bytes, at: 0 };
        if let Ok(header) = cursor.header() {
            return Ok((header, cursor.at));
        }
    }
    Err(format!("no page header at byte {at}"))
}

/// Compares the checksum (CRC-32) of a page, where the writer stored one.
fn check_crc(file: &mut File, range: Range<u64>, stored: i64) -> Result<(), String> {
    file.seek(SeekFrom::Start(range.start)).map_err(|error| error.to_string())?;
    let mut crc = Crc::new();
    let mut left = range.end - range.start;
    let mut block = vec![0_u8; 1 << 16];
    while left > 0 {
        let wanted = block.len().min(usize::try_from(left).unwrap_or(usize::MAX));
        let part = &mut block[..wanted];
        file.read_exact(part).map_err(|error| error.to_string())?;
        crc.update(part);
        left -= wanted as u64;
    }
    if crc.sum() == stored as u32 {
        Ok(())
    } else {
        Err(format!("the page at byte {} fails its checksum", range.start))
    }
}
