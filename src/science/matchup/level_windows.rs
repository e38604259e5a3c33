//! Gathers level samples into windows, in one pass, whatever their order.
//!
//! Memory: one level a window and band, and for a median the samples of the few windows of each band that are still open.

use crate::model::{Band, BandLevels, Deployment, LevelKind, LevelRow, LevelStatistic, Missing, SensorRecord};
use crate::units::{Instant, Window, mean_power_db};
use std::collections::{HashMap, VecDeque};

/// Windows of one band that may still receive samples before the oldest is closed.
const OPEN_WINDOWS: usize = 4;

/// Which sensor a record belongs to.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct SensorKey {
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
}

/// Why samples could not be gathered.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum LevelWindowsError {
    /// A sample came for a window whose median was already taken.
    #[error(
        "row {row}: this sample at {time} comes too late for the median of its window, which ended before rows already read; expected rows in order of time within each band (sort the table, or set `match.statistic = \"power_mean\"`)"
    )]
    TooLate {
        /// Line or row of the sample.
        row: u64,
        /// Start of the sample.
        time: Instant,
    },
}

/// Gathers samples. Feed it with [`push`](Self::push), then take the records.
#[derive(Debug)]
pub struct LevelWindows {
    statistic: LevelStatistic,
    window_ms: Option<i64>,
    sensors: Vec<(SensorKey, Gathered)>,
}

/// Number of a sensor's band within one [`LevelWindows`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BandNumber {
    sensor: usize,
    band: usize,
}

#[derive(Debug)]
struct Gathered {
    kind: LevelKind,
    windows: HashMap<Window, u32>,
    order: Vec<Window>,
    last: Option<(Window, u32)>,
    bands: Vec<GatheredBand>,
}

/// What is known of each window of a band, one entry a window in the order in which windows were first met.
#[derive(Debug)]
struct GatheredBand {
    band: Band,
    /// Level so far: the one sample's, or the finished statistic; for a power mean the level of the summed power.
    level_db: Vec<f64>,
    reason: Vec<Option<Missing>>,
    /// Number and seconds of samples; kept only where samples are gathered.
    samples: Vec<u32>,
    seconds: Vec<f32>,
    open: VecDeque<(u32, Vec<f64>)>,
    last_sample: Option<Window>,
}

impl LevelWindows {
    /// With `window_ms`, samples are gathered into windows of that length that start at whole multiples of it since 1970;
    /// a sample belongs to the window that holds its centre. Without, every sample's own span is a window.
    pub fn new(statistic: LevelStatistic, window_ms: Option<i64>) -> Self {
        Self { statistic, window_ms, sensors: Vec::new() }
    }

    /// Number for a sensor's band, to be used in [`push`](Self::push). The same sensor and band again give the same number.
    pub fn band(&mut self, key: &SensorKey, kind: LevelKind, band: Band) -> BandNumber {
        let sensor = self.sensors.iter().position(|(known, _)| known == key).unwrap_or_else(|| {
            let empty = Gathered { kind, windows: HashMap::new(), order: Vec::new(), last: None, bands: Vec::new() };
            self.sensors.push((key.clone(), empty));
            self.sensors.len() - 1
        });
        let bands = &mut self.sensors[sensor].1.bands;
        let band = bands.iter().position(|other| other.band.same_as(band)).unwrap_or_else(|| {
            bands.push(GatheredBand::new(band));
            bands.len() - 1
        });
        BandNumber { sensor, band }
    }

    /// Adds a sample of a sensor's band (numbered by [`band`](Self::band)).
    ///
    /// Returns why the sample is not used, where it is not.
    ///
    /// # Errors
    /// When a median is asked for and the sample comes too late for its window.
    pub fn push(&mut self, number: BandNumber, row: &LevelRow) -> Result<Option<Missing>, LevelWindowsError> {
        let window = match self.window_ms {
            None => row.window,
            Some(length) => {
                let start = row.window.centre().0.div_euclid(length) * length;
                Window { start: Instant(start), end: Instant(start + length) }
            }
        };
        let statistic = self.statistic;
        let gathers = self.window_ms.is_some();
        let gathered = &mut self.sensors[number.sensor].1;
        let index = gathered.index_of(window);
        let band = &mut gathered.bands[number.band];
        band.reach(index as usize, gathers);
        let reason = row.reason.or_else(|| (!row.level_db.is_finite()).then_some(Missing::NotFinite)).or_else(|| {
            // The same span twice is the same sample twice; only neighbours can be compared in one pass when gathering.
            let again =
                if gathers { band.last_sample == Some(row.window) } else { band.reason[index as usize].is_none() };
            again.then_some(Missing::DuplicateRow)
        });
        if let Some(reason) = reason {
            let known = &mut band.reason[index as usize];
            if *known == Some(Missing::NoLevel) {
                *known = Some(reason);
            }
            return Ok(Some(reason));
        }
        band.last_sample = Some(row.window);
        if gathers {
            band.gather(index, row, statistic)?;
        } else {
            band.level_db[index as usize] = row.level_db;
            band.reason[index as usize] = None;
        }
        Ok(None)
    }

    /// The finished records, in order of site and sensor; windows in order of time, bands in order of frequency.
    /// `describe` gives depth and deployments of a sensor.
    pub fn finish(mut self, describe: impl Fn(&SensorKey) -> (Option<f64>, Vec<Deployment>)) -> Vec<SensorRecord> {
        let statistic = self.statistic;
        let gathers = self.window_ms.is_some();
        self.sensors.sort_by(|a, b| a.0.cmp(&b.0));
        self.sensors
            .into_iter()
            .map(|(key, gathered)| {
                let (depth_m, deployments) = describe(&key);
                gathered.finish(key, statistic, gathers, depth_m, &deployments)
            })
            .collect()
    }
}

impl Gathered {
    fn index_of(&mut self, window: Window) -> u32 {
        if let Some((last, index)) = self.last
            && last == window
        {
            return index;
        }
        let next = self.order.len() as u32;
        let index = *self.windows.entry(window).or_insert(next);
        if index == next {
            self.order.push(window);
        }
        self.last = Some((window, index));
        index
    }

    fn finish(
        self,
        key: SensorKey,
        statistic: LevelStatistic,
        gathers: bool,
        depth_m: Option<f64>,
        deployments: &[Deployment],
    ) -> SensorRecord {
        let mut order: Vec<u32> = (0..self.order.len() as u32).collect();
        order.sort_unstable_by_key(|&k| self.order[k as usize]);
        let windows: Vec<Window> = order.iter().map(|&k| self.order[k as usize]).collect();
        let mut bands: Vec<BandLevels> =
            self.bands.into_iter().map(|band| band.finish(&order, statistic, gathers)).collect();
        bands.sort_by(|a, b| a.band.centre_hz.total_cmp(&b.band.centre_hz));
        let deployment = windows
            .iter()
            .map(|window| {
                if deployments.is_empty() {
                    return Some(0);
                }
                // A window belongs to a deployment only as a whole: half of it may be handling.
                deployments
                    .iter()
                    .position(|d| window.start >= d.window.start && window.end <= d.window.end)
                    .map(|index| index as u32)
            })
            .collect();
        SensorRecord {
            site: key.site,
            sensor: key.sensor,
            depth_m,
            kind: self.kind,
            statistic,
            windows,
            deployment,
            deployments: deployments.iter().map(|d| d.id.clone()).collect(),
            bands,
        }
    }
}

impl GatheredBand {
    fn new(band: Band) -> Self {
        Self {
            band,
            level_db: Vec::new(),
            reason: Vec::new(),
            samples: Vec::new(),
            seconds: Vec::new(),
            open: VecDeque::new(),
            last_sample: None,
        }
    }

    /// Makes room for a window. Grows by a quarter and not by doubling: long records of many bands would waste as much again.
    fn reach(&mut self, index: usize, gathers: bool) {
        if index < self.level_db.len() {
            return;
        }
        if index >= self.level_db.capacity() {
            let more = index + 1 - self.level_db.len() + index / 4 + 64;
            self.level_db.reserve_exact(more);
            self.reason.reserve_exact(more);
        }
        self.level_db.resize(index + 1, f64::NAN);
        self.reason.resize(index + 1, Some(Missing::NoLevel));
        if gathers {
            self.samples.resize(index + 1, 0);
            self.seconds.resize(index + 1, 0.0);
        }
    }

    fn gather(&mut self, index: u32, row: &LevelRow, statistic: LevelStatistic) -> Result<(), LevelWindowsError> {
        let at = index as usize;
        self.reason[at] = None;
        self.samples[at] += 1;
        self.seconds[at] += row.window.length_ms() as f32 / 1e3;
        if self.samples[at] == 1 {
            self.level_db[at] = row.level_db;
            return Ok(());
        }
        match statistic {
            LevelStatistic::PowerMean => {
                // Level of the power summed so far; divided by the count at the end.
                let pair = mean_power_db(&[self.level_db[at], row.level_db]).expect("two levels");
                self.level_db[at] = pair + 10.0 * std::f64::consts::LOG10_2;
            }
            LevelStatistic::Median => {
                if self.samples[at] == 2 {
                    if self.open.len() == OPEN_WINDOWS {
                        let (oldest, samples) = self.open.pop_front().expect("a full queue has a front");
                        self.level_db[oldest as usize] = median_db(samples);
                    }
                    self.open.push_back((index, vec![self.level_db[at]]));
                }
                match self.open.iter_mut().rev().find(|(open, _)| *open == index) {
                    Some((_, samples)) => samples.push(row.level_db),
                    None => return Err(LevelWindowsError::TooLate { row: row.row, time: row.window.start }),
                }
            }
        }
        Ok(())
    }

    fn finish(mut self, order: &[u32], statistic: LevelStatistic, gathers: bool) -> BandLevels {
        for (index, samples) in std::mem::take(&mut self.open) {
            self.level_db[index as usize] = median_db(samples);
        }
        if statistic == LevelStatistic::PowerMean {
            for (level, samples) in self.level_db.iter_mut().zip(&self.samples) {
                if *samples > 1 {
                    *level -= 10.0 * libm::log10(f64::from(*samples));
                }
            }
        }
        if let Some(last) = order.len().checked_sub(1) {
            self.reach(last, gathers);
        }
        let in_order = order.iter().enumerate().all(|(k, index)| k == *index as usize);
        BandLevels {
            band: self.band,
            level_db: arranged(self.level_db, order, in_order),
            samples: arranged(self.samples, order, in_order || !gathers),
            seconds: arranged(self.seconds, order, in_order || !gathers),
            reason: arranged(self.reason, order, in_order),
        }
    }
}

/// Values in a new order, without spare room; as they are where the order is theirs already.
fn arranged<T: Copy>(mut values: Vec<T>, order: &[u32], as_they_are: bool) -> Vec<T> {
    if as_they_are {
        values.shrink_to_fit();
        return values;
    }
    order.iter().map(|index| values[*index as usize]).collect()
}

/// Median of levels; the middle two are averaged in decibels.
fn median_db(mut levels: Vec<f64>) -> f64 {
    levels.sort_unstable_by(f64::total_cmp);
    let middle = levels.len() / 2;
    match levels.len() {
        0 => f64::NAN,
        n if n % 2 == 1 => levels[middle],
        _ => 0.5 * (levels[middle - 1] + levels[middle]),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn key() -> SensorKey {
        SensorKey { site: "A".into(), sensor: "A1".into() }
    }

    fn band() -> Band {
        Band::from_edges(50.0, 100.0).unwrap()
    }

    fn row(second: i64, level_db: f64) -> LevelRow {
        let window = Window { start: Instant(second * 1000), end: Instant((second + 1) * 1000) };
        LevelRow { site: 0, band: 0, window, level_db, row: second as u64, reason: None }
    }

    fn gather(statistic: LevelStatistic, rows: &[LevelRow]) -> SensorRecord {
        let mut windows = LevelWindows::new(statistic, Some(10_000));
        let number = windows.band(&key(), LevelKind::BandLevel, band());
        for row in rows {
            windows.push(number, row).unwrap();
        }
        windows.finish(|_| (None, Vec::new())).remove(0)
    }

    #[test]
    fn one_loud_sample_moves_the_power_mean_and_not_the_median() {
        // Nine samples at 60 dB and one at 100 dB: power mean = 10 log10((9e6 + 1e10)/10) = 90.0039 dB (closed form).
        let rows: Vec<LevelRow> = (0..10).map(|s| row(s, if s == 4 { 100.0 } else { 60.0 })).collect();
        assert!((gather(LevelStatistic::Median, &rows).bands[0].level_db[0] - 60.0).abs() < 1e-12);
        let power = gather(LevelStatistic::PowerMean, &rows);
        assert!((power.bands[0].level_db[0] - 90.003_907_3).abs() < 1e-6, "{:?}", power.bands[0].level_db);
        assert_eq!(power.bands[0].samples, [10]);
        assert_eq!(power.bands[0].seconds, [10.0]);
    }

    #[test]
    fn order_of_windows_does_not_matter_for_samples_that_come_together() {
        let mut rows: Vec<LevelRow> = (0..30).map(|s| row(s, s as f64)).collect();
        let forward = gather(LevelStatistic::Median, &rows);
        rows.reverse();
        assert_eq!(gather(LevelStatistic::Median, &rows), forward);
        assert_eq!(forward.bands[0].level_db, [4.5, 14.5, 24.5]);
    }

    #[test]
    fn a_sample_too_late_for_a_median_is_an_error_and_not_a_wrong_number() {
        let mut windows = LevelWindows::new(LevelStatistic::Median, Some(10_000));
        let number = windows.band(&key(), LevelKind::BandLevel, band());
        for second in 0..100 {
            windows.push(number, &row(second, 60.0)).unwrap();
        }
        let mut late = row(5, 70.0);
        late.window.end = late.window.end.plus_ms(1);
        let error = windows.push(number, &late).unwrap_err();
        assert!(error.to_string().starts_with("row 5: this sample at 1970-01-01T00:00:05Z comes too late"), "{error}");
    }

    #[test]
    fn a_second_row_for_the_same_window_is_named_a_duplicate_and_the_first_counts() {
        let mut windows = LevelWindows::new(LevelStatistic::Median, None);
        let number = windows.band(&key(), LevelKind::BandLevel, band());
        assert_eq!(windows.push(number, &row(3, 60.0)), Ok(None));
        assert_eq!(windows.push(number, &row(3, 61.0)), Ok(Some(Missing::DuplicateRow)));
        assert_eq!(windows.push(number, &row(1, f64::NAN)), Ok(Some(Missing::NotFinite)));
        let record = windows.finish(|_| (None, Vec::new())).remove(0);
        assert_eq!(record.windows.len(), 2);
        assert!(record.bands[0].level_db[0].is_nan());
        assert_eq!(record.bands[0].reason, [Some(Missing::NotFinite), None]);
        assert!((record.bands[0].level_db[1] - 60.0).abs() < 1e-12);
    }

    #[test]
    fn a_window_that_leaves_its_deployment_belongs_to_none() {
        let mut windows = LevelWindows::new(LevelStatistic::Median, None);
        let number = windows.band(&key(), LevelKind::BandLevel, band());
        for second in 0..4 {
            windows.push(number, &row(second, 60.0)).unwrap();
        }
        let deployment = Deployment { id: "first".into(), window: Window { start: Instant(1000), end: Instant(3500) } };
        let record = windows.finish(|_| (Some(30.0), vec![deployment.clone()])).remove(0);
        assert_eq!(record.deployment, [None, Some(0), Some(0), None]);
    }
}
