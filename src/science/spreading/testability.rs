//! Where and when sound could judge spreading at all, before anything is compared.

use super::laws::LawTable;
use super::options::SpreadOptions;
use super::windows::{BandWindows, Floor, ModelWindows, comparable};
use crate::model::{NotIdentified, Testability};
use std::collections::BTreeMap;

#[derive(Default)]
struct Month {
    windows: usize,
    testable: usize,
    reasons: BTreeMap<NotIdentified, usize>,
}

/// Share of the windows of each month in which sound could judge the spreading of a model. `month_of` gives year and month
/// of an instant (ms since 1970).
pub fn testability(
    windows: &BandWindows<'_>,
    model: &ModelWindows<'_>,
    laws: &LawTable,
    options: &SpreadOptions,
    month_of: impl Fn(i64) -> (i32, u32),
) -> Vec<Testability> {
    let floor = Floor::of(windows);
    let mut months: BTreeMap<(i32, u32), Month> = BTreeMap::new();
    for (i, time) in windows.times_ms.iter().enumerate() {
        if !windows.level_db[i].is_finite() {
            continue;
        }
        let month = months.entry(month_of(*time)).or_default();
        month.windows += 1;
        match judged(windows, model, laws, options, floor, i) {
            Ok(()) => month.testable += 1,
            Err(why) => *month.reasons.entry(why).or_insert(0) += 1,
        }
    }
    months
        .into_iter()
        .map(|(month, Month { windows: count, testable, reasons })| {
            let mut reasons: Vec<_> = reasons.into_iter().collect();
            reasons.sort_by_key(|(why, count)| (std::cmp::Reverse(*count), *why));
            Testability { month, band: windows.band, windows: count, testable, reasons }
        })
        .collect()
}

/// Whether sound could judge one window, or the first reason why not.
fn judged(
    windows: &BandWindows<'_>,
    model: &ModelWindows<'_>,
    laws: &LawTable,
    options: &SpreadOptions,
    floor: Floor,
    i: usize,
) -> Result<(), NotIdentified> {
    let x = model.f_over_fp[i];
    comparable(&model.radiated[i], x)?;
    if x < options.least_x {
        return Err(NotIdentified::BelowPeak);
    }
    if x >= options.reference().x_low || laws.range_db(x) < options.least_law_range_db {
        return Err(NotIdentified::LawsAgree);
    }
    if windows.level_db[i] < floor.level_db + options.floor_margin_db {
        return Err(floor.reason);
    }
    Ok(())
}
