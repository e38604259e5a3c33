//! The nodes that a place needs.

use crate::model::{Flag, FlagSet, Grid, Missing, NodeId, Point, SpatialRule, Stencil};
use crate::numerics::axis::Bracket;
use geo::Distance;

/// Distance along the sphere, km (haversine, mean radius of the Earth), to the millimetre: beyond that platforms differ.
pub fn distance_km(a: Point, b: Point) -> f64 {
    let place = |point: Point| geo::Point::new(point.longitude_deg(), point.latitude_deg());
    (geo::Haversine.distance(place(a), place(b)) * 1e3).round() / 1e6
}

/// Mean radius of the Earth, km: (2a + b)/3 of WGS84 (NIMA TR8350.2).
const EARTH_RADIUS_KM: f64 = 6_371.008_771_4;

/// The nodes that a place needs under a rule.
///
/// # Errors
/// The reason, when the place lies outside the grid or too far from its nodes.
pub fn stencil(grid: &Grid, place: Point, rule: &SpatialRule) -> Result<Stencil, Missing> {
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

fn bilinear(grid: &Grid, place: Point) -> Result<Stencil, Missing> {
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

/// Beyond the last row of a grid that closes around the globe and comes within one row of the pole: the mean of the row
/// stands for the pole, flagged.
fn polar(grid: &Grid, place: Point) -> Option<Stencil> {
    if !grid.longitude.is_periodic() || grid.latitude.len() < 2 {
        return None;
    }
    let (low, high) = grid.latitude.limits();
    let step = (high - low) / (grid.latitude.len() - 1) as f64;
    let latitude = place.latitude_deg();
    let (edge, pole) = if latitude > high { (high, 90.0) } else { (low, -90.0) };
    if f64::abs(pole - edge) > step {
        return None;
    }
    let row = grid.latitude.bracket(edge)?.before;
    let share = (latitude - edge) / (pole - edge);
    let column = grid.longitude.bracket_longitude(place.longitude_deg())?;
    let count = grid.longitude.len();
    let mut weights = vec![share / count as f64; count];
    for (node, weight) in ends(column) {
        weights[node] += (1.0 - share) * weight;
    }
    let nodes = weights.into_iter().enumerate().map(|(column, weight)| (NodeId { row, column }, weight)).collect();
    Some(Stencil { nodes, flags: FlagSet::of(Flag::PoleRow) })
}

/// Nodes within a distance, nearest first; ties in stored order.
fn within(grid: &Grid, place: Point, radius_km: f64) -> Vec<(NodeId, f64)> {
    let mut near = Vec::new();
    for row in 0..grid.latitude.len() {
        let Some(latitude) = grid.latitude.value_at(row) else { continue };
        if (latitude - place.latitude_deg()).abs().to_radians() * EARTH_RADIUS_KM > radius_km {
            continue;
        }
        for column in 0..=grid.longitude.len() {
            let Some(longitude) = grid.longitude.value_at(column) else { continue };
            let turned = (longitude + 180.0).rem_euclid(360.0) - 180.0;
            let Ok(node) = Point::new(latitude.clamp(-90.0, 90.0), turned) else { continue };
            let distance = distance_km(place, node);
            if distance <= radius_km {
                near.push((NodeId { row, column }, distance));
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
    use crate::numerics::axis::Axis;

    fn grid(latitudes: &[f64], longitudes: &[f64]) -> Grid {
        Grid { latitude: Axis::linear(latitudes).unwrap(), longitude: Axis::longitude(longitudes).unwrap() }
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
    fn beyond_the_last_row_of_a_global_grid_the_pole_row_serves() {
        let columns: Vec<f64> = (0..36).map(|k| f64::from(k) * 10.0).collect();
        let grid = grid(&[-85.0, -75.0, 75.0, 85.0], &columns);
        assert_eq!(stencil(&grid, Point::new(89.0, 12.0).unwrap(), &rule()).err(), None);
        let polar = stencil(&grid, Point::new(90.0, 12.0).unwrap(), &rule()).unwrap();
        assert!(polar.nodes.iter().all(|(_, weight)| (weight - 1.0 / 36.0).abs() < 1e-12));
        let regional = Grid { longitude: Axis::longitude(&[0.0, 10.0, 20.0]).unwrap(), ..grid };
        assert_eq!(stencil(&regional, Point::new(89.0, 12.0).unwrap(), &rule()), Err(Missing::OutsideGrid));
    }
}
