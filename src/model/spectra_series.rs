//! Directional spectra at one site, reduced step by step: what memory keeps of them.

use super::outcome::{FlagSet, Missing};
use super::series::{NodeUse, SourceId};
use super::spectrum::SpectrumAxes;
use crate::units::Instant;

/// A number that is kept at every frequency of every step. Overlaps are kept over the product of the densities they belong
/// to (1/rad), so that single precision holds them.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SeaRow {
    /// Density E(f), m2/Hz.
    Density,
    /// Integral of E cos(theta), m2/Hz; theta is the direction of travel.
    A1,
    /// Integral of E sin(theta), m2/Hz.
    B1,
    /// Density of the wind sea, m2/Hz; NaN without wind.
    WindDensity,
    /// Integral of E cos(theta) over the wind sea, m2/Hz.
    WindA1,
    /// Integral of E sin(theta) over the wind sea, m2/Hz.
    WindB1,
    /// Overlap of the site's spectrum with itself over E^2.
    Total,
    /// The part of pairs of a node with itself, squared weights, over E^2.
    Diagonal,
    /// What the nodes have on their own, plain weights, over E^2.
    Own,
    /// Overlap with the next step over the product of both densities.
    WithNext,
    /// Share of the pairs of opposite bins with a zero.
    ZeroPairs,
}

/// Number of rows a step.
pub const SEA_ROWS: usize = 11;

/// Reduced spectra at one site at the native steps of one source. A step without a spectrum has its reason in `missing`.
#[derive(Debug, Clone, PartialEq)]
pub struct SpectraSeries {
    /// The source.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// Axes of the spectra.
    pub axes: SpectrumAxes,
    /// Native steps, strictly increasing.
    pub steps: Vec<Instant>,
    /// Remarks.
    pub flags: Vec<FlagSet>,
    /// Why a step has no value.
    pub missing: Vec<Option<Missing>>,
    /// Start of the laid-on tail at each step, Hz; NaN where none is found.
    pub tail_start_hz: Vec<f64>,
    /// Distance of the nearest node or station used at each step, km; one entry for a site and source that stay.
    pub nearest_km: Vec<f64>,
    /// Nodes used (for moving ones: at the first step with a spectrum).
    pub nodes: Vec<NodeUse>,
    /// Steps farther apart than this are a gap, ms.
    pub max_gap_ms: i64,
    /// Step by step, row by row, frequency by frequency.
    numbers: Vec<f32>,
}

impl SpectraSeries {
    /// A series with nothing in it yet, and no room for numbers.
    pub fn empty(source: SourceId, site: String, axes: SpectrumAxes, steps: Vec<Instant>, max_gap_ms: i64) -> Self {
        let count = steps.len();
        Self {
            source,
            site,
            axes,
            steps,
            flags: vec![FlagSet::default(); count],
            missing: vec![Some(Missing::OutsideTime); count],
            tail_start_hz: vec![f64::NAN; count],
            nearest_km: Vec::new(),
            nodes: Vec::new(),
            max_gap_ms,
            numbers: Vec::new(),
        }
    }

    /// Takes room for the numbers of all steps, missing until they are filled.
    pub fn take_room(&mut self) {
        self.numbers = vec![f32::NAN; self.steps.len() * SEA_ROWS * self.axes.frequencies()];
    }

    /// One row of a step; empty where no step has a spectrum.
    pub fn row(&self, step: usize, row: SeaRow) -> &[f32] {
        let frequencies = self.axes.frequencies();
        let start = (step * SEA_ROWS + row as usize) * frequencies;
        self.numbers.get(start..start + frequencies).unwrap_or_default()
    }

    /// One row of a step, to fill.
    pub fn row_mut(&mut self, step: usize, row: SeaRow) -> &mut [f32] {
        let frequencies = self.axes.frequencies();
        let start = (step * SEA_ROWS + row as usize) * frequencies;
        &mut self.numbers[start..start + frequencies]
    }

    /// All rows of a step, to fill: row by row, frequency by frequency.
    pub fn step_mut(&mut self, step: usize) -> &mut [f32] {
        let width = SEA_ROWS * self.axes.frequencies();
        &mut self.numbers[step * width..(step + 1) * width]
    }

    /// Whether the step has a spectrum.
    pub fn is_known(&self, step: usize) -> bool {
        self.missing[step].is_none()
    }
}
