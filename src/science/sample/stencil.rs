//! The nodes that a place needs.

use crate::model::{Flag, FlagSet, Grid, Missing, NodeId, Point, SpatialRule, Stencil};
use crate::numerics::axis::{Axis, Bracket};
use geo::Distance;

/// Distance along the sphere, km (haversine, mean radius of the Earth), to the millimetre: beyond that platforms differ.
pub fn distance_km(a: Point, b: Point) -> f64 {
    let place = |point: Point| geo::Point::new(point.longitude_deg(), point.latitude_deg());
    (geo::Haversine.distance(place(a), place(b)) * 1e3).round() / 1e6
}

/// Mean radius of the Earth, km: (2a + b)/3 of WGS84 (NIMA TR8350.2).
const EARTH_RADIUS_KM: f64 = 6_371.008_771_4;

/// Latitude and longitude as axes.
struct Axes<'a> {
    latitude: &'a Axis,
    longitude: &'a Axis,
}

/// The nodes that a place needs under a rule.
///
/// # Errors
/// The reason, when the place lies outside the grid or too far from its nodes.
pub fn stencil(grid: &Grid, place: Point, rule: &SpatialRule) -> Result<Stencil, Missing> {
    let grid = match grid {
        Grid::Axes { latitude, longitude } => &Axes { latitude, longitude },
        Grid::Scattered(nodes) => return super::scattered::stencil(nodes, place, rule),
    };
    match *rule {
        SpatialRule::Bilinear(_) => bilinear(grid, place),
        SpatialRule::Nearest { max_distance_km } => {
            let near = within(grid, place, max_distance_km);
            let nodes = near.into_iter().map(|(node, _)| (node, 1.0)).collect::<Vec<_>>();
            // All nodes within reach, nearest first: the first one that has data serves.
            if nodes.is_empty() {
                Err(Missing::BeyondDistance)
            } else {
                Ok(Stencil { nodes, flags: FlagSet::of(Flag::NearestNode) })
            }
        }
        SpatialRule::Footprint { radius_km } => {
            let near = within(grid, place, radius_km);
            let weight = 1.0 / near.len() as f64;
            if near.is_empty() {
                return Err(Missing::BeyondDistance);
            }
            Ok(Stencil { nodes: near.into_iter().map(|(node, _)| (node, weight)).collect(), flags: FlagSet::default() })
        }
    }
}

fn bilinear(grid: &Axes<'_>, place: Point) -> Result<Stencil, Missing> {
    let column = grid.longitude.bracket_longitude(place.longitude_deg()).ok_or(Missing::OutsideGrid)?;
    let Some(row) = grid.latitude.bracket(place.latitude_deg()) else {
        return polar(grid, place).ok_or(Missing::OutsideGrid);
    };
    let mut nodes = Vec::with_capacity(4);
    for (node_row, row_weight) in ends(row) {
        for (node_column, column_weight) in ends(column) {
            nodes.push((NodeId { row: node_row, column: node_column }, row_weight * column_weight));
        }
    }
    Ok(Stencil { nodes, flags: FlagSet::default() })
}

/// The one or two nodes of a bracket with their weights; a node of weight zero is not needed.
fn ends(bracket: Bracket) -> Vec<(usize, f64)> {
    if bracket.share == 0.0 {
        vec![(bracket.before, 1.0)]
    } else {
        vec![(bracket.before, 1.0 - bracket.share), (bracket.after, bracket.share)]
    }
}

/// Beyond the last row of a grid that closes around the globe and comes within one row of the pole: the last row at the
/// site's longitude, flagged. (A mean over the row would be wrong: components of one wind turn with the longitude.)
fn polar(grid: &Axes<'_>, place: Point) -> Option<Stencil> {
    if !grid.longitude.is_periodic() {
        return None;
    }
    let latitude = place.latitude_deg();
    let (_, high) = grid.latitude.limits();
    let ((row, edge), (_, inner), pole) = if latitude > high {
        let mut rows = grid.latitude.nodes().rev();
        (rows.next()?, rows.next()?, 90.0)
    } else {
        let mut rows = grid.latitude.nodes();
        (rows.next()?, rows.next()?, -90.0)
    };
    if f64::abs(pole - edge) > f64::abs(edge - inner) {
        return None;
    }
    let column = grid.longitude.bracket_longitude(place.longitude_deg())?;
    let nodes = ends(column).into_iter().map(|(column, weight)| (NodeId { row, column }, weight)).collect();
    Some(Stencil { nodes, flags: FlagSet::of(Flag::PoleRow) })
}

/// Nodes within a distance, nearest first; ties in stored order. Only rows and columns that can hold one are looked at.
fn within(grid: &Axes<'_>, place: Point, radius_km: f64) -> Vec<(NodeId, f64)> {
    let radius = radius_km / EARTH_RADIUS_KM;
    // A little more than needed: the distance decides.
    let radius_deg = radius.to_degrees() * (1.0 + 1e-6) + 1e-6;
    let latitude_deg = place.latitude_deg();
    // Where the circle holds no pole, its widest meridians are asin(sin r / cos latitude) away.
    let columns_deg = if latitude_deg.abs() + radius_deg < 90.0 {
        libm::asin((libm::sin(radius) / libm::cos(latitude_deg.to_radians())).min(1.0)).to_degrees() * (1.0 + 1e-6)
            + 1e-6
    } else {
        180.0
    };
    let columns: Vec<(usize, f64)> = grid
        .longitude
        .around_longitude(place.longitude_deg(), columns_deg)
        .into_iter()
        .map(|(column, longitude)| (column, (longitude + 180.0).rem_euclid(360.0) - 180.0))
        .collect();
    let mut near = Vec::new();
    for (row, latitude) in grid.latitude.between(latitude_deg - radius_deg, latitude_deg + radius_deg) {
        for (column, longitude) in &columns {
            let Ok(node) = Point::new(latitude.clamp(-90.0, 90.0), *longitude) else { continue };
            let distance = distance_km(place, node);
            if distance <= radius_km {
                near.push((NodeId { row, column: *column }, distance));
            }
        }
    }
    near.sort_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)));
    near
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::CoastRule;

    fn grid(latitudes: &[f64], longitudes: &[f64]) -> Grid {
        Grid::Axes { latitude: Axis::linear(latitudes).unwrap(), longitude: Axis::longitude(longitudes).unwrap() }
    }

    fn rule() -> SpatialRule {
        SpatialRule::Bilinear(CoastRule::Missing)
    }

    #[test]
    fn a_degree_of_the_equator_has_its_length() {
        let at = |lon| Point::new(0.0, lon).unwrap();
        // 2 pi R / 360.
        assert!((distance_km(at(0.0), at(1.0)) - 111.195_08).abs() < 1e-4);
        assert!((distance_km(at(179.5), at(-179.5)) - 111.195_08).abs() < 1e-4);
    }

    #[test]
    fn weights_are_those_of_the_cell() {
        let grid = grid(&[52.6, 52.35], &[13.1, 13.35, 13.6]);
        let stencil = stencil(&grid, Point::new(52.475, 13.15).unwrap(), &rule()).unwrap();
        let weights: Vec<f64> = stencil.nodes.iter().map(|(_, weight)| *weight).collect();
        assert!((weights.iter().sum::<f64>() - 1.0).abs() < 1e-12);
        assert!(
            stencil.nodes.iter().any(|(node, weight)| node.row == 0 && node.column == 0 && (weight - 0.4).abs() < 1e-9)
        );
    }

    #[test]
    fn a_site_on_a_node_needs_that_node_alone() {
        let grid = grid(&[52.6, 52.35], &[13.1, 13.35, 13.6]);
        let stencil = stencil(&grid, Point::new(52.35, 13.35).unwrap(), &rule()).unwrap();
        assert_eq!(stencil.nodes, [(NodeId { row: 1, column: 1 }, 1.0)]);
    }

    #[test]
    fn beyond_the_last_row_of_a_global_grid_that_row_serves_with_a_flag() {
        let columns: Vec<f64> = (0..36).map(|k| f64::from(k) * 10.0).collect();
        let rows = [-85.0, -75.0, 75.0, 85.0];
        let far = grid(&[60.0, 61.0], &columns);
        let regional = grid(&rows, &[0.0, 10.0, 20.0]);
        let grid = grid(&rows, &columns);
        for (latitude, row) in [(89.0, 3), (90.0, 3), (-86.0, 0)] {
            let polar = stencil(&grid, Point::new(latitude, 12.0).unwrap(), &rule()).unwrap();
            assert_eq!(polar.flags, FlagSet::of(Flag::PoleRow));
            let nodes: Vec<NodeId> = polar.nodes.iter().map(|(node, _)| *node).collect();
            assert_eq!(nodes, [NodeId { row, column: 1 }, NodeId { row, column: 2 }]);
            assert!((polar.nodes[1].1 - 0.2).abs() < 1e-12);
        }
        assert_eq!(stencil(&regional, Point::new(89.0, 12.0).unwrap(), &rule()), Err(Missing::OutsideGrid));
        assert_eq!(stencil(&far, Point::new(89.0, 12.0).unwrap(), &rule()), Err(Missing::OutsideGrid));
    }

    /// All nodes, one by one: what the search must give.
    fn by_hand(grid: &Axes<'_>, place: Point, radius_km: f64) -> Vec<NodeId> {
        let mut near: Vec<(f64, NodeId)> = Vec::new();
        for (row, latitude) in grid.latitude.nodes() {
            for (column, longitude) in grid.longitude.nodes() {
                let turned = (longitude + 180.0).rem_euclid(360.0) - 180.0;
                let distance = distance_km(place, Point::new(latitude, turned).unwrap());
                if distance <= radius_km {
                    near.push((distance, NodeId { row, column }));
                }
            }
        }
        near.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
        near.into_iter().map(|(_, node)| node).collect()
    }

    proptest::proptest! {
        #[test]
        fn the_search_around_a_place_misses_no_node(
            latitude in -90.0..90.0f64, longitude in -180.0..180.0f64, radius_km in 1.0..4000.0f64, turned in 0..2
        ) {
            let columns: Vec<f64> = (0..72).map(|k| f64::from(k) * 5.0 - if turned == 0 { 0.0 } else { 180.0 }).collect();
            let rows: Vec<f64> = (0..37).map(|k| 90.0 - f64::from(k) * 5.0).collect();
            let (latitudes, longitudes) = (Axis::linear(&rows).unwrap(), Axis::longitude(&columns).unwrap());
            let grid = Axes { latitude: &latitudes, longitude: &longitudes };
            let place = Point::new(latitude, longitude).unwrap();
            let found: Vec<NodeId> = within(&grid, place, radius_km).into_iter().map(|(node, _)| node).collect();
            proptest::prop_assert_eq!(found, by_hand(&grid, place, radius_km));
        }
    }
}
