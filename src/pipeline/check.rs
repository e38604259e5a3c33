//! `check`: opens every input and says what was understood; computes nothing.

use super::check_spectra::{SpectraCheck, check_spectra};
use super::inputs::{OpenLevels, OpenWind, open_inputs};
use super::progress::Progress;
use crate::Error;
use crate::config::{Study, WindOrigin};
use crate::io::wind_table::read_wind_table;
use crate::model::{FieldSource, Missing, Site, Track};
use crate::science::sample::stencil;
use crate::units::{Instant, Window};
use serde::Serialize;

/// Gaps that are listed one by one; the others are counted.
const GAPS_LISTED: usize = 5;

/// What was understood of a study's inputs.
#[derive(Debug, Clone, Serialize)]
pub struct CheckReport {
    /// Name of the study.
    pub study: String,
    /// The sites.
    pub sites: Vec<SiteCheck>,
    /// The wind inputs.
    pub wind: Vec<WindCheck>,
    /// Inputs of directional spectra.
    pub spectra: Vec<SpectraCheck>,
    /// The level tables.
    pub levels: Vec<LevelsCheck>,
    /// What lacks or looks wrong.
    pub problems: Vec<String>,
    /// The study with all defaults filled in.
    pub resolved: Study,
}

/// A site and its place on each grid.
#[derive(Debug, Clone, Serialize)]
pub struct SiteCheck {
    /// Site name.
    pub id: String,
    /// Degrees north; of the first position of a track.
    pub latitude_deg: Option<f64>,
    /// Degrees east.
    pub longitude_deg: Option<f64>,
    /// Positions of a track; 0 for a site that stays.
    pub positions: usize,
    /// Sensors, with their depth in metres.
    pub sensors: Vec<(String, Option<f64>)>,
}

/// A wind input.
#[derive(Debug, Clone, Serialize)]
pub struct WindCheck {
    /// Its id.
    pub id: String,
    /// Files and formats.
    pub files: Vec<String>,
    /// Variables and what they are.
    pub variables: Vec<String>,
    /// Height above the surface, m.
    pub height_m: Option<f64>,
    /// Limits of the grid: south, north, west, east, degrees; none for a table.
    pub limits_deg: Option<[f64; 4]>,
    /// Whether the grid closes around the globe.
    pub periodic: bool,
    /// Rows and columns.
    pub nodes: Option<[usize; 2]>,
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

/// A level table.
#[derive(Debug, Clone, Serialize)]
pub struct LevelsCheck {
    /// Files with format, layout, reference, window.
    pub files: Vec<String>,
    /// Unit of the levels as they are used.
    pub unit: &'static str,
    /// Names of the sites in the table; an empty name is a table that names none.
    pub sites: Vec<String>,
    /// Bands: lower edge, centre, upper edge, Hz.
    pub bands_hz: Vec<[f64; 3]>,
    /// Level samples.
    pub samples: u64,
    /// Samples that can be used.
    pub usable: u64,
    /// Samples that cannot, by reason.
    pub not_usable: Vec<(&'static str, u64)>,
    /// Start of the first and end of the last window.
    pub span: Option<(String, String)>,
    /// Least and greatest level, dB.
    pub range_db: Option<(f64, f64)>,
    /// Samples whose window overlaps the one before.
    pub overlapping: u64,
    /// Remarks.
    pub notes: Vec<String>,
}

/// Opens every input of a study and says what was understood.
///
/// # Errors
/// When an input cannot be opened or understood.
pub fn check_study(study: &Study, progress: &dyn Progress) -> Result<CheckReport, Error> {
    let inputs = open_inputs(study)?;
    let mut problems = inputs.remarks.clone();
    let mut spans = Vec::new();
    let wind: Vec<WindCheck> = inputs
        .wind
        .iter()
        .map(|wind| check_wind(wind, &inputs.sites, &mut spans, &mut problems))
        .collect::<Result<_, Error>>()?;
    let spectra: Vec<SpectraCheck> =
        inputs.spectra.iter().map(|spectra| check_spectra(spectra, &inputs.sites, &mut problems)).collect();
    let mut levels = Vec::new();
    for table in &inputs.levels {
        levels.push(check_levels(table, &inputs.sites, &spans, &mut problems, progress)?);
    }
    for (section, empty) in [("[[wind]]", wind.is_empty()), ("[[levels]]", levels.is_empty())] {
        if empty {
            problems.push(format!("there is no `{section}`: nothing can be matched"));
        }
    }
    let sites = inputs.sites.iter().map(check_site).collect();
    Ok(CheckReport { study: study.name.clone(), sites, wind, spectra, levels, problems, resolved: study.clone() })
}

fn check_site(site: &Site) -> SiteCheck {
    let place = site.track.nominal();
    SiteCheck {
        id: site.id.clone(),
        latitude_deg: place.map(crate::model::Point::latitude_deg),
        longitude_deg: place.map(crate::model::Point::longitude_deg),
        positions: match &site.track {
            Track::Fixed(_) => 0,
            Track::Moving(positions) => positions.len(),
        },
        sensors: site.sensors.iter().map(|sensor| (sensor.id.clone(), sensor.depth_m)).collect(),
    }
}

fn check_wind(
    wind: &OpenWind,
    sites: &[Site],
    spans: &mut Vec<Window>,
    problems: &mut Vec<String>,
) -> Result<WindCheck, Error> {
    let id = wind.input.id.0.clone();
    let mut check = match (&wind.grid, &wind.input.origin) {
        (Some(source), _) => {
            let meta = source.meta();
            for site in sites {
                let Some(place) = site.track.nominal() else { continue };
                if let Err(why) = stencil(&meta.grid, place, &crate::model::SpatialRule::default()) {
                    problems.push(format!(
                        "wind `{id}`: site {} at {:.4} N, {:.4} E: {}",
                        site.id,
                        place.latitude_deg(),
                        place.longitude_deg(),
                        why.sentence()
                    ));
                }
            }
            WindCheck {
                id,
                files: source.files().iter().map(|(path, format)| format!("{} ({format})", path.display())).collect(),
                variables: source.variables().to_vec(),
                height_m: meta.height_m,
                limits_deg: Some(meta.grid.limits()),
                periodic: meta.grid.is_periodic(),
                nodes: Some(meta.grid.size().into()),
                max_gap_h: source.max_gap_ms() as f64 / 3.6e6,
                notes: source.warnings().to_vec(),
                ..steps_check(&meta.steps, source.max_gap_ms())
            }
        }
        (None, WindOrigin::Table { files, options, max_gap_ms, .. }) => {
            let table = read_wind_table(files, options)?;
            WindCheck {
                id,
                files: files.iter().map(|path| path.display().to_string()).collect(),
                variables: vec!["wind from a table".to_owned()],
                height_m: Some(table.height_m),
                notes: table.notes.clone(),
                ..steps_check(&table.steps, *max_gap_ms)
            }
        }
        (None, WindOrigin::Grid { .. }) => steps_check(&[], 0),
    };
    if check.height_m.is_none() {
        check.notes.push(
            "the height of the wind is not stated; it is taken as given (set `wind.height_m` to record it)".to_owned(),
        );
    }
    if let Some((first, last)) = &check.span
        && let (Ok(start), Ok(end)) = (Instant::parse(first), Instant::parse(last))
    {
        spans.push(Window { start, end });
    }
    Ok(check)
}

/// What the steps of a source say; the rest is empty.
fn steps_check(steps: &[Instant], max_gap_ms: i64) -> WindCheck {
    let mut between: Vec<i64> = steps.windows(2).map(|pair| pair[1].0 - pair[0].0).collect();
    between.sort_unstable();
    let gaps = steps
        .windows(2)
        .filter(|pair| pair[1].0 - pair[0].0 > max_gap_ms)
        .map(|pair| (pair[0].iso(), pair[1].iso()))
        .collect();
    WindCheck {
        id: String::new(),
        files: Vec::new(),
        variables: Vec::new(),
        height_m: None,
        limits_deg: None,
        periodic: false,
        nodes: None,
        span: steps.first().zip(steps.last()).map(|(first, last)| (first.iso(), last.iso())),
        steps: steps.len(),
        step_h: between.get(between.len() / 2).map_or(0.0, |ms| *ms as f64 / 3.6e6),
        max_gap_h: max_gap_ms as f64 / 3.6e6,
        gaps,
        notes: Vec::new(),
    }
}

fn check_levels(
    levels: &OpenLevels,
    sites: &[Site],
    wind: &[Window],
    problems: &mut Vec<String>,
    progress: &dyn Progress,
) -> Result<LevelsCheck, Error> {
    let mut table = levels.table.clone();
    progress.start(0, "reading levels");
    let survey = table.survey()?;
    progress.finish();
    let summary = table.describe();
    for name in &summary.sites {
        let known = sites.iter().any(|site| site.id == *name) || (name.is_empty() && sites.len() == 1);
        if !known {
            let what = if name.is_empty() {
                "the level table names no site and the study has several (set `levels.site_id`)".to_owned()
            } else {
                format!("the level table names a site `{name}` that the study does not have")
            };
            problems.push(what);
        }
    }
    if let Some(span) = survey.span
        && !wind.is_empty()
        && !wind.iter().any(|wind| wind.start < span.end && span.start < wind.end)
    {
        problems.push(format!("levels run from {} to {}, when there is no wind", span.start, span.end));
    }
    let files = summary
        .files
        .iter()
        .map(|file| {
            let window = file.window_s.map_or_else(
                || "window from two columns".to_owned(),
                |seconds| format!("window {seconds} s, stamped at its {}", stamp_word(file.stamp)),
            );
            format!("{} ({}, {}; {}; {window})", file.path.display(), file.format, file.layout, file.reference)
        })
        .collect();
    let mut notes: Vec<String> =
        summary.files.iter().flat_map(|f| f.warnings.iter().chain(&f.notes).cloned()).collect();
    notes.extend(summary.notes.iter().cloned());
    if survey.out_of_order > 0 {
        notes.push(format!(
            "{} samples come before the one before them; order does not matter here",
            survey.out_of_order
        ));
    }
    Ok(LevelsCheck {
        files,
        unit: summary.kind.unit(),
        sites: summary.sites,
        bands_hz: summary.bands.iter().map(|band| [band.low_hz, band.centre_hz, band.high_hz]).collect(),
        samples: survey.samples,
        usable: survey.usable,
        not_usable: survey.reasons.iter().map(|(why, n): (&Missing, &u64)| (why.name(), *n)).collect(),
        span: survey.span.map(|span| (span.start.iso(), span.end.iso())),
        range_db: survey.range_db,
        overlapping: survey.overlapping,
        notes,
    })
}

fn stamp_word(stamp: Option<crate::model::Stamp>) -> &'static str {
    match stamp {
        Some(crate::model::Stamp::Start) => "start",
        Some(crate::model::Stamp::Centre) => "centre",
        Some(crate::model::Stamp::End) => "end",
        None => "start and end",
    }
}

impl CheckReport {
    /// The report as text.
    pub fn text(&self) -> String {
        let mut out = format!("study: {}\n", self.study);
        for site in &self.sites {
            let place = match (site.latitude_deg, site.longitude_deg) {
                (Some(latitude), Some(longitude)) => format!("{latitude:.5} N, {longitude:.5} E"),
                _ => "no position".to_owned(),
            };
            let track =
                if site.positions > 0 { format!(", a track of {} positions", site.positions) } else { String::new() };
            let sensors: Vec<String> = site
                .sensors
                .iter()
                .map(|(id, depth)| depth.map_or_else(|| id.clone(), |depth| format!("{id} at {depth} m")))
                .collect();
            out.push_str(&format!("site {}: {place}{track}; sensors: {}\n", site.id, sensors.join(", ")));
        }
        for wind in &self.wind {
            out.push_str(&wind.text());
        }
        for spectra in &self.spectra {
            out.push_str(&spectra.text());
        }
        for levels in &self.levels {
            out.push_str(&levels.text());
        }
        if self.problems.is_empty() {
            out.push_str("nothing lacks\n");
        }
        for problem in &self.problems {
            out.push_str(&format!("look at this: {problem}\n"));
        }
        out
    }
}

impl WindCheck {
    fn text(&self) -> String {
        let mut out = format!("wind `{}`: {}\n", self.id, self.variables.join(", "));
        out.push_str(&format!("  files: {}\n", self.files.join(", ")));
        if let (Some([south, north, west, east]), Some([rows, columns])) = (self.limits_deg, self.nodes) {
            let around = if self.periodic { ", around the globe" } else { "" };
            out.push_str(&format!(
                "  grid: {rows} x {columns} nodes, {south} to {north} N, {west} to {east} E{around}\n"
            ));
        }
        if let Some((first, last)) = &self.span {
            out.push_str(&format!("  steps: {}, {first} to {last}, every {} h\n", self.steps, self.step_h));
        }
        let height = self.height_m.map_or_else(|| "not stated".to_owned(), |height| format!("{height} m"));
        out.push_str(&format!("  height: {height}; gaps longer than {} h: {}\n", self.max_gap_h, self.gaps.len()));
        for (start, end) in self.gaps.iter().take(GAPS_LISTED) {
            out.push_str(&format!("    {start} to {end}\n"));
        }
        for note in &self.notes {
            out.push_str(&format!("  note: {note}\n"));
        }
        out
    }
}

impl LevelsCheck {
    fn text(&self) -> String {
        let mut out = format!("levels in {}\n  files: {}\n", self.unit, self.files.join(", "));
        let sites: Vec<&str> =
            self.sites.iter().map(|site| if site.is_empty() { "(not named)" } else { site }).collect();
        out.push_str(&format!("  sites: {}\n", sites.join(", ")));
        if let (Some([low, ..]), Some([.., high])) = (self.bands_hz.first(), self.bands_hz.last()) {
            out.push_str(&format!("  bands: {}, {low:.1} to {high:.1} Hz\n", self.bands_hz.len()));
        }
        if let Some((start, end)) = &self.span {
            out.push_str(&format!("  time: {start} to {end}\n"));
        }
        out.push_str(&format!("  samples: {}, usable {}\n", self.samples, self.usable));
        for (why, n) in &self.not_usable {
            out.push_str(&format!("    {why}: {n}\n"));
        }
        if let Some((low, high)) = self.range_db {
            out.push_str(&format!("  levels: {low:.1} to {high:.1} dB\n"));
        }
        if self.overlapping > 0 {
            out.push_str(&format!(
                "  note: {} samples overlap the one before: they are not independent\n",
                self.overlapping
            ));
        }
        for note in &self.notes {
            out.push_str(&format!("  note: {note}\n"));
        }
        out
    }
}
