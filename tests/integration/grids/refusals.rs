//! What cannot be right is refused in one line: file, variable, what was found, what was expected, which key helps.

use super::support::{ODD_NAME, ask, at, fixture, open, sample, without_folder};

/// The refusal of a file, whether it comes from the header or from the data.
fn refusal(names: &[&str], settings: &[&str]) -> String {
    let files: Vec<_> = names.iter().map(|name| fixture(name)).collect();
    let error = match open(&files, settings) {
        Err(error) => error.to_string(),
        Ok(_) => ask(&files, 45.0, 229.0, &at(1.0), "eastward_wind", settings).expect_err("a refusal").to_string(),
    };
    assert!(!error.contains('\n'), "one line: {error}");
    without_folder(&error)
}

const UNITS_HINT: &str = "expected such as \"hours since 1900-01-01 00:00:00\" (set `wind.time_units`)";

#[test]
fn what_cannot_be_right_is_refused_in_one_line() {
    let rotated = "it lies on a grid about a rotated pole without latitude and longitude of its nodes; expected both as variables of two dimensions (add them, or regrid it first)";
    let one_of = |variable: &str, problem: &str| format!("variable `{variable}`: {problem}");
    for (names, settings, message) in [
        (
            &["g13_words.nc"][..],
            &[][..],
            one_of("u10", "its attribute `scale_factor` is the text \"one hundredth\"; expected a number"),
        ),
        (
            &["g13_two.nc"],
            &[],
            one_of("u10", "its attribute `scale_factor` is [0.01, 0.02]; expected one finite number"),
        ),
        (
            &["t03_unknown.nc"],
            &[],
            one_of(
                "time",
                &format!(
                    "its units are \"hours since 2031-01-10 00:00:00 CEST\": the time zone \"cest\" is not known; {UNITS_HINT}"
                ),
            ),
        ),
        (
            &["t05_360_february.nc"],
            &[],
            one_of("time", "step 1 is 2031-02-29 in the calendar 360_day, a date that does not exist in reality"),
        ),
        (
            &["t05_unknown.nc"],
            &[],
            one_of("time", "its calendar is \"maya\", which is not known (set `wind.calendar` to the right one)"),
        ),
        (
            &["t06_none.nc"],
            &[],
            one_of("time", "it has no units; expected such as \"hours since 1900-01-01\" (set `wind.time_units`)"),
        ),
        (
            &["t06_months.nc"],
            &[],
            one_of(
                "time",
                &format!("its units are \"months since 2031-01-01\": \"months\" have no fixed length; {UNITS_HINT}"),
            ),
        ),
        (
            &["t06_pattern.nc"],
            &[],
            one_of("time", &format!("its units are \"day as %Y%m%d.%f\": there is no \"since\"; {UNITS_HINT}")),
        ),
        (
            &["t06_words.nc"],
            &[],
            one_of(
                "time",
                &format!(
                    "its units are \"hours since the beginning\": \"the beginning\" is no reference date; {UNITS_HINT}"
                ),
            ),
        ),
        (
            &["t06_impossible.nc"],
            &[],
            one_of(
                "time",
                &format!(
                    "its units are \"hours since 2031-02-30\": the reference date 2031-02-30 does not exist in the calendar standard; {UNITS_HINT}"
                ),
            ),
        ),
        (
            &["t07_conflict.nc"],
            &[],
            one_of(
                "u10",
                "the step 2031-01-10T01:00:00Z is there twice with different values (2 and 3); expected one value",
            ),
        ),
        (&["t09_none.nc"], &[], one_of("u10", "it has no step: its time `time` has length zero")),
        (
            &["t11_overlapping.nc"],
            &[],
            one_of(
                "u10",
                "it is a forecast with 2 lead times along `step`, whose valid times overlap; choose one lead time a valid time first",
            ),
        ),
        (
            &["t11_lead_6.nc"],
            &[],
            one_of(
                "u10",
                "it is a forecast of lead time 6 (`step`), so that its times may be those of the forecast's start; set `wind.time` to the variable of valid times",
            ),
        ),
        (
            &["t11_reference_time.nc"],
            &[],
            one_of(
                "u10",
                "its time `time` is when forecasts start, not when they are valid (set `wind.time` to the variable of valid times)",
            ),
        ),
        (
            &["t11_initial.nc"],
            &[],
            one_of(
                "u10",
                "its time `time` is when forecasts start, not when they are valid (set `wind.time` to the variable of valid times)",
            ),
        ),
        (
            &["t11_named.nc"],
            &[],
            one_of(
                "u10",
                "it is a forecast with 4 lead times along `step`, whose valid times overlap; choose one lead time a valid time first",
            ),
        ),
        (&["d02_members.nc"], &[], one_of("uwind", "it has 3 ensemble members (0 to 2); set `wind.member`")),
        (
            &["d02_members.nc"],
            &["member=7"],
            one_of("uwind", "it has no member 7; members are [0.0, 1.0, 2.0] (`wind.member`)"),
        ),
        (
            &["d02_heights_without_10.nc"],
            &[],
            one_of("uwind", "it has the heights [2.0, 50.0] m, none of them 10 m (set `wind.height_m`)"),
        ),
        (
            &["d02_unknown.nc"],
            &[],
            one_of(
                "uwind",
                "its dimension `scenario` has 2 values and is neither time, latitude nor longitude (set `wind.time`, `wind.latitude` or `wind.longitude`, or select one of them first)",
            ),
        ),
        (
            &["d04_unsaid.nc"],
            &[],
            one_of(
                "wdir",
                "nothing says whether it is where the wind comes from or goes to (set `wind.direction_sense` to \"from\" or \"to\")",
            ),
        ),
        (
            &["d05_kelvin.nc"],
            &[],
            one_of("u10", "it is in `K`; expected a speed such as m s-1, knots or km/h (set `wind.units` to override)"),
        ),
        (
            &["d05_metre_seconds.nc"],
            &[],
            one_of(
                "u10",
                "it is in `m s`; expected a speed such as m s-1, knots or km/h (set `wind.units` to override)",
            ),
        ),
        (&["d05_none.nc"], &[], one_of("u10", "it has no units; expected a speed such as m s-1 (set `wind.units`)")),
        (&["d06_rotated_unmapped.nc"], &[], one_of("u10", rotated)),
        (
            &["d06_projected.nc"],
            &[],
            one_of(
                "u10",
                "it lies on a grid in a map projection without latitude and longitude of its nodes; expected both as variables of two dimensions (add them, or regrid it first)",
            ),
        ),
        (&["d06_radians.nc"], &[], one_of("u10", "its latitude `lat` is in radians; expected degrees")),
        (
            &["d03_heights.nc"],
            &["eastward=u10", "northward=v10", "height_m=100"],
            one_of("u10", "it is at 10 m, but `wind.height_m` asks for 100 m"),
        ),
    ] {
        assert_eq!(refusal(names, settings), format!("{}: {message}", names[0]));
    }
}

#[test]
fn files_that_do_not_fit_together_are_refused_by_name() {
    for (names, message) in [
        (
            &["t10_a.nc", "t10_conflict.nc"][..],
            "t10_conflict.nc: variable `u10` is 3.5 at the step 2031-01-10T02:00:00Z, where another file has 3; expected one value (leave one of the files out) (compared with t10_a.nc)",
        ),
        (
            &["t10_a.nc", "t10_grid.nc"],
            "t10_grid.nc: variable `u10` lies on another grid: 2 x 2 nodes from 44 to 46 degrees north and 229 to 231 degrees east; expected 2 x 2 nodes from 44 to 46 degrees north and 228 to 230 degrees east (compared with t10_a.nc)",
        ),
        (
            &["t10_a.nc", "t10_other_names.nc"],
            "t10_other_names.nc: no variable is recognised as a wind like that of the other files; candidates are a, b; set `wind.files` to leave it out, or `wind.eastward`",
        ),
    ] {
        assert_eq!(refusal(names, &[]), message);
    }
}

#[test]
fn a_wind_that_is_not_found_names_the_candidates() {
    let keys = "set `wind.eastward` and `wind.northward`, or `wind.speed`";
    for (name, candidates) in
        [("d03_current.nc", "u, v"), ("f03_groups.nc", "none (variables in the groups surface are not read)")]
    {
        assert_eq!(
            refusal(&[name], &[]),
            format!(
                "{name}: no variable is recognised as a wind (components towards east and north, or speed); candidates are {candidates}; {keys}"
            )
        );
    }
    assert_eq!(
        refusal(&["d03_heights.nc"], &["height_m=50"]),
        "d03_heights.nc: no variable is recognised as the eastward wind; candidates are u10, u100; set `wind.eastward`"
    );
}

#[test]
fn storage_that_cannot_be_believed_is_refused() {
    for (name, message) in [
        (
            "f02_lzf.nc",
            "f02_lzf.nc: variable `u10` is packed with the filter lzf (32000); only shuffle, deflate and fletcher32 are understood (repack the file)",
        ),
        (
            "f04_plain_hdf5.nc",
            "f04_plain_hdf5.nc: variable `u10`: it has no units; expected a speed such as m s-1 (set `wind.units`)",
        ),
        (
            "f06_false_count.nc",
            "f06_false_count.nc: damaged or cut short: variable `time` ends at byte 10000000470, but the file has 588 bytes",
        ),
    ] {
        assert_eq!(refusal(&[name], &[]), message);
    }
    let plain = refusal(&["f04_plain_hdf5.nc"], &["units=m/s"]);
    assert!(
        plain.starts_with("f04_plain_hdf5.nc: variable `u10`: its dimension `phony_dim_0` has 3 values"),
        "{plain}"
    );
}

// Values are (100 k + 10 i) x 0.01 m/s by construction; netcdf-c 4.10.1 reads them so.
#[test]
fn a_record_variable_alone_has_no_padding() {
    let source = open(&[fixture("f06_one_record_variable.nc")], &["time=times"]).unwrap();
    let series = sample(&source, 45.0, 229.0);
    for (k, speed) in series.scalar_speed_m_s.iter().enumerate() {
        assert!((speed - (k as f64 + 0.1)).abs() < 1e-12, "{:?}", series.scalar_speed_m_s);
    }
    assert_eq!(series.steps.len(), 5);
}

#[test]
fn impossible_places_are_refused_and_outside_is_explained() {
    let file = [fixture("g01_east.nc")];
    for (latitude, longitude, message) in [
        (95.0, 230.0, "latitude is 95, expected -90 to 90 degrees north (are latitude 95 and longitude 230 swapped?)"),
        (
            f64::NAN,
            230.0,
            "latitude is NaN, expected -90 to 90 degrees north (are latitude NaN and longitude 230 swapped?)",
        ),
        (45.0, 540.0, "longitude is 540, expected -180 to 360 degrees east"),
    ] {
        assert_eq!(ask(&file, latitude, longitude, &at(1.0), "wind_speed", &[]).unwrap_err().to_string(), message);
    }
    let outside = ask(&file, 45.0, -100.0, &at(1.0), "wind_speed", &[]).unwrap();
    assert_eq!(
        outside.message.unwrap(),
        "the site lies outside the grid: the grid runs from 44 to 46 degrees north and from 228 to 234 degrees east"
    );
    let late = ask(&file, 45.0, 230.0, &at(3.5), "wind_speed", &[]).unwrap();
    assert_eq!(
        late.message.unwrap(),
        "the time lies before the first or after the last step of the field: the field runs from 2031-01-10T00:00:00Z to 2031-01-10T03:00:00Z"
    );
    let gap = ask(&[fixture("t08_gap.nc")], 45.0, 229.0, &at(8.0), "wind_speed", &[]).unwrap();
    assert_eq!(
        gap.message.unwrap(),
        "the field has a gap in time longer than the limit (`max_gap_h`): from 2031-01-10T02:00:00Z to 2031-01-10T14:00:00Z; the limit is 2 h"
    );
    let one = ask(&[fixture("d06_one_node.nc")], 45.1, 229.0, &at(1.0), "wind_speed", &[]).unwrap();
    assert!(one.message.unwrap().ends_with("(`match.spatial = \"nearest\"`)"));
}

#[test]
fn names_of_files_are_not_read_as_addresses() {
    // The C library takes parts of a name for an address; it must not.
    let name = fixture("f01_odd_name.nc");
    assert!(name.ends_with(ODD_NAME));
    assert_eq!(sample(&open(&[name], &[]).unwrap(), 45.0, 229.0).eastward_m_s, [1.0, 2.0, 3.0]);
}
