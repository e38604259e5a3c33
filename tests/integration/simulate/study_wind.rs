//! Levels from the wind of the study's own inputs.

use super::support::{BAND, rows, true_wind};
use crate::support::{project, underwind, write};

#[test]
fn the_wind_of_the_study_is_used_and_named_again() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::copy(project().join("demo-data/wind.nc"), folder.path().join("model.nc")).unwrap();
    let text = format!(
        "[study]\nname = \"plan\"\n[[site]]\nid = \"lantern\"\nlatitude_deg = 44.62\nlongitude_deg = -31.27\n\
         [[wind]]\nid = \"model\"\nfiles = [\"model.nc\"]\n[match]\nstatistic = \"power_mean\"\n\
         [simulate]\nwind = \"study\"\ngap_share = 0\n{BAND}"
    );
    write(folder.path(), "plan.toml", &text);
    underwind(folder.path(), &["simulate", "plan.toml", "-o", "made/deep"]).succeeds();
    let made = folder.path().join("made/deep");
    assert!(!made.join("wind.nc").exists());
    // The demo's wind at this place came from another interpolation, of another program part.
    let demo = true_wind(&project().join("demo-data"));
    let wind = true_wind(&made);
    assert_eq!(wind.len(), 2904);
    for (key, speed) in &wind {
        assert!((speed - demo[key]).abs() < 2e-4, "{key:?}: {speed} {}", demo[key]);
    }
    // The study works from its new place, and keeps the sections of the plan.
    let study = std::fs::read_to_string(made.join("study.toml")).unwrap();
    assert!(study.contains("statistic = \"power_mean\"") && !study.contains("[simulate]"), "{study}");
    let run = underwind(&made, &["match", "study.toml", "-o", "out"]).succeeds();
    assert!(run.stdout.contains("pairs of wind and level used: 2904"), "{}", run.stdout);
    assert_eq!(rows(&made.join("levels.csv.gz")).1.len(), 2904);
}

#[test]
fn a_stated_time_shortens_the_deployment() {
    let folder = tempfile::tempdir().unwrap();
    let mut table = String::from("time,wind_speed\n");
    for hour in 0..100 {
        table.push_str(&format!("{},{}\n", 1_924_992_000 + hour * 3600, 5 + hour % 7));
    }
    write(folder.path(), "buoy.csv", &table);
    let text = format!(
        "[study]\nname = \"plan\"\n[[site]]\nid = \"A\"\nlatitude_deg = 44\nlongitude_deg = -31\n\
         [[wind]]\nid = \"buoy\"\ntable = [\"buoy.csv\"]\ntime_unit = \"s\"\nunits = \"m/s\"\nheight_m = 10\n\
         [simulate]\nwind = \"study\"\nstart = \"2031-01-02T00:00:00Z\"\ndays = 2\ngap_share = 0\n{BAND}"
    );
    write(folder.path(), "plan.toml", &text);
    underwind(folder.path(), &["simulate", "plan.toml", "-o", "made"]).succeeds();
    let wind = true_wind(&folder.path().join("made"));
    assert_eq!(wind.len(), 48);
    // 1924992000 s is 2031-01-01T00:00:00Z. Linear from 8 m/s (hour 24) to 9 m/s (hour 25): closed form 8.5 m/s.
    assert!((wind[&("2031-01-02T00:00:00Z".to_owned(), "A".to_owned())] - 8.5).abs() < 1e-4);
}
