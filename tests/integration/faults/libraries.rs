//! Files on which the C libraries crash or never end, and folders of junk.

use crate::support::{project, underwind, write};
use std::path::Path;

/// A copy of a fixture with some bytes replaced (place from 0, bytes).
fn damaged(folder: &Path, fixture: &str, name: &str, patches: &[(usize, &[u8])]) {
    let mut bytes = std::fs::read(project().join("tests/fixtures/grids").join(fixture)).unwrap();
    for (at, patch) in patches {
        bytes[*at..at + patch.len()].copy_from_slice(patch);
    }
    std::fs::write(folder.join(name), bytes).unwrap();
}

#[test]
fn a_crash_of_the_file_library_is_an_error_of_one_line() {
    let folder = tempfile::tempdir().unwrap();
    // Found by damaging files at random: one bit in a header of the symbol table; netcdf-c 4.9 and HDF5 1.14 die of it.
    damaged(folder.path(), "f02_big_endian.nc", "bit.nc", &[(2171, &[4])]);
    let ask = ["sample", "wind", "bit.nc", "--latitude", "45", "--longitude", "-131", "--time", "2031-01-10T01:00:00Z"];
    let run = underwind(folder.path(), &ask);
    assert_eq!(run.status, 4, "{}", run.stderr);
    assert_eq!(
        run.stderr,
        "error: bit.nc: damaged or cut short: the HDF5 library crashes (signal 11) on it (write the file anew, or leave it out)\n"
    );
}

#[test]
fn a_file_library_that_never_ends_is_stopped() {
    let folder = tempfile::tempdir().unwrap();
    let fixture = std::fs::read(project().join("tests/fixtures/grids/f02_compact.nc")).unwrap();
    let zeros = vec![0; ZEROED.len()];
    assert!(fixture.len() > ZEROED.end);
    damaged(folder.path(), "f02_compact.nc", "loop.nc", &[(ZEROED.start, &zeros)]);
    let ask =
        ["sample", "wind", "loop.nc", "--latitude", "45", "--longitude", "-131", "--time", "2031-01-10T01:00:00Z"];
    let run = underwind(folder.path(), &ask);
    assert_eq!(run.status, 4, "{}", run.stderr);
    assert_eq!(
        run.stderr,
        "error: loop.nc: damaged or cut short: the HDF5 library does not come to an end on it (write the file anew, or leave it out)\n"
    );
}

/// Bytes of `f02_compact.nc` without which the library reads round in circles.
const ZEROED: std::ops::Range<usize> = 2128..2169;

#[test]
fn a_folder_of_junk_is_refused_file_by_file() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    let junk: [(&str, &[u8], &str); 9] = [
        ("empty.nc", b"", "this is an empty file"),
        ("page.nc", b"<!DOCTYPE html><html>no such file</html>", "this is an HTML page"),
        ("archive.nc", b"PK\x03\x04aaaaaaaaaaaaaaaa", "this is a ZIP archive"),
        ("grib.nc", b"GRIB\x00\x00\x00\x02aaaaaaa", "this is GRIB"),
        ("packed.nc", b"\x1f\x8b\x08\x00aaaaaaaaaa", "this is gzip-compressed"),
        ("magic.nc", b"CDF\x01", "damaged or cut short"),
        ("magic4.nc", b"\x89HDF\r\n\x1a\n", ""),
        ("noise.nc", b"\x00\xff\x13\x37\x00\xff\x13\x37", "expected NetCDF"),
        ("text.nc", b"time,u,v\n", "expected NetCDF"),
    ];
    for (name, bytes, expected) in junk {
        std::fs::write(at.join(name), bytes).unwrap();
        let text = format!(
            "[study]\nname = \"junk\"\n[[site]]\nid = \"a\"\nlatitude_deg = 45\nlongitude_deg = -31\ndepth_m = 10\n[[wind]]\nid = \"m\"\nfiles = [\"{name}\"]\n"
        );
        write(at, "study.toml", &text);
        let said = underwind(at, &["check", "study.toml"]).fails(4, &[name, expected]).stderr;
        assert!(!said.contains("panicked"), "{said}");
    }
}
