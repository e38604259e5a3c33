//! Several files and components on one time line and one grid.

use super::read::Reader;
use super::wind_part::Part;
use crate::model::Grid;
use crate::units::Instant;
use std::collections::BTreeMap;

/// Coordinates of two files are the same up to this many degrees (float32 against float64).
const SAME_PLACE_DEG: f64 = 1e-4;

/// A grid in words.
pub(super) fn grid_words(grid: &Grid) -> String {
    let [south, north, west, east] = grid.limits();
    let (rows, columns) = grid.size();
    format!("{rows} x {columns} nodes from {south} to {north} degrees north and {west} to {east} degrees east")
}

/// Brings the steps of all parts on one time line: the steps at which every component is there.
pub(super) fn merge(
    readers: &[Reader],
    parts: Vec<(Part, Vec<Option<Instant>>)>,
    components: usize,
    notes: &mut Vec<String>,
) -> (Vec<Part>, Vec<Instant>) {
    let mut seen: BTreeMap<Instant, Vec<usize>> = BTreeMap::new();
    let mut unsorted = Vec::new();
    for (part, steps) in &parts {
        let known: Vec<Instant> = steps.iter().filter_map(|step| *step).collect();
        if known.windows(2).any(|pair| pair[1] < pair[0]) {
            unsorted.push(readers[part.reader].header.path.display().to_string());
        }
        for step in known {
            let counts = seen.entry(step).or_insert_with(|| vec![0; components]);
            counts[part.component] += 1;
        }
    }
    unsorted.dedup();
    for path in unsorted {
        notes.push(format!("{path}: steps are not in order of time; they were sorted"));
    }
    let twice = seen.values().filter(|counts| counts.iter().any(|count| *count > 1)).count();
    if twice > 0 {
        notes.push(format!("{twice} steps are there more than once; the first counts, and differences are refused"));
    }
    let partial = seen.values().filter(|counts| counts.contains(&0)).count();
    if partial > 0 {
        notes.push(format!("{partial} steps lack one of the components and are left out"));
    }
    let steps: Vec<Instant> = seen.iter().filter(|(_, counts)| !counts.contains(&0)).map(|(step, _)| *step).collect();
    let parts = parts
        .into_iter()
        .map(|(mut part, of_part)| {
            part.merged = of_part.iter().map(|step| steps.binary_search(&(*step)?).ok()).collect();
            part
        })
        .collect();
    (parts, steps)
}

/// Whether two grids have the same nodes, stored the same way round: a node goes by its stored row and column.
pub(super) fn same_grid(a: &Grid, b: &Grid) -> bool {
    let same = |a: &crate::numerics::axis::Axis, b: &crate::numerics::axis::Axis| {
        a.len() == b.len() && a.nodes().zip(b.nodes()).all(|(a, b)| a.0 == b.0 && (a.1 - b.1).abs() < SAME_PLACE_DEG)
    };
    match (a, b) {
        (Grid::Axes { latitude, longitude }, Grid::Axes { latitude: other_latitude, longitude: other_longitude }) => {
            same(latitude, other_latitude) && same(longitude, other_longitude)
        }
        (Grid::Scattered(a), Grid::Scattered(b)) => {
            a.size() == b.size()
                && a.is_grid_relative() == b.is_grid_relative()
                && a.nodes().zip(b.nodes()).all(|(a, b)| {
                    (a.0, a.1) == (b.0, b.1) && (0..3).all(|k| (a.2[k] - b.2[k]).abs() < SAME_PLACE_DEG.to_radians())
                })
        }
        _ => false,
    }
}

/// The most common time between steps, ms.
pub(super) fn usual_step_ms(steps: &[Instant]) -> i64 {
    let mut counts: BTreeMap<i64, usize> = BTreeMap::new();
    for pair in steps.windows(2) {
        *counts.entry(pair[1].0 - pair[0].0).or_default() += 1;
    }
    counts.iter().max_by_key(|(step, count)| (**count, -**step)).map_or(0, |(step, _)| *step)
}
