//! Whole spectra out of storage: for each step and node all frequencies and directions, each chunk decoded once.

use super::place::Placement;
use crate::io::netcdf::chunks::Loaded;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::{Chunks, NumberType, Storage, Variable};
use crate::io::netcdf::read::{Reader, SCRATCH, Scratch, Wanted};
use std::ops::Range;

/// Which spectra are wanted, and in which order their cells go.
pub(super) struct WantedSpectra<'a> {
    pub(super) placement: &'a Placement,
    pub(super) steps: Range<u64>,
    /// Row and column, or station and 0.
    pub(super) nodes: &'a [(u64, u64)],
    /// Stored index of each frequency and direction of the output.
    pub(super) frequency_order: &'a [usize],
    pub(super) direction_order: &'a [usize],
}

impl WantedSpectra<'_> {
    pub(super) fn cells(&self) -> usize {
        self.frequency_order.len() * self.direction_order.len()
    }

    /// Index of a variable's element with frequency and direction 0.
    fn base(&self, step: u64, node: (u64, u64)) -> Vec<u64> {
        let mut index = self.placement.fixed.clone();
        let mut set = |place: Option<usize>, value: u64| {
            if let Some(place) = place {
                index[place] = value;
            }
        };
        set(self.placement.step, step);
        set(self.placement.row, node.0);
        set(self.placement.column, node.1);
        set(self.placement.station, node.0);
        index
    }
}

/// Raw numbers of the wanted spectra: step by step, node by node, frequency by frequency, direction by direction. What was
/// never written is NaN.
pub(super) fn gather(
    reader: &Reader,
    variable: &Variable,
    wanted: &WantedSpectra<'_>,
    out: &mut Vec<f64>,
) -> Result<(), NetcdfError> {
    let count = (wanted.steps.end - wanted.steps.start) as usize * wanted.nodes.len() * wanted.cells();
    out.clear();
    out.resize(count, f64::NAN);
    match &variable.storage {
        Storage::Chunked(chunks) => {
            let number =
                variable.number_type().ok_or_else(|| reader.of_variable(variable, "it holds no numbers".to_owned()))?;
            gather_chunks(reader, variable, chunks, number, wanted, out)
        }
        _ => gather_plain(reader, variable, wanted, out),
    }
}

/// One read for each step and node.
fn gather_plain(
    reader: &Reader,
    variable: &Variable,
    wanted: &WantedSpectra<'_>,
    out: &mut [f64],
) -> Result<(), NetcdfError> {
    let place = wanted.placement;
    let frequencies: Vec<(u64, u64)> = wanted.frequency_order.iter().map(|stored| (*stored as u64, 0)).collect();
    let shape = reader.header.shape(variable);
    let stored = place.direction.map_or(1, |direction| shape[direction]);
    let mut spectra = out.chunks_exact_mut(wanted.cells().max(1));
    for step in wanted.steps.clone() {
        for node in wanted.nodes {
            let fixed = wanted.base(step, *node);
            let read = reader.gather(
                variable,
                &Wanted {
                    fixed: &fixed,
                    step: place.direction,
                    row: Some(place.frequency),
                    column: None,
                    steps: 0..stored,
                    nodes: &frequencies,
                },
            )?;
            let Some(spectrum) = spectra.next() else { return Ok(()) };
            // Read direction by direction, each with all its frequencies.
            for (k, row) in spectrum.chunks_exact_mut(wanted.direction_order.len()).enumerate() {
                for (cell, stored) in row.iter_mut().zip(wanted.direction_order) {
                    *cell = read[stored * frequencies.len() + k];
                }
            }
        }
    }
    Ok(())
}

/// Element strides of a shape, last dimension fastest.
fn strides(shape: &[u64]) -> Vec<u64> {
    let mut strides = vec![1; shape.len()];
    for place in (0..shape.len().saturating_sub(1)).rev() {
        strides[place] = strides[place + 1] * shape[place + 1];
    }
    strides
}

/// For each stored index its place in the output, where it has one.
fn inverse(order: &[usize], stored: u64) -> Vec<Option<usize>> {
    let mut inverse = vec![None; stored as usize];
    for (place, stored) in order.iter().enumerate() {
        inverse[*stored] = Some(place);
    }
    inverse
}

struct ChunkWalk<'a> {
    chunks: &'a Chunks,
    number: NumberType,
    grid: Vec<u64>,
    within: Vec<u64>,
    shape: Vec<u64>,
    bytes: u64,
    place: &'a Placement,
    frequency_places: Vec<Option<usize>>,
    direction_places: Vec<Option<usize>>,
}

fn gather_chunks(
    reader: &Reader,
    variable: &Variable,
    chunks: &Chunks,
    number: NumberType,
    wanted: &WantedSpectra<'_>,
    out: &mut [f64],
) -> Result<(), NetcdfError> {
    let shape = reader.header.shape(variable);
    let grid: Vec<u64> = shape.iter().zip(&chunks.shape).map(|(length, chunk)| length.div_ceil(*chunk)).collect();
    let bytes = reader.chunk_bytes(variable, chunks, number)?;
    let place = wanted.placement;
    let walk = ChunkWalk {
        chunks,
        number,
        grid: strides(&grid),
        within: strides(&chunks.shape),
        bytes,
        place,
        frequency_places: inverse(wanted.frequency_order, shape[place.frequency]),
        direction_places: inverse(wanted.direction_order, place.direction.map_or(1, |d| shape[d])),
        shape,
    };
    // Nodes of one chunk, and steps of one chunk, go together.
    let chunk_of = |index: &[u64]| -> u64 {
        index.iter().zip(&chunks.shape).zip(&walk.grid).map(|((at, chunk), stride)| at / chunk * stride).sum()
    };
    let mut visits: Vec<(u64, u64, usize)> = Vec::new();
    let mut slot = 0;
    for step in wanted.steps.clone() {
        for node in wanted.nodes {
            let base = wanted.base(step, *node);
            let beyond = base.iter().zip(&chunks.extent).any(|(at, extent)| at >= extent);
            if !beyond {
                let within = base
                    .iter()
                    .zip(&chunks.shape)
                    .zip(&walk.within)
                    .map(|((at, chunk), stride)| at % chunk * stride)
                    .sum();
                visits.push((chunk_of(&base), within, slot));
            }
            slot += 1;
        }
    }
    visits.sort_by_key(|(chunk, _, slot)| (*chunk, *slot));
    let cells = wanted.cells();
    let directions = wanted.direction_order.len();
    SCRATCH.with_borrow_mut(|scratch| {
        for of_chunk in visits.chunk_by(|a, b| a.0 == b.0) {
            walk.each_tile(reader, variable, of_chunk[0].0, scratch, |tile, data| {
                for (_, within, slot) in of_chunk {
                    let spectrum = &mut out[slot * cells..(slot + 1) * cells];
                    walk.copy(tile, data, *within, spectrum, directions);
                }
            })?;
        }
        Ok(())
    })
}

/// A chunk in hand: which frequencies and directions it holds.
struct Tile {
    frequencies: Range<u64>,
    directions: Range<u64>,
    shuffled: bool,
}

impl ChunkWalk<'_> {
    /// Loads all chunks that hold the spectra of one place: splits in frequency and direction.
    fn each_tile(
        &self,
        reader: &Reader,
        variable: &Variable,
        first: u64,
        scratch: &mut Scratch,
        mut take: impl FnMut(&Tile, &[u8]),
    ) -> Result<(), NetcdfError> {
        let split = |place: Option<usize>| match place {
            Some(place) => {
                let (length, chunk) = (self.shape[place], self.chunks.shape[place]);
                (0..length.div_ceil(chunk))
                    .map(|k| (k * self.grid[place], k * chunk..((k + 1) * chunk).min(length)))
                    .collect::<Vec<_>>()
            }
            None => vec![(0, 0..1)],
        };
        for (over_frequency, frequencies) in split(Some(self.place.frequency)) {
            for (over_direction, directions) in split(self.place.direction) {
                // A chunk that was never written holds nothing but fill.
                let Some(stored) = self.chunks.blocks.get(&(first + over_frequency + over_direction)) else { continue };
                let Loaded { inflated, shuffled } =
                    reader.load_chunk(variable, self.chunks, *stored, self.bytes, self.number, scratch)?;
                let data = if inflated { &scratch.inflated } else { &scratch.stored };
                take(&Tile { frequencies: frequencies.clone(), directions, shuffled }, data);
            }
        }
        Ok(())
    }

    /// Copies what a chunk holds of one spectrum; `within` is the place of its first cell in the chunk.
    fn copy(&self, tile: &Tile, data: &[u8], within: u64, spectrum: &mut [f64], directions: usize) {
        let size = self.number.size();
        let count = self.bytes as usize / size;
        let step = self.place.direction.map_or(1, |place| self.within[place]) as usize;
        let plain = tile.shuffled && self.number == NumberType::F32 && !self.chunks.big_endian && step == 1;
        for frequency in tile.frequencies.clone() {
            let Some(k) = self.frequency_places[frequency as usize] else { continue };
            let row = &mut spectrum[k * directions..(k + 1) * directions];
            let start =
                within as usize + ((frequency - tile.frequencies.start) * self.within[self.place.frequency]) as usize;
            let places = &self.direction_places[tile.directions.start as usize..tile.directions.end as usize];
            if plain && in_order(places) {
                let first = places[0].unwrap_or(0);
                read_planes(data, count, start, &mut row[first..first + places.len()]);
                continue;
            }
            let mut bytes = [0_u8; 8];
            for (j, place) in places.iter().enumerate() {
                let Some(place) = place else { continue };
                let at = start + j * step;
                for (k, byte) in bytes[..size].iter_mut().enumerate() {
                    *byte = if tile.shuffled { data[k * count + at] } else { data[at * size + k] };
                }
                row[*place] = self.number.decode(&bytes[..size], self.chunks.big_endian);
            }
        }
    }
}

/// Whether places rise one by one.
fn in_order(places: &[Option<usize>]) -> bool {
    let Some(Some(first)) = places.first() else { return false };
    places.iter().enumerate().all(|(k, place)| *place == Some(first + k))
}

/// Neighbouring single-precision numbers out of the four byte planes of a shuffled chunk.
fn read_planes(data: &[u8], count: usize, start: usize, out: &mut [f64]) {
    let length = out.len();
    let plane = |k: usize| &data[k * count + start..k * count + start + length];
    let (a, b, c, d) = (plane(0), plane(1), plane(2), plane(3));
    for (k, value) in out.iter_mut().enumerate() {
        *value = f64::from(f32::from_le_bytes([a[k], b[k], c[k], d[k]]));
    }
}
