//! What only the library can read: compact data, packed offsets, texts. Under its lock, in boxes.

use super::error::NetcdfError;
use super::header::Variable;
use super::read::{Reader, Wanted};
use crate::io::contain::contain;

/// Numbers that the library reads in one go.
const LARGEST_BOX: u64 = 1 << 20;
/// A box around the nodes is read where it holds at most this many numbers for each of them.
const SPARSEST_BOX: u64 = 4096;

impl Reader {
    /// Texts along a variable of one dimension, read by the library; empty where there are none.
    pub(super) fn texts(&self, variable: &Variable) -> Vec<String> {
        let shape = self.header.shape(variable);
        let (Ok(file), [count]) = (self.by_library(), &shape[..]) else { return Vec::new() };
        let Some(found) = file.variable(&variable.name) else { return Vec::new() };
        (0..*count as usize).map_while(|at| contain(|| found.get_string([at])).ok()?.ok()).collect()
    }

    fn by_library(&self) -> Result<&netcdf::File, String> {
        let opened = self.library.get_or_init(|| netcdf::open(&self.header.path).map_err(|error| error.to_string()));
        opened.as_ref().map_err(Clone::clone)
    }

    pub(super) fn gather_by_library(&self, variable: &Variable, wanted: &Wanted<'_>) -> Result<Vec<f64>, NetcdfError> {
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
}
