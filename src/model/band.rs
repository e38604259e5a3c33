//! Frequency bands: exact decidecades and octaves, or explicit edges.
//!
//! IEC 61260-1:2014 defines the octave ratio G = 10^(3/10) and mid-band frequencies relative to 1 kHz; ISO 18405:2017
//! names the tenth of a decade (ratio 10^(1/10)) a decidecade. A band of fraction 1/b has the edges f G^(±1/(2b)).

use crate::units::Hertz;
use serde::{Deserialize, Serialize};

/// The kind of bands a record holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum BandScheme {
    /// Decidecades: centre 1000 x 10^(n/10) Hz, edges 10^(±1/20) beside it.
    Decidecade,
    /// Octaves of base ten: centre 1000 x 10^(3n/10) Hz, edges 10^(±3/20) beside it.
    Octave,
}

/// A frequency band.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Band {
    /// Lower edge, Hz.
    pub low_hz: f64,
    /// Mid-band frequency, Hz.
    pub centre_hz: f64,
    /// Upper edge, Hz.
    pub high_hz: f64,
}

/// Why a number names no band.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum BandError {
    /// A centre that is no mid-band frequency of the scheme.
    #[error(
        "{found_hz} Hz is no {scheme} centre; the nearest is {nearest_hz:.4} Hz (give edges if the band is not of that kind)"
    )]
    NotOnScheme {
        /// As given.
        found_hz: f64,
        /// Name of the scheme.
        scheme: &'static str,
        /// Nearest exact centre.
        nearest_hz: f64,
    },
    /// Edges out of order or not positive.
    #[error("band edges are {low_hz} and {high_hz} Hz; expected 0 < lower < upper")]
    Edges {
        /// Lower edge as given.
        low_hz: f64,
        /// Upper edge as given.
        high_hz: f64,
    },
}

impl BandScheme {
    /// Its name in words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Decidecade => "decidecade",
            Self::Octave => "octave",
        }
    }

    /// Width of a band in steps of 10^(1/10).
    fn tenths(self) -> f64 {
        match self {
            Self::Decidecade => 1.0,
            Self::Octave => 3.0,
        }
    }

    /// The exact band whose centre is nearest to a nominal one. Nominal centres (31.5, 63, 1250 Hz ...) are rounded; they
    /// are accepted up to a third of the distance to the next centre, and so are the rounded exact ones (1258.9 Hz).
    ///
    /// # Errors
    /// When the frequency lies between two centres of the scheme.
    pub fn band(self, nominal: Hertz) -> Result<Band, BandError> {
        let position = 10.0 * libm::log10(nominal.hz() / 1000.0) / self.tenths();
        let index = position.round();
        let centre_hz = exact_centre_hz(index * self.tenths());
        if (position - index).abs() > 1.0 / 3.0 {
            return Err(BandError::NotOnScheme { found_hz: nominal.hz(), scheme: self.name(), nearest_hz: centre_hz });
        }
        let half = libm::pow(10.0, self.tenths() / 20.0);
        Ok(Band { low_hz: centre_hz / half, centre_hz, high_hz: centre_hz * half })
    }
}

/// 1000 x 10^(tenths/10) Hz; whole decades come out exact.
fn exact_centre_hz(tenths: f64) -> f64 {
    let decade = (tenths / 10.0).floor();
    let rest = tenths - 10.0 * decade;
    let scale = libm::pow(10.0, decade.abs() + if decade < 0.0 { -3.0 } else { 3.0 });
    let within = if rest == 0.0 { 1.0 } else { libm::pow(10.0, rest / 10.0) };
    if decade < 0.0 { within / scale } else { within * scale }
}

impl Band {
    /// A band of explicit edges; its centre is their geometric mean.
    ///
    /// # Errors
    /// When the edges are not positive and in order.
    pub fn from_edges(low_hz: f64, high_hz: f64) -> Result<Self, BandError> {
        if !(low_hz > 0.0 && high_hz > low_hz && high_hz.is_finite()) {
            return Err(BandError::Edges { low_hz, high_hz });
        }
        Ok(Self { low_hz, centre_hz: (low_hz * high_hz).sqrt(), high_hz })
    }

    /// Width, Hz.
    pub fn width_hz(self) -> f64 {
        self.high_hz - self.low_hz
    }

    /// Ten times the logarithm of the bandwidth over 1 Hz: band level minus mean spectral density level, dB.
    pub fn width_db(self) -> f64 {
        10.0 * libm::log10(self.width_hz())
    }

    /// Whether two bands are the same up to rounding of their numbers.
    pub fn same_as(self, other: Self) -> bool {
        let near = |a: f64, b: f64| (a / b - 1.0).abs() < 1e-3;
        near(self.low_hz, other.low_hz) && near(self.high_hz, other.high_hz)
    }

    /// Short label with its unit: "63 Hz", "1.25 kHz".
    pub fn label(self) -> String {
        let (value, unit) =
            if self.centre_hz >= 999.5 { (self.centre_hz / 1000.0, "kHz") } else { (self.centre_hz, "Hz") };
        let digits = if value >= 99.95 {
            0
        } else if value >= 9.995 {
            1
        } else {
            2
        };
        let text = format!("{value:.digits$}");
        let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
        format!("{text} {unit}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    // IEC 61260-1:2014: exact mid-band frequencies are 1000 G^(x/b), G = 10^(3/10); nominal 31.5, 63, 125, 1250 Hz ...
    #[test]
    fn nominal_centres_find_their_exact_decidecade() {
        for (nominal, exact) in [
            (63.0, 63.095_734_448),
            (125.0, 125.892_541_179),
            (1000.0, 1000.0),
            (1250.0, 1_258.925_411_794),
            (31.5, 31.622_776_602),
            (20.0, 19.952_623_150),
            (10.0, 10.0),
            (100.0, 100.0),
        ] {
            let band = BandScheme::Decidecade.band(Hertz::new(nominal).unwrap()).unwrap();
            assert!((band.centre_hz / exact - 1.0).abs() < 1e-10, "{nominal}: {band:?}");
            assert!((band.high_hz / band.low_hz - 1.258_925_411_794).abs() < 1e-9);
        }
        assert_eq!(
            BandScheme::Decidecade.band(Hertz::new(10.0).unwrap()).unwrap().centre_hz.to_bits(),
            10f64.to_bits()
        );
    }

    #[test]
    fn octaves_are_of_base_ten() {
        let band = BandScheme::Octave.band(Hertz::new(63.0).unwrap()).unwrap();
        assert!((band.centre_hz - 63.095_734).abs() < 1e-5, "{band:?}");
        assert!((band.high_hz / band.low_hz - 1.995_262_315).abs() < 1e-8);
        let band = BandScheme::Octave.band(Hertz::new(31.5).unwrap()).unwrap();
        assert!((band.centre_hz - 31.622_777).abs() < 1e-5, "{band:?}");
    }

    #[test]
    fn a_frequency_between_two_centres_is_refused() {
        let error = BandScheme::Decidecade.band(Hertz::new(112.0).unwrap()).unwrap_err();
        assert!(error.to_string().starts_with("112 Hz is no decidecade centre"), "{error}");
    }

    #[test]
    fn labels_carry_their_unit() {
        let label = |nominal| BandScheme::Decidecade.band(Hertz::new(nominal).unwrap()).unwrap().label();
        assert_eq!(label(63.0), "63.1 Hz");
        assert_eq!(label(1000.0), "1 kHz");
        assert_eq!(label(12500.0), "12.6 kHz");
    }
}
