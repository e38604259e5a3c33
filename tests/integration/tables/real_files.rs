//! Real open files, where the folder is there; facts read with pandas (see the notes beside the files).

use super::support::{real_data, rows_of, stated};
use underwind::io::levels::LevelOptions;
use underwind::io::wind_table::{WindTableOptions, read_wind_table};
use underwind::model::BandScheme;
use underwind::units::Instant;

#[test]
fn the_hourly_octave_band_record() {
    let Some(folder) = real_data() else { return };
    let path = folder.join("SanctSound_CI01_01_OL_1h.csv");
    let options = LevelOptions {
        site: Some("CI01".to_owned()),
        bands: Some(BandScheme::Octave),
        window_s: Some(3600.0),
        ..stated()
    };
    let (rows, mut table) = rows_of(&path, &options).unwrap();
    assert_eq!(table.names().bands.len(), 11);
    assert_eq!(rows.len(), 2671 * 11);
    assert_eq!(rows[0].window.start.iso(), "2018-10-31T21:00:02Z");
    assert_eq!(rows[rows.len() - 1].window.start.iso(), "2019-02-20T16:00:00Z");
    assert_eq!(rows[rows.len() - 1].row, 2672);
    let noon = Instant::parse("2018-12-12T17:00:00Z").unwrap();
    let levels: Vec<f64> = rows.iter().filter(|row| row.window.start == noon).map(|row| row.level_db).collect();
    let expected = [
        86.638_776,
        82.855_185,
        83.702_572,
        85.199_52,
        88.389_875,
        92.459_135,
        99.826_243,
        108.313_093,
        110.369_587,
        107.533_782,
        104.374_355,
    ];
    assert_eq!(levels, expected);
    let survey = table.survey().unwrap();
    assert_eq!((survey.samples, survey.usable), (29_381, 29_381));
    let (low, high) = survey.range_db.unwrap();
    assert!((low - 31.154_56).abs() < 1e-9 && high >= 137.170_01);
    // Column medians of the first and last band.
    for (band, median) in [(0, 94.164_939), (10, 105.929_549)] {
        let mut levels: Vec<f64> = rows.iter().filter(|row| row.band == band).map(|row| row.level_db).collect();
        levels.sort_by(f64::total_cmp);
        assert!((levels[levels.len() / 2] - median).abs() < 1e-9, "{band}");
    }
}

#[test]
fn the_hourly_sea_point_winds() {
    let Some(folder) = real_data() else { return };
    let path = folder.join("nora3_wind_point_202101.csv");
    let options = WindTableOptions { height_m: Some(10.0), ..WindTableOptions::default() };
    let table = read_wind_table(std::slice::from_ref(&path), &options).unwrap();
    assert_eq!(table.steps.len(), 744);
    for (time, speed, from_deg) in [
        ("2021-01-01T00:00:00Z", 7.87, 301.8),
        ("2021-01-15T13:00:00Z", 1.58, 310.9),
        ("2021-01-31T23:00:00Z", 10.22, 98.8_f64),
    ] {
        let at = table.steps.binary_search(&Instant::parse(time).unwrap()).unwrap();
        assert!((table.speed_m_s[at] - speed).abs() < 1e-12);
        assert!((table.eastward_m_s[at] + speed * from_deg.to_radians().sin()).abs() < 1e-9, "{time}");
        assert!((table.northward_m_s[at] + speed * from_deg.to_radians().cos()).abs() < 1e-9, "{time}");
    }
    let (low, high) = table.speed_m_s.iter().fold((f64::MAX, f64::MIN), |(low, high), v| (low.min(*v), high.max(*v)));
    // pandas 3.1: min 0.24, max 19.81.
    assert!((low - 0.24).abs() < 1e-12 && (high - 19.81).abs() < 1e-12, "{low} {high}");
    assert!(
        table.notes.contains(&"times without zone are taken as UTC (set `wind.time_zone` if they are not)".to_owned())
    );
    let error = read_wind_table(std::slice::from_ref(&path), &WindTableOptions::default()).unwrap_err().to_string();
    assert!(
        error.ends_with("to use is not stated; set `wind.height_m` to one of their heights (or name the column)"),
        "{error}"
    );
}

#[test]
fn the_buoy_with_two_header_lines_newest_first() {
    let Some(folder) = real_data() else { return };
    let path = folder.join("ndbc_44013.txt");
    let options = WindTableOptions {
        height_m: Some(4.0),
        direction_sense: Some("from".to_owned()),
        ..WindTableOptions::default()
    };
    let table = read_wind_table(std::slice::from_ref(&path), &options).unwrap();
    assert!(table.steps.windows(2).all(|pair| pair[0] < pair[1]));
    assert_eq!(table.missing.iter().filter(|why| why.is_some()).count(), 7, "seven rows lack wind");
    for (time, speed, from_deg) in [("2022-04-28T02:50:00Z", 13.0, 300.0_f64), ("2022-05-08T12:50:00Z", 10.0, 50.0)] {
        let at = table.steps.binary_search(&Instant::parse(time).unwrap()).unwrap();
        assert!((table.speed_m_s[at] - speed).abs() < 1e-12, "{time}");
        assert!((table.eastward_m_s[at] + speed * from_deg.to_radians().sin()).abs() < 1e-9, "{time}");
    }
    assert!(table.notes.contains(&"the rows are not in order of time; they were sorted".to_owned()));
}
