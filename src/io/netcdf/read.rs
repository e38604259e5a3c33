//! Values from storage: raw numbers, before any mask or scale. Missing blocks are NaN.

use super::error::NetcdfError;
use super::header::{ChunkPlace, Chunks, Filter, Header, NumberType, Storage, Variable};
use super::packing::Packing;
use crate::io::contain::contain;
use libdeflater::Decompressor;
use std::cell::RefCell;
use std::fs::File;
use std::os::unix::fs::FileExt;
use std::sync::OnceLock;

/// Runs of bytes closer than this are read in one go: a seek costs more than the bytes between.
const NEAR_BYTES: u64 = 64 << 10;
/// Longest run that is read in one go.
const LONGEST_RUN_BYTES: u64 = 8 << 20;
/// Numbers that the library reads in one go.
const LARGEST_BOX: u64 = 1 << 20;
/// A box around the nodes is read where it holds at most this many numbers for each of them.
const SPARSEST_BOX: u64 = 4096;
/// A chunk larger than this is not believed.
const LARGEST_CHUNK_BYTES: u64 = 4 << 30;
/// A coordinate variable longer than this is not read whole.
pub(super) const LONGEST_COORDINATE: u64 = 50_000_000;

thread_local! {
    static SCRATCH: RefCell<Scratch> = RefCell::new(Scratch::default());
}

/// Buffers that a thread uses again and again.
#[derive(Default)]
struct Scratch {
    stored: Vec<u8>,
    inflated: Vec<u8>,
    plain: Vec<u8>,
    inflater: Option<Decompressor>,
}

/// A file open for positioned reads, shared by all threads.
#[derive(Debug)]
pub(super) struct Reader {
    pub(super) header: Header,
    file: File,
    bytes: u64,
    library: OnceLock<Result<netcdf::File, String>>,
}

/// Which elements of a variable are wanted.
#[derive(Debug, Clone)]
pub(super) struct Wanted<'a> {
    /// For each dimension of the variable the index that is fixed; those of step, row and column are not used.
    pub(super) fixed: &'a [u64],
    /// Place of the step dimension among the variable's, if it has one.
    pub(super) step: Option<usize>,
    /// Place of the row dimension, if any.
    pub(super) row: Option<usize>,
    /// Place of the column dimension, if any.
    pub(super) column: Option<usize>,
    /// Steps.
    pub(super) steps: std::ops::Range<u64>,
    /// Rows and columns.
    pub(super) nodes: &'a [(u64, u64)],
}

impl Wanted<'_> {
    /// The full index of one element.
    fn index(&self, step: u64, node: (u64, u64), index: &mut Vec<u64>) {
        index.clear();
        index.extend_from_slice(self.fixed);
        if let Some(place) = self.step {
            index[place] = step;
        }
        if let Some(place) = self.row {
            index[place] = node.0;
        }
        if let Some(place) = self.column {
            index[place] = node.1;
        }
    }
}

impl Reader {
    /// Opens the file that a header was read from.
    pub(super) fn open(header: Header) -> Result<Self, NetcdfError> {
        let unreadable = |source| NetcdfError::Unreadable { path: header.path.clone(), source };
        let file = File::open(&header.path).map_err(unreadable)?;
        let bytes = file.metadata().map_err(unreadable)?.len();
        Ok(Self { header, file, bytes, library: OnceLock::new() })
    }

    /// All values of a variable, last dimension fastest. For coordinates: refuses what is far too long.
    pub(super) fn all(&self, variable: &Variable) -> Result<Vec<f64>, NetcdfError> {
        let shape = self.header.shape(variable);
        let count: u64 = shape.iter().product();
        if count > LONGEST_COORDINATE || count / 64 > self.bytes.saturating_mul(1024) {
            return Err(self.of_variable(variable, format!("it has {count} values, more than a coordinate can have")));
        }
        // A variable of any rank is a list of rows for this purpose.
        let (rows, columns) = match shape.split_last() {
            None => (1, 1),
            Some((last, rest)) => (rest.iter().product::<u64>(), *last),
        };
        let mut values = Vec::with_capacity(count as usize);
        let rank = shape.len();
        for row in 0..rows {
            let mut fixed = vec![0; rank];
            let mut rest = row;
            for place in (0..rank.saturating_sub(1)).rev() {
                fixed[place] = rest % shape[place];
                rest /= shape[place];
            }
            let wanted = Wanted {
                fixed: &fixed,
                step: rank.checked_sub(1),
                row: None,
                column: None,
                steps: 0..columns,
                nodes: &[(0, 0)],
            };
            values.extend(self.gather(variable, &wanted)?);
        }
        Ok(values)
    }

    /// All values of a coordinate variable, unpacked; NaN where they are missing.
    pub(super) fn coordinate(&self, variable: &Variable) -> Result<Vec<f64>, NetcdfError> {
        let packing = Packing::of(&self.header, variable)?;
        Ok(self.all(variable)?.into_iter().map(|raw| packing.value(raw)).collect())
    }

    /// Texts along a variable of one dimension, read by the library; empty where there are none.
    pub(super) fn texts(&self, variable: &Variable) -> Vec<String> {
        let shape = self.header.shape(variable);
        let (Ok(file), [count]) = (self.by_library(), &shape[..]) else { return Vec::new() };
        let Some(found) = file.variable(&variable.name) else { return Vec::new() };
        (0..*count as usize).map_while(|at| contain(|| found.get_string([at..at + 1])).ok()?.ok()).collect()
    }

    fn by_library(&self) -> Result<&netcdf::File, String> {
        let opened = self.library.get_or_init(|| netcdf::open(&self.header.path).map_err(|error| error.to_string()));
        opened.as_ref().map_err(Clone::clone)
    }

    /// The wanted elements: step by step, node by node.
    pub(super) fn gather(&self, variable: &Variable, wanted: &Wanted<'_>) -> Result<Vec<f64>, NetcdfError> {
        let Some(number) = variable.number_type() else {
            return Err(self.of_variable(variable, "it holds no numbers".to_owned()));
        };
        match &variable.storage {
            Storage::Contiguous { offset, big_endian } => {
                let shape = self.header.shape(variable);
                self.gather_runs(variable, wanted, number, *big_endian, |index| {
                    offset + number.size() as u64 * flat(index, &shape)
                })
            }
            Storage::Records { offset, record_bytes } => {
                let shape = self.header.shape(variable);
                self.gather_runs(variable, wanted, number, true, |index| {
                    let within = flat(&index[1..], &shape[1..]);
                    offset + index[0] * record_bytes + number.size() as u64 * within
                })
            }
            Storage::Chunked(chunks) => self.gather_chunks(variable, wanted, number, chunks),
            Storage::Library => self.gather_by_library(variable, wanted),
            Storage::Locked(filter) => Err(NetcdfError::Filter {
                path: self.header.path.clone(),
                variable: variable.name.clone(),
                filter: filter.clone(),
            }),
        }
    }

    fn gather_runs(
        &self,
        variable: &Variable,
        wanted: &Wanted<'_>,
        number: NumberType,
        big_endian: bool,
        address: impl Fn(&[u64]) -> u64,
    ) -> Result<Vec<f64>, NetcdfError> {
        let size = number.size() as u64;
        let mut places: Vec<(u64, usize)> = Vec::new();
        let mut index = Vec::new();
        for step in wanted.steps.clone() {
            for node in wanted.nodes {
                wanted.index(step, *node, &mut index);
                places.push((address(&index), places.len()));
            }
        }
        places.sort_unstable();
        let mut values = vec![f64::NAN; places.len()];
        SCRATCH.with_borrow_mut(|scratch| {
            let mut first = 0;
            while first < places.len() {
                let start = places[first].0;
                let mut last = first;
                while last + 1 < places.len()
                    && places[last + 1].0 <= places[last].0 + size + NEAR_BYTES
                    && places[last + 1].0 + size - start <= LONGEST_RUN_BYTES
                {
                    last += 1;
                }
                let length = (places[last].0 + size - start) as usize;
                scratch.stored.resize(length, 0);
                self.read_at(variable, &mut scratch.stored, start)?;
                for (place, slot) in &places[first..=last] {
                    let at = (place - start) as usize;
                    values[*slot] = number.decode(&scratch.stored[at..at + size as usize], big_endian);
                }
                first = last + 1;
            }
            Ok(())
        })?;
        Ok(values)
    }

    fn read_at(&self, variable: &Variable, buffer: &mut [u8], address: u64) -> Result<(), NetcdfError> {
        self.file.read_exact_at(buffer, address).map_err(|source| match source.kind() {
            std::io::ErrorKind::UnexpectedEof => NetcdfError::Damaged {
                path: self.header.path.clone(),
                problem: format!(
                    "variable `{}` has data up to byte {}, but the file has {} bytes",
                    variable.name,
                    address.saturating_add(buffer.len() as u64),
                    self.bytes
                ),
            },
            _ => NetcdfError::Unreadable { path: self.header.path.clone(), source },
        })
    }

    fn gather_chunks(
        &self,
        variable: &Variable,
        wanted: &Wanted<'_>,
        number: NumberType,
        chunks: &Chunks,
    ) -> Result<Vec<f64>, NetcdfError> {
        let shape = self.header.shape(variable);
        let grid: Vec<u64> = shape.iter().zip(&chunks.shape).map(|(length, chunk)| length.div_ceil(*chunk)).collect();
        let chunk_bytes = chunks
            .shape
            .iter()
            .try_fold(number.size() as u64, |bytes, length| bytes.checked_mul(*length))
            .filter(|bytes| *bytes <= LARGEST_CHUNK_BYTES)
            .ok_or_else(|| self.of_variable(variable, "its chunks are larger than 4 GiB".to_owned()))?;
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

    /// Brings a chunk into the scratch buffers, inflated but not unshuffled.
    fn load_chunk(
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

    fn gather_by_library(&self, variable: &Variable, wanted: &Wanted<'_>) -> Result<Vec<f64>, NetcdfError> {
        let failed = |problem: String| NetcdfError::Library {
            path: self.header.path.clone(),
            action: format!("variable `{}` cannot be read", variable.name),
            problem,
        };
        let file = self.by_library().map_err(&failed)?;
        let found = file.variable(&variable.name).ok_or_else(|| failed("it is not there any more".to_owned()))?;
        let mut values = Vec::with_capacity((wanted.steps.end - wanted.steps.start) as usize * wanted.nodes.len());
        let read = |extents: Vec<std::ops::Range<usize>>| -> Result<Vec<f64>, NetcdfError> {
            contain(|| found.get_values(extents)).map_err(&failed)?.map_err(|error| failed(error.to_string()))
        };
        // The box around all nodes, several steps at a time, where it is not too much larger than they are; else one by one.
        let ends = |of: fn(&(u64, u64)) -> u64| {
            let (low, high) = (wanted.nodes.iter().map(of).min(), wanted.nodes.iter().map(of).max());
            low.zip(high).map_or(0..0, |(low, high)| low..high + 1)
        };
        let rows = if wanted.row.is_some() { ends(|node| node.0) } else { 0..1 };
        let columns = if wanted.column.is_some() { ends(|node| node.1) } else { 0..1 };
        let (height, width) = (rows.end - rows.start, columns.end - columns.start);
        let in_box = height.saturating_mul(width);
        let as_box = in_box <= LARGEST_BOX && in_box <= (wanted.nodes.len() as u64).saturating_mul(SPARSEST_BOX);
        let mut step = wanted.steps.start;
        while step < wanted.steps.end && as_box {
            let end = (step + (LARGEST_BOX / in_box.max(1)).max(1)).min(wanted.steps.end);
            let mut extents: Vec<_> = wanted.fixed.iter().map(|at| *at as usize..*at as usize + 1).collect();
            for (place, range) in [(wanted.step, &(step..end)), (wanted.row, &rows), (wanted.column, &columns)] {
                if let Some(place) = place {
                    extents[place] = range.start as usize..range.end as usize;
                }
            }
            // The strides of the box: last dimension of the variable fastest.
            let stride = |place: Option<usize>| -> usize {
                place.map_or(0, |place| extents[place + 1..].iter().map(ExactSizeIterator::len).product())
            };
            let strides = [stride(wanted.step), stride(wanted.row), stride(wanted.column)];
            let all = read(extents)?;
            for k in 0..(end - step) as usize {
                for (row, column) in wanted.nodes {
                    let (row, column) = ((row - rows.start) as usize, (column - columns.start) as usize);
                    let at = k * strides[0]
                        + if wanted.row.is_some() { row * strides[1] } else { 0 }
                        + if wanted.column.is_some() { column * strides[2] } else { 0 };
                    values.push(all.get(at).copied().unwrap_or(f64::NAN));
                }
            }
            step = end;
        }
        let mut index = Vec::new();
        for step in step..wanted.steps.end {
            for node in wanted.nodes {
                wanted.index(step, *node, &mut index);
                let value = read(index.iter().map(|at| *at as usize..*at as usize + 1).collect())?;
                values.push(value.first().copied().unwrap_or(f64::NAN));
            }
        }
        Ok(values)
    }

    fn of_variable(&self, variable: &Variable, problem: String) -> NetcdfError {
        NetcdfError::Variable { path: self.header.path.clone(), variable: variable.name.clone(), problem }
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

struct Loaded {
    /// The data are in `Scratch::inflated`, else in `Scratch::stored`.
    inflated: bool,
    shuffled: bool,
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

/// Number of an element, last dimension fastest.
fn flat(index: &[u64], shape: &[u64]) -> u64 {
    index.iter().zip(shape).fold(0, |number, (at, length)| number * length + at)
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
