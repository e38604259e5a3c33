//! One step of one site: from the spectra of its nodes to the rows that are kept.

use super::blend::{StepOverlap, blend_nodes, pair_overlap, step_overlap};
use super::moments::{Moments, WindOver};
use super::reduce::Reducer;
use crate::model::{
    CoastRule, DirectionalSpectrum, Flag, FlagSet, Missing, NodeId, SEA_ROWS, SeaRow, SpatialRule, SpectrumAxes,
    Stencil,
};

/// Spectra of the nodes of one step, each complete, missing throughout, or in between.
#[derive(Debug, Clone, Copy)]
pub struct NodeSpectra<'a> {
    /// Nodes in increasing order.
    pub nodes: &'a [NodeId],
    /// Their densities, one spectrum after the other, m2/Hz/rad.
    pub densities: &'a [f64],
    /// What each of them is.
    pub states: &'a [NodeState],
}

/// What a node's spectrum is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NodeState {
    /// Every density is known.
    Complete,
    /// Some are missing.
    Incomplete,
    /// None is known: land, or nothing stored.
    Missing,
}

impl NodeState {
    /// Of a spectrum.
    pub fn of(densities: &[f64]) -> Self {
        let missing: usize = densities.iter().map(|density| usize::from(density.is_nan())).sum();
        match missing {
            0 => Self::Complete,
            all if all == densities.len() => Self::Missing,
            _ => Self::Incomplete,
        }
    }
}

/// Room for the work on one step, used again and again.
#[derive(Debug)]
pub struct StepScratch {
    moments: Moments,
    overlap: StepOverlap,
}

impl StepScratch {
    /// Room for so many frequencies.
    pub fn new(frequencies: usize) -> Self {
        Self { moments: Moments::zeros(frequencies), overlap: StepOverlap::with_frequencies(frequencies) }
    }
}

/// What a step came to besides its rows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepSea {
    /// Remarks.
    pub flags: FlagSet,
    /// Start of the laid-on tail, Hz; NaN where none is found.
    pub tail_start_hz: f64,
}

/// Blends the nodes of a site into `blended` and puts the rows of the step into `rows` (`SEA_ROWS` times the frequencies).
///
/// # Errors
/// The reason, when a node that the rule needs is missing, or there is no energy.
pub fn reduce_step(
    reducer: &Reducer<'_>,
    axes: &SpectrumAxes,
    (stencil, rule): (&Stencil, &SpatialRule),
    spectra: NodeSpectra<'_>,
    wind: Option<WindOver>,
    scratch: &mut StepScratch,
    blended: &mut [f64],
    rows: &mut [f32],
) -> Result<StepSea, Missing> {
    let (nodes, lost) = usable_nodes(axes, stencil, rule, spectra)?;
    blend_nodes(&nodes, blended);
    let spectrum = DirectionalSpectrum::new(axes, blended).expect("the room is that of the axes");
    reducer.tables().moments(spectrum, wind, &mut scratch.moments);
    if !scratch.moments.density.iter().any(|density| *density > 0.0) {
        return Err(Missing::NoEnergy);
    }
    step_overlap(reducer.opposing(), &nodes, blended, &mut scratch.overlap);
    let frequencies = axes.frequencies();
    let mut put = |row: SeaRow, values: &mut dyn Iterator<Item = f64>| {
        let room = &mut rows[row as usize * frequencies..(row as usize + 1) * frequencies];
        for (place, value) in room.iter_mut().zip(values) {
            *place = value as f32;
        }
    };
    debug_assert!(SEA_ROWS > SeaRow::ZeroPairs as usize);
    let Moments { density, a1, b1, wind_density, wind_a1, wind_b1, .. } = &scratch.moments;
    put(SeaRow::Density, &mut density.iter().copied());
    put(SeaRow::A1, &mut a1.iter().copied());
    put(SeaRow::B1, &mut b1.iter().copied());
    put(SeaRow::WindDensity, &mut wind_density.iter().copied());
    put(SeaRow::WindA1, &mut wind_a1.iter().copied());
    put(SeaRow::WindB1, &mut wind_b1.iter().copied());
    let over_square = |values: &[f64]| values.iter().zip(density).map(|(v, e)| v / (e * e)).collect::<Vec<_>>();
    put(SeaRow::Total, &mut over_square(&scratch.overlap.total).into_iter());
    put(SeaRow::Diagonal, &mut over_square(&scratch.overlap.diagonal).into_iter());
    put(SeaRow::Own, &mut over_square(&scratch.overlap.own).into_iter());
    put(SeaRow::ZeroPairs, &mut (0..frequencies).map(|k| reducer.opposing().zero_pair_share(spectrum.row(k))));
    let mut flags = stencil.flags;
    if lost {
        flags.insert(Flag::CoastRenormalised);
    }
    let tail_start_hz = reducer.tail_start_hz(spectrum, density).unwrap_or(f64::NAN);
    Ok(StepSea { flags, tail_start_hz })
}

type Weighted<'a> = Vec<(&'a [f64], f64)>;

/// The nodes that count, with weights that sum to one, and whether some were left out.
fn usable_nodes<'a>(
    axes: &SpectrumAxes,
    stencil: &Stencil,
    rule: &SpatialRule,
    spectra: NodeSpectra<'a>,
) -> Result<(Weighted<'a>, bool), Missing> {
    let cells = axes.cells();
    let find = |node: &NodeId| {
        let place = spectra.nodes.binary_search(node).ok()?;
        Some((&spectra.densities[place * cells..(place + 1) * cells], spectra.states[place]))
    };
    let why = |state: Option<NodeState>| match state {
        Some(NodeState::Incomplete) => Missing::IncompleteSpectrum,
        _ => Missing::LandOrMissing,
    };
    if let SpatialRule::Nearest { .. } = rule {
        let mut last = None;
        for (node, _) in &stencil.nodes {
            match find(node) {
                Some((densities, NodeState::Complete)) => return Ok((vec![(densities, 1.0)], false)),
                other => last = last.or(other.map(|(_, state)| state)),
            }
        }
        return Err(why(last));
    }
    let keeps_rest = !matches!(rule, SpatialRule::Bilinear(CoastRule::Missing));
    let mut nodes: Weighted<'a> = Vec::with_capacity(4);
    let (mut valid, mut lost) = (0.0, None);
    for (node, weight) in stencil.nodes.iter().filter(|(_, weight)| *weight != 0.0) {
        match find(node) {
            Some((densities, NodeState::Complete)) => {
                nodes.push((densities, *weight));
                valid += weight;
            }
            other => {
                let state = other.map(|(_, state)| state);
                if !keeps_rest {
                    return Err(why(state));
                }
                lost = Some(why(state));
            }
        }
    }
    if nodes.is_empty() {
        return Err(lost.unwrap_or(Missing::LandOrMissing));
    }
    if lost.is_some() {
        nodes.iter_mut().for_each(|(_, weight)| *weight /= valid);
    }
    Ok((nodes, lost.is_some()))
}

/// Overlap of a site's blended spectra at two neighbouring steps over the product of their densities, into `row` of the
/// earlier step.
pub fn reduce_pair(
    reducer: &Reducer<'_>,
    earlier: (&[f64], &[f32]),
    later: (&[f64], &[f32]),
    room: &mut [f64],
    row: &mut [f32],
) {
    pair_overlap(reducer.opposing(), earlier.0, later.0, room);
    for (k, place) in row.iter_mut().enumerate() {
        *place = (room[k] / (f64::from(earlier.1[k]) * f64::from(later.1[k]))) as f32;
    }
}
