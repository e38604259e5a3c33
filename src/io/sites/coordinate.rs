//! Latitudes and longitudes as people write them.

use std::fmt;

/// Which coordinate a text is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Axis {
    /// Degrees north.
    Latitude,
    /// Degrees east.
    Longitude,
}

impl Axis {
    /// Its name in words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Latitude => "latitude",
            Self::Longitude => "longitude",
        }
    }
}

/// Why a text is no coordinate.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CoordinateProblem {
    /// An empty cell.
    Empty,
    /// Not a number of degrees.
    Unreadable,
    /// Minutes or seconds of 60 or more.
    Sixty,
    /// A fraction of degrees before minutes, or of minutes before seconds.
    FractionBeforeEnd,
    /// A minus sign and a letter.
    SignAndLetter,
    /// A letter of the other axis.
    OtherAxis,
}

impl fmt::Display for CoordinateProblem {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(match self {
            Self::Empty => "is empty; expected degrees in every row",
            Self::Unreadable => "is no coordinate; expected degrees such as -129.4, 129.4 W, 129 24.0 W or 129 24 00 W",
            Self::Sixty => "has minutes or seconds of 60 or more; expected less than 60",
            Self::FractionBeforeEnd => "has a fraction before its last part; expected whole degrees before minutes, whole minutes before seconds",
            Self::SignAndLetter => "has a minus sign and a letter; expected one of them",
            Self::OtherAxis => "has a letter of the other axis; are latitude and longitude swapped?",
        })
    }
}

/// The letters of the hemispheres; one stands first or last.
const LETTERS: [char; 4] = ['N', 'S', 'E', 'W'];

/// Reads degrees, degrees and minutes, or degrees, minutes and seconds, with a sign or a letter N, S, E, W.
///
/// # Errors
/// When the text is none of these; ranges are checked where both coordinates are known.
pub fn parse_coordinate(text: &str, axis: Axis) -> Result<f64, CoordinateProblem> {
    let upper = text.trim().to_uppercase().replace('\u{2212}', "-");
    if upper.is_empty() {
        return Err(CoordinateProblem::Empty);
    }
    let (letter, upper) = match (upper.strip_prefix(LETTERS), upper.strip_suffix(LETTERS)) {
        (Some(rest), _) => (upper.chars().next(), rest),
        (None, Some(rest)) => (upper.chars().next_back(), rest),
        (None, None) => (None, upper.as_str()),
    };
    let mut body = String::new();
    for c in upper.chars() {
        match c {
            // Degree, minute and second marks of all kinds, and D, M as letters for them.
            '\u{b0}' | '\u{ba}' | '\'' | '"' | '\u{2032}' | '\u{2033}' | '\u{2019}' | '\u{201d}' | ':' | '_' | 'D'
            | 'M' | '\u{a0}' => {
                body.push(' ');
            }
            ',' => body.push('.'),
            c => body.push(c),
        }
    }
    let body = body.trim();
    let (negative, body) = match body.strip_prefix('-') {
        Some(rest) => (true, rest),
        None => (false, body.strip_prefix('+').unwrap_or(body)),
    };
    // "48-15.0": a dash between the parts.
    let spaced = body.replace('-', " ");
    let mut parts = Vec::new();
    for part in spaced.split_whitespace() {
        if !part.bytes().all(|byte| byte.is_ascii_digit() || byte == b'.') {
            return Err(CoordinateProblem::Unreadable);
        }
        parts.push(part.parse::<f64>().map_err(|_| CoordinateProblem::Unreadable)?);
    }
    let degrees = match parts.as_slice() {
        [degrees] => *degrees,
        [degrees, minutes] => whole(*degrees)? + sixtieth(*minutes)? / 60.0,
        [degrees, minutes, seconds] => {
            whole(*degrees)? + whole(sixtieth(*minutes)?)? / 60.0 + sixtieth(*seconds)? / 3600.0
        }
        _ => return Err(CoordinateProblem::Unreadable),
    };
    let minus = match (axis, letter) {
        (_, None) => negative,
        (Axis::Latitude, Some('N' | 'S')) | (Axis::Longitude, Some('E' | 'W')) if negative => {
            return Err(CoordinateProblem::SignAndLetter);
        }
        (Axis::Latitude, Some('N')) | (Axis::Longitude, Some('E')) => false,
        (Axis::Latitude, Some('S')) | (Axis::Longitude, Some('W')) => true,
        _ => return Err(CoordinateProblem::OtherAxis),
    };
    Ok(if minus { -degrees } else { degrees })
}

fn whole(number: f64) -> Result<f64, CoordinateProblem> {
    if number.fract() == 0.0 { Ok(number) } else { Err(CoordinateProblem::FractionBeforeEnd) }
}

fn sixtieth(number: f64) -> Result<f64, CoordinateProblem> {
    if number < 60.0 { Ok(number) } else { Err(CoordinateProblem::Sixty) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn all_ways_of_writing_one_longitude() {
        for text in [
            "-129.4",
            "129.4W",
            "129.4 W",
            "W 129.4",
            "129,4 W",
            "129 24.0 W",
            "129\u{b0}24.0'W",
            "129-24.0W",
            "129:24:00 W",
            "-129 24",
            "129\u{b0} 24\u{2032} 00\u{2033} W",
            "129d24m W",
            "\u{2212}129.4",
            "129\u{b0}24'00\"w",
        ] {
            let degrees = parse_coordinate(text, Axis::Longitude).unwrap();
            assert!((degrees + 129.4).abs() < 1e-12, "{text}: {degrees}");
        }
    }

    #[test]
    fn what_is_wrong_is_named() {
        use CoordinateProblem as P;
        for (text, axis, problem) in [
            ("", Axis::Latitude, P::Empty),
            ("north", Axis::Latitude, P::Unreadable),
            ("48 75.0 N", Axis::Latitude, P::Sixty),
            ("48.5 30 N", Axis::Latitude, P::FractionBeforeEnd),
            ("-48.5 S", Axis::Latitude, P::SignAndLetter),
            ("129.4 W", Axis::Latitude, P::OtherAxis),
            ("48.2 N", Axis::Longitude, P::OtherAxis),
            ("1 2 3 4", Axis::Latitude, P::Unreadable),
            ("4e1", Axis::Latitude, P::Unreadable),
            ("nan", Axis::Latitude, P::Unreadable),
        ] {
            assert_eq!(parse_coordinate(text, axis), Err(problem), "{text}");
        }
    }

    proptest::proptest! {
        #[test]
        fn minutes_and_seconds_come_back(degrees in 0_u32..180, minutes in 0_u32..60, seconds in 0_u32..60) {
            let expected = f64::from(degrees) + f64::from(minutes) / 60.0 + f64::from(seconds) / 3600.0;
            let found = parse_coordinate(&format!("{degrees} {minutes} {seconds} W"), Axis::Longitude).unwrap();
            proptest::prop_assert!((found + expected).abs() < 1e-12);
        }
    }
}
