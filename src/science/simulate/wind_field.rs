//! The invented wind on a grid, as packed numbers.
//!
//! The true wind at a site is by definition what the stored numbers say: components bilinear between nodes, linear between
//! hours. So a reader that does the same is tested, and not its interpolation error.

use super::settings::Settings;
use super::site_wind::SiteWind;
use super::weather::Weather;
use crate::model::{Point, Track};
use crate::units::{HOUR_MS, Instant};

/// Scale of the packed numbers: m/s a step.
pub const PACKED_SCALE_M_S: f64 = 0.01;
/// Packed number of a missing value.
pub const PACKED_FILL: i16 = -32_767;
/// Nodes times hours beyond which a field is refused.
const LARGEST_FIELD: usize = 100_000_000;
/// Length of a degree of latitude, km (a sphere of 6371 km).
const DEGREE_KM: f64 = 111.195;

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

fn places_of(track: &Track) -> Vec<Point> {
    match track {
        Track::Fixed(place) => vec![*place],
        Track::Moving(positions) => positions.iter().map(|(_, place)| *place).collect(),
    }
}

/// Longitude in the turn that is nearest to another, so that a group across the antimeridian stays together.
fn near(longitude_deg: f64, to_deg: f64) -> f64 {
    to_deg + (longitude_deg - to_deg + 540.0).rem_euclid(360.0) - 180.0
}

impl WindField {
    /// Invents a field that covers the tracks and the time of the settings.
    ///
    /// # Errors
    /// A sentence, when there is no place, or the field would be too large.
    pub fn invent(settings: &Settings, seed: u64, tracks: &[&Track]) -> Result<Self, String> {
        let places: Vec<Point> = tracks.iter().flat_map(|track| places_of(track)).collect();
        let first = places.first().ok_or("there is no site with a position to simulate")?.longitude_deg();
        let latitudes: Vec<f64> = places.iter().map(|place| place.latitude_deg()).collect();
        let longitudes: Vec<f64> = places.iter().map(|place| near(place.longitude_deg(), first)).collect();
        let latitudes_deg = axis(&latitudes, settings, 90.0);
        let longitudes_deg = axis(&longitudes, settings, f64::INFINITY);
        let hours = ((settings.invented_length_ms() + HOUR_MS - 1) / HOUR_MS) as usize + 1;
        let nodes = latitudes_deg.len() * longitudes_deg.len();
        if latitudes_deg.len() < 2 || nodes.saturating_mul(hours) > LARGEST_FIELD {
            return Err(format!(
                "the wind field would have {} x {} nodes and {hours} hours; set another `simulate.resolution_deg` or `simulate.margin_deg`, or simulate fewer days",
                latitudes_deg.len(),
                longitudes_deg.len()
            ));
        }
        let weather = Weather::invent(settings, seed, hours as f64);
        let easternmost = longitudes.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        // Two nodes at least stay sea, whatever the settings say: the coast must not change the wind at a site.
        let coast_deg = settings.land_beyond_deg.map(|beyond| easternmost + beyond.max(2.0 * settings.resolution_deg));
        let east_km = DEGREE_KM * libm::cos(latitudes[0].to_radians());
        let grid: Vec<_> = latitudes_deg
            .iter()
            .flat_map(|latitude| longitudes_deg.iter().map(move |longitude| (*latitude, *longitude)))
            .map(|(latitude, longitude)| {
                let is_land = coast_deg.is_some_and(|coast| longitude > coast);
                let place = weather.place((longitude - first) * east_km, (latitude - latitudes[0]) * DEGREE_KM);
                (!is_land).then_some(place)
            })
            .collect();
        let mut field = Self {
            latitudes_deg,
            longitudes_deg,
            start: settings.invented_start(),
            hours,
            eastward: Vec::with_capacity(nodes * hours),
            northward: Vec::with_capacity(nodes * hours),
        };
        for hour in 0..hours {
            let moment = weather.moment(hour as f64);
            for place in &grid {
                let wind = place.as_ref().map(|place| weather.wind_m_s(place, &moment));
                field.eastward.push(wind.map_or(PACKED_FILL, |wind| packed(wind.0)));
                field.northward.push(wind.map_or(PACKED_FILL, |wind| packed(wind.1)));
            }
        }
        Ok(field)
    }

    /// The wind along a track, as the stored numbers have it: at each hour at the place of that hour.
    pub fn along(&self, track: &Track) -> SiteWind {
        let steps: Vec<Instant> = (0..self.hours).map(|hour| self.start.plus_ms(hour as i64 * HOUR_MS)).collect();
        let (eastward_m_s, northward_m_s) = steps
            .iter()
            .enumerate()
            .map(|(hour, step)| {
                let cell = track.at(*step).and_then(|place| self.cell(place));
                cell.map_or((f64::NAN, f64::NAN), |cell| {
                    (self.mix(&self.eastward, hour, cell), self.mix(&self.northward, hour, cell))
                })
            })
            .unzip();
        SiteWind { steps, eastward_m_s, northward_m_s, max_gap_ms: 2 * HOUR_MS }
    }

    /// Row and column of the cell, and the shares of its northern row and eastern column.
    fn cell(&self, place: Point) -> Option<(usize, usize, f64, f64)> {
        let middle = self.longitudes_deg[self.longitudes_deg.len() / 2];
        let (row, north) = cell_on(&self.latitudes_deg, place.latitude_deg())?;
        let (column, east) = cell_on(&self.longitudes_deg, near(place.longitude_deg(), middle))?;
        Some((row, column, north, east))
    }

    fn mix(&self, packed: &[i16], hour: usize, (row, column, north, east): (usize, usize, f64, f64)) -> f64 {
        let width = self.longitudes_deg.len();
        let size = width * self.latitudes_deg.len();
        let node = |r: usize, c: usize| {
            let number = packed[hour * size + r * width + c];
            if number == PACKED_FILL { f64::NAN } else { f64::from(number) * PACKED_SCALE_M_S }
        };
        let low = node(row, column) * (1.0 - east) + node(row, column + 1) * east;
        let high = node(row + 1, column) * (1.0 - east) + node(row + 1, column + 1) * east;
        low * (1.0 - north) + high * north
    }
}

fn packed(value_m_s: f64) -> i16 {
    (value_m_s / PACKED_SCALE_M_S).round().clamp(-32_000.0, 32_000.0) as i16
}

fn axis(values: &[f64], settings: &Settings, limit: f64) -> Vec<f64> {
    let low = values.iter().copied().fold(f64::INFINITY, f64::min) - settings.margin_deg;
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max) + settings.margin_deg;
    let step = settings.resolution_deg;
    let from = (low / step).floor() as i64;
    let to = ((high / step).ceil() as i64).max(from + 1);
    (from..=to).map(|k| k as f64 * step).filter(|value| value.abs() <= limit).collect()
}

/// Cell of a coordinate on an increasing, even axis, and the share of its upper node.
fn cell_on(axis: &[f64], coordinate: f64) -> Option<(usize, f64)> {
    let last = axis.len().checked_sub(2)?;
    if coordinate < axis[0] || coordinate > axis[last + 1] {
        return None;
    }
    let index = axis.partition_point(|node| *node <= coordinate).saturating_sub(1).min(last);
    Some((index, (coordinate - axis[index]) / (axis[index + 1] - axis[index])))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn fixed(latitude_deg: f64, longitude_deg: f64) -> Track {
        Track::Fixed(Point::new(latitude_deg, longitude_deg).unwrap())
    }

    #[test]
    fn the_field_covers_sites_on_both_sides_of_the_antimeridian() {
        let settings = Settings { days: Some(3.0), ..Settings::default() };
        let tracks = [fixed(44.3, 179.9), fixed(45.1, -179.6)];
        let field = WindField::invent(&settings, 5, &[&tracks[0], &tracks[1]]).unwrap();
        assert!(field.longitudes_deg.len() < 8, "{:?}", field.longitudes_deg);
        for track in &tracks {
            let wind = field.along(track);
            assert!(wind.steps.len() == 73 && wind.eastward_m_s.iter().all(|value| value.is_finite()));
        }
        assert!(field.along(&fixed(10.0, 0.0)).eastward_m_s.iter().all(|value| value.is_nan()));
    }

    // Closed form: bilinear interpolation at the centre of a cell is the mean of its corners.
    #[test]
    fn the_wind_between_nodes_is_that_of_the_stored_numbers() {
        let field = WindField {
            latitudes_deg: vec![0.0, 1.0],
            longitudes_deg: vec![10.0, 11.0],
            start: Instant(0),
            hours: 1,
            eastward: vec![100, 200, 300, 800],
            northward: vec![0, 0, 100, 100],
        };
        let wind = field.along(&fixed(0.5, 10.5));
        assert!((wind.eastward_m_s[0] - 3.5).abs() < 1e-12 && (wind.northward_m_s[0] - 0.5).abs() < 1e-12);
        let corner = field.along(&fixed(1.0, 11.0));
        assert!((corner.eastward_m_s[0] - 8.0).abs() < 1e-12);
        let quarter = field.along(&fixed(0.0, 10.25));
        assert!((quarter.eastward_m_s[0] - 1.25).abs() < 1e-12);
    }

    #[test]
    fn land_lies_away_from_the_sites() {
        let settings = Settings { days: Some(1.0), margin_deg: 3.0, land_beyond_deg: Some(0.0), ..Settings::default() };
        let track = fixed(44.3, 20.49);
        let field = WindField::invent(&settings, 5, &[&track]).unwrap();
        assert!(field.eastward.contains(&PACKED_FILL));
        assert!(field.along(&track).eastward_m_s.iter().all(|value| value.is_finite()));
    }
}
