//! Wind from tables: hazards D4, D5, T7.

use super::support::{scratch, short};
use underwind::io::wind_table::{WindTable, WindTableError, WindTableOptions, read_wind_table};
use underwind::model::{Missing, SourceId};

fn read(content: &str, options: &WindTableOptions) -> Result<WindTable, WindTableError> {
    let file = scratch("wind.csv", content);
    read_wind_table(&[file.path], options)
}

fn refusal(content: &str, options: &WindTableOptions) -> String {
    let file = scratch("wind.csv", content);
    short(&read_wind_table(std::slice::from_ref(&file.path), options).unwrap_err().to_string(), &file)
}

fn at_10_m() -> WindTableOptions {
    WindTableOptions { height_m: Some(10.0), ..WindTableOptions::default() }
}

#[test]
fn speed_and_direction_become_components() {
    let table = read("time,wind_speed_m_s,wind_from_direction_deg\n2031-01-01T00:00:00Z,10,270\n2031-01-01T01:00:00Z,5,180\n2031-01-01T02:00:00Z,0,\n", &at_10_m()).unwrap();
    // A wind from 270 blows towards east, from 180 towards north (WMO-No. 8 convention).
    let expected = [(10.0, 0.0), (0.0, 5.0), (0.0, 0.0)];
    for (index, (east, north)) in expected.iter().enumerate() {
        assert!((table.eastward_m_s[index] - east).abs() < 1e-12, "{index}");
        assert!((table.northward_m_s[index] - north).abs() < 1e-12, "{index}");
    }
    assert_eq!(table.missing, [None, None, None]);
    let series = table.series(&SourceId("buoy".to_owned()), "A", 3_600_000);
    assert!(series.has_components());
    assert_eq!((series.scalar_speed_m_s.clone(), series.height_m), (vec![10.0, 5.0, 0.0], Some(10.0)));
}

#[test]
fn a_direction_to_is_turned_and_knots_are_converted() {
    let options =
        WindTableOptions { units: Some("knots".to_owned()), direction_sense: Some("to".to_owned()), ..at_10_m() };
    let table = read("time,wspd,wdir\n2031-01-01T00:00:00Z,36,90\n", &options).unwrap();
    // 36 kn = 36 x 1852 / 3600 m/s = 18.52 m/s, exactly.
    assert!((table.eastward_m_s[0] - 18.52).abs() < 1e-12 && table.northward_m_s[0].abs() < 1e-12);
}

#[test]
fn speed_alone_has_no_components_and_is_no_fault() {
    let table = read("time,wind_speed_m_s\n2031-01-01T00:00:00Z,10\n2031-01-01T01:00:00Z,\n", &at_10_m()).unwrap();
    assert!(table.eastward_m_s.iter().all(|value| value.is_nan()));
    assert_eq!(table.missing, [None, Some(Missing::NoValue)]);
    assert!(table.notes.contains(&"the table has no wind direction; components are missing".to_owned()));
}

#[test]
fn components_give_the_speed() {
    let table = read(
        "time,u10,v10\n2031-01-01T00:00:00Z,3,4\n2031-01-01T01:00:00Z,3,\n",
        &WindTableOptions { units: Some("m/s".to_owned()), ..at_10_m() },
    )
    .unwrap();
    assert!((table.speed_m_s[0] - 5.0).abs() < 1e-12);
    assert!(table.eastward_m_s[1].is_nan() && table.speed_m_s[1].is_nan());
    assert_eq!(table.missing[1], Some(Missing::NoValue));
}

#[test]
fn order_and_repeats() {
    let text = "time,wind_speed_m_s\n2031-01-01T02:00:00Z,3\n2031-01-01T00:00:00Z,1\n2031-01-01T00:00:00Z,1\n2031-01-01T02:00:00Z,\n";
    let table = read(text, &at_10_m()).unwrap();
    assert_eq!(table.speed_m_s, [1.0, 3.0]);
    assert!(
        table.notes.contains(&"the rows are not in order of time; they were sorted".to_owned()),
        "{:?}",
        table.notes
    );
    assert!(
        table.notes.contains(&"2 rows repeat a time and its wind; they count once".to_owned()),
        "{:?}",
        table.notes
    );
    assert_eq!(
        refusal("time,wind_speed_m_s\n2031-01-01T00:00:00Z,1\n2031-01-01T00:00:00Z,2\n", &at_10_m()),
        "wind.csv: line 3: the wind at 2031-01-01T00:00:00Z is 2.000 m/s (NaN east, NaN north), but 1.000 m/s (NaN east, NaN north) in line 2; expected one wind at a time"
    );
}

#[test]
fn what_is_not_stated_is_asked_for() {
    let none = WindTableOptions::default();
    assert_eq!(
        refusal("time,wind_speed_m_s\n2031-01-01T00:00:00Z,1\n", &none),
        "wind.csv: the height of the wind above the surface is not stated; set `wind.height_m` to metres"
    );
    assert_eq!(
        refusal("time,wspd\n2031-01-01T00:00:00Z,1\n", &at_10_m()),
        "wind.csv: the unit of column `wspd` is not stated; set `wind.units` to \"m/s\", \"knots\", \"km/h\" or \"mph\""
    );
    assert_eq!(
        refusal("time,wspd (m/s),wdir\n2031-01-01T00:00:00Z,1,90\n", &at_10_m()),
        "wind.csv: the sense of direction of column `wdir` is not stated; set `wind.direction_sense` to \"from\" or \"to\""
    );
    assert_eq!(
        refusal("time,wind_speed_10m,wind_speed_50m\n2031-01-01T00:00:00Z,1,2\n", &none),
        "wind.csv: which of the columns `wind_speed_10m`, `wind_speed_50m` to use is not stated; set `wind.height_m` to one of their heights (or name the column)"
    );
    assert_eq!(
        refusal("time,temp\n2031-01-01T00:00:00Z,1\n", &at_10_m()),
        "wind.csv: no column is recognised as the wind speed (`wind_speed_m_s`, `wspd`, `eastward_wind and northward_wind`); the columns are `time`, `temp`; set `wind.speed`"
    );
    let table = read("time,wind_speed_10m (m/s)\n2031-01-01T00:00:00Z,1\n", &none).unwrap();
    assert!((table.height_m - 10.0).abs() < 1e-12);
}

#[test]
fn units_rows_and_wrong_units() {
    let table = read("time,wspd\nUTC,knots\n2031-01-01T00:00:00Z,36\n", &at_10_m()).unwrap();
    assert!((table.speed_m_s[0] - 18.52).abs() < 1e-12);
    assert_eq!(
        refusal("#time,wspd\n#UTC,Bft\n2031-01-01T00:00:00Z,6\n", &at_10_m()),
        "wind.csv: column `wspd` is in `Bft`; expected m/s, knots, km/h or mph (set `wind.units` to override)"
    );
}

#[test]
fn impossible_winds_are_refused_by_their_line() {
    let with = |row: &str| {
        refusal(&format!("time,wind_speed_m_s,wind_from_direction_deg\n2031-01-01T00:00:00Z,1,90\n{row}\n"), &at_10_m())
    };
    assert_eq!(
        with("2031-01-01T01:00:00Z,99.0,90"),
        "wind.csv: line 3, column `wind_speed_m_s`: 99 is no wind speed; expected 0 to 100 m/s (if it stands for a missing value, add it to `wind.missing_codes`)"
    );
    assert_eq!(
        with("2031-01-01T01:00:00Z,-1,90"),
        "wind.csv: line 3, column `wind_speed_m_s`: -1 is no wind speed; expected 0 to 100 m/s (if it stands for a missing value, add it to `wind.missing_codes`)"
    );
    assert_eq!(
        with("2031-01-01T01:00:00Z,1,999"),
        "wind.csv: line 3, column `wind_from_direction_deg`: 999 is no direction; expected 0 to 360 degrees (if it stands for a missing value, add it to `wind.missing_codes`)"
    );
    let options = WindTableOptions { missing_codes: vec!["99.0".to_owned(), "999".to_owned()], ..at_10_m() };
    let table = read(
        "time,wind_speed_m_s,wind_from_direction_deg\n2031-01-01T00:00:00Z,99.0,90\n2031-01-01T01:00:00Z,5,999\n",
        &options,
    )
    .unwrap();
    assert_eq!(table.missing, [Some(Missing::NoValue), None]);
}

#[test]
fn years_of_two_digits_are_refused() {
    assert_eq!(
        refusal("#YY MM DD hh mm WSPD\n#yr mo dy hr mn m/s\n31 01 01 00 00 5.0\n31 01 01 00 10 5.0\n", &at_10_m()),
        "wind.csv: line 3: year, month, day, hour and minute are 31 1 1 0 0; expected a day and time that exist, with a year of four digits"
    );
}

#[test]
fn a_buoy_file_with_two_comment_lines_newest_first() {
    let text = "#YY  MM DD hh mm WDIR WSPD GST\n#yr  mo dy hr mn degT m/s  m/s\n2031 01 01 00 20 90 MM 6.0\n2031 01 01 00 10  MM 5.0 6.0\n\
                2031 01 01 00 00 180 4.0 6.0\n";
    let options = WindTableOptions { direction_sense: Some("from".to_owned()), ..at_10_m() };
    let table = read(text, &options).unwrap();
    assert_eq!(table.steps[0].iso(), "2031-01-01T00:00:00Z");
    assert_eq!(table.missing, [None, Some(Missing::NoValue), Some(Missing::NoValue)]);
    // From 180: towards north.
    assert!((table.northward_m_s[0] - 4.0).abs() < 1e-12 && table.eastward_m_s[0].abs() < 1e-12);
    assert!((table.speed_m_s[1] - 5.0).abs() < 1e-12 && table.eastward_m_s[1].is_nan());
}
