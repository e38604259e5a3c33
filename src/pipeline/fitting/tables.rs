//! The relations as tables and as JSON.

use crate::Error;
use crate::config::TableFormat;
use crate::io::replace_file::replace_with;
use crate::model::Fitted;
use crate::pipeline::output::write_table;
use crate::report::columns::{
    bands_together_table, relation_table, replicates_table, segments_table, wind_error_table,
};
use std::path::{Path, PathBuf};

/// Writes the relation tables in the study's formats, and the relations as JSON. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub fn write_relations(fitted: &Fitted, formats: &[TableFormat], folder: &Path) -> Result<Vec<PathBuf>, Error> {
    let mut written = write_table(formats, folder, "relation", &relation_table(&fitted.bands))?;
    let json = folder.join("relation.json");
    replace_with(&json, relations_json(fitted).as_bytes())?;
    written.push(json);
    written.extend(write_table(formats, folder, "bands_together", &bands_together_table(fitted))?);
    if fitted.bands.iter().any(|band| !band.relation.deployments.is_empty()) {
        written.extend(write_table(formats, folder, "segments", &segments_table(fitted))?);
    }
    if fitted.bands.iter().any(|band| band.relation.replicates.is_some()) {
        written.extend(write_table(formats, folder, "replicates", &replicates_table(&fitted.bands))?);
    }
    if fitted.bands.iter().any(|band| !band.checks.wind_error.is_empty()) {
        written.extend(write_table(formats, folder, "wind_error", &wind_error_table(&fitted.bands))?);
    }
    Ok(written)
}

/// The relations as JSON, complete: curves, diagnostics, wind classes, checks.
pub fn relations_json(fitted: &Fitted) -> String {
    let mut text = serde_json::to_string_pretty(&fitted.bands).expect("plain data is JSON");
    text.push('\n');
    text
}
