//! Numbers in text cells.

/// Which character separates whole from fraction.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) enum DecimalMark {
    /// `99.5`
    #[default]
    Point,
    /// `99,5`
    Comma,
}

/// What a text cell holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Cell {
    /// A finite or infinite number (an infinity is written as such, or overflows).
    Number(f64),
    /// Nothing but blanks.
    Empty,
    /// One of the texts that stand for "not a number".
    NotANumber,
    /// One of the texts that stand for "no value".
    NoValue,
    /// Any other text.
    Text,
}

/// Without blanks at both ends.
pub(crate) fn trim(mut cell: &[u8]) -> &[u8] {
    while let [first, rest @ ..] = cell
        && first.is_ascii_whitespace()
    {
        cell = rest;
    }
    while let [rest @ .., last] = cell
        && last.is_ascii_whitespace()
    {
        cell = rest;
    }
    cell
}

/// Powers of ten that a double holds exactly.
const TENS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

/// A plain decimal number of at most 15 digits: exact integer over exact power of ten, so correctly rounded.
fn short_number(cell: &[u8], mark: u8) -> Option<f64> {
    let (negative, digits) = match cell {
        [b'-', rest @ ..] => (true, rest),
        _ => (false, cell),
    };
    if digits.is_empty() || digits.len() > 16 {
        return None;
    }
    let mut whole: u64 = 0;
    let mut count = 0_usize;
    let mut fraction: Option<usize> = None;
    for &byte in digits {
        let digit = byte.wrapping_sub(b'0');
        if digit < 10 {
            whole = whole * 10 + u64::from(digit);
            count += 1;
        } else if byte == mark && fraction.is_none() {
            fraction = Some(count);
        } else {
            return None;
        }
    }
    if count == 0 || count > 15 {
        return None;
    }
    let scale = fraction.map_or(0, |at| count - at);
    let value = whole as f64 / TENS[scale];
    Some(if negative { -value } else { value })
}

/// A number in Rust's notation, with either decimal mark, without thousands marks; blanks around it are allowed.
pub(crate) fn plain_number(cell: &[u8], mark: DecimalMark) -> Option<f64> {
    match parse_number(cell, mark) {
        Cell::Number(value) => Some(value),
        _ => None,
    }
}

/// Reads a cell that should hold a number.
pub(crate) fn parse_number(cell: &[u8], mark: DecimalMark) -> Cell {
    let point = match mark {
        DecimalMark::Point => b'.',
        DecimalMark::Comma => b',',
    };
    if let Some(value) = short_number(cell, point) {
        return Cell::Number(value);
    }
    let cell = trim(cell);
    if cell.is_empty() {
        return Cell::Empty;
    }
    if let Some(value) = short_number(cell, point) {
        return Cell::Number(value);
    }
    long_number(cell, point)
}

#[cold]
fn long_number(cell: &[u8], point: u8) -> Cell {
    let Ok(text) = std::str::from_utf8(cell) else { return Cell::Text };
    let lower = text.to_ascii_lowercase();
    match lower.as_str() {
        "nan" | "-nan" | "+nan" => return Cell::NotANumber,
        "na" | "n/a" | "null" | "none" | "<na>" | "#n/a" => return Cell::NoValue,
        "inf" | "+inf" | "infinity" | "+infinity" => return Cell::Number(f64::INFINITY),
        "-inf" | "-infinity" => return Cell::Number(f64::NEG_INFINITY),
        _ => {}
    }
    // The minus sign that text editors put.
    let lower = lower.replace('\u{2212}', "-");
    if !lower.bytes().all(|byte| byte.is_ascii_digit() || matches!(byte, b'+' | b'-' | b'e') || byte == point) {
        return Cell::Text;
    }
    let text = if point == b',' { lower.replace(',', ".") } else { lower };
    text.parse().map_or(Cell::Text, Cell::Number)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(text: &str) -> Cell {
        parse_number(text.as_bytes(), DecimalMark::Point)
    }

    // The reference is the standard library's own correctly rounded parser.
    #[test]
    fn fast_numbers_equal_the_standard_library() {
        for text in
            ["0", "-0.0", "99.52", "123456789012345", "0.000000000001", "-86.638776", "1.2589", "5e-324", "1e300"]
        {
            let expected: f64 = text.parse().unwrap();
            assert_eq!(point(text), Cell::Number(expected), "{text}");
            assert_eq!(point(&format!(" {text}\t")), Cell::Number(expected), "{text}");
        }
    }

    #[test]
    fn marks_and_missing_texts() {
        assert_eq!(parse_number(b"99,52", DecimalMark::Comma), Cell::Number(99.52));
        assert_eq!(parse_number(b"1.234,5", DecimalMark::Comma), Cell::Text);
        assert_eq!(point("1,234.5"), Cell::Text);
        assert_eq!(point("1 234"), Cell::Text);
        assert_eq!(point(""), Cell::Empty);
        assert_eq!(point("NaN"), Cell::NotANumber);
        assert_eq!(point("n/a"), Cell::NoValue);
        assert_eq!(point("-Inf"), Cell::Number(f64::NEG_INFINITY));
        assert_eq!(point("0x10"), Cell::Text);
        assert_eq!(point("1_000"), Cell::Text);
        assert_eq!(point("\u{2212}3.5"), Cell::Number(-3.5));
    }

    proptest::proptest! {
        #[test]
        fn any_short_decimal_parses_as_the_standard_library_does(whole in -9_999_999_i64..9_999_999, digits in 0_usize..8, tail in 0_u32..9_999_999) {
            let text = if digits == 0 { format!("{whole}") } else { format!("{whole}.{tail:0digits$}") };
            let expected: f64 = text.parse().unwrap();
            proptest::prop_assert_eq!(point(&text), Cell::Number(expected));
        }
    }
}
