//! Units of wind speed in tables.

/// Metres per second in one unit of this name; `None` for anything that is no speed unit.
pub fn speed_factor(text: &str) -> Option<f64> {
    let lower = text.trim().trim_matches(|c| matches!(c, '(' | ')' | '[' | ']')).trim().to_lowercase();
    let plain = lower.replace("**", "").replace('^', "");
    match plain.as_str() {
        "m/s" | "m s-1" | "m.s-1" | "ms-1" | "mps" | "m_s" | "m s" | "meter per second" | "metre per second"
        | "meters per second" | "metres per second" => Some(1.0),
        // An international knot is 1852 m an hour, exactly (ISO 80000-3).
        "knots" | "knot" | "kn" | "kt" | "kts" => Some(1852.0 / 3600.0),
        "km/h" | "kmh" | "km h-1" | "kph" | "km_h" => Some(1.0 / 3.6),
        // A statute mile is 1609.344 m, exactly.
        "mph" | "mi/h" => Some(1609.344 / 3600.0),
        _ => None,
    }
}

/// The unit in a column name: `wind_speed_kn`, "Wind speed (m/s)".
pub(super) fn unit_in_name(name: &str) -> Option<f64> {
    let lower = name.trim().to_lowercase();
    if let Some(open) = lower.rfind(['(', '['])
        && let Some(factor) = speed_factor(&lower[open..])
    {
        return Some(factor);
    }
    ["m_s", "ms-1", "kn", "kt", "kts", "knots", "km_h", "kmh", "mph", "mps", "m/s"]
        .into_iter()
        .find(|unit| lower.strip_suffix(unit).is_some_and(|rest| rest.ends_with(['_', ' '])))
        .and_then(speed_factor)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_of_the_trade() {
        for (text, factor) in [
            ("m/s", 1.0),
            ("M/S", 1.0),
            ("m s**-1", 1.0),
            ("knots", 0.514_444_444_444_444_5),
            ("(km/h)", 0.277_777_777_777_777_8),
            ("mph", 0.44704),
        ] {
            assert!((speed_factor(text).unwrap() - factor).abs() < 1e-15, "{text}");
        }
        assert_eq!(speed_factor("Bft"), None);
        assert_eq!(speed_factor("1"), None);
        assert_eq!(unit_in_name("wind_speed_m_s"), Some(1.0));
        assert_eq!(unit_in_name("Wind speed (kn)"), speed_factor("kn"));
        assert_eq!(unit_in_name("wind_speed"), None);
        assert_eq!(unit_in_name("wind_speed_10m"), None);
    }
}
