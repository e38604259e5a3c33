//! `simulate`: settings to files: wind, levels, the truth, and a study that reads them.

mod files;
mod study_text;
mod truth;
mod winds;

use super::inputs::open_sites;
use super::progress::Progress;
use super::run::make_folder;
use crate::Error;
use crate::config::{Study, StudyError};
use crate::io::replace_file::replace_with;
use crate::model::{Sensor, Site};
use crate::science::simulate::{
    BandLaw, LevelSeries, Settings, ShipVisit, WindOrigin, Windows, lost_windows, mean_speed_m_s, simulate_levels,
    simulate_ships,
};
use files::{write_levels, write_sites, write_true_wind, write_wind_field};
use std::path::{Path, PathBuf};
use winds::Winds;

/// What every file says of itself.
const INVENTED: &str = "simulated by underwind from stated laws; nothing in it was measured";

/// One sensor with what is known of it.
struct SensorTruth<'a> {
    site: &'a Site,
    sensor: &'a Sensor,
    laws: Vec<BandLaw>,
    /// Mean wind speed of each window, m/s; NaN where there is none.
    speeds_m_s: &'a [f64],
    /// Levels by band, one a window, dB; NaN where there is none.
    levels_db: Vec<Vec<f64>>,
}

/// Simulates the deployment that a study describes, and writes it into a folder. Returns the files written.
///
/// # Errors
/// When the study has no `[simulate]` section or one that cannot be, or when a file cannot be read or written.
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
    settings.check().map_err(refuse)?;
    let seed = seed.unwrap_or(settings.seed);
    if i64::try_from(seed).is_err() {
        return Err(Error::CommandLine(format!("the seed {seed} is too large; expected at most {}", i64::MAX)));
    }
    let (sites, _) = open_sites(study)?;
    if let Some(id) = settings.floor_offset_db.keys().find(|id| sites.iter().all(|site| site.id != **id)) {
        return Err(refuse(format!("`simulate.floor_offset_db` names the site `{id}`, which the study does not have")));
    }
    let study_text = study_text::study_text(study, settings, &sites)?;
    progress.start(4, "simulating");
    let winds = match settings.wind {
        WindOrigin::Invented => Winds::invented(settings, seed, &sites).map_err(refuse)?,
        WindOrigin::Study => Winds::of_study(study, settings, &sites, progress)?,
    };
    make_folder(output)?;
    progress.advance(1);
    let windows = winds.windows;
    let speeds: Vec<Vec<f64>> = winds
        .at_sites
        .iter()
        .map(|wind| (0..windows.count).map(|k| mean_speed_m_s(wind, windows.start_of(k), windows.length_ms)).collect())
        .collect();
    let truths = sensor_truths(settings, seed, &sites, windows, &speeds);
    progress.advance(1);
    let mut written = Vec::new();
    if let Some(field) = &winds.field {
        let path = output.join("wind.nc");
        write_wind_field(field, &study.name, &path)?;
        written.push(path);
    }
    written.extend(write_levels(settings, windows, &truths, output)?);
    if study_text::has_site_list(&sites) {
        let path = output.join(study_text::SITE_LIST);
        write_sites(&sites, &path)?;
        written.push(path);
    }
    written.push(write_true_wind(windows, &sites, &speeds, output)?);
    progress.advance(1);
    let truth = truth::truth_text(settings, seed, windows, &truths).map_err(refuse)?;
    for (name, text) in [("truth.toml", truth), ("study.toml", study_text), ("README.md", readme(study))] {
        let path = output.join(name);
        // A folder may already have a story of its own.
        if name == "README.md" && path.exists() {
            continue;
        }
        replace_with(&path, text.as_bytes())?;
        written.push(path);
    }
    progress.finish();
    Ok(written)
}

fn sensor_truths<'a>(
    settings: &Settings,
    seed: u64,
    sites: &'a [Site],
    windows: Windows,
    speeds: &'a [Vec<f64>],
) -> Vec<SensorTruth<'a>> {
    let mut truths = Vec::new();
    for ((place, site), speeds_m_s) in sites.iter().enumerate().zip(speeds) {
        let ships = simulate_ships(settings, seed, place as u64, windows.total_h());
        for sensor in &site.sensors {
            let laws = settings.laws_at(&site.id);
            let number = truths.len() as u64;
            let levels_db = sensor_levels(settings, seed, windows, number, sensor, &laws, speeds_m_s, &ships);
            truths.push(SensorTruth { site, sensor, laws, speeds_m_s, levels_db });
        }
    }
    truths
}

fn sensor_levels(
    settings: &Settings,
    seed: u64,
    windows: Windows,
    number: u64,
    sensor: &Sensor,
    laws: &[BandLaw],
    speeds_m_s: &[f64],
    ships: &[ShipVisit],
) -> Vec<Vec<f64>> {
    let lost = lost_windows(settings, seed, number, windows);
    laws.iter()
        .enumerate()
        .map(|(band, law)| {
            let series = LevelSeries { law, windows, speeds_m_s, ships, sensor: number, band: band as u64 };
            let mut levels = simulate_levels(settings, seed, &series);
            for (k, level) in levels.iter_mut().enumerate() {
                *level = if lost[k] { f64::NAN } else { *level + gain_db(settings, sensor, windows, k) };
            }
            levels
        })
        .collect()
}

/// What the deployment of a window adds to the level, dB; NaN outside the deployments.
fn gain_db(settings: &Settings, sensor: &Sensor, windows: Windows, window: usize) -> f64 {
    if sensor.deployments.is_empty() {
        return 0.0;
    }
    let (start, end) = (windows.start_of(window), windows.start_of(window + 1));
    let inside =
        |deployment: &crate::model::Deployment| deployment.window.start <= start && end <= deployment.window.end;
    sensor.deployments.iter().position(inside).map_or(f64::NAN, |number| settings.gain_step_db * number as f64)
}

fn readme(study: &Study) -> String {
    format!(
        "# {}\n\n**Nothing here was measured.** `underwind simulate` invented this deployment. The laws behind the levels are in\n`truth.toml`, the mean wind of every window in `true_wind.csv.gz`; the fit reads neither.\n\nTo analyse it: `underwind run study.toml`\n",
        study.name
    )
}
