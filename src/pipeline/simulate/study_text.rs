//! The study file of a simulated deployment: the sections of the original, with the simulated inputs in place of its own.

use super::INVENTED;
use crate::Error;
use crate::config::{Study, StudyError};
use crate::model::{Site, Track};
use crate::science::simulate::{Settings, WindOrigin};
use std::path::Path;
use toml::{Table, Value};

/// Id of the invented wind.
const WIND_ID: &str = "simulated";

/// Name of the site list.
pub(super) const SITE_LIST: &str = "sites.csv";

/// Whether the sites go into a list; those that move stay in the study file, with their tracks.
pub(super) fn has_site_list(sites: &[Site]) -> bool {
    sites.iter().all(|site| matches!(site.track, Track::Fixed(_)))
}

/// The text of the study file.
pub(super) fn study_text(study: &Study, settings: &Settings, sites: &[Site]) -> Result<String, Error> {
    let text = std::fs::read_to_string(&study.path)
        .map_err(|source| StudyError::Unreadable { path: study.path.clone(), source })?;
    let lacking = |problem: String| Error::Study(StudyError::Lacking { path: study.path.clone(), problem });
    let mut original: Table = text.parse().map_err(|error: toml::de::Error| lacking(error.message().to_owned()))?;
    // Of the file, not of its folder: an empty path has no absolute form.
    let whole = std::path::absolute(&study.path)
        .map_err(|source| StudyError::Unreadable { path: study.path.clone(), source })?;
    let base = whole.parent().unwrap_or(Path::new("/"));
    if let Some(Value::Table(head)) = original.get_mut("study") {
        head.remove("output");
    }
    if has_site_list(sites) {
        original.remove("site");
        let list = Table::from_iter([("file".to_owned(), SITE_LIST.into())]);
        original.insert("sites".to_owned(), list.into());
    } else {
        if let Some(Value::Table(list)) = original.get_mut("sites") {
            rebase(list, "file", base);
        }
        for site in tables_of(&mut original, "site") {
            rebase(site, "track", base);
        }
    }
    match settings.wind {
        WindOrigin::Invented => {
            let mut wind = Table::new();
            wind.insert("id".to_owned(), WIND_ID.into());
            wind.insert("files".to_owned(), Value::Array(vec!["wind.nc".into()]));
            original.insert("wind".to_owned(), Value::Array(vec![wind.into()]));
        }
        WindOrigin::Study => {
            for wind in tables_of(&mut original, "wind") {
                rebase(wind, "files", base);
                rebase(wind, "table", base);
            }
        }
    }
    original.insert("levels".to_owned(), Value::Array(levels(sites, settings)));
    let mut out = format!("# {INVENTED}.\n# The truth is in truth.toml; the fit does not read it.\n");
    for section in ["study", "site", "sites", "wind", "levels", "match", "relation", "report"] {
        let Some(value) = original.remove(section) else { continue };
        let one = Table::from_iter([(section.to_owned(), value)]);
        let text = toml::to_string(&one).map_err(|error| lacking(format!("`{section}`: {error}")))?;
        out.push('\n');
        out.push_str(&text);
    }
    Ok(out)
}

/// Name of the level table of a sensor, by its place among the sensor names of the study.
pub(super) fn levels_file(sensor: usize, sensors: usize) -> String {
    if sensors == 1 { "levels.csv.gz".to_owned() } else { format!("levels_{}.csv.gz", sensor + 1) }
}

/// The names of sensors, each once, in order: a level table holds the sensors of one name at all sites.
pub(super) fn sensor_names<'a>(sensors: impl Iterator<Item = &'a str>) -> Vec<&'a str> {
    let mut names = Vec::new();
    for name in sensors {
        if !names.contains(&name) {
            names.push(name);
        }
    }
    names
}

fn levels(sites: &[Site], settings: &Settings) -> Vec<Value> {
    let names = sensor_names(sites.iter().flat_map(|site| &site.sensors).map(|sensor| sensor.id.as_str()));
    names
        .iter()
        .enumerate()
        .map(|(number, name)| {
            let mut table = Table::new();
            table.insert("files".to_owned(), Value::Array(vec![levels_file(number, names.len()).into()]));
            table.insert("sensor".to_owned(), (*name).into());
            for (key, value) in
                [("reference", "1 uPa"), ("kind", "band_level"), ("bands", "decidecade"), ("stamp", "start")]
            {
                table.insert(key.to_owned(), value.into());
            }
            table.insert("window_s".to_owned(), Value::Float(settings.window_s));
            table.into()
        })
        .collect()
}

fn tables_of<'a>(original: &'a mut Table, section: &str) -> impl Iterator<Item = &'a mut Table> {
    original.get_mut(section).and_then(Value::as_array_mut).into_iter().flatten().filter_map(Value::as_table_mut)
}

/// Makes the paths of a key hold from anywhere.
fn rebase(table: &mut Table, key: &str, base: &Path) {
    let whole = |text: &str| Value::String(base.join(text).to_string_lossy().into_owned());
    let Some(value) = table.get_mut(key) else { return };
    let entries = match value {
        Value::Array(list) => list.as_mut_slice(),
        one => std::slice::from_mut(one),
    };
    for entry in entries {
        if let Some(text) = entry.as_str() {
            *entry = whole(text);
        }
    }
}
