//! Matchups: one row per source, site, sensor, window and band.

use super::conditions::push_windows;
use super::sampled::repeated;
use crate::model::{
    BandLevels, ColumnData, Conditions, LevelKind, LevelStatistic, Missing, SeaRows, SensorRecord, Table, WindowWind,
};
use std::ops::Range;

/// The rows of one source and sensor for a run of windows; bands vary fastest. `rules`: the reason of each rule of the study.
///
/// # Panics
/// When the conditions are of other windows: a defect in the caller.
pub fn matchups_table(
    record: &SensorRecord,
    conditions: &Conditions,
    sea: Option<&SeaRows<'_>>,
    rules: &[String],
    windows: Range<usize>,
) -> Table {
    assert_eq!(record.windows.len(), conditions.wind.len(), "conditions of other windows");
    let bands = record.bands.len();
    let rows = windows.len() * bands;
    let each = |window: &dyn Fn(usize) -> f64| -> ColumnData {
        let mut values = Vec::with_capacity(rows);
        for k in windows.clone() {
            values.resize(values.len() + bands, window(k));
        }
        ColumnData::Number(values)
    };
    let cells = |cell: &dyn Fn(&BandLevels, usize) -> f64| -> ColumnData {
        let mut values = Vec::with_capacity(rows);
        for k in windows.clone() {
            values.extend(record.bands.iter().map(|band| cell(band, k)));
        }
        ColumnData::Number(values)
    };
    let wind = |pick: fn(&WindowWind) -> f64| each(&|k| conditions.wind[k].as_ref().map_or(f64::NAN, pick));

    let mut table = Table::default();
    table.push("source", "", "id of the wind input", repeated(&conditions.source.0, rows));
    table.push("site", "", "id of the site", repeated(&record.site, rows));
    table.push("sensor", "", "id of the sensor", repeated(&record.sensor, rows));
    table.push(
        "deployment",
        "",
        "id of the sensor's deployment that holds the whole window",
        deployments(record, &windows),
    );
    push_windows(&mut table, windows.clone().flat_map(|k| std::iter::repeat_n(record.windows[k], bands)));
    table.push("band_centre_hz", "Hz", "mid-band frequency of the sound", cells(&|band, _| band.band.centre_hz));
    table.push("band_low_hz", "Hz", "lower edge of the band", cells(&|band, _| band.band.low_hz));
    table.push("band_high_hz", "Hz", "upper edge of the band", cells(&|band, _| band.band.high_hz));
    table.push(
        level_name(record.kind),
        record.kind.unit(),
        level_meaning(record.kind),
        cells(&|band, k| band.level_db[k]),
    );
    table.push(
        "level_statistic",
        "",
        "statistic that stands for the samples of the window",
        repeated(statistic_name(record.statistic), rows),
    );
    table.push(
        "level_samples",
        "1",
        "number of level samples behind the level",
        ColumnData::Integer(
            windows.clone().flat_map(|k| record.bands.iter().map(move |band| i64::from(band.samples_at(k)))).collect(),
        ),
    );
    table.push(
        "level_seconds",
        "s",
        "time that the level samples cover",
        cells(&|band, k| band.seconds_at(k, record.windows[k].length_ms() as f64 / 1e3)),
    );
    table.push(
        "wind_speed_mean_m_s",
        "m s-1",
        "mean over the window of the speed of the interpolated components",
        wind(|w| w.speed_mean_m_s),
    );
    table.push("wind_speed_of_mean_m_s", "m s-1", "speed of the mean components", wind(|w| w.speed_of_mean_m_s));
    table.push(
        "scalar_wind_speed_mean_m_s",
        "m s-1",
        "mean over the window of the speed interpolated in space as a scalar",
        wind(|w| w.scalar_speed_mean_m_s),
    );
    table.push(
        "wind_from_direction_deg",
        "degree",
        "direction that the mean wind comes from, clockwise from true north",
        wind(WindowWind::from_direction_deg),
    );
    if let Some(sea) = sea {
        super::sea::push_matchups(&mut table, record, sea);
    }
    push_use(&mut table, record, conditions, rules, windows);
    table
}

fn push_use(
    table: &mut Table,
    record: &SensorRecord,
    conditions: &Conditions,
    rules: &[String],
    windows: Range<usize>,
) {
    let rows = windows.len() * record.bands.len();
    let mut used = Vec::with_capacity(rows);
    let mut codes = Vec::with_capacity(rows);
    let mut flag_texts = Vec::new();
    let mut flag_codes = Vec::with_capacity(rows);
    let mut rule_codes = Vec::with_capacity(if rules.is_empty() { 0 } else { rows });
    for k in windows {
        let names = conditions.flags[k].names();
        let flag_code = if names.is_empty() {
            u32::MAX
        } else {
            flag_texts.iter().position(|known| *known == names).unwrap_or_else(|| {
                flag_texts.push(names);
                flag_texts.len() - 1
            }) as u32
        };
        for band in 0..record.bands.len() {
            let reason = conditions.pair_reason(record, band, k);
            if !rules.is_empty() {
                let rule = conditions.exclusion.rule(k, band).filter(|_| reason == Some(Missing::Excluded));
                rule_codes.push(rule.map_or(u32::MAX, |rule| rule as u32));
            }
            used.push(reason.is_none());
            codes.push(reason.map_or(u32::MAX, |why| why as u32));
            flag_codes.push(flag_code);
        }
    }
    let texts = Missing::ALL.iter().map(|why| why.name().to_owned()).collect();
    table.push(
        "flags",
        "",
        "remarks on the wind, names joined by a space",
        ColumnData::Text { texts: flag_texts, codes: flag_codes },
    );
    table.push("use", "", "whether the pair goes into the fit", ColumnData::Truth(used));
    table.push("reason", "", "why the pair does not go into the fit", ColumnData::Text { texts, codes });
    if !rules.is_empty() {
        let data = ColumnData::Text { texts: rules.to_vec(), codes: rule_codes };
        table.push("excluded_by", "", "the study's rule that leaves the pair out, by its reason", data);
    }
}

fn deployments(record: &SensorRecord, windows: &Range<usize>) -> ColumnData {
    let codes = windows
        .clone()
        .flat_map(|k| {
            let code = record.deployment[k].filter(|_| !record.deployments.is_empty()).unwrap_or(u32::MAX);
            std::iter::repeat_n(code, record.bands.len())
        })
        .collect();
    ColumnData::Text { texts: record.deployments.clone(), codes }
}

/// Name of the level column: it says what the level describes.
pub(crate) fn level_name(kind: LevelKind) -> &'static str {
    match kind {
        LevelKind::BandLevel => "band_level_db",
        LevelKind::SpectralDensityLevel => "spectral_density_level_db",
    }
}

fn level_meaning(kind: LevelKind) -> &'static str {
    match kind {
        LevelKind::BandLevel => "level of the mean-square sound pressure in the band",
        LevelKind::SpectralDensityLevel => "level of the mean-square sound pressure spectral density in the band",
    }
}

fn statistic_name(statistic: LevelStatistic) -> &'static str {
    match statistic {
        LevelStatistic::Median => "median",
        LevelStatistic::PowerMean => "power_mean",
    }
}
