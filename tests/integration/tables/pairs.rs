//! Tables of pairs of wind speed and level.

use super::support::{scratch, short};
use underwind::io::table::{PairColumns, PairOptions, TableWriter, read_pairs};
use underwind::model::{ColumnData, Table};

fn refusal(content: &str) -> String {
    let file = scratch("pairs.csv", content);
    short(&read_pairs(&file.path, &PairOptions::default()).unwrap_err().to_string(), &file)
}

#[test]
fn usual_columns_in_any_case_and_order() {
    let file = scratch(
        "pairs.csv",
        "Level_dB,TIME,site,wind_speed_m_s,band_centre_hz,deployment,use\n80.5,2031-01-01T00:00:00Z,A,5.5,63,one,true\n,2031-01-01T01:00:00Z,B,6,63,,false\n",
    );
    let pairs = read_pairs(&file.path, &PairOptions::default()).unwrap();
    assert_eq!(pairs.time_ms, [1_924_992_000_000, 1_924_995_600_000]);
    assert!(!pairs.relative);
    assert_eq!(pairs.wind_speed_m_s, [5.5, 6.0]);
    assert!((pairs.level_db[0] - 80.5).abs() < 1e-12 && pairs.level_db[1].is_nan());
    let site = pairs.site.unwrap();
    assert_eq!((site.text(0), site.text(1)), ("A", "B"));
    assert_eq!(pairs.band_centre_hz.unwrap(), [63.0, 63.0]);
    assert_eq!(pairs.deployment.unwrap().text(1), "");
    assert_eq!(pairs.used.unwrap(), [true, false]);
    assert_eq!(pairs.row, [2, 3]);
}

#[test]
fn hours_without_a_date_are_relative() {
    let file = scratch("pairs.csv", "time_h,wind_speed_m_s,level_db\n0,5,80\n1.5,6,81\n");
    let pairs = read_pairs(&file.path, &PairOptions::default()).unwrap();
    assert!(pairs.relative);
    assert_eq!(pairs.time_ms, [0, 5_400_000]);
}

#[test]
fn other_names_by_option() {
    let file = scratch("pairs.csv", "when,U,L\n2031-01-01,5,80\n");
    let columns = PairColumns {
        time: Some("When".to_owned()),
        wind_speed: Some("u".to_owned()),
        level: Some("l".to_owned()),
        ..PairColumns::default()
    };
    let pairs = read_pairs(&file.path, &PairOptions { columns, ..PairOptions::default() }).unwrap();
    assert_eq!((pairs.wind_speed_m_s[0], pairs.level_db[0]), (5.0, 80.0));
}

#[test]
fn faults_are_named() {
    assert_eq!(
        refusal("time,wind,level_db\n2031-01-01,5,80\n"),
        "pairs.csv: no column is recognised as the wind speed in m/s (`wind_speed_m_s`, `wind_speed_mean_m_s`); the columns are `time`, `wind`, `level_db`; set `--wind-column`"
    );
    assert_eq!(
        refusal("wind_speed_m_s,level_db\n5,80\n"),
        "pairs.csv: no column is recognised as the time (`time`, `window_start_utc`, `time_h`); the columns are `wind_speed_m_s`, `level_db`; set `--time-column`"
    );
    assert_eq!(
        refusal("time,wind_speed_m_s,level_db\n2031-01-01,5,80\n2031-01-02,calm,80\n"),
        "pairs.csv: line 3, column `wind_speed_m_s`: `calm` is no number; expected a number or an empty cell"
    );
    assert_eq!(
        refusal("time,wind_speed_m_s,level_db\n1930089600,5,80\n"),
        "pairs.csv: line 2, column `time`: `1930089600` is no time; expected a unit for times that are numbers: \"s\", \"ms\", \"us\", \"ns\", \"spreadsheet_days\" or \"day_number\" (set `--time-unit`)"
    );
    assert_eq!(
        refusal("time_h,wind_speed_m_s,level_db\n,5,80\n1,5,80\n"),
        "pairs.csv: line 2, column `time_h`: `NaN` is no time; expected hours as a number in every row"
    );
}

#[test]
fn a_written_matchup_table_reads_back_from_both_formats() {
    let mut table = Table::default();
    table.push("window_start_utc", "", "start", ColumnData::Time(vec![0, 3_600_000]));
    table.push("site", "", "site", ColumnData::from_texts(["A", "B"]));
    table.push("wind_speed_mean_m_s", "m/s", "wind", ColumnData::Number(vec![5.25, f64::NAN]));
    table.push("level_db", "dB", "level", ColumnData::Number(vec![80.125, 81.0]));
    table.push("use", "", "used", ColumnData::Truth(vec![true, false]));
    let folder = tempfile::tempdir().unwrap();
    let mut read = Vec::new();
    for name in ["pairs.csv", "pairs.parquet"] {
        let path = folder.path().join(name);
        let mut writer = TableWriter::create(&path).unwrap();
        writer.append(&table).unwrap();
        writer.finish().unwrap();
        read.push(read_pairs(&path, &PairOptions::default()).unwrap());
    }
    for pairs in &read {
        assert_eq!(pairs.time_ms, [0, 3_600_000]);
        assert!((pairs.wind_speed_m_s[0] - 5.25).abs() < 1e-12 && pairs.wind_speed_m_s[1].is_nan());
        assert_eq!(pairs.used.as_deref(), Some([true, false].as_slice()));
        assert_eq!(pairs.site.as_ref().unwrap().text(1), "B");
    }
}
