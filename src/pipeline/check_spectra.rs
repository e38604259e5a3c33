//! What `check` says of directional spectra.

use super::inputs::OpenSpectra;
use crate::io::netcdf::SpectraPlace;
use crate::model::{Missing, Site, SpatialRule};
use crate::science::sample::{distance_km, stencil};
use serde::Serialize;

/// Gaps that are listed one by one; the others are counted.
const GAPS_LISTED: usize = 5;

/// An input of directional spectra.
#[derive(Debug, Clone, Serialize)]
pub struct SpectraCheck {
    /// Its id.
    pub id: String,
    /// Files and formats.
    pub files: Vec<String>,
    /// The variable of the density and its unit.
    pub variable: String,
    /// Axes with their senses.
    pub axes: String,
    /// First and last frequency, Hz.
    pub frequency_hz: [f64; 2],
    /// Number of frequencies and directions.
    pub cells: [usize; 2],
    /// Whether the directions go all the way round.
    pub full_circle: bool,
    /// Sound frequencies (twice the wave frequency) that the spectra reach without an extended tail, Hz.
    pub sound_hz: [f64; 2],
    /// Start of the tail as the study states it, Hz; else it is looked for in every spectrum.
    pub tail_start_hz: Option<f64>,
    /// Where the spectra are.
    pub place: String,
    /// First and last step.
    pub span: Option<(String, String)>,
    /// Number of steps.
    pub steps: usize,
    /// Usual time between steps, h.
    pub step_h: f64,
    /// Steps farther apart than this are a gap, h.
    pub max_gap_h: f64,
    /// Gaps: start, end.
    pub gaps: Vec<(String, String)>,
    /// Remarks.
    pub notes: Vec<String>,
}

/// Says what was understood of spectra, and which sites they do not reach.
pub(super) fn check_spectra(spectra: &OpenSpectra, sites: &[Site], problems: &mut Vec<String>) -> SpectraCheck {
    let (source, id) = (&spectra.source, spectra.input.id.0.clone());
    let axes = source.axes();
    let steps = source.steps();
    for site in sites {
        let Some(at) = site.track.nominal() else { continue };
        let why = match source.place() {
            SpectraPlace::Grid(grid) => stencil(grid, at, &SpatialRule::default()).err(),
            SpectraPlace::Stations { .. } => {
                let near = source.stations_at(0).into_iter().flatten().map(|station| distance_km(at, station));
                let near = near.fold(f64::INFINITY, f64::min);
                (near.is_finite() && near > source.max_distance_km()).then_some(Missing::BeyondDistance)
            }
        };
        if let Some(why) = why {
            problems.push(format!(
                "spectra `{id}`: site {} at {:.4} N, {:.4} E: {}",
                site.id,
                at.latitude_deg(),
                at.longitude_deg(),
                why.sentence()
            ));
        }
    }
    let place = match source.place() {
        SpectraPlace::Grid(grid) => {
            let [south, north, west, east] = grid.limits();
            let (rows, columns) = grid.size();
            let around = if grid.is_periodic() { ", around the globe" } else { "" };
            format!("grid: {rows} x {columns} nodes, {south} to {north} N, {west} to {east} E{around}")
        }
        SpectraPlace::Stations { count, drifting } => {
            let drift = if drifting { ", drifting" } else { "" };
            format!("stations: {count}{drift}; the nearest serves a site, within {} km", source.max_distance_km())
        }
    };
    let first_hz = axes.frequency_hz[0];
    let last_hz = axes.frequency_hz[axes.frequencies() - 1];
    SpectraCheck {
        id,
        files: source.files().iter().map(|(path, format)| format!("{} ({format})", path.display())).collect(),
        variable: source.variable_words(),
        axes: source.axes_words().to_owned(),
        frequency_hz: [first_hz, last_hz],
        cells: [axes.frequencies(), axes.directions()],
        full_circle: axes.full_circle,
        sound_hz: [2.0 * first_hz, 2.0 * last_hz],
        tail_start_hz: spectra.input.tail_start_hz,
        place,
        span: steps.first().zip(steps.last()).map(|(first, last)| (first.iso(), last.iso())),
        steps: steps.len(),
        step_h: source.usual_step_ms() as f64 / 3.6e6,
        max_gap_h: source.max_gap_ms() as f64 / 3.6e6,
        gaps: steps
            .windows(2)
            .filter(|pair| pair[1].0 - pair[0].0 > source.max_gap_ms())
            .map(|pair| (pair[0].iso(), pair[1].iso()))
            .collect(),
        notes: source.warnings().to_vec(),
    }
}

impl SpectraCheck {
    pub(super) fn text(&self) -> String {
        let mut out = format!("spectra `{}`: {}\n", self.id, self.variable);
        out.push_str(&format!("  files: {}\n  axes: {}\n  {}\n", self.files.join(", "), self.axes, self.place));
        let [low, high] = self.sound_hz;
        let tail = self.tail_start_hz.map_or_else(
            || "looked for in every spectrum".to_owned(),
            |start| format!("from {start} Hz, as the study states"),
        );
        out.push_str(&format!("  sound of opposing waves: {low:.2} to {high:.2} Hz; laid-on tail: {tail}\n"));
        if let Some((first, last)) = &self.span {
            out.push_str(&format!("  steps: {}, {first} to {last}, every {} h\n", self.steps, self.step_h));
        }
        out.push_str(&format!("  gaps longer than {} h: {}\n", self.max_gap_h, self.gaps.len()));
        for (start, end) in self.gaps.iter().take(GAPS_LISTED) {
            out.push_str(&format!("    {start} to {end}\n"));
        }
        for note in &self.notes {
            out.push_str(&format!("  note: {note}\n"));
        }
        out
    }
}
