//! Without noise, every level written is that of the stated law at the true wind.

use super::support::{BAND, rows, study, true_wind};
use crate::support::{underwind, write};
use std::path::Path;

const NO_NOISE: &str = "slow_noise_sd_db = 0\nwhite_noise_sd_db = 0\ngap_share = 0\n";

/// Closed form of the band: powers of floor and wind part add; above 9 m/s the wind part falls by 10 dB per decade.
fn law_db(wind_speed_m_s: f64, floor_db: f64) -> f64 {
    let wind = 70.0 + 30.0 * (wind_speed_m_s.min(9.0) / 4.0).log10() - 10.0 * (wind_speed_m_s / 9.0).max(1.0).log10();
    10.0 * (10f64.powf(floor_db / 10.0) + 10f64.powf(wind / 10.0)).log10()
}

fn simulated(folder: &Path, site: &str, simulate: &str) -> Vec<Vec<String>> {
    write(folder, "plan.toml", &study(site, &format!("{simulate}{NO_NOISE}{BAND}")));
    underwind(folder, &["simulate", "plan.toml", "-o", "made"]).succeeds();
    let (header, rows) = rows(&folder.join("made/levels.csv.gz"));
    assert_eq!(header, ["time", "site", "1000 Hz"]);
    rows
}

#[test]
fn levels_follow_the_law_at_the_mean_wind_of_their_window() {
    let folder = tempfile::tempdir().unwrap();
    let levels = simulated(folder.path(), "", "days = 40\nwindow_s = 7200\n");
    assert_eq!(levels.len(), 480);
    let wind = true_wind(&folder.path().join("made"));
    let mut above = 0;
    for row in &levels {
        let speed = wind[&(row[0].clone(), row[1].clone())];
        let level: f64 = row[2].parse().unwrap();
        assert!((level - law_db(speed, 70.0)).abs() < 0.006, "{row:?}: {speed} m/s");
        above += usize::from(speed > 9.0);
    }
    assert!(above > 20, "only {above} windows above the onset");
}

#[test]
fn a_gain_step_shifts_the_second_deployment_and_nothing_lies_outside_deployments() {
    let folder = tempfile::tempdir().unwrap();
    let sensor = "[[site.sensor]]\nid = \"H1\"\n\
        [[site.sensor.deployment]]\nid = \"first\"\nstart = 2031-01-02T00:00:00Z\nend = 2031-01-10T00:00:00Z\n\
        [[site.sensor.deployment]]\nid = \"second\"\nstart = 2031-01-12T00:00:00Z\nend = 2031-01-20T00:00:00Z\n";
    let levels = simulated(folder.path(), sensor, "days = 30\ngain_step_db = 3\nfloor_offset_db = { A = 2 }\n");
    assert_eq!(levels.len(), 2 * 8 * 24);
    let wind = true_wind(&folder.path().join("made"));
    for row in &levels {
        let gain_db = if row[0].as_str() < "2031-01-11" { 0.0 } else { 3.0 };
        let expected = law_db(wind[&(row[0].clone(), row[1].clone())], 72.0) + gain_db;
        let level: f64 = row[2].parse().unwrap();
        assert!((level - expected).abs() < 0.006, "{row:?}: {expected}");
    }
    // The study that was written has both deployments and can be used at once.
    let check = underwind(&folder.path().join("made"), &["check", "study.toml"]).succeeds();
    assert!(check.stdout.contains("H1"), "{}", check.stdout);
    let sites = std::fs::read_to_string(folder.path().join("made/sites.csv")).unwrap();
    assert!(sites.contains("second,2031-01-12T00:00:00Z,2031-01-20T00:00:00Z"), "{sites}");
}

#[test]
fn a_moving_site_has_the_wind_of_its_place() {
    let folder = tempfile::tempdir().unwrap();
    write(
        folder.path(),
        "track.csv",
        "time,latitude,longitude\n2031-01-01T00:00:00Z,45,-30\n2031-01-11T00:00:00Z,46,-28\n",
    );
    let text = study("", &format!("days = 15\n{NO_NOISE}{BAND}"))
        .replace("latitude_deg = 45.1\nlongitude_deg = 179.93\n", "track = \"track.csv\"\n");
    write(folder.path(), "plan.toml", &text);
    underwind(folder.path(), &["simulate", "plan.toml", "-o", "made"]).succeeds();
    // Ten days of positions, fifteen of wind: no level is made up where there is no position.
    let (_, levels) = rows(&folder.path().join("made/levels.csv.gz"));
    assert_eq!(levels.len(), 240);
    let run = underwind(folder.path(), &["match", "made/study.toml", "-o", "out"]).succeeds();
    assert!(run.stdout.contains("pairs of wind and level used: 240"), "{}", run.stdout);
}
