//! Helpers of these tests: fixtures, look-ups, series, messages.

use crate::support::project;
use std::path::{Path, PathBuf};
use underwind::Error;
use underwind::config::wind_options_from;
use underwind::io::netcdf::{NetcdfError, WindSource, open_wind};
use underwind::model::{Point, Site, SourceId, SpatialRule, Track, WindSeries};
use underwind::pipeline::{Answer, LookUp, Silent, look_up_wind, sample_wind};
use underwind::units::Instant;

/// The name that `f01_odd_name.nc` gets in the tests.
pub(super) const ODD_NAME: &str = "f01 odd näme #1 100% [a].nc";

/// A file of this folder's fixtures.
pub(super) fn fixture(name: &str) -> PathBuf {
    static FOLDER: std::sync::OnceLock<tempfile::TempDir> = std::sync::OnceLock::new();
    let stored = |name: &str| project().join("tests/fixtures/grids").join(name);
    if name != "f01_odd_name.nc" {
        return stored(name);
    }
    let folder = FOLDER.get_or_init(|| {
        let folder = tempfile::tempdir().unwrap();
        std::fs::copy(stored(name), folder.path().join(ODD_NAME)).unwrap();
        folder
    });
    folder.path().join(ODD_NAME)
}

/// Expected values that the fixtures' script worked out.
pub(super) fn expected(name: &str) -> serde_json::Value {
    serde_json::from_str(&std::fs::read_to_string(fixture(name)).unwrap()).unwrap()
}

/// One look-up, with settings `key=value`.
pub(super) fn ask(
    files: &[PathBuf],
    latitude: f64,
    longitude: f64,
    time: &str,
    quantity: &str,
    settings: &[&str],
) -> Result<Answer, Error> {
    ask_by(files, latitude, longitude, time, quantity, settings, SpatialRule::default())
}

/// The same by a rule of space.
pub(super) fn ask_by(
    files: &[PathBuf],
    latitude: f64,
    longitude: f64,
    time: &str,
    quantity: &str,
    settings: &[&str],
    spatial: SpatialRule,
) -> Result<Answer, Error> {
    look_up_wind(&LookUp {
        files: files.to_vec(),
        latitude_deg: Some(latitude),
        longitude_deg: Some(longitude),
        time: Some(time.to_owned()),
        quantity: Some(quantity.to_owned()),
        settings: settings.iter().map(|text| (*text).to_owned()).collect(),
        spatial,
        ..LookUp::default()
    })
}

/// The value of a look-up that has one.
pub(super) fn value(
    files: &[PathBuf],
    latitude: f64,
    longitude: f64,
    time: &str,
    quantity: &str,
    settings: &[&str],
) -> f64 {
    let answer = ask(files, latitude, longitude, time, quantity, settings).unwrap();
    answer.value.unwrap_or_else(|| panic!("{files:?} at {latitude} {longitude} {time}: {answer:?}"))
}

/// The one line of a refusal, without the folder of the fixtures.
pub(super) fn message(files: &[PathBuf], settings: &[&str]) -> String {
    let error = ask(files, 45.0, -31.0, "2031-01-10T04:00:00Z", "eastward_wind", settings).expect_err("a refusal");
    assert_eq!(error.exit_status(), 4, "{error}");
    without_folder(&error.to_string())
}

/// A text without the folder of the fixtures.
pub(super) fn without_folder(text: &str) -> String {
    let folder = fixture("");
    let folder = folder.display().to_string();
    let folder = folder.trim_end_matches('/');
    text.replace(&format!("{folder}/"), "").replace(folder, "")
}

/// ISO time of an hour after the fixtures' start.
pub(super) fn at(hour: f64) -> String {
    Instant::parse("2031-01-10T00:00:00Z").unwrap().plus_ms((hour * 3.6e6).round() as i64).iso()
}

/// A site that stays.
pub(super) fn site(latitude: f64, longitude: f64) -> Site {
    Site { id: "A".into(), track: Track::Fixed(Point::new(latitude, longitude).unwrap()), sensors: Vec::new() }
}

/// Opens files with settings `key=value`.
pub(super) fn open(files: &[PathBuf], settings: &[&str]) -> Result<WindSource, NetcdfError> {
    let settings: Vec<String> = settings.iter().map(|text| (*text).to_owned()).collect();
    open_wind(SourceId("model".into()), files, &wind_options_from(&settings).unwrap())
}

/// The whole series at a place.
pub(super) fn series(files: &[PathBuf], latitude: f64, longitude: f64) -> WindSeries {
    sample(&open(files, &[]).unwrap(), latitude, longitude)
}

/// The whole series at a place of an open source.
pub(super) fn sample(source: &WindSource, latitude: f64, longitude: f64) -> WindSeries {
    sample_wind(source, &[site(latitude, longitude)], None, &SpatialRule::default(), &Silent).unwrap().remove(0)
}

/// The steps of an open source, as ISO text.
pub(super) fn steps(source: &WindSource) -> Vec<String> {
    use underwind::model::FieldSource;
    source.meta().steps.iter().map(|step| step.iso()).collect()
}

/// Rows of a plain comma-separated table, by column name.
pub(super) fn rows(path: &Path) -> Vec<std::collections::HashMap<String, String>> {
    let text = std::fs::read_to_string(path).unwrap();
    let mut lines = text.lines();
    let names: Vec<String> = lines.next().unwrap().split(',').map(str::to_owned).collect();
    lines.map(|line| names.iter().cloned().zip(line.split(',').map(str::to_owned)).collect()).collect()
}
