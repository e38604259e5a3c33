//! Reading what `simulate` wrote, without the program's own readers.

use flate2::read::GzDecoder;
use std::collections::BTreeMap;
use std::io::Read;
use std::path::Path;

/// A compressed CSV file: header, and rows as texts.
pub(super) fn rows(path: &Path) -> (Vec<String>, Vec<Vec<String>>) {
    let mut text = String::new();
    GzDecoder::new(std::fs::File::open(path).unwrap()).read_to_string(&mut text).unwrap();
    let mut lines = text.lines().map(|line| line.split(',').map(str::to_owned).collect::<Vec<_>>());
    (lines.next().unwrap(), lines.collect())
}

/// Mean wind speed by window start and site, from `true_wind.csv.gz`; windows without wind are left out.
pub(super) fn true_wind(folder: &Path) -> BTreeMap<(String, String), f64> {
    let (_, rows) = rows(&folder.join("true_wind.csv.gz"));
    rows.into_iter()
        .filter(|row| !row[2].is_empty())
        .map(|row| ((row[0].clone(), row[1].clone()), row[2].parse().unwrap()))
        .collect()
}

/// A number of a TOML table.
pub(super) fn number(table: &toml::Table, key: &str) -> Option<f64> {
    let value = table.get(key)?;
    value.as_float().or_else(|| value.as_integer().map(|n| n as f64))
}

/// A study of one site with this `[simulate]` section.
pub(super) fn study(site: &str, simulate: &str) -> String {
    format!(
        "[study]\nname = \"trial\"\n\n[[site]]\nid = \"A\"\nlatitude_deg = 45.1\nlongitude_deg = 179.93\n{site}\n[simulate]\n{simulate}"
    )
}

/// A band with an onset.
pub(super) const BAND: &str = "[[simulate.band]]\ncentre_hz = 1000\nfloor_db = 70\nslope_db_per_decade = 30\ncrossover_m_s = 4\nonset_m_s = 9\npost_onset_slope_db_per_decade = -10\n";
