//! Directional spectra at the sites of a study: each storage block decoded once, in parallel; what is kept are reductions a
//! step, never spectra.

use super::progress::Progress;
use super::stencils::Stencils;
use crate::io::netcdf::{NetcdfError, SpectraPlace, SpectraSlab, SpectraSource};
use crate::model::{
    Flag, FlagSet, Missing, NodeId, NodeUse, Point, SEA_ROWS, SeaRow, Site, SpatialRule, SpectraSeries, Stencil, Track,
    WindSeries,
};
use crate::science::matchup::wind_at;
use crate::science::sample::{distance_km, stencil};
use crate::science::waves::{
    NodeSpectra, NodeState, ReduceOptions, Reducer, StepScratch, Water, WindOver, reduce_pair, reduce_step,
};
use crate::units::{ComingFrom, Compass, Instant, Window};
use rayon::prelude::*;
use std::collections::{BTreeMap, BTreeSet};

/// Steps that make a task.
const STEPS_A_TASK: usize = 16;
/// Tasks a thread that are in hand before their results are put in place.
const TASKS_A_THREAD: usize = 4;
/// Steps at the borders of tasks that are kept until their neighbours come in.
const MOST_BORDERS: usize = 64;
/// Two readings of one step agree within this share.
const SAME_READING: f32 = 1e-3;

/// How spectra are reduced.
#[derive(Debug, Clone, Copy, Default)]
pub struct SpectraRules {
    /// The water under the waves.
    pub water: Water,
    /// Tail and its tolerance.
    pub reduce: ReduceOptions,
    /// How a site's spectrum is taken from the grid.
    pub spatial: SpatialRule,
}

/// Reduced spectra at the sites at the native steps of a source, within a window (and one step on either side) or at all
/// steps. `wind` gives, site by site, the wind that tells wind sea from swell. The same bytes come out for any number of
/// threads.
///
/// # Errors
/// When a block cannot be read or decoded, or two files contradict each other.
pub fn sample_spectra(
    source: &SpectraSource,
    sites: &[Site],
    wind: &[Option<&WindSeries>],
    window: Option<Window>,
    rules: &SpectraRules,
    progress: &dyn Progress,
) -> Result<Vec<SpectraSeries>, NetcdfError> {
    let window = window.map(|window| Window {
        start: window.start.plus_ms(-source.max_gap_ms()),
        end: window.end.plus_ms(source.max_gap_ms()),
    });
    let range = steps_of(source.steps(), window);
    let steps = source.steps()[range.clone()].to_vec();
    let stencils: Vec<Stencils> = match (sites, only_station(source)) {
        ([_], Some(stencil)) => vec![Stencils::Fixed(Ok(stencil))],
        _ => sites.iter().map(|site| stencils(source, site, &rules.spatial, &steps, range.start)).collect(),
    };
    let mut all: Vec<SpectraSeries> = sites
        .iter()
        .zip(&stencils)
        .map(|(site, stencils)| {
            let mut series = SpectraSeries::empty(
                source.id().clone(),
                site.id.clone(),
                source.axes().clone(),
                steps.clone(),
                source.max_gap_ms(),
            );
            for (k, why) in series.missing.iter_mut().enumerate() {
                *why = Some(stencils.at(k).as_ref().err().copied().unwrap_or(Missing::NoSpectrum));
            }
            describe_nodes(source, site, stencils, range.start, &steps, &mut series);
            series
        })
        .collect();
    // Sites that the source never serves take neither room nor work.
    let served: Vec<bool> = stencils.iter().map(|stencils| stencils.all().iter().any(Result::is_ok)).collect();
    let winds = (0..sites.len()).map(|k| winds(wind.get(k).copied().flatten(), &steps));
    let job = Job {
        source,
        reducer: Reducer::new(source.axes(), &rules.water, rules.reduce),
        rule: rules.spatial,
        winds: winds.zip(&served).filter(|(_, served)| **served).map(|(winds, _)| winds).collect(),
        stencils: stencils.into_iter().zip(&served).filter(|(_, served)| **served).map(|(one, _)| one).collect(),
        first: range.start,
        count: steps.len(),
    };
    let mut room: Vec<&mut SpectraSeries> =
        all.iter_mut().zip(&served).filter(|(_, served)| **served).map(|(series, _)| series).collect();
    room.iter_mut().for_each(|series| series.take_room());
    job.run(window, &mut room, progress)?;
    Ok(all)
}

fn steps_of(steps: &[Instant], window: Option<Window>) -> std::ops::Range<usize> {
    let Some(window) = window else { return 0..steps.len() };
    let first = steps.partition_point(|step| *step <= window.start).saturating_sub(1);
    let last = (steps.partition_point(|step| *step < window.end) + 1).min(steps.len());
    first.min(last)..last
}

fn stencils(source: &SpectraSource, site: &Site, rule: &SpatialRule, steps: &[Instant], first: usize) -> Stencils {
    let at = |place: Option<Point>, step: usize| -> Result<Stencil, Missing> {
        let place = place.ok_or(Missing::NoPosition)?;
        match source.place() {
            SpectraPlace::Grid(grid) => stencil(grid, place, rule),
            SpectraPlace::Stations { .. } => nearest_station(source, place, first + step),
        }
    };
    let drifting = matches!(source.place(), SpectraPlace::Stations { drifting: true, .. });
    match &site.track {
        Track::Fixed(place) if !drifting => Stencils::Fixed(at(Some(*place), 0)),
        track => Stencils::Moving(steps.iter().enumerate().map(|(k, step)| at(track.at(*step), k)).collect()),
    }
}

/// The nearest station at a step, within the limit.
fn nearest_station(source: &SpectraSource, place: Point, step: usize) -> Result<Stencil, Missing> {
    let near = source
        .stations_at(step)
        .into_iter()
        .enumerate()
        .filter_map(|(k, station)| Some((k, distance_km(place, station?))))
        .min_by(|a, b| a.1.total_cmp(&b.1));
    match near {
        Some((row, km)) if km <= source.max_distance_km() => {
            Ok(Stencil { nodes: vec![(NodeId { row, column: 0 }, 1.0)], flags: FlagSet::of(Flag::NearestStation) })
        }
        Some(_) => Err(Missing::BeyondDistance),
        None => Err(Missing::NoPosition),
    }
}

/// The station that serves a place at a step of the source, as nodes; none where there is none near enough.
pub(super) fn station_nodes(source: &SpectraSource, place: Point, step: usize) -> Vec<(NodeId, f64)> {
    let stencil = only_station(source).map_or_else(|| nearest_station(source, place, step), Ok);
    stencil.map(|stencil| stencil.nodes).unwrap_or_default()
}

/// A single station whose place is not known serves a single site.
fn only_station(source: &SpectraSource) -> Option<Stencil> {
    let is_only = matches!(source.place(), SpectraPlace::Stations { count: 1, .. });
    (is_only && source.stations_at(0).iter().all(Option::is_none)).then(|| Stencil {
        nodes: vec![(NodeId { row: 0, column: 0 }, 1.0)],
        flags: FlagSet::of(Flag::StationPlaceUnknown),
    })
}

/// Wind of a site at each step.
fn winds(series: Option<&WindSeries>, steps: &[Instant]) -> Vec<Option<WindOver>> {
    let Some(series) = series else { return Vec::new() };
    steps.iter().map(|step| wind_over(wind_at(series, *step).value()?)).collect()
}

/// A window's wind as one over waves; `None` without direction.
pub(super) fn wind_over(wind: &crate::model::WindowWind) -> Option<WindOver> {
    let from = Compass::<ComingFrom>::of_wind(wind.eastward_mean_m_s, wind.northward_mean_m_s)?;
    (wind.speed_mean_m_s > 0.0).then_some(WindOver { speed_m_s: wind.speed_mean_m_s, from_deg: from.degrees() })
}

fn describe_nodes(
    source: &SpectraSource,
    site: &Site,
    stencils: &Stencils,
    first: usize,
    steps: &[Instant],
    series: &mut SpectraSeries,
) {
    let used = |k: usize| -> Vec<NodeUse> {
        let (Ok(stencil), Some(place)) = (stencils.at(k), site.track.at(steps[k])) else { return Vec::new() };
        let position = |node: &NodeId| match source.place() {
            SpectraPlace::Grid(grid) => {
                let (latitude, longitude) = grid.place(*node)?;
                Point::new(latitude, longitude).ok()
            }
            SpectraPlace::Stations { .. } => source.stations_at(first + k).get(node.row).copied().flatten(),
        };
        let of_node = |(node, weight): &(NodeId, f64)| {
            let at = position(node)?;
            Some(NodeUse {
                latitude_deg: at.latitude_deg(),
                longitude_deg: at.longitude_deg(),
                weight: *weight,
                distance_km: distance_km(place, at),
            })
        };
        stencil.nodes.iter().filter_map(of_node).collect()
    };
    let Some(known) = (0..steps.len()).find(|k| stencils.at(*k).is_ok()) else { return };
    series.nodes = used(known);
    let nearest = |nodes: &[NodeUse]| nodes.iter().map(|node| node.distance_km).fold(f64::NAN, f64::min);
    series.nearest_km = match stencils {
        Stencils::Fixed(_) => vec![nearest(&series.nodes)],
        Stencils::Moving(_) => (0..steps.len()).map(|k| nearest(&used(k))).collect(),
    };
}

struct Job<'a> {
    source: &'a SpectraSource,
    reducer: Reducer<'a>,
    rule: SpatialRule,
    stencils: Vec<Stencils>,
    winds: Vec<Vec<Option<WindOver>>>,
    /// Place of the first step among the source's.
    first: usize,
    count: usize,
}

/// One step of all sites.
struct StepResult {
    step: usize,
    sites: Vec<Result<(FlagSet, f64), Missing>>,
    rows: Vec<f32>,
    /// Whether the overlap with the next step is in the rows.
    has_next: bool,
}

/// A step whose neighbour in time comes in another task: blended spectra of all sites.
struct Border {
    step: usize,
    blended: Vec<f64>,
}

struct TaskResult {
    slabs: Vec<usize>,
    steps: Vec<StepResult>,
    borders: Vec<Border>,
}

impl Job<'_> {
    fn run(
        &self,
        window: Option<Window>,
        all: &mut [&mut SpectraSeries],
        progress: &dyn Progress,
    ) -> Result<(), NetcdfError> {
        let nodes: Vec<NodeId> = self
            .stencils
            .iter()
            .flat_map(Stencils::all)
            .filter_map(|stencil| stencil.as_ref().ok())
            .flat_map(|stencil| stencil.nodes.iter().filter(|(_, weight)| *weight > 0.0).map(|(node, _)| *node))
            .collect::<BTreeSet<_>>()
            .into_iter()
            .collect();
        if nodes.is_empty() {
            return Ok(());
        }
        let slabs = self.source.plan(nodes.len(), window);
        let tasks = self.tasks(&slabs);
        progress.start(slabs.len() as u64, "reading spectra");
        let mut borders: BTreeMap<usize, Vec<f64>> = BTreeMap::new();
        let mut room = vec![0.0; self.source.axes().frequencies()];
        for batch in tasks.chunks(TASKS_A_THREAD * rayon::current_num_threads()) {
            let results: Vec<Result<TaskResult, NetcdfError>> = batch
                .par_iter()
                .map(|task| {
                    let result = self.task(&slabs, task, &nodes);
                    progress.advance(task.len() as u64);
                    result
                })
                .collect();
            for result in results {
                let result = result?;
                self.place(&slabs, result, all, &mut borders, &mut room)?;
            }
        }
        progress.finish();
        Ok(())
    }

    /// Slabs taken together, so that a task is worth its while.
    fn tasks(&self, slabs: &[SpectraSlab]) -> Vec<Vec<usize>> {
        let mut tasks: Vec<Vec<usize>> = Vec::new();
        let mut held = STEPS_A_TASK;
        for (k, slab) in slabs.iter().enumerate() {
            let steps = self.source.slab_steps(slab).len();
            if held >= STEPS_A_TASK {
                tasks.push(Vec::new());
                held = 0;
            }
            held += steps;
            if let Some(task) = tasks.last_mut() {
                task.push(k);
            }
        }
        tasks
    }

    fn task(&self, slabs: &[SpectraSlab], task: &[usize], nodes: &[NodeId]) -> Result<TaskResult, NetcdfError> {
        let axes = self.source.axes();
        let (cells, frequencies, sites) = (axes.cells(), axes.frequencies(), self.stencils.len());
        let width = SEA_ROWS * frequencies;
        let mut result = TaskResult { slabs: Vec::new(), steps: Vec::new(), borders: Vec::new() };
        let mut densities = Vec::new();
        let mut scratch = StepScratch::new(frequencies);
        let mut room = vec![0.0; frequencies];
        let (mut before, mut blended) = (vec![0.0; sites * cells], vec![0.0; sites * cells]);
        let mut before_is_border = true;
        for number in task {
            let slab = &slabs[*number];
            self.source.decode(slab, nodes, &mut densities)?;
            let mut order: Vec<(usize, usize)> = self
                .source
                .slab_steps(slab)
                .iter()
                .enumerate()
                .filter_map(|(k, step)| Some(((*step)?.checked_sub(self.first)?, k)))
                .filter(|(step, _)| *step < self.count)
                .collect();
            order.sort_unstable();
            for (step, stored) in order {
                let here = &densities[stored * nodes.len() * cells..(stored + 1) * nodes.len() * cells];
                let states: Vec<NodeState> = here.chunks_exact(cells).map(NodeState::of).collect();
                let spectra = NodeSpectra { nodes, densities: here, states: &states };
                let mut of_step = StepResult {
                    step,
                    sites: Vec::with_capacity(sites),
                    rows: vec![f32::NAN; sites * width],
                    has_next: false,
                };
                for (site, stencils) in self.stencils.iter().enumerate() {
                    let wind = self.winds[site].get(step).copied().flatten();
                    let mix = &mut blended[site * cells..(site + 1) * cells];
                    let rows = &mut of_step.rows[site * width..(site + 1) * width];
                    let found = stencils.at(step).as_ref().map_err(|why| *why).and_then(|stencil| {
                        reduce_step(&self.reducer, axes, (stencil, &self.rule), spectra, wind, &mut scratch, mix, rows)
                    });
                    of_step.sites.push(found.map(|sea| (sea.flags, sea.tail_start_hz)));
                }
                let follows = result.steps.last().is_some_and(|last| last.step + 1 == step);
                if let (true, Some(last)) = (follows, result.steps.last_mut()) {
                    for site in 0..sites {
                        self.pair(site, last, &before, &of_step, &blended, &mut room);
                    }
                    last.has_next = true;
                }
                if let (false, false, Some(last)) = (follows, before_is_border, result.steps.last()) {
                    result.borders.push(Border { step: last.step, blended: before.clone() });
                }
                if !follows {
                    result.borders.push(Border { step, blended: blended.clone() });
                }
                before_is_border = !follows;
                result.steps.push(of_step);
                result.slabs.push(*number);
                std::mem::swap(&mut before, &mut blended);
            }
        }
        if let (false, Some(last)) = (before_is_border, result.steps.last()) {
            result.borders.push(Border { step: last.step, blended: before });
        }
        Ok(result)
    }

    fn pair(&self, site: usize, earlier: &mut StepResult, a: &[f64], later: &StepResult, b: &[f64], room: &mut [f64]) {
        if earlier.sites[site].is_err() || later.sites[site].is_err() {
            return;
        }
        let axes = self.source.axes();
        let (cells, frequencies) = (axes.cells(), axes.frequencies());
        let width = SEA_ROWS * frequencies;
        let density = SeaRow::Density as usize * frequencies;
        let next = SeaRow::WithNext as usize * frequencies;
        let of_site = site * cells..(site + 1) * cells;
        let rows = &mut earlier.rows[site * width..(site + 1) * width];
        let known = rows[density..density + frequencies].to_vec();
        let later_density = &later.rows[site * width + density..site * width + density + frequencies];
        reduce_pair(
            &self.reducer,
            (&a[of_site.clone()], &known),
            (&b[of_site], later_density),
            room,
            &mut rows[next..next + frequencies],
        );
    }

    /// Puts a task's steps where they belong, and makes the pairs across its borders.
    fn place(
        &self,
        slabs: &[SpectraSlab],
        result: TaskResult,
        all: &mut [&mut SpectraSeries],
        borders: &mut BTreeMap<usize, Vec<f64>>,
        room: &mut [f64],
    ) -> Result<(), NetcdfError> {
        let width = SEA_ROWS * self.source.axes().frequencies();
        for (of_step, slab) in result.steps.iter().zip(&result.slabs) {
            for (site, series) in all.iter_mut().enumerate() {
                let rows = &of_step.rows[site * width..(site + 1) * width];
                match of_step.sites[site] {
                    Ok((flags, tail)) => {
                        if series.is_known(of_step.step) {
                            self.must_agree(&slabs[*slab], series, of_step.step, rows)?;
                            if of_step.has_next {
                                let next = SeaRow::WithNext as usize * self.source.axes().frequencies();
                                let count = self.source.axes().frequencies();
                                series
                                    .row_mut(of_step.step, SeaRow::WithNext)
                                    .copy_from_slice(&rows[next..next + count]);
                            }
                            continue;
                        }
                        series.step_mut(of_step.step).copy_from_slice(rows);
                        series.flags[of_step.step] = flags.union(self.source.flags());
                        series.missing[of_step.step] = None;
                        series.tail_start_hz[of_step.step] = tail;
                    }
                    Err(why) => {
                        if !series.is_known(of_step.step) {
                            series.missing[of_step.step] = Some(why);
                        }
                    }
                }
            }
        }
        for Border { step, blended } in result.borders {
            borders.insert(step, blended);
            for earlier in [step.checked_sub(1), Some(step)].into_iter().flatten() {
                self.join(earlier, all, borders, room);
            }
        }
        // Slabs come in order of time: only the latest few can still meet a neighbour.
        while borders.len() > MOST_BORDERS {
            borders.pop_first();
        }
        Ok(())
    }

    /// The pair of a step and its successor, where both have come in.
    fn join(&self, step: usize, all: &mut [&mut SpectraSeries], borders: &BTreeMap<usize, Vec<f64>>, room: &mut [f64]) {
        let cells = self.source.axes().cells();
        let (Some(earlier), Some(later)) = (borders.get(&step), borders.get(&(step + 1))) else { return };
        for (site, series) in all.iter_mut().enumerate() {
            if !(series.is_known(step) && series.is_known(step + 1)) {
                continue;
            }
            let of_site = site * cells..(site + 1) * cells;
            let densities = [step, step + 1].map(|step| series.row(step, SeaRow::Density).to_vec());
            reduce_pair(
                &self.reducer,
                (&earlier[of_site.clone()], &densities[0]),
                (&later[of_site], &densities[1]),
                room,
                series.row_mut(step, SeaRow::WithNext),
            );
        }
    }

    fn must_agree(
        &self,
        slab: &SpectraSlab,
        series: &SpectraSeries,
        step: usize,
        rows: &[f32],
    ) -> Result<(), NetcdfError> {
        let known = series.row(step, SeaRow::Density);
        let new = &rows[..known.len()];
        let top = known.iter().copied().fold(0.0, f32::max);
        match known.iter().zip(new).find(|(a, b)| (**a - **b).abs() > SAME_READING * top) {
            None => Ok(()),
            Some((a, b)) => Err(NetcdfError::Variable {
                path: self.source.slab_file(slab).to_owned(),
                variable: self.source.variable_words(),
                problem: format!(
                    "the step {} is there twice with different spectra at site {} (densities {a} and {b} m2/Hz); expected one (leave one of the files out)",
                    series.steps[step], series.site
                ),
            }),
        }
    }
}
