//! Compass directions that cannot mix their sense.

use std::marker::PhantomData;

/// Why a number is no valid quantity.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{quantity} is {found}; expected {expected}")]
pub struct UnitsError {
    /// What the number was meant to be.
    pub quantity: &'static str,
    /// The number as given.
    pub found: f64,
    /// The values that are allowed.
    pub expected: &'static str,
}

/// The wind convention: the direction that something comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ComingFrom {}

/// The travel convention: the direction that something goes to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum GoingTo {}

/// A direction in degrees clockwise from true north, kept in [0, 360), with its sense in the type.
///
/// The two senses do not mix:
///
/// ```
/// use underwind::units::{Compass, ComingFrom, GoingTo};
/// let wind: Compass<ComingFrom> = Compass::from_degrees(270.0).unwrap();
/// let travel: Compass<GoingTo> = wind.reversed();
/// assert_eq!(travel.degrees(), 90.0);
/// ```
///
/// ```compile_fail
/// use underwind::units::{Compass, ComingFrom, GoingTo};
/// let wind: Compass<ComingFrom> = Compass::from_degrees(270.0).unwrap();
/// let travel: Compass<GoingTo> = wind;
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Compass<C> {
    degrees: f64,
    sense: PhantomData<C>,
}

impl<C> Compass<C> {
    /// From degrees clockwise from true north; any finite number of turns.
    ///
    /// # Errors
    /// When the number is not finite.
    pub fn from_degrees(degrees: f64) -> Result<Self, UnitsError> {
        if !degrees.is_finite() {
            return Err(UnitsError { quantity: "direction", found: degrees, expected: "a finite number of degrees" });
        }
        let turned = degrees.rem_euclid(360.0);
        // rem_euclid of a tiny negative number rounds to 360 itself.
        Ok(Self { degrees: if turned >= 360.0 { 0.0 } else { turned }, sense: PhantomData })
    }

    /// Degrees clockwise from true north, in [0, 360).
    pub fn degrees(self) -> f64 {
        self.degrees
    }
}

impl Compass<ComingFrom> {
    /// The direction that a wind with these components (m/s, towards east and towards north) comes from.
    /// Calm has no direction: `None`.
    pub fn of_wind(eastward_m_s: f64, northward_m_s: f64) -> Option<Self> {
        if eastward_m_s == 0.0 && northward_m_s == 0.0 {
            return None;
        }
        Self::from_degrees(270.0 - libm::atan2(northward_m_s, eastward_m_s).to_degrees()).ok()
    }

    /// The same movement, named by where it goes.
    pub fn reversed(self) -> Compass<GoingTo> {
        Compass { degrees: (self.degrees + 180.0) % 360.0, sense: PhantomData }
    }

    /// Components (m/s, towards east and towards north) of a wind of this speed from this direction.
    pub fn components(self, speed_m_s: f64) -> (f64, f64) {
        let radians = self.degrees.to_radians();
        (-speed_m_s * libm::sin(radians), -speed_m_s * libm::cos(radians))
    }
}

impl Compass<GoingTo> {
    /// The same movement, named by where it comes from.
    pub fn reversed(self) -> Compass<ComingFrom> {
        Compass { degrees: (self.degrees + 180.0) % 360.0, sense: PhantomData }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    // WMO No. 8, Guide to Instruments and Methods of Observation: direction is where the wind blows from,
    // clockwise from true north (from memory).
    #[test]
    fn westerly_wind_comes_from_270() {
        let wind = Compass::of_wind(5.0, 0.0).unwrap();
        assert!((wind.degrees() - 270.0).abs() < 1e-12);
        let (east, north) = wind.components(5.0);
        assert!((east - 5.0).abs() < 1e-12 && north.abs() < 1e-12);
    }

    #[test]
    fn northerly_wind_comes_from_0_and_goes_to_180() {
        let wind = Compass::of_wind(0.0, -7.0).unwrap();
        assert!(wind.degrees() < 1e-9 || wind.degrees() > 360.0 - 1e-9);
        assert!((wind.reversed().degrees() - 180.0).abs() < 1e-9);
    }

    #[test]
    fn calm_has_no_direction() {
        assert!(Compass::of_wind(0.0, 0.0).is_none());
    }

    #[test]
    fn a_tiny_negative_angle_stays_below_360() {
        assert!(Compass::<GoingTo>::from_degrees(-1e-20).unwrap().degrees() < 360.0);
        assert!(Compass::<GoingTo>::from_degrees(f64::NAN).is_err());
    }
}
