//! Opens everything a study names.

use crate::Error;
use crate::config::{LevelsInput, SpectraInput, Study, WindInput, WindOrigin};
use crate::io::levels::{LevelError, LevelOptions, LevelTable, open_levels};
use crate::io::netcdf::{SpectraSource, WindSource, open_spectra, open_wind};
use crate::io::sites::{read_sites, read_track};
use crate::model::Site;
use std::path::PathBuf;

/// The inputs of a study, opened: headers read, nothing computed.
#[derive(Debug)]
pub struct Inputs {
    /// Sites, in the order of the study, those of the list last.
    pub sites: Vec<Site>,
    /// Wind inputs, in the order of the study.
    pub wind: Vec<OpenWind>,
    /// Directional spectra, in the order of the study.
    pub spectra: Vec<OpenSpectra>,
    /// Level tables, in the order of the study.
    pub levels: Vec<OpenLevels>,
    /// Remarks on site lists and tracks.
    pub remarks: Vec<String>,
}

/// A wind input, opened.
#[derive(Debug)]
pub struct OpenWind {
    /// What the study says of it.
    pub input: WindInput,
    /// A gridded source; `None` for a table, which is read when it is needed.
    pub grid: Option<WindSource>,
}

/// An input of directional spectra, opened.
#[derive(Debug)]
pub struct OpenSpectra {
    /// What the study says of it.
    pub input: SpectraInput,
    /// The source.
    pub source: SpectraSource,
}

/// A level table, opened.
#[derive(Debug)]
pub struct OpenLevels {
    /// What the study says of it.
    pub input: LevelsInput,
    /// The table.
    pub table: LevelTable,
}

/// Opens the inputs.
///
/// # Errors
/// When one cannot be read or understood; the message names the file and the key that resolves it.
pub fn open_inputs(study: &Study) -> Result<Inputs, Error> {
    let (sites, remarks) = open_sites(study)?;
    let mut wind = Vec::new();
    for input in &study.wind {
        let grid = match &input.origin {
            WindOrigin::Grid { files, options } => Some(open_wind(input.id.clone(), files, options)?),
            WindOrigin::Table { .. } => None,
        };
        wind.push(OpenWind { input: input.clone(), grid });
    }
    let mut spectra = Vec::new();
    for input in &study.spectra {
        let source = open_spectra(input.id.clone(), &input.files, &input.options)?;
        spectra.push(OpenSpectra { input: input.clone(), source });
    }
    let mut levels = Vec::new();
    for input in &study.levels {
        let only = if let [only] = sites.as_slice() { Some(only.id.as_str()) } else { None };
        levels.push(OpenLevels { input: input.clone(), table: open_levels_of(&input.files, &input.options, only)? });
    }
    Ok(Inputs { sites, wind, spectra, levels, remarks })
}

/// Opens level tables; where nothing names their site and there is only one, it is that.
///
/// # Errors
/// As [`open_levels`].
pub(super) fn open_levels_of(
    files: &[PathBuf],
    options: &LevelOptions,
    only_site: Option<&str>,
) -> Result<LevelTable, LevelError> {
    match (open_levels(files, options), only_site) {
        (Err(LevelError::Ask { asks, .. }), Some(site)) if asks.iter().all(|asked| asked.key == "levels.site") => {
            open_levels(files, &LevelOptions { site: Some(site.to_owned()), ..options.clone() })
        }
        (opened, _) => opened,
    }
}

/// The sites of a study, those written in it before those of its list, and remarks on the files.
///
/// # Errors
/// When a list or a track cannot be read, or an id is there twice.
pub fn open_sites(study: &Study) -> Result<(Vec<Site>, Vec<String>), Error> {
    let options = &study.sites.options;
    let mut all: Vec<Site> = Vec::new();
    let mut remarks = Vec::new();
    for (site, track) in &study.sites.sites {
        let mut site = site.clone();
        if let Some(path) = track {
            let read = read_track(path, options)?;
            remarks.extend(read.notes);
            site.track = read.track;
        }
        all.push(site);
    }
    if let Some(path) = &study.sites.file {
        let read = read_sites(path, options)?;
        remarks.extend(read.notes);
        for site in read.sites {
            if all.iter().any(|known| known.id == site.id) {
                return Err(Error::SiteTwice { path: path.clone(), site: site.id });
            }
            all.push(site);
        }
    }
    Ok((all, remarks))
}

impl Inputs {
    /// All files, for the provenance.
    pub fn files(&self, study: &Study) -> Vec<PathBuf> {
        let mut files: Vec<PathBuf> = Vec::new();
        for wind in &self.wind {
            match &wind.input.origin {
                WindOrigin::Grid { files: grid, .. } => files.extend(grid.iter().cloned()),
                WindOrigin::Table { files: table, .. } => files.extend(table.iter().cloned()),
            }
        }
        files.extend(self.spectra.iter().flat_map(|spectra| spectra.input.files.iter().cloned()));
        files.extend(self.levels.iter().flat_map(|levels| levels.input.files.iter().cloned()));
        files.extend(super::exclusion::interval_files(study));
        files.extend(study.sites.file.iter().cloned());
        files.extend(study.sites.sites.iter().filter_map(|(_, track)| track.clone()));
        files
    }
}
