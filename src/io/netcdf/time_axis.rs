//! CF time: "units since reference", decoded to UTC instants.

use super::calendar::{Calendar, Date};
use super::error::NetcdfError;
use super::header::{AttributeValue, NumberType, Variable};
use super::packing::Packing;
use super::read::Reader;
use crate::units::Instant;

/// A decoded time axis. Steps keep their stored order.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct TimeAxis {
    /// One entry a stored step; `None` where the time is missing.
    pub(super) steps: Vec<Option<Instant>>,
    pub(super) notes: Vec<String>,
}

/// What the units text says.
#[derive(Debug, Clone, Copy, PartialEq)]
struct TimeUnits {
    /// Milliseconds a unit.
    unit_ms: f64,
    reference: Date,
    /// Milliseconds since the reference's midnight, in UTC.
    reference_ms: i64,
}

const DAY_MS: i64 = 86_400_000;

/// Decodes a time variable. Units and calendar from the study go before the file's.
pub(super) fn decode(
    reader: &Reader,
    variable: &Variable,
    units: Option<&str>,
    calendar: Option<&str>,
) -> Result<TimeAxis, NetcdfError> {
    let refuse = |problem: String| NetcdfError::Variable {
        path: reader.header.path.clone(),
        variable: variable.name.clone(),
        problem,
    };
    let text = match units.or_else(|| variable.text("units")) {
        Some(text) => text.to_owned(),
        None => {
            return Err(refuse(
                "it has no units; expected such as \"hours since 1900-01-01\" (set `wind.time_units`)".to_owned(),
            ));
        }
    };
    let mut notes = Vec::new();
    let named = calendar.map(str::to_owned).or_else(|| variable.text("calendar").map(str::to_owned));
    let mut calendar = match &named {
        None => Calendar::Standard,
        Some(name) => Calendar::from_name(name).ok_or_else(|| {
            refuse(format!("its calendar is \"{name}\", which is not known (set `wind.calendar` to the right one)"))
        })?,
    };
    let units = parse_units(&text, calendar).map_err(|why| {
        refuse(format!("its units are \"{text}\": {why}; expected such as \"hours since 1900-01-01 00:00:00\" (set `wind.time_units`)"))
    })?;
    if calendar == Calendar::Standard && units.reference.year == 0 {
        // The mixed calendar has no year zero (1 BC is followed by AD 1); the proleptic one counts it. By an old custom
        // (COARDS, 1995) such times are those of a climatology.
        calendar = Calendar::ProlepticGregorian;
        notes.push(format!(
            "time variable `{}` counts from year 0: a climatology by old custom; its steps keep their dates in year 0 and stand for no date of a record",
            variable.name
        ));
    }
    if variable.number_type() == Some(NumberType::F32) {
        notes.push(format!(
            "time variable `{}` is stored in single precision, which may resolve minutes only",
            variable.name
        ));
    }
    if matches!(calendar, Calendar::Days360 | Calendar::NoLeap | Calendar::AllLeap) {
        notes.push(format!("time runs in the model calendar {}; dates keep their names", calendar.name()));
    }
    let packing = Packing::of(&reader.header, variable)?;
    let start_day = calendar.day_number(units.reference);
    let mut steps = Vec::new();
    for (index, raw) in reader.all(variable)?.into_iter().enumerate() {
        let value = packing.value(raw);
        if value.is_nan() {
            steps.push(None);
            continue;
        }
        let offset_ms = value * units.unit_ms;
        if offset_ms.abs() > 1e16 {
            return Err(refuse(format!("step {index} is {value} {text}, beyond any calendar")));
        }
        // Whole seconds, so that k/24 days land on the hour; finer times only where the unit itself is that fine.
        let rounded = if units.unit_ms < 1000.0 { offset_ms.round() } else { (offset_ms / 1000.0).round() * 1000.0 };
        let total_ms = units.reference_ms + rounded as i64;
        let day = start_day + total_ms.div_euclid(DAY_MS);
        let unix_day = calendar.unix_days(day).ok_or_else(|| {
            let date = calendar.date_of(day);
            refuse(format!(
                "step {index} is {:04}-{:02}-{:02} in the calendar {}, a date that does not exist in reality",
                date.year,
                date.month,
                date.day,
                calendar.name()
            ))
        })?;
        steps.push(Some(Instant(unix_day * DAY_MS + total_ms.rem_euclid(DAY_MS))));
    }
    let missing = steps.iter().filter(|step| step.is_none()).count();
    if missing > 0 {
        notes.push(format!("{missing} steps of time variable `{}` have no time and are left out", variable.name));
    }
    Ok(TimeAxis { steps, notes })
}

/// Whether a variable's units look like a time.
pub(super) fn looks_like_time(variable: &Variable) -> bool {
    match variable.attribute("units") {
        Some(AttributeValue::Text(text)) => text.to_ascii_lowercase().contains(" since "),
        _ => false,
    }
}

fn parse_units(text: &str, calendar: Calendar) -> Result<TimeUnits, String> {
    let lower = text.trim().to_ascii_lowercase();
    let Some((unit, reference)) = lower.split_once(" since ").map(|(a, b)| (a.trim(), b.trim())) else {
        return Err("there is no \"since\"".to_owned());
    };
    let unit_ms = match unit {
        "days" | "day" | "d" => 86_400_000.0,
        "hours" | "hour" | "hrs" | "hr" | "h" => 3_600_000.0,
        "minutes" | "minute" | "mins" | "min" => 60_000.0,
        "seconds" | "second" | "secs" | "sec" | "s" => 1000.0,
        "milliseconds" | "millisecond" | "msecs" | "msec" | "ms" => 1.0,
        "microseconds" | "microsecond" => 0.001,
        "months" | "month" | "years" | "year" | "common_years" => {
            return Err(format!("\"{unit}\" have no fixed length"));
        }
        other => return Err(format!("\"{other}\" is no unit of time")),
    };
    let (reference, reference_ms) = parse_reference(reference)?;
    if !calendar.has(reference) {
        return Err(format!(
            "the reference date {:04}-{:02}-{:02} does not exist in the calendar {}",
            reference.year,
            reference.month,
            reference.day,
            calendar.name()
        ));
    }
    Ok(TimeUnits { unit_ms, reference, reference_ms })
}

/// A reference date with its time of day in milliseconds, UTC.
fn parse_reference(text: &str) -> Result<(Date, i64), String> {
    let wrong = || format!("\"{text}\" is no reference date");
    let split = text.find(['t', ' ']).unwrap_or(text.len());
    let (date, rest) = text.split_at(split);
    let negative = date.starts_with('-');
    let parts: Vec<&str> = date.trim_start_matches('-').split('-').collect();
    let [year, month, day] = parts[..] else { return Err(wrong()) };
    let number = |part: &str| -> Result<i64, String> {
        if part.is_empty() || part.len() > 6 || !part.bytes().all(|byte| byte.is_ascii_digit()) {
            return Err(wrong());
        }
        part.parse().map_err(|_| wrong())
    };
    let year = number(year)? * if negative { -1 } else { 1 };
    let date = Date { year, month: number(month)? as u32, day: number(day)? as u32 };
    let rest = rest.trim_start_matches('t').trim();
    let zone_at = rest
        .char_indices()
        .find(|(at, c)| matches!(c, '+' | '-') && *at > 0 || c.is_ascii_alphabetic() || (*c == ' ' && *at > 0))
        .map_or(rest.len(), |(at, _)| at);
    let (clock, zone) = if rest.starts_with(['+', '-']) { ("", rest) } else { rest.split_at(zone_at) };
    let mut ms = 0_i64;
    let clock = clock.trim();
    if !clock.is_empty() {
        let parts: Vec<&str> = clock.split(':').collect();
        if parts.len() > 3 {
            return Err(wrong());
        }
        let whole = |part: &str, below: i64| number(part).ok().filter(|value| *value < below).ok_or_else(wrong);
        ms += whole(parts[0], 24)? * 3_600_000;
        if let Some(minutes) = parts.get(1) {
            ms += whole(minutes, 60)? * 60_000;
        }
        if let Some(seconds) = parts.get(2) {
            let seconds: f64 = seconds.parse().map_err(|_| wrong())?;
            if !(0.0..60.0).contains(&seconds) {
                return Err(wrong());
            }
            ms += (seconds * 1000.0).round() as i64;
        }
    }
    Ok((date, ms - zone_ms(zone.trim())?))
}

/// Offset of a zone from UTC in milliseconds, east positive.
fn zone_ms(zone: &str) -> Result<i64, String> {
    if matches!(zone, "" | "z" | "utc" | "gmt") {
        return Ok(0);
    }
    let wrong = || format!("the time zone \"{zone}\" is not known");
    let digits = zone.strip_prefix("utc").unwrap_or(zone).trim();
    let sign = match digits.as_bytes().first() {
        Some(b'+') => 1,
        Some(b'-') => -1,
        _ => return Err(wrong()),
    };
    let digits = &digits[1..];
    let (hours, minutes) = match digits.split_once(':') {
        Some((hours, minutes)) => (hours, minutes),
        None if digits.len() <= 2 => (digits, "0"),
        None => digits.split_at(digits.len() - 2),
    };
    let hours: i64 = hours.parse().map_err(|_| wrong())?;
    let minutes: i64 = minutes.parse().map_err(|_| wrong())?;
    if !(0..=15).contains(&hours) || !(0..60).contains(&minutes) {
        return Err(wrong());
    }
    Ok(sign * (hours * 3_600_000 + minutes * 60_000))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn reference_unix_ms(text: &str) -> Result<i64, String> {
        let units = parse_units(text, Calendar::Standard)?;
        Ok(Calendar::Standard.day_number(units.reference) * DAY_MS + units.reference_ms)
    }

    // cftime 1.6 and xarray 2026.9 (general-purpose libraries): UTC = reference minus offset; "+0200" and "UTC" are accepted.
    #[test]
    fn zones_of_the_reference_are_taken_off() {
        let plain = reference_unix_ms("hours since 2020-01-01 00:00:00").unwrap();
        for (zone, hours) in [
            ("Z", 0.0),
            (" UTC", 0.0),
            ("+02:00", 2.0),
            (" +02", 2.0),
            (" -03:30", -3.5),
            (" +0200", 2.0),
            ("-7:00", -7.0),
        ] {
            let text = format!("hours since 2020-01-01T00:00:00{zone}");
            assert_eq!(reference_unix_ms(&text).unwrap(), plain - (hours * 3.6e6) as i64, "{text}");
        }
        assert!(reference_unix_ms("hours since 2020-01-01 00:00:00 CEST").unwrap_err().contains("cest"));
    }

    // Facts of real files (DATA.md beside them), read there with netCDF4 1.7.5 and cftime.
    #[test]
    fn real_times_with_zones_and_model_calendars() {
        let folder = std::env::var_os("UNDERWIND_REAL_DATA").map_or_else(
            || std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/data"),
            std::path::PathBuf::from,
        );
        for (name, count, first, last) in [
            ("just_time_UTC.nc", 288, "2024-01-01T00:00:00Z", "2024-01-03T23:45:00Z"),
            ("just_time_naive.nc", 288, "2024-01-01T00:00:00Z", "2024-01-03T23:45:00Z"),
            ("just_time_offset-7.nc", 288, "2024-01-01T07:00:00Z", "2024-01-04T06:45:00Z"),
        ] {
            let path = folder.join(name);
            if !path.is_file() {
                println!("skipped: no real data folder {}", folder.display());
                return;
            }
            let axis = decode_file(&path).unwrap();
            assert!(axis.steps.windows(2).all(|pair| pair[1].unwrap().0 - pair[0].unwrap().0 == 900_000), "{name}");
            let ends = [axis.steps[0], axis.steps[count - 1]].map(|step| step.unwrap().iso());
            assert_eq!((axis.steps.len(), ends), (count, [first, last].map(str::to_owned)), "{name}");
        }
        // A year of twelve months of 30 days: its 30 February is no date, so the whole axis cannot be placed; the last step
        // is 20 May 1906.
        let path = folder.join("ref_test_360_day_1900.nc");
        let refused = decode_file(&path).unwrap_err().to_string();
        assert!(
            refused.ends_with(
                "variable `time`: step 58 is 1900-02-29 in the calendar 360_day, a date that does not exist in reality"
            ),
            "{refused}"
        );
        let start = Calendar::Days360.day_number(Date { year: 1900, month: 1, day: 1 });
        assert_eq!(Calendar::Days360.date_of(start + 2299), Date { year: 1906, month: 5, day: 20 });
    }

    fn decode_file(path: &std::path::Path) -> Result<TimeAxis, NetcdfError> {
        let reader = Reader::open(super::super::wind::read_header(path)?)?;
        decode(&reader, reader.header.variable("time").unwrap(), None, None)
    }

    #[test]
    fn spellings_of_one_reference() {
        let expected = Calendar::Standard.day_number(Date { year: 1900, month: 1, day: 1 }) * DAY_MS;
        for text in [
            "hours since 1900-01-01 00:00:00.0",
            "Hours Since 1900-1-1",
            "days since 1900-01-01 0:0:0",
            "seconds since 1900-01-01T00:00Z",
            "minutes since 1900-01-01 00:00",
        ] {
            assert_eq!(reference_unix_ms(text), Ok(expected), "{text}");
        }
    }

    #[test]
    fn units_that_mean_nothing_are_refused_with_their_text() {
        assert!(reference_unix_ms("months since 2000-01-01").unwrap_err().contains("no fixed length"));
        assert!(reference_unix_ms("day as %Y%m%d.%f").unwrap_err().contains("since"));
        assert!(reference_unix_ms("hours since 2001-02-30").unwrap_err().contains("does not exist"));
        assert!(reference_unix_ms("hours since yesterday").unwrap_err().contains("no reference date"));
    }
}
