//! Grids whose latitudes and longitudes are no axes: curvilinear, rotated, projected; nodes and stations.
//!
//! Files and expected values are made by `tests/fixtures/layouts/make_layouts.py` (pyproj 3.7.2 with PROJ 9.5.1 for places and
//! the angles of the axes; the field is known everywhere).

use super::support::{ask, ask_by, at};
use crate::support::project;
use underwind::model::{CoastRule, Missing, SpatialRule};

fn fixture(name: &str) -> std::path::PathBuf {
    project().join("tests/fixtures/layouts").join(name)
}

#[test]
fn winds_on_grids_without_axes_agree_with_the_field_they_were_made_from() {
    let text = std::fs::read_to_string(fixture("layouts.json")).unwrap();
    let all: serde_json::Value = serde_json::from_str(&text).unwrap();
    let cases = all["cases"].as_array().unwrap();
    let mut wrong = Vec::new();
    for case in cases {
        let number = |name: &str| case[name].as_f64().unwrap();
        let texts = |name: &str| -> Vec<&str> {
            case[name].as_array().unwrap().iter().map(|text| text.as_str().unwrap()).collect()
        };
        let rule = match case["rule"].as_str().unwrap() {
            "renormalise" => SpatialRule::Bilinear(CoastRule::Renormalise),
            text => text
                .strip_prefix("nearest ")
                .map_or_else(SpatialRule::default, |km| SpatialRule::Nearest { max_distance_km: km.parse().unwrap() }),
        };
        for quantity in ["eastward", "northward"] {
            let answer = ask_by(
                &[fixture(case["file"].as_str().unwrap())],
                number("latitude"),
                number("longitude"),
                &at(number("hour")),
                &format!("{quantity}_wind"),
                &texts("settings"),
                rule,
            );
            let is_right = match (&answer, case["missing"].as_str()) {
                (Ok(answer), None) => {
                    let close = |value: f64| (value - number(quantity)).abs() <= number("tolerance");
                    answer.value.is_some_and(close) && answer.flags == texts("flags")
                }
                (Ok(answer), Some(why)) => {
                    let why = Missing::ALL.iter().find(|known| known.name() == why).unwrap();
                    answer.value.is_none()
                        && answer.message.as_ref().is_some_and(|message| message.starts_with(why.sentence()))
                }
                (Err(_), _) => false,
            };
            if !is_right {
                let brief = answer.map(|answer| (answer.value, answer.flags, answer.message));
                wrong.push(format!("{quantity} {case}\n    gives {brief:?}"));
            }
        }
    }
    assert!(wrong.is_empty(), "{} of {}:\n{}", wrong.len(), 2 * cases.len(), wrong.join("\n"));
    assert!(cases.len() > 40, "{}", cases.len());
}

#[test]
fn what_nothing_states_is_asked_for() {
    let said = |name: &str, settings: &[&str]| {
        let error = ask(&[fixture(name)], 45.0, -31.0, &at(1.0), "eastward_wind", settings).expect_err("a refusal");
        error.to_string().rsplit_once(&format!("{name}: ")).unwrap().1.to_owned()
    };
    assert_eq!(
        said("rotated_unsaid.nc", &[]),
        "variable `u10`: it lies on a grid about a rotated pole and nothing says whether it is towards east and north or along the grid's axes (set `wind.grid_relative` to true or false)"
    );
    assert_eq!(
        said("projected_no_places.nc", &[]),
        "variable `u10`: it lies on a grid in a map projection without latitude and longitude of its nodes; expected both as variables of two dimensions (add them, or regrid it first)"
    );
    assert_eq!(
        said("drifting.nc", &[]),
        "variable `u10`: its latitude and longitude change along `time`, its time; expected nodes that stay (give the wind of a ship or a drifting buoy as a table)"
    );
}
