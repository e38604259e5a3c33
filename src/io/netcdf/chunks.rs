//! HDF5 chunks, decoded by ourselves: each once, only the wanted bytes of it looked at.

use super::error::NetcdfError;
use super::header::{ChunkPlace, Chunks, Filter, NumberType, Variable};
use super::read::{Reader, SCRATCH, Scratch, Wanted};
use libdeflater::Decompressor;

/// A chunk larger than this is not believed.
const LARGEST_CHUNK_BYTES: u64 = 4 << 30;

impl Reader {
    pub(super) fn gather_chunks(
        &self,
        variable: &Variable,
        wanted: &Wanted<'_>,
        number: NumberType,
        chunks: &Chunks,
    ) -> Result<Vec<f64>, NetcdfError> {
        let shape = self.header.shape(variable);
        let grid: Vec<u64> = shape.iter().zip(&chunks.shape).map(|(length, chunk)| length.div_ceil(*chunk)).collect();
        let chunk_bytes = self.chunk_bytes(variable, chunks, number)?;
        let parts = ChunkParts::of(wanted, chunks, &grid);
        let width = wanted.nodes.len();
        let mut values = vec![f64::NAN; parts.steps.len() * width];
        let size = number.size();
        let count = chunk_bytes as usize / size;
        SCRATCH.with_borrow_mut(|scratch| {
            for of_steps in parts.steps.chunk_by(|a, b| a.chunk == b.chunk) {
                for of_nodes in parts.nodes.chunk_by(|a, b| a.chunk == b.chunk) {
                    // A chunk that was never written holds nothing but fill.
                    let Some(place) = chunks.blocks.get(&(of_steps[0].chunk + of_nodes[0].chunk)) else { continue };
                    let loaded = self.load_chunk(variable, chunks, *place, chunk_bytes, number, scratch)?;
                    let data = if loaded.inflated { &scratch.inflated } else { &scratch.stored };
                    let mut bytes = [0_u8; 8];
                    for step in of_steps {
                        for node in of_nodes {
                            let within = (step.within + node.within) as usize;
                            for (k, byte) in bytes[..size].iter_mut().enumerate() {
                                // Shuffled bytes lie in planes: all first bytes, then all second bytes ...
                                *byte =
                                    if loaded.shuffled { data[k * count + within] } else { data[within * size + k] };
                            }
                            values[step.slot * width + node.slot] = number.decode(&bytes[..size], chunks.big_endian);
                        }
                    }
                }
            }
            Ok(())
        })?;
        for (slot, index) in parts.beyond {
            match slot {
                Beyond::Step => values[index * width..(index + 1) * width].fill(f64::NAN),
                Beyond::Node => values.iter_mut().skip(index).step_by(width).for_each(|value| *value = f64::NAN),
            }
        }
        Ok(values)
    }

    /// Bytes of a decoded chunk.
    pub(super) fn chunk_bytes(
        &self,
        variable: &Variable,
        chunks: &Chunks,
        number: NumberType,
    ) -> Result<u64, NetcdfError> {
        chunks
            .shape
            .iter()
            .try_fold(number.size() as u64, |bytes, length| bytes.checked_mul(*length))
            .filter(|bytes| *bytes <= LARGEST_CHUNK_BYTES)
            .ok_or_else(|| self.of_variable(variable, "its chunks are larger than 4 GiB".to_owned()))
    }

    /// Brings a chunk into the scratch buffers, inflated but not unshuffled.
    pub(super) fn load_chunk(
        &self,
        variable: &Variable,
        chunks: &Chunks,
        place: ChunkPlace,
        chunk_bytes: u64,
        number: NumberType,
        scratch: &mut Scratch,
    ) -> Result<Loaded, NetcdfError> {
        let damaged = |problem: &str| NetcdfError::Damaged {
            path: self.header.path.clone(),
            problem: format!("variable `{}`: a chunk at byte {} {problem}", variable.name, place.address),
        };
        if place.address.checked_add(place.bytes).is_none_or(|end| end > self.bytes) {
            return Err(damaged("lies beyond the end of the file"));
        }
        scratch.stored.resize(place.bytes as usize, 0);
        self.read_at(variable, &mut scratch.stored, place.address)?;
        let mut loaded = Loaded { inflated: false, shuffled: false };
        for (bit, filter) in chunks.filters.iter().enumerate().rev() {
            if place.filter_mask & (1 << bit) != 0 {
                continue;
            }
            match filter {
                Filter::Fletcher32 => {
                    let data = if loaded.inflated { &mut scratch.inflated } else { &mut scratch.stored };
                    // Where the checksum was taken before shuffling, it was shuffled along with the data.
                    if loaded.shuffled {
                        unshuffle(data, &mut scratch.plain, number.size());
                        std::mem::swap(data, &mut scratch.plain);
                        loaded.shuffled = false;
                    }
                    let Some(length) = data.len().checked_sub(4) else {
                        return Err(damaged("is shorter than its checksum"));
                    };
                    let stored = u32::from_le_bytes(data[length..].try_into().expect("four bytes"));
                    if fletcher32(&data[..length]) != stored {
                        return Err(damaged("does not have its checksum (fletcher32)"));
                    }
                    data.truncate(length);
                }
                Filter::Deflate => {
                    // Between deflate and the data there may be a checksum.
                    let extra = if chunks.filters[..bit].contains(&Filter::Fletcher32) { 4 } else { 0 };
                    scratch.inflated.resize(chunk_bytes as usize + extra, 0);
                    let inflater = scratch.inflater.get_or_insert_with(Decompressor::new);
                    let length = inflater
                        .zlib_decompress(&scratch.stored, &mut scratch.inflated)
                        .map_err(|_| damaged("cannot be inflated"))?;
                    scratch.inflated.truncate(length);
                    loaded.inflated = true;
                }
                // Shuffling single bytes changes nothing.
                Filter::Shuffle => loaded.shuffled = number.size() > 1,
            }
        }
        let data = if loaded.inflated { &scratch.inflated } else { &scratch.stored };
        if data.len() as u64 != chunk_bytes {
            return Err(damaged("does not have the size of a chunk"));
        }
        Ok(loaded)
    }
}

/// A wanted step or node: its share in the number of its chunk, its share in the place within the chunk, and its place among
/// the wanted. Both numbers are sums over dimensions, so that steps and nodes can be worked out apart.
#[derive(Debug, Clone, Copy)]
struct ChunkPart {
    chunk: u64,
    within: u64,
    slot: usize,
}

/// What lies beyond the stored extent of a variable.
#[derive(Debug, Clone, Copy)]
enum Beyond {
    Step,
    Node,
}

/// Wanted steps and nodes in order of their chunks, so that each chunk is decoded once.
struct ChunkParts {
    steps: Vec<ChunkPart>,
    nodes: Vec<ChunkPart>,
    beyond: Vec<(Beyond, usize)>,
}

impl ChunkParts {
    fn of(wanted: &Wanted<'_>, chunks: &Chunks, grid: &[u64]) -> Self {
        let stride = |lengths: &[u64], place: usize| lengths[place + 1..].iter().product::<u64>();
        let part = |place: usize, at: u64| {
            let chunk = at / chunks.shape[place] * stride(grid, place);
            (chunk, at % chunks.shape[place] * stride(&chunks.shape, place))
        };
        let named = [wanted.step, wanted.row, wanted.column];
        // The dimensions that are fixed count to every step.
        let (mut fixed_chunk, mut fixed_within) = (0, 0);
        let mut all_beyond = false;
        for (place, at) in wanted.fixed.iter().enumerate().filter(|(place, _)| !named.contains(&Some(*place))) {
            let (chunk, within) = part(place, *at);
            all_beyond |= *at >= chunks.extent[place];
            fixed_chunk += chunk;
            fixed_within += within;
        }
        let is_beyond = |place: Option<usize>, at: u64| place.is_some_and(|place| at >= chunks.extent[place]);
        let mut parts = Self { steps: Vec::new(), nodes: Vec::new(), beyond: Vec::new() };
        for (slot, step) in wanted.steps.clone().enumerate() {
            let (chunk, within) = wanted.step.map_or((0, 0), |place| part(place, step));
            parts.steps.push(ChunkPart { chunk: fixed_chunk + chunk, within: fixed_within + within, slot });
            if all_beyond || is_beyond(wanted.step, step) {
                parts.beyond.push((Beyond::Step, slot));
            }
        }
        for (slot, (row, column)) in wanted.nodes.iter().enumerate() {
            let of_row = wanted.row.map_or((0, 0), |place| part(place, *row));
            let of_column = wanted.column.map_or((0, 0), |place| part(place, *column));
            parts.nodes.push(ChunkPart { chunk: of_row.0 + of_column.0, within: of_row.1 + of_column.1, slot });
            if is_beyond(wanted.row, *row) || is_beyond(wanted.column, *column) {
                parts.beyond.push((Beyond::Node, slot));
            }
        }
        parts.steps.sort_by_key(|part| part.chunk);
        parts.nodes.sort_by_key(|part| part.chunk);
        parts
    }
}

/// How a chunk lies in the scratch buffers.
pub(super) struct Loaded {
    /// The data are in `Scratch::inflated`, else in `Scratch::stored`.
    pub(super) inflated: bool,
    /// The bytes lie in planes.
    pub(super) shuffled: bool,
}

/// Undoes HDF5's shuffle: planes of first bytes, second bytes ... become values; bytes beyond the last whole value stand as
/// they are.
fn unshuffle(shuffled: &[u8], plain: &mut Vec<u8>, size: usize) {
    let count = shuffled.len() / size;
    plain.clear();
    for element in 0..count {
        plain.extend((0..size).map(|byte| shuffled[byte * count + element]));
    }
    plain.extend_from_slice(&shuffled[count * size..]);
}

/// The Fletcher checksum as HDF5 computes it: over big-endian 16-bit words, an odd last byte as a word's high byte.
fn fletcher32(data: &[u8]) -> u32 {
    let (mut first, mut second) = (0_u32, 0_u32);
    // 360 words can be added before the sums must be folded.
    for block in data.chunks(720) {
        for word in block.chunks(2) {
            first = first.wrapping_add(u32::from(word[0]) << 8 | word.get(1).copied().map_or(0, u32::from));
            second = second.wrapping_add(first);
        }
        first = (first & 0xffff) + (first >> 16);
        second = (second & 0xffff) + (second >> 16);
    }
    first = (first & 0xffff) + (first >> 16);
    second = (second & 0xffff) + (second >> 16);
    second << 16 | first
}
