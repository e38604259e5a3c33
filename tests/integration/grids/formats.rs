//! Formats and storage: the same answer from all of them; what is broken is refused.

use super::support::{ask, ask_by, at, fixture, message, series, site, value};
use crate::support::underwind;
use underwind::config::wind_options_from;
use underwind::io::netcdf::{WindOptions, open_wind};
use underwind::model::{CoastRule, SourceId, SpatialRule};
use underwind::pipeline::{Silent, sample_wind};

// Expected values: numpy 2.4 in tests/fixtures/grids/make_grids.py, which also wrote the files (netCDF4 1.7).
#[test]
fn every_format_and_order_gives_the_same_values() {
    let expected: serde_json::Value =
        serde_json::from_str(&std::fs::read_to_string(fixture("expected.json")).unwrap()).unwrap();
    let mut compared = 0;
    for name in [
        "classic.nc",
        "offset64.nc",
        "cdf5.nc",
        "nc4_classic.nc",
        "contiguous.nc",
        "deflate_shuffle_checksum.nc",
        "deflate_plain.nc",
        "big_endian.nc",
        "time_last.nc",
        "float_missing.nc",
        "extra_dims.nc",
        "east_360.nc",
        "trade_names.nc",
    ] {
        // Unpacked single precision is not the same number as packed.
        let tolerance = if name == "float_missing.nc" { 1e-5 } else { 1e-9 };
        for query in expected["queries"].as_array().unwrap() {
            let number = |key: &str| query[key].as_f64();
            for (quantity, key) in [("eastward_wind", "eastward"), ("northward_wind", "northward")] {
                let answer = ask(
                    &[fixture(name)],
                    number("latitude").unwrap(),
                    number("longitude").unwrap(),
                    &at(number("hour").unwrap()),
                    quantity,
                    &[],
                )
                .unwrap();
                match number(key) {
                    Some(expected) => {
                        let found = answer.value.unwrap_or_else(|| panic!("{name} {query}: {answer:?}"));
                        assert!((found - expected).abs() < tolerance, "{name} {query}: {found}");
                    }
                    None => {
                        assert_eq!(answer.status, "missing", "{name} {query}");
                        assert!(answer.message.unwrap().contains("land or missing"));
                    }
                }
                compared += 1;
            }
        }
    }
    assert_eq!(compared, 13 * 6 * 2);
}

#[test]
fn files_split_in_time_give_the_same_series_in_any_order() {
    let whole = series(&[fixture("contiguous.nc")], 45.3, -31.2);
    assert_eq!(whole.steps.len(), 30);
    for files in [["first_half.nc", "second_half.nc"], ["second_half.nc", "first_half.nc"]] {
        let split = series(&files.map(fixture), 45.3, -31.2);
        assert_eq!(split, whole, "{files:?}");
    }
    // The same file twice says the same twice.
    assert_eq!(series(&[fixture("contiguous.nc"), fixture("first_half.nc")], 45.3, -31.2), whole);
}

#[test]
fn a_node_beside_land_is_its_value_and_a_mixed_cell_follows_the_coast_rule() {
    let file = [fixture("classic.nc")];
    let here = |rule| ask_by(&file, 44.7, -30.2, &at(5.0), "eastward_wind", &[], rule).unwrap();
    assert_eq!(here(SpatialRule::Bilinear(CoastRule::Missing)).value, None);
    let scaled = here(SpatialRule::Bilinear(CoastRule::Renormalise));
    assert_eq!(scaled.flags, ["coast_renormalised"]);
    assert!(value(&file, 44.5, -30.5, &at(5.0), "eastward_wind", &[]).is_finite());
}

#[test]
fn directions_average_on_the_circle_and_units_and_zones_are_undone() {
    let file = [fixture("speed_direction.nc")];
    let settings = ["direction_sense=from"];
    // 350 and 10 degrees at 10 knots: from the north, 10 kn x cos 10 deg; one knot is 1852/3600 m/s, exactly.
    let speed = value(&file, 0.5, 0.5, "2031-01-10T00:00:00Z", "wind_speed", &settings);
    assert!((speed - 10.0 * 1852.0 / 3600.0 * 10f64.to_radians().cos()).abs() < 1e-6, "{speed}");
    let direction = value(&file, 0.5, 0.5, "2031-01-10T00:30:00Z", "wind_from_direction", &settings);
    assert!(!(1e-4..=359.9999).contains(&direction), "{direction}");
    let turned = value(&file, 0.5, 0.5, "2031-01-10T00:30:00Z", "wind_from_direction", &["direction_sense=to"]);
    assert!((turned - 180.0).abs() < 1e-4, "{turned}");
    assert!(
        message(&file, &[])
            .contains("nothing says whether it is where the wind comes from or goes to (set `wind.direction_sense`")
    );
}

#[test]
fn the_only_record_variable_of_two_bytes_has_no_padding() {
    // Values are (100 k + 10 i) x 0.01 m/s by construction.
    let file = [fixture("unlimited.nc")];
    let error = ask(&file, 45.0, 1.0, "2031-01-10T00:00:00Z", "wind_speed", &[]).unwrap_err().to_string();
    assert!(error.contains("there is no time variable `time` for it (set `wind.time`)"), "{error}");
}

#[test]
fn what_is_not_understood_is_asked_for_with_its_key() {
    for (name, settings, parts) in [
        ("meaningless_names.nc", vec![], vec!["candidates are a, b; set `wind.eastward` and `wind.northward`"]),
        ("no_units.nc", vec![], vec!["variable `u10`: it has no units", "(set `wind.units`)"]),
        ("months.nc", vec![], vec!["\"months\" have no fixed length", "(set `wind.time_units`)"]),
        (
            "classic.nc",
            vec!["eastward=u99", "northward=v10"],
            vec!["there is no variable `u99` (`wind.eastward`); the variables are time, latitude, longitude, u10, v10"],
        ),
        ("classic.nc", vec!["units=furlongs"], vec!["it is in `furlongs`; expected a speed"]),
        (
            "classic.nc",
            vec!["calendar=lunar"],
            vec!["its calendar is \"lunar\", which is not known (set `wind.calendar`"],
        ),
    ] {
        let message = message(&[fixture(name)], &settings);
        for part in parts {
            assert!(message.contains(part), "{name}: expected `{part}` in: {message}");
        }
    }
    let named = value(
        &[fixture("meaningless_names.nc")],
        45.5,
        -31.0,
        &at(4.0),
        "eastward_wind",
        &["eastward=a", "northward=b"],
    );
    assert!((named + 4.316).abs() < 1e-9);
    assert!(value(&[fixture("no_units.nc")], 45.5, -31.0, &at(4.0), "eastward_wind", &["units=m/s"]).is_finite());
    let error = wind_options_from(&["unit=m/s".to_owned()]).unwrap_err().to_string();
    assert!(error.contains("unknown key `unit`, did you mean `units`?"), "{error}");
}

#[test]
fn files_that_are_something_else_are_named() {
    let folder = tempfile::tempdir().unwrap();
    for (bytes, words) in [
        (&b""[..], "an empty file"),
        (b"<!DOCTYPE html><html>", "an HTML page"),
        (b"PK\x03\x04aaaa", "a ZIP archive"),
        (b"GRIB....", "GRIB"),
        (b"\x1f\x8b\x08\x00", "gzip"),
        (b"time,u,v\n", "plain text"),
        (b"CDF\x01", "damaged or cut short"),
        (b"CDF\x07aaaa", "unknown version"),
    ] {
        let path = folder.path().join("wind.nc");
        std::fs::write(&path, bytes).unwrap();
        let error = open_wind(SourceId("m".into()), std::slice::from_ref(&path), &WindOptions::default())
            .unwrap_err()
            .to_string();
        assert!(error.contains(words) && error.contains("wind.nc"), "{error}");
    }
    let error = open_wind(SourceId("m".into()), &[folder.path().to_owned()], &WindOptions::default()).unwrap_err();
    assert!(error.to_string().contains("a folder"), "{error}");
}

/// A truncated file never gives a number that the whole file does not give.
#[test]
fn truncated_files_are_refused_or_right() {
    let folder = tempfile::tempdir().unwrap();
    let mut refused = 0;
    for name in
        ["classic.nc", "offset64.nc", "cdf5.nc", "contiguous.nc", "deflate_shuffle_checksum.nc", "deflate_plain.nc"]
    {
        let bytes = std::fs::read(fixture(name)).unwrap();
        let whole = series(&[fixture(name)], 45.3, -31.2);
        for part in 1..20 {
            let path = folder.path().join(name);
            std::fs::write(&path, &bytes[..bytes.len() * part / 20]).unwrap();
            let Ok(source) = open_wind(SourceId("model".into()), &[path], &WindOptions::default()) else {
                refused += 1;
                continue;
            };
            match sample_wind(&source, &[site(45.3, -31.2)], None, &SpatialRule::default(), &Silent) {
                Err(_) => refused += 1,
                Ok(read) => assert_eq!(read[0], whole, "{name} cut to {part}/20"),
            }
        }
    }
    assert!(refused > 100, "{refused}");
}

#[test]
fn a_flipped_byte_under_a_checksum_is_found() {
    let folder = tempfile::tempdir().unwrap();
    let mut bytes = std::fs::read(fixture("deflate_shuffle_checksum.nc")).unwrap();
    let path = folder.path().join("flipped.nc");
    let whole = series(&[fixture("deflate_shuffle_checksum.nc")], 45.3, -31.2);
    let mut found = 0;
    for at in (4000..bytes.len()).step_by(97) {
        bytes[at] ^= 0x10;
        std::fs::write(&path, &bytes).unwrap();
        bytes[at] ^= 0x10;
        let read = open_wind(SourceId("model".into()), std::slice::from_ref(&path), &WindOptions::default())
            .and_then(|source| sample_wind(&source, &[site(45.3, -31.2)], None, &SpatialRule::default(), &Silent));
        match read {
            Err(_) => found += 1,
            // A byte that the values do not depend on, or metadata that still makes sense as a coordinate or attribute.
            Ok(read) if read[0] == whole => {}
            Ok(read) => {
                // The index of the chunks has no checksum: a chunk may be lost, never changed.
                let pairs = read[0].eastward_m_s.iter().zip(&whole.eastward_m_s);
                let changed = pairs.filter(|(a, b)| a.is_finite() && a.to_bits() != b.to_bits()).count();
                assert!(
                    changed == 0 || changed == whole.steps.len(),
                    "one value changed silently at byte {at}: {changed}"
                );
            }
        }
    }
    assert!(found > 20, "{found}");
}

#[test]
fn outside_the_grid_and_the_time_is_missing_with_the_limits() {
    let file = [fixture("classic.nc")];
    let outside = ask(&file, 47.0, -31.0, &at(3.0), "wind_speed", &[]).unwrap();
    assert_eq!((outside.status, outside.value), ("missing", None));
    assert!(
        outside
            .message
            .unwrap()
            .contains("the grid runs from 44.5 to 46 degrees north and from -32 to -30 degrees east")
    );
    let late = ask(&file, 45.0, -31.0, &at(29.5), "wind_speed", &[]).unwrap();
    assert!(late.message.unwrap().contains("the field runs from 2031-01-10T00:00:00Z to 2031-01-11T05:00:00Z"));
    assert!(ask(&file, 95.0, -31.0, &at(3.0), "wind_speed", &[]).is_err());
}

#[test]
fn the_look_up_prints_json_that_says_what_was_used() {
    let run = underwind(
        &fixture(""),
        &[
            "sample",
            "wind",
            "classic.nc",
            "--latitude",
            "45.5",
            "--longitude",
            "-31",
            "--time",
            "2031-01-10T04:00",
            "--quantity",
            "eastward_wind",
            "--json",
        ],
    )
    .succeeds();
    let answer: serde_json::Value = serde_json::from_str(&run.stdout).unwrap();
    assert_eq!((answer["status"].as_str(), answer["unit"].as_str()), (Some("ok"), Some("m s-1")));
    assert!((answer["value"].as_f64().unwrap() + 4.316).abs() < 1e-9);
    assert_eq!(answer["inputs"]["nodes"][0]["weight"], 1.0);
    let refused = underwind(
        &fixture(""),
        &["sample", "wind", "months.nc", "--latitude", "45", "--longitude", "-31", "--time", "2031-01-10", "--json"],
    );
    assert_eq!(refused.status, 4);
    assert!(refused.stdout.starts_with("{\"status\":\"refused\""), "{}", refused.stdout);
}
