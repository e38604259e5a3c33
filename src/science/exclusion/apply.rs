//! Rules applied to the pairs of one sensor and wind source.

use super::expression::Expression;
use crate::model::{Band, BandLevels, Conditions, Exclusion, SensorRecord, WindowWind};
use crate::units::Window;

/// Columns that conditions may use. Those up to `year` belong to the window, the others to the band as well.
pub const RULE_COLUMNS: [&str; 12] = [
    "wind_speed_mean_m_s",
    "wind_speed_of_mean_m_s",
    "scalar_wind_speed_mean_m_s",
    "wind_from_direction_deg",
    "hour_utc",
    "month",
    "year",
    "level_db",
    "level_samples",
    "level_seconds",
    "band_centre_hz",
    "window_s",
];

/// First column that differs between bands.
const FIRST_OF_BAND: usize = 7;

/// A rule of the study.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// Sites that it applies to; empty: all.
    pub sites: Vec<String>,
    /// Sensors that it applies to; empty: all.
    pub sensors: Vec<String>,
    /// What is left out.
    pub kind: RuleKind,
}

/// What a rule leaves out.
#[derive(Debug, Clone, PartialEq)]
pub enum RuleKind {
    /// Pairs for which a condition on [`RULE_COLUMNS`] is true.
    Condition(Expression),
    /// Windows that overlap one of these intervals.
    Intervals(Vec<Interval>),
}

/// A span of time to leave out.
#[derive(Debug, Clone, PartialEq)]
pub struct Interval {
    /// The span, half open.
    pub window: Window,
    /// Site; empty: all.
    pub site: String,
    /// Sensor; empty: all.
    pub sensor: String,
    /// Frequencies from and to, Hz; a band that overlaps them is left out. `None`: all bands.
    pub band_hz: Option<(f64, f64)>,
}

/// For each window and band of a record, the number of the first rule that leaves it out.
pub fn exclude(record: &SensorRecord, conditions: &Conditions, rules: &[&Rule]) -> Exclusion {
    let bands = record.bands.len();
    let mut exclusion = Exclusion::none(record.windows.len(), bands, rules.len());
    let here = |list: &[String], name: &str| list.is_empty() || list.iter().any(|known| known == name);
    for (number, rule) in rules.iter().enumerate() {
        if !here(&rule.sites, &record.site) || !here(&rule.sensors, &record.sensor) {
            continue;
        }
        match &rule.kind {
            RuleKind::Condition(condition) => by_condition(record, conditions, condition, number, &mut exclusion),
            RuleKind::Intervals(intervals) => by_intervals(record, intervals, number, &mut exclusion),
        }
    }
    exclusion
}

fn by_condition(
    record: &SensorRecord,
    conditions: &Conditions,
    condition: &Expression,
    number: usize,
    exclusion: &mut Exclusion,
) {
    let of_band = condition.columns().iter().any(|column| *column >= FIRST_OF_BAND);
    for k in 0..record.windows.len() {
        let window = |column: usize| of_window(record, conditions, k, column);
        if of_band {
            for (index, band) in record.bands.iter().enumerate() {
                let value = |column: usize| {
                    if column < FIRST_OF_BAND { window(column) } else { of_level(record, band, k, column) }
                };
                if condition.holds(&value) {
                    exclusion.mark(k, index, number);
                }
            }
        } else if condition.holds(&window) {
            (0..record.bands.len()).for_each(|index| exclusion.mark(k, index, number));
        }
    }
}

fn of_window(record: &SensorRecord, conditions: &Conditions, k: usize, column: usize) -> f64 {
    let wind = conditions.wind[k].as_ref();
    let calendar = || record.windows[k].centre().year_month_hour();
    match column {
        0 => wind.map_or(f64::NAN, |wind| wind.speed_mean_m_s),
        1 => wind.map_or(f64::NAN, |wind| wind.speed_of_mean_m_s),
        2 => wind.map_or(f64::NAN, |wind| wind.scalar_speed_mean_m_s),
        3 => wind.map_or(f64::NAN, WindowWind::from_direction_deg),
        4 => calendar().map_or(f64::NAN, |(_, _, hour)| hour),
        5 => calendar().map_or(f64::NAN, |(_, month, _)| f64::from(month)),
        _ => calendar().map_or(f64::NAN, |(year, _, _)| f64::from(year)),
    }
}

fn of_level(record: &SensorRecord, band: &BandLevels, k: usize, column: usize) -> f64 {
    let length_s = record.windows[k].length_ms() as f64 / 1e3;
    match column {
        7 => band.level_db[k],
        8 => f64::from(band.samples_at(k)),
        9 => band.seconds_at(k, length_s),
        10 => band.band.centre_hz,
        _ => length_s,
    }
}

fn by_intervals(record: &SensorRecord, intervals: &[Interval], number: usize, exclusion: &mut Exclusion) {
    let overlaps = |band: Band, range: Option<(f64, f64)>| {
        range.is_none_or(|(low, high)| band.low_hz < high && low < band.high_hz)
    };
    // Windows are in order of their start, and of one length or nearly so.
    let longest_ms = record.windows.iter().map(|window| window.length_ms()).max().unwrap_or(0);
    for interval in intervals {
        if !(interval.site.is_empty() || interval.site == record.site)
            || !(interval.sensor.is_empty() || interval.sensor == record.sensor)
        {
            continue;
        }
        let span = interval.window;
        let first = record.windows.partition_point(|window| window.start.0 < span.start.0 - longest_ms);
        for (k, window) in record.windows.iter().enumerate().skip(first) {
            if window.start >= span.end {
                break;
            }
            // An instant inside counts as well as a span that overlaps.
            let inside = window.end > span.start || (window.length_ms() == 0 && window.start >= span.start);
            if inside {
                for (index, band) in record.bands.iter().enumerate() {
                    if overlaps(band.band, interval.band_hz) {
                        exclusion.mark(k, index, number);
                    }
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{LevelKind, LevelStatistic, SourceId};
    use crate::units::Instant;

    fn hour(k: i64) -> Instant {
        Instant(k * 3_600_000)
    }

    /// Ten hours from 1970-01-01, two bands; wind speed and level rise by one an hour.
    fn record() -> (SensorRecord, Conditions) {
        let level_db: Vec<f64> = (0..10).map(|k| 60.0 + f64::from(k)).collect();
        let band = |low, high| BandLevels {
            band: Band::from_edges(low, high).unwrap(),
            level_db: level_db.clone(),
            samples: Vec::new(),
            seconds: Vec::new(),
            reason: vec![None; 10],
        };
        let record = SensorRecord {
            site: "A".into(),
            sensor: "1".into(),
            depth_m: None,
            kind: LevelKind::BandLevel,
            statistic: LevelStatistic::Median,
            windows: (0..10).map(|k| Window { start: hour(k), end: hour(k + 1) }).collect(),
            deployment: vec![Some(0); 10],
            deployments: Vec::new(),
            bands: vec![band(50.0, 100.0), band(500.0, 1000.0)],
        };
        let wind = |k: i32| WindowWind {
            eastward_mean_m_s: 0.0,
            northward_mean_m_s: -f64::from(k),
            speed_mean_m_s: f64::from(k),
            speed_of_mean_m_s: f64::from(k),
            scalar_speed_mean_m_s: f64::from(k),
            step_bridged_s: 3600.0,
        };
        let mut conditions = Conditions::empty(SourceId("m".into()), "A".into(), 10);
        conditions.wind = (0..10).map(|k| (k != 4).then(|| wind(k))).collect();
        (record, conditions)
    }

    fn excluded(kind: RuleKind) -> Vec<(usize, usize)> {
        let (record, conditions) = record();
        let rule = Rule { sites: Vec::new(), sensors: Vec::new(), kind };
        let exclusion = exclude(&record, &conditions, &[&rule]);
        (0..10).flat_map(|k| (0..2).map(move |b| (k, b))).filter(|(k, b)| exclusion.rule(*k, *b).is_some()).collect()
    }

    fn condition(text: &str) -> RuleKind {
        RuleKind::Condition(Expression::parse(text, &RULE_COLUMNS).unwrap())
    }

    #[test]
    fn conditions_leave_out_windows_or_single_bands() {
        let both = |windows: &[usize]| windows.iter().flat_map(|k| [(*k, 0), (*k, 1)]).collect::<Vec<_>>();
        // Window 4 has no wind: the condition is neither true nor false there.
        assert_eq!(excluded(condition("wind_speed_mean_m_s > 2")), both(&[3, 5, 6, 7, 8, 9]));
        assert_eq!(excluded(condition("wind_speed_mean_m_s is missing")), both(&[4]));
        // A wind to the south comes from the north.
        assert_eq!(excluded(condition("wind_from_direction_deg < 1 and hour_utc > 8")), both(&[8, 9]));
        assert_eq!(excluded(condition("level_db >= 68 and band_centre_hz < 200")), [(8, 0), (9, 0)]);
        assert_eq!(excluded(condition("month = 1 and year = 1970 and window_s = 3600 and hour_utc < 1")), both(&[0]));
    }

    #[test]
    fn intervals_leave_out_what_they_touch() {
        let interval = |start: i64, end: i64, band_hz| Interval {
            window: Window { start: Instant(start), end: Instant(end) },
            site: String::new(),
            sensor: "1".into(),
            band_hz,
        };
        let minute = 60_000;
        let touched = vec![
            interval(150 * minute, 180 * minute, None),
            interval(545 * minute, 550 * minute, Some((600.0, 700.0))),
        ];
        assert_eq!(excluded(RuleKind::Intervals(touched)), [(2, 0), (2, 1), (9, 1)]);
        let elsewhere = Interval { site: "B".into(), ..interval(0, 600 * minute, None) };
        assert!(excluded(RuleKind::Intervals(vec![elsewhere])).is_empty());
    }

    #[test]
    fn the_first_rule_counts() {
        let (record, conditions) = record();
        let rule = |text: &str| Rule { sites: vec!["A".into()], sensors: Vec::new(), kind: condition(text) };
        let (first, second) = (rule("hour_utc < 2"), rule("hour_utc < 4"));
        let exclusion = exclude(&record, &conditions, &[&first, &second]);
        let rules: Vec<Option<usize>> = (0..5).map(|k| exclusion.rule(k, 0)).collect();
        assert_eq!(rules, [Some(0), Some(0), Some(1), Some(1), None]);
    }
}
