//! Directional distributions of waves about their mean direction, their overlap, and published laws for their course with
//! frequency.

use serde::{Deserialize, Serialize};
use std::f64::consts::{PI, TAU};

/// A distribution D(theta), 1/rad, theta from the mean direction; its integral over the circle is 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Distribution {
    /// The same in all directions.
    Isotropic,
    /// `A cos^(2s)(theta/2)` (Longuet-Higgins et al. 1963).
    CosinePower {
        /// Exponent s, 0 or more.
        s: f64,
    },
    /// `sech^2(beta theta)` on -pi to pi (Donelan et al. 1985).
    SechSquared {
        /// Narrowness beta, above 0.
        beta: f64,
    },
    /// A Gaussian wrapped round the circle.
    WrappedNormal {
        /// Standard deviation before wrapping, rad.
        width_rad: f64,
    },
    /// Two equal wrapped Gaussians, one on each side of the mean direction.
    TwoLobe {
        /// Angle of each lobe from the mean direction (half of the separation), rad.
        half_separation_rad: f64,
        /// Standard deviation of each lobe, rad.
        width_rad: f64,
    },
}

/// Density of a wrapped normal distribution at an angle, 1/rad.
pub fn wrapped_normal_per_rad(angle_rad: f64, width_rad: f64) -> f64 {
    // So broad that the first harmonic, 2 exp(-width^2 / 2), is below 1e-10: isotropic.
    if width_rad > 7.0 {
        return 1.0 / TAU;
    }
    // On the nearest turn; further turns until they cannot matter.
    let angle = angle_rad - TAU * (angle_rad / TAU).round();
    let turns = 1 + (8.5 * width_rad / TAU).ceil() as i32;
    let sum: f64 = (-turns..=turns)
        .map(|turn| {
            let z = (angle + TAU * f64::from(turn)) / width_rad;
            libm::exp(-0.5 * z * z)
        })
        .sum();
    sum / (width_rad * TAU.sqrt())
}

/// Factor of the cosine power law, 1/rad: Gamma(s + 1) / (2 sqrt(pi) Gamma(s + 1/2)).
fn cosine_power_factor(s: f64) -> f64 {
    libm::exp(libm::lgamma(s + 1.0) - libm::lgamma(s + 0.5)) / (2.0 * PI.sqrt())
}

/// Factor of the sech^2 law, 1/rad.
fn sech_squared_factor(beta: f64) -> f64 {
    beta / (2.0 * libm::tanh(beta * PI))
}

impl Distribution {
    /// Density at an angle from the mean direction, 1/rad.
    pub fn per_rad(self, angle_rad: f64) -> f64 {
        match self {
            Self::Isotropic => 1.0 / TAU,
            Self::CosinePower { s } => {
                let cosine = libm::cos(0.5 * angle_rad).abs();
                if s == 0.0 { 1.0 / TAU } else { cosine_power_factor(s) * libm::pow(cosine, 2.0 * s) }
            }
            Self::SechSquared { beta } => {
                let angle = angle_rad - TAU * (angle_rad / TAU).round();
                let sech = 1.0 / libm::cosh(beta * angle);
                sech_squared_factor(beta) * sech * sech
            }
            Self::WrappedNormal { width_rad } => wrapped_normal_per_rad(angle_rad, width_rad),
            Self::TwoLobe { half_separation_rad, width_rad } => {
                0.5 * (wrapped_normal_per_rad(angle_rad - half_separation_rad, width_rad)
                    + wrapped_normal_per_rad(angle_rad + half_separation_rad, width_rad))
            }
        }
    }

    /// Overlap of opposing waves, the integral of D(t) D(t + pi) over 0 to 2 pi, 1/rad.
    pub fn overlap_2pi_per_rad(self) -> f64 {
        match self {
            Self::Isotropic => 1.0 / TAU,
            Self::CosinePower { s } => cosine_power_factor(s) * libm::pow(4.0, -s),
            Self::SechSquared { beta } => sech_squared_overlap(beta),
            Self::WrappedNormal { width_rad } => wrapped_normal_per_rad(PI, 2f64.sqrt() * width_rad),
            Self::TwoLobe { half_separation_rad, width_rad } => {
                let width = 2f64.sqrt() * width_rad;
                0.5 * (wrapped_normal_per_rad(PI, width)
                    + wrapped_normal_per_rad(PI - 2.0 * half_separation_rad, width))
            }
        }
    }

    /// The same shape made narrower by this factor in the inverse variance (above 1) or wider (below 1).
    #[must_use]
    pub fn narrowed(self, factor: f64) -> Self {
        let root = factor.sqrt();
        match self {
            Self::Isotropic => Self::Isotropic,
            Self::CosinePower { s } => Self::CosinePower { s: s * factor },
            Self::SechSquared { beta } => Self::SechSquared { beta: beta * root },
            Self::WrappedNormal { width_rad } => Self::WrappedNormal { width_rad: width_rad / root },
            Self::TwoLobe { half_separation_rad, width_rad } => {
                Self::TwoLobe { half_separation_rad: half_separation_rad / root, width_rad: width_rad / root }
            }
        }
    }

    /// Overlap against that of the isotropic sea, dB: 10 log10(2 pi I).
    pub fn overlap_db(self) -> f64 {
        10.0 * libm::log10(TAU * self.overlap_2pi_per_rad())
    }

    /// Harmonics r1 and r2 about the mean direction, by the closed forms or by a sum over 720 directions.
    pub fn harmonics(self) -> (f64, f64) {
        match self {
            Self::Isotropic => (0.0, 0.0),
            Self::CosinePower { s } => (s / (s + 1.0), s * (s - 1.0) / ((s + 1.0) * (s + 2.0))),
            Self::WrappedNormal { width_rad: w } => (libm::exp(-0.5 * w * w), libm::exp(-2.0 * w * w)),
            Self::TwoLobe { half_separation_rad: d, width_rad: w } => {
                (libm::exp(-0.5 * w * w) * libm::cos(d), libm::exp(-2.0 * w * w) * libm::cos(2.0 * d))
            }
            Self::SechSquared { .. } => {
                let step = TAU / 720.0;
                (0..720).fold((0.0, 0.0), |(first, second), i| {
                    let angle = f64::from(i) * step;
                    let weight = self.per_rad(angle) * step;
                    (first + weight * libm::cos(angle), second + weight * libm::cos(2.0 * angle))
                })
            }
        }
    }

    /// Directional spread from the first moments (Kuik et al. 1988): sqrt(2 (1 - r1)), rad.
    pub fn spread_rad(self) -> f64 {
        (2.0 * (1.0 - self.harmonics().0.abs())).max(0.0).sqrt()
    }
}

/// Twice the integral over 0 to pi of D(t) D(pi - t): smooth inside, so Simpson's rule serves.
fn sech_squared_overlap(beta: f64) -> f64 {
    const PARTS: i32 = 512;
    let step = PI / f64::from(PARTS);
    let law = Distribution::SechSquared { beta };
    let sum: f64 = (0..=PARTS)
        .map(|i| {
            let angle = f64::from(i) * step;
            let weight = if i == 0 || i == PARTS {
                1.0
            } else if i % 2 == 1 {
                4.0
            } else {
                2.0
            };
            weight * law.per_rad(angle) * law.per_rad(PI - angle)
        })
        .sum();
    2.0 * sum * step / 3.0
}

/// A published law for the course of the distribution with x = f / fp of the wind sea.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub enum SpreadingLaw {
    /// Mitsuyasu et al. 1975: cosine power.
    #[serde(rename = "mitsuyasu_1975")]
    Mitsuyasu1975,
    /// Hasselmann et al. 1980: cosine power.
    #[serde(rename = "hasselmann_1980")]
    Hasselmann1980,
    /// Donelan et al. 1985 with Banner 1990 above 1.6 fp: sech^2.
    #[serde(rename = "donelan_1985_banner_1990")]
    DonelanBanner,
    /// Ewans 1998: two lobes.
    #[serde(rename = "ewans_1998")]
    Ewans1998,
}

impl SpreadingLaw {
    /// All of them.
    pub const ALL: [Self; 4] = [Self::Mitsuyasu1975, Self::Hasselmann1980, Self::DonelanBanner, Self::Ewans1998];

    /// Name with its year.
    pub fn name(self) -> &'static str {
        match self {
            Self::Mitsuyasu1975 => "Mitsuyasu 1975",
            Self::Hasselmann1980 => "Hasselmann 1980",
            Self::DonelanBanner => "Donelan 1985, Banner 1990",
            Self::Ewans1998 => "Ewans 1998",
        }
    }

    /// Largest f / fp that the law's data support.
    pub fn reaches_to(self) -> f64 {
        match self {
            Self::Ewans1998 => 7.0,
            Self::Mitsuyasu1975 | Self::Hasselmann1980 | Self::DonelanBanner => 10.0,
        }
    }

    /// The distribution at x = f / fp for a wind sea with this inverse wave age U10 / cp.
    pub fn at(self, x: f64, inverse_wave_age: f64) -> Distribution {
        match self {
            Self::Mitsuyasu1975 => {
                let peak = 11.5 * libm::pow(inverse_wave_age, -2.5);
                Distribution::CosinePower { s: peak * libm::pow(x, if x < 1.0 { 5.0 } else { -2.5 }) }
            }
            Self::Hasselmann1980 => {
                let s = if x < 1.05 {
                    6.97 * libm::pow(x, 4.06)
                } else {
                    9.77 * libm::pow(x, -2.33 - 1.45 * (inverse_wave_age - 1.17))
                };
                Distribution::CosinePower { s }
            }
            Self::DonelanBanner => Distribution::SechSquared { beta: donelan_banner_beta(x) },
            Self::Ewans1998 => {
                let (separation_deg, width_deg) = ewans_deg(x);
                Distribution::TwoLobe {
                    half_separation_rad: 0.5 * separation_deg.to_radians(),
                    width_rad: width_deg.to_radians(),
                }
            }
        }
    }
}

/// Narrowness of the sech^2 law.
fn donelan_banner_beta(x: f64) -> f64 {
    if x < 0.56 {
        1.24
    } else if x < 0.95 {
        2.61 * libm::pow(x, 1.3)
    } else if x < 1.6 {
        2.28 * libm::pow(x, -1.3)
    } else {
        libm::pow(10.0, -0.4 + 0.8393 * libm::exp(-0.567 * 2.0 * libm::log(x)))
    }
}

/// Separation of the two lobes and width of each, degrees.
fn ewans_deg(x: f64) -> (f64, f64) {
    if x < 1.0 {
        (14.93, 11.38 + 5.357 * libm::pow(x, -7.929))
    } else {
        (libm::exp(5.453 - 2.750 / x), 32.13 - 15.39 / (x * x))
    }
}
