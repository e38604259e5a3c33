//! Numbers and times as text, the same on every machine.

use crate::units::Instant;
use std::io::Write;

/// Appends a number; nothing for NaN.
pub(super) fn push_number(out: &mut Vec<u8>, number: f64, decimals: Option<usize>) {
    if number.is_nan() {
        return;
    }
    if number.is_infinite() {
        out.extend_from_slice(if number > 0.0 { b"inf" } else { b"-inf" });
        return;
    }
    match decimals {
        Some(decimals) => push_fixed(out, number, decimals),
        None => push_shortest(out, number),
    }
}

/// The shortest text that gives back the same number.
fn push_shortest(out: &mut Vec<u8>, number: f64) {
    let size = number.abs();
    let written =
        if size == 0.0 || (1e-5..1e16).contains(&size) { write!(out, "{number}") } else { write!(out, "{number:e}") };
    written.expect("writing to memory does not fail");
}

fn push_fixed(out: &mut Vec<u8>, number: f64, decimals: usize) {
    const SCALES: [f64; 8] = [1.0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7];
    if let Some(scale) = SCALES.get(decimals)
        && number.abs() < 1e8
    {
        let scaled = number.abs() * scale;
        let rounded = scaled.round();
        // Away from a tie the rounding of the product cannot change the digit.
        if ((scaled - scaled.floor()) - 0.5).abs() > 1e-6 {
            return push_digits(out, number < 0.0, rounded as u64, decimals);
        }
    }
    let start = out.len();
    write!(out, "{number:.decimals$}").expect("writing to memory does not fail");
    let is_zero = out[start..].iter().all(|byte| matches!(byte, b'-' | b'0' | b'.'));
    if is_zero && out.get(start) == Some(&b'-') {
        out.remove(start);
    }
}

fn push_digits(out: &mut Vec<u8>, negative: bool, whole: u64, decimals: usize) {
    if negative && whole > 0 {
        out.push(b'-');
    }
    let mut digits = [b'0'; 24];
    let mut at = digits.len();
    let mut rest = whole;
    let mut count = 0;
    while rest > 0 || count <= decimals {
        at -= 1;
        digits[at] = b'0' + (rest % 10) as u8;
        rest /= 10;
        count += 1;
        if count == decimals && decimals > 0 {
            at -= 1;
            digits[at] = b'.';
        }
    }
    out.extend_from_slice(&digits[at..]);
}

/// Appends an instant as ISO 8601 in UTC.
#[derive(Debug, Default)]
pub(super) struct TimeText {
    /// The last instant and its text.
    last: Option<(i64, String)>,
}

impl TimeText {
    pub(super) fn push(&mut self, out: &mut Vec<u8>, ms: i64) {
        match &self.last {
            Some((before, text)) if *before == ms => out.extend_from_slice(text.as_bytes()),
            _ => {
                let text = Instant(ms).iso();
                out.extend_from_slice(text.as_bytes());
                self.last = Some((ms, text));
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn text(number: f64, decimals: Option<usize>) -> String {
        let mut out = Vec::new();
        push_number(&mut out, number, decimals);
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn numbers_as_text() {
        for (number, decimals, expected) in [
            (1.5, None, "1.5"),
            (f64::NAN, None, ""),
            (f64::NAN, Some(2), ""),
            (-0.001, Some(2), "0.00"),
            (0.0, Some(0), "0"),
            (-1.25, Some(3), "-1.250"),
            (0.5, Some(0), "0"),
            (2.675, Some(2), "2.67"),
            (1e-7, None, "1e-7"),
            (12_345_678.9, Some(1), "12345678.9"),
            (f64::INFINITY, Some(1), "inf"),
        ] {
            assert_eq!(text(number, decimals), expected, "{number} {decimals:?}");
        }
    }

    proptest::proptest! {
        // The reference is the standard library's exact formatting.
        #[test]
        fn fixed_decimals_equal_the_standard_library(number in -1e7_f64..1e7, decimals in 0_usize..8) {
            let mut expected = format!("{number:.decimals$}");
            if expected.starts_with('-') && expected.bytes().all(|byte| matches!(byte, b'-' | b'0' | b'.')) {
                expected.remove(0);
            }
            proptest::prop_assert_eq!(text(number, Some(decimals)), expected);
        }

        #[test]
        fn the_shortest_text_gives_back_the_number(bits in proptest::prelude::any::<u64>()) {
            let number = f64::from_bits(bits);
            if number.is_finite() {
                proptest::prop_assert_eq!(text(number, None).parse::<f64>().unwrap().to_bits(), bits);
            }
        }
    }
}
