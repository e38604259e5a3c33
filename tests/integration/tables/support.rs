//! Helpers of the table tests.

use std::path::{Path, PathBuf};
use underwind::io::levels::{LevelError, LevelNames, LevelOptions, LevelTable, open_levels};
use underwind::model::{BandScheme, LevelKind, LevelRow, PressureReference, Stamp};

/// A folder of fixtures.
pub(super) fn fixtures() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/fixtures/tables")
}

/// The folder of real files, where it is there.
#[expect(clippy::print_stderr, reason = "a skipped test says so")]
pub(super) fn real_data() -> Option<PathBuf> {
    let folder = std::env::var_os("UNDERWIND_REAL_DATA")
        .map_or_else(|| Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/data"), PathBuf::from);
    if folder.is_dir() {
        return Some(folder);
    }
    eprintln!("skipped: no real data folder");
    None
}

/// A file with this content in a folder of its own.
pub(super) struct Scratch {
    pub(super) folder: tempfile::TempDir,
    pub(super) path: PathBuf,
}

pub(super) fn scratch(name: &str, content: impl AsRef<[u8]>) -> Scratch {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join(name);
    std::fs::write(&path, content).unwrap();
    Scratch { folder, path }
}

/// Options that state everything a plain level table leaves out.
pub(super) fn stated() -> LevelOptions {
    LevelOptions {
        site: None,
        reference: Some(PressureReference::Micropascal),
        kind: Some(LevelKind::BandLevel),
        bands: Some(BandScheme::Decidecade),
        window_s: Some(600.0),
        stamp: Some(Stamp::Start),
        ..LevelOptions::default()
    }
}

/// All rows of a table, with its names.
pub(super) fn rows_of(path: &Path, options: &LevelOptions) -> Result<(Vec<LevelRow>, LevelTable), LevelError> {
    let mut table = open_levels(&[path.to_owned()], options)?;
    let mut rows = Vec::new();
    table.for_each(|_: &LevelNames, row| -> Result<(), LevelError> {
        rows.push(row);
        Ok(())
    })?;
    Ok((rows, table))
}

/// The message of the error that opening or reading gives, without the folder of the file.
pub(super) fn message(content: impl AsRef<[u8]>, options: &LevelOptions) -> String {
    let file = scratch("levels.csv", content);
    let error = rows_of(&file.path, options).expect_err("an error is expected");
    short(&error.to_string(), &file)
}

/// A message without the scratch folder.
pub(super) fn short(message: &str, file: &Scratch) -> String {
    message.replace(&format!("{}/", file.folder.path().display()), "")
}
