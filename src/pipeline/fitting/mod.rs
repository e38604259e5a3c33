//! `fit`: level against wind speed, per source, site, sensor and band.

mod pairs;
mod segments;
mod tables;
mod together;

pub use pairs::fit_pairs;
pub use tables::{relations_json, write_relations};

use super::matching::{Matched, used_levels_db, with_short_events_db};
use super::progress::Progress;
use crate::config::{Study, WindowSpeed};
use crate::model::{Conditions, Fitted, FittedBand, FittedSensor, SensorRecord, WindowWind};
pub(super) use segments::{SegmentLabels, segment_labels};
use together::{Found, Together};

/// The wind speed of a window that the fit uses, m/s; NaN where there is none.
pub(crate) fn wind_speed_m_s(wind: Option<&WindowWind>, which: WindowSpeed) -> f64 {
    wind.map_or(f64::NAN, |wind| match which {
        WindowSpeed::SpeedMean => wind.speed_mean_m_s,
        WindowSpeed::SpeedOfMean => wind.speed_of_mean_m_s,
        WindowSpeed::ScalarSpeedMean => wind.scalar_speed_mean_m_s,
    })
}

/// Fits all bands of all sensors against each wind source, and checks the relations.
pub fn fit_matched(study: &Study, matched: &Matched, progress: &dyn Progress) -> Fitted {
    let total: usize = matched.conditions.iter().map(Vec::len).sum();
    progress.start(total as u64, "fitting");
    let mut fitted = Fitted::default();
    for wind in &study.wind {
        for (record, sources) in matched.records.iter().zip(&matched.conditions) {
            if let Some(conditions) = sources.iter().find(|conditions| conditions.source == wind.id) {
                let together = together(study, record, conditions, 0);
                let mut found = together.fit_and_check(&study.relation.options);
                if let Some(screened) = matched.screened_at(record) {
                    let all = Together { levels_db: with_short_events_db(record, conditions), ..together };
                    found.add_unscreened(all.fit(&study.relation.options));
                    found.screen = Some(screened);
                }
                add(&mut fitted, record, conditions, found);
                progress.advance(1);
            }
        }
    }
    progress.finish();
    fitted
}

/// Fits the bands of one sensor against one wind source, without checks; the level of a window goes with the wind this many
/// windows before it (after it where negative).
pub(super) fn fit_conditions(
    study: &Study,
    record: &SensorRecord,
    conditions: &Conditions,
    lag_windows: i32,
) -> Vec<FittedBand> {
    let mut fitted = Fitted::default();
    let relations = together(study, record, conditions, lag_windows).fit(&study.relation.options);
    add(&mut fitted, record, conditions, Found::unchecked(relations));
    fitted.bands
}

fn together(study: &Study, record: &SensorRecord, conditions: &Conditions, lag_windows: i32) -> Together {
    let times_ms: Vec<i64> = record.windows.iter().map(|window| window.centre().0).collect();
    let wind: Vec<f64> =
        conditions.wind.iter().map(|wind| wind_speed_m_s(wind.as_ref(), study.matching.wind_speed)).collect();
    let wind_m_s = if lag_windows == 0 { wind } else { lagged(&times_ms, &wind, lag_windows) };
    Together { times_ms, wind_m_s, segments: segments_of(study, record), levels_db: used_levels_db(record, conditions) }
}

/// The segments of a sensor's record, as the study has them.
pub(super) fn segments_of(study: &Study, record: &SensorRecord) -> Option<SegmentLabels> {
    let times_ms: Vec<i64> = record.windows.iter().map(|window| window.centre().0).collect();
    let deployment =
        (!record.deployments.is_empty()).then_some((record.deployment.as_slice(), record.deployments.as_slice()));
    segment_labels(study.relation.segment_by, &times_ms, deployment)
}

fn add(fitted: &mut Fitted, record: &SensorRecord, conditions: &Conditions, found: Found) {
    fitted.sensors.push(FittedSensor {
        source: conditions.source.clone(),
        site: record.site.clone(),
        sensor: record.sensor.clone(),
        common_onset: found.common_onset,
        segments: found.segments,
        screen: found.screen,
    });
    fitted.bands.extend(found.bands.into_iter().zip(&record.bands).map(|((relation, checks), band)| FittedBand {
        source: conditions.source.clone(),
        site: record.site.clone(),
        sensor: record.sensor.clone(),
        band: Some(band.band),
        kind: Some(record.kind),
        relation,
        checks,
    }));
}

/// The values of windows that lie a number of usual steps earlier (later where negative); NaN where there is none.
fn lagged(times_ms: &[i64], values: &[f64], steps: i32) -> Vec<f64> {
    let mut gaps_ms: Vec<i64> = times_ms.windows(2).map(|pair| pair[1] - pair[0]).collect();
    gaps_ms.sort_unstable();
    let Some(step_ms) = gaps_ms.get(gaps_ms.len() / 2) else { return vec![f64::NAN; values.len()] };
    let earlier = |time: &i64| times_ms.binary_search(&(time - i64::from(steps) * step_ms)).ok();
    times_ms.iter().map(|time| earlier(time).map_or(f64::NAN, |at| values[at])).collect()
}
