//! Reference, kind and scale of levels from a unit or a column name.

use crate::model::{LevelKind, LevelScale, PressureReference};

/// What a text states about levels.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct StatedUnit {
    /// The reference pressure.
    pub reference: Option<PressureReference>,
    /// Band level or spectral density level.
    pub kind: Option<LevelKind>,
    /// Decibels or linear.
    pub scale: Option<LevelScale>,
}

impl StatedUnit {
    /// The statements of both; the first goes before the second.
    #[must_use]
    pub fn or(self, other: Self) -> Self {
        Self {
            reference: self.reference.or(other.reference),
            kind: self.kind.or(other.kind),
            scale: self.scale.or(other.scale),
        }
    }
}

/// Reads statements such as "dB re 1 µPa²/Hz", `level_db_re_1upa`, "µPa^2/Hz", "dB re 20 uPa".
///
/// ISO 18405:2017 refers a sound pressure level to 1 µPa (or 1 µPa² for the mean square) and a spectral density level to
/// 1 µPa²/Hz; so a reference with "per hertz" states a density and one without states a band level. A name that says
/// density beside a reference without "per hertz" contradicts itself: then the kind counts as not stated.
pub fn stated_unit(text: &str) -> StatedUnit {
    let mut plain =
        text.to_lowercase().replace(['\u{b5}', '\u{3bc}'], "u").replace(['\u{b2}', '^'], "2").replace("22", "2");
    plain = plain.replace("micro", "u").replace("pascal", "pa").replace("\u{221a}", "sqrt");
    let spaced: String =
        plain.chars().map(|c| if matches!(c, '_' | '(' | ')' | '[' | ']' | ',') { ' ' } else { c }).collect();
    let dense: String = spaced.chars().filter(|c| !c.is_whitespace()).collect();
    let decibel = dense.contains("db");
    let names_density = ["psd", "density", "spectrallevel"].iter().any(|word| dense.contains(word));
    let pressure = if dense.contains("re20upa") {
        Some(PressureReference::TwentyMicropascals)
    } else if dense.contains("re1upa") || dense.contains("reupa") {
        Some(PressureReference::Micropascal)
    } else if dense.contains("re1pa") || dense.contains("repa") {
        Some(PressureReference::Pascal)
    } else {
        None
    };
    let per_hertz = ["/hz", "perhz", "hz-1", "/sqrt", "/rthz", "hz2-1"].iter().any(|word| dense.contains(word));
    if let Some(reference) = pressure {
        let kind = match (per_hertz, names_density) {
            (true, _) => Some(LevelKind::SpectralDensityLevel),
            (false, false) => Some(LevelKind::BandLevel),
            (false, true) => None,
        };
        return StatedUnit { reference: Some(reference), kind, scale: Some(LevelScale::Decibel) };
    }
    if decibel {
        let kind = (names_density || per_hertz).then_some(LevelKind::SpectralDensityLevel);
        return StatedUnit { reference: None, kind, scale: Some(LevelScale::Decibel) };
    }
    // A linear unit: whole words only, since "pa" is in many words.
    let words: Vec<&str> = spaced.split_whitespace().collect();
    let linear = |unit: &str, reference| {
        words.iter().rev().find_map(|word| {
            let rest = word.strip_prefix(unit)?;
            let square = rest.starts_with('2');
            let rest = rest.strip_prefix('2').unwrap_or(rest);
            let tail_is_density = matches!(rest, "/hz" | "hz-1" | "/sqrthz" | "/sqrt" | "perhz");
            (rest.is_empty() || tail_is_density).then_some(StatedUnit {
                reference: Some(reference),
                kind: Some(if per_hertz { LevelKind::SpectralDensityLevel } else { LevelKind::BandLevel }),
                scale: Some(if square { LevelScale::MeanSquare } else { LevelScale::RootMeanSquare }),
            })
        })
    };
    linear("upa", PressureReference::Micropascal)
        .or_else(|| linear("pa", PressureReference::Pascal))
        .unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use LevelKind::{BandLevel, SpectralDensityLevel};
    use LevelScale::{Decibel, MeanSquare, RootMeanSquare};
    use PressureReference::{Micropascal, Pascal, TwentyMicropascals};

    // ISO 18405:2017, sound pressure level and mean-square sound pressure spectral density level (from memory).
    #[test]
    fn references_and_kinds_are_read_from_units() {
        for (text, reference, kind, scale) in [
            ("dB re 1 \u{b5}Pa\u{b2}/Hz", Micropascal, SpectralDensityLevel, Decibel),
            ("dB re 1 \u{3bc}Pa^2/Hz", Micropascal, SpectralDensityLevel, Decibel),
            ("dB re 1 uPa", Micropascal, BandLevel, Decibel),
            ("level (dB re 1 uPa2)", Micropascal, BandLevel, Decibel),
            ("level_db_re_1upa2_per_hz", Micropascal, SpectralDensityLevel, Decibel),
            ("dB re 1 Pa^2/Hz", Pascal, SpectralDensityLevel, Decibel),
            ("dB re 1 Pa", Pascal, BandLevel, Decibel),
            ("dB re 20 uPa", TwentyMicropascals, BandLevel, Decibel),
            ("\u{b5}Pa\u{b2}/Hz", Micropascal, SpectralDensityLevel, MeanSquare),
            ("uPa2", Micropascal, BandLevel, MeanSquare),
            ("rms (Pa)", Pascal, BandLevel, RootMeanSquare),
        ] {
            let expected = StatedUnit { reference: Some(reference), kind: Some(kind), scale: Some(scale) };
            assert_eq!(stated_unit(text), expected, "{text}");
        }
    }

    #[test]
    fn what_is_not_said_is_not_read() {
        assert_eq!(stated_unit("level_db"), StatedUnit { reference: None, kind: None, scale: Some(Decibel) });
        assert_eq!(stated_unit("level"), StatedUnit::default());
        assert_eq!(stated_unit("space"), StatedUnit::default());
        assert_eq!(stated_unit("psd_db").kind, Some(SpectralDensityLevel));
        assert_eq!(stated_unit("psd (dB re 1 uPa)").kind, None);
    }
}
