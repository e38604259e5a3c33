//! Moments of a directional spectrum at every frequency. They are linear in the density: a blend of spectra has the blend of
//! their moments.

use super::water::Water;
use crate::model::{DirectionalSpectrum, SpectrumAxes};

/// A wave belongs to the wind sea where this factor times the wind speed along its direction exceeds its phase speed (wave
/// age below 1.2 along the wind; Ardhuin, Ocean waves in geosciences).
const WIND_SEA_FACTOR: f64 = 1.2;

/// Wind at 10 m over the waves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WindOver {
    /// Speed, m/s.
    pub speed_m_s: f64,
    /// Direction it comes from, degrees clockwise from true north.
    pub from_deg: f64,
}

/// Density and first and second directional moments at every frequency, m2/Hz, of the whole sea and of its wind-sea part.
/// Directions are those of travel.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Moments {
    /// E(f).
    pub density: Vec<f64>,
    /// Integral of E cos(theta).
    pub a1: Vec<f64>,
    /// Integral of E sin(theta).
    pub b1: Vec<f64>,
    /// Integral of E cos(2 theta).
    pub a2: Vec<f64>,
    /// Integral of E sin(2 theta).
    pub b2: Vec<f64>,
    /// E(f) of the wind sea; NaN without wind.
    pub wind_density: Vec<f64>,
    /// Integral of E cos(theta) over the wind sea.
    pub wind_a1: Vec<f64>,
    /// Integral of E sin(theta) over the wind sea.
    pub wind_b1: Vec<f64>,
}

impl Moments {
    /// Zeros for so many frequencies.
    pub fn zeros(frequencies: usize) -> Self {
        let zeros = || vec![0.0; frequencies];
        Self {
            density: zeros(),
            a1: zeros(),
            b1: zeros(),
            a2: zeros(),
            b2: zeros(),
            wind_density: zeros(),
            wind_a1: zeros(),
            wind_b1: zeros(),
        }
    }

    fn columns(&self) -> [&[f64]; 8] {
        [&self.density, &self.a1, &self.b1, &self.a2, &self.b2, &self.wind_density, &self.wind_a1, &self.wind_b1]
    }

    fn columns_mut(&mut self) -> [&mut [f64]; 8] {
        [
            &mut self.density,
            &mut self.a1,
            &mut self.b1,
            &mut self.a2,
            &mut self.b2,
            &mut self.wind_density,
            &mut self.wind_a1,
            &mut self.wind_b1,
        ]
    }

    /// Adds another's moments times a weight.
    pub fn add(&mut self, weight: f64, other: &Self) {
        for (sums, values) in self.columns_mut().into_iter().zip(other.columns()) {
            for (sum, value) in sums.iter_mut().zip(values) {
                *sum += weight * value;
            }
        }
    }
}

/// Tables for the moments of spectra on one set of axes.
#[derive(Debug, Clone)]
pub struct MomentTables {
    /// For each direction: width, and width times cos, sin, cos 2, sin 2.
    weights: Vec<[f64; 5]>,
    cosine: Vec<f64>,
    sine: Vec<f64>,
    phase_speed_m_s: Vec<f64>,
}

impl MomentTables {
    /// Tables for these axes in this water.
    pub fn new(axes: &SpectrumAxes, water: &Water) -> Self {
        let weights = axes
            .direction_to_rad
            .iter()
            .zip(&axes.direction_width_rad)
            .map(|(to, width)| {
                let (sine, cosine) = libm::sincos(*to);
                let (sine_2, cosine_2) = libm::sincos(2.0 * to);
                [*width, width * cosine, width * sine, width * cosine_2, width * sine_2]
            })
            .collect();
        Self {
            weights,
            cosine: axes.direction_to_rad.iter().map(|to| libm::cos(*to)).collect(),
            sine: axes.direction_to_rad.iter().map(|to| libm::sin(*to)).collect(),
            phase_speed_m_s: axes.frequency_hz.iter().map(|f| water.phase_speed_m_s(*f)).collect(),
        }
    }

    /// Phase speed at each frequency, m/s.
    pub fn phase_speed_m_s(&self) -> &[f64] {
        &self.phase_speed_m_s
    }

    /// Moments of a spectrum into `out`, which has room for its frequencies. Without wind the wind-sea columns are NaN.
    pub fn moments(&self, spectrum: DirectionalSpectrum<'_>, wind: Option<WindOver>, out: &mut Moments) {
        // Along-wind part of each direction's unit vector, times factor and speed: the fastest wave that is wind sea there.
        let along = wind.map(|wind| {
            let (sine, cosine) = libm::sincos((wind.from_deg + 180.0).to_radians());
            (WIND_SEA_FACTOR * wind.speed_m_s * cosine, WIND_SEA_FACTOR * wind.speed_m_s * sine)
        });
        for k in 0..out.density.len() {
            let row = spectrum.row(k);
            let mut sums = [0.0; 5];
            for (density, weight) in row.iter().zip(&self.weights) {
                for part in 0..5 {
                    sums[part] += density * weight[part];
                }
            }
            [out.density[k], out.a1[k], out.b1[k], out.a2[k], out.b2[k]] = sums;
            let mut driven = [0.0; 3];
            match along {
                Some((north, east)) if (north * north + east * east) > self.phase_speed_m_s[k].powi(2) => {
                    for (i, (density, weight)) in row.iter().zip(&self.weights).enumerate() {
                        if north * self.cosine[i] + east * self.sine[i] > self.phase_speed_m_s[k] {
                            for part in 0..3 {
                                driven[part] += density * weight[part];
                            }
                        }
                    }
                }
                Some(_) => {}
                None => driven = [f64::NAN; 3],
            }
            [out.wind_density[k], out.wind_a1[k], out.wind_b1[k]] = driven;
        }
    }
}
