//! Tables of the spreading comparison.

use crate::Error;
use crate::config::Study;
use crate::io::replace_file::replace_with;
use crate::model::SensorSpreading;
use crate::pipeline::output::write_table;
use crate::report::columns::{spreading_table, testability_table};
use std::path::{Path, PathBuf};

/// Writes the comparison and the testability, as tables with their dictionaries and as JSON. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub(in crate::pipeline) fn write_spreading(
    study: &Study,
    all: &[SensorSpreading],
    folder: &Path,
) -> Result<Vec<PathBuf>, Error> {
    let mut written = write_table(&study.tables, folder, "spreading", &spreading_table(all))?;
    written.extend(write_table(&study.tables, folder, "testability", &testability_table(all))?);
    let json = folder.join("spreading.json");
    replace_with(&json, spreading_json(all).as_bytes())?;
    written.push(json);
    Ok(written)
}

/// The comparison as JSON.
pub fn spreading_json(all: &[SensorSpreading]) -> String {
    let mut text = serde_json::to_string_pretty(all).expect("plain data is JSON");
    text.push('\n');
    text
}
