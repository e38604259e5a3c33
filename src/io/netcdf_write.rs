//! Gridded wind as a CF NetCDF-4 file, packed and compressed.

use crate::io::replace_file::WriteError;
use crate::units::Instant;
use netcdf::AttributeValue;
use std::path::Path;

/// Hourly wind on a grid, packed: value = number x scale.
#[derive(Debug, Clone, Copy)]
pub struct PackedWind<'a> {
    /// Title of the file.
    pub title: &'a str,
    /// What the reader should know, such as that it is invented.
    pub comment: &'a str,
    /// Degrees north.
    pub latitudes_deg: &'a [f64],
    /// Degrees east.
    pub longitudes_deg: &'a [f64],
    /// First hour; to the second.
    pub start: Instant,
    /// Number of hours.
    pub hours: usize,
    /// Towards the east; hour by hour, row by row.
    pub eastward: &'a [i16],
    /// Towards the north.
    pub northward: &'a [i16],
    /// m/s a step.
    pub scale_m_s: f64,
    /// Number that stands for a missing value.
    pub fill: i16,
}

/// Hours in a chunk: a day, so that a year is read in few pieces.
const CHUNK_HOURS: usize = 24;
/// Compression (deflate) level: beyond it files hardly shrink.
const DEFLATE_LEVEL: i32 = 6;

/// Writes the file beside its place and renames it when it is whole.
///
/// # Errors
/// When the file cannot be written.
pub fn write_wind(path: &Path, wind: &PackedWind<'_>) -> Result<(), WriteError> {
    let failed = |source: std::io::Error| WriteError::Write { path: path.to_owned(), source };
    let folder = path.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."));
    if !folder.is_dir() {
        return Err(WriteError::NoFolder { path: path.to_owned(), folder: folder.to_owned() });
    }
    let mut builder = tempfile::Builder::new();
    builder.prefix(".wind.").suffix(".part");
    // As any other output: what the user's mask allows, not for the owner alone.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let beside = builder
        .tempfile_in(folder)
        .map_err(|source| WriteError::Create { path: path.to_owned(), folder: folder.to_owned(), source })?
        .into_temp_path();
    fill(&beside, wind).map_err(|error| failed(std::io::Error::other(error.to_string())))?;
    std::fs::File::open(&beside).and_then(|file| file.sync_all()).map_err(failed)?;
    beside.persist(path).map_err(|error| failed(error.error))
}

fn fill(path: &Path, wind: &PackedWind<'_>) -> Result<(), netcdf::Error> {
    let mut file = netcdf::create(path)?;
    for (name, text) in [("Conventions", "CF-1.11"), ("title", wind.title), ("comment", wind.comment)] {
        file.add_attribute(name, text)?;
    }
    let (rows, columns) = (wind.latitudes_deg.len(), wind.longitudes_deg.len());
    file.add_dimension("time", wind.hours)?;
    file.add_dimension("latitude", rows)?;
    file.add_dimension("longitude", columns)?;

    let units = format!("hours since {}", wind.start.iso().replace('T', " ").replace('Z', ""));
    let hours: Vec<i32> = (0..wind.hours as i32).collect();
    let mut time = file.add_variable::<i32>("time", &["time"])?;
    for (name, text) in [("standard_name", "time"), ("units", units.as_str()), ("calendar", "standard"), ("axis", "T")]
    {
        time.put_attribute(name, text)?;
    }
    time.put_values(&hours, ..)?;
    for (name, units, axis, values) in [
        ("latitude", "degrees_north", "Y", wind.latitudes_deg),
        ("longitude", "degrees_east", "X", wind.longitudes_deg),
    ] {
        let mut coordinate = file.add_variable::<f64>(name, &[name])?;
        for (attribute, text) in [("standard_name", name), ("units", units), ("axis", axis)] {
            coordinate.put_attribute(attribute, text)?;
        }
        coordinate.put_values(values, ..)?;
    }
    let mut height = file.add_variable::<f64>("height", &[])?;
    for (name, text) in [("standard_name", "height"), ("units", "m"), ("positive", "up")] {
        height.put_attribute(name, text)?;
    }
    height.put_value(10.0, ())?;
    for (name, long_name, values) in [
        ("eastward_wind", "wind towards the east, 10 m above the sea", wind.eastward),
        ("northward_wind", "wind towards the north, 10 m above the sea", wind.northward),
    ] {
        let mut variable = file.add_variable::<i16>(name, &["time", "latitude", "longitude"])?;
        variable.set_chunking(&[CHUNK_HOURS.min(wind.hours), rows, columns])?;
        variable.set_compression(DEFLATE_LEVEL, true)?;
        variable.set_fill_value(wind.fill)?;
        variable.put_attribute("scale_factor", AttributeValue::Double(wind.scale_m_s))?;
        for (attribute, text) in
            [("standard_name", name), ("long_name", long_name), ("units", "m s-1"), ("coordinates", "height")]
        {
            variable.put_attribute(attribute, text)?;
        }
        variable.put_values(values, ..)?;
    }
    file.close()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::io::netcdf::{WindOptions, open_wind};
    use crate::model::{FieldSource, NodeId, NodeRequest, SourceId};

    #[test]
    fn what_is_written_is_read_again() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("wind.nc");
        let wind = PackedWind {
            title: "three hours",
            comment: "invented",
            latitudes_deg: &[10.0, 11.0],
            longitudes_deg: &[179.5, 180.5],
            start: Instant::parse("2031-02-01T06:00:00Z").unwrap(),
            hours: 3,
            eastward: &[1, 2, 3, -400, 5, 6, 7, 8, 9, 10, 11, 12],
            northward: &[0; 12],
            scale_m_s: 0.01,
            fill: -400,
        };
        write_wind(&path, &wind).unwrap();
        let first = std::fs::read(&path).unwrap();
        let source = open_wind(SourceId("w".to_owned()), std::slice::from_ref(&path), &WindOptions::default()).unwrap();
        let meta = source.meta();
        assert_eq!(meta.steps[2], Instant::parse("2031-02-01T08:00:00Z").unwrap());
        assert_eq!(meta.height_m, Some(10.0));
        let nodes = [NodeId { row: 0, column: 1 }, NodeId { row: 1, column: 1 }];
        let request = NodeRequest { nodes: nodes.to_vec(), window: None };
        let slab = source.plan(&request).into_iter().next().unwrap();
        let block = source.decode(&slab, &nodes).unwrap();
        assert!((block.values[0] - 0.02).abs() < 1e-12 && block.values[1].is_nan());
        // Written again over itself: the same bytes.
        write_wind(&path, &wind).unwrap();
        assert_eq!(first, std::fs::read(&path).unwrap());
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
    }
}
