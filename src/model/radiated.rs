//! The sound level that opposing waves radiate, with its remarks, or why there is none.

use super::level::LevelKind;
use super::outcome::causes;
use crate::model::Band;
use serde::{Deserialize, Serialize};

causes! {
    /// Why opposing waves have no radiated level.
    NotRadiated {
        NoSpectrum = "no_spectrum": "there is no complete wave spectrum for this place and time",
        NoOpposingEnergy = "no_opposing_energy": "the spectrum holds no energy in opposite directions at half of the band's frequency: the radiated level is undefined, not zero",
        Sector = "sector": "the directions of the spectrum are a sector: opposing waves cannot be judged",
        BelowFrequencies = "below_frequencies": "half of the band's frequency lies below the first frequency of the spectrum",
        BeyondFrequencies = "beyond_frequencies": "half of the band's frequency lies beyond the last frequency of the spectrum",
    }
}

causes! {
    /// A remark on a radiated level.
    RadiationFlag {
        Tail = "tail": "part of the band comes from the laid-on tail of the spectrum: the level tests the tail's assumption, not the model",
        Extended = "extended": "part of the band lies beyond the last frequency of the spectrum and was extended by an f^-5 tail",
        ShallowSensor = "shallow_sensor": "the sensor is less than half a sound wavelength deep: the level there is higher, from waves that decay with depth",
        Waveguide = "waveguide": "the water is less than one sound wavelength deep and guides the sound: this is not modelled",
        FiniteDepth = "finite_depth": "the waves feel the bottom (k D of 3 or less): the surface-pressure factor for finite depth was applied, the bottom's own pressure was not",
        Blended = "blended": "more than half of the opposing energy comes from blending different stored spectra",
        LowerBound = "lower_bound": "some pairs of opposite directions hold a zero: the level is a lower bound",
    }
}

/// The level that opposing waves radiate in a band.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RadiatedLevel {
    /// Band level, dB re 1 uPa^2.
    pub band_level_db: f64,
    /// By how much the level would rise if the tail fell with f^-4 where it now falls with f^-5, dB: 0 outside the tail, 20
    /// dB per factor ten in frequency beyond its start.
    pub tail_sensitivity_db: f64,
    flags: u32,
}

impl RadiatedLevel {
    /// A level without remarks.
    pub fn new(band_level_db: f64, tail_sensitivity_db: f64) -> Self {
        Self { band_level_db, tail_sensitivity_db, flags: 0 }
    }

    /// The same remarks on another level.
    #[must_use]
    pub fn with_level(self, band_level_db: f64, tail_sensitivity_db: f64) -> Self {
        Self { band_level_db, tail_sensitivity_db, ..self }
    }

    /// The same with one more remark when the condition holds.
    #[must_use]
    pub fn flag_if(self, condition: bool, flag: RadiationFlag) -> Self {
        Self { flags: self.flags | (u32::from(condition) << flag as u32), ..self }
    }

    /// Whether a remark applies.
    pub fn has(&self, flag: RadiationFlag) -> bool {
        self.flags & (1 << flag as u32) != 0
    }

    /// All remarks.
    pub fn flags(&self) -> impl Iterator<Item = RadiationFlag> + '_ {
        RadiationFlag::ALL.iter().copied().filter(|flag| self.has(*flag))
    }

    /// The level in a table's own kind, dB re 1 uPa^2 or 1 uPa^2/Hz.
    pub fn in_kind_db(&self, kind: LevelKind, band: Band) -> f64 {
        self.band_level_db + LevelKind::BandLevel.to_other_db(kind, band)
    }
}

/// A radiated level or the reason why there is none.
pub type Radiated = Result<RadiatedLevel, NotRadiated>;

/// The exponent of a laid-on tail of E(f).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum TailPower {
    /// E falls with f^-4.
    Fourth,
    /// E falls with f^-5.
    Fifth,
}

impl TailPower {
    /// The power by which E falls.
    pub fn exponent(self) -> f64 {
        match self {
            Self::Fourth => 4.0,
            Self::Fifth => 5.0,
        }
    }
}
