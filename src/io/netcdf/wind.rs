//! A wind source: one or many NetCDF files, understood from their headers, read block by block.

use super::error::NetcdfError;
use super::header::{Header, Storage, Variable};
use super::read::{Reader, Wanted};
use super::roles::{DIRECTION, EASTWARD, NORTHWARD, Role, SPEED, candidates};
use super::sniff::{Format, sniff};
use super::wind_merge::{grid_words, merge, same_grid, usual_step_ms};
use super::wind_options::WindOptions;
use super::wind_part::{Part, part};
use super::{classic, hdf5};
use crate::model::{Block, FieldMeta, FieldSource, FlagSet, NodeId, NodeRequest, Slab, SourceId};
use crate::units::Instant;
use std::path::{Path, PathBuf};

/// A gap of this many usual steps is bridged where the study does not say otherwise.
const BRIDGED_STEPS: i64 = 2;
/// Steps of unchunked storage that are read together.
const UNCHUNKED_STEPS: u64 = 256;

/// What a source's numbers are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum WindKind {
    /// Components towards east and north.
    Components,
    /// Speed, and the direction it comes from.
    SpeedAndDirection,
    /// Speed alone.
    Speed,
}

/// A component's variable in each file that has it: the file's place and the variable.
type InFiles<'a> = Vec<(usize, &'a Variable)>;

/// Gridded wind, opened.
#[derive(Debug)]
pub struct WindSource {
    meta: FieldMeta,
    kind: WindKind,
    readers: Vec<Reader>,
    parts: Vec<Part>,
    max_gap_ms: i64,
    variables: Vec<String>,
}

/// Opens wind files and understands their headers.
///
/// # Errors
/// When a file cannot be read, when a variable or unit cannot be understood (the message names the key to set), or when
/// files do not fit together.
pub fn open_wind(source: SourceId, files: &[PathBuf], options: &WindOptions) -> Result<WindSource, NetcdfError> {
    if files.is_empty() {
        return Err(NetcdfError::NoFiles);
    }
    let mut readers = Vec::new();
    for path in files {
        readers.push(Reader::open(read_header(path)?)?);
    }
    let (kind, found) = components(&readers, options)?;
    for (index, reader) in readers.iter().enumerate() {
        if !found.iter().flatten().any(|(of_file, _)| *of_file == index) {
            return Err(no_variable(
                reader,
                "a wind like that of the other files",
                "wind.files` to leave it out, or `wind.eastward",
            ));
        }
    }
    let mut notes = Vec::new();
    let mut flags = FlagSet::default();
    let mut parts: Vec<(Part, Vec<Option<Instant>>)> = Vec::new();
    let mut variables = Vec::new();
    for (component, in_files) in found.iter().enumerate() {
        for (reader, variable) in in_files {
            let (part, steps) = part(&readers, *reader, variable, component, kind, options, &mut notes, &mut flags)?;
            let described = format!("{} (`{}`)", component_name(kind, component), part.variable);
            if !variables.contains(&described) {
                variables.push(described);
            }
            parts.push((part, steps));
        }
    }
    let (parts, steps) = merge(&readers, parts, found.len(), &mut notes);
    if steps.is_empty() {
        return Err(NetcdfError::Variable {
            path: readers[0].header.path.clone(),
            variable: parts[0].variable.clone(),
            problem: "there is no step in time at which all components are there".to_owned(),
        });
    }
    let first = &parts[0];
    let grid = first.placement.grid.clone();
    for other in &parts[1..] {
        if !same_grid(&grid, &other.placement.grid) {
            return Err(NetcdfError::Disagree {
                path: readers[other.reader].header.path.clone(),
                other: readers[first.reader].header.path.clone(),
                problem: format!(
                    "variable `{}` lies on another grid: {}; expected {}",
                    other.variable,
                    grid_words(&other.placement.grid),
                    grid_words(&grid)
                ),
            });
        }
    }
    let max_gap_ms = options.max_gap_ms.unwrap_or_else(|| BRIDGED_STEPS * usual_step_ms(&steps));
    let height_m = options.height_m.or(first.placement.height_m);
    if let Some(height_m) = height_m.filter(|height_m| options.height_m.is_none() && (height_m - 10.0).abs() > 1e-6) {
        notes.push(format!("the wind is that at {height_m} m, not at 10 m (set `wind.height_m` to choose or confirm)"));
    }
    notes.dedup();
    let meta = FieldMeta { source, layout: grid.layout(), grid, steps, height_m, flags, notes };
    Ok(WindSource { meta, kind, readers, parts, max_gap_ms, variables })
}

/// Reads a file's header, whichever format it has.
pub(super) fn read_header(path: &Path) -> Result<Header, NetcdfError> {
    match sniff(path)? {
        Format::Classic(version) => classic::read_header(path, version),
        Format::Hdf5 => {
            super::probe::guard(path)?;
            hdf5::read_header(path)
        }
    }
}

/// The same, without a trial in a process of its own.
pub(super) fn read_trusted_header(path: &Path) -> Result<Header, NetcdfError> {
    match sniff(path)? {
        Format::Classic(version) => classic::read_header(path, version),
        Format::Hdf5 => hdf5::read_header(path),
    }
}

/// Finds the variables of each component in all files.
fn components<'a>(readers: &'a [Reader], options: &WindOptions) -> Result<(WindKind, Vec<InFiles<'a>>), NetcdfError> {
    let find = |role: &Role, named: &Option<String>| -> Result<InFiles<'a>, NetcdfError> {
        let mut found = Vec::new();
        for (index, reader) in readers.iter().enumerate() {
            if let Some(variable) = role.find(&reader.header, named.as_deref(), options)? {
                found.push((index, variable));
            }
        }
        match named {
            Some(name) if found.is_empty() => Err(NetcdfError::NoSuchVariable {
                path: readers[0].header.path.clone(),
                name: name.clone(),
                key: role.key,
                found: readers[0].header.variable_names(),
            }),
            _ => Ok(found),
        }
    };
    let wants_speed = options.speed.is_some() && options.eastward.is_none();
    if !wants_speed {
        let eastward = find(&EASTWARD, &options.eastward)?;
        let northward = find(&NORTHWARD, &options.northward)?;
        if !eastward.is_empty() && !northward.is_empty() {
            return Ok((WindKind::Components, vec![eastward, northward]));
        }
        if options.eastward.is_some() || options.northward.is_some() {
            let (role, key) =
                if eastward.is_empty() { (EASTWARD, "wind.eastward") } else { (NORTHWARD, "wind.northward") };
            return Err(no_variable(&readers[0], role.wanted, key));
        }
    }
    let speed = find(&SPEED, &options.speed)?;
    if speed.is_empty() {
        return Err(no_variable(
            &readers[0],
            "a wind (components towards east and north, or speed)",
            "wind.eastward` and `wind.northward`, or `wind.speed",
        ));
    }
    let direction = find(&DIRECTION, &options.direction)?;
    if direction.is_empty() {
        return Ok((WindKind::Speed, vec![speed]));
    }
    Ok((WindKind::SpeedAndDirection, vec![speed, direction]))
}

fn no_variable(reader: &Reader, wanted: &'static str, key: &'static str) -> NetcdfError {
    let mut candidates = candidates(&reader.header);
    if !reader.header.groups.is_empty() {
        candidates.push_str(&format!(" (variables in the groups {} are not read)", reader.header.groups.join(", ")));
    }
    NetcdfError::NoVariable { path: reader.header.path.clone(), wanted, candidates, key }
}

fn component_name(kind: WindKind, component: usize) -> &'static str {
    match (kind, component) {
        (WindKind::Components, 0) => "eastward wind",
        (WindKind::Components, _) => "northward wind",
        (_, 0) => "wind speed",
        (_, _) => "wind direction",
    }
}

impl WindSource {
    /// What its numbers are.
    pub fn kind(&self) -> WindKind {
        self.kind
    }

    /// Steps farther apart than this are a gap, ms.
    pub fn max_gap_ms(&self) -> i64 {
        self.max_gap_ms
    }

    /// The most common time between steps, ms.
    pub fn usual_step_ms(&self) -> i64 {
        usual_step_ms(&self.meta.steps)
    }

    /// What the reader should know of it, in sentences.
    pub fn warnings(&self) -> &[String] {
        &self.meta.notes
    }

    /// The variables, with what they are.
    pub fn variables(&self) -> &[String] {
        &self.variables
    }

    /// The files, with their formats.
    pub fn files(&self) -> Vec<(PathBuf, &'static str)> {
        self.readers.iter().map(|reader| (reader.header.path.clone(), reader.header.format)).collect()
    }

    /// Number of numbers that a step has at a node.
    pub fn components(&self) -> usize {
        if self.kind == WindKind::Speed { 1 } else { 2 }
    }

    /// Which component a slab holds, and for each of its steps the place among the source's steps.
    pub fn slab_steps(&self, slab: &Slab) -> (usize, &[Option<usize>]) {
        let part = &self.parts[slab.file];
        (part.component, &part.merged[slab.stored_steps.clone()])
    }

    /// Whether two readings of one step contradict each other: they differ by more than packing can round away.
    pub fn contradict(&self, component: usize, first: f64, second: f64) -> bool {
        let of_component = self.parts.iter().filter(|part| part.component == component);
        let resolution = of_component.map(|part| part.packing.resolution() * part.to_unit.abs()).fold(0.0, f64::max);
        let apart = if self.kind == WindKind::SpeedAndDirection && component == 1 {
            (first - second + 540.0).rem_euclid(360.0) - 180.0
        } else {
            first - second
        };
        apart.abs() > 1e-4 + resolution
    }

    /// Name of the file that a slab comes from.
    pub fn slab_file(&self, slab: &Slab) -> &Path {
        &self.readers[self.parts[slab.file].reader].header.path
    }

    /// The error for two files that say different things about one step.
    pub fn conflict(&self, slab: &Slab, step: Instant, first: f64, second: f64) -> NetcdfError {
        let part = &self.parts[slab.file];
        let place = self.meta.steps.binary_search(&step).ok();
        let holds = |other: &Part| {
            other.component == part.component && other.reader != part.reader && other.merged.contains(&place)
        };
        let path = self.readers[part.reader].header.path.clone();
        match self.parts.iter().find(|other| holds(other)) {
            Some(other) => NetcdfError::Disagree {
                path,
                other: self.readers[other.reader].header.path.clone(),
                problem: format!(
                    "variable `{}` is {second} at the step {step}, where another file has {first}; expected one value (leave one of the files out)",
                    part.variable
                ),
            },
            None => NetcdfError::Variable {
                path,
                variable: part.variable.clone(),
                problem: format!(
                    "the step {step} is there twice with different values ({first} and {second}); expected one value"
                ),
            },
        }
    }
}

impl FieldSource for WindSource {
    type Error = NetcdfError;

    fn meta(&self) -> &FieldMeta {
        &self.meta
    }

    fn plan(&self, request: &NodeRequest) -> Vec<Slab> {
        let mut slabs = Vec::new();
        for (file, part) in self.parts.iter().enumerate() {
            let wanted: Vec<usize> = (0..part.merged.len())
                .filter(|stored| {
                    part.merged[*stored].is_some_and(|merged| {
                        request.window.is_none_or(|window| {
                            // One step on either side of the window, so that its edges have neighbours.
                            let steps = &self.meta.steps;
                            let next = steps.get(merged + 1).is_none_or(|next| *next >= window.start);
                            let before = merged.checked_sub(1).is_none_or(|k| steps[k] <= window.end);
                            next && before
                        })
                    })
                })
                .collect();
            let Some((first, last)) = wanted.first().zip(wanted.last()) else { continue };
            let variable =
                self.readers[part.reader].header.variable(&part.variable).expect("the part was made from it");
            let length = match (&variable.storage, part.placement.step) {
                (Storage::Chunked(chunks), Some(place)) => {
                    // Short chunks are taken together, so that a slab is worth a task.
                    let chunk = chunks.shape[place];
                    chunk * (32 / chunk).max(1)
                }
                _ => UNCHUNKED_STEPS,
            } as usize;
            let mut start = first / length * length;
            while start <= *last {
                let end = (start + length).min(last + 1);
                slabs.push(Slab { file, stored_steps: start.max(*first)..end });
                start += length;
            }
        }
        slabs
    }

    fn decode(&self, slab: &Slab, nodes: &[NodeId]) -> Result<Block, NetcdfError> {
        let part = &self.parts[slab.file];
        let reader = &self.readers[part.reader];
        let variable = reader.header.variable(&part.variable).expect("the part was made from it");
        let nodes: Vec<(u64, u64)> = nodes.iter().map(|node| (node.row as u64, node.column as u64)).collect();
        let steps = slab.stored_steps.start as u64..slab.stored_steps.end as u64;
        let mut values: Vec<f64> = Vec::new();
        let mut preliminary: Vec<bool> = Vec::new();
        for (attempt, fixed) in part.placement.fixed.iter().enumerate() {
            let wanted = Wanted {
                fixed,
                step: part.placement.step,
                row: part.placement.row,
                column: part.placement.column,
                steps: steps.clone(),
                nodes: &nodes,
            };
            let read = reader.gather(variable, &wanted)?.into_iter().map(|raw| self.convert(part, raw));
            if attempt == 0 {
                values = read.collect();
            } else {
                preliminary.resize(values.len(), false);
                for ((value, is_preliminary), other) in values.iter_mut().zip(&mut preliminary).zip(read) {
                    if value.is_nan() && !other.is_nan() {
                        *value = other;
                        *is_preliminary = true;
                    }
                }
            }
            if values.iter().all(|value| value.is_finite()) {
                break;
            }
        }
        if !part.preliminary.is_empty() {
            preliminary.resize(values.len(), false);
            for (of_step, stored) in preliminary.chunks_mut(nodes.len().max(1)).zip(slab.stored_steps.clone()) {
                if part.preliminary.get(stored) == Some(&true) {
                    of_step.fill(true);
                }
            }
        }
        Ok(Block { values, preliminary })
    }
}

impl WindSource {
    /// A raw number as m/s, or as degrees that the wind comes from.
    fn convert(&self, part: &Part, raw: f64) -> f64 {
        let value = part.packing.value(raw);
        if self.kind == WindKind::SpeedAndDirection && part.component == 1 {
            let turned = value * part.to_unit.abs() + if part.to_unit < 0.0 { 180.0 } else { 0.0 };
            return if turned.is_finite() { turned.rem_euclid(360.0) } else { f64::NAN };
        }
        let speed = value * part.to_unit;
        // Infinite winds are damage, not weather.
        if speed.is_finite() { speed } else { f64::NAN }
    }
}
