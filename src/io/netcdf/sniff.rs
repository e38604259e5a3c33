//! What a file is, from its first bytes.

use super::error::NetcdfError;
use std::fs::File;
use std::io::Read;
use std::path::Path;

/// A file format that can be read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Format {
    /// Classic NetCDF, with its version byte: 1, 2 or 5.
    Classic(u8),
    /// NetCDF-4, which is HDF5.
    Hdf5,
}

/// Looks at the first bytes.
pub(super) fn sniff(path: &Path) -> Result<Format, NetcdfError> {
    let unreadable = |source| NetcdfError::Unreadable { path: path.to_owned(), source };
    let not = |found| Err(NetcdfError::NotNetcdf { path: path.to_owned(), found });
    if path.is_dir() {
        return not("a folder");
    }
    // A pipe or device would be waited for, perhaps for ever.
    if std::fs::metadata(path).is_ok_and(|metadata| !metadata.is_file()) {
        return not("no regular file");
    }
    let mut head = Vec::new();
    File::open(path).map_err(unreadable)?.take(4096).read_to_end(&mut head).map_err(unreadable)?;
    let text = String::from_utf8_lossy(&head[..head.len().min(512)]).trim_start().to_lowercase();
    match head.as_slice() {
        [] => not("an empty file"),
        [b'C', b'D', b'F', version @ (1 | 2 | 5), ..] => Ok(Format::Classic(*version)),
        [b'C', b'D', b'F', ..] => not("a NetCDF file of an unknown version"),
        [0x89, b'H', b'D', b'F', b'\r', b'\n', 0x1a, b'\n', ..] => Ok(Format::Hdf5),
        [0x0e, 0x03, 0x13, 0x01, ..] => not("HDF4"),
        [b'G', b'R', b'I', b'B', ..] => not("GRIB (convert it to NetCDF first)"),
        [0x1f, 0x8b, ..] => not("gzip-compressed (unpack it first)"),
        [b'P', b'K', 3 | 5, 4 | 6, ..] => not("a ZIP archive (unpack it first)"),
        [b'B', b'Z', b'h', ..] => not("bzip2-compressed (unpack it first)"),
        [0x28, 0xb5, 0x2f, 0xfd, ..] => not("zstd-compressed (unpack it first)"),
        [b'P', b'A', b'R', b'1', ..] => not("Parquet"),
        _ if text.starts_with("<!doctype html") || text.starts_with("<html") => {
            not("an HTML page (a failed download?)")
        }
        _ if text.starts_with("<?xml") => not("XML"),
        _ if text.starts_with('{') => not("JSON text"),
        // HDF5 may start after a user block of 512, 1024, 2048 bytes.
        _ if [512, 1024, 2048].iter().any(|at| head.get(*at..at + 8) == Some(b"\x89HDF\r\n\x1a\n".as_slice())) => {
            Ok(Format::Hdf5)
        }
        _ if head.iter().all(|byte| byte.is_ascii_graphic() || byte.is_ascii_whitespace()) => not("plain text"),
        _ => not("of an unknown format"),
    }
}
