//! Times in text and in numbers: from what tables hold to UTC instants.

use crate::units::Instant;
use chrono::NaiveDate;

/// The unit of times that are numbers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TimeUnit {
    /// Seconds since 1970-01-01T00:00:00Z.
    Seconds,
    /// Milliseconds since 1970.
    Milliseconds,
    /// Microseconds since 1970.
    Microseconds,
    /// Nanoseconds since 1970.
    Nanoseconds,
    /// Days of a spreadsheet: day 1 is 1900-01-01 and a 29 February 1900 is counted, so that day 61 is 1900-03-01; earlier days are refused.
    SpreadsheetDays,
    /// Days as numerical computing packages count them: day 719529 is 1970-01-01.
    DayNumber,
}

impl TimeUnit {
    /// From its name in a study file.
    pub fn from_name(name: &str) -> Option<Self> {
        match name {
            "s" => Some(Self::Seconds),
            "ms" => Some(Self::Milliseconds),
            "us" => Some(Self::Microseconds),
            "ns" => Some(Self::Nanoseconds),
            "spreadsheet_days" => Some(Self::SpreadsheetDays),
            "day_number" => Some(Self::DayNumber),
            _ => None,
        }
    }

    /// The names that `from_name` knows.
    pub const NAMES: &'static str = "\"s\", \"ms\", \"us\", \"ns\", \"spreadsheet_days\" or \"day_number\"";

    /// The instant of a number, to the nearest millisecond; `None` where there is none.
    pub fn instant(self, number: f64) -> Option<Instant> {
        const DAY_MS: f64 = 86_400_000.0;
        let ms = match self {
            Self::Seconds => number * 1e3,
            Self::Milliseconds => number,
            Self::Microseconds => number / 1e3,
            Self::Nanoseconds => number / 1e6,
            // Day 25569 is 1970-01-01.
            Self::SpreadsheetDays if number >= 61.0 => (number - 25_569.0) * DAY_MS,
            Self::SpreadsheetDays => return None,
            Self::DayNumber => (number - 719_529.0) * DAY_MS,
        };
        // Days carry 15 digits, a few microseconds; the rounding brings whole seconds back.
        let rounded = ms.round();
        // Years 1678 to 2262, where every common time type has an instant.
        (rounded.abs() < 9.2e12).then_some(Instant(rounded as i64))
    }
}

/// The order of day and month in dates written with slashes or dots.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DateOrder {
    /// 31/12/2031
    DayFirst,
    /// 12/31/2031
    MonthFirst,
}

impl DateOrder {
    /// From its name in a study file.
    pub fn from_name(name: &str) -> Option<Self> {
        match name {
            "dmy" => Some(Self::DayFirst),
            "mdy" => Some(Self::MonthFirst),
            _ => None,
        }
    }
}

/// How to read the times of a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct TimeRules {
    /// Minutes east of Greenwich of times that carry no zone; `None`: not stated, taken as UTC.
    pub zone_minutes: Option<i32>,
    /// Unit of times that are numbers.
    pub unit: Option<TimeUnit>,
    /// Order of day and month.
    pub order: Option<DateOrder>,
}

/// What was met while reading times, for notes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct TimeRemarks {
    /// Some time carried no zone.
    pub naive: bool,
    /// Some time was the 60th second of a minute; it was counted as the next second.
    pub leap_second: bool,
    /// Some time was 24:00; it was counted as 00:00 of the next day.
    pub hour_24: bool,
}

/// Why a cell is no time.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TimeProblem {
    /// Not a time in any known form.
    Unreadable,
    /// No such day or hour.
    Impossible,
    /// Day and month could be either.
    Order,
    /// A number, and its unit is not stated.
    Unit,
    /// The text behind the time is no known zone.
    Zone,
    /// A clock time without a date.
    NoDate,
    /// An empty cell.
    Empty,
}

impl TimeProblem {
    /// What was expected, in words, and the key to set (to be prefixed by the section), if one helps.
    pub fn expected(self) -> (&'static str, Option<&'static str>) {
        match self {
            Self::Unreadable => ("an ISO 8601 time such as 2031-05-04T13:00:00Z", None),
            Self::Impossible => ("a day and hour that exist", None),
            Self::Order => ("a time whose day and month are sure: \"dmy\" or \"mdy\"", Some("date_order")),
            Self::Unit => (
                "a unit for times that are numbers: \"s\", \"ms\", \"us\", \"ns\", \"spreadsheet_days\" or \"day_number\"",
                Some("time_unit"),
            ),
            Self::Zone => ("Z, an offset such as +02:00, or no zone", None),
            Self::NoDate => ("a date and a time in one cell", None),
            Self::Empty => ("a time in every row", None),
        }
    }
}

/// Parses a fixed zone of a study file: "UTC", "Z", "+02:00", "UTC+2", "-03:30". `None` for anything else.
pub fn zone_minutes(text: &str) -> Option<i32> {
    let upper = text.trim().to_ascii_uppercase();
    let rest = upper.strip_prefix("UTC").or_else(|| upper.strip_prefix("GMT")).unwrap_or(&upper).trim();
    if matches!(rest, "" | "Z") {
        return (!upper.is_empty()).then_some(0);
    }
    match offset(rest.as_bytes())? {
        (minutes, []) => Some(minutes),
        _ => None,
    }
}

/// A numeric offset at the start of a text (minutes east), and the rest.
fn offset(text: &[u8]) -> Option<(i32, &[u8])> {
    let (sign, rest) = match text {
        [b'+', rest @ ..] => (1, rest),
        [b'-', rest @ ..] => (-1, rest),
        _ => return None,
    };
    let count = rest.iter().take_while(|byte| byte.is_ascii_digit()).count();
    let (hours, minutes, rest) = match (count, rest.get(count..)?) {
        (1 | 2, [b':', tail @ ..]) => (digits(rest, 0, count)?, digits(tail, 0, 2)?, tail.get(2..)?),
        (1 | 2, tail) => (digits(rest, 0, count)?, 0, tail),
        (4, tail) => (digits(rest, 0, 2)?, digits(rest, 2, 2)?, tail),
        _ => return None,
    };
    let total = hours * 60 + minutes;
    (hours <= 14 && minutes < 60 && total <= 14 * 60).then_some((sign * total, rest))
}

/// A run of exactly `count` digits at `at`.
fn digits(text: &[u8], at: usize, count: usize) -> Option<i32> {
    let mut value = 0;
    for &byte in text.get(at..at + count)? {
        let digit = byte.wrapping_sub(b'0');
        if digit > 9 {
            return None;
        }
        value = value * 10 + i32::from(digit);
    }
    Some(value)
}

/// Days since 1970-01-01 of a day of the proleptic Gregorian calendar.
fn days(year: i32, month: i32, day: i32) -> Option<i64> {
    let date = NaiveDate::from_ymd_opt(year, month as u32, day as u32)?;
    Some(i64::from(date.to_epoch_days()))
}

/// The clock part behind a date, in milliseconds of the day, and what follows it.
fn clock<'a>(text: &'a [u8], remarks: &mut TimeRemarks) -> Result<(i64, &'a [u8]), TimeProblem> {
    let hour_digits = if text.get(1).is_some_and(u8::is_ascii_digit) { 2 } else { 1 };
    let hour = digits(text, 0, hour_digits).ok_or(TimeProblem::Unreadable)?;
    let mut rest = text.get(hour_digits..).unwrap_or_default();
    let colon = rest.first() == Some(&b':');
    let field = |rest: &mut &'a [u8]| -> Option<i32> {
        let body: &'a [u8] = if colon { rest.strip_prefix(b":")? } else { rest };
        let value = digits(body, 0, 2)?;
        *rest = body.get(2..)?;
        Some(value)
    };
    let minute = field(&mut rest).ok_or(TimeProblem::Unreadable)?;
    let mut second = 0;
    let mut fraction_ms = 0;
    if let Some(value) = field(&mut rest) {
        second = value;
        if let [b'.' | b',', tail @ ..] = rest {
            let count = tail.iter().take_while(|byte| byte.is_ascii_digit()).count();
            if count == 0 {
                return Err(TimeProblem::Unreadable);
            }
            for digit in tail[..count].iter().chain(b"000").take(3) {
                fraction_ms = fraction_ms * 10 + i64::from(digit - b'0');
            }
            // To the nearest millisecond.
            if tail[..count].get(3).is_some_and(|digit| *digit >= b'5') {
                fraction_ms += 1;
            }
            rest = &tail[count..];
        }
    } else if rest.first() == Some(&b':') {
        return Err(TimeProblem::Unreadable);
    }
    let whole_day = hour == 24 && minute == 0 && second == 0 && fraction_ms == 0;
    // Leap seconds stand at the last second of a UTC day, which other zones see at other hours: 59:60 is enough here.
    let leap = minute == 59 && second == 60;
    if hour > 24 || (hour == 24 && !whole_day) || minute > 59 || (second > 59 && !leap) {
        return Err(TimeProblem::Impossible);
    }
    remarks.hour_24 |= whole_day;
    remarks.leap_second |= leap;
    // The 60th second is the same instant as the next minute in POSIX time.
    let fraction_ms = if leap { 0 } else { fraction_ms };
    Ok((i64::from((hour * 60 + minute) * 60 + second) * 1000 + fraction_ms, rest))
}

/// The date part: days since 1970 and what follows.
fn date(text: &[u8], order: Option<DateOrder>) -> Result<(i64, &[u8]), TimeProblem> {
    let first = text.iter().take_while(|byte| byte.is_ascii_digit()).count();
    let mark = text.get(first).copied();
    match (first, mark) {
        (4, Some(mark @ (b'-' | b'/' | b'.'))) => {
            let year = digits(text, 0, 4).ok_or(TimeProblem::Unreadable)?;
            let (month, rest) = one_or_two(text.get(5..).unwrap_or_default()).ok_or(TimeProblem::Unreadable)?;
            let rest = rest.strip_prefix(&[mark]).ok_or(TimeProblem::Unreadable)?;
            let (day, rest) = one_or_two(rest).ok_or(TimeProblem::Unreadable)?;
            Ok((days(year, month, day).ok_or(TimeProblem::Impossible)?, rest))
        }
        (8, mark) if mark.is_none() || matches!(mark, Some(b'T' | b't' | b' ')) => {
            let part = |at, count| digits(text, at, count).ok_or(TimeProblem::Unreadable);
            let (year, month, day) = (part(0, 4)?, part(4, 2)?, part(6, 2)?);
            Ok((days(year, month, day).ok_or(TimeProblem::Impossible)?, &text[8..]))
        }
        (1 | 2, Some(mark @ (b'/' | b'.' | b'-'))) => {
            let (one, rest) = one_or_two(text).ok_or(TimeProblem::Unreadable)?;
            let rest = rest.strip_prefix(&[mark]).ok_or(TimeProblem::Unreadable)?;
            let (two, rest) = one_or_two(rest).ok_or(TimeProblem::Unreadable)?;
            let rest = rest.strip_prefix(&[mark]).ok_or(TimeProblem::Unreadable)?;
            let year = digits(rest, 0, 4).ok_or(TimeProblem::Unreadable)?;
            let (day, month) = match order {
                None => return Err(TimeProblem::Order),
                Some(DateOrder::DayFirst) => (one, two),
                Some(DateOrder::MonthFirst) => (two, one),
            };
            Ok((days(year, month, day).ok_or(TimeProblem::Impossible)?, &rest[4..]))
        }
        (1 | 2, Some(b':')) => Err(TimeProblem::NoDate),
        _ => Err(TimeProblem::Unreadable),
    }
}

fn one_or_two(text: &[u8]) -> Option<(i32, &[u8])> {
    let count = text.iter().take(2).take_while(|byte| byte.is_ascii_digit()).count();
    if count == 0 { None } else { Some((digits(text, 0, count)?, &text[count..])) }
}

/// The plain form `YYYY-MM-DD?HH:MM:SSZ` and its like without zone, by position.
fn usual_form(text: &[u8], rules: &TimeRules, remarks: &mut TimeRemarks, day: &mut (i32, i64)) -> Option<Instant> {
    let zoned = match text.len() {
        19 => false,
        20 if text[19] == b'Z' => true,
        _ => return None,
    };
    let marks = text[4] == b'-'
        && text[7] == b'-'
        && (text[10] == b'T' || text[10] == b' ')
        && text[13] == b':'
        && text[16] == b':';
    if !marks {
        return None;
    }
    let (year, month, day_of_month) = (digits(text, 0, 4)?, digits(text, 5, 2)?, digits(text, 8, 2)?);
    let (hour, minute, second) = (digits(text, 11, 2)?, digits(text, 14, 2)?, digits(text, 17, 2)?);
    if hour > 23 || minute > 59 || second > 59 {
        return None;
    }
    let key = (year * 16 + month) * 32 + day_of_month;
    if day.0 != key {
        *day = (key, days(year, month, day_of_month)?);
    }
    let clock_s = i64::from((hour * 60 + minute) * 60 + second);
    let shift_min = if zoned { 0 } else { rules.zone_minutes.unwrap_or(0) };
    remarks.naive |= !zoned;
    Some(Instant(day.1 * 86_400_000 + clock_s * 1000 - i64::from(shift_min) * 60_000))
}

/// Reads times under fixed rules and remembers what it met.
#[derive(Debug, Clone, Default)]
pub struct TimeReader {
    rules: TimeRules,
    remarks: TimeRemarks,
    /// The last day read, as a key and as days since 1970.
    day: (i32, i64),
}

impl TimeReader {
    /// A reader with these rules.
    pub fn new(rules: TimeRules) -> Self {
        Self { rules, remarks: TimeRemarks::default(), day: (0, 0) }
    }

    /// The rules.
    pub fn rules(&self) -> TimeRules {
        self.rules
    }

    /// What was met so far.
    pub fn remarks(&self) -> TimeRemarks {
        self.remarks
    }

    /// Marks that a time without zone was met elsewhere (a naive Parquet column).
    pub fn note_naive(&mut self) {
        self.remarks.naive = true;
    }

    /// The instant of a local clock reading without zone, ms since 1970 by that clock.
    pub fn from_naive_ms(&self, ms: i64) -> Instant {
        Instant(ms - i64::from(self.rules.zone_minutes.unwrap_or(0)) * 60_000)
    }

    /// Reads a cell without blanks around it.
    ///
    /// # Errors
    /// When the cell is no time under these rules.
    pub fn read(&mut self, cell: &[u8]) -> Result<Instant, TimeProblem> {
        if let Some(unit) = self.rules.unit {
            let number = std::str::from_utf8(cell).ok().and_then(|text| text.parse::<f64>().ok());
            return match number {
                _ if cell.is_empty() => Err(TimeProblem::Empty),
                Some(number) => unit.instant(number).ok_or(TimeProblem::Impossible),
                None => self.text(cell),
            };
        }
        self.text(cell)
    }

    fn text(&mut self, cell: &[u8]) -> Result<Instant, TimeProblem> {
        if let Some(instant) = usual_form(cell, &self.rules, &mut self.remarks, &mut self.day) {
            return Ok(instant);
        }
        if cell.is_empty() {
            return Err(TimeProblem::Empty);
        }
        let plain_number = std::str::from_utf8(cell).is_ok_and(|text| text.parse::<f64>().is_ok());
        let compact_date = cell.len() == 8 && cell.iter().all(u8::is_ascii_digit);
        if plain_number && !compact_date {
            return Err(TimeProblem::Unit);
        }
        let (day, rest) = date(cell, self.rules.order)?;
        let (clock_ms, rest) = match rest {
            [] => (0, rest),
            [b'T' | b't' | b'_', tail @ ..] => clock(tail, &mut self.remarks)?,
            [b' ', tail @ ..] => clock(super::delimited::trim(tail), &mut self.remarks)?,
            _ => return Err(TimeProblem::Unreadable),
        };
        let local_ms = day * 86_400_000 + clock_ms;
        let zone = super::delimited::trim(rest);
        if zone.is_empty() {
            self.remarks.naive = true;
            return Ok(self.from_naive_ms(local_ms));
        }
        let text = std::str::from_utf8(zone).map_err(|_| TimeProblem::Zone)?;
        let minutes = zone_minutes(text).ok_or(TimeProblem::Zone)?;
        Ok(Instant(local_ms - i64::from(minutes) * 60_000))
    }
}

/// Whether a cell has the look of a date or a date and time (in any order of day and month). Numbers do not.
pub(crate) fn looks_like_time(cell: &[u8]) -> bool {
    let rules = TimeRules { zone_minutes: None, unit: None, order: Some(DateOrder::DayFirst) };
    match TimeReader::new(rules).read(cell) {
        // A compact date could be a number.
        Ok(_) => !cell.iter().all(u8::is_ascii_digit),
        Err(TimeProblem::Impossible | TimeProblem::Zone) => {
            cell.len() > 8 && cell.iter().any(|byte| matches!(byte, b'-' | b'/' | b':'))
        }
        Err(_) => false,
    }
}
