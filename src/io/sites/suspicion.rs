//! Positions that are possible but look like a slip: a lost sign, or latitude and longitude swapped.

use crate::model::Point;

/// A site farther than this from all others is looked at.
const FAR_DEG: f64 = 20.0;
/// The others must lie within this span to say anything.
const SPAN_DEG: f64 = 20.0;
/// A slip is believed when its undoing lands within the others, give or take this.
const MARGIN_DEG: f64 = 2.0;

/// A slip that would explain a far position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Slip {
    /// How far the position lies from the others, degrees of latitude or longitude.
    pub(super) distance_deg: f64,
    /// What undoes it, in words.
    pub(super) remedy: &'static str,
}

/// Difference of longitudes the short way, degrees.
fn turn(from_deg: f64, to_deg: f64) -> f64 {
    (to_deg - from_deg + 540.0).rem_euclid(360.0) - 180.0
}

/// Looks at one position among the others; at least two others are needed.
pub(super) fn slip(point: Point, others: &[Point]) -> Option<Slip> {
    let anchor = others.first()?;
    if others.len() < 2 {
        return None;
    }
    let span = |values: &mut dyn Iterator<Item = f64>| {
        values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| (low.min(value), high.max(value)))
    };
    let latitudes = span(&mut others.iter().map(|other| other.latitude_deg()));
    let turns = span(&mut others.iter().map(|other| turn(anchor.longitude_deg(), other.longitude_deg())));
    if latitudes.1 - latitudes.0 > SPAN_DEG || turns.1 - turns.0 > SPAN_DEG {
        return None;
    }
    // Distance from the box around the others.
    let beyond = |latitude: f64, longitude: f64| {
        let outside = |value: f64, (low, high): (f64, f64)| (low - value).max(value - high).max(0.0);
        outside(latitude, latitudes).max(outside(turn(anchor.longitude_deg(), longitude), turns))
    };
    let (latitude, longitude) = (point.latitude_deg(), point.longitude_deg());
    let distance_deg = beyond(latitude, longitude);
    if distance_deg < FAR_DEG {
        return None;
    }
    let candidates = [
        (latitude, -longitude, "the other sign of the longitude"),
        (-latitude, longitude, "the other sign of the latitude"),
        (-latitude, -longitude, "the other signs of both"),
        (longitude, latitude, "latitude and longitude swapped"),
    ];
    candidates
        .into_iter()
        .find(|(latitude, longitude, _)| beyond(*latitude, *longitude) <= MARGIN_DEG)
        .map(|(.., remedy)| Slip { distance_deg, remedy })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(latitude: f64, longitude: f64) -> Point {
        Point::new(latitude, longitude).unwrap()
    }

    #[test]
    fn a_lost_sign_and_a_swap_show_among_neighbours() {
        let others = [point(48.0, -129.0), point(49.0, -130.0)];
        assert_eq!(slip(point(48.5, 129.5), &others).unwrap().remedy, "the other sign of the longitude");
        assert_eq!(slip(point(-48.5, -129.5), &others).unwrap().remedy, "the other sign of the latitude");
        let others = [point(10.0, 60.0), point(12.0, 62.0)];
        assert_eq!(slip(point(61.0, 11.0), &others).unwrap().remedy, "latitude and longitude swapped");
    }

    #[test]
    fn honest_lists_pass() {
        // Near the antimeridian, 360 and -180 conventions mixed.
        let others = [point(10.0, 179.0), point(11.0, -179.0)];
        assert!(slip(point(10.5, 180.0), &others).is_none());
        // Far away, but no slip explains it; few or scattered neighbours say nothing.
        let others = [point(48.0, -129.0), point(49.0, -130.0)];
        assert!(slip(point(10.0, 20.0), &others).is_none());
        assert!(slip(point(48.0, 129.0), &others[..1]).is_none());
        assert!(slip(point(48.0, 129.0), &[point(48.0, -129.0), point(0.0, 0.0)]).is_none());
    }
}
