//! Tables of the spreading comparison.

use crate::Error;
use crate::config::{Study, TableFormat};
use crate::io::replace_file::replace_with;
use crate::io::table::{TableWriter, write_dictionary};
use crate::model::{SensorSpreading, Table};
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
    let mut written = Vec::new();
    write(study, &spreading_table(all), folder, "spreading", &mut written)?;
    write(study, &testability_table(all), folder, "testability", &mut written)?;
    let json = folder.join("spreading.json");
    let mut text = serde_json::to_string_pretty(all).expect("plain data is JSON");
    text.push('\n');
    replace_with(&json, text.as_bytes())?;
    written.push(json);
    Ok(written)
}

fn write(study: &Study, table: &Table, folder: &Path, name: &str, written: &mut Vec<PathBuf>) -> Result<(), Error> {
    for format in &study.tables {
        let extension = match format {
            TableFormat::Parquet => "parquet",
            TableFormat::Csv => "csv",
        };
        let path = folder.join(format!("{name}.{extension}"));
        let mut writer = TableWriter::create(&path)?;
        writer.append(table)?;
        writer.finish()?;
        written.push(path);
    }
    let dictionary = folder.join(format!("{name}_columns.csv"));
    write_dictionary(&dictionary, table)?;
    written.push(dictionary);
    Ok(())
}
