//! The main job on files that nobody here wrote. Skipped where they are absent.

use crate::support::{shared, underwind, write};

/// A reanalysis-format year of real wind at a place inside its grid; levels are simulated from that wind, with known truth.
/// The file is over land: its winds serve the reader and the fit, not any physics of the sea.
#[test]
fn a_real_year_of_wind_with_simulated_levels_gives_the_truth_back() {
    let Some(data) = shared("data") else { return };
    let folder = tempfile::tempdir().unwrap();
    let wind = data.join("era5_hourly_2017_packed.nc");
    write(
        folder.path(),
        "plan.toml",
        &format!(
            r#"[study]
name = "Real wind, simulated levels"
[[site]]
id = "inside"
latitude_deg = 52.47
longitude_deg = 13.21
[[wind]]
id = "reanalysis"
files = ["{}"]
[simulate]
seed = 4
wind = "study"
slow_noise_sd_db = 1.0
white_noise_sd_db = 0.5
[[simulate.band]]
centre_hz = 500
floor_db = 70
slope_db_per_decade = 28
crossover_m_s = 2.0
[[simulate.band]]
centre_hz = 8000
floor_db = 60
slope_db_per_decade = 32
crossover_m_s = 1.8
onset_m_s = 6.0
"#,
            wind.display()
        ),
    );
    underwind(folder.path(), &["simulate", "plan.toml", "--output", "trial"]).succeeds();
    let run = underwind(folder.path(), &["run", "trial/study.toml", "--json", "--quiet"]).succeeds();
    let relations: Vec<serde_json::Value> = serde_json::from_str(&run.stdout).unwrap();
    assert_eq!(relations.len(), 2);
    let number = |band: usize, quantity: &str| relations[band]["relation"][quantity]["value"]["estimate"].as_f64();
    for (band, floor_db, slope_db) in [(0, 70.0, 28.0), (1, 60.0, 32.0)] {
        assert!((number(band, "floor_db").unwrap() - floor_db).abs() < 1.0, "{:?}", number(band, "floor_db"));
        let slope = number(band, "slope_db_per_decade").unwrap();
        assert!((slope - slope_db).abs() < 3.0, "{slope}");
        assert!(relations[band]["relation"]["diagnostics"]["samples"].as_u64().unwrap() > 8000);
    }
    let onset = number(1, "onset_m_s").unwrap();
    assert!((onset - 6.0).abs() < 1.0, "{onset}");
    assert_eq!(number(0, "onset_m_s"), None, "there is no onset in the lower band");
}

/// The hourly octave-band record: odd columns, deployment and recovery inside. No wind was measured beside it, so the wind is
/// simulated for its place and dates.
#[test]
fn a_real_level_table_is_checked_and_matched() {
    let Some(data) = shared("data") else { return };
    let folder = tempfile::tempdir().unwrap();
    let levels = data.join("SanctSound_CI01_01_OL_1h.csv");
    let site = "[[site]]\nid = \"mooring\"\nlatitude_deg = 34.0\nlongitude_deg = -120.1\n";
    write(
        folder.path(),
        "plan.toml",
        &format!(
            "[study]\nname = \"Wind for the record\"\n{site}[simulate]\nstart = \"2018-10-31T00:00:00Z\"\ndays = 115\n[[simulate.band]]\ncentre_hz = 1000\nfloor_db = 80\nslope_db_per_decade = 20\ncrossover_m_s = 5\n"
        ),
    );
    underwind(folder.path(), &["simulate", "plan.toml", "--output", "wind"]).succeeds();
    write(
        folder.path(),
        "study.toml",
        &format!(
            "[study]\nname = \"Real levels, simulated wind\"\ntables = [\"csv\"]\n{site}[[wind]]\nid = \"simulated\"\nfiles = [\"wind/wind.nc\"]\n[[levels]]\nfiles = [\"{}\"]\nreference = \"1 uPa\"\nkind = \"band_level\"\nbands = \"octave\"\nwindow_s = 3600\nstamp = \"start\"\n",
            levels.display()
        ),
    );
    // Facts of DATA.md: 2671 rows, 11 octave bands.
    let check = underwind(folder.path(), &["check", "study.toml"]).succeeds();
    for part in ["bands: 11", "samples: 29381", "2018-10-31T21:00:02Z to 2019-02-20T17:00:00Z", "nothing lacks"] {
        assert!(check.stdout.contains(part), "expected `{part}` in:\n{}", check.stdout);
    }
    let run = underwind(folder.path(), &["match", "study.toml"]).succeeds();
    assert!(run.stdout.contains("pairs of wind and level used: 29381"), "{}", run.stdout);
}
