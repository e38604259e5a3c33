//! Ticks of a time axis by the real calendar, in UTC.

use chrono::{DateTime, Datelike, Months, NaiveDate, NaiveDateTime, TimeDelta};

use super::axis::label_width;

/// A calendar tick: the upper label at every tick, the lower one only where the larger unit begins.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct DateTick {
    pub ms: i64,
    pub label: String,
    pub under: Option<String>,
}

#[derive(Debug, Clone, Copy)]
enum Step {
    Minutes(i64),
    Hours(i64),
    /// Days of the month 1, 1 + n, ..., not closer than n to the next first.
    Days(u32),
    Months(u32),
    Years(i32),
}

const STEPS: [Step; 21] = [
    Step::Minutes(1),
    Step::Minutes(5),
    Step::Minutes(10),
    Step::Minutes(30),
    Step::Hours(1),
    Step::Hours(3),
    Step::Hours(6),
    Step::Hours(12),
    Step::Days(1),
    Step::Days(2),
    Step::Days(5),
    Step::Days(10),
    Step::Days(15),
    Step::Months(1),
    Step::Months(2),
    Step::Months(3),
    Step::Months(6),
    Step::Years(1),
    Step::Years(2),
    Step::Years(5),
    Step::Years(10),
];
const MOST_TICKS: usize = 80;
const MONTHS: [&str; 12] = ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];

/// Ticks from start to end (ms since 1970, UTC) for an axis of this length; the finest step whose labels fit.
pub(crate) fn ticks(start_ms: i64, end_ms: i64, length_px: f64) -> Vec<DateTick> {
    let (Some(start), Some(end)) = (date_time(start_ms), date_time(end_ms)) else {
        return Vec::new();
    };
    if end <= start || !length_px.is_finite() {
        return Vec::new();
    }
    let per_ms = length_px / (end_ms - start_ms) as f64;
    for step in STEPS {
        let Some(instants) = instants(start, end, step) else { continue };
        let mut ticks: Vec<DateTick> = Vec::with_capacity(instants.len());
        let mut before: Option<NaiveDateTime> = None;
        for at in instants {
            let under = before.is_none_or(|b| larger_unit(step, b) != larger_unit(step, at));
            ticks.push(DateTick {
                ms: at.and_utc().timestamp_millis(),
                label: label(step, at),
                under: under.then(|| larger_unit(step, at)).filter(|text| !text.is_empty()),
            });
            before = Some(at);
        }
        // Half of the text is centred on each side of a tick; the lower row must fit as well.
        let fits = |picked: Vec<(i64, f64)>, gap: f64| {
            picked.windows(2).all(|p| (p[1].0 - p[0].0) as f64 * per_ms >= f64::midpoint(p[0].1, p[1].1) + gap)
        };
        let upper = ticks.iter().map(|t| (t.ms, label_width(&t.label))).collect();
        let lower: Vec<_> = ticks.iter().filter_map(|t| Some((t.ms, label_width(t.under.as_ref()?)))).collect();
        // The first lower label may begin late and be dropped when the next comes at once.
        if fits(upper, 10.0) && !ticks.is_empty() {
            if !fits(lower.clone(), 8.0) {
                if !fits(lower[1..].to_vec(), 8.0) {
                    continue;
                }
                if let Some(first) = ticks.first_mut() {
                    first.under = None;
                }
            }
            return ticks;
        }
    }
    Vec::new()
}

/// Whether an instant lies in the years 1 to 9999 (ms since 1970): no other is drawn, so that one mistyped date cannot
/// stretch an axis over geological times.
pub(crate) fn is_usual(ms: i64) -> bool {
    (-62_135_596_800_000..253_402_300_800_000).contains(&ms)
}

/// A UTC instant as a date, when the calendar reaches that far.
pub(crate) fn date_time(ms: i64) -> Option<NaiveDateTime> {
    DateTime::from_timestamp_millis(ms).map(|t| t.naive_utc())
}

/// `2021-03-05` of an instant; an en dash when the calendar does not reach that far.
pub fn iso_date(ms: i64) -> String {
    date_time(ms).map_or_else(|| super::number::MISSING.to_owned(), |t| t.format("%Y-%m-%d").to_string())
}

/// `3 May 2021` or, within a day, `3 May 2021 14:00`.
pub(crate) fn plain_date(ms: i64, with_time: bool) -> String {
    date_time(ms).map_or_else(
        || super::number::MISSING.to_owned(),
        |t| {
            let date = format!("{} {} {}", t.day(), month(t.month()), t.year());
            if with_time { format!("{date} {}", t.format("%H:%M")) } else { date }
        },
    )
}

fn month(number: u32) -> &'static str {
    MONTHS[(number as usize - 1) % 12]
}

fn label(step: Step, at: NaiveDateTime) -> String {
    match step {
        Step::Minutes(_) | Step::Hours(_) => at.format("%H:%M").to_string(),
        Step::Days(_) => at.day().to_string(),
        Step::Months(_) => month(at.month()).to_owned(),
        Step::Years(_) => at.year().to_string(),
    }
}

fn larger_unit(step: Step, at: NaiveDateTime) -> String {
    match step {
        Step::Minutes(_) | Step::Hours(_) => format!("{} {} {}", at.day(), month(at.month()), at.year()),
        Step::Days(_) => format!("{} {}", month(at.month()), at.year()),
        Step::Months(_) => at.year().to_string(),
        Step::Years(_) => String::new(),
    }
}

/// All ticks of a step inside the range; `None` when there would be far too many.
fn instants(start: NaiveDateTime, end: NaiveDateTime, step: Step) -> Option<Vec<NaiveDateTime>> {
    let midnight = start.date().and_hms_opt(0, 0, 0)?;
    let mut found = Vec::new();
    let mut keep = |at: NaiveDateTime| {
        if at >= start && at <= end {
            found.push(at);
        }
        found.len() <= MOST_TICKS
    };
    match step {
        Step::Minutes(n) | Step::Hours(n) => {
            let length = if matches!(step, Step::Hours(_)) { TimeDelta::hours(n) } else { TimeDelta::minutes(n) };
            let skip = (start - midnight).num_minutes() / length.num_minutes();
            let mut at = midnight + length * i32::try_from(skip).ok()?;
            while at <= end {
                if !keep(at) {
                    return None;
                }
                at += length;
            }
        }
        Step::Days(n) => {
            let mut first = start.date().with_day(1)?;
            while first.and_hms_opt(0, 0, 0)? <= end {
                let next = first.checked_add_months(Months::new(1))?;
                let length = u32::try_from((next - first).num_days()).ok()?;
                // 1, 6, 11, ... but nothing that crowds the next first.
                for day in (1..=length).step_by(n as usize).filter(|d| *d == 1 || d + n * 2 / 3 <= length + 1) {
                    if !keep(first.with_day(day)?.and_hms_opt(0, 0, 0)?) {
                        return None;
                    }
                }
                first = next;
            }
        }
        Step::Months(n) => {
            let mut first = NaiveDate::from_ymd_opt(start.year(), 1, 1)?;
            while first.and_hms_opt(0, 0, 0)? <= end {
                if !keep(first.and_hms_opt(0, 0, 0)?) {
                    return None;
                }
                first = first.checked_add_months(Months::new(n))?;
            }
        }
        Step::Years(n) => {
            let mut year = start.year().div_euclid(n) * n;
            while year <= end.year() {
                if !keep(NaiveDate::from_ymd_opt(year, 1, 1)?.and_hms_opt(0, 0, 0)?) {
                    return None;
                }
                year += n;
            }
        }
    }
    Some(found)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ms(text: &str) -> i64 {
        text.parse::<NaiveDateTime>().unwrap().and_utc().timestamp_millis()
    }

    fn shown(start: &str, end: &str, length: f64) -> (Vec<String>, Vec<String>) {
        let ticks = ticks(ms(start), ms(end), length);
        (ticks.iter().map(|t| t.label.clone()).collect(), ticks.iter().filter_map(|t| t.under.clone()).collect())
    }

    #[test]
    fn a_winter_crosses_the_year() {
        let (upper, under) = shown("2020-11-12T00:00:00", "2021-03-20T00:00:00", 180.0);
        assert_eq!(upper, ["Dec", "Jan", "Feb", "Mar"]);
        assert_eq!(under, ["2020", "2021"]);
    }

    #[test]
    fn leap_february_has_29_days() {
        let (upper, under) = shown("2020-02-26T00:00:00", "2020-03-03T00:00:00", 300.0);
        assert_eq!(upper, ["26", "27", "28", "29", "1", "2", "3"]);
        assert_eq!(under, ["Feb 2020", "Mar 2020"]);
    }

    #[test]
    fn one_hour_and_thirty_years_have_labels() {
        let (upper, under) = shown("2021-05-01T10:00:00", "2021-05-01T11:00:00", 600.0);
        assert_eq!(upper[..3], ["10:00", "10:05", "10:10"]);
        assert_eq!(under, ["1 May 2021"]);
        let (upper, _) = shown("1990-05-01T10:00:00", "2021-05-01T11:00:00", 300.0);
        assert_eq!(upper, ["1995", "2000", "2005", "2010", "2015", "2020"]);
    }

    #[test]
    fn strange_ranges_give_no_ticks_and_no_panic() {
        assert!(ticks(5, 5, 100.0).is_empty());
        assert!(ticks(i64::MIN, i64::MAX, 100.0).is_empty());
        assert!(ticks(0, 86_400_000, f64::NAN).is_empty());
        assert_eq!(iso_date(i64::MAX), "–");
    }
}
