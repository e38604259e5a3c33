//! What the comparison takes: measured levels and what each model radiates, window by window; and which windows count.

use crate::model::{Band, NotIdentified, NotRadiated, Radiated, RadiatedLevel, RadiationFlag};

/// What lies under the measured levels of a band, band levels in dB re 1 uPa^2.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct BandFloor {
    /// The quiet floor that a fit of level against wind found, or an upper bound of it.
    pub fitted_db: Option<f64>,
    /// Self-noise of the instrument.
    pub instrument_db: Option<f64>,
}

/// Levels of one band at one sensor.
#[derive(Debug, Clone, Copy)]
pub struct BandWindows<'a> {
    /// The band.
    pub band: Band,
    /// Start of each window, ms since 1970, increasing.
    pub times_ms: &'a [i64],
    /// Band level of each window, dB re 1 uPa^2; NaN where there is none or the row is not used.
    pub level_db: &'a [f64],
    /// Wind speed over each window, m/s; NaN where there is none.
    pub wind_speed_m_s: &'a [f64],
    /// Floors.
    pub floor: BandFloor,
}

/// What one model says of the same windows.
#[derive(Debug, Clone, Copy)]
pub struct ModelWindows<'a> {
    /// The spectra input.
    pub model: &'a str,
    /// Radiated band level.
    pub radiated: &'a [Radiated],
    /// f / fp of the wind sea at half of the band's centre; NaN without wind sea.
    pub f_over_fp: &'a [f64],
    /// Overlap at half of the band's centre, dB re isotropic.
    pub overlap_db: &'a [f64],
}

/// The radiated level of a window that can be compared.
///
/// # Errors
/// The reason why it cannot be.
pub fn comparable(radiated: &Radiated, f_over_fp: f64) -> Result<RadiatedLevel, NotIdentified> {
    let level = radiated.map_err(|why| match why {
        NotRadiated::NoOpposingEnergy => NotIdentified::NoOpposingEnergy,
        NotRadiated::BeyondFrequencies => NotIdentified::TailOnly,
        NotRadiated::NoSpectrum | NotRadiated::Sector | NotRadiated::BelowFrequencies => NotIdentified::NoSpectrum,
    })?;
    for (flag, why) in [
        (RadiationFlag::ShallowSensor, NotIdentified::SensorTooShallow),
        (RadiationFlag::Waveguide, NotIdentified::SensorTooShallow),
        (RadiationFlag::Tail, NotIdentified::TailOnly),
        (RadiationFlag::Extended, NotIdentified::TailOnly),
        (RadiationFlag::Blended, NotIdentified::Blended),
        (RadiationFlag::LowerBound, NotIdentified::LowerBound),
    ] {
        if level.has(flag) {
            return Err(why);
        }
    }
    if f_over_fp.is_nan() { Err(NotIdentified::NoWindSea) } else { Ok(level) }
}

/// The floor that counts: its level, whether it is taken off the measured power, and what it is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Floor {
    pub level_db: f64,
    /// A stand-in (the quietest hundredth of the record) bounds the floor and is not taken off.
    pub known: bool,
    pub reason: NotIdentified,
}

impl Floor {
    pub(super) fn of(windows: &BandWindows<'_>) -> Self {
        let fitted = windows.floor.fitted_db.unwrap_or(f64::NEG_INFINITY);
        let instrument = windows.floor.instrument_db.unwrap_or(f64::NEG_INFINITY);
        if fitted.max(instrument) > f64::NEG_INFINITY {
            let reason = if instrument >= fitted { NotIdentified::Instrument } else { NotIdentified::Floor };
            return Self { level_db: fitted.max(instrument), known: true, reason };
        }
        let levels: Vec<f64> = windows.level_db.iter().copied().filter(|level| level.is_finite()).collect();
        let level_db = crate::numerics::quantile::quantile(&levels, 0.01);
        Self { level_db, known: false, reason: NotIdentified::Floor }
    }

    /// Level of the power above the floor, dB: minus infinity at or below it. The median over windows of this is the value
    /// at which the median of level minus (model plus floor) vanishes: no window has to be dropped for lying near the floor.
    pub(super) fn above_db(self, level_db: f64) -> f64 {
        if !self.known {
            return level_db;
        }
        let power = libm::pow(10.0, 0.1 * (level_db - self.level_db)) - 1.0;
        if power <= 0.0 { f64::NEG_INFINITY } else { self.level_db + 10.0 * libm::log10(power) }
    }
}
