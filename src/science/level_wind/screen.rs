//! A screen for short events that raise many bands at once: passing ships, handling of the instrument.
//!
//! It looks at levels alone, by duration and by coherence over bands, and never at the residual from a wind fit: that would
//! select on the outcome. A squall of a few hours raises many bands too and is marked as well, so the relation with and without
//! the marked rows should be shown side by side.

use crate::model::Screened;
use crate::numerics::quantile::median;

/// Choices of the screen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ScreenOptions {
    /// Length of the window of the running medians, hours; at least four times the longest event.
    pub window_h: f64,
    /// Events longer than this are weather, not ships, hours.
    pub longest_event_h: f64,
    /// A band is raised when it lies this many robust scales above the medians before and after, ...
    pub least_scales: f64,
    /// ... and at least this much, dB.
    pub least_excess_db: f64,
    /// Share of the bands with data that must be raised at once.
    pub least_share_of_bands: f64,
}

impl Default for ScreenOptions {
    fn default() -> Self {
        Self {
            window_h: 24.0,
            longest_event_h: 6.0,
            least_scales: 2.0,
            least_excess_db: 3.0,
            least_share_of_bands: 0.5,
        }
    }
}

/// What the screen found.
#[derive(Debug, Clone, PartialEq)]
pub struct ScreenedEvents {
    /// Whether each row belongs to a short event.
    pub marked: Vec<bool>,
    /// Number of events.
    pub events: usize,
    /// Number of rows that were raised but belong to longer events, which are kept.
    pub kept_rows: usize,
}

impl ScreenedEvents {
    /// How many events and windows that are.
    pub fn summary(&self) -> Screened {
        Screened {
            events: self.events,
            windows: self.marked.iter().filter(|marked| **marked).count(),
            kept_windows: self.kept_rows,
        }
    }
}

/// Marks short events in which most bands are raised at once. Columns are bands, rows are windows in any order; NaN is missing.
/// With fewer than three bands coherence cannot be judged and nothing is marked.
pub fn screen_short_events(times_ms: &[i64], levels_db: &[&[f64]], options: &ScreenOptions) -> ScreenedEvents {
    const LEAST_BANDS: usize = 3;
    let rows = levels_db.iter().map(|levels| levels.len()).min().unwrap_or(0).min(times_ms.len());
    let mut screened = ScreenedEvents { marked: vec![false; times_ms.len()], events: 0, kept_rows: 0 };
    if levels_db.len() < LEAST_BANDS || rows < 2 {
        return screened;
    }
    let mut order: Vec<usize> = (0..rows).collect();
    order.sort_by_key(|&row| times_ms[row]);
    let origin = i128::from(times_ms[order[0]]);
    let hours: Vec<f64> = order.iter().map(|&row| (i128::from(times_ms[row]) - origin) as f64 / 3.6e6).collect();
    let mut raised = vec![0_usize; rows];
    let mut known = vec![0_usize; rows];
    for levels in levels_db {
        let ordered: Vec<f64> = order.iter().map(|&row| levels[row]).collect();
        let excess = excess_over_running_median(&hours, &ordered, options.window_h);
        let absolute: Vec<f64> = excess.iter().filter(|value| value.is_finite()).map(|value| value.abs()).collect();
        let limit = (options.least_scales * 1.4826 * median(&absolute)).max(options.least_excess_db);
        for (position, value) in excess.iter().enumerate().filter(|(_, value)| value.is_finite()) {
            known[position] += 1;
            raised[position] += usize::from(*value > limit);
        }
    }
    let coherent = |position: usize| {
        known[position] >= LEAST_BANDS
            && raised[position] as f64 >= options.least_share_of_bands * known[position] as f64
    };
    let steps: Vec<f64> = hours.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let longest_step_h = 1.5 * median(&steps);
    let mut first = 0;
    while first < rows {
        if !coherent(first) {
            first += 1;
            continue;
        }
        let mut last = first;
        while last + 1 < rows && coherent(last + 1) && hours[last + 1] - hours[last] <= longest_step_h {
            last += 1;
        }
        if hours[last] - hours[first] <= options.longest_event_h {
            screened.events += 1;
            order[first..=last].iter().for_each(|&row| screened.marked[row] = true);
        } else {
            screened.kept_rows += last - first + 1;
        }
        first = last + 1;
    }
    screened
}

/// Level minus the higher of the medians of the half windows before and after it: a ship stands out from both, the onset of a
/// storm only from the one before. Medians are taken on a grid of a sixteenth of the window. NaN where the level is missing.
fn excess_over_running_median(hours: &[f64], level_db: &[f64], window_h: f64) -> Vec<f64> {
    const GRID: f64 = 16.0;
    let step = (window_h / GRID).max(1e-6);
    let median_of = |from: f64, to: f64| -> f64 {
        let start = hours.partition_point(|&hour| hour < from);
        let end = hours.partition_point(|&hour| hour <= to).max(start);
        let values: Vec<f64> = level_db[start..end].iter().copied().filter(|level| level.is_finite()).collect();
        median(&values)
    };
    let mut slot = f64::NAN;
    let (mut before, mut after) = (f64::NAN, f64::NAN);
    hours
        .iter()
        .zip(level_db)
        .map(|(&hour, &level)| {
            if !level.is_finite() {
                return f64::NAN;
            }
            let here = (hour / step).floor();
            if here.to_bits() != slot.to_bits() {
                slot = here;
                before = median_of(here * step - 0.5 * window_h, (here + 1.0) * step);
                after = median_of(here * step, (here + 1.0) * step + 0.5 * window_h);
            }
            level - before.max(after)
        })
        .collect()
}
