//! The classic format (CDF-1, CDF-2, CDF-5), read by ourselves.
//!
//! The C library returns zeros for a file that was cut short; here the size is checked against the header before a value is
//! believed. Layout: NetCDF Users' Guide, "File Format Specifications".

use super::error::NetcdfError;
use super::header::{AttributeValue, Dimension, Header, NumberType, Storage, Variable, VariableType};
use std::fs::File;
use std::io::Read;
use std::path::Path;

/// A header larger than this is not believed: real ones are kilobytes.
const LARGEST_HEADER_BYTES: u64 = 64 << 20;

const TAG_DIMENSION: u32 = 10;
const TAG_VARIABLE: u32 = 11;
const TAG_ATTRIBUTE: u32 = 12;

/// Reads the header of a classic file and checks the file's size against it.
pub(super) fn read_header(path: &Path, version: u8) -> Result<Header, NetcdfError> {
    let unreadable = |source| NetcdfError::Unreadable { path: path.to_owned(), source };
    let file = File::open(path).map_err(unreadable)?;
    let file_bytes = file.metadata().map_err(unreadable)?.len();
    // Headers are small; a file may be large. Grow the part that is read until the header fits.
    let mut part = (1_u64 << 16).min(file_bytes);
    loop {
        let mut bytes = Vec::new();
        (&file).take(part).read_to_end(&mut bytes).map_err(unreadable)?;
        std::io::Seek::rewind(&mut &file).map_err(unreadable)?;
        match parse(path, version, &bytes, file_bytes) {
            Err(Trouble::Short) if part < file_bytes.min(LARGEST_HEADER_BYTES) => {
                part = (part * 8).min(file_bytes.min(LARGEST_HEADER_BYTES));
            }
            Err(Trouble::Short) => {
                let problem = format!("the header does not end within the file's {file_bytes} bytes");
                return Err(NetcdfError::Damaged { path: path.to_owned(), problem });
            }
            Err(Trouble::Wrong(problem)) => return Err(NetcdfError::Damaged { path: path.to_owned(), problem }),
            Ok(header) => return Ok(header),
        }
    }
}

enum Trouble {
    /// The bytes end before the header does.
    Short,
    Wrong(String),
}

struct Cursor<'a> {
    bytes: &'a [u8],
    at: usize,
    version: u8,
}

impl<'a> Cursor<'a> {
    fn take(&mut self, count: u64) -> Result<&'a [u8], Trouble> {
        let end = usize::try_from(count).ok().and_then(|count| self.at.checked_add(count)).ok_or(Trouble::Short)?;
        let taken = self.bytes.get(self.at..end).ok_or(Trouble::Short)?;
        self.at = end;
        Ok(taken)
    }

    fn u32(&mut self) -> Result<u32, Trouble> {
        Ok(u32::from_be_bytes(self.take(4)?.try_into().expect("four bytes")))
    }

    fn u64(&mut self) -> Result<u64, Trouble> {
        Ok(u64::from_be_bytes(self.take(8)?.try_into().expect("eight bytes")))
    }

    /// A count or length: 4 bytes, 8 in CDF-5.
    fn count(&mut self) -> Result<u64, Trouble> {
        if self.version == 5 { self.u64() } else { Ok(u64::from(self.u32()?)) }
    }

    /// An offset: 4 bytes in CDF-1, else 8.
    fn offset(&mut self) -> Result<u64, Trouble> {
        if self.version == 1 { Ok(u64::from(self.u32()?)) } else { self.u64() }
    }

    fn padded(&mut self, count: u64) -> Result<&'a [u8], Trouble> {
        let taken = self.take(count)?;
        self.take(padding(count))?;
        Ok(taken)
    }

    fn name(&mut self) -> Result<String, Trouble> {
        let length = self.count()?;
        // The format has names in UTF-8. A name that is none has lost a bit, and with it the attribute that it names: a packed
        // value without its offset would be a wrong number.
        let bytes = self.padded(length)?;
        std::str::from_utf8(bytes).map(str::to_owned).map_err(|_| {
            Trouble::Wrong(format!("the name \"{}\" in its header is not UTF-8", String::from_utf8_lossy(bytes)))
        })
    }

    /// The number of items of a list that has this tag.
    fn list(&mut self, tag: u32, what: &str) -> Result<u64, Trouble> {
        let found = self.u32()?;
        let count = self.count()?;
        match (found, count) {
            (0, 0) => Ok(0),
            (found, count) if found == tag => {
                // Each item takes at least 8 bytes: a count beyond that is false.
                if count > LARGEST_HEADER_BYTES / 8 {
                    return Err(Trouble::Wrong(format!("the header names {count} {what}")));
                }
                Ok(count)
            }
            (found, _) => Err(Trouble::Wrong(format!("the list of {what} starts with tag {found}, expected {tag}"))),
        }
    }

    fn attributes(&mut self) -> Result<Vec<(String, AttributeValue)>, Trouble> {
        let count = self.list(TAG_ATTRIBUTE, "attributes")?;
        let mut attributes = Vec::new();
        for _ in 0..count {
            let name = self.name()?;
            let code = self.u32()?;
            let length = self.count()?;
            let value = match kind(code)? {
                VariableType::Text | VariableType::Other => {
                    AttributeValue::Text(String::from_utf8_lossy(self.padded(length)?).into_owned())
                }
                VariableType::Number(number) => {
                    let size = number.size();
                    let bytes = length.checked_mul(size as u64).ok_or(Trouble::Short)?;
                    let values = self.padded(bytes)?.chunks_exact(size).map(|value| number.decode(value, true));
                    AttributeValue::Numbers(values.collect(), number)
                }
            };
            attributes.push((name, value));
        }
        Ok(attributes)
    }
}

fn padding(bytes: u64) -> u64 {
    bytes.next_multiple_of(4) - bytes
}

fn kind(code: u32) -> Result<VariableType, Trouble> {
    Ok(match code {
        1 => VariableType::Number(NumberType::I8),
        2 => VariableType::Text,
        3 => VariableType::Number(NumberType::I16),
        4 => VariableType::Number(NumberType::I32),
        5 => VariableType::Number(NumberType::F32),
        6 => VariableType::Number(NumberType::F64),
        7 => VariableType::Number(NumberType::U8),
        8 => VariableType::Number(NumberType::U16),
        9 => VariableType::Number(NumberType::U32),
        10 => VariableType::Number(NumberType::I64),
        11 => VariableType::Number(NumberType::U64),
        other => return Err(Trouble::Wrong(format!("a variable or attribute has the unknown type {other}"))),
    })
}

/// A variable as the header gives it.
struct Raw {
    variable: Variable,
    begin: u64,
    /// Bytes of one record, or of the whole variable, without padding.
    bytes: u64,
    is_record: bool,
}

fn parse(path: &Path, version: u8, bytes: &[u8], file_bytes: u64) -> Result<Header, Trouble> {
    let mut cursor = Cursor { bytes, at: 4, version };
    let stated_records = cursor.count()?;
    let mut dimensions = Vec::new();
    let mut record_dimension = None;
    for index in 0..cursor.list(TAG_DIMENSION, "dimensions")? {
        let name = cursor.name()?;
        let length = cursor.count()?;
        if length == 0 {
            if record_dimension.is_some() {
                return Err(Trouble::Wrong("two dimensions are unlimited".to_owned()));
            }
            record_dimension = Some(index as usize);
        }
        dimensions.push(Dimension { name, length });
    }
    // Global attributes are passed over: nothing here depends on them.
    cursor.attributes()?;
    let mut variables: Vec<Raw> = Vec::new();
    for _ in 0..cursor.list(TAG_VARIABLE, "variables")? {
        variables.push(raw_variable(&mut cursor, &dimensions, record_dimension)?);
    }
    let record_count_of_type = variables.iter().filter(|raw| raw.is_record).count();
    let mut record_bytes = 0_u64;
    for raw in variables.iter().filter(|raw| raw.is_record) {
        // One record variable alone is not padded (the format's special case).
        let padded = if record_count_of_type == 1 { raw.bytes } else { raw.bytes + padding(raw.bytes) };
        record_bytes = record_bytes
            .checked_add(padded)
            .ok_or_else(|| Trouble::Wrong("the records are impossibly large".to_owned()))?;
    }
    let streaming = if version == 5 { u64::MAX } else { u64::from(u32::MAX) };
    let records = if stated_records == streaming {
        // Written as a stream: the number of records follows from the file's size.
        let begin = variables.iter().filter(|raw| raw.is_record).map(|raw| raw.begin).min().unwrap_or(file_bytes);
        let of_records = file_bytes.saturating_sub(begin);
        // The format pads a file to four bytes at most.
        let rest = of_records.checked_rem(record_bytes).unwrap_or(0);
        if rest > 3 {
            return Err(Trouble::Wrong(format!(
                "its last record has {rest} of {record_bytes} bytes (the number of records is not stated)"
            )));
        }
        of_records.checked_div(record_bytes).unwrap_or(0)
    } else {
        stated_records
    };
    if let Some(index) = record_dimension {
        dimensions[index].length = records;
    }
    let header_bytes = cursor.at as u64;
    let mut finished = Vec::new();
    for mut raw in variables {
        let name = &raw.variable.name;
        let last = if raw.is_record {
            let before = records.saturating_sub(1).checked_mul(record_bytes);
            // Without records there are no bytes, and the place may be the end of the file.
            if records == 0 {
                Some(0)
            } else {
                before.and_then(|before| before.checked_add(raw.begin.checked_add(raw.bytes)?))
            }
        } else {
            raw.begin.checked_add(raw.bytes)
        };
        match last {
            Some(last) if last <= file_bytes && (raw.begin >= header_bytes || raw.bytes == 0) => {}
            Some(last) if last > file_bytes => {
                return Err(Trouble::Wrong(format!(
                    "variable `{name}` ends at byte {last}, but the file has {file_bytes} bytes"
                )));
            }
            _ => return Err(Trouble::Wrong(format!("variable `{name}` has an impossible place in the file"))),
        }
        raw.variable.storage = if raw.is_record {
            Storage::Records { offset: raw.begin, record_bytes }
        } else {
            Storage::Contiguous { offset: raw.begin, big_endian: true }
        };
        finished.push(raw.variable);
    }
    let format = match version {
        1 => "NetCDF classic",
        2 => "NetCDF 64-bit offset",
        _ => "NetCDF CDF-5",
    };
    Ok(Header { path: path.to_owned(), format, dimensions, variables: finished, groups: Vec::new() })
}

fn raw_variable(
    cursor: &mut Cursor<'_>,
    dimensions: &[Dimension],
    record_dimension: Option<usize>,
) -> Result<Raw, Trouble> {
    let name = cursor.name()?;
    let rank = cursor.count()?;
    if rank > 1024 {
        return Err(Trouble::Wrong(format!("variable `{name}` has {rank} dimensions")));
    }
    let mut of_variable = Vec::new();
    for _ in 0..rank {
        let dimension = cursor.count()? as usize;
        if dimension >= dimensions.len() {
            return Err(Trouble::Wrong(format!("variable `{name}` names a dimension that is not there")));
        }
        of_variable.push(dimension);
    }
    let attributes = cursor.attributes()?;
    let kind = kind(cursor.u32()?)?;
    // The stored size is not used: it overflows for large variables, and follows from the shape.
    let _ = cursor.count()?;
    let begin = cursor.offset()?;
    let is_record = record_dimension.is_some() && of_variable.first() == record_dimension.as_ref();
    if of_variable.iter().skip(1).any(|dimension| Some(*dimension) == record_dimension) {
        return Err(Trouble::Wrong(format!(
            "variable `{name}` has the unlimited dimension in a place other than the first"
        )));
    }
    let size = match kind {
        VariableType::Number(number) => number.size() as u64,
        VariableType::Text | VariableType::Other => 1,
    };
    let fixed = &of_variable[usize::from(is_record)..];
    let bytes = fixed
        .iter()
        .try_fold(size, |bytes, dimension| bytes.checked_mul(dimensions[*dimension].length))
        .filter(|bytes| *bytes < u64::MAX / 4)
        .ok_or_else(|| Trouble::Wrong(format!("variable `{name}` is impossibly large")))?;
    let variable = Variable { name, dimensions: of_variable, kind, attributes, storage: Storage::Library };
    Ok(Raw { variable, begin, bytes, is_record })
}
