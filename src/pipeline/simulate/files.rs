//! The data files of a simulated deployment.

use super::study_text::{levels_file, sensor_names};
use super::{INVENTED, SensorTruth};
use crate::io::netcdf_write::{PackedWind, write_wind};
use crate::io::replace_file::{ReplaceFile, WriteError, replace_with};
use crate::model::{Deployment, Site};
use crate::science::simulate::{PACKED_FILL, PACKED_SCALE_M_S, Settings, WindField, Windows};
use flate2::write::GzEncoder;
use flate2::{Compression, GzBuilder};
use std::path::{Path, PathBuf};

pub(super) fn write_wind_field(field: &WindField, title: &str, path: &Path) -> Result<(), WriteError> {
    write_wind(
        path,
        &PackedWind {
            title,
            comment: INVENTED,
            latitudes_deg: &field.latitudes_deg,
            longitudes_deg: &field.longitudes_deg,
            start: field.start,
            hours: field.hours,
            eastward: &field.eastward,
            northward: &field.northward,
            scale_m_s: PACKED_SCALE_M_S,
            fill: PACKED_FILL,
        },
    )
}

/// A compressed CSV file on its way.
struct Rows {
    path: PathBuf,
    rows: csv::Writer<GzEncoder<ReplaceFile>>,
}

impl Rows {
    fn create(path: PathBuf) -> Result<Self, WriteError> {
        // No time in the gzip header: the same settings give the same bytes.
        let out = GzBuilder::new().mtime(0).write(ReplaceFile::create(&path)?, Compression::best());
        Ok(Self { path, rows: csv::Writer::from_writer(out) })
    }

    fn write(&mut self, cells: &[String]) -> Result<(), WriteError> {
        self.rows.write_record(cells).map_err(|error| failed(&self.path, std::io::Error::other(error)))
    }

    fn finish(self) -> Result<PathBuf, WriteError> {
        let Self { path, rows } = self;
        let out = rows.into_inner().map_err(|error| failed(&path, error.into_error()))?;
        out.finish().map_err(|source| failed(&path, source))?.finish()?;
        Ok(path)
    }
}

fn failed(path: &Path, source: std::io::Error) -> WriteError {
    WriteError::Write { path: path.to_owned(), source }
}

fn number(value: f64, decimals: usize) -> String {
    if value.is_nan() { String::new() } else { format!("{value:.decimals$}") }
}

/// Writes one wide table a sensor name; windows without any level have no row.
pub(super) fn write_levels(
    settings: &Settings,
    windows: Windows,
    truths: &[SensorTruth<'_>],
    folder: &Path,
) -> Result<Vec<PathBuf>, WriteError> {
    let names = sensor_names(truths.iter().map(|truth| truth.sensor.id.as_str()));
    let mut written = Vec::new();
    for (place, name) in names.iter().enumerate() {
        let mut rows = Rows::create(folder.join(levels_file(place, names.len())))?;
        let mut header = vec!["time".to_owned(), "site".to_owned()];
        header.extend(settings.band.iter().map(|law| format!("{} Hz", law.centre_hz)));
        rows.write(&header)?;
        for truth in truths.iter().filter(|truth| truth.sensor.id == **name) {
            for window in 0..windows.count {
                if truth.levels_db.iter().all(|levels| levels[window].is_nan()) {
                    continue;
                }
                let mut cells = vec![windows.start_of(window).iso(), truth.site.id.clone()];
                cells.extend(truth.levels_db.iter().map(|levels| number(levels[window], 2)));
                rows.write(&cells)?;
            }
        }
        written.push(rows.finish()?);
    }
    Ok(written)
}

/// Writes the sites, a row for each sensor or deployment.
pub(super) fn write_sites(sites: &[Site], path: &Path) -> Result<(), WriteError> {
    let mut rows = csv::Writer::from_writer(Vec::new());
    let mut row =
        |cells: [String; 8]| rows.write_record(cells).map_err(|error| failed(path, std::io::Error::other(error)));
    row(
        ["site", "latitude_deg", "longitude_deg", "sensor", "depth_m", "deployment", "start", "end"].map(str::to_owned)
    )?;
    for site in sites {
        let Some(place) = site.track.nominal() else { continue };
        for sensor in &site.sensors {
            let mut of = |deployment: Option<&Deployment>| {
                row([
                    site.id.clone(),
                    place.latitude_deg().to_string(),
                    place.longitude_deg().to_string(),
                    sensor.id.clone(),
                    sensor.depth_m.map_or_else(String::new, |depth| depth.to_string()),
                    deployment.map_or_else(String::new, |deployment| deployment.id.clone()),
                    deployment.map_or_else(String::new, |deployment| deployment.window.start.iso()),
                    deployment.map_or_else(String::new, |deployment| deployment.window.end.iso()),
                ])
            };
            if sensor.deployments.is_empty() {
                of(None)?;
            }
            for deployment in &sensor.deployments {
                of(Some(deployment))?;
            }
        }
    }
    let bytes = rows.into_inner().map_err(|error| failed(path, error.into_error()))?;
    replace_with(path, &bytes)
}

/// Writes the mean wind speed of every window, from which the levels were made.
pub(super) fn write_true_wind(
    windows: Windows,
    sites: &[Site],
    speeds: &[Vec<f64>],
    folder: &Path,
) -> Result<PathBuf, WriteError> {
    let mut rows = Rows::create(folder.join("true_wind.csv.gz"))?;
    rows.write(&["window_start", "site", "wind_speed_mean_m_s"].map(str::to_owned))?;
    for (site, speeds_m_s) in sites.iter().zip(speeds) {
        for (window, speed) in speeds_m_s.iter().enumerate() {
            rows.write(&[windows.start_of(window).iso(), site.id.clone(), number(*speed, 4)])?;
        }
    }
    rows.finish()
}
