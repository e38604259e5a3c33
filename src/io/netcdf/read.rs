//! Values from storage: raw numbers, before any mask or scale. Missing blocks are NaN.

use super::error::NetcdfError;
use super::header::{Header, NumberType, Storage, Variable};
use super::packing::Packing;
use libdeflater::Decompressor;
use std::cell::RefCell;
use std::fs::File;
use std::os::unix::fs::FileExt;
use std::sync::OnceLock;

/// Runs of bytes closer than this are read in one go: a seek costs more than the bytes between.
const NEAR_BYTES: u64 = 64 << 10;
/// Longest run that is read in one go.
const LONGEST_RUN_BYTES: u64 = 8 << 20;
/// A coordinate variable longer than this is not read whole.
pub(super) const LONGEST_COORDINATE: u64 = 50_000_000;

thread_local! {
    pub(super) static SCRATCH: RefCell<Scratch> = RefCell::new(Scratch::default());
}

/// Buffers that a thread uses again and again.
#[derive(Default)]
pub(super) struct Scratch {
    pub(super) stored: Vec<u8>,
    pub(super) inflated: Vec<u8>,
    pub(super) plain: Vec<u8>,
    pub(super) inflater: Option<Decompressor>,
}

/// A file open for positioned reads, shared by all threads.
#[derive(Debug)]
pub(super) struct Reader {
    pub(super) header: Header,
    pub(super) file: File,
    pub(super) bytes: u64,
    pub(super) library: OnceLock<Result<netcdf::File, String>>,
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
    pub(super) fn index(&self, step: u64, node: (u64, u64), index: &mut Vec<u64>) {
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

    pub(super) fn read_at(&self, variable: &Variable, buffer: &mut [u8], address: u64) -> Result<(), NetcdfError> {
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

    pub(super) fn of_variable(&self, variable: &Variable, problem: String) -> NetcdfError {
        NetcdfError::Variable { path: self.header.path.clone(), variable: variable.name.clone(), problem }
    }
}

/// Number of an element, last dimension fastest.
fn flat(index: &[u64], shape: &[u64]) -> u64 {
    index.iter().zip(shape).fold(0, |number, (at, length)| number * length + at)
}
