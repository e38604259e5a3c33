//! One sea, written in every way that archives write spectra: the right number, an explained null, or a refusal.
//!
//! Files and expected values are made by `tests/fixtures/spectra/make_spectra.py` (numpy and netCDF4; versions in
//! `expected.json`), which holds the sea itself and never reads a file back.

use super::support::fixture;
use std::path::PathBuf;
use underwind::model::Missing;
use underwind::pipeline::{LookUp, look_up_spectrum};
use underwind::units::Instant;

fn texts(value: &serde_json::Value) -> Vec<String> {
    value.as_array().unwrap().iter().map(|text| text.as_str().unwrap().to_owned()).collect()
}

#[test]
fn every_way_of_writing_spectra_gives_the_number_the_reason_or_a_refusal() {
    let all: serde_json::Value =
        serde_json::from_str(&std::fs::read_to_string(fixture("expected.json")).unwrap()).unwrap();
    let start = Instant::parse(all["start"].as_str().unwrap()).unwrap();
    let cases = all["cases"].as_array().unwrap();
    let mut wrong = Vec::new();
    for case in cases {
        let number = |name: &str| case[name].as_f64();
        let question = LookUp {
            files: texts(&case["files"]).iter().map(|name| fixture(name)).collect::<Vec<PathBuf>>(),
            latitude_deg: number("latitude"),
            longitude_deg: number("longitude"),
            time: Some(start.plus_ms((number("hour").unwrap() * 3.6e6).round() as i64).iso()),
            quantity: Some(case["quantity"].as_str().unwrap().to_owned()),
            frequency_hz: number("frequency_hz").map(|hz| {
                let sound = case["quantity"] == "radiated_level";
                if sound { 2.0 * hz } else { hz }
            }),
            direction_deg: number("direction_deg"),
            settings: texts(&case["settings"]),
            ..LookUp::default()
        };
        let found = look_up_spectrum(&question);
        let told = format!("{case}\n    gives {:?}", found.as_ref().map(|a| (a.value, &a.flags, &a.message)));
        let fits = match (&found, case.get("refused"), case.get("missing")) {
            (Err(error), Some(parts), _) => {
                let message = error.to_string();
                error.exit_status() == 4
                    && message.lines().count() == 1
                    && texts(parts).iter().all(|part| message.contains(part.as_str()))
            }
            (Ok(answer), None, Some(why)) => {
                let why = Missing::ALL.iter().find(|known| known.name() == why.as_str().unwrap()).unwrap();
                answer.value.is_none()
                    && answer.status == "missing"
                    && answer.message.as_ref().is_some_and(|message| message.starts_with(why.sentence()))
            }
            (Ok(answer), None, None) => {
                let expected = number("value").unwrap();
                let close = |value: f64| (value - expected).abs() <= number("relative").unwrap() * expected.abs();
                answer.value.is_some_and(close) && answer.flags == texts(&case["flags"])
            }
            _ => false,
        };
        if !fits {
            wrong.push(told);
        }
    }
    assert!(wrong.is_empty(), "{} of {} cases:\n{}", wrong.len(), cases.len(), wrong.join("\n"));
    assert!(cases.len() > 500, "{}", cases.len());
}
