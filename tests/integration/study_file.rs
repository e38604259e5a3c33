//! The study file: what is refused, in one line with its place and the remedy.

use crate::support::{project, underwind, write};
use underwind::config::read_study;

const HEAD: &str = "[study]\nname = \"trial\"\n";
const SITE: &str = "[[site]]\nid = \"A\"\nlatitude_deg = 45.0\nlongitude_deg = -30.0\n";

/// The message for a study file of this text.
fn message(text: &str) -> String {
    let folder = tempfile::tempdir().unwrap();
    write(folder.path(), "study.toml", text);
    write(folder.path(), "levels.csv", "time\n");
    let error = read_study(&folder.path().join("study.toml")).expect_err("a study that is refused").to_string();
    assert_eq!(error.lines().count(), 1, "one line: {error}");
    error.replace(&format!("{}/", folder.path().display()), "").replace(&folder.path().display().to_string(), "FOLDER")
}

#[test]
fn a_misspelt_key_is_named_with_its_line_and_the_nearest_key() {
    let text = format!("{HEAD}{SITE}[[wind]]\nid = \"m\"\nfile = [\"a.nc\"]\n");
    let message = message(&text);
    assert!(
        message.starts_with("study.toml, line 9: unknown key `file`, did you mean `files`?; known here: id, files,"),
        "{message}"
    );
}

#[test]
fn a_missing_file_and_a_pattern_without_match_are_named() {
    let wind = |files: &str| format!("{HEAD}{SITE}[[wind]]\nid = \"m\"\nfiles = [\"{files}\"]\n");
    assert_eq!(message(&wind("a.nc")), "study.toml, line 9: `wind.files`: there is no file a.nc");
    assert_eq!(
        message(&wind("a_*.nc")),
        "study.toml, line 9: `wind.files`: the pattern `a_*.nc` matches no file in FOLDER"
    );
}

#[test]
fn impossible_values_are_refused_with_what_is_expected() {
    for (text, expected) in [
        (
            format!("{HEAD}[[site]]\nid = \"A\"\nlatitude_deg = -129.4\nlongitude_deg = 48.0\n"),
            "study.toml, line 5: -129.4 is not allowed; expected a latitude of -90 to 90 degrees north",
        ),
        (
            format!("{HEAD}{SITE}depth_m = -40\n"),
            "study.toml, line 7: -40 is not allowed; expected a depth of 0 to 12000 m, positive down",
        ),
        (
            format!("{HEAD}{SITE}[relation]\nreplicates = 10\n"),
            "study.toml, line 8: 10 replicates are not allowed; expected 0 (estimates alone) or 100 to 20000: fewer give no 95 % interval",
        ),
        (
            format!("{HEAD}{SITE}[match]\nwindow_s = 0\n"),
            "study.toml, line 8: 0 is not allowed; expected a span of 0.001 s to 366 days, in seconds",
        ),
        (
            format!("{HEAD}{SITE}[report]\nwind_class_edges_m_s = [8.0, 5.0]\n"),
            "study.toml, line 8: `report.wind_class_edges_m_s` must increase",
        ),
        (format!("{HEAD}{SITE}{SITE}"), "study.toml, line 8: site `A` is there twice; ids must differ"),
        (
            HEAD.to_owned(),
            "study.toml: no site: give `[[site]]` with id, latitude_deg and longitude_deg, or `[sites] file = \"sites.csv\"`",
        ),
    ] {
        assert_eq!(message(&text), expected);
    }
}

#[test]
fn a_deployment_must_end_after_it_starts() {
    let text = format!(
        "{HEAD}{SITE}[[site.sensor]]\nid = \"1\"\n[[site.sensor.deployment]]\nid = \"a\"\nstart = 2031-05-04T00:00:00Z\nend = \"2031-05-03\"\n"
    );
    assert_eq!(
        message(&text),
        "study.toml, line 12: deployment `a` ends at 2031-05-03T00:00:00Z, not after its start 2031-05-04T00:00:00Z"
    );
}

#[test]
fn text_that_is_no_toml_is_refused_with_its_line() {
    let message = message("[study\nname = 1\n");
    assert!(message.starts_with("study.toml, line 1: "), "{message}");
}

#[test]
fn every_example_in_config_is_a_valid_study() {
    let mut read = 0;
    for entry in std::fs::read_dir(project().join("config")).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|extension| extension == "toml") {
            read_study(&path).unwrap_or_else(|error| panic!("{error}"));
            read += 1;
        }
    }
    assert!(read >= 3, "only {read} examples");
}

#[test]
fn a_study_that_is_not_there_ends_with_status_3() {
    let folder = tempfile::tempdir().unwrap();
    underwind(folder.path(), &["check", "nothing.toml"]).fails(3, &["study file nothing.toml: cannot be read"]);
}

#[test]
fn sections_that_a_job_needs_are_asked_for() {
    let folder = tempfile::tempdir().unwrap();
    write(folder.path(), "study.toml", &format!("{HEAD}{SITE}"));
    underwind(folder.path(), &["match", "study.toml"])
        .fails(3, &["study.toml: there is no `[[wind]]`; this job needs at least one"]);
    underwind(folder.path(), &["simulate", "study.toml", "--output", "x"]).fails(3, &["[simulate]"]);
}
