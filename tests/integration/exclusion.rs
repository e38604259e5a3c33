//! `[[exclude]]`: conditions and lists of intervals.

use crate::support::{project, rows, underwind, write};
use std::collections::BTreeMap;
use std::path::Path;

/// The demo's study with absolute paths and these lines more.
fn study(folder: &Path, more: &str) {
    let text = std::fs::read_to_string(project().join("demo-data/study.toml")).unwrap();
    let here = format!("\"{}/demo-data/", project().display());
    let text = ["wind.nc", "levels.csv.gz", "sites.csv"]
        .iter()
        .fold(text, |text, name| text.replace(&format!("\"{name}"), &format!("{here}{name}")));
    write(folder, "study.toml", &format!("{text}\n{more}"));
}

#[test]
fn rules_leave_pairs_out_and_every_pair_says_which() {
    let folder = tempfile::tempdir().unwrap();
    write(
        folder.path(),
        "visits.csv",
        "start,end,reason,site,band_low_hz,band_high_hz\n\
         2031-03-01T06:00Z,2031-03-02T06:00Z,service visit,,,\n\
         2031-03-05T00:00Z,2031-03-05T12:00Z,dredging nearby,basin,50,200\n",
    );
    study(
        folder.path(),
        "[[exclude]]\nwhen = \"wind_speed_mean_m_s > 12 and hour_utc < 6\"\nreason = \"night squalls\"\nsites = [\"skerry\"]\n\
         [[exclude]]\nintervals = \"visits.csv\"\n",
    );
    let run = underwind(folder.path(), &["match", "study.toml", "-o", "out", "--quiet"]).succeeds();
    let all = rows(&folder.path().join("out/matchups.csv"));
    let mut counts: BTreeMap<&str, u64> = BTreeMap::new();
    for row in &all {
        let number = |name: &str| row[name].parse::<f64>().unwrap_or(f64::NAN);
        let start = row["window_start_utc"].as_str();
        let hour: f64 = start[11..13].parse::<f64>().unwrap() + 0.5;
        // The rules once more, by hand, in their order.
        let expected = if row["site"] == "skerry" && number("wind_speed_mean_m_s") > 12.0 && hour < 6.0 {
            "night squalls"
        } else if ("2031-03-01T06:00".."2031-03-02T06:00").contains(&&start[..16]) {
            "service visit"
        } else if row["site"] == "basin"
            && ("2031-03-05T00:00".."2031-03-05T12:00").contains(&&start[..16])
            && number("band_low_hz") < 200.0
            && number("band_high_hz") > 50.0
        {
            "dredging nearby"
        } else {
            ""
        };
        let told = row["excluded_by"].as_str();
        // A pair that lacks level or wind says that first.
        if row["use"] == "true" || row["reason"] == "excluded" {
            assert_eq!(told, expected, "{row:?}");
            assert_eq!(row["use"] == "false", !expected.is_empty(), "{row:?}");
        }
        if !told.is_empty() {
            *counts.entry(told).or_default() += 1;
        }
    }
    assert_eq!(counts.len(), 3, "{counts:?}");
    for (reason, count) in counts {
        assert!(
            run.stdout.contains(&format!("left out by rule, {reason}: {count}\n")),
            "{reason} {count}: {}",
            run.stdout
        );
    }
}

#[test]
fn relations_with_and_without_the_rules_stand_side_by_side() {
    let folder = tempfile::tempdir().unwrap();
    study(folder.path(), "[relation]\nreplicates = 100\n[[exclude]]\nwhen = \"level_db > 95\"\nreason = \"loud\"\n");
    let arguments = ["fit", "study.toml", "-o", "out", "--quiet", "--sensitivity"];
    let told = underwind(folder.path(), &arguments).succeeds().stdout;
    assert!(told.contains("exclusion rules: not applied"), "{told}");
    let refits = rows(&folder.path().join("out/sensitivity.csv"));
    let lowest = refits.iter().find(|row| row["choice"] == "exclusion rules").unwrap();
    // The lowest band lies above 95 dB most of the time: with the rule its pairs are fewer.
    assert!(lowest["pairs"].parse::<u64>().unwrap() > 2000, "{lowest:?}");
}

#[test]
fn rules_that_cannot_be_read_are_refused_with_their_place() {
    let folder = tempfile::tempdir().unwrap();
    let refused = |more: &str, parts: &[&str]| {
        study(folder.path(), more);
        underwind(folder.path(), &["match", "study.toml", "-o", "out", "--quiet"]).fails(3, parts);
    };
    refused(
        "[[exclude]]\nwhen = \"wind_speed > 3\"\n",
        &[
            "study.toml, line 27: `exclude.when`, at character 1: there is no column `wind_speed`; known here: wind_speed_mean_m_s,",
        ],
    );
    refused("[[exclude]]\nreason = \"x\"\n", &["`[[exclude]]` needs either `when` (a condition) or `intervals`"]);
    refused("[[exclude]]\nintervals = \"none.csv\"\n", &["`exclude.intervals`: there is no file", "none.csv"]);
    let listed = |text: &str, parts: &[&str]| {
        write(folder.path(), "visits.csv", text);
        study(folder.path(), "[[exclude]]\nintervals = \"visits.csv\"\n");
        underwind(folder.path(), &["match", "study.toml", "-o", "out", "--quiet"]).fails(4, parts);
    };
    listed(
        "start,end\n2031-03-02T00:00Z,2031-03-01T00:00Z\n",
        &["visits.csv: line 2: the interval ends at 2031-03-01T00:00:00Z, not after its start 2031-03-02T00:00:00Z"],
    );
    listed(
        "start,end,band_low_hz,band_high_hz\n2031-03-01T00:00Z,2031-03-02T00:00Z,500,\n",
        &["visits.csv: line 2: the band is `500` to ``; expected two frequencies in Hz, the lower first, or none"],
    );
    listed("begin,end\n2031-03-01T00:00Z,2031-03-02T00:00Z\n", &["visits.csv", "the start"]);
}
