//! `fit --matchups`: relations from a table of pairs of wind and level.

use super::segments::{SegmentLabels, segment_labels};
use super::together::{Found, Together};
use crate::config::SegmentBy;
use crate::io::table::{Pairs, TextColumn};
use crate::model::{Band, Fitted, FittedBand, FittedSensor, SourceId};
use crate::science::level_wind::Options;
use std::collections::BTreeMap;

/// Fits a table of pairs of wind and level: each source, site and sensor by itself, its bands together; rows marked as not
/// used are left out.
pub fn fit_pairs(pairs: &Pairs, options: &Options, segment_by: SegmentBy, screen: bool) -> Fitted {
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
    let mut fitted = Fitted::default();
    for ([source, site, sensor], bands) in groups {
        let found = match bands_together(pairs, &bands, segment_by) {
            Some(together) => together.fit_screened(options, screen),
            None => {
                Found::of_bands(bands.values().map(|rows| one_band(pairs, rows, segment_by).fit_and_check(options)))
            }
        };
        fitted.sensors.push(FittedSensor {
            source: SourceId(source.to_owned()),
            site: site.to_owned(),
            sensor: sensor.to_owned(),
            common_onset: found.common_onset,
            segments: found.segments,
            screen: found.screen,
        });
        fitted.bands.extend(bands.keys().zip(found.bands).map(|(band, (relation, checks))| {
            let centre_hz = f64::from_bits(*band);
            FittedBand {
                source: SourceId(source.to_owned()),
                site: site.to_owned(),
                sensor: sensor.to_owned(),
                band: (centre_hz > 0.0).then_some(Band { low_hz: f64::NAN, centre_hz, high_hz: f64::NAN }),
                kind: None,
                relation,
                checks,
            }
        }));
    }
    fitted
}

/// Bands of one sensor on one time line: then all share the same draws, and differences between bands can be judged.
/// `None` when the bands do not agree on wind or deployment, or one has a time twice.
fn bands_together(pairs: &Pairs, bands: &BTreeMap<u64, Vec<usize>>, segment_by: SegmentBy) -> Option<Together> {
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
    let rows: Vec<usize> = times.values().copied().collect();
    let times_ms: Vec<i64> = times.into_keys().collect();
    let segments = segments(pairs, &rows, &times_ms, segment_by);
    let wind_m_s = rows.iter().map(|row| pairs.wind_speed_m_s[*row]).collect();
    Some(Together { times_ms, wind_m_s, segments, levels_db })
}

/// The rows of one band by themselves.
fn one_band(pairs: &Pairs, rows: &[usize], segment_by: SegmentBy) -> Together {
    let times_ms: Vec<i64> = rows.iter().map(|row| pairs.time_ms[*row]).collect();
    let pick = |values: &[f64]| -> Vec<f64> { rows.iter().map(|row| values[*row]).collect() };
    Together {
        wind_m_s: pick(&pairs.wind_speed_m_s),
        segments: segments(pairs, rows, &times_ms, segment_by),
        levels_db: vec![pick(&pairs.level_db)],
        times_ms,
    }
}

/// The segments of some rows.
fn segments(pairs: &Pairs, rows: &[usize], times_ms: &[i64], by: SegmentBy) -> Option<SegmentLabels> {
    let column = pairs.deployment.as_ref();
    let codes: Option<Vec<Option<u32>>> =
        column.map(|column| rows.iter().map(|row| Some(column.codes[*row]).filter(|code| *code != u32::MAX)).collect());
    let deployment = codes.as_deref().zip(column.map(|column| column.texts.as_slice()));
    segment_labels(by, times_ms, deployment)
}

fn text_at(column: Option<&TextColumn>, row: usize) -> &str {
    column.map_or("", |column| column.text(row))
}
