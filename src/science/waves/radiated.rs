//! The sound that opposing waves radiate.
//!
//! Two trains of the same frequency f in opposite directions press on the water below with twice the frequency, and this
//! pressure does not decay with depth. For a random sea over a bottomless homogeneous ocean the pressure density is
//!
//! ```text
//! F_p(f_s) = pi k_a^2 F_0,   k_a = 2 pi f_s / c,   f_s = 2 f,
//! F_0      = rho^2 g^2 f_s (1 + x)(1 + 3 x) E(f)^2 I_2pi / 2,   x = T k^2 / (rho g),
//! ```
//!
//! with one-sided E in m2/Hz and the overlap I over 0 to 2 pi; the derivation is Hasselmann's (1963), and its constants were
//! checked by a simulation of the sea. A finite depth D of the water multiplies this by
//!
//! ```text
//! tanh^2(kD) (1/4 + kD / (2 sinh 2kD)) (1/2 + 3 / (2 tanh^2 kD))^2
//! ```
//!
//! (Ardhuin, Ocean waves in geosciences, after Ardhuin and Herbers 2013), which tends to 1 in deep water. What the waves add
//! at the bottom itself is left out.

use super::water::Water;
use crate::model::{Band, NotRadiated, Radiated, RadiatedLevel, RadiationFlag, SpectrumAxes, TailPower};
use std::f64::consts::{PI, TAU};

/// Pressure densities in Pa^2 times this are in uPa^2.
const MICROPASCAL_SQUARED: f64 = 1e12;
/// Depth against the wavelength below which waves feel the bottom.
const DEEP_KD: f64 = 3.0;
/// A sensor must be this many sound wavelengths deep.
const LEAST_SENSOR_WAVELENGTHS: f64 = 0.5;

/// The radiating sea surface and what lies under it.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Radiator {
    /// The water.
    pub water: Water,
    /// What the bottom adds, dB; 0 is a bottomless ocean.
    pub bottom_gain_db: f64,
}

/// Gain of a bottom that reflects this share of the power at all angles, dB: incoherent bounces between it and the surface,
/// (1 + R) / (1 - R).
pub fn bottom_gain_db(power_reflection: f64) -> f64 {
    10.0 * libm::log10((1.0 + power_reflection) / (1.0 - power_reflection))
}

impl Radiator {
    /// `F_0`, the density of the surface pressure per wavenumber area at wavenumbers near zero, Pa^2 m^2 / (rad^2 Hz), of waves
    /// of this frequency with `source` = E^2 times the overlap (m4/Hz2/rad).
    pub fn surface_pressure(&self, wave_hz: f64, source: f64) -> f64 {
        let Water { gravity_m_s2: g, density_kg_m3: rho, .. } = self.water;
        rho * rho * g * g * wave_hz * source * self.wave_factor(wave_hz)
    }

    /// Tension and finite depth against deep gravity waves.
    fn wave_factor(&self, wave_hz: f64) -> f64 {
        let k = self.water.wavenumber_rad_m(wave_hz);
        let x = self.water.tension_ratio(k);
        (1.0 + x) * (1.0 + 3.0 * x) * self.water.depth_m.map_or(1.0, |depth| finite_depth_factor(k * depth))
    }

    /// Pressure density of the radiated sound at a sound frequency, Pa^2/Hz.
    pub fn density_pa2_hz(&self, sound_hz: f64, source: f64) -> f64 {
        let wavenumber = TAU * sound_hz / self.water.sound_speed_m_s;
        let gain = libm::pow(10.0, self.bottom_gain_db / 10.0);
        gain * PI * wavenumber * wavenumber * self.surface_pressure(0.5 * sound_hz, source)
    }

    /// The same as a level, dB re 1 uPa^2/Hz; minus infinity without opposing energy.
    pub fn density_level_db(&self, sound_hz: f64, source: f64) -> f64 {
        10.0 * libm::log10(MICROPASCAL_SQUARED * self.density_pa2_hz(sound_hz, source))
    }
}

/// Finite depth against deep water, for k D.
pub fn finite_depth_factor(kd: f64) -> f64 {
    if kd > 300.0 {
        return 1.0;
    }
    let tanh = libm::tanh(kd);
    let steep = 0.5 + 1.5 / (tanh * tanh);
    tanh * tanh * (0.25 + kd / (2.0 * libm::sinh(2.0 * kd))) * steep * steep
}

/// One point of a band's integral: between frequencies `below` and `below + 1` of the spectrum at `share` of the logarithmic
/// way (beyond 1: extended), what the source there weighs (uPa^2 per m4/Hz2/rad).
#[derive(Debug, Clone, Copy)]
struct QuadraturePoint {
    below: usize,
    share: f64,
    weight: f64,
}

#[derive(Debug, Clone)]
struct BandTable {
    band: Band,
    points: Result<Vec<QuadraturePoint>, NotRadiated>,
    /// First and last frequency that the points use.
    used: (usize, usize),
    flags: RadiatedLevel,
}

/// Where the levels of a set of bands come from on one spectrum's frequencies; made once, used for every step.
#[derive(Debug, Clone)]
pub struct RadiatedBands {
    frequency_hz: Vec<f64>,
    sector: bool,
    bands: Vec<BandTable>,
    logarithms: Vec<f64>,
}

/// How the bands are made.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BandSettings {
    /// Tail laid on beyond the last frequency of the spectrum; `None`: bands there have no level.
    pub extend: Option<TailPower>,
    /// Depth of the sensor, m, where it is known.
    pub sensor_depth_m: Option<f64>,
}

impl Default for BandSettings {
    fn default() -> Self {
        Self { extend: Some(TailPower::Fifth), sensor_depth_m: None }
    }
}

impl RadiatedBands {
    /// Tables for these bands.
    pub fn new(axes: &SpectrumAxes, radiator: &Radiator, bands: &[Band], settings: BandSettings) -> Self {
        let bands = bands.iter().map(|band| band_table(axes, radiator, *band, settings)).collect();
        Self {
            frequency_hz: axes.frequency_hz.clone(),
            sector: !axes.full_circle,
            bands,
            logarithms: vec![0.0; axes.frequencies()],
        }
    }

    /// Levels of all bands for a source, E^2 times the overlap (m4/Hz2/rad), at every frequency of the spectrum, into `out` (one a band).
    /// The source is interpolated along straight lines in log-log. Takes no memory.
    pub fn levels(&mut self, source: &[f64], tail_start_hz: Option<f64>, out: &mut [Radiated]) {
        for (logarithm, value) in self.logarithms.iter_mut().zip(source) {
            *logarithm = libm::log(*value);
        }
        let logarithms = &self.logarithms;
        for (table, level) in self.bands.iter().zip(out) {
            *level = if self.sector {
                Err(NotRadiated::Sector)
            } else {
                band_level(table, logarithms, source, tail_start_hz, &self.frequency_hz)
            };
        }
    }
}

fn band_level(
    table: &BandTable,
    logarithms: &[f64],
    source: &[f64],
    tail_start_hz: Option<f64>,
    frequency_hz: &[f64],
) -> Radiated {
    let points = table.points.as_ref().map_err(|why| *why)?;
    let used = &source[table.used.0..=table.used.1];
    if used.iter().any(|value| value.is_nan()) {
        return Err(NotRadiated::NoSpectrum);
    }
    if used.iter().any(|value| *value <= 0.0) {
        return Err(NotRadiated::NoOpposingEnergy);
    }
    let last = frequency_hz.len() - 1;
    let sum: f64 = points
        .iter()
        .map(|point| {
            let value = if point.below == last {
                // Extended: `share` is the logarithm of the fall.
                logarithms[last] + point.share
            } else {
                logarithms[point.below] + point.share * (logarithms[point.below + 1] - logarithms[point.below])
            };
            point.weight * libm::exp(value)
        })
        .sum();
    let start = tail_start_hz.unwrap_or(f64::INFINITY).min(if table.flags.has(RadiationFlag::Extended) {
        frequency_hz[last]
    } else {
        f64::INFINITY
    });
    let beyond = 20.0 * libm::log10(0.5 * table.band.centre_hz / start);
    let level = table.flags.with_level(10.0 * libm::log10(sum), beyond.max(0.0));
    Ok(level.flag_if(0.5 * table.band.high_hz > start * (1.0 + 1e-9), RadiationFlag::Tail))
}

fn band_table(axes: &SpectrumAxes, radiator: &Radiator, band: Band, settings: BandSettings) -> BandTable {
    let water = &radiator.water;
    let wavelengths = |depth: Option<f64>| depth.map_or(f64::INFINITY, |d| d * band.centre_hz / water.sound_speed_m_s);
    let kd = water.depth_m.map_or(f64::INFINITY, |depth| depth * water.wavenumber_rad_m(0.5 * band.low_hz));
    let last_hz = axes.frequency_hz.last().copied().unwrap_or(0.0);
    let extended = 0.5 * band.high_hz > last_hz * (1.0 + 1e-9);
    let flags = RadiatedLevel::new(f64::NAN, 0.0)
        .flag_if(wavelengths(settings.sensor_depth_m) < LEAST_SENSOR_WAVELENGTHS, RadiationFlag::ShallowSensor)
        .flag_if(wavelengths(water.depth_m) < 1.0, RadiationFlag::Waveguide)
        .flag_if(kd <= DEEP_KD, RadiationFlag::FiniteDepth)
        .flag_if(extended, RadiationFlag::Extended);
    let points = if 0.5 * band.low_hz < axes.frequency_hz[0] * (1.0 - 1e-9) {
        Err(NotRadiated::BelowFrequencies)
    } else if extended && settings.extend.is_none() {
        Err(NotRadiated::BeyondFrequencies)
    } else {
        Ok(band_points(axes, radiator, band, settings.extend.unwrap_or(TailPower::Fifth)))
    };
    let last = axes.frequencies() - 1;
    let used = points.as_ref().map_or((0, 0), |points| {
        let low = points.iter().map(|p| p.below).min().unwrap_or(0);
        let high = points.iter().map(|p| (p.below + 1).min(last)).max().unwrap_or(0);
        (low, high)
    });
    BandTable { band, points, used, flags }
}

/// Gauss and Legendre's four points on [-1, 1] with their weights (Abramowitz and Stegun 1964, table 25.4).
const GAUSS_LEGENDRE: [(f64, f64); 4] = [
    (-0.861_136_311_594_053, 0.347_854_845_137_454),
    (-0.339_981_043_584_856, 0.652_145_154_862_546),
    (0.339_981_043_584_856, 0.652_145_154_862_546),
    (0.861_136_311_594_053, 0.347_854_845_137_454),
];

/// The integral over the band in ln(f), piece by piece between the frequencies of the spectrum, where the integrand is
/// smooth.
fn band_points(axes: &SpectrumAxes, radiator: &Radiator, band: Band, extend: TailPower) -> Vec<QuadraturePoint> {
    let frequency = &axes.frequency_hz;
    let (low, high) = (0.5 * band.low_hz, 0.5 * band.high_hz);
    let mut cuts: Vec<f64> = vec![low];
    cuts.extend(frequency.iter().copied().filter(|f| *f > low * (1.0 + 1e-12) && *f < high * (1.0 - 1e-12)));
    cuts.push(high);
    let mut points = Vec::new();
    for pair in cuts.windows(2) {
        let (from, to) = (libm::log(pair[0]), libm::log(pair[1]));
        for (position, weight) in GAUSS_LEGENDRE {
            let logarithm = 0.5 * (from + to) + 0.5 * (to - from) * position;
            let wave_hz = libm::exp(logarithm);
            // d f_s = f_s d ln f.
            let width_hz = 2.0 * wave_hz * weight * 0.5 * (to - from);
            let weight = MICROPASCAL_SQUARED * radiator.density_pa2_hz(2.0 * wave_hz, 1.0) * width_hz;
            let last = frequency.len() - 1;
            let after = frequency.partition_point(|f| *f <= wave_hz);
            let (below, share) = if after > last {
                (last, -2.0 * extend.exponent() * libm::log(wave_hz / frequency[last]))
            } else {
                let below = after.saturating_sub(1);
                let (start, end) = (libm::log(frequency[below]), libm::log(frequency[below + 1]));
                (below, (logarithm - start) / (end - start))
            };
            points.push(QuadraturePoint { below, share, weight });
        }
    }
    points
}

#[cfg(test)]
mod tests {
    use super::super::wind_sea::WindSeaSpectrum;
    use super::*;
    use crate::model::BandScheme;
    use crate::units::Hertz;

    fn axes(count: i32) -> SpectrumAxes {
        let directions = (0..24).map(|i| f64::from(i) * TAU / 24.0).collect();
        SpectrumAxes::new((0..count).map(|k| 0.04 * 1.1_f64.powi(k)).collect(), None, directions).unwrap()
    }

    fn band(nominal_hz: f64) -> Band {
        BandScheme::Decidecade.band(Hertz::new(nominal_hz).unwrap()).unwrap()
    }

    /// E^2 / (2 pi): an isotropic sea with an f^-5 spectrum.
    fn source(axes: &SpectrumAxes) -> Vec<f64> {
        axes.frequency_hz.iter().map(|f| 1e-6 * libm::pow(*f, -10.0) / TAU).collect()
    }

    fn level(axes: &SpectrumAxes, band: Band, settings: BandSettings, source: &[f64]) -> Radiated {
        let radiator = Radiator { water: Water { tension_n_m: 0.0, ..Water::default() }, bottom_gain_db: 0.0 };
        let mut out = [Err(NotRadiated::NoSpectrum)];
        RadiatedBands::new(axes, &radiator, &[band], settings).levels(source, None, &mut out);
        out[0]
    }

    // Physics reference: for an f^-7 spectrum the band-mean density exceeds the density at the centre by 0.33 dB
    // (decidecade) and 2.67 dB (octave).
    #[test]
    fn a_band_is_integrated_over_its_own_edges() {
        let axes = axes(40);
        let radiator = Radiator { water: Water { tension_n_m: 0.0, ..Water::default() }, bottom_gain_db: 0.0 };
        for (scheme, excess_db) in [(BandScheme::Decidecade, 0.33), (BandScheme::Octave, 2.67)] {
            let band = scheme.band(Hertz::new(1.0).unwrap()).unwrap();
            let at_centre =
                radiator.density_level_db(band.centre_hz, 1e-6 * libm::pow(0.5 * band.centre_hz, -10.0) / TAU);
            let level = level(&axes, band, BandSettings::default(), &source(&axes)).unwrap();
            let mean = level.in_kind_db(crate::model::LevelKind::SpectralDensityLevel, band);
            assert!((mean - at_centre - excess_db).abs() < 0.006, "{scheme:?}: {}", mean - at_centre);
        }
    }

    // Closed form: -70 dB per decade of spectral density is -60 dB per decade of decidecade level; continued beyond the
    // last frequency by f^-5 nothing changes for an f^-5 sea.
    #[test]
    fn the_slope_holds_across_and_beyond_the_frequencies() {
        let (long, short) = (axes(60), axes(30));
        let one = level(&long, band(1.0), BandSettings::default(), &source(&long)).unwrap().band_level_db;
        let ten = level(&long, band(10.0), BandSettings::default(), &source(&long)).unwrap().band_level_db;
        assert!((ten - one + 60.0).abs() < 1e-6);
        let extended = level(&short, band(10.0), BandSettings::default(), &source(&short)).unwrap();
        assert!((extended.band_level_db - ten).abs() < 1e-6);
        assert!(extended.has(RadiationFlag::Extended) && extended.has(RadiationFlag::Tail));
        let none = BandSettings { extend: None, ..BandSettings::default() };
        assert_eq!(level(&short, band(10.0), none, &source(&short)), Err(NotRadiated::BeyondFrequencies));
        assert_eq!(level(&short, band(0.05), none, &source(&short)), Err(NotRadiated::BelowFrequencies));
    }

    // 20 dB per decade in sound between f^-4 and f^-5 beyond the start of the tail (closed form).
    #[test]
    fn the_tail_is_flagged_and_its_sensitivity_said() {
        let axes = axes(40);
        let radiator = Radiator::default();
        let mut bands = RadiatedBands::new(&axes, &radiator, &[band(0.4), band(2.0)], BandSettings::default());
        let mut out = [Err(NotRadiated::NoSpectrum); 2];
        bands.levels(&source(&axes), Some(0.5), &mut out);
        let (low, high) = (out[0].unwrap(), out[1].unwrap());
        assert!(!low.has(RadiationFlag::Tail) && low.tail_sensitivity_db == 0.0);
        assert!(high.has(RadiationFlag::Tail));
        assert!((high.tail_sensitivity_db - 20.0 * (band(2.0).centre_hz / 2.0 / 0.5).log10()).abs() < 1e-9);
    }

    #[test]
    fn no_opposing_energy_is_undefined_and_missing_is_missing() {
        let axes = axes(40);
        let settings = BandSettings::default();
        assert_eq!(level(&axes, band(1.0), settings, &[0.0; 40]), Err(NotRadiated::NoOpposingEnergy));
        assert_eq!(level(&axes, band(1.0), settings, &[f64::NAN; 40]), Err(NotRadiated::NoSpectrum));
        // A zero far from the band does no harm.
        let mut source = source(&axes);
        source[0] = 0.0;
        assert!(level(&axes, band(1.0), settings, &source).is_ok());
    }

    #[test]
    fn shallow_sensors_and_shallow_water_are_flagged() {
        let axes = axes(40);
        let water = Water { depth_m: Some(30.0), ..Water::default() };
        let radiator = Radiator { water, bottom_gain_db: 0.0 };
        let settings = BandSettings { sensor_depth_m: Some(25.0), ..BandSettings::default() };
        let mut out = [Err(NotRadiated::NoSpectrum); 2];
        RadiatedBands::new(&axes, &radiator, &[band(0.2), band(2.0)], settings).levels(&source(&axes), None, &mut out);
        let (low, high) = (out[0].unwrap(), out[1].unwrap());
        assert!(low.has(RadiationFlag::FiniteDepth) && !high.has(RadiationFlag::FiniteDepth));
        assert!(low.has(RadiationFlag::ShallowSensor) && high.has(RadiationFlag::Waveguide));
    }

    // Physics reference, worked numbers: Pierson-Moskowitz sea of 10 m/s, isotropic, 1 and 2 Hz of sound, without tension.
    #[test]
    fn the_worked_table() {
        let water = Water { tension_n_m: 0.0, ..Water::default() };
        let radiator = Radiator { water, bottom_gain_db: 0.0 };
        let sea = WindSeaSpectrum::fully_developed(10.0, &water);
        for (sound_hz, isotropic, cosine, two_lobe) in
            [(1.0, 110.50, 102.72, 110.80), (2.0, 89.47, 81.69, 89.77), (4.0, 68.40, 60.62, 68.70)]
        {
            let e = sea.density_m2_hz(0.5 * sound_hz);
            for (overlap, expected) in [(1.0 / TAU, isotropic), (0.026_525_823_85, cosine), (0.170_452_393_1, two_lobe)]
            {
                let level = radiator.density_level_db(sound_hz, e * e * overlap);
                assert!((level - expected).abs() < 0.01, "{sound_hz}: {level} {expected}");
            }
        }
    }
}
