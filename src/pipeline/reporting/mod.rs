//! `report`: figures and the page.

mod figures;
mod methods;
mod page;
pub(super) mod words;

pub(super) use page::block;

use super::fitting::{segments_of, wind_speed_m_s};
use super::matching::{Matched, used_levels_db};
use super::progress::Progress;
use super::provenance::InputRecord;
use crate::Error;
use crate::config::Study;
use crate::io::replace_file::replace_with;
use crate::model::{Conditions, Fitted, FittedBand, FittedSensor, SensorRecord, SensorSpreading, Site};
use crate::pipeline::spreading::{SpreadFigures, spread_figures};
use crate::report::{Figure, html};
use rayon::prelude::*;
use std::path::{Path, PathBuf};

/// PNG pixels per CSS pixel: 2 is 192 pixels an inch, enough for a page and for print at a column's width.
const PNG_SCALE: f64 = 2.0;

/// All that the report shows.
#[derive(Debug)]
pub(super) struct ReportInput<'a> {
    /// The study.
    pub study: &'a Study,
    /// Its sites.
    pub sites: &'a [Site],
    /// Levels and wind brought together.
    pub matched: &'a Matched,
    /// The relations.
    pub fitted: &'a Fitted,
    /// The spreading comparison; empty without spectra.
    pub spreading: &'a [SensorSpreading],
    /// The input files.
    pub inputs: &'a [InputRecord],
}

/// One sensor's record with the wind of one source and the relations of its bands.
struct Pairing<'a> {
    record: &'a SensorRecord,
    conditions: &'a Conditions,
    fitted: &'a [FittedBand],
    /// What was found over its bands together.
    sensor: Option<&'a FittedSensor>,
    /// The wind speed that the fit used, one entry a window, m/s.
    wind_m_s: Vec<f64>,
    /// Levels of each band, one entry a window, dB; NaN where the pair is not used.
    levels_db: Vec<Vec<f64>>,
}

/// A figure with its place and its caption.
pub(super) struct Placed {
    /// File name without extension.
    pub(super) name: String,
    pub(super) caption: String,
    pub(super) figure: Figure,
}

/// Draws all figures and writes them (SVG and PNG) and the page. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub(super) fn write_report(
    input: &ReportInput<'_>,
    folder: &Path,
    progress: &dyn Progress,
) -> Result<Vec<PathBuf>, Error> {
    let pairings = pairings(input);
    let whole = figures::of_study(input);
    let per_pairing: Vec<Vec<Placed>> =
        pairings.par_iter().map(|pairing| figures::of_pairing(input, pairing)).collect();
    let figure_folder = folder.join("figures");
    std::fs::create_dir_all(&figure_folder).map_err(|source| Error::Folder { path: figure_folder.clone(), source })?;
    let spread = spread_figures(input.study, input.matched, input.spreading);
    let of_spread = spread.testability.iter().chain(spread.of_sensors.iter().flatten());
    let all: Vec<&Placed> = whole.iter().chain(per_pairing.iter().flatten()).chain(of_spread).collect();
    progress.start(all.len() as u64, "drawing");
    let written: Vec<[PathBuf; 2]> = all
        .par_iter()
        .map(|placed| {
            let files = write_figure(&figure_folder, &placed.name, &placed.figure)?;
            progress.advance(1);
            Ok(files)
        })
        .collect::<Result<_, Error>>()?;
    progress.finish();
    let page = folder.join("report.html");
    let methods = methods::methods(input);
    let document = page::document(input, &pairings, &methods, whole, per_pairing, spread);
    replace_with(&page, html(&document).as_bytes())?;
    let text = folder.join("methods.md");
    replace_with(&text, methods.markdown(input.study).as_bytes())?;
    let mut files: Vec<PathBuf> = written.into_iter().flatten().collect();
    files.extend([page, text]);
    Ok(files)
}

/// Draws and writes the figures of the spreading comparison alone. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub(super) fn write_spread_figures(
    study: &Study,
    matched: &Matched,
    spreading: &[SensorSpreading],
    folder: &Path,
) -> Result<Vec<PathBuf>, Error> {
    let figures = spread_figures(study, matched, spreading);
    let folder = folder.join("figures");
    std::fs::create_dir_all(&folder).map_err(|source| Error::Folder { path: folder.clone(), source })?;
    let all: Vec<&Placed> = figures.testability.iter().chain(figures.of_sensors.iter().flatten()).collect();
    let written: Vec<[PathBuf; 2]> = all
        .par_iter()
        .map(|placed| write_figure(&folder, &placed.name, &placed.figure))
        .collect::<Result<_, Error>>()?;
    Ok(written.into_iter().flatten().collect())
}

/// Writes a figure as SVG and PNG.
///
/// # Errors
/// When a file cannot be written.
pub(super) fn write_figure(folder: &Path, name: &str, figure: &Figure) -> Result<[PathBuf; 2], Error> {
    let svg = folder.join(format!("{name}.svg"));
    replace_with(&svg, figure.svg().as_bytes())?;
    let png = folder.join(format!("{name}.png"));
    replace_with(&png, &figure.png(PNG_SCALE)?)?;
    Ok([svg, png])
}

fn pairings<'a>(input: &'a ReportInput<'a>) -> Vec<Pairing<'a>> {
    let mut pairings = Vec::new();
    for wind in &input.study.wind {
        for (record, sources) in input.matched.records.iter().zip(&input.matched.conditions) {
            let Some(conditions) = sources.iter().find(|conditions| conditions.source == wind.id) else { continue };
            let bands = &input.fitted.bands;
            let of_pairing = |f: &FittedBand| f.source == wind.id && f.site == record.site && f.sensor == record.sensor;
            let first = bands.iter().position(of_pairing).unwrap_or(bands.len());
            let fitted = &bands[first..first + bands[first..].iter().take_while(|band| of_pairing(band)).count()];
            let sensor = input
                .fitted
                .sensors
                .iter()
                .find(|f| f.source == wind.id && f.site == record.site && f.sensor == record.sensor);
            let which = input.study.matching.wind_speed;
            let wind_m_s = conditions.wind.iter().map(|wind| wind_speed_m_s(wind.as_ref(), which)).collect();
            let levels_db = used_levels_db(record, conditions);
            pairings.push(Pairing { record, conditions, fitted, sensor, wind_m_s, levels_db });
        }
    }
    pairings
}
