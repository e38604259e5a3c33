//! The nodes that a place needs where latitude and longitude are no axes.

use super::stencil::distance_km;
use crate::model::{Flag, FlagSet, Layout, Missing, NodeId, Point, Scattered, SpatialRule, Stencil};
use crate::model::{dot, east_and_north, unit_vector};

/// Nodes without cells serve sites within this distance where the study sets none, km.
const MAX_DISTANCE_KM: f64 = 50.0;
/// A site this near to a node or an edge, in shares of the cell, is on it: coordinates in float32 differ from their text.
const ON_NODE: f64 = 1e-5;
/// Cells this many rows and columns around the nearest node are looked at first.
const AROUND: usize = 2;

/// The nodes that a place needs under a rule.
///
/// # Errors
/// The reason, when the place lies in no cell or too far from every node.
pub(super) fn stencil(nodes: &Scattered, place: Point, rule: &SpatialRule) -> Result<Stencil, Missing> {
    let flag = if nodes.layout() == Layout::Stations { Flag::NearestStation } else { Flag::NearestNode };
    match *rule {
        SpatialRule::Bilinear(_) if nodes.has_cells() => in_cell(nodes, place).ok_or(Missing::OutsideGrid),
        SpatialRule::Bilinear(_) => {
            let mut near = within(nodes, place, MAX_DISTANCE_KM)?;
            near.truncate(1);
            Ok(Stencil { nodes: vec![(near[0].0, 1.0)], flags: FlagSet::of(flag) })
        }
        SpatialRule::Nearest { max_distance_km } => {
            let near = within(nodes, place, max_distance_km)?;
            Ok(Stencil { nodes: near.into_iter().map(|(node, _)| (node, 1.0)).collect(), flags: FlagSet::of(flag) })
        }
        SpatialRule::Footprint { radius_km } => {
            let near = within(nodes, place, radius_km)?;
            let weight = 1.0 / near.len() as f64;
            Ok(Stencil { nodes: near.into_iter().map(|(node, _)| (node, weight)).collect(), flags: FlagSet::default() })
        }
    }
}

/// Nodes within a distance, nearest first; ties in stored order.
fn within(nodes: &Scattered, place: Point, radius_km: f64) -> Result<Vec<(NodeId, f64)>, Missing> {
    let here = unit_vector(place.latitude_deg(), place.longitude_deg());
    // The chord of the distance on a sphere a little too small, so that the distance itself decides.
    let chord = (radius_km / 6350.0).min(2.0);
    let mut near: Vec<(NodeId, f64)> = nodes
        .nodes()
        .filter(|(_, _, vector)| {
            let apart = [vector[0] - here[0], vector[1] - here[1], vector[2] - here[2]];
            dot(apart, apart) <= chord * chord + 1e-12
        })
        .filter_map(|(row, column, _)| {
            let (latitude, longitude) = nodes.place(row, column)?;
            let distance = distance_km(place, Point::new(latitude, longitude).ok()?);
            (distance <= radius_km).then_some((NodeId { row, column }, distance))
        })
        .collect();
    near.sort_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)));
    if near.is_empty() { Err(Missing::BeyondDistance) } else { Ok(near) }
}

/// The cell of four nodes that a place lies in, with its bilinear weights: on the plane that touches the globe at the site
/// (gnomonic, where great circles are straight), the inverse of the bilinear map.
fn in_cell(nodes: &Scattered, place: Point) -> Option<Stencil> {
    let here = unit_vector(place.latitude_deg(), place.longitude_deg());
    let (near_row, near_column) = nodes
        .nodes()
        .map(|(row, column, vector)| (dot(vector, here), row, column))
        .max_by(|a, b| a.0.total_cmp(&b.0).then((b.1, b.2).cmp(&(a.1, a.2))))
        .map(|(_, row, column)| (row, column))?;
    let (rows, columns) = nodes.size();
    let around = |at: usize, count: usize| at.saturating_sub(AROUND)..(at + AROUND).min(count - 1);
    let (east, north) = east_and_north(place.latitude_deg(), place.longitude_deg());
    let plane = |row: usize, column: usize| -> Option<[f64; 2]> {
        let vector = nodes.vector(row, column)?;
        let down = dot(vector, here);
        (down > 0.1).then(|| [dot(vector, east) / down, dot(vector, north) / down])
    };
    let cell = |row: usize, column: usize| -> Option<Stencil> {
        let corners =
            [plane(row, column)?, plane(row, column + 1)?, plane(row + 1, column)?, plane(row + 1, column + 1)?];
        let (s, t) = inverse_bilinear(corners)?;
        let weights = [(1.0 - s) * (1.0 - t), s * (1.0 - t), (1.0 - s) * t, s * t];
        let ids = [(row, column), (row, column + 1), (row + 1, column), (row + 1, column + 1)];
        let needed = ids.iter().zip(weights).filter(|(_, weight)| *weight > 0.0);
        let mut list: Vec<(NodeId, f64)> =
            needed.map(|((row, column), weight)| (NodeId { row: *row, column: *column }, weight)).collect();
        list.sort_by_key(|(node, _)| *node);
        Some(Stencil { nodes: list, flags: FlagSet::default() })
    };
    let near = around(near_row, rows).flat_map(|row| around(near_column, columns).map(move |column| (row, column)));
    let found = near.into_iter().find_map(|(row, column)| cell(row, column));
    let inner = (1..rows - 1).contains(&near_row) && (1..columns - 1).contains(&near_column);
    if found.is_some() || !inner {
        return found;
    }
    // Strongly sheared cells may lie farther from the nearest node.
    (0..rows - 1).flat_map(|row| (0..columns - 1).map(move |column| (row, column))).find_map(|(r, c)| cell(r, c))
}

/// Shares along the columns and the rows at which a bilinear map of four corners is zero; `None` outside the cell.
fn inverse_bilinear([a, b, c, d]: [[f64; 2]; 4]) -> Option<(f64, f64)> {
    for axis in 0..2 {
        let low = a[axis].min(b[axis]).min(c[axis]).min(d[axis]);
        let high = a[axis].max(b[axis]).max(c[axis]).max(d[axis]);
        let room = ON_NODE * (high - low);
        if low > room || high < -room {
            return None;
        }
    }
    let (mut s, mut t) = (0.5, 0.5);
    for _ in 0..25 {
        let mut value = [0.0; 2];
        let mut by_s = [0.0; 2];
        let mut by_t = [0.0; 2];
        for axis in 0..2 {
            let (a, b, c, d) = (a[axis], b[axis], c[axis], d[axis]);
            value[axis] = (1.0 - t) * (a + s * (b - a)) + t * (c + s * (d - c));
            by_s[axis] = (1.0 - t) * (b - a) + t * (d - c);
            by_t[axis] = (c - a) + s * (a - b - c + d);
        }
        let determinant = by_s[0] * by_t[1] - by_s[1] * by_t[0];
        if determinant == 0.0 {
            return None;
        }
        let step_s = (value[0] * by_t[1] - value[1] * by_t[0]) / determinant;
        let step_t = (by_s[0] * value[1] - by_s[1] * value[0]) / determinant;
        s -= step_s;
        t -= step_t;
        if !(s.abs() < 100.0 && t.abs() < 100.0) {
            return None;
        }
        if step_s.abs() + step_t.abs() < 1e-13 {
            break;
        }
    }
    let snap = |share: f64| {
        if share.abs() <= ON_NODE {
            0.0
        } else if (share - 1.0).abs() <= ON_NODE {
            1.0
        } else {
            share
        }
    };
    let (s, t) = (snap(s), snap(t));
    ((0.0..=1.0).contains(&s) && (0.0..=1.0).contains(&t)).then_some((s, t))
}

#[cfg(test)]
mod tests {
    use super::*;

    proptest::proptest! {
        #[test]
        fn the_inverse_undoes_a_bilinear_map(s in 0.01..0.99f64, t in 0.01..0.99f64, bend in proptest::array::uniform8(-0.2..0.2f64)) {
            let corners = [[0.0, 0.0], [1.0, 0.2], [-0.3, 1.0], [0.8, 1.3]];
            let mut moved: Vec<[f64; 2]> =
                corners.iter().enumerate().map(|(k, p)| [p[0] + bend[2 * k], p[1] + bend[2 * k + 1]]).collect();
            let at = [0, 1].map(|x| {
                (1.0 - t) * ((1.0 - s) * moved[0][x] + s * moved[1][x]) + t * ((1.0 - s) * moved[2][x] + s * moved[3][x])
            });
            for corner in &mut moved {
                corner[0] -= at[0];
                corner[1] -= at[1];
            }
            let found = inverse_bilinear([moved[0], moved[1], moved[2], moved[3]]).unwrap();
            proptest::prop_assert!((found.0 - s).abs() < 1e-9 && (found.1 - t).abs() < 1e-9, "{found:?}");
        }
    }
}
