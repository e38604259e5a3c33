//! CF calendars in integer arithmetic (CF section 4.4.1). Days are counted from 1970-01-01 of the proleptic Gregorian calendar.

/// A calendar.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Calendar {
    /// Julian before 1582-10-15, Gregorian since ("standard", "gregorian").
    Standard,
    ProlepticGregorian,
    Julian,
    NoLeap,
    AllLeap,
    Days360,
}

/// A date of some calendar.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Date {
    pub(super) year: i64,
    pub(super) month: u32,
    pub(super) day: u32,
}

const CUMULATIVE: [i64; 12] = [0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334];

impl Calendar {
    /// By its CF name.
    pub(super) fn from_name(name: &str) -> Option<Self> {
        Some(match name.trim().to_ascii_lowercase().as_str() {
            "standard" | "gregorian" => Self::Standard,
            "proleptic_gregorian" => Self::ProlepticGregorian,
            "julian" => Self::Julian,
            "noleap" | "365_day" => Self::NoLeap,
            "all_leap" | "366_day" => Self::AllLeap,
            "360_day" => Self::Days360,
            _ => return None,
        })
    }

    /// Its CF name.
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Standard => "standard",
            Self::ProlepticGregorian => "proleptic_gregorian",
            Self::Julian => "julian",
            Self::NoLeap => "noleap",
            Self::AllLeap => "all_leap",
            Self::Days360 => "360_day",
        }
    }

    fn is_leap(self, year: i64) -> bool {
        match self {
            Self::Julian => year.rem_euclid(4) == 0,
            Self::NoLeap | Self::Days360 => false,
            Self::AllLeap => true,
            Self::ProlepticGregorian => gregorian_leap(year),
            Self::Standard if year <= 1582 => year.rem_euclid(4) == 0,
            Self::Standard => gregorian_leap(year),
        }
    }

    /// Whether the calendar has this date.
    pub(super) fn has(self, date: Date) -> bool {
        let length = match (self, date.month) {
            (Self::Days360, _) => 30,
            (_, 2) if self.is_leap(date.year) => 29,
            (_, 2) => 28,
            (_, 4 | 6 | 9 | 11) => 30,
            _ => 31,
        };
        let skipped = self == Self::Standard && date.year == 1582 && date.month == 10 && (5..=14).contains(&date.day);
        (1..=12).contains(&date.month) && (1..=length).contains(&date.day) && !skipped
    }

    /// Number of a day in this calendar's own count; only differences within a calendar mean something.
    pub(super) fn day_number(self, date: Date) -> i64 {
        let (year, month, day) = (date.year, i64::from(date.month), i64::from(date.day));
        match self {
            Self::Days360 => year * 360 + (month - 1) * 30 + day - 1,
            Self::NoLeap => year * 365 + CUMULATIVE[month as usize - 1] + day - 1,
            Self::AllLeap => year * 366 + CUMULATIVE[month as usize - 1] + i64::from(month > 2) + day - 1,
            Self::Julian => julian_days(year, month, day),
            Self::ProlepticGregorian => gregorian_days(year, month, day),
            Self::Standard if date >= GREGORIAN_START => gregorian_days(year, month, day),
            Self::Standard => julian_days(year, month, day),
        }
    }

    /// The date of a day number of this calendar.
    pub(super) fn date_of(self, number: i64) -> Date {
        // A first guess a little early, then years, months and days by counting: exact, and short enough.
        let per_year = match self {
            Self::Days360 => 360.0,
            Self::NoLeap => 365.0,
            Self::AllLeap => 366.0,
            _ => 365.25,
        };
        let zero = match self {
            Self::Days360 | Self::NoLeap | Self::AllLeap => 0,
            _ => 1970,
        };
        let mut year = zero + (number as f64 / per_year).floor() as i64 - 1;
        while self.day_number(Date { year: year + 1, month: 1, day: 1 }) <= number {
            year += 1;
        }
        while self.day_number(Date { year, month: 1, day: 1 }) > number {
            year -= 1;
        }
        let mut date = Date { year, month: 1, day: 1 };
        for month in 2..=12 {
            if self.day_number(Date { year, month, day: 1 }) <= number {
                date.month = month;
            }
        }
        date.day = 1 + (number - self.day_number(date)) as u32;
        if self == Self::Standard && date.year == 1582 && date.month == 10 && date.day > 4 {
            date.day += 10;
        }
        date
    }

    /// Days since 1970-01-01 (proleptic Gregorian) of a day number of this calendar, where the date exists there.
    pub(super) fn unix_days(self, number: i64) -> Option<i64> {
        match self {
            // The same count of real days.
            Self::Standard | Self::ProlepticGregorian | Self::Julian => Some(number),
            // Model years: the date keeps its name, where it has one.
            Self::NoLeap | Self::AllLeap | Self::Days360 => {
                let date = self.date_of(number);
                Self::ProlepticGregorian.has(date).then(|| Self::ProlepticGregorian.day_number(date))
            }
        }
    }
}

const GREGORIAN_START: Date = Date { year: 1582, month: 10, day: 15 };

fn gregorian_leap(year: i64) -> bool {
    year.rem_euclid(4) == 0 && (year.rem_euclid(100) != 0 || year.rem_euclid(400) == 0)
}

/// Days since 1970-01-01, proleptic Gregorian. Years begin in March, so that the leap day is the last.
fn gregorian_days(year: i64, month: i64, day: i64) -> i64 {
    let (year, month) = if month <= 2 { (year - 1, month + 9) } else { (year, month - 3) };
    let leaps = year.div_euclid(4) - year.div_euclid(100) + year.div_euclid(400);
    year * 365 + leaps + (month * 153 + 2) / 5 + day - 1 - 719_468
}

/// The same count of days for a Julian date.
fn julian_days(year: i64, month: i64, day: i64) -> i64 {
    let (year, month) = if month <= 2 { (year - 1, month + 9) } else { (year, month - 3) };
    year * 365 + year.div_euclid(4) + (month * 153 + 2) / 5 + day - 1 - 719_470
}

#[cfg(test)]
mod tests {
    use super::*;

    fn date(year: i64, month: u32, day: u32) -> Date {
        Date { year, month, day }
    }

    // cftime 1.6 (general-purpose library), and the definition of the reform: Thursday 4 October 1582 (Julian) was followed
    // by Friday 15 October 1582 (Gregorian).
    #[test]
    fn the_reform_skips_ten_days() {
        let standard = Calendar::Standard;
        assert_eq!(standard.day_number(date(1582, 10, 15)) - standard.day_number(date(1582, 10, 4)), 1);
        assert!(!standard.has(date(1582, 10, 10)));
        assert_eq!(standard.date_of(standard.day_number(date(1582, 10, 4)) + 1), date(1582, 10, 15));
    }

    #[test]
    fn the_epoch_and_known_days() {
        assert_eq!(Calendar::ProlepticGregorian.day_number(date(1970, 1, 1)), 0);
        assert_eq!(Calendar::Standard.day_number(date(1900, 1, 1)), -25_567);
        // Year 1 differs by two days between the mixed and the proleptic calendar.
        assert_eq!(
            Calendar::Standard.day_number(date(1, 1, 1)) - Calendar::ProlepticGregorian.day_number(date(1, 1, 1)),
            -2
        );
    }

    #[test]
    fn model_calendars_keep_dates_and_refuse_those_that_do_not_exist() {
        let days = Calendar::Days360;
        let start = days.day_number(date(1900, 1, 1));
        assert_eq!(days.date_of(start + 2299), date(1906, 5, 20));
        assert_eq!(days.unix_days(days.day_number(date(2001, 2, 30))), None);
        let no_leap = Calendar::NoLeap;
        assert_eq!(no_leap.date_of(no_leap.day_number(date(2004, 2, 28)) + 1), date(2004, 3, 1));
    }

    proptest::proptest! {
        #[test]
        fn every_day_number_is_its_date(number in -800_000i64..200_000) {
            for calendar in [Calendar::Standard, Calendar::ProlepticGregorian, Calendar::Julian, Calendar::NoLeap, Calendar::AllLeap, Calendar::Days360] {
                let date = calendar.date_of(number);
                proptest::prop_assert!(calendar.has(date), "{calendar:?} {date:?}");
                proptest::prop_assert_eq!(calendar.day_number(date), number);
            }
        }
    }
}
