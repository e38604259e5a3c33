//! Numbers as a reader sees them: rounded to what the uncertainty deserves, minus signs, missing as an en dash.

/// What stands for a missing value.
pub const MISSING: &str = "–";

/// Decimals to print for a value whose interval has this half-width: the last digit is at most a third of it.
/// Between 0 and 4; an interval of zero or unknown width gives `fallback`.
pub fn decimals_for(half_width: f64, fallback: usize) -> usize {
    if !half_width.is_finite() || half_width <= 0.0 {
        return fallback;
    }
    (0..4).find(|&d| half_width * powi(10.0, d) >= 3.0).unwrap_or(4) as usize
}

/// A number with a fixed count of decimals and a true minus sign; an en dash when it is not finite.
pub fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return MISSING.to_owned();
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        // What rounds to zero carries no sign.
        Some(digits) if digits.bytes().all(|b| b == b'0' || b == b'.') => digits.to_owned(),
        Some(digits) => format!("−{digits}"),
        None => text,
    }
}

/// A value with its interval and unit, such as `60.1 (59.6 to 60.7) dB`; the decimals follow the interval's width.
/// Without a finite interval only the value, with `fallback` decimals; an en dash when there is no value.
pub fn with_interval(value: f64, low: f64, high: f64, unit: &str, fallback: usize) -> String {
    if !value.is_finite() {
        return MISSING.to_owned();
    }
    let body = if low.is_finite() && high.is_finite() {
        let decimals = decimals_for((high - low) / 2.0, fallback);
        format!("{} ({} to {})", fixed(value, decimals), fixed(low, decimals), fixed(high, decimals))
    } else {
        fixed(value, fallback)
    };
    with_unit(&body, unit)
}

/// A value and its unit with a no-break space between; no unit on a missing value.
pub fn quantity(value: f64, decimals: usize, unit: &str) -> String {
    let body = fixed(value, decimals);
    if body == MISSING { body } else { with_unit(&body, unit) }
}

/// A whole number with thin groups of three, such as `17 520` (no-break spaces).
pub fn count(value: usize) -> String {
    let digits = value.to_string();
    // Four digits read well without a gap.
    if digits.len() < 5 {
        return digits;
    }
    let mut text = String::new();
    for (i, c) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push('\u{a0}');
        }
        text.push(c);
    }
    text
}

/// A frequency with its unit: `63 Hz`, `12.5 kHz`; at most four significant digits.
pub fn frequency(hz: f64) -> String {
    if !hz.is_finite() {
        return MISSING.to_owned();
    }
    let (value, unit) = if hz >= 1000.0 { (hz / 1000.0, "kHz") } else { (hz, "Hz") };
    let decimals = if value >= 100.0 {
        1
    } else if value >= 10.0 {
        2
    } else {
        3
    };
    let text = fixed(value, decimals);
    with_unit(text.trim_end_matches('0').trim_end_matches('.'), unit)
}

/// A tick's number: plain digits, or a power of ten where these would be too long.
pub(crate) fn tick(value: f64, decimals: usize) -> String {
    let size = value.abs();
    if size >= 1e6 || (size > 0.0 && decimals > 4) {
        let exponent = libm::floor(libm::log10(size) + 1e-9);
        let mantissa = value / libm::pow(10.0, exponent);
        let head = fixed(mantissa, 2);
        let head = if head.contains('.') { head.trim_end_matches('0').trim_end_matches('.') } else { &head };
        let power: String = format!("{exponent:.0}").chars().map(superscript).collect();
        return if head == "1" { format!("10{power}") } else { format!("{head}·10{power}") };
    }
    fixed(value, decimals)
}

fn superscript(c: char) -> char {
    match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '0' => '⁰',
        '4'..='9' => char::from_u32(0x2070 + c as u32 - '0' as u32).unwrap_or(c),
        other => other,
    }
}

fn with_unit(body: &str, unit: &str) -> String {
    match unit {
        "" => body.to_owned(),
        "°" | "%" => format!("{body}{unit}"),
        _ => format!("{body}\u{a0}{unit}"),
    }
}

fn powi(base: f64, exponent: i32) -> f64 {
    (0..exponent).fold(1.0, |product, _| product * base)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rounding_follows_the_interval() {
        assert_eq!(with_interval(60.114, 59.56, 60.71, "dB", 1), "60.1 (59.6 to 60.7)\u{a0}dB");
        assert_eq!(with_interval(23.41, 11.2, 35.9, "dB", 1), "23 (11 to 36)\u{a0}dB");
        assert_eq!(with_interval(9.8123, 9.79, 9.83, "m/s", 1), "9.812 (9.790 to 9.830)\u{a0}m/s");
        assert_eq!(with_interval(9.8123, f64::NAN, f64::NAN, "m/s", 1), "9.8\u{a0}m/s");
        assert_eq!(with_interval(f64::NAN, 1.0, 2.0, "m/s", 1), "–");
        assert_eq!(decimals_for(0.0, 2), 2);
        assert_eq!(decimals_for(1e-9, 2), 4);
    }

    #[test]
    fn signs_and_groups() {
        assert_eq!(fixed(-0.04, 1), "0.0");
        assert_eq!(fixed(-3.26, 1), "−3.3");
        assert_eq!(quantity(f64::INFINITY, 1, "dB"), "–");
        assert_eq!(count(8760), "8760");
        assert_eq!(count(1_234_567), "1\u{a0}234\u{a0}567");
        assert_eq!(frequency(63.0957), "63.1\u{a0}Hz");
        assert_eq!(frequency(12_500.0), "12.5\u{a0}kHz");
        assert_eq!(frequency(100.0), "100\u{a0}Hz");
        assert_eq!(tick(2e9, 0), "2·10⁹");
        assert_eq!(tick(1e-7, 7), "10⁻⁷");
        assert_eq!(tick(1.0, 7), "10⁰");
        assert_eq!(tick(0.0, 0), "0");
    }
}
