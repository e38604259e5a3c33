//! Unit texts of densities, frequencies and directions.

use super::options::DensityEncoding;
use std::f64::consts::{PI, TAU};

/// Energy to variance: density of sea water (common practice) times standard gravity, N/m3.
const WEIGHT_N_M3: f64 = 1025.0 * 9.806_65;

/// What the unit text of a density says.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct DensityUnit {
    /// m2/Hz/rad (m2/Hz without angle) a unit.
    pub(super) factor: f64,
    /// How it is stored, where the text says so.
    pub(super) encoding: Option<DensityEncoding>,
}

/// Reads the unit of a density; `angle`: whether it is one over directions too. The error says what is wrong with it.
pub(super) fn density_unit(text: &str, angle: bool) -> Result<DensityUnit, String> {
    let lower = text.trim().to_lowercase();
    let (inner, encoding) = match lower.strip_prefix("log10").map(str::trim) {
        Some(rest) => {
            let inner = rest.strip_prefix('(').and_then(|rest| rest.strip_suffix(')')).unwrap_or(rest);
            let (unit, added) = match inner.rsplit_once('+') {
                Some((unit, added)) => {
                    let added: f64 = added.trim().parse().map_err(|_| format!("`{added}` is no added constant"))?;
                    (unit.trim(), added)
                }
                None => (inner.trim(), 0.0),
            };
            (unit.to_owned(), Some(DensityEncoding::Log10 { added }))
        }
        None if lower.starts_with("ln") || lower.contains("log") => {
            return Err("only the decimal logarithm (`log10(..)`) is understood".to_owned());
        }
        None => (lower, None),
    };
    let factor = factor(&inner, angle)?;
    Ok(DensityUnit { factor, encoding })
}

/// A unit text as its factors with their powers.
fn powers(text: &str) -> Option<Vec<(String, i32)>> {
    let plain = text.replace("**", "").replace(['^', '(', ')', '{', '}'], "").replace('²', "2").replace("⁻¹", "-1");
    let plain = plain.replace(" per ", " / ").replace('/', " / ");
    let mut found = Vec::new();
    let mut below = false;
    for word in plain.split([' ', '.', '*', '·', '_']).filter(|word| !word.is_empty()) {
        if word == "/" {
            below = true;
            continue;
        }
        let end = word.find(|c: char| c.is_ascii_digit() || c == '-' || c == '+').unwrap_or(word.len());
        let (name, power) = word.split_at(end);
        let power: i32 = if power.is_empty() { 1 } else { power.parse().ok()? };
        if name.is_empty() {
            // A bare "1" as in "1/s".
            if power == 1 {
                continue;
            }
            return None;
        }
        // What follows a stroke divides; a stroke is written before each divisor.
        found.push((name.to_owned(), if below { -power } else { power }));
        below = false;
    }
    Some(found)
}

/// Factor of a unit of m2 s rad-1 or of energy, or the sentence that says what it lacks.
fn factor(text: &str, angle: bool) -> Result<f64, String> {
    let unknown = || "it is no unit of variance density".to_owned();
    let (mut factor, mut metres, mut seconds, mut angles, mut joules) = (1.0, 0, 0, 0, 0);
    for (name, power) in powers(text).ok_or_else(unknown)? {
        match name.as_str() {
            "m" | "metre" | "metres" | "meter" | "meters" => metres += power,
            "cm" => {
                metres += power;
                factor *= 0.01_f64.powi(power);
            }
            "s" | "sec" | "second" | "seconds" => seconds += power,
            "hz" | "hertz" => seconds -= power,
            "rad" | "radian" | "radians" => angles += power,
            "deg" | "degs" | "degree" | "degrees" | "degr" | "°" => {
                angles += power;
                // One over a degree is 180/pi over a radian.
                factor *= (PI / 180.0).powi(power);
            }
            "j" | "joule" | "joules" => joules += power,
            "kj" => {
                joules += power;
                factor *= 1000.0_f64.powi(power);
            }
            _ => return Err(unknown()),
        }
    }
    if joules == 1 {
        // Energy on a unit of area: J/m2 is rho g times the variance.
        factor /= WEIGHT_N_M3;
        metres += 4;
    }
    match (metres, seconds, angles) {
        (2, 1, -1) if angle => Ok(factor),
        (2, 1, 0) if !angle => Ok(factor),
        // Per radian a second and per radian.
        (2, 1, -2) if angle => Err("it is a density over angular frequency".to_owned()),
        (2, 1, 0) => Err("it states no angle: per radian or per degree differ by 57.3".to_owned()),
        _ => Err(unknown()),
    }
}

/// What an axis of frequency holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum FrequencyUnit {
    /// Times this gives Hz.
    Frequency(f64),
    /// Times this gives a period in s.
    Period(f64),
}

/// Reads the unit of a frequency axis.
pub(super) fn frequency_unit(text: &str) -> Option<FrequencyUnit> {
    let lower = text.trim().to_lowercase();
    if matches!(lower.as_str(), "khz" | "mhz") {
        return Some(FrequencyUnit::Frequency(if text.trim().starts_with('m') { 1e-3 } else { 1e3 }));
    }
    match powers(&lower)?.as_slice() {
        [(name, -1)] if matches!(name.as_str(), "s" | "sec" | "second" | "seconds") => {
            Some(FrequencyUnit::Frequency(1.0))
        }
        [(name, 1)] if matches!(name.as_str(), "hz" | "hertz") => Some(FrequencyUnit::Frequency(1.0)),
        [(name, 1)] if matches!(name.as_str(), "s" | "sec" | "second" | "seconds") => Some(FrequencyUnit::Period(1.0)),
        [(name, 1), (per, -1)]
            if name.starts_with("rad") && matches!(per.as_str(), "s" | "sec" | "second" | "seconds") =>
        {
            Some(FrequencyUnit::Frequency(1.0 / TAU))
        }
        _ => None,
    }
}

/// Radians a unit of a direction axis.
pub(super) fn direction_unit_rad(text: &str) -> Option<f64> {
    let lower = text.trim().to_lowercase();
    if lower.starts_with("deg") || matches!(lower.as_str(), "arc_degree" | "arc_degrees" | "°") {
        return Some(PI / 180.0);
    }
    lower.starts_with("rad").then_some(1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn densities_are_read_however_they_are_spelled() {
        let per_degree = 180.0 / PI;
        for (text, expected) in [
            ("m2 s rad-1", 1.0),
            ("m**2 s radian**-1", 1.0),
            ("m^2 s rad^-1", 1.0),
            ("m2/Hz/rad", 1.0),
            ("m2 Hz-1 rad-1", 1.0),
            ("m2 s / rad", 1.0),
            ("m2.s.rad-1", 1.0),
            ("m2 s degree-1", per_degree),
            ("m2/(Hz degree)", f64::NAN),
            ("m2/Hz/deg", per_degree),
            ("m^2/Hz/degree", per_degree),
            ("J m-2 Hz-1 rad-1", 1.0 / 10_051.816_25),
            ("J/m2/Hz/degr", per_degree / 10_051.816_25),
        ] {
            let found = density_unit(text, true);
            if expected.is_nan() {
                assert!(found.is_err(), "{text}: {found:?}");
            } else {
                assert!((found.unwrap().factor / expected - 1.0).abs() < 1e-12, "{text}");
            }
        }
        for text in ["m2 s", "m2/Hz", "m", "m2 s rad-2", "log(m2 s rad-1)", "", "1"] {
            assert!(density_unit(text, true).is_err(), "{text}");
        }
        assert!((density_unit("m2 s", false).unwrap().factor - 1.0).abs() < 1e-15);
    }

    #[test]
    fn logarithms_are_read_with_their_added_constant() {
        let unit = density_unit("log10(m2 s rad-1 +1E-12)", true).unwrap();
        assert_eq!(unit.encoding, Some(DensityEncoding::Log10 { added: 1e-12 }));
        let unit = density_unit("log10(m2 s rad-1)", true).unwrap();
        assert_eq!(unit.encoding, Some(DensityEncoding::Log10 { added: 0.0 }));
    }

    #[test]
    fn axes_have_units_or_none() {
        for text in ["s-1", "1/s", "Hz", "hertz", "s**-1", "s^-1", "1 / s"] {
            assert_eq!(frequency_unit(text), Some(FrequencyUnit::Frequency(1.0)), "{text}");
        }
        assert_eq!(frequency_unit("rad s-1"), Some(FrequencyUnit::Frequency(1.0 / TAU)));
        assert_eq!(frequency_unit("rad/s"), Some(FrequencyUnit::Frequency(1.0 / TAU)));
        assert_eq!(frequency_unit("s"), Some(FrequencyUnit::Period(1.0)));
        assert_eq!(frequency_unit("mHz"), Some(FrequencyUnit::Frequency(1e-3)));
        for text in ["1", "", "m", "index"] {
            assert_eq!(frequency_unit(text), None, "{text}");
        }
    }
}
