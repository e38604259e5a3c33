//! Bands from texts: "63 Hz", "1 kHz", "1k", `OL_31.5`, "20-50 Hz".

/// What a text says about a band.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum BandText {
    /// A centre, Hz.
    Centre {
        /// The number, Hz.
        hz: f64,
        /// Whether the text named the unit (Hz, kHz or k).
        unit_stated: bool,
    },
    /// Both edges, Hz.
    Edges {
        /// Lower edge, Hz.
        low_hz: f64,
        /// Upper edge, Hz.
        high_hz: f64,
    },
}

/// Prefixes that say "band" or "level" by themselves: after these a bare number is a frequency.
const PREFIXES: &[&str] = &[
    "",
    "b",
    "band",
    "bands",
    "bl",
    "f",
    "fc",
    "freq",
    "frequency",
    "hz",
    "l",
    "leq",
    "level",
    "level_db",
    "lp",
    "ob",
    "oct",
    "octave",
    "ol",
    "db",
    "psd",
    "spl",
    "spl_db",
    "dd",
    "ddec",
    "decidecade",
    "third_octave",
    "tob",
    "tol",
    "x",
];

/// Reads a band from a header or a cell. `prefix` is a further prefix to accept before a bare number.
///
/// A text is a band when it is a number with Hz, kHz or k behind it, after any words; or a bare number, alone or after a
/// word that means band or level. `wind_10m` and `temp_2` are none.
pub fn parse_band_text(text: &str, prefix: Option<&str>) -> Option<BandText> {
    let lower = text.trim().to_lowercase();
    let lower = without_level_unit(&lower);
    if let Some(prefix) = prefix.map(str::to_lowercase)
        && let Some(rest) = lower.strip_prefix(&prefix)
    {
        return number_part(rest.trim_matches(['_', ' ', '-']), true);
    }
    let start = number_start(lower)?;
    let (head, tail) = lower.split_at(start);
    // A minus sign is no prefix.
    if matches!(head.trim(), "-" | "\u{2212}") {
        return None;
    }
    let head = head.trim_matches(|c: char| matches!(c, '_' | '-' | ' ' | '(' | '['));
    let tail = tail.trim_end_matches([')', ']', ' ']);
    let known = PREFIXES.contains(&head.replace(' ', "_").as_str());
    number_part(tail, known)
}

/// Cuts a unit of the level behind the band: "63 hz (db re 1 upa)", `63_db`.
fn without_level_unit(text: &str) -> &str {
    let cuts = ["(db", "[db", " db", "_db", "(upa", "(\u{b5}pa", "(\u{3bc}pa", "(pa"];
    let behind_number = |at: &usize| text[..*at].bytes().any(|byte| byte.is_ascii_digit());
    let at = cuts.iter().filter_map(|cut| text.find(cut)).filter(behind_number).min();
    at.map_or(text, |at| &text[..at]).trim_end()
}

/// Where the trailing number (or pair of numbers) begins: the first digit that follows no letter directly, else the first digit.
fn number_start(text: &str) -> Option<usize> {
    let first = text.find(|c: char| c.is_ascii_digit())?;
    let mut previous = ' ';
    for (at, c) in text.char_indices() {
        if c.is_ascii_digit() && !previous.is_alphanumeric() && previous != '.' {
            return Some(at);
        }
        previous = c;
    }
    Some(first)
}

/// A number with an optional unit, or two with a dash.
fn number_part(text: &str, bare_allowed: bool) -> Option<BandText> {
    if let Some(at) = text.char_indices().skip(1).find(|(_, c)| matches!(c, '-' | '\u{2013}')).map(|(at, _)| at) {
        let (low, high) = text.split_at(at);
        let high = high.trim_start_matches(['-', '\u{2013}']);
        let (low, low_unit) = one_number(low.trim())?;
        let (high, high_unit) = one_number(high.trim())?;
        let unit = high_unit.or(low_unit);
        if unit.is_none() && !bare_allowed {
            return None;
        }
        let (low_scale, high_scale) = (low_unit.or(unit).unwrap_or(1.0), high_unit.or(unit).unwrap_or(1.0));
        return Some(BandText::Edges { low_hz: low * low_scale, high_hz: high * high_scale });
    }
    let (number, unit) = one_number(text)?;
    if unit.is_none() && !bare_allowed {
        return None;
    }
    Some(BandText::Centre { hz: number * unit.unwrap_or(1.0), unit_stated: unit.is_some() })
}

/// A number and the hertz of its unit, if one follows.
fn one_number(text: &str) -> Option<(f64, Option<f64>)> {
    let end = text.find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | ','))).unwrap_or(text.len());
    let (digits, unit) = text.split_at(end);
    let unit = match unit.trim_matches([' ', '_']) {
        "" => None,
        "hz" => Some(1.0),
        "k" | "khz" => Some(1000.0),
        _ => return None,
    };
    if digits.ends_with(',') {
        return None;
    }
    let comma = digits.matches(',').count();
    let digits = if comma == 1 && !digits.contains('.') { digits.replace(',', ".") } else { digits.to_owned() };
    let number: f64 = digits.parse().ok()?;
    (number.is_finite() && number >= 0.0).then_some((number, unit))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn centre(text: &str) -> Option<f64> {
        match parse_band_text(text, None) {
            Some(BandText::Centre { hz, .. }) => Some(hz),
            _ => None,
        }
    }

    #[test]
    fn header_forms_of_the_trade() {
        for (text, hz) in [
            ("63 Hz", 63.0),
            ("63Hz", 63.0),
            ("63_hz", 63.0),
            ("1 kHz", 1000.0),
            ("1k", 1000.0),
            ("12.5k", 12_500.0),
            ("63.1", 63.1),
            ("OL_31.5", 31.5),
            ("ol_16k", 16_000.0),
            ("TOL63", 63.0),
            ("1,25 kHz", 1250.0),
            ("L 125 Hz", 125.0),
            ("level_db_63", 63.0),
            ("spl [2 kHz]", 2000.0),
            ("X63.1", 63.1),
            ("band 1000", 1000.0),
            ("63_db", 63.0),
            ("63 Hz (dB re 1 \u{b5}Pa)", 63.0),
            ("1 kHz [dB re 1 uPa2/Hz]", 1000.0),
            ("OL_63_db_re_1upa", 63.0),
            ("63 Hz (uPa2)", 63.0),
            ("anything 63 Hz", 63.0),
        ] {
            assert_eq!(centre(text), Some(hz), "{text}");
        }
    }

    #[test]
    fn other_columns_are_no_bands() {
        for text in [
            "wind_10m",
            "temp_2",
            "depth",
            "qc",
            "p95",
            "sensor1",
            "2020-01-01",
            "n_samples",
            "lat",
            "wave 1",
            "63 Hz flag",
            "-25",
            "12,",
            "10th",
            "",
        ] {
            assert_eq!(centre(text), None, "{text}");
        }
    }

    #[test]
    fn pairs_are_edges() {
        let edges = |text| match parse_band_text(text, None) {
            Some(BandText::Edges { low_hz, high_hz }) => Some((low_hz, high_hz)),
            _ => None,
        };
        assert_eq!(edges("20-50 Hz"), Some((20.0, 50.0)));
        assert_eq!(edges("20 Hz - 24 kHz"), Some((20.0, 24_000.0)));
        assert_eq!(edges("bb_0.02-24k"), Some((20.0, 24_000.0)));
        assert_eq!(edges("0.02-24 kHz"), Some((20.0, 24_000.0)));
        assert_eq!(parse_band_text("zz63", Some("zz")), Some(BandText::Centre { hz: 63.0, unit_stated: false }));
    }

    proptest::proptest! {
        #[test]
        fn a_number_with_its_unit_comes_back(hz in 1.0_f64..200_000.0, prefix in "[a-z]{0,6}") {
            let text = format!("{prefix} {hz} Hz");
            proptest::prop_assert_eq!(centre(&text), Some(hz));
        }

        #[test]
        fn any_text_is_read_without_panic(text in "\\PC{0,30}") {
            let _ = parse_band_text(&text, None);
        }
    }
}
