//! Files of others: the reference set and real files, where they are there.

use super::support::{ask, ask_by, open, rows, sample, steps, value};
use crate::support::shared;
use underwind::io::netcdf::WindKind;
use underwind::model::{CoastRule, FieldSource, Flag, SpatialRule};

/// How far a value may be from the reference, m/s.
const AGREED_M_S: f64 = 1e-6;

fn close(found: f64, expected: f64) {
    assert!((found - expected).abs() < AGREED_M_S, "{found} for {expected}");
}

// Reference: scipy 1.17 and a hand-written loop (bench/tiny_reference/summary.json), zero-weight corners ignored.
#[test]
fn all_points_of_the_reference_set_agree() {
    let Some(folder) = shared("bench") else { return };
    let folder = folder.join("tiny_reference");
    let file = [folder.join("wind.nc")];
    let (mut points, mut missing, mut scaled) = (0, [0; 2], 0);
    for row in rows(&folder.join("reference_wind.csv")) {
        let number = |name: &str| row[name].parse::<f64>().ok().filter(|value| value.is_finite());
        let (latitude, longitude) = (number("lat").unwrap(), number("lon").unwrap());
        for (k, (rule, suffix)) in
            [(CoastRule::Missing, ""), (CoastRule::Renormalise, "_renorm")].into_iter().enumerate()
        {
            for (quantity, column) in [("eastward_wind", "u10"), ("northward_wind", "v10")] {
                let rule = SpatialRule::Bilinear(rule);
                let answer = ask_by(&file, latitude, longitude, &row["time"], quantity, &[], rule).unwrap();
                match number(&format!("{column}{suffix}")) {
                    Some(expected) => {
                        close(answer.value.unwrap_or_else(|| panic!("{row:?}: {answer:?}")), expected);
                        // A value that was scaled says so, and only such a value.
                        let flagged = answer.flags.contains(&Flag::CoastRenormalised.name());
                        assert_eq!(flagged, number(column).is_none(), "{row:?}: {answer:?}");
                        scaled += usize::from(flagged);
                    }
                    None => {
                        assert_eq!((answer.status, answer.value), ("missing", None), "{row:?}");
                        missing[k] += 1;
                    }
                }
            }
        }
        let speed = ask(&file, latitude, longitude, &row["time"], "wind_speed", &[]).unwrap();
        let from = ask(&file, latitude, longitude, &row["time"], "wind_from_direction", &[]).unwrap();
        match (number("wind_speed"), number("wind_from_deg")) {
            (Some(expected), Some(degrees)) => {
                close(speed.value.unwrap(), expected);
                // The table holds nine digits, and a slow wind turns much for a small change.
                let apart = (from.value.unwrap() - degrees + 540.0).rem_euclid(360.0) - 180.0;
                assert!(apart.abs() < 1e-4, "{row:?}: {from:?}");
            }
            _ => assert_eq!((speed.value, from.value), (None, None), "{row:?}"),
        }
        points += 1;
    }
    // summary.json: 205 points, 46 missing by the loop, 29 with renormalised weights; two components each.
    assert_eq!((points, missing, scaled), (205, [92, 58], 34));
}

#[test]
fn the_seam_of_the_reference_set_agrees() {
    let Some(folder) = shared("bench") else { return };
    let folder = folder.join("tiny_reference");
    let mut points = 0;
    for row in rows(&folder.join("reference_seam.csv")) {
        let number = |name: &str| row[name].parse::<f64>().unwrap();
        // 540 degrees is no longitude that a user may give; the axis takes it.
        let longitude = if number("lon") > 360.0 { number("lon") - 360.0 } else { number("lon") };
        for (quantity, column) in [("eastward_wind", "u10"), ("northward_wind", "v10")] {
            let found = value(&[folder.join(&row["file"])], number("lat"), longitude, &row["time"], quantity, &[]);
            close(found, number(column));
        }
        points += 1;
    }
    assert_eq!(points, 24);
}

// Facts of real files (DATA.md beside them), read there with netCDF4 1.7.5 and xarray 2026.9.

#[test]
fn a_packed_reanalysis_year_gives_its_facts() {
    let Some(folder) = shared("data") else { return };
    let year = [folder.join("era5_hourly_2017_packed.nc")];
    close(value(&year, 52.47, 13.20, "2017-03-01T05:40:00Z", "eastward_wind", &[]), 3.043_320_692_1);
    close(value(&year, 52.47, 13.20, "2017-03-01T05:40:00Z", "northward_wind", &[]), 3.010_611_247_9);
    let source = open(&year, &[]).unwrap();
    // The file has winds at 100 m too: those at 10 m are taken.
    assert_eq!(source.variables(), ["eastward wind (`u10`)", "northward wind (`v10`)"]);
    assert_eq!(source.meta().height_m, Some(10.0));
    assert_eq!((source.kind(), source.usual_step_ms()), (WindKind::Components, 3_600_000));
    let known = steps(&source);
    assert_eq!(known.len(), 8760);
    assert_eq!((known[0].as_str(), known[8759].as_str()), ("2017-01-01T00:00:00Z", "2017-12-31T23:00:00Z"));
    // The grid is in single precision: 52.35 is stored as 52.349998.
    let (rows, columns) = ([52.6_f32, 52.35].map(f64::from), [13.1_f32, 13.35, 13.6].map(f64::from));
    let mut fastest = 0.0_f64;
    for (k, row, column, u, v) in [
        (0, 0, 0, 3.014_110_196_277_608_5, 2.856_074_141_533_421),
        (4000, 1, 2, 4.592_626_522_089_181, -1.455_022_786_582_709_7),
        (8759, 0, 1, 3.976_949_214_273_160_4, 5.019_826_405_644_991),
    ] {
        let series = sample(&source, rows[row], columns[column]);
        close(series.eastward_m_s[k], u);
        close(series.northward_m_s[k], v);
    }
    for row in rows {
        for column in columns {
            let series = sample(&source, row, column);
            assert!(series.missing.iter().all(Option::is_none));
            fastest = series.scalar_speed_m_s.iter().copied().fold(fastest, f64::max);
        }
    }
    close(fastest, 13.292_795_877_824_785);
    // A wind at 100 m when it is asked for, and none at 50 m.
    assert_eq!(open(&year, &["height_m=100"]).unwrap().variables()[0], "eastward wind (`u100`)");
    let refused = open(&year, &["height_m=50"]).unwrap_err().to_string();
    assert!(refused.contains("candidates are u100, u10; set `wind.eastward`"), "{refused}");
}

#[test]
fn two_files_whose_metadata_lack_units_are_read_with_the_studys_keys() {
    let Some(folder) = shared("data") else { return };
    let storm = [folder.join("storm_u.cdf"), folder.join("storm_v.cdf")];
    let keys = ["time_units=hours since 1996-01-05 00:00", "units=m/s"];
    let source = open(&storm, &keys).unwrap();
    let known = steps(&source);
    assert_eq!(known.len(), 64);
    assert_eq!((known[0].as_str(), known[63].as_str()), ("1996-01-05T00:00:00Z", "1996-01-20T18:00:00Z"));
    for (latitude, longitude, k, u, v) in [
        (45.0, -77.5, 20, 4.911_796_569_824_219, -3.926_256_179_809_570_3),
        (32.5, 295.0 - 360.0, 40, 3.938_348_770_141_601_6, -2.705_232_620_239_258),
        (41.25, -70.0, 58, -1.180_686_950_683_593_8, 30.390_335_083_007_812),
    ] {
        let series = sample(&source, latitude, longitude);
        close(series.eastward_m_s[k], u);
        close(series.northward_m_s[k], v);
        // Steps 17 and 37 of the northward file are masked throughout: no speed from one component.
        assert!(series.missing[17].is_some() && series.missing[37].is_some());
        assert_eq!(series.missing.iter().filter(|why| why.is_some()).count(), 2);
    }
    let refused = open(&storm, &keys[1..]).unwrap_err().to_string();
    assert!(
        refused.ends_with(
            "storm_u.cdf: variable `timestep`: it has no units; expected such as \"hours since 1900-01-01\" (set `wind.time_units`)"
        ),
        "{refused}"
    );
    let refused = open(&storm, &keys[..1]).unwrap_err().to_string();
    assert!(
        refused
            .ends_with("storm_u.cdf: variable `u`: it has no units; expected a speed such as m s-1 (set `wind.units`)"),
        "{refused}"
    );
    // One file alone has one component.
    let refused = open(&storm[..1], &keys).unwrap_err().to_string();
    assert!(refused.contains("candidates are"), "{refused}");
}

#[test]
fn monthly_means_across_the_seam_are_flagged() {
    let Some(folder) = shared("data") else { return };
    let monthly = [folder.join("cmip5_uas_monthly.nc"), folder.join("cmip5_vas_monthly.nc")];
    let answer = ask(&monthly, 40.102_977_752_685_55, 359.0625, "2005-01-16T12:00:00Z", "eastward_wind", &[]).unwrap();
    close(answer.value.unwrap(), 0.623_771_667_5);
    assert_eq!((answer.status, &answer.flags[..]), ("flagged", &[Flag::AveragedField.name()][..]));
    let source = open(&monthly, &[]).unwrap();
    let grid = &source.meta().grid;
    assert!(grid.is_periodic());
    assert_eq!((grid.size().0, grid.size().1, source.meta().steps.len()), (96, 192, 12));
    for (k, row, column, u, v) in [
        (0, 48, 0, 0.730_949_401_855_468_8, -2.848_933_219_909_668),
        (6, 10, 100, -1.940_889_358_520_507_8, -0.805_522_918_701_171_9),
        (11, 90, 191, -1.927_611_351_013_183_6, -1.252_449_035_644_531_2),
    ] {
        let (latitude, longitude) = grid.place(underwind::model::NodeId { row, column }).unwrap();
        let series = sample(&source, latitude, longitude);
        close(series.eastward_m_s[k], u);
        close(series.northward_m_s[k], v);
    }
}

#[test]
fn a_climatology_of_year_zero_with_longitudes_to_379() {
    let Some(folder) = shared("data") else { return };
    let climatology = [folder.join("coads_wind_climatology.nc")];
    let source = open(&climatology, &[]).unwrap();
    // The mixed calendar has no year zero, the proleptic one has: 366 h after 0000-01-01 is 16 January 06:00. The reader
    // is told that such years stand for no date.
    let known = steps(&source);
    assert_eq!((known.len(), known[0].as_str()), (12, "0000-01-16T06:00:00Z"));
    assert!(source.warnings().iter().any(|note| note.contains("year 0: a climatology")), "{:?}", source.warnings());
    for (k, latitude, longitude, u, v, speed) in [
        (0, 31.0, 181.0, 5.353_182, -0.659_318_15, 10.559_091),
        (6, -49.0, 221.0, -1.474_999_7, 7.575, 12.45),
        (11, 45.0, 161.0, 5.711_219_3, -0.779_512_17, 11.802_683),
    ] {
        for turned in [longitude, longitude - 360.0] {
            if turned < -180.0 {
                continue;
            }
            let series = sample(&source, latitude, turned);
            close(series.eastward_m_s[k], u);
            close(series.northward_m_s[k], v);
            // The speed of the mean vector is not the mean speed, which the file has beside it.
            close(series.scalar_speed_m_s[k], u.hypot(v));
            let mean = sample(&open(&climatology, &["speed=WSPD"]).unwrap(), latitude, turned);
            close(mean.scalar_speed_m_s[k], speed);
        }
    }
    let vector = sample(&source, 31.0, 181.0).scalar_speed_m_s[0];
    assert!((vector - 5.394).abs() < 5e-4, "{vector}");
}

// The northward wind is not in this file: its one component is read as if it were a speed.
#[test]
fn texts_along_time_do_not_stand_in_the_way() {
    let Some(folder) = shared("data") else { return };
    let file = [folder.join("vlstr_type.nc")];
    let source = open(&file, &["speed=wind"]).unwrap();
    let known = steps(&source);
    assert_eq!((known.len(), known[149].as_str()), (150, "1970-01-07T05:00:00Z"));
    let series = sample(&source, 50.0, 10.0);
    assert!(series.scalar_speed_m_s.iter().all(|speed| (speed - 1.0).abs() < 1e-12));
    let refused = open(&file, &[]).unwrap_err().to_string();
    assert!(
        refused.ends_with("candidates are wind; set `wind.eastward` and `wind.northward`, or `wind.speed`"),
        "{refused}"
    );
}

#[test]
fn a_malformed_header_is_an_error() {
    let Some(folder) = shared("data") else { return };
    let refused = open(&[folder.join("bad_cdf5_begin.nc")], &[]).unwrap_err().to_string();
    assert!(refused.contains("bad_cdf5_begin.nc: damaged or cut short: variable"), "{refused}");
}
