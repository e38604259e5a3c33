//! The whole job, or the first part of it: match, fit, report.

use super::fitting::{fit_matched, write_relations};
use super::inputs::open_inputs;
use super::matching::{Counts, bring_together, write_tables};
use super::progress::Progress;
use super::provenance::{PROGRAM, Provenance, input_records, write_provenance};
use super::reporting::{ReportInput, write_report, write_spread_figures};
use super::sensitivity::{refit_all, write_sensitivity};
use super::spreading::{compare_spreading, write_spreading};
use crate::Error;
use crate::config::Study;
use crate::model::{Fitted, Refit, SensorSpreading};
use std::path::{Path, PathBuf};

/// What is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stage {
    /// The tables of sampled wind, conditions and matchups.
    Match,
    /// The relation table.
    Fit,
    /// The relation table, and what other choices would do to it.
    Sensitivity,
    /// Figures and page.
    Report,
    /// The spreading comparison: tables, figures.
    Spread,
    /// All of these.
    Everything,
}

/// What a run came to.
#[derive(Debug)]
pub struct Outcome {
    /// The relations; empty for `Stage::Match`.
    pub fitted: Fitted,
    /// How many pairs and rows were used.
    pub counts: Counts,
    /// Remarks.
    pub remarks: Vec<String>,
    /// The spreading comparison; empty without spectra.
    pub spreading: Vec<SensorSpreading>,
    /// Fits under other choices; empty unless asked for.
    pub refits: Vec<Refit>,
    /// Files written.
    pub written: Vec<PathBuf>,
}

/// Runs a study up to a stage, and writes that stage's outputs and the provenance.
///
/// # Errors
/// When an input cannot be used, when the inputs have nothing in common, or when an output cannot be written.
pub fn run(study: &Study, stage: Stage, progress: &dyn Progress) -> Result<Outcome, Error> {
    if stage == Stage::Spread && study.spectra.is_empty() {
        return Err(Error::Lacking { study: study.path.clone(), section: "[[spectra]]" });
    }
    let inputs = open_inputs(study)?;
    // Checksums keep one core busy while the level tables, which are read in order, keep another.
    let files = inputs.files(study);
    let (matched, records) = rayon::join(|| bring_together(study, &inputs, progress), || input_records(study, &files));
    let (mut matched, records) = (matched?, records?);
    // Made before the work that takes long, so that a folder that cannot be written is known at once.
    make_folder(&study.output)?;
    let mut written = Vec::new();
    if matches!(stage, Stage::Match | Stage::Everything) {
        written.extend(write_tables(study, &matched, &study.output, progress)?);
    }
    let fitted = if stage == Stage::Match { Fitted::default() } else { fit_matched(study, &matched, progress) };
    if matches!(stage, Stage::Fit | Stage::Sensitivity | Stage::Everything) {
        written.extend(write_relations(&fitted, &study.tables, &study.output)?);
    }
    let mut spreading = Vec::new();
    if matches!(stage, Stage::Spread | Stage::Report | Stage::Everything) {
        spreading = compare_spreading(study, &matched, &fitted.bands, progress);
    }
    if matches!(stage, Stage::Spread | Stage::Everything) && !spreading.is_empty() {
        written.extend(write_spreading(study, &spreading, &study.output)?);
    }
    if stage == Stage::Spread {
        written.extend(write_spread_figures(study, &matched, &spreading, &study.output)?);
    }
    let mut refits = Vec::new();
    if stage == Stage::Sensitivity {
        let (all, remarks) = refit_all(study, &inputs, &matched, &fitted.bands, progress)?;
        written.extend(write_sensitivity(study, &all, &study.output)?);
        matched.remarks.extend(remarks);
        refits = all;
    }
    if matches!(stage, Stage::Report | Stage::Everything) {
        let input = ReportInput {
            study,
            sites: &inputs.sites,
            matched: &matched,
            fitted: &fitted,
            spreading: &spreading,
            inputs: &records,
        };
        written.extend(write_report(&input, &study.output, progress)?);
    }
    let path = study.output.join("provenance.json");
    let provenance = Provenance {
        program: PROGRAM,
        study,
        inputs: &records,
        pairs_used: matched.counts.used,
        pairs_not_used: &matched.counts.not_used,
        pairs_excluded: &matched.counts.excluded,
        level_rows_not_used: &matched.counts.rows_not_used,
        remarks: &matched.remarks,
    };
    write_provenance(&provenance, &path)?;
    written.push(path);
    Ok(Outcome { fitted, counts: matched.counts, remarks: matched.remarks, spreading, refits, written })
}

/// Makes a folder for outputs, with all above it.
///
/// # Errors
/// When it cannot be made.
pub fn make_folder(folder: &Path) -> Result<(), Error> {
    std::fs::create_dir_all(folder).map_err(|source| Error::Folder { path: folder.to_owned(), source })
}
