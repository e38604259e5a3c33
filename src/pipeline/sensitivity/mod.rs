//! `fit --sensitivity`: the fit again under every reasonable choice, one choice at a time.

mod choices;
mod figures;

use super::fitting::fit_conditions;
use super::inputs::Inputs;
use super::matching::{Matched, bring_together};
use super::output::write_table;
use super::progress::{Progress, Silent};
use super::reporting::write_figure;
use crate::Error;
use crate::config::Study;
use crate::model::{FittedBand, Missing, Refit};
use crate::report::columns::sensitivity_table;
use choices::{Change, Grounds, trials};
use std::path::{Path, PathBuf};

/// Fits under every choice other than the study's own, one at a time; the base is the study's first wind source.
///
/// A choice for which nothing can be fitted at all (such as a nearest node farther away than is allowed) is left out, with
/// a remark.
///
/// # Errors
/// When an input cannot be read.
pub(super) fn refit_all(
    study: &Study,
    inputs: &Inputs,
    matched: &Matched,
    fitted: &[FittedBand],
    progress: &dyn Progress,
) -> Result<(Vec<Refit>, Vec<String>), Error> {
    let Some(first) = study.wind.first() else { return Ok((Vec::new(), Vec::new())) };
    let grounds = Grounds {
        several_samples: matched
            .records
            .iter()
            .flat_map(|record| &record.bands)
            .any(|band| band.samples.iter().any(|n| *n > 1)),
        deployments: matched.records.iter().any(|record| record.deployments.len() > 1),
        land: matched.counts.not_used.contains_key(Missing::LandOrMissing.name()),
    };
    let trials = trials(study, &grounds);
    let (mut refits, mut remarks) = (Vec::new(), Vec::new());
    progress.start(trials.len() as u64, "trying choices");
    for trial in trials {
        let others = match &trial.change {
            Change::Source(id) => fitted.iter().filter(|band| band.source == *id).cloned().collect(),
            Change::Fit(other) => fit_first(other, matched, 0),
            Change::Lag(windows) => fit_first(study, matched, *windows),
            Change::Match(other) => match bring_together(other, inputs, &Silent) {
                Ok(again) => fit_first(other, &again, 0),
                Err(Error::NothingInCommon { .. }) => {
                    let choice = &trial.choice;
                    remarks.push(format!("{}, {}: no pairs are left; not tried", choice.about, choice.taken));
                    Vec::new()
                }
                Err(error) => return Err(error),
            },
        };
        for base in fitted.iter().filter(|band| band.source == first.id) {
            let same =
                |other: &&FittedBand| other.site == base.site && other.sensor == base.sensor && other.band == base.band;
            if let Some(other) = others.iter().find(same) {
                refits.push(Refit { choice: trial.choice.clone(), base: base.clone(), other: other.clone() });
            }
        }
        progress.advance(1);
    }
    progress.finish();
    // Site by site, as a reader asks; the sort is stable, so choices and bands keep their order.
    refits.sort_by(|a, b| (&a.base.site, &a.base.sensor).cmp(&(&b.base.site, &b.base.sensor)));
    Ok((refits, remarks))
}

/// The fit of the study's first wind source, with its wind moved by a number of windows.
fn fit_first(study: &Study, matched: &Matched, lag_windows: i32) -> Vec<FittedBand> {
    let mut fitted = Vec::new();
    for (record, sources) in matched.records.iter().zip(&matched.conditions) {
        if let Some(conditions) = sources.iter().find(|conditions| conditions.source == study.wind[0].id) {
            fitted.extend(fit_conditions(study, record, conditions, lag_windows));
        }
    }
    fitted
}

/// Writes the table and the figures of the choices. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub(super) fn write_sensitivity(study: &Study, refits: &[Refit], folder: &Path) -> Result<Vec<PathBuf>, Error> {
    let mut written = write_table(&study.tables, folder, "sensitivity", &sensitivity_table(refits))?;
    let figure_folder = folder.join("figures");
    std::fs::create_dir_all(&figure_folder).map_err(|source| Error::Folder { path: figure_folder.clone(), source })?;
    for (name, figure) in figures::of_choices(refits) {
        written.extend(write_figure(&figure_folder, &name, &figure)?);
    }
    Ok(written)
}
