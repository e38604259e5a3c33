//! An invented wind field: advected waves of weather, stored on a grid as packed numbers.
//!
//! The true wind at a site is by definition what the stored numbers say: bilinear between nodes, linear between hours. So a
//! reader that does the same is tested, and not its interpolation error.

use super::random::Stream;
use super::settings::Settings;
use crate::model::Point;
use crate::units::{HOUR_MS, Instant};

/// Scale of the packed numbers: m/s a step.
pub const PACKED_SCALE_M_S: f64 = 0.001;
/// Packed number of a missing value.
pub const PACKED_FILL: i16 = -32_767;
/// Waves that make up each component.
const WAVES: usize = 48;
/// Nodes times hours beyond which a field is refused.
const LARGEST_FIELD: usize = 60_000_000;
/// Median of the speed of two independent normal components of standard deviation 1: sqrt(2 ln 2).
const MEDIAN_SPEED: f64 = 1.177_410_022_515_474_7;

/// Hourly wind on a grid.
#[derive(Debug, Clone)]
pub struct WindField {
    /// Degrees north, increasing.
    pub latitudes_deg: Vec<f64>,
    /// Degrees east, increasing; may pass 180.
    pub longitudes_deg: Vec<f64>,
    /// First hour.
    pub start: Instant,
    /// Number of hours.
    pub hours: usize,
    /// Component towards the east, packed; hour by hour, row by row.
    pub eastward: Vec<i16>,
    /// Component towards the north, packed.
    pub northward: Vec<i16>,
}

/// The true wind at a site at the hours of the field.
#[derive(Debug, Clone)]
pub struct SiteWind {
    /// Hours.
    pub steps: Vec<Instant>,
    /// Component towards the east, m/s.
    pub eastward_m_s: Vec<f64>,
    /// Component towards the north, m/s.
    pub northward_m_s: Vec<f64>,
}

struct Wave {
    along_x: f64,
    along_y: f64,
    per_hour: f64,
    amplitude: f64,
    phase: f64,
}

impl Wave {
    /// The wave at a place (degrees) and hour. Its phase leans forward: the wind builds slowly and changes quickly, as at a front.
    fn at(&self, x: f64, y: f64, hour: f64) -> f64 {
        let phase = self.along_x * x + self.along_y * y - self.per_hour * hour + self.phase;
        self.amplitude * libm::sin(phase + 0.6 * libm::sin(phase))
    }
}

fn waves(seed: u64, purpose: u64, settings: &Settings) -> Vec<Wave> {
    let mut stream = Stream::new(seed, purpose);
    let mut waves: Vec<Wave> = (0..WAVES)
        .map(|_| {
            // Wavelengths of 5 to 40 degrees, longer ones stronger; weather drifts eastward, and has a life of its own.
            let length_deg = 5.0 * libm::pow(8.0, stream.uniform());
            let heading = 2.0 * std::f64::consts::PI * stream.uniform();
            let number = 2.0 * std::f64::consts::PI / length_deg;
            let (along_x, along_y) = (number * libm::cos(heading), number * libm::sin(heading));
            let own = stream.normal() / settings.wind_time_scale_h;
            let per_hour = along_x * 0.15 + own;
            let amplitude = libm::pow(length_deg, 0.6) * (0.3 + stream.uniform());
            let phase = 2.0 * std::f64::consts::PI * stream.uniform();
            Wave { along_x, along_y, per_hour, amplitude, phase }
        })
        .collect();
    // Half the sum of squares is the variance of a sum of sines.
    let variance: f64 = waves.iter().map(|wave| 0.5 * wave.amplitude * wave.amplitude).sum();
    let scale = settings.median_wind_m_s / MEDIAN_SPEED / variance.sqrt();
    waves.iter_mut().for_each(|wave| wave.amplitude *= scale);
    waves
}

impl WindField {
    /// Invents a field that covers the places.
    ///
    /// # Errors
    /// A sentence, when there is no place, or the field would be too large.
    pub fn invent(settings: &Settings, seed: u64, places: &[Point]) -> Result<Self, String> {
        let start = settings.start()?;
        let first = places.first().ok_or("there is no site with a position to simulate")?;
        // Longitudes near the first site, so that a group across the antimeridian stays together.
        let near = |place: &Point| {
            first.longitude_deg() + (place.longitude_deg() - first.longitude_deg() + 540.0).rem_euclid(360.0) - 180.0
        };
        let axis = |values: Vec<f64>, limit: f64| -> Vec<f64> {
            let low = values.iter().copied().fold(f64::INFINITY, f64::min) - settings.margin_deg;
            let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max) + settings.margin_deg;
            let step = settings.resolution_deg;
            let from = (low / step).floor() as i64;
            let to = ((high / step).ceil() as i64).max(from + 1);
            (from..=to).map(|k| k as f64 * step).filter(|value| value.abs() <= limit).collect()
        };
        let latitudes_deg = axis(places.iter().map(|place| place.latitude_deg()).collect(), 90.0);
        let longitudes_deg = axis(places.iter().map(near).collect(), 720.0);
        let hours = settings.hours() + 1;
        let nodes = latitudes_deg.len() * longitudes_deg.len();
        if nodes.saturating_mul(hours) > LARGEST_FIELD {
            return Err(format!(
                "the wind field would have {nodes} nodes and {hours} hours; raise `simulate.resolution_deg`, or put the sites closer together"
            ));
        }
        let (east, north) = (waves(seed, 1, settings), waves(seed, 2, settings));
        let mut field =
            Self { latitudes_deg, longitudes_deg, start, hours, eastward: Vec::new(), northward: Vec::new() };
        for hour in 0..hours {
            for latitude in &field.latitudes_deg {
                for longitude in &field.longitudes_deg {
                    let value = |waves: &[Wave]| -> i16 {
                        let sum: f64 = waves.iter().map(|wave| wave.at(*longitude, *latitude, hour as f64)).sum();
                        (sum / PACKED_SCALE_M_S).round().clamp(-32_000.0, 32_000.0) as i16
                    };
                    field.eastward.push(value(&east));
                    field.northward.push(value(&north));
                }
            }
        }
        Ok(field)
    }

    /// The wind at a place, as the stored numbers have it; `None` outside the grid.
    pub fn at(&self, place: Point) -> Option<SiteWind> {
        let (row, north) = cell(&self.latitudes_deg, place.latitude_deg())?;
        let turns = [0.0, 360.0, -360.0, 720.0];
        let (column, east) = turns.iter().find_map(|turn| cell(&self.longitudes_deg, place.longitude_deg() + turn))?;
        let width = self.longitudes_deg.len();
        let size = width * self.latitudes_deg.len();
        let mix = |packed: &[i16], hour: usize| {
            let node = |r: usize, c: usize| f64::from(packed[hour * size + r * width + c]) * PACKED_SCALE_M_S;
            let low = node(row, column) * (1.0 - east) + node(row, column + 1) * east;
            let high = node(row + 1, column) * (1.0 - east) + node(row + 1, column + 1) * east;
            low * (1.0 - north) + high * north
        };
        Some(SiteWind {
            steps: (0..self.hours).map(|hour| self.start.plus_ms(hour as i64 * HOUR_MS)).collect(),
            eastward_m_s: (0..self.hours).map(|hour| mix(&self.eastward, hour)).collect(),
            northward_m_s: (0..self.hours).map(|hour| mix(&self.northward, hour)).collect(),
        })
    }
}

/// Cell of a coordinate on an increasing, even axis, and the share of the upper node.
fn cell(axis: &[f64], coordinate: f64) -> Option<(usize, f64)> {
    let last = axis.len().checked_sub(2)?;
    if coordinate < axis[0] || coordinate > axis[last + 1] {
        return None;
    }
    let index = (((coordinate - axis[0]) / (axis[1] - axis[0])).floor() as usize).min(last);
    Some((index, (coordinate - axis[index]) / (axis[index + 1] - axis[index])))
}

/// Mean speed over each hour between two steps, m/s, by a fine sum; NaN where a step is missing or not an hour after the
/// one before.
pub fn hourly_speed_m_s(wind: &SiteWind) -> Vec<f64> {
    const PARTS: usize = 60;
    (1..wind.steps.len())
        .map(|k| {
            if wind.steps[k].0 - wind.steps[k - 1].0 != HOUR_MS {
                return f64::NAN;
            }
            let at = |values: &[f64], share: f64| values[k - 1] + share * (values[k] - values[k - 1]);
            let sum: f64 = (0..PARTS)
                .map(|part| {
                    let share = (part as f64 + 0.5) / PARTS as f64;
                    libm::hypot(at(&wind.eastward_m_s, share), at(&wind.northward_m_s, share))
                })
                .sum();
            sum / PARTS as f64
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_field_has_its_median_and_covers_its_sites() {
        let settings = Settings { days: 365, resolution_deg: 1.0, ..Settings::default() };
        let place = Point::new(44.3, 179.9).unwrap();
        let other = Point::new(45.1, -179.6).unwrap();
        let field = WindField::invent(&settings, 5, &[place, other]).unwrap();
        let wind = field.at(other).unwrap();
        let mut speeds = hourly_speed_m_s(&wind);
        speeds.sort_unstable_by(f64::total_cmp);
        let median = speeds[speeds.len() / 2];
        assert!((median - settings.median_wind_m_s).abs() < 1.5, "{median}");
        assert!(speeds[0] < 1.5 && speeds[speeds.len() - 1] > 13.0, "{} {}", speeds[0], speeds[speeds.len() - 1]);
        assert!(field.at(Point::new(10.0, 0.0).unwrap()).is_none());
    }
}
