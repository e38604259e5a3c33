//! `match`: levels into windows, wind over the windows, tables.

use super::exclusion::Rules;
use super::inputs::{Inputs, OpenLevels, OpenWind};
use super::output::Output;
use super::progress::Progress;
use super::sampling::sample_wind;
use super::sea::{Sea, bring_sea};
use crate::Error;
use crate::config::{Study, WindOrigin};
use crate::io::levels::LevelNames;
use crate::io::wind_table::read_wind_table;
use crate::model::{BandLevels, Conditions, LevelKind, LevelRow, Missing, Screened, SensorRecord, Site, WindSeries};
use crate::report::columns::{conditions_table, matchups_table, sampled_table};
use crate::science::level_wind::{ScreenOptions, screen_short_events};
use crate::science::matchup::{BandNumber, LevelWindows, SensorKey, wind_over_windows};
use crate::units::Window;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// Rows of the matchup table that are made at a time: bounds the memory.
const ROWS_AT_A_TIME: usize = 65_536;

/// Levels and wind brought together.
#[derive(Debug)]
pub struct Matched {
    /// Levels by sensor, in order of site and sensor.
    pub records: Vec<SensorRecord>,
    /// Wind at the sites, by source (in the study's order) and site.
    pub series: Vec<WindSeries>,
    /// For each record, the wind of each source over its windows.
    pub conditions: Vec<Vec<Conditions>>,
    /// For each record, what the screen for short events found; empty where it is off.
    pub screened: Vec<Screened>,
    /// The sea, where the study has spectra.
    pub sea: Sea,
    /// How many pairs and rows are used, and why others are not.
    pub counts: Counts,
    /// What the reader should know.
    pub remarks: Vec<String>,
}

/// How many pairs and rows are used, and why others are not.
#[derive(Debug, Default, Clone)]
pub struct Counts {
    /// Pairs that go into the fit.
    pub used: u64,
    /// Pairs that do not, by reason.
    pub not_used: BTreeMap<&'static str, u64>,
    /// Pairs that each rule of the study leaves out, by the rule's reason.
    pub excluded: Vec<(String, u64)>,
    /// Rows of the level tables that reach no pair, by reason.
    pub rows_not_used: BTreeMap<&'static str, u64>,
}

impl Matched {
    /// From the first to the last instant that has a window.
    pub fn span(&self) -> Option<Window> {
        span(&self.records)
    }

    /// What the screen for short events found at a sensor; `None` where it is off.
    pub(super) fn screened_at(&self, record: &SensorRecord) -> Option<Screened> {
        let same = |(known, _): &(&SensorRecord, &Screened)| known.site == record.site && known.sensor == record.sensor;
        self.records.iter().zip(&self.screened).find(same).map(|(_, screened)| *screened)
    }
}

fn span(records: &[SensorRecord]) -> Option<Window> {
    records
        .iter()
        .filter_map(|record| Some((record.windows.first()?.start, record.windows.iter().map(|w| w.end).max()?)))
        .reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)))
        .map(|(start, end)| Window { start, end })
}

/// Brings levels and wind together.
///
/// # Errors
/// When an input cannot be read, or when the inputs have nothing in common.
pub fn bring_together(study: &Study, inputs: &Inputs, progress: &dyn Progress) -> Result<Matched, Error> {
    if study.wind.is_empty() || study.levels.is_empty() {
        let lacking = if study.wind.is_empty() { "[[wind]]" } else { "[[levels]]" };
        return Err(Error::Lacking { study: study.path.clone(), section: lacking });
    }
    let mut counts = Counts::default();
    let mut remarks = inputs.remarks.clone();
    let mut records = gather_levels(study, inputs, &mut counts, &mut remarks, progress)?;
    let screened = if study.relation.screen { records.iter_mut().map(screen).collect() } else { Vec::new() };
    let whole = span(&records);
    let mut series = Vec::new();
    for wind in &inputs.wind {
        series.extend(wind_series(study, wind, &inputs.sites, whole, &mut remarks, progress)?);
    }
    let rules = Rules::read(study)?;
    remarks.extend(rules.notes.iter().cloned());
    let conditions: Vec<Vec<Conditions>> = records
        .iter()
        .map(|record| {
            let here = series.iter().filter(|series| series.site == record.site);
            here.map(|series| {
                let mut conditions = wind_over_windows(series, &record.windows);
                rules.apply(record, &mut conditions);
                conditions
            })
            .collect()
        })
        .collect();
    counts.excluded = rules.reasons.into_iter().map(|reason| (reason, 0)).collect();
    for record in &records {
        let overlaps = record.overlapping_windows();
        if overlaps > 0 {
            remarks.push(format!(
                "site {}, sensor {}: {overlaps} of {} windows overlap the one before; neighbouring levels share samples",
                record.site,
                record.sensor,
                record.windows.len()
            ));
        }
    }
    count_pairs(&records, &conditions, &mut counts);
    for spectra in &inputs.spectra {
        let warnings = spectra.source.warnings().iter();
        remarks.extend(warnings.map(|warning| format!("spectra `{}`: {warning}", spectra.input.id)));
    }
    let sea = bring_sea(study, inputs, &records, &series, &conditions, whole, progress)?;
    let matched = Matched { records, series, conditions, screened, sea, counts, remarks };
    if matched.counts.used == 0 {
        return Err(nothing_in_common(inputs, &matched, whole));
    }
    Ok(matched)
}

fn gather_levels(
    study: &Study,
    inputs: &Inputs,
    counts: &mut Counts,
    remarks: &mut Vec<String>,
    progress: &dyn Progress,
) -> Result<Vec<SensorRecord>, Error> {
    let window_ms = study.matching.window_s.map(|s| (s * 1e3).round() as i64);
    let mut windows = LevelWindows::new(study.matching.statistic, window_ms);
    let kind = study.matching.kind.or_else(|| inputs.levels.first().map(|levels| levels.table.kind()));
    let kind = kind.unwrap_or(LevelKind::BandLevel);
    let mut unknown: BTreeMap<String, u64> = BTreeMap::new();
    for levels in &inputs.levels {
        // The number of rows of a text is not known before its end.
        progress.start(0, "reading levels");
        let mut router = Router::new(inputs, levels, kind);
        let mut table = levels.table.clone();
        let mut rows = 0_u64;
        table.for_each(|names, row| -> Result<(), Error> {
            rows += 1;
            if rows.is_multiple_of(1 << 16) {
                progress.advance(1 << 16);
            }
            match router.route(&mut windows, &row, names) {
                Route::To(number, shift_db) => {
                    let row = LevelRow { level_db: row.level_db + shift_db, ..row };
                    if let Some(why) = windows.push(number, &row)? {
                        *counts.rows_not_used.entry(why.name()).or_default() += 1;
                    }
                }
                Route::UnknownSite(name) => {
                    *unknown.entry(name.to_owned()).or_default() += 1;
                    *counts.rows_not_used.entry(Missing::UnknownSite.name()).or_default() += 1;
                }
            }
            Ok(())
        })?;
        remarks.extend(table.notes());
        progress.finish();
    }
    for (name, rows) in unknown {
        remarks
            .push(format!("the level tables name a site `{name}` that the study does not have: {rows} rows not used"));
    }
    Ok(windows.finish(|key| {
        let site = inputs.sites.iter().find(|site| site.id == key.site);
        let sensor = site.and_then(|site| site.sensors.iter().find(|sensor| sensor.id == key.sensor));
        sensor.map_or((None, Vec::new()), |sensor| (sensor.depth_m, sensor.deployments.clone()))
    }))
}

/// Where a level row goes.
enum Route<'a> {
    /// To this band, with this many dB added (from the table's kind of level to the study's).
    To(BandNumber, f64),
    /// Its site is not in the study.
    UnknownSite(&'a str),
}

/// Finds the sensor and band of each row; names are compared once for each pair of site and band.
struct Router<'a> {
    sites: &'a [Site],
    sensor: Option<&'a str>,
    from: LevelKind,
    to: LevelKind,
    known: Vec<Vec<Option<(BandNumber, f64)>>>,
}

impl<'a> Router<'a> {
    fn new(inputs: &'a Inputs, levels: &'a OpenLevels, to: LevelKind) -> Self {
        Self {
            sites: &inputs.sites,
            sensor: levels.input.sensor.as_deref(),
            from: levels.table.kind(),
            to,
            known: Vec::new(),
        }
    }

    fn route<'n>(&mut self, windows: &mut LevelWindows, row: &LevelRow, names: &'n LevelNames) -> Route<'n> {
        let (site, band) = (row.site as usize, row.band as usize);
        if let Some(Some((number, shift_db))) = self.known.get(site).and_then(|bands| bands.get(band)) {
            return Route::To(*number, *shift_db);
        }
        let name = &names.sites[site];
        // A table without site names belongs to the one site of a study that has one.
        let found = match (name.as_str(), self.sites) {
            ("", [only]) => Some(only),
            _ => self.sites.iter().find(|known| known.id == *name),
        };
        let Some(found) = found else { return Route::UnknownSite(name) };
        let sensor = self.sensor.map_or_else(|| found.sensors[0].id.clone(), str::to_owned);
        let key = SensorKey { site: found.id.clone(), sensor };
        let of_row = names.bands[band];
        let number = windows.band(&key, self.to, of_row);
        let shift_db = self.from.to_other_db(self.to, of_row);
        if self.known.len() <= site {
            self.known.resize(site + 1, Vec::new());
        }
        if self.known[site].len() <= band {
            self.known[site].resize(band + 1, None);
        }
        self.known[site][band] = Some((number, shift_db));
        Route::To(number, shift_db)
    }
}

fn wind_series(
    study: &Study,
    wind: &OpenWind,
    sites: &[Site],
    whole: Option<Window>,
    remarks: &mut Vec<String>,
    progress: &dyn Progress,
) -> Result<Vec<WindSeries>, Error> {
    match (&wind.grid, &wind.input.origin) {
        (Some(source), _) => {
            remarks.extend(source.warnings().iter().map(|warning| format!("wind `{}`: {warning}", wind.input.id)));
            Ok(sample_wind(source, sites, whole, &study.matching.spatial, progress)?)
        }
        (None, WindOrigin::Table { files, options, site, max_gap_ms }) => {
            let here: Vec<&Site> =
                sites.iter().filter(|known| site.as_ref().is_none_or(|id| *id == known.id)).collect();
            if here.is_empty() {
                return Err(Error::NoSuchSite {
                    study: study.path.clone(),
                    wind: wind.input.id.clone(),
                    site: site.clone().unwrap_or_default(),
                });
            }
            let read = read_wind_table(files, options)?;
            remarks.extend(read.notes.iter().map(|note| format!("wind `{}`: {note}", wind.input.id)));
            Ok(here.into_iter().map(|site| read.series(&wind.input.id, &site.id, *max_gap_ms)).collect())
        }
        (None, WindOrigin::Grid { .. }) => Ok(Vec::new()),
    }
}

/// Marks the levels of short events as not used; their numbers stay.
fn screen(record: &mut SensorRecord) -> Screened {
    let times_ms: Vec<i64> = record.windows.iter().map(|window| window.centre().0).collect();
    let usable = |band: &BandLevels| -> Vec<f64> {
        let level = |(level, reason): (&f64, &Option<Missing>)| if reason.is_none() { *level } else { f64::NAN };
        band.level_db.iter().zip(&band.reason).map(level).collect()
    };
    let levels: Vec<Vec<f64>> = record.bands.iter().map(usable).collect();
    let columns: Vec<&[f64]> = levels.iter().map(Vec::as_slice).collect();
    let events = screen_short_events(&times_ms, &columns, &ScreenOptions::default());
    for band in &mut record.bands {
        for (reason, _) in band.reason.iter_mut().zip(&events.marked).filter(|(_, marked)| **marked) {
            reason.get_or_insert(Missing::ShortEvent);
        }
    }
    events.summary()
}

fn count_pairs(records: &[SensorRecord], conditions: &[Vec<Conditions>], counts: &mut Counts) {
    for (record, sources) in records.iter().zip(conditions) {
        for conditions in sources {
            for band in 0..record.bands.len() {
                for k in 0..record.windows.len() {
                    match conditions.pair_reason(record, band, k) {
                        None => counts.used += 1,
                        Some(why) => {
                            *counts.not_used.entry(why.name()).or_default() += 1;
                            if let (Missing::Excluded, Some(rule)) = (why, conditions.exclusion.rule(k, band)) {
                                counts.excluded[rule].1 += 1;
                            }
                        }
                    }
                }
            }
        }
    }
}

/// Levels of each band, one entry a window, dB; NaN where the pair is not used.
pub(super) fn used_levels_db(record: &SensorRecord, conditions: &Conditions) -> Vec<Vec<f64>> {
    levels_db(record, |band, k| conditions.pair_reason(record, band, k).is_none())
}

/// As [`used_levels_db`], with the levels that the screen for short events left out.
pub(super) fn with_short_events_db(record: &SensorRecord, conditions: &Conditions) -> Vec<Vec<f64>> {
    levels_db(record, |band, k| match conditions.pair_reason(record, band, k) {
        None => true,
        Some(Missing::ShortEvent) => {
            let usable = record.deployment[k].is_some() && conditions.missing[k].is_none();
            usable && conditions.exclusion.rule(k, band).is_none() && record.bands[band].level_db[k].is_finite()
        }
        Some(_) => false,
    })
}

fn levels_db(record: &SensorRecord, take: impl Fn(usize, usize) -> bool) -> Vec<Vec<f64>> {
    let of_band = |(index, band): (usize, &BandLevels)| {
        band.level_db.iter().enumerate().map(|(k, level)| if take(index, k) { *level } else { f64::NAN }).collect()
    };
    record.bands.iter().enumerate().map(of_band).collect()
}

fn nothing_in_common(inputs: &Inputs, matched: &Matched, whole: Option<Window>) -> Error {
    let levels = whole.map_or_else(
        || "the level tables give no level at a site of the study".to_owned(),
        |w| format!("levels run from {} to {}", w.start, w.end),
    );
    let wind: Vec<String> = inputs
        .wind
        .iter()
        .map(|wind| {
            let steps = matched.series.iter().find(|series| series.source == wind.input.id).map(|series| &series.steps);
            let span = match steps.and_then(|steps| Some((steps.first()?, steps.last()?))) {
                Some((first, last)) => format!("from {first} to {last}"),
                None => "at none of these times".to_owned(),
            };
            format!("wind `{}` {span}", wind.input.id)
        })
        .collect();
    let mut reasons: Vec<(u64, &str)> = matched.counts.not_used.iter().map(|(why, n)| (*n, *why)).collect();
    reasons.sort_unstable_by(|a, b| b.cmp(a));
    let reasons: Vec<String> = reasons.iter().map(|(n, why)| format!("{why} {n}")).collect();
    Error::NothingInCommon { levels, wind: wind.join("; "), reasons: reasons.join(", ") }
}

/// Writes the sampled series, the conditions and the matchups, with a column dictionary beside them.
/// Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub fn write_tables(
    study: &Study,
    matched: &Matched,
    folder: &Path,
    progress: &dyn Progress,
) -> Result<Vec<PathBuf>, Error> {
    let mut written = Vec::new();
    let total: u64 = matched.conditions.iter().map(|sources| sources.len() as u64).sum();
    progress.start(total, "writing tables");
    let mut sampled = Output::create(&study.tables, folder, "sampled")?;
    for series in &matched.series {
        sampled.append(&sampled_table(series))?;
    }
    written.extend(sampled.finish()?);

    let rules: Vec<String> = matched.counts.excluded.iter().map(|(reason, _)| reason.clone()).collect();
    // Sources vary slowest: the order of the tables is source, site, sensor, window, band.
    let mut conditions_out = Output::create(&study.tables, folder, "conditions")?;
    let mut matchups_out = Output::create(&study.tables, folder, "matchups")?;
    for wind in &study.wind {
        for (number, (record, sources)) in matched.records.iter().zip(&matched.conditions).enumerate() {
            let Some(conditions) = sources.iter().find(|conditions| conditions.source == wind.id) else { continue };
            conditions_out.append(&conditions_table(
                conditions,
                matched.sea.conditions[number].first(),
                &record.sensor,
                &record.windows,
            ))?;
            let step = (ROWS_AT_A_TIME / record.bands.len().max(1)).max(1);
            let mut start = 0;
            while start < record.windows.len() {
                let end = (start + step).min(record.windows.len());
                let sea = matched.sea.rows(study, record, number, 0, sources, start..end);
                matchups_out.append(&matchups_table(record, conditions, sea.as_ref(), &rules, start..end))?;
                start = end;
            }
            progress.advance(1);
        }
    }
    written.extend(conditions_out.finish()?);
    written.extend(matchups_out.finish()?);
    progress.finish();
    Ok(written)
}
