//! Times in text: hazard L1. The reference is chrono 0.4 (a general-purpose library), which the reader does not use for clocks
//! and offsets.

use chrono::{DateTime, FixedOffset};
use proptest::prelude::{prop_assert_eq, proptest};
use underwind::io::time_text::{DateOrder, TimeProblem, TimeReader, TimeRules, TimeUnit, zone_minutes};
use underwind::units::Instant;

fn read(text: &str) -> Result<Instant, TimeProblem> {
    TimeReader::new(TimeRules::default()).read(text.as_bytes())
}

#[test]
fn fixed_zones_of_a_study_file() {
    for (text, minutes) in [
        ("UTC", 0),
        ("utc", 0),
        ("Z", 0),
        ("GMT", 0),
        ("+02:00", 120),
        ("UTC+2", 120),
        ("-03:30", -210),
        ("+0530", 330),
        ("+14", 840),
    ] {
        assert_eq!(zone_minutes(text), Some(minutes), "{text}");
    }
    for text in ["", "CET", "Europe/Oslo", "+25:00", "+2:", "2", "+02:60", "+15"] {
        assert_eq!(zone_minutes(text), None, "{text}");
    }
}

#[test]
fn numbers_by_their_unit() {
    // 2031-03-01T00:00:00Z: 1930089600 s after 1970 (Python 3.11, datetime); day 47908 of a spreadsheet; day 741868 of numerical
    // packages (719529 is 1970-01-01).
    for (unit, number) in [
        (TimeUnit::Seconds, 1_930_089_600.0),
        (TimeUnit::Milliseconds, 1_930_089_600e3),
        (TimeUnit::Microseconds, 1_930_089_600e6),
        (TimeUnit::Nanoseconds, 1_930_089_600e9),
        (TimeUnit::SpreadsheetDays, 47_908.0),
        (TimeUnit::DayNumber, 741_868.0),
    ] {
        assert_eq!(unit.instant(number).map(Instant::iso).as_deref(), Some("2031-03-01T00:00:00Z"), "{unit:?}");
        assert_eq!(unit.instant(f64::NAN), None);
    }
    // The spreadsheet's own 29 February 1900, which never was, and all before it.
    assert_eq!(TimeUnit::SpreadsheetDays.instant(60.0), None);
    assert_eq!(TimeUnit::SpreadsheetDays.instant(61.0).map(Instant::iso).as_deref(), Some("1900-03-01T00:00:00Z"));
}

#[test]
fn one_instant_in_many_forms() {
    let instant = Instant(1_930_093_329_000);
    for text in [
        "2031-03-01T01:02:09Z",
        "2031-03-01t01:02:09z",
        "2031-03-01 01:02:09",
        "2031-03-01 1:02:09",
        "2031-3-1 01:02:09",
        "2031/03/01 01:02:09",
        "20310301T010209Z",
        "2031-03-01T01:02:09.000000+00:00",
        "2031-03-01T01:02:09,000Z",
        "2031-03-01 01:02:09 UTC",
        "2031-03-01 01:02:09 +00",
        "2031-02-28T23:02:09-02",
        "2031-03-01T06:32:09+0530",
    ] {
        assert_eq!(read(text), Ok(instant), "{text}");
    }
    assert_eq!(read("2031-03-01T01:02Z"), Ok(Instant(1_930_093_320_000)));
    assert_eq!(read("2031-03-01"), Ok(Instant(1_930_089_600_000)));
    assert_eq!(read("20310301"), Ok(Instant(1_930_089_600_000)));
}

proptest! {
    #[test]
    fn any_instant_at_any_offset_reads_as_chrono_writes_it(ms in -2_000_000_000_000_i64..4_000_000_000_000, minutes in -14 * 60_i32..=14 * 60) {
        let zone = FixedOffset::east_opt(minutes * 60).unwrap();
        let text = DateTime::from_timestamp_millis(ms).unwrap().with_timezone(&zone).to_rfc3339();
        prop_assert_eq!(read(&text), Ok(Instant(ms)), "{}", text);
    }

    #[test]
    fn day_and_month_follow_the_stated_order(day in 1_u32..=28, month in 1_u32..=12, year in 1950_i32..2050) {
        let expected = Instant::parse(&format!("{year:04}-{month:02}-{day:02}T12:00:00Z")).unwrap();
        for (order, text) in [(DateOrder::DayFirst, format!("{day}/{month}/{year} 12:00")), (DateOrder::MonthFirst, format!("{month:02}.{day:02}.{year} 12:00:00"))] {
            let rules = TimeRules { order: Some(order), ..TimeRules::default() };
            prop_assert_eq!(TimeReader::new(rules).read(text.as_bytes()), Ok(expected));
            prop_assert_eq!(read(&text), Err(TimeProblem::Order));
        }
    }

    #[test]
    fn any_bytes_end_in_a_time_or_a_problem(bytes in proptest::collection::vec(proptest::prelude::any::<u8>(), 0..40)) {
        let _ = TimeReader::new(TimeRules::default()).read(&bytes);
    }

    #[test]
    fn text_of_the_right_alphabet_never_panics(text in "[0-9TZ:+. -]{0,32}") {
        let _ = read(&text);
    }
}
