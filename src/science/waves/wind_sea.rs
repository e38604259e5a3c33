//! Frequency spectra of wind seas: Pierson and Moskowitz 1964, and JONSWAP 1973.

use super::water::Water;
use std::f64::consts::TAU;

/// Phillips' constant of the Pierson-Moskowitz spectrum.
pub const PM_ALPHA: f64 = 8.1e-3;
/// Exponent constant of the Pierson-Moskowitz spectrum.
pub const PM_BETA: f64 = 0.74;
/// Mean peak enhancement of JONSWAP.
pub const JONSWAP_GAMMA: f64 = 3.3;
/// U(19.5 m) / U(10 m) by the logarithmic law with a drag coefficient of 1.3e-3 and kappa 0.40: 1 + sqrt(1.3e-3) / 0.40
/// ln 1.95. (1.026, often printed, comes from the decimal logarithm.)
pub const WIND_19_5_OVER_10_M: f64 = 1.060_197_326;

/// A wind-sea spectrum of Pierson and Moskowitz's shape, with a peak enhancement.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WindSeaSpectrum {
    /// Level of the tail (Phillips' alpha).
    pub alpha: f64,
    /// Peak frequency, Hz.
    pub peak_hz: f64,
    /// Peak enhancement; 1 is Pierson and Moskowitz.
    pub gamma: f64,
    /// Gravity, m/s2.
    pub gravity_m_s2: f64,
}

impl WindSeaSpectrum {
    /// The fully developed sea of a wind at 10 m height (m/s, above 0).
    pub fn fully_developed(wind_10m_m_s: f64, water: &Water) -> Self {
        let wind = WIND_19_5_OVER_10_M * wind_10m_m_s;
        let peak_hz = libm::pow(0.8 * PM_BETA, 0.25) * water.gravity_m_s2 / (TAU * wind);
        Self { alpha: PM_ALPHA, peak_hz, gamma: 1.0, gravity_m_s2: water.gravity_m_s2 }
    }

    /// A Pierson-Moskowitz shape of this significant height (m) and mean zero-crossing period (s): fp = 0.7104 / Tz.
    pub fn of_height_and_period(hs_m: f64, tz_s: f64, water: &Water) -> Self {
        // m2 of the shape is alpha g^2 (2 pi)^-2 sqrt(pi / b) / 4 with b = 5/4 (2 pi fp)^4, and m0 alpha g^2 / (4 b).
        let peak_hz = libm::pow(4.0 / (5.0 * std::f64::consts::PI), 0.25) / tz_s;
        let b = 1.25 * libm::pow(TAU * peak_hz, 4.0);
        let g = water.gravity_m_s2;
        Self { alpha: 4.0 * b * hs_m * hs_m / (16.0 * g * g), peak_hz, gamma: 1.0, gravity_m_s2: g }
    }

    /// Variance density at a frequency, m2/Hz.
    pub fn density_m2_hz(&self, frequency_hz: f64) -> f64 {
        let x = frequency_hz / self.peak_hz;
        let tail = self.alpha * self.gravity_m_s2 * self.gravity_m_s2 * libm::pow(TAU, -4.0);
        let shape = tail * libm::pow(frequency_hz, -5.0) * libm::exp(-1.25 * libm::pow(x, -4.0));
        if (self.gamma - 1.0).abs() < 1e-12 {
            return shape;
        }
        let width = if x <= 1.0 { 0.07 } else { 0.09 };
        let from_peak = (x - 1.0) / width;
        shape * libm::pow(self.gamma, libm::exp(-0.5 * from_peak * from_peak))
    }

    /// Variance of the Pierson-Moskowitz shape without enhancement, m2: alpha g^2 (2 pi fp)^-4 / 5.
    pub fn m0_without_enhancement_m2(&self) -> f64 {
        self.alpha * self.gravity_m_s2 * self.gravity_m_s2 * libm::pow(TAU * self.peak_hz, -4.0) / 5.0
    }
}
