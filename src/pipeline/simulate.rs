//! `simulate`: settings to files: wind, levels, sites, the truth, and a study that reads them.

use super::inputs::{open_inputs, open_sites};
use super::progress::Progress;
use super::run::make_folder;
use super::sampling::sample_wind;
use crate::Error;
use crate::config::{Study, StudyError};
use crate::io::netcdf_write::{PackedWind, write_wind};
use crate::io::replace_file::{ReplaceFile, WriteError, replace_with};
use crate::model::{Point, Site};
use crate::science::simulate::{
    PACKED_FILL, PACKED_SCALE_M_S, Settings, SiteWind, WindField, WindOrigin, hourly_speed_m_s, simulate_levels,
    simulate_ships,
};
use crate::units::Instant;
use flate2::{Compression, GzBuilder};
use serde::Serialize;
use std::io::Write;
use std::path::{Path, PathBuf};

const INVENTED: &str = "simulated by underwind from stated laws; nothing in it was measured";

/// The truth, written beside the data and never read by the fit.
#[derive(Serialize)]
struct Truth<'a> {
    comment: &'static str,
    seed: u64,
    settings: &'a Settings,
}

/// The wind and the ships at one site.
struct SiteTruth<'a> {
    site: &'a Site,
    /// Start of each hour.
    hours: Vec<Instant>,
    speeds_m_s: Vec<f64>,
}

/// Simulates the deployment that a study describes, and writes it into a folder. Returns the files written.
///
/// # Errors
/// When the study has no `[simulate]` section or an impossible value in it, or when a file cannot be written.
pub fn simulate_study(
    study: &Study,
    output: &Path,
    seed: Option<u64>,
    progress: &dyn Progress,
) -> Result<Vec<PathBuf>, Error> {
    let Some(settings) = &study.simulate else {
        return Err(Error::Lacking { study: study.path.clone(), section: "[simulate]" });
    };
    let refuse = |problem: String| Error::Study(StudyError::Lacking { path: study.path.clone(), problem });
    let seed = seed.unwrap_or(settings.seed);
    let (sites, _) = open_sites(study)?;
    make_folder(output)?;
    let mut written = Vec::new();
    progress.start(3, "simulating");
    let (truths, wind_section) = match settings.wind {
        WindOrigin::Invented => {
            let places: Vec<Point> = sites.iter().filter_map(|site| site.track.nominal()).collect();
            let field = WindField::invent(settings, seed, &places).map_err(refuse)?;
            let path = output.join("wind.nc");
            write_field(&field, &study.name, &path)?;
            written.push(path);
            let truths = sites
                .iter()
                .map(|site| {
                    let wind = site.track.nominal().and_then(|place| field.at(place)).ok_or_else(|| {
                        refuse(format!(
                            "site {} moves or lies outside the simulated grid; give it one position",
                            site.id
                        ))
                    })?;
                    Ok(site_truth(site, &wind))
                })
                .collect::<Result<Vec<_>, Error>>()?;
            (truths, "[[wind]]\nid = \"simulated\"\nfiles = [\"wind.nc\"]\n".to_owned())
        }
        WindOrigin::Study => wind_of_study(study, &sites, progress)?,
    };
    progress.advance(1);
    let levels = write_levels(settings, seed, &truths, output)?;
    progress.advance(1);
    let mut study_text = format!(
        "# {INVENTED}.\n# The truth is in truth.toml; the fit does not read it.\n\n[study]\nname = \"{}\"\n\n[sites]\nfile = \"sites.csv\"\n\n{wind_section}",
        study.name.replace('"', "'")
    );
    for (sensor, file) in &levels {
        study_text.push_str(&format!(
            "\n[[levels]]\nfiles = [\"{file}\"]\nsensor = \"{sensor}\"\nreference = \"1 uPa\"\nkind = \"band_level\"\nbands = \"decidecade\"\nwindow_s = 3600\nstamp = \"start\"\n"
        ));
        written.push(output.join(file));
    }
    for (name, text) in [
        ("sites.csv", sites_text(&sites)),
        (
            "truth.toml",
            toml::to_string_pretty(&Truth { comment: INVENTED, seed, settings }).expect("settings are plain data"),
        ),
        ("study.toml", study_text),
    ] {
        let path = output.join(name);
        replace_with(&path, text.as_bytes())?;
        written.push(path);
    }
    progress.finish();
    Ok(written)
}

fn site_truth<'a>(site: &'a Site, wind: &SiteWind) -> SiteTruth<'a> {
    let hours = wind.steps[..wind.steps.len().saturating_sub(1)].to_vec();
    SiteTruth { site, hours, speeds_m_s: hourly_speed_m_s(wind) }
}

/// The wind of the study's own inputs at the sites, and the section that names them again.
fn wind_of_study<'a>(
    study: &Study,
    sites: &'a [Site],
    progress: &dyn Progress,
) -> Result<(Vec<SiteTruth<'a>>, String), Error> {
    let inputs = open_inputs(&Study { levels: Vec::new(), ..study.clone() })?;
    let Some(source) = inputs.wind.iter().find_map(|wind| wind.grid.as_ref()) else {
        return Err(Error::Lacking { study: study.path.clone(), section: "[[wind]]" });
    };
    let series = sample_wind(source, sites, None, &study.matching.spatial, progress)?;
    let truths = sites
        .iter()
        .zip(series)
        .map(|(site, series)| {
            let wind = SiteWind {
                steps: series.steps,
                eastward_m_s: series.eastward_m_s,
                northward_m_s: series.northward_m_s,
            };
            site_truth(site, &wind)
        })
        .collect();
    // The section as the study has it, with paths that hold from anywhere.
    let text = std::fs::read_to_string(&study.path)
        .map_err(|source| StudyError::Unreadable { path: study.path.clone(), source })?;
    let table: toml::Table = text.parse().unwrap_or_default();
    let mut section = toml::Table::new();
    if let Some(mut wind) = table.get("wind").cloned() {
        for (entry, input) in wind.as_array_mut().into_iter().flatten().zip(&study.wind) {
            if let (Some(entry), Some(files)) = (entry.as_table_mut(), input.grid_files()) {
                let files = files.iter().map(|path| {
                    let absolute = std::path::absolute(path).unwrap_or_else(|_| path.clone());
                    toml::Value::String(absolute.to_string_lossy().into_owned())
                });
                entry.insert("files".to_owned(), toml::Value::Array(files.collect()));
            }
        }
        section.insert("wind".to_owned(), wind);
    }
    Ok((truths, toml::to_string(&section).expect("a section that was read can be written")))
}

fn write_field(field: &WindField, title: &str, path: &Path) -> Result<(), WriteError> {
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

/// Writes one wide table a sensor name. Returns the sensor names with their files.
fn write_levels(
    settings: &Settings,
    seed: u64,
    truths: &[SiteTruth<'_>],
    output: &Path,
) -> Result<Vec<(String, String)>, Error> {
    let mut sensors: Vec<&str> = Vec::new();
    for id in truths.iter().flat_map(|truth| &truth.site.sensors).map(|sensor| sensor.id.as_str()) {
        if !sensors.contains(&id) {
            sensors.push(id);
        }
    }
    let mut files = Vec::new();
    for (number, sensor) in sensors.iter().enumerate() {
        let name =
            if sensors.len() == 1 { "levels.csv.gz".to_owned() } else { format!("levels_{}.csv.gz", number + 1) };
        let path = output.join(&name);
        let failed = |source| WriteError::Write { path: path.clone(), source };
        // No time stamp in the gzip header: the same settings give the same bytes.
        let mut out = GzBuilder::new().mtime(0).write(ReplaceFile::create(&path)?, Compression::best());
        let labels: Vec<String> = settings.band.iter().map(|law| format!("{} Hz", law.centre_hz)).collect();
        writeln!(out, "time,site,{}", labels.join(",")).map_err(failed)?;
        for (place, truth) in truths.iter().enumerate() {
            if !truth.site.sensors.iter().any(|known| known.id == **sensor) {
                continue;
            }
            let hours = truth.hours.len();
            let stream = (place * 16 + number) as u64;
            let ships = simulate_ships(settings, seed, place as u64, hours);
            let bands: Vec<Vec<f64>> = settings
                .band
                .iter()
                .enumerate()
                .map(|(band, law)| simulate_levels(settings, seed, stream, band as u64, law, &truth.speeds_m_s, &ships))
                .collect();
            for (k, hour) in truth.hours.iter().enumerate() {
                if bands.iter().all(|levels| levels[k].is_nan()) {
                    continue;
                }
                write!(out, "{},{}", hour.iso(), truth.site.id).map_err(failed)?;
                for levels in &bands {
                    write!(out, ",{:.2}", levels[k]).map_err(failed)?;
                }
                writeln!(out).map_err(failed)?;
            }
        }
        out.finish().map_err(failed)?.finish()?;
        files.push(((*sensor).to_owned(), name));
    }
    Ok(files)
}

fn sites_text(sites: &[Site]) -> String {
    let mut text = String::from("site,latitude_deg,longitude_deg,sensor,depth_m\n");
    for site in sites {
        let Some(place) = site.track.nominal() else { continue };
        for sensor in &site.sensors {
            let depth = sensor.depth_m.map_or_else(String::new, |depth| depth.to_string());
            text.push_str(&format!(
                "{},{},{},{},{depth}\n",
                site.id,
                place.latitude_deg(),
                place.longitude_deg(),
                sensor.id
            ));
        }
    }
    text
}
