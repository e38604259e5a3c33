//! Places of nodes where latitude and longitude are no axes.

use super::error::NetcdfError;
use super::header::{Header, Variable};
use super::read::Reader;
use super::wind_options::WindOptions;
use crate::model::{Grid, Layout, Scattered};
use std::sync::Arc;

/// Where the nodes of a field lie: the dimensions of rows and columns (none for a list of nodes) and the grid.
pub(super) struct Places {
    pub(super) row: Option<usize>,
    pub(super) column: usize,
    pub(super) grid: Grid,
    pub(super) note: Option<String>,
}

/// Finds the nodes' places; `None` where latitude and longitude are axes (or scalars).
///
/// # Errors
/// When the layout can be told but not used: no places of the nodes, or components whose sense nothing states.
pub(super) fn places(
    reader: &Reader,
    variable: &Variable,
    options: &WindOptions,
) -> Result<Option<Places>, NetcdfError> {
    let header = &reader.header;
    let refuse =
        |problem: String| NetcdfError::Variable { path: header.path.clone(), variable: variable.name.clone(), problem };
    let latitude = coordinate(header, variable, "latitude", options.latitude.as_deref());
    let longitude = coordinate(header, variable, "longitude", options.longitude.as_deref());
    let mapped = mapped_layout(header, variable);
    let (Some(latitude), Some(longitude)) = (latitude, longitude) else {
        return match mapped {
            Some(Layout::RotatedPole) => rotated(reader, variable, options).map(Some),
            Some(layout) => Err(refuse(without_places(layout))),
            None => Ok(None),
        };
    };
    if latitude.dimensions != longitude.dimensions {
        return Ok(None);
    }
    let layout = mapped.unwrap_or(match latitude.dimensions.len() {
        2 => Layout::Curvilinear,
        _ if is_station(header, latitude) => Layout::Stations,
        _ => Layout::Nodes,
    });
    let places: Option<Vec<usize>> = latitude
        .dimensions
        .iter()
        .map(|dimension| variable.dimensions.iter().position(|own| own == dimension))
        .collect();
    let places = places.ok_or_else(|| {
        refuse(format!(
            "its latitudes `{}` lie along dimensions that it does not have (set `wind.latitude` and `wind.longitude`)",
            latitude.name
        ))
    })?;
    let read = |of: &Variable| -> Result<Vec<f64>, NetcdfError> {
        let scale = if of.text("units").is_some_and(|u| u.to_lowercase().starts_with("rad")) {
            180.0 / std::f64::consts::PI
        } else {
            1.0
        };
        Ok(reader.coordinate(of)?.into_iter().map(|value| value * scale).collect())
    };
    let (row, column) = match places[..] {
        [row, column] => (Some(row), column),
        [column] => (None, column),
        _ => return Ok(None),
    };
    let shape = header.shape(variable);
    let size = (row.map_or(1, |row| shape[row] as usize), shape[column] as usize);
    finish(reader, variable, options, (row, column), size, (read(latitude)?, read(longitude)?), layout).map(Some)
}

fn finish(
    reader: &Reader,
    variable: &Variable,
    options: &WindOptions,
    (row, column): (Option<usize>, usize),
    size: (usize, usize),
    (latitude, longitude): (Vec<f64>, Vec<f64>),
    layout: Layout,
) -> Result<Places, NetcdfError> {
    let header = &reader.header;
    let refuse =
        |problem: String| NetcdfError::Variable { path: header.path.clone(), variable: variable.name.clone(), problem };
    let has_cells = row.is_some();
    let relative = if has_cells { sense(reader, variable, options, layout, column).map_err(refuse)? } else { None };
    if let Some(value) = latitude.iter().find(|value| value.abs() > 90.001) {
        return Err(refuse(format!("one of its latitudes is {value}; expected -90 to 90 degrees")));
    }
    let nodes = Scattered::new(layout, size, latitude, longitude, relative)
        .ok_or_else(|| refuse("none of its nodes has a latitude and a longitude".to_owned()))?;
    let note = relative.map(|_| {
        format!("variable `{}` is along the grid's axes; it was turned to east and north at each node", variable.name)
    });
    Ok(Places { row, column, grid: Grid::Scattered(Arc::new(nodes)), note })
}

/// Whether components are along the grid's axes: +1 or -1 as x grows or falls with the column; `None` for east and north.
fn sense(
    reader: &Reader,
    variable: &Variable,
    options: &WindOptions,
    layout: Layout,
    column: usize,
) -> Result<Option<f64>, String> {
    let standard = variable.text("standard_name").unwrap_or_default().to_lowercase();
    let units = variable.text("units").unwrap_or_default().to_lowercase();
    let is_component = !standard.contains("speed")
        && !standard.contains("direction")
        && !units.starts_with("deg")
        && !units.starts_with("rad");
    let stated = match standard.as_str() {
        "eastward_wind" | "northward_wind" => Some(false),
        "x_wind" | "y_wind" | "grid_eastward_wind" | "grid_northward_wind" => Some(true),
        _ if !is_component || options.speed.as_deref() == Some(&variable.name) || super::roles::is_speed(variable) => {
            Some(false)
        }
        _ => None,
    };
    let Some(relative) = options.grid_relative.filter(|_| is_component).or(stated) else {
        return Err(format!(
            "it lies on a {} and nothing says whether it is towards east and north or along the grid's axes (set `wind.grid_relative` to true or false)",
            layout.name()
        ));
    };
    if !relative {
        return Ok(None);
    }
    let axis = reader.header.variable(reader.header.dimension_names(variable)[column]);
    let falls = axis
        .filter(|axis| axis.dimensions.len() == 1)
        .and_then(|axis| reader.coordinate(axis).ok())
        .is_some_and(|values| values.first().zip(values.last()).is_some_and(|(first, last)| last < first));
    Ok(Some(if falls { -1.0 } else { 1.0 }))
}

/// The latitude or longitude variable of a field where it is no axis: of two dimensions, or along a dimension that both share.
fn coordinate<'a>(
    header: &'a Header,
    variable: &Variable,
    standard: &str,
    named: Option<&str>,
) -> Option<&'a Variable> {
    let of_field = |other: &&Variable| {
        matches!(other.dimensions.len(), 1 | 2)
            && other.number_type().is_some()
            && other.dimensions.iter().all(|dimension| variable.dimensions.contains(dimension))
            && !(other.dimensions.len() == 1 && header.dimensions[other.dimensions[0]].name == other.name)
    };
    if let Some(name) = named {
        return header.variable(name).filter(of_field);
    }
    let listed: Vec<&str> = variable.text("coordinates").unwrap_or_default().split_whitespace().collect();
    let short: &[&str] = if standard == "latitude" {
        &["lat", "latitude", "xlat", "nav_lat", "lat_rho"]
    } else {
        &["lon", "longitude", "xlong", "nav_lon", "lon_rho"]
    };
    let unit = if standard == "latitude" { "degrees_north" } else { "degrees_east" };
    let is = |other: &&Variable| {
        other.text("standard_name") == Some(standard)
            || short.contains(&other.name.to_lowercase().as_str())
            || (other.text("units") == Some(unit) && other.text("standard_name").is_none())
    };
    let all = || header.variables.iter().filter(of_field).filter(is);
    all()
        .find(|other| listed.contains(&other.name.as_str()))
        .or_else(|| all().max_by_key(|other| other.dimensions.len()))
}

fn is_station(header: &Header, latitude: &Variable) -> bool {
    let name = header.dimensions[latitude.dimensions[0]].name.to_lowercase();
    ["stat", "site", "buoy", "platform"].iter().any(|word| name.contains(word))
        || header.variables.iter().any(|other| other.text("cf_role") == Some("timeseries_id"))
}

/// The layout that a grid mapping or the standard names of the dimensions' coordinates state.
fn mapped_layout(header: &Header, variable: &Variable) -> Option<Layout> {
    // The attribute may hold "name: coordinates" pairs (CF section 5.6).
    let name = variable.text("grid_mapping").and_then(|text| text.split([':', ' ']).next());
    match name.and_then(|name| header.variable(name)).and_then(|mapping| mapping.text("grid_mapping_name")) {
        Some("latitude_longitude") => None,
        Some("rotated_latitude_longitude") => Some(Layout::RotatedPole),
        Some(_) => Some(Layout::Projected),
        None => header.dimension_names(variable).iter().find_map(|dimension| {
            match header.variable(dimension)?.text("standard_name")? {
                "grid_latitude" | "grid_longitude" => Some(Layout::RotatedPole),
                "projection_x_coordinate" | "projection_y_coordinate" => Some(Layout::Projected),
                _ => None,
            }
        }),
    }
}

fn without_places(layout: Layout) -> String {
    format!(
        "it lies on a {} without latitude and longitude of its nodes; expected both as variables of two dimensions (add them, or regrid it first)",
        layout.name()
    )
}

/// Places of a rotated grid from its pole (CF appendix F, "Rotated pole").
fn rotated(reader: &Reader, variable: &Variable, options: &WindOptions) -> Result<Places, NetcdfError> {
    let header = &reader.header;
    let refuse =
        |problem: String| NetcdfError::Variable { path: header.path.clone(), variable: variable.name.clone(), problem };
    let names = header.dimension_names(variable);
    let axis = |standard: &str| -> Option<(usize, &Variable)> {
        names.iter().enumerate().find_map(|(place, name)| {
            let axis = header.variable(name)?;
            (axis.text("standard_name") == Some(standard)).then_some((place, axis))
        })
    };
    let mapping = variable.text("grid_mapping").and_then(|text| header.variable(text.split([':', ' ']).next()?));
    let number = |name: &str| match mapping?.attribute(name)? {
        super::header::AttributeValue::Numbers(values, _) => values.first().copied(),
        super::header::AttributeValue::Text(text) => text.trim().parse().ok(),
    };
    let (Some((row, rows)), Some((column, columns)), Some(pole_latitude), Some(pole_longitude)) = (
        axis("grid_latitude"),
        axis("grid_longitude"),
        number("grid_north_pole_latitude"),
        number("grid_north_pole_longitude"),
    ) else {
        return Err(refuse(without_places(Layout::RotatedPole)));
    };
    let turn = number("north_pole_grid_longitude").unwrap_or(0.0);
    let (rows, columns) = (reader.coordinate(rows)?, reader.coordinate(columns)?);
    let (mut latitude, mut longitude) = (Vec::new(), Vec::new());
    for row in &rows {
        for column in &columns {
            let (node_latitude, node_longitude) = unrotate(*row, *column - turn, pole_latitude, pole_longitude);
            latitude.push(node_latitude);
            longitude.push(node_longitude);
        }
    }
    let size = (rows.len(), columns.len());
    finish(reader, variable, options, (Some(row), column), size, (latitude, longitude), Layout::RotatedPole)
}

/// Latitude and longitude of a place given about a rotated pole, degrees: the pole's own frame turned back by its latitude
/// about the east-west axis, then by its longitude.
fn unrotate(latitude: f64, longitude: f64, pole_latitude: f64, pole_longitude: f64) -> (f64, f64) {
    let [x, y, z] = crate::model::unit_vector(latitude, longitude);
    let (sin_pole, cos_pole) = (libm::sin(pole_latitude.to_radians()), libm::cos(pole_latitude.to_radians()));
    // The rotated meridian zero runs through the pole's own meridian on the far side.
    let (towards, up) = (-x * sin_pole + z * cos_pole, x * cos_pole + z * sin_pole);
    let east = libm::atan2(-y, towards).to_degrees();
    let longitude = (pole_longitude + east + 180.0).rem_euclid(360.0) - 180.0;
    (libm::asin(up.clamp(-1.0, 1.0)).to_degrees(), longitude)
}

#[cfg(test)]
mod tests {
    use super::*;

    // The rotated equator and meridian zero meet at latitude 90 - pole latitude, on the meridian opposite the pole's; the
    // rotated pole is the pole (definition in CF appendix F).
    #[test]
    fn the_frame_of_a_rotated_pole_turns_back() {
        let (latitude, longitude) = unrotate(0.0, 0.0, 39.25, -162.0);
        assert!((latitude - 50.75).abs() < 1e-9 && (longitude - 18.0).abs() < 1e-9, "{latitude} {longitude}");
        let (latitude, longitude) = unrotate(90.0, 0.0, 39.25, -162.0);
        assert!((latitude - 39.25).abs() < 1e-9 && (longitude + 162.0).abs() < 1e-6, "{latitude} {longitude}");
        // East of the rotated origin is east.
        assert!(unrotate(0.0, 1.0, 39.25, -162.0).1 > 18.5);
    }
}
