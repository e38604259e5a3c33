//! From the number in a cell to dB re 1 uPa (or 1 uPa²/Hz), or to the reason why there is none.

use super::options::LevelOptions;
use crate::io::delimited::{Cell, DecimalMark, parse_number, plain_number};
use crate::model::{LevelScale, Missing, PressureReference};

/// No hydrophone record holds levels beyond these, dB re 1 uPa: sums of the quietest seas and the loudest sources keep tens
/// of decibels away from both (common practice). Numbers beyond are missing codes or wrong units.
const PLAUSIBLE_DB: std::ops::RangeInclusive<f64> = -100.0..=300.0;

/// How level numbers become levels.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Conversion {
    scale: LevelScale,
    add_db: f64,
    codes: Vec<f64>,
    code_texts: Vec<String>,
}

/// What a cell comes to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Converted {
    /// A level, dB.
    Level(f64),
    /// None, and why.
    Missing(Missing),
    /// A text that is neither a number nor a missing code.
    NotANumber,
    /// A level that cannot be one.
    Implausible(f64),
}

impl Conversion {
    pub(super) fn new(options: &LevelOptions, reference: PressureReference, scale: LevelScale) -> Self {
        let number = |code: &String| plain_number(code.as_bytes(), DecimalMark::Point);
        Self {
            scale,
            add_db: reference.to_micropascal_db(),
            codes: options.missing_codes.iter().filter_map(number).collect(),
            code_texts: options
                .missing_codes
                .iter()
                .filter(|code| number(code).is_none())
                .map(|code| code.trim().to_owned())
                .collect(),
        }
    }

    /// A text cell without blanks around it.
    pub(super) fn text(&self, cell: &[u8], mark: DecimalMark) -> Converted {
        match parse_number(cell, mark) {
            Cell::Number(number) => self.number(number),
            Cell::Empty => Converted::Missing(Missing::NoLevel),
            other => {
                if self.code_texts.iter().any(|code| code.as_bytes() == cell) {
                    return Converted::Missing(Missing::MissingCode);
                }
                match other {
                    Cell::NotANumber => Converted::Missing(Missing::NotFinite),
                    Cell::NoValue => Converted::Missing(Missing::MissingCode),
                    _ => Converted::NotANumber,
                }
            }
        }
    }

    /// A number; NaN and infinities included.
    pub(super) fn number(&self, number: f64) -> Converted {
        if self.codes.contains(&number) {
            return Converted::Missing(Missing::MissingCode);
        }
        if !number.is_finite() {
            return Converted::Missing(Missing::NotFinite);
        }
        let level_db = match self.scale {
            LevelScale::Decibel => number,
            // Digital silence has no level.
            LevelScale::MeanSquare | LevelScale::RootMeanSquare if number == 0.0 => {
                return Converted::Missing(Missing::NotFinite);
            }
            LevelScale::MeanSquare => 10.0 * libm::log10(number),
            LevelScale::RootMeanSquare => 20.0 * libm::log10(number),
        } + self.add_db;
        if PLAUSIBLE_DB.contains(&level_db) { Converted::Level(level_db) } else { Converted::Implausible(level_db) }
    }
}
