//! Where every output comes from: the resolved study, the tool's version, each input's size and checksum, and how many
//! rows were not used and why.

use crate::Error;
use crate::config::Study;
use crate::io::checksum::checksum;
use crate::io::replace_file::replace_with;
use rayon::prelude::*;
use serde::Serialize;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// One input file.
#[derive(Debug, Clone, Serialize)]
pub struct InputRecord {
    /// File name as the study names it, relative to the study file where it can be.
    pub file: String,
    /// Size in bytes.
    pub bytes: u64,
    /// SHA-256 of the whole file, hexadecimal.
    pub sha256: String,
}

/// The provenance of a run.
#[derive(Debug, Clone, Serialize)]
pub(super) struct Provenance<'a> {
    /// The program and its version.
    pub program: &'static str,
    /// The study as resolved, with all defaults.
    pub study: &'a Study,
    /// The inputs, in order of their names.
    pub inputs: &'a [InputRecord],
    /// Pairs of wind and level that go into the fit.
    pub pairs_used: u64,
    /// Pairs that do not, by reason.
    pub pairs_not_used: &'a BTreeMap<&'static str, u64>,
    /// Pairs that each rule of the study leaves out, by its reason.
    pub pairs_excluded: &'a [(String, u64)],
    /// Rows of the level tables that reach no pair, by reason.
    pub level_rows_not_used: &'a BTreeMap<&'static str, u64>,
    /// Remarks of the run.
    pub remarks: &'a [String],
}

/// Program and version, as every output carries it.
pub const PROGRAM: &str = concat!("underwind ", env!("CARGO_PKG_VERSION"));

/// Size and checksum of the inputs.
///
/// # Errors
/// When a file cannot be read.
pub(super) fn input_records(study: &Study, files: &[PathBuf]) -> Result<Vec<InputRecord>, Error> {
    let base = study.path.parent().unwrap_or(Path::new(""));
    let mut files: Vec<&PathBuf> = files.iter().collect();
    files.sort();
    files.dedup();
    files
        .par_iter()
        .map(|path| {
            let sum = checksum(path)?;
            let file = path.strip_prefix(base).unwrap_or(path).to_string_lossy().into_owned();
            Ok(InputRecord { file, bytes: sum.size, sha256: sum.sha256 })
        })
        .collect()
}

/// Writes the provenance as JSON.
///
/// # Errors
/// When the file cannot be written.
pub(super) fn write_provenance(provenance: &Provenance<'_>, path: &Path) -> Result<(), Error> {
    let text = serde_json::to_string_pretty(provenance).expect("plain data is JSON");
    replace_with(path, text.as_bytes())?;
    Ok(())
}
