//! Wind at the sites of a study: nodes first, then only their blocks, each once, in parallel; memory follows sites and steps.

use super::progress::Progress;
use super::stencils::Stencils;
use crate::io::netcdf::{NetcdfError, WindKind, WindSource};
use crate::model::{
    Block, FieldSource, FlagSet, Grid, Missing, NodeId, NodeRequest, NodeUse, Point, Site, Slab, SpatialRule, Track,
    WindSeries,
};
use crate::science::sample::{NodeWinds, distance_km, stencil, wind_at_site};
use crate::units::{Instant, Window};
use rayon::prelude::*;
use std::collections::BTreeSet;

/// Slabs that are decoded before their values are put in place: bounds the memory, keeps all threads busy.
const SLABS_AT_A_TIME: usize = 64;

fn stencils(grid: &Grid, site: &Site, rule: &SpatialRule, steps: &[Instant]) -> Stencils {
    match &site.track {
        Track::Fixed(place) => Stencils::Fixed(stencil(grid, *place, rule)),
        Track::Moving(_) => Stencils::Moving(
            steps
                .iter()
                .map(|step| site.track.at(*step).ok_or(Missing::NoPosition).and_then(|p| stencil(grid, p, rule)))
                .collect(),
        ),
    }
}

/// Wind at the sites at the native steps of a source, within a window (and one step on either side), or at all steps.
/// The same bytes come out for any number of threads.
///
/// # Errors
/// When a block cannot be read or decoded, or two files contradict each other.
pub fn sample_wind(
    source: &WindSource,
    sites: &[Site],
    window: Option<Window>,
    rule: &SpatialRule,
    progress: &dyn Progress,
) -> Result<Vec<WindSeries>, NetcdfError> {
    let meta = source.meta();
    // A missing step at the window's edge may be bridged: so the steps beyond it are needed too.
    let window = window.map(|window| Window {
        start: window.start.plus_ms(-source.max_gap_ms()),
        end: window.end.plus_ms(source.max_gap_ms()),
    });
    let steps = steps_of(&meta.steps, window);
    let stencils: Vec<Stencils> =
        sites.iter().map(|site| stencils(&meta.grid, site, rule, &meta.steps[steps.clone()])).collect();
    let nodes: Vec<NodeId> = stencils
        .iter()
        .flat_map(Stencils::all)
        .filter_map(|stencil| stencil.as_ref().ok())
        .flat_map(|stencil| stencil.nodes.iter().filter(|(_, weight)| *weight > 0.0).map(|(node, _)| *node))
        .collect::<BTreeSet<_>>()
        .into_iter()
        .collect();
    let Decoded { mut values, preliminary } = decode_all(source, &nodes, &steps, window, progress)?;
    if source.kind() == WindKind::Components {
        turn_to_east(&meta.grid, &nodes, &mut values);
    }
    let all = sites
        .par_iter()
        .zip(&stencils)
        .map(|(site, stencils)| {
            let mut series = empty_series(source, site, meta.steps[steps.clone()].to_vec());
            series.nodes = nodes_used(&meta.grid, site, stencils);
            for k in 0..steps.len() {
                let slot = k * nodes.len();
                let of_step = |component: usize| {
                    values.get(component).map_or(&[][..], |values| &values[slot..slot + nodes.len()])
                };
                let winds = NodeWinds {
                    nodes: &nodes,
                    first: of_step(0),
                    second: of_step(1),
                    second_is_direction: source.kind() == WindKind::SpeedAndDirection,
                    preliminary: preliminary.get(slot..slot + nodes.len()).unwrap_or_default(),
                };
                let found = stencils
                    .at(k)
                    .as_ref()
                    .map_err(|why| *why)
                    .and_then(|stencil| Ok((wind_at_site(stencil, rule, &winds)?, stencil.flags)));
                match found {
                    Ok(((wind, flags), of_stencil)) => {
                        series.eastward_m_s.push(wind.eastward_m_s);
                        series.northward_m_s.push(wind.northward_m_s);
                        series.scalar_speed_m_s.push(wind.scalar_speed_m_s);
                        series.flags.push(meta.flags.union(flags).union(of_stencil));
                        series.missing.push(None);
                    }
                    Err(why) => {
                        series.eastward_m_s.push(f64::NAN);
                        series.northward_m_s.push(f64::NAN);
                        series.scalar_speed_m_s.push(f64::NAN);
                        series.flags.push(FlagSet::default());
                        series.missing.push(Some(why));
                    }
                }
            }
            series
        })
        .collect();
    Ok(all)
}

/// Turns components along a grid's axes to east and north, node by node.
fn turn_to_east(grid: &Grid, nodes: &[NodeId], values: &mut [Vec<f64>]) {
    let (Grid::Scattered(places), [first, second]) = (grid, values) else { return };
    if !places.is_grid_relative() || nodes.is_empty() {
        return;
    }
    let turns: Vec<(f64, f64)> =
        nodes.iter().map(|node| places.x_axis(node.row, node.column).unwrap_or((f64::NAN, f64::NAN))).collect();
    for (along, across) in first.chunks_mut(nodes.len()).zip(second.chunks_mut(nodes.len())) {
        for ((x, y), (cos, sin)) in along.iter_mut().zip(across).zip(&turns) {
            (*x, *y) = (*x * cos - *y * sin, *x * sin + *y * cos);
        }
    }
}

/// The steps within a window and one on either side.
fn steps_of(steps: &[crate::units::Instant], window: Option<Window>) -> std::ops::Range<usize> {
    let Some(window) = window else { return 0..steps.len() };
    let first = steps.partition_point(|step| *step <= window.start).saturating_sub(1);
    let last = (steps.partition_point(|step| *step < window.end) + 1).min(steps.len());
    first.min(last)..last
}

fn empty_series(source: &WindSource, site: &Site, steps: Vec<crate::units::Instant>) -> WindSeries {
    let meta = source.meta();
    WindSeries {
        source: meta.source.clone(),
        site: site.id.clone(),
        eastward_m_s: Vec::with_capacity(steps.len()),
        northward_m_s: Vec::with_capacity(steps.len()),
        scalar_speed_m_s: Vec::with_capacity(steps.len()),
        flags: Vec::with_capacity(steps.len()),
        missing: Vec::with_capacity(steps.len()),
        steps,
        nodes: Vec::new(),
        height_m: meta.height_m,
        max_gap_ms: source.max_gap_ms(),
    }
}

/// Values of the nodes: component by component, step by step, node by node; and which of them (in any component) are
/// preliminary, empty where none is.
struct Decoded {
    values: Vec<Vec<f64>>,
    preliminary: Vec<bool>,
}

fn decode_all(
    source: &WindSource,
    nodes: &[NodeId],
    steps: &std::ops::Range<usize>,
    window: Option<Window>,
    progress: &dyn Progress,
) -> Result<Decoded, NetcdfError> {
    let size = steps.len() * nodes.len();
    let mut decoded = Decoded { values: vec![vec![f64::NAN; size]; source.components()], preliminary: Vec::new() };
    if nodes.is_empty() {
        return Ok(decoded);
    }
    let slabs = source.plan(&NodeRequest { nodes: nodes.to_vec(), window });
    progress.start(slabs.len() as u64, "reading wind");
    for batch in slabs.chunks(SLABS_AT_A_TIME) {
        let blocks: Vec<Result<Block, NetcdfError>> = batch
            .par_iter()
            .map(|slab| {
                let block = source.decode(slab, nodes);
                progress.advance(1);
                block
            })
            .collect();
        for (slab, block) in batch.iter().zip(blocks) {
            place(source, slab, &block?, nodes.len(), steps, &mut decoded)?;
        }
    }
    progress.finish();
    Ok(decoded)
}

/// Puts a block's values where they belong; a step that is there already must say the same.
fn place(
    source: &WindSource,
    slab: &Slab,
    block: &Block,
    nodes: usize,
    steps: &std::ops::Range<usize>,
    decoded: &mut Decoded,
) -> Result<(), NetcdfError> {
    let (component, merged) = source.slab_steps(slab);
    if !block.preliminary.is_empty() {
        decoded.preliminary.resize(decoded.values[component].len(), false);
    }
    for (k, step) in merged.iter().enumerate() {
        let Some(step) = step.filter(|step| steps.contains(step)) else { continue };
        let slot = (step - steps.start) * nodes;
        for node in 0..nodes {
            let new = block.values[k * nodes + node];
            let known = &mut decoded.values[component][slot + node];
            if known.is_nan() {
                *known = new;
                if block.preliminary.get(k * nodes + node) == Some(&true) && !new.is_nan() {
                    decoded.preliminary[slot + node] = true;
                }
            } else if source.contradict(component, *known, new) {
                return Err(source.conflict(slab, source.meta().steps[step], *known, new));
            }
        }
    }
    Ok(())
}

fn nodes_used(grid: &Grid, site: &Site, stencils: &Stencils) -> Vec<NodeUse> {
    let Some(place) = site.track.nominal() else { return Vec::new() };
    let Some(stencil) = stencils.all().iter().find_map(|stencil| stencil.as_ref().ok()) else { return Vec::new() };
    stencil
        .nodes
        .iter()
        .filter_map(|(node, weight)| {
            let (latitude_deg, longitude_deg) = grid.place(*node)?;
            let distance_km = distance_km(place, Point::new(latitude_deg, longitude_deg).ok()?);
            Some(NodeUse { latitude_deg, longitude_deg, weight: *weight, distance_km })
        })
        .collect()
}
