//! Opens files of directional spectra and brings them on one time line.

use super::find::density;
use super::options::SpectraOptions;
use super::part::{Part, part};
use super::place::Sites;
use super::source::SpectraSource;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::read::Reader;
use crate::io::netcdf::wind::read_header;
use crate::io::netcdf::wind_merge::{same_grid, usual_step_ms};
use crate::model::{FlagSet, SourceId};
use crate::units::Instant;
use std::path::{Path, PathBuf};

/// A gap of this many usual steps is bridged where the study does not say otherwise.
const BRIDGED_STEPS: i64 = 2;
/// Farthest nearest station where the study does not say it, km.
const MAX_DISTANCE_KM: f64 = 50.0;
/// Frequencies (relative) and directions (rad) of two files are the same within this.
const SAME_AXIS: f64 = 1e-4;

/// Opens files of directional spectra and understands their headers.
///
/// # Errors
/// When a file cannot be read, when an axis, a sense or a unit cannot be known (the message names the key to set), or when
/// files do not fit together.
pub fn open_spectra(
    source: SourceId,
    files: &[PathBuf],
    options: &SpectraOptions,
) -> Result<SpectraSource, NetcdfError> {
    open(source, files, options).map_err(in_own_keys)
}

/// Messages of the shared readers name keys of `[[wind]]`; here the same keys belong to `[[spectra]]`.
fn in_own_keys(error: NetcdfError) -> NetcdfError {
    match error {
        NetcdfError::Variable { path, variable, problem } => {
            NetcdfError::Variable { path, variable, problem: problem.replace("`wind.", "`spectra.") }
        }
        other => other,
    }
}

fn open(source: SourceId, files: &[PathBuf], options: &SpectraOptions) -> Result<SpectraSource, NetcdfError> {
    let mut readers = Vec::new();
    for path in files {
        readers.push(Reader::open(read_header(path)?)?);
    }
    let mut parts = Vec::new();
    let mut notes: Vec<String> = Vec::new();
    for (index, reader) in readers.iter().enumerate() {
        let (part, steps) = part(reader, index, density(reader, options)?, options)?;
        if let Some((first, _)) = parts.first() {
            fits(&readers, first, &part)?;
        }
        for note in &part.notes {
            if !notes.contains(note) {
                notes.push(note.clone());
            }
        }
        parts.push((part, steps));
    }
    let (parts, steps) = merge(&readers, parts, &mut notes);
    let Some(first) = parts.first().filter(|_| !steps.is_empty()) else {
        return Err(NetcdfError::Variable {
            path: files.first().cloned().unwrap_or_default(),
            variable: "time".to_owned(),
            problem: "there is no step with a time".to_owned(),
        });
    };
    if let Sites::Stations { latitude_deg, longitude_deg, .. } = &first.sites
        && let Some((latitude, longitude)) = latitude_deg
            .iter()
            .zip(longitude_deg)
            .find(|(latitude, longitude)| latitude.abs() > 90.001 || longitude.abs() > 720.0)
    {
        return Err(NetcdfError::Variable {
            path: readers[first.reader].header.path.clone(),
            variable: first.variable.clone(),
            problem: format!("a position is {latitude} north, {longitude} east; expected degrees"),
        });
    }
    let usual_step_ms = usual_step_ms(&steps);
    Ok(SpectraSource {
        source,
        readers,
        parts,
        max_gap_ms: options.max_gap_ms.unwrap_or(BRIDGED_STEPS * usual_step_ms),
        usual_step_ms,
        max_distance_km: options.max_distance_km.unwrap_or(MAX_DISTANCE_KM),
        steps,
        flags: FlagSet::default(),
        notes,
    })
}

/// Whether a file has the axes and the grid of the first.
fn fits(readers: &[Reader], first: &Part, other: &Part) -> Result<(), NetcdfError> {
    let disagree = |problem: String| NetcdfError::Disagree {
        path: readers[other.reader].header.path.clone(),
        other: readers[first.reader].header.path.clone(),
        problem: format!("variable `{}` {problem}", other.variable),
    };
    let (a, b) = (&first.axes.axes, &other.axes.axes);
    let same = |a: &[f64], b: &[f64], relative: bool| {
        a.len() == b.len()
            && a.iter().zip(b).all(|(a, b)| (a - b).abs() <= SAME_AXIS * if relative { a.abs() } else { 1.0 })
    };
    if !same(&a.frequency_hz, &b.frequency_hz, true) || !same(&a.direction_to_rad, &b.direction_to_rad, false) {
        return Err(disagree(format!("has other axes: {}; expected {}", other.axes.words, first.axes.words)));
    }
    match (&first.sites, &other.sites) {
        (Sites::Grid(a), Sites::Grid(b)) if same_grid(a, b) => Ok(()),
        (Sites::Stations { count: a, .. }, Sites::Stations { count: b, .. }) if a == b => Ok(()),
        _ => Err(disagree("lies on another grid or other stations".to_owned())),
    }
}

type Timed = (Part, Vec<Option<Instant>>);

fn merge(readers: &[Reader], parts: Vec<Timed>, notes: &mut Vec<String>) -> (Vec<Part>, Vec<Instant>) {
    let mut all: Vec<Instant> = Vec::new();
    for (part, steps) in &parts {
        let known: Vec<Instant> = steps.iter().filter_map(|step| *step).collect();
        if known.windows(2).any(|pair| pair[1] < pair[0]) {
            let path: &Path = &readers[part.reader].header.path;
            notes.push(format!("{}: steps are not in order of time; they were sorted", path.display()));
        }
        all.extend(known);
    }
    let count = all.len();
    all.sort_unstable();
    all.dedup();
    if all.len() < count {
        notes.push(format!("{} steps are there more than once; they must agree, and count once", count - all.len()));
    }
    let parts = parts
        .into_iter()
        .map(|(mut part, steps)| {
            part.merged = steps.iter().map(|step| all.binary_search(&(*step)?).ok()).collect();
            part
        })
        .collect();
    (parts, all)
}
