//! From a file to a stream of UTF-8 (or Latin) bytes with line feeds: first bytes, gzip, encoding, line ends.

use super::DelimitedError;
use encoding_rs::{Decoder, Encoding, UTF_16BE, UTF_16LE, WINDOWS_1252};
use flate2::read::MultiGzDecoder;
use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

/// What the first bytes of a file look like.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum FileKind {
    /// Text, or at least nothing else that is known.
    Text,
    /// A gzip stream.
    Gzip,
    /// A Parquet file.
    Parquet,
    /// Something that is no table; the name for messages.
    Other(&'static str),
    /// No bytes.
    Empty,
}

/// Names the kind of a file by its first bytes.
pub(crate) fn sniff(head: &[u8]) -> FileKind {
    let starts = |magic: &[u8]| head.starts_with(magic);
    let lower: Vec<u8> =
        head.iter().take(256).map(u8::to_ascii_lowercase).skip_while(u8::is_ascii_whitespace).collect();
    if head.is_empty() {
        FileKind::Empty
    } else if starts(&[0x1f, 0x8b]) {
        FileKind::Gzip
    } else if starts(b"PAR1") {
        FileKind::Parquet
    } else if starts(b"\x89HDF\r\n\x1a\n") {
        FileKind::Other("an HDF5 or NetCDF-4 file")
    } else if starts(b"CDF\x01") || starts(b"CDF\x02") || starts(b"CDF\x05") {
        FileKind::Other("a classic NetCDF file")
    } else if starts(b"PK\x03\x04") {
        FileKind::Other("a ZIP archive (a spreadsheet file is one too)")
    } else if starts(b"\xd0\xcf\x11\xe0") {
        FileKind::Other("an old binary spreadsheet")
    } else if starts(b"GRIB") {
        FileKind::Other("a GRIB file")
    } else if starts(b"ARROW1") {
        FileKind::Other("an Arrow file")
    } else if starts(b"\x28\xb5\x2f\xfd") {
        FileKind::Other("zstd-compressed data")
    } else if starts(b"BZh") {
        FileKind::Other("bzip2-compressed data")
    } else if starts(b"\xfd7zXZ") {
        FileKind::Other("xz-compressed data")
    } else if starts(b"%PDF") {
        FileKind::Other("a PDF document")
    } else if starts(b"RIFF") || starts(b"fLaC") {
        FileKind::Other("a sound file")
    } else if lower.starts_with(b"<!doctype html") || lower.starts_with(b"<html") {
        FileKind::Other("an HTML page")
    } else if lower.starts_with(b"<?xml") {
        FileKind::Other("an XML document")
    } else {
        FileKind::Text
    }
}

/// The first bytes of a file, for `sniff`.
pub(crate) fn first_bytes(path: &Path) -> Result<Vec<u8>, DelimitedError> {
    let failed = |source| DelimitedError::Read { path: path.to_owned(), source };
    let metadata = std::fs::metadata(path).map_err(failed)?;
    if metadata.is_dir() {
        return Err(DelimitedError::OtherKind { path: path.to_owned(), found: "a folder", expected: "a table" });
    }
    let mut head = Vec::with_capacity(512);
    File::open(path).map_err(failed)?.take(512).read_to_end(&mut head).map_err(failed)?;
    Ok(head)
}

/// The bytes of a text file, decompressed and with a known encoding.
pub(crate) struct TextSource {
    /// UTF-8, or bytes of an ASCII superset where nothing was said; line ends are LF or CR LF.
    pub(crate) reader: Box<dyn Read + Send>,
    /// Whether it came through gzip.
    pub(crate) compressed: bool,
    /// What was found out about the encoding, where it is worth a note.
    pub(crate) note: Option<String>,
}

/// Opens a text file.
pub(crate) fn open_text(path: &Path, encoding: Option<&str>, encoding_key: &str) -> Result<TextSource, DelimitedError> {
    let kind = sniff(&first_bytes(path)?);
    let file = File::open(path).map_err(|source| DelimitedError::Read { path: path.to_owned(), source })?;
    let other = |found| DelimitedError::OtherKind { path: path.to_owned(), found, expected: "a text table" };
    let (mut raw, compressed): (Box<dyn Read + Send>, bool) = match kind {
        FileKind::Empty => return Err(DelimitedError::Empty { path: path.to_owned() }),
        FileKind::Parquet => return Err(other("a Parquet file")),
        FileKind::Other(found) => return Err(other(found)),
        FileKind::Gzip => (Box::new(MultiGzDecoder::new(io::BufReader::with_capacity(1 << 16, file))), true),
        FileKind::Text => (Box::new(file), false),
    };
    let mut sample = Vec::with_capacity(1 << 16);
    read_up_to(&mut raw, &mut sample, 1 << 16).map_err(|source| read_error(path, compressed, 0, source))?;
    if compressed {
        match sniff(&sample) {
            FileKind::Empty => return Err(DelimitedError::Empty { path: path.to_owned() }),
            FileKind::Gzip => return Err(other("gzip data within gzip data")),
            FileKind::Parquet => return Err(other("a Parquet file within gzip data")),
            FileKind::Other(found) => return Err(other(found)),
            FileKind::Text => {}
        }
    }
    let (coding, mark_length, note) = choose_encoding(&sample, encoding, encoding_key)?;
    let cr_only = {
        let text = decoded_sample(coding, sample.get(mark_length..).unwrap_or_default());
        text.contains(&b'\r') && !text.contains(&b'\n')
    };
    let whole = io::Cursor::new(sample.split_off(mark_length.min(sample.len()))).chain(raw);
    let decoded: Box<dyn Read + Send> = match coding {
        None => Box::new(whole),
        Some(coding) => Box::new(Transcoder::new(whole, coding)),
    };
    let reader: Box<dyn Read + Send> = if cr_only { Box::new(CarriageReturns(decoded)) } else { decoded };
    Ok(TextSource { reader, compressed, note })
}

/// The error of a read that failed after a line.
pub(crate) fn read_error(path: &Path, compressed: bool, line: u64, source: io::Error) -> DelimitedError {
    let path = path.to_owned();
    if compressed { DelimitedError::Gzip { path, line, source } } else { DelimitedError::Read { path, source } }
}

fn read_up_to(reader: &mut dyn Read, into: &mut Vec<u8>, limit: usize) -> io::Result<()> {
    reader.take(limit as u64).read_to_end(into).map(|_| ())
}

fn decoded_sample(coding: Option<&'static Encoding>, bytes: &[u8]) -> Vec<u8> {
    match coding {
        None => bytes.to_vec(),
        Some(coding) => coding.decode_without_bom_handling(bytes).0.into_owned().into_bytes(),
    }
}

/// The encoding to convert from (`None`: leave the bytes as they are), the length of the byte order mark, and a note.
type Choice = (Option<&'static Encoding>, usize, Option<String>);

fn choose_encoding(sample: &[u8], stated: Option<&str>, key: &str) -> Result<Choice, DelimitedError> {
    let mark = Encoding::for_bom(sample);
    if let Some(name) = stated {
        let label = match name.trim().to_ascii_lowercase().as_str() {
            "latin1" | "latin-1" | "iso-8859-1" => "windows-1252".to_owned(),
            "utf8" => "utf-8".to_owned(),
            other => other.to_owned(),
        };
        let coding = Encoding::for_label(label.as_bytes())
            .ok_or_else(|| DelimitedError::UnknownEncoding { key: key.to_owned(), found: name.to_owned() })?;
        let skipped = mark.filter(|(found, _)| *found == coding).map_or(0, |(_, length)| length);
        let convert = (coding != encoding_rs::UTF_8).then_some(coding);
        return Ok((convert, skipped, None));
    }
    if let Some((coding, length)) = mark {
        let convert = (coding != encoding_rs::UTF_8).then_some(coding);
        return Ok((convert, length, convert.map(|coding| format!("the text is {}", coding.name()))));
    }
    // Without a mark, UTF-16 shows by a zero byte beside every ASCII letter.
    let pairs = sample.len() / 2;
    if pairs >= 8 {
        let zeros = |offset: usize| sample.iter().skip(offset).step_by(2).filter(|byte| **byte == 0).count();
        let (even, odd) = (zeros(0), zeros(1));
        if odd * 10 > pairs * 8 && even == 0 {
            return Ok((Some(UTF_16LE), 0, Some("the text is taken as UTF-16LE by its zero bytes".to_owned())));
        }
        if even * 10 > pairs * 8 && odd == 0 {
            return Ok((Some(UTF_16BE), 0, Some("the text is taken as UTF-16BE by its zero bytes".to_owned())));
        }
    }
    let valid = match std::str::from_utf8(sample) {
        Ok(_) => true,
        // A sample may cut the last character.
        Err(error) => error.error_len().is_none(),
    };
    if valid {
        Ok((None, 0, None))
    } else {
        let note =
            format!("the text is not UTF-8; taken as Latin-1 (Windows-1252), set `{key}` if it is another encoding");
        Ok((Some(WINDOWS_1252), 0, Some(note)))
    }
}

/// Converts another encoding to UTF-8 while reading.
struct Transcoder<R> {
    input: R,
    decoder: Decoder,
    raw: Vec<u8>,
    ready: Vec<u8>,
    taken: usize,
    ended: bool,
}

impl<R: Read> Transcoder<R> {
    fn new(input: R, coding: &'static Encoding) -> Self {
        Self {
            input,
            decoder: coding.new_decoder_without_bom_handling(),
            raw: vec![0; 1 << 15],
            ready: Vec::new(),
            taken: 0,
            ended: false,
        }
    }
}

impl<R: Read> Read for Transcoder<R> {
    fn read(&mut self, into: &mut [u8]) -> io::Result<usize> {
        while self.taken == self.ready.len() {
            if self.ended {
                return Ok(0);
            }
            let count = self.input.read(&mut self.raw)?;
            self.ended = count == 0;
            let bytes = self.raw.get(..count).unwrap_or_default();
            let room = self.decoder.max_utf8_buffer_length(count).unwrap_or(4 * count + 16);
            self.ready.resize(room, 0);
            let (_, _, written, _) = self.decoder.decode_to_utf8(bytes, &mut self.ready, self.ended);
            self.ready.truncate(written);
            self.taken = 0;
        }
        let available = self.ready.get(self.taken..).unwrap_or_default();
        let count = available.len().min(into.len());
        into[..count].copy_from_slice(&available[..count]);
        self.taken += count;
        Ok(count)
    }
}

/// Turns the carriage returns of a file that has no line feeds into line feeds.
struct CarriageReturns(Box<dyn Read + Send>);

impl Read for CarriageReturns {
    fn read(&mut self, into: &mut [u8]) -> io::Result<usize> {
        let count = self.0.read(into)?;
        for byte in into.iter_mut().take(count) {
            if *byte == b'\r' {
                *byte = b'\n';
            }
        }
        Ok(count)
    }
}
