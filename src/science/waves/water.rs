//! Sea water and the dispersion of surface waves.
//!
//! omega^2 = (g k + (T / rho) k^3) tanh(k h): linear (Airy) waves with surface tension T over a flat bottom at depth h.

use std::f64::consts::{PI, TAU};

/// Standard gravity, m/s2 (exact by definition).
pub const STANDARD_GRAVITY_M_S2: f64 = 9.806_65;

/// What the sea is made of. The defaults are common practice for the surface of the open ocean.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Water {
    /// Gravity, m/s2.
    pub gravity_m_s2: f64,
    /// Density, kg/m3.
    pub density_kg_m3: f64,
    /// Surface tension, N/m.
    pub tension_n_m: f64,
    /// Sound speed, m/s.
    pub sound_speed_m_s: f64,
    /// Depth of the water, m; `None` is deep for every wave.
    pub depth_m: Option<f64>,
}

impl Default for Water {
    fn default() -> Self {
        Self {
            gravity_m_s2: STANDARD_GRAVITY_M_S2,
            density_kg_m3: 1025.0,
            tension_n_m: 0.074,
            sound_speed_m_s: 1500.0,
            depth_m: None,
        }
    }
}

/// Above this k h the hyperbolic functions are 1 or would overflow.
const DEEP_KH: f64 = 300.0;

impl Water {
    /// Wavenumber of waves of this frequency (Hz, above 0), rad/m: Newton's method with the group speed as derivative.
    pub fn wavenumber_rad_m(&self, frequency_hz: f64) -> f64 {
        let omega = TAU * frequency_hz;
        let deep = omega * omega / self.gravity_m_s2;
        let mut k = match self.depth_m {
            Some(depth) => deep / libm::tanh((deep * depth).min(DEEP_KH)).sqrt(),
            None => deep,
        };
        for _ in 0..50 {
            let step = (self.angular_frequency_rad_s(k) - omega) / self.group_speed_of_m_s(k);
            k = (k - step).max(0.1 * k);
            if step.abs() <= 1e-14 * k {
                break;
            }
        }
        k
    }

    /// Angular frequency of waves of this wavenumber, rad/s.
    pub fn angular_frequency_rad_s(&self, k: f64) -> f64 {
        let depth = self.depth_m.map_or(1.0, |depth| libm::tanh((k * depth).min(DEEP_KH)));
        (self.gravity_m_s2 * k * (1.0 + self.tension_ratio(k)) * depth).sqrt()
    }

    /// Surface tension against gravity at a wavenumber: T k^2 / (rho g).
    pub fn tension_ratio(&self, k: f64) -> f64 {
        self.tension_n_m * k * k / (self.density_kg_m3 * self.gravity_m_s2)
    }

    /// Phase speed of waves of this frequency, m/s.
    pub fn phase_speed_m_s(&self, frequency_hz: f64) -> f64 {
        TAU * frequency_hz / self.wavenumber_rad_m(frequency_hz)
    }

    /// Group speed of waves of this frequency, m/s.
    pub fn group_speed_m_s(&self, frequency_hz: f64) -> f64 {
        self.group_speed_of_m_s(self.wavenumber_rad_m(frequency_hz))
    }

    fn group_speed_of_m_s(&self, k: f64) -> f64 {
        let x = self.tension_ratio(k);
        let depth = self.depth_m.map_or(0.0, |depth| {
            let twice = 2.0 * k * depth;
            if twice > DEEP_KH { 0.0 } else { twice / libm::sinh(twice) }
        });
        0.5 * self.angular_frequency_rad_s(k) / k * ((1.0 + 3.0 * x) / (1.0 + x) + depth)
    }

    /// The slowest wave, where gravity and tension are equal: phase speed (m/s), wavelength (m) and frequency (Hz) in deep
    /// water.
    pub fn slowest_wave(&self) -> (f64, f64, f64) {
        let speed = libm::pow(4.0 * self.gravity_m_s2 * self.tension_n_m / self.density_kg_m3, 0.25);
        let wavelength = TAU * (self.tension_n_m / (self.density_kg_m3 * self.gravity_m_s2)).sqrt();
        (speed, wavelength, speed / wavelength)
    }

    /// Saturation in the frequency form, (2 pi)^4 f^5 E(f) / g^2: the constant alpha on a Phillips tail.
    pub fn saturation_of_frequency(&self, frequency_hz: f64, density_m2_hz: f64) -> f64 {
        libm::pow(TAU, 4.0) * libm::pow(frequency_hz, 5.0) * density_m2_hz / (self.gravity_m_s2 * self.gravity_m_s2)
    }

    /// Saturation in the wavenumber form, k^3 F(k) with `F(k) = E(f) c_g / (2 pi)`: alpha / 2 on a Phillips tail.
    pub fn saturation_of_wavenumber(&self, frequency_hz: f64, density_m2_hz: f64) -> f64 {
        let k = self.wavenumber_rad_m(frequency_hz);
        k * k * k * density_m2_hz * self.group_speed_of_m_s(k) / (2.0 * PI)
    }
}
