//! A source of directional spectra: what is known from the headers, and its blocks.

use super::gather::{WantedSpectra, gather};
use super::part::Part;
use super::place::Sites;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::Storage;
use crate::io::netcdf::read::Reader;
use crate::model::{FlagSet, Grid, NodeId, Point, SourceId, SpectrumAxes};
use crate::units::{Instant, Window};
use std::ops::Range;
use std::path::{Path, PathBuf};

/// Densities that are decoded at a time where storage does not say how: bounds the memory of a task.
const CELLS_AT_A_TIME: usize = 1 << 20;

/// Directional spectra, opened.
#[derive(Debug)]
pub struct SpectraSource {
    pub(super) source: SourceId,
    pub(super) readers: Vec<Reader>,
    pub(super) parts: Vec<Part>,
    pub(super) steps: Vec<Instant>,
    pub(super) flags: FlagSet,
    pub(super) notes: Vec<String>,
    pub(super) max_gap_ms: i64,
    pub(super) usual_step_ms: i64,
    pub(super) max_distance_km: f64,
}

/// Steps of one file whose blocks are decoded together.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SpectraSlab {
    file: usize,
    stored_steps: Range<usize>,
}

/// Where the spectra of a source are.
#[derive(Debug, Clone, Copy)]
pub enum SpectraPlace<'a> {
    /// A grid.
    Grid(&'a Grid),
    /// So many stations.
    Stations {
        /// How many.
        count: usize,
        /// Whether they drift.
        drifting: bool,
    },
}

impl SpectraSource {
    /// Its name.
    pub fn id(&self) -> &SourceId {
        &self.source
    }

    /// Its axes.
    pub fn axes(&self) -> &SpectrumAxes {
        &self.parts[0].axes.axes
    }

    /// Axes, senses and units, in words.
    pub fn axes_words(&self) -> &str {
        &self.parts[0].axes.words
    }

    /// The variable of the density and how it is stored, in words.
    pub fn variable_words(&self) -> String {
        let part = &self.parts[0];
        let variable = self.readers[part.reader].header.variable(&part.variable).expect("the part was made from it");
        format!("`{}` in {}", part.variable, variable.text("units").unwrap_or("the unit of the study"))
    }

    /// Steps in increasing order, none twice.
    pub fn steps(&self) -> &[Instant] {
        &self.steps
    }

    /// Steps farther apart than this are a gap, ms.
    pub fn max_gap_ms(&self) -> i64 {
        self.max_gap_ms
    }

    /// The most common time between steps, ms.
    pub fn usual_step_ms(&self) -> i64 {
        self.usual_step_ms
    }

    /// Farthest station that serves a site, km.
    pub fn max_distance_km(&self) -> f64 {
        self.max_distance_km
    }

    /// What the reader should know of it, in sentences.
    pub fn warnings(&self) -> &[String] {
        &self.notes
    }

    /// Remarks on every value.
    pub fn flags(&self) -> FlagSet {
        self.flags
    }

    /// The files, with their formats.
    pub fn files(&self) -> Vec<(PathBuf, &'static str)> {
        self.readers.iter().map(|reader| (reader.header.path.clone(), reader.header.format)).collect()
    }

    /// Where its spectra are.
    pub fn place(&self) -> SpectraPlace<'_> {
        match &self.parts[0].sites {
            Sites::Grid(grid) => SpectraPlace::Grid(grid),
            Sites::Stations { count, drifting, .. } => {
                let drifting = *drifting || self.parts.iter().any(|part| part.sites != self.parts[0].sites);
                SpectraPlace::Stations { count: *count, drifting }
            }
        }
    }

    /// Positions of the stations at a step of the source; none where the file lacks them.
    pub fn stations_at(&self, step: usize) -> Vec<Option<Point>> {
        for part in &self.parts {
            let Some(stored) = part.merged.iter().position(|merged| *merged == Some(step)) else { continue };
            return stations(&part.sites, stored);
        }
        Vec::new()
    }

    /// The slabs that hold the steps of a window (all, where there is none) and one on either side, in order of time.
    pub fn plan(&self, nodes: usize, window: Option<Window>) -> Vec<SpectraSlab> {
        let mut slabs = Vec::new();
        for (file, part) in self.parts.iter().enumerate() {
            let wanted: Vec<usize> = (0..part.merged.len())
                .filter(|stored| part.merged[*stored].is_some_and(|merged| self.is_wanted(merged, window)))
                .collect();
            let (Some(first), Some(last)) = (wanted.first(), wanted.last()) else { continue };
            let length = self.steps_together(part, nodes);
            let mut start = first / length * length;
            while start <= *last {
                slabs.push(SpectraSlab { file, stored_steps: start.max(*first)..(start + length).min(last + 1) });
                start += length;
            }
        }
        slabs.sort_by_key(|slab| self.slab_steps(slab).iter().flatten().min().copied());
        slabs
    }

    fn is_wanted(&self, step: usize, window: Option<Window>) -> bool {
        window.is_none_or(|window| {
            let next = self.steps.get(step + 1).is_none_or(|next| *next >= window.start);
            next && step.checked_sub(1).is_none_or(|k| self.steps[k] <= window.end)
        })
    }

    fn steps_together(&self, part: &Part, nodes: usize) -> usize {
        let cells = self.axes().cells() * nodes.max(1);
        let variable = self.readers[part.reader].header.variable(&part.variable).expect("the part was made from it");
        match (&variable.storage, part.placement.step) {
            (Storage::Chunked(chunks), Some(place)) => chunks.shape[place].max(1) as usize,
            _ => (CELLS_AT_A_TIME / cells.max(1)).clamp(1, 256),
        }
    }

    /// For each step of a slab its place among the source's steps.
    pub fn slab_steps(&self, slab: &SpectraSlab) -> &[Option<usize>] {
        &self.parts[slab.file].merged[slab.stored_steps.clone()]
    }

    /// The file that a slab comes from.
    pub fn slab_file(&self, slab: &SpectraSlab) -> &Path {
        &self.readers[self.parts[slab.file].reader].header.path
    }

    /// Decodes a slab for some nodes (of a station: its number as row): step by step, node by node, the densities of a
    /// spectrum in the order of the axes, m2/Hz/rad. A spectrum that is not there is NaN throughout.
    ///
    /// # Errors
    /// When a block cannot be read or decoded, or holds what is no density.
    pub fn decode(&self, slab: &SpectraSlab, nodes: &[NodeId], out: &mut Vec<f64>) -> Result<(), NetcdfError> {
        let part = &self.parts[slab.file];
        let reader = &self.readers[part.reader];
        let variable = reader.header.variable(&part.variable).expect("the part was made from it");
        let nodes: Vec<(u64, u64)> = nodes.iter().map(|node| (node.row as u64, node.column as u64)).collect();
        let wanted = WantedSpectra {
            placement: &part.placement,
            steps: slab.stored_steps.start as u64..slab.stored_steps.end as u64,
            nodes: &nodes,
            frequency_order: &part.axes.frequency_order,
            direction_order: &part.axes.direction_order,
        };
        gather(reader, variable, &wanted, out)?;
        for (number, spectrum) in out.chunks_exact_mut(wanted.cells()).enumerate() {
            part.convert(spectrum).map_err(|problem| {
                let step = slab.stored_steps.start + number / nodes.len().max(1);
                reader.of_variable(variable, format!("step {step}: {problem}"))
            })?;
        }
        Ok(())
    }
}

fn stations(sites: &Sites, stored_step: usize) -> Vec<Option<Point>> {
    let Sites::Stations { count, latitude_deg, longitude_deg, drifting, .. } = sites else { return Vec::new() };
    let start = if *drifting { stored_step * count } else { 0 };
    (start..start + count)
        .map(|k| -> Option<Point> {
            let longitude = (longitude_deg.get(k)? + 180.0).rem_euclid(360.0) - 180.0;
            Point::new(*latitude_deg.get(k)?, longitude).ok()
        })
        .collect()
}
