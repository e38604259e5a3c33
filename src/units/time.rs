//! Instants and windows of time. Everything inside is UTC.

use chrono::{DateTime, Datelike, SecondsFormat, Timelike};
use serde::{Deserialize, Serialize};
use std::fmt;

/// Milliseconds in a second.
pub const SECOND_MS: i64 = 1_000;
/// Milliseconds in an hour.
pub const HOUR_MS: i64 = 3_600_000;

/// An instant: milliseconds since 1970-01-01T00:00:00Z, without leap seconds (POSIX time).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Instant(pub i64);

/// Why a text is no instant.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{text}` is no time; expected ISO 8601 such as 2031-05-04T13:00:00Z")]
pub struct InstantError {
    /// The text as given.
    pub text: String,
}

impl Instant {
    /// Milliseconds since 1970-01-01T00:00:00Z.
    pub fn unix_ms(self) -> i64 {
        self.0
    }

    /// From an ISO 8601 text. A date alone is its midnight; a text without zone is taken as UTC.
    ///
    /// # Errors
    /// When the text is no such time.
    pub fn parse(text: &str) -> Result<Self, InstantError> {
        let trimmed = text.trim();
        if let Ok(zoned) = DateTime::parse_from_rfc3339(trimmed) {
            return Ok(Self(zoned.timestamp_millis()));
        }
        let bare = trimmed.strip_suffix(['Z', 'z']).unwrap_or(trimmed).replace('T', " ");
        for pattern in ["%Y-%m-%d %H:%M:%S%.f", "%Y-%m-%d %H:%M"] {
            if let Ok(naive) = chrono::NaiveDateTime::parse_from_str(&bare, pattern) {
                return Ok(Self(naive.and_utc().timestamp_millis()));
            }
        }
        if let Ok(day) = chrono::NaiveDate::parse_from_str(&bare, "%Y-%m-%d")
            && let Some(midnight) = day.and_hms_opt(0, 0, 0)
        {
            return Ok(Self(midnight.and_utc().timestamp_millis()));
        }
        Err(InstantError { text: text.to_owned() })
    }

    /// ISO 8601 text in UTC, to the second, or to the millisecond where there is a fraction.
    pub fn iso(self) -> String {
        let form = if self.0.rem_euclid(SECOND_MS) == 0 { SecondsFormat::Secs } else { SecondsFormat::Millis };
        DateTime::from_timestamp_millis(self.0)
            .map_or_else(|| format!("{} ms since 1970", self.0), |time| time.to_rfc3339_opts(form, true))
    }

    /// Calendar year, month (1 to 12), and hour of the day with its fraction, in UTC. `None` far outside history.
    pub fn year_month_hour(self) -> Option<(i32, u32, f64)> {
        let time = DateTime::from_timestamp_millis(self.0)?;
        Some((time.year(), time.month(), f64::from(time.num_seconds_from_midnight()) / 3600.0))
    }

    /// Later by this many milliseconds (earlier when negative).
    #[must_use]
    pub fn plus_ms(self, ms: i64) -> Self {
        Self(self.0.saturating_add(ms))
    }
}

impl fmt::Display for Instant {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(&self.iso())
    }
}

/// A half-open span of time, [start, end). A window of length zero is its instant.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Window {
    /// First instant inside.
    pub start: Instant,
    /// First instant after.
    pub end: Instant,
}

impl Window {
    /// A window; `None` when it would end before it starts.
    pub fn new(start: Instant, end: Instant) -> Option<Self> {
        (end >= start).then_some(Self { start, end })
    }

    /// Its length in milliseconds.
    pub fn length_ms(self) -> i64 {
        self.end.0 - self.start.0
    }

    /// Its middle, rounded down to a millisecond.
    pub fn centre(self) -> Instant {
        Instant(self.start.0 + self.length_ms() / 2)
    }

    /// Whether an instant lies inside; the instant itself for a window of length zero.
    pub fn contains(self, instant: Instant) -> bool {
        instant >= self.start && (instant < self.end || (self.start == self.end && instant == self.start))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn iso_texts_with_and_without_zone() {
        // 2001-09-09T01:46:40Z is 10^9 s after the epoch (POSIX, common practice).
        let billion = Instant(1_000_000_000_000);
        for text in
            ["2001-09-09T01:46:40Z", "2001-09-09 01:46:40", "2001-09-09T03:46:40+02:00", "2001-09-09T01:46:40.000Z"]
        {
            assert_eq!(Instant::parse(text), Ok(billion), "{text}");
        }
        assert_eq!(billion.iso(), "2001-09-09T01:46:40Z");
        assert_eq!(Instant::parse("1970-01-02"), Ok(Instant(24 * HOUR_MS)));
        assert!(Instant::parse("yesterday").is_err());
    }

    #[test]
    fn windows_are_half_open() {
        let window = Window::new(Instant(0), Instant(10)).unwrap();
        assert!(window.contains(Instant(0)) && !window.contains(Instant(10)));
        assert!(Window::new(Instant(5), Instant(5)).unwrap().contains(Instant(5)));
        assert!(Window::new(Instant(5), Instant(4)).is_none());
    }
}
