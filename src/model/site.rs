//! Sites, their positions or tracks, and the sensors they hold.

use crate::units::{Instant, Window};
use serde::Serialize;

/// A position on the sphere: latitude in [-90, 90] degrees north, longitude in [-180, 180) degrees east.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Point {
    latitude_deg: f64,
    longitude_deg: f64,
}

/// Why coordinates are no position.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum PointError {
    /// Latitude outside [-90, 90].
    #[error(
        "latitude is {latitude_deg}, expected -90 to 90 degrees north (are latitude {latitude_deg} and longitude {longitude_deg} swapped?)"
    )]
    Latitude {
        /// As given, degrees.
        latitude_deg: f64,
        /// As given, degrees.
        longitude_deg: f64,
    },
    /// Longitude outside [-180, 360] or not a number.
    #[error("longitude is {longitude_deg}, expected -180 to 360 degrees east")]
    Longitude {
        /// As given, degrees.
        longitude_deg: f64,
    },
}

impl Point {
    /// From degrees north and degrees east; the longitude in either convention (-180 to 180, or 0 to 360).
    ///
    /// # Errors
    /// When a coordinate is impossible or not finite.
    pub fn new(latitude_deg: f64, longitude_deg: f64) -> Result<Self, PointError> {
        if !latitude_deg.is_finite() || latitude_deg.abs() > 90.0 {
            return Err(PointError::Latitude { latitude_deg, longitude_deg });
        }
        if !longitude_deg.is_finite() || !(-180.0..=360.0).contains(&longitude_deg) {
            return Err(PointError::Longitude { longitude_deg });
        }
        let longitude_deg = if longitude_deg >= 180.0 { longitude_deg - 360.0 } else { longitude_deg };
        Ok(Self { latitude_deg, longitude_deg })
    }

    /// Degrees north.
    pub fn latitude_deg(self) -> f64 {
        self.latitude_deg
    }

    /// Degrees east, in [-180, 180).
    pub fn longitude_deg(self) -> f64 {
        self.longitude_deg
    }
}

/// Where a site is: at one place, or along a track.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub enum Track {
    /// One place for all times.
    Fixed(Point),
    /// Positions in increasing time; between them the place is interpolated along the shorter way, outside there is none.
    Moving(Vec<(Instant, Point)>),
}

impl Track {
    /// The place at an instant; `None` before the first and after the last position of a moving track.
    pub fn at(&self, instant: Instant) -> Option<Point> {
        match self {
            Self::Fixed(point) => Some(*point),
            Self::Moving(positions) => {
                let after = positions.partition_point(|(time, _)| *time <= instant);
                let (before_time, before) = *positions.get(after.checked_sub(1)?)?;
                if before_time == instant {
                    return Some(before);
                }
                let (after_time, after) = *positions.get(after)?;
                let share = (instant.0 - before_time.0) as f64 / (after_time.0 - before_time.0) as f64;
                let turn = (after.longitude_deg - before.longitude_deg + 540.0).rem_euclid(360.0) - 180.0;
                let longitude_deg = (before.longitude_deg + share * turn + 180.0).rem_euclid(360.0) - 180.0;
                let latitude_deg = before.latitude_deg + share * (after.latitude_deg - before.latitude_deg);
                Some(Point { latitude_deg, longitude_deg })
            }
        }
    }

    /// One place that stands for the site on maps and in tables: the place itself, or the first of a track.
    pub fn nominal(&self) -> Option<Point> {
        match self {
            Self::Fixed(point) => Some(*point),
            Self::Moving(positions) => positions.first().map(|(_, point)| *point),
        }
    }
}

/// A sensor at a site.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Sensor {
    /// Name, unique within its site.
    pub id: String,
    /// Depth below the surface, metres, positive down.
    pub depth_m: Option<f64>,
    /// Periods of use, each with its name; empty: one deployment for the whole record.
    pub deployments: Vec<Deployment>,
}

/// A period in which a sensor stood without a change of hardware.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Deployment {
    /// Name, unique within its sensor.
    pub id: String,
    /// The period.
    pub window: Window,
}

/// A place where sound is measured.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Site {
    /// Name, unique within the study.
    pub id: String,
    /// Where it is.
    pub track: Track,
    /// Its sensors, at least one.
    pub sensors: Vec<Sensor>,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_longitude_conventions_are_one_place() {
        assert_eq!(Point::new(10.0, 230.5), Point::new(10.0, -129.5));
        assert_eq!(Point::new(10.0, 180.0), Point::new(10.0, -180.0));
        assert_eq!(Point::new(10.0, 360.0), Point::new(10.0, 0.0));
    }

    #[test]
    fn impossible_coordinates_are_refused() {
        let swapped = Point::new(-129.4, 48.2).unwrap_err().to_string();
        assert!(swapped.contains("-129.4") && swapped.contains("swapped"), "{swapped}");
        assert!(Point::new(f64::NAN, 0.0).is_err() && Point::new(0.0, 361.0).is_err());
    }

    #[test]
    fn a_track_crosses_the_antimeridian_the_short_way() {
        let track = Track::Moving(vec![
            (Instant(0), Point::new(0.0, 179.0).unwrap()),
            (Instant(10), Point::new(2.0, -179.0).unwrap()),
        ]);
        let middle = track.at(Instant(5)).unwrap();
        assert!((middle.longitude_deg() + 180.0).abs() < 1e-12 && (middle.latitude_deg() - 1.0).abs() < 1e-12);
        assert!(track.at(Instant(11)).is_none() && track.at(Instant(-1)).is_none());
        assert_eq!(track.at(Instant(10)).unwrap(), Point::new(2.0, -179.0).unwrap());
    }
}
