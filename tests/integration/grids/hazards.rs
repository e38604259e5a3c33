//! Files that each do one thing that real files do: the right number, a number with its flag, or an explained null.
//!
//! The files and what a right reader answers are made by `tests/fixtures/grids/make_grids.py` (numpy's `interp` with its
//! period for values, cftime for times; versions in `hazards.json`).

use super::support::{ask_by, expected, fixture, open, steps};
use std::path::PathBuf;
use underwind::model::{CoastRule, SpatialRule};

fn texts(value: &serde_json::Value) -> Vec<&str> {
    value.as_array().unwrap().iter().map(|text| text.as_str().unwrap()).collect()
}

fn files(value: &serde_json::Value) -> Vec<PathBuf> {
    texts(value).into_iter().map(fixture).collect()
}

fn rule(text: &str) -> SpatialRule {
    match text.split_once(' ') {
        None if text == "renormalise" => SpatialRule::Bilinear(CoastRule::Renormalise),
        None => SpatialRule::default(),
        Some(("nearest", km)) => SpatialRule::Nearest { max_distance_km: km.parse().unwrap() },
        Some((_, km)) => SpatialRule::Footprint { radius_km: km.parse().unwrap() },
    }
}

#[test]
fn hazards_give_the_right_number_the_flag_or_the_reason() {
    let mut wrong = Vec::new();
    let all = expected("hazards.json");
    let cases = all["values"].as_array().unwrap();
    for case in cases {
        let number = |name: &str| case[name].as_f64();
        for quantity in ["eastward", "northward"] {
            let answer = ask_by(
                &files(&case["files"]),
                number("latitude").unwrap(),
                number("longitude").unwrap(),
                case["time"].as_str().unwrap(),
                &format!("{quantity}_wind"),
                &texts(&case["settings"]),
                rule(case["rule"].as_str().unwrap()),
            );
            let brief = answer.as_ref().map(|found| (found.value, &found.flags, &found.message));
            let told = format!("{case}\n    gives {brief:?}");
            match (answer, number(quantity)) {
                (Err(_), _) => wrong.push(told),
                (Ok(answer), Some(expected)) => {
                    let close = answer.value.is_some_and(|v| (v - expected).abs() < number("tolerance").unwrap());
                    if !close || answer.flags != texts(&case["flags"]) {
                        wrong.push(told);
                    }
                }
                (Ok(answer), None) => {
                    let why = case["missing"].as_str().unwrap();
                    let why = underwind::model::Missing::ALL.iter().find(|known| known.name() == why).unwrap();
                    let message = answer.message.unwrap_or_default();
                    if answer.value.is_some() || answer.status != "missing" || !message.starts_with(why.sentence()) {
                        wrong.push(told);
                    }
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{} of {} cases:\n{}", wrong.len(), 2 * cases.len(), wrong.join("\n"));
    assert!(cases.len() > 240, "{}", cases.len());
}

#[test]
fn times_of_every_kind_decode_to_the_same_instants() {
    let mut wrong = Vec::new();
    let all = expected("hazards.json");
    let cases = all["times"].as_array().unwrap();
    for case in cases {
        match open(&files(&case["files"]), &texts(&case["settings"])) {
            Ok(source) if steps(&source) == texts(&case["steps"]) => {}
            Ok(source) => wrong.push(format!("{case}\n    gives {:?}", steps(&source))),
            Err(error) => wrong.push(format!("{case}\n    gives {error}")),
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    assert!(cases.len() > 30, "{}", cases.len());
}

#[test]
fn what_a_reader_should_know_is_said() {
    for (names, note) in [
        (&["t02_float32.nc"][..], "time variable `time` is stored in single precision, which may resolve minutes only"),
        (&["t05_noleap.nc"], "time runs in the model calendar noleap; dates keep their names"),
        (&["t07_unsorted.nc"], "t07_unsorted.nc: steps are not in order of time; they were sorted"),
        (&["t07_descending.nc"], "t07_descending.nc: steps are not in order of time; they were sorted"),
        (&["t07_twice.nc"], "1 steps are there more than once; the first counts, and differences are refused"),
        (&["t09_hole.nc"], "1 steps of time variable `time` have no time and are left out"),
        (&["t09_short_axis.nc"], "2 steps of time variable `time` have no time and are left out"),
        (&["t10_a.nc", "t10_a.nc"], "4 steps are there more than once; the first counts, and differences are refused"),
        (&["t11_mean.nc"], "variable `u10` holds the mean over time (cell_methods), not values at an instant"),
        (&["d02_split.nc"], "variable `u10`: final values go before preliminary ones along `expver`"),
        (&["g11_text_missing.nc"], "variable `u10`: `missing_value` is a text, read as -9999"),
        (
            &["g12_range_unpacked.nc"],
            "variable `u10`: `valid_range` is taken in the units of the unpacked values, as its type says",
        ),
        (
            &["g12_range_wrong.nc"],
            "variable `u10`: its valid range, in packed units, leaves only winds from 0.5 to 1.5; all others are missing (a range meant in unpacked units?)",
        ),
        (&["g13_text.nc"], "variable `u10`: `scale_factor` is a text, read as 0.01"),
    ] {
        let source = open(&names.iter().map(|name| fixture(name)).collect::<Vec<_>>(), &[]).unwrap();
        let notes: Vec<String> = source.warnings().iter().map(|note| super::support::without_folder(note)).collect();
        assert!(notes.iter().any(|known| known == note), "{names:?}: expected `{note}` among {notes:#?}");
    }
}
