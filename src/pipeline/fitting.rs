//! `fit`: level against wind speed, per source, site, sensor and band.

use super::matching::{Matched, deployment_labels, used_levels_db};
use super::progress::Progress;
use crate::Error;
use crate::config::{Study, TableFormat, WindowSpeed};
use crate::io::replace_file::replace_with;
use crate::io::table::{Pairs, TableWriter, TextColumn, write_dictionary};
use crate::model::{Band, Conditions, FittedBand, Relation, SensorRecord, SourceId, WindowWind};
use crate::report::columns::relation_table;
use crate::science::level_wind::{Options, SiteRecord, fit_site};
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// The wind speed of a window that the fit uses, m/s; NaN where there is none.
pub(crate) fn wind_speed_m_s(wind: Option<&WindowWind>, which: WindowSpeed) -> f64 {
    wind.map_or(f64::NAN, |wind| match which {
        WindowSpeed::SpeedMean => wind.speed_mean_m_s,
        WindowSpeed::SpeedOfMean => wind.speed_of_mean_m_s,
        WindowSpeed::ScalarSpeedMean => wind.scalar_speed_mean_m_s,
    })
}

/// Fits all bands of all sensors against each wind source.
pub fn fit_matched(study: &Study, matched: &Matched, progress: &dyn Progress) -> Vec<FittedBand> {
    let total: usize = matched.conditions.iter().map(Vec::len).sum();
    progress.start(total as u64, "fitting");
    let mut fitted = Vec::new();
    for wind in &study.wind {
        for (record, sources) in matched.records.iter().zip(&matched.conditions) {
            if let Some(conditions) = sources.iter().find(|conditions| conditions.source == wind.id) {
                fitted.extend(fit_conditions(study, record, conditions, 0));
                progress.advance(1);
            }
        }
    }
    progress.finish();
    fitted
}

/// Fits the bands of one sensor against one wind source; the level of a window goes with the wind this many windows before it
/// (after it where negative).
pub(super) fn fit_conditions(
    study: &Study,
    record: &SensorRecord,
    conditions: &Conditions,
    lag_windows: i32,
) -> Vec<FittedBand> {
    let times_ms: Vec<i64> = record.windows.iter().map(|window| window.centre().0).collect();
    let wind: Vec<f64> =
        conditions.wind.iter().map(|wind| wind_speed_m_s(wind.as_ref(), study.matching.wind_speed)).collect();
    let wind = if lag_windows == 0 { wind } else { lagged(&times_ms, &wind, lag_windows) };
    let levels = used_levels_db(record, conditions);
    let deployment = deployment_labels(record);
    let site = SiteRecord {
        times_ms: &times_ms,
        wind_speed_m_s: &wind,
        deployment: deployment.as_deref(),
        levels_db: levels.iter().map(Vec::as_slice).collect(),
    };
    fit_site(&site, &study.relation.options)
        .into_iter()
        .zip(&record.bands)
        .map(|(relation, band)| FittedBand {
            source: conditions.source.clone(),
            site: record.site.clone(),
            sensor: record.sensor.clone(),
            band: Some(band.band),
            kind: Some(record.kind),
            relation,
        })
        .collect()
}

/// The values of windows that lie a number of usual steps earlier (later where negative); NaN where there is none.
fn lagged(times_ms: &[i64], values: &[f64], steps: i32) -> Vec<f64> {
    let mut gaps_ms: Vec<i64> = times_ms.windows(2).map(|pair| pair[1] - pair[0]).collect();
    gaps_ms.sort_unstable();
    let Some(step_ms) = gaps_ms.get(gaps_ms.len() / 2) else { return vec![f64::NAN; values.len()] };
    let earlier = |time: &i64| times_ms.binary_search(&(time - i64::from(steps) * step_ms)).ok();
    times_ms.iter().map(|time| earlier(time).map_or(f64::NAN, |at| values[at])).collect()
}

/// Fits a table of pairs of wind and level: each source, site and sensor by itself, its bands together; rows marked as not
/// used are left out.
pub fn fit_pairs(pairs: &Pairs, options: &Options) -> Vec<FittedBand> {
    let mut groups: BTreeMap<[&str; 3], BTreeMap<u64, Vec<usize>>> = BTreeMap::new();
    for row in 0..pairs.time_ms.len() {
        if pairs.used.as_ref().is_some_and(|used| !used[row]) {
            continue;
        }
        let names = [&pairs.source, &pairs.site, &pairs.sensor].map(|column| text_at(column.as_ref(), row));
        // Positive numbers order like their bits; a table without bands has one.
        let band = pairs.band_centre_hz.as_ref().map_or(0, |band| band[row].to_bits());
        groups.entry(names).or_default().entry(band).or_default().push(row);
    }
    let mut fitted = Vec::new();
    for ([source, site, sensor], bands) in groups {
        let relations = match BandsTogether::of(pairs, &bands) {
            Some(together) => together.fit(options),
            None => bands.values().flat_map(|rows| fit_rows(pairs, rows, options)).collect(),
        };
        fitted.extend(bands.keys().zip(relations).map(|(band, relation)| {
            let centre_hz = f64::from_bits(*band);
            FittedBand {
                source: SourceId(source.to_owned()),
                site: site.to_owned(),
                sensor: sensor.to_owned(),
                band: (centre_hz > 0.0).then_some(Band { low_hz: f64::NAN, centre_hz, high_hz: f64::NAN }),
                kind: None,
                relation,
            }
        }));
    }
    fitted
}

/// Bands of one sensor on one time line, as the fit wants them: then all share the same draws, and differences between bands
/// can be judged.
struct BandsTogether {
    times_ms: Vec<i64>,
    wind_m_s: Vec<f64>,
    deployment: Option<Vec<u32>>,
    levels_db: Vec<Vec<f64>>,
}

impl BandsTogether {
    /// `None` when the bands do not agree on wind or deployment, or one has a time twice.
    fn of(pairs: &Pairs, bands: &BTreeMap<u64, Vec<usize>>) -> Option<Self> {
        let mut times: BTreeMap<i64, usize> = BTreeMap::new();
        for row in bands.values().flatten() {
            times.entry(pairs.time_ms[*row]).or_insert(*row);
        }
        let place: BTreeMap<i64, usize> = times.keys().enumerate().map(|(k, time)| (*time, k)).collect();
        let deployment_of = |row: usize| pairs.deployment.as_ref().map(|column| column.codes[row]);
        let mut levels_db = Vec::with_capacity(bands.len());
        for rows in bands.values() {
            let mut levels = vec![f64::NAN; times.len()];
            let mut seen = vec![false; times.len()];
            for row in rows {
                let time = pairs.time_ms[*row];
                let first = times[&time];
                let same_wind = pairs.wind_speed_m_s[first].total_cmp(&pairs.wind_speed_m_s[*row]).is_eq();
                let k = place[&time];
                if !same_wind || deployment_of(first) != deployment_of(*row) || std::mem::replace(&mut seen[k], true) {
                    return None;
                }
                levels[k] = pairs.level_db[*row];
            }
            levels_db.push(levels);
        }
        let deployment = pairs.deployment.as_ref().map(|column| times.values().map(|row| column.codes[*row]).collect());
        let wind_m_s = times.values().map(|row| pairs.wind_speed_m_s[*row]).collect();
        Some(Self { times_ms: times.into_keys().collect(), wind_m_s, deployment, levels_db })
    }

    fn fit(&self, options: &Options) -> Vec<Relation> {
        let record = SiteRecord {
            times_ms: &self.times_ms,
            wind_speed_m_s: &self.wind_m_s,
            deployment: self.deployment.as_deref(),
            levels_db: self.levels_db.iter().map(Vec::as_slice).collect(),
        };
        fit_site(&record, options)
    }
}

/// Fits the rows of one band by themselves.
fn fit_rows(pairs: &Pairs, rows: &[usize], options: &Options) -> Vec<Relation> {
    let pick = |values: &[f64]| -> Vec<f64> { rows.iter().map(|row| values[*row]).collect() };
    let together = BandsTogether {
        times_ms: rows.iter().map(|row| pairs.time_ms[*row]).collect(),
        wind_m_s: pick(&pairs.wind_speed_m_s),
        deployment: pairs.deployment.as_ref().map(|column| rows.iter().map(|row| column.codes[*row]).collect()),
        levels_db: vec![pick(&pairs.level_db)],
    };
    together.fit(options)
}

/// Writes the relation table in the study's formats and as JSON. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub fn write_relations(fitted: &[FittedBand], formats: &[TableFormat], folder: &Path) -> Result<Vec<PathBuf>, Error> {
    let table = relation_table(fitted);
    let mut written = Vec::new();
    for format in formats {
        let extension = match format {
            TableFormat::Parquet => "parquet",
            TableFormat::Csv => "csv",
        };
        let path = folder.join(format!("relation.{extension}"));
        let mut writer = TableWriter::create(&path)?;
        writer.append(&table)?;
        writer.finish()?;
        written.push(path);
    }
    let dictionary = folder.join("relation_columns.csv");
    write_dictionary(&dictionary, &table)?;
    written.push(dictionary);
    let json = folder.join("relation.json");
    replace_with(&json, relations_json(fitted).as_bytes())?;
    written.push(json);
    Ok(written)
}

/// The relations as JSON, complete: curves, diagnostics, wind classes.
pub fn relations_json(fitted: &[FittedBand]) -> String {
    let mut text = serde_json::to_string_pretty(fitted).expect("plain data is JSON");
    text.push('\n');
    text
}

fn text_at(column: Option<&TextColumn>, row: usize) -> &str {
    column.map_or("", |column| column.text(row))
}
