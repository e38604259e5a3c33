//! Every form of one truth reads the same. The files and the truth are written by `make_tables.py` with numpy
//! and pyarrow (versions in versions.txt); hazards L1, L2, L3, L4, L6.

use super::support::{fixtures, rows_of, stated};
use underwind::io::levels::LevelOptions;
use underwind::model::{LevelRow, Stamp};

struct Truth {
    start_ms: i64,
    end_ms: i64,
    centre_hz: f64,
    level_db: f64,
}

fn truth() -> Vec<Truth> {
    let text = std::fs::read_to_string(fixtures().join("truth.csv")).unwrap();
    text.lines()
        .skip(1)
        .map(|line| {
            let cells: Vec<&str> = line.split(',').collect();
            Truth {
                start_ms: cells[0].parse().unwrap(),
                end_ms: cells[1].parse().unwrap(),
                centre_hz: cells[2].parse().unwrap(),
                level_db: cells[3].parse().unwrap(),
            }
        })
        .collect()
}

/// What a file needs besides the usual statements.
fn options_of(name: &str) -> LevelOptions {
    let mut options = stated();
    let unit = |text: &str| Some(text.to_owned());
    match name {
        "time_epoch_s.csv" | "time_epoch_s_float.csv" | "pq_epoch_s_float.parquet" => options.time_unit = unit("s"),
        "time_epoch_ms.csv" | "pq_epoch_ms.parquet" => options.time_unit = unit("ms"),
        "time_epoch_us.csv" => options.time_unit = unit("us"),
        "time_spreadsheet.csv" => options.time_unit = unit("spreadsheet_days"),
        "time_day_number.csv" => options.time_unit = unit("day_number"),
        "time_dmy.csv" | "time_dotted.csv" => options.date_order = unit("dmy"),
        "time_mdy.csv" => options.date_order = unit("mdy"),
        "time_local_plus10.csv" => options.time_zone = unit("+10:00"),
        "time_end.csv" => options.stamp = Some(Stamp::End),
        "time_centre.csv" => options.stamp = Some(Stamp::Centre),
        "windows.csv" => (options.window_s, options.stamp) = (None, None),
        "quoted_comma.csv" => options.text.decimal_mark = unit(","),
        // The unit row or header states these.
        "latin1.csv" | "micro_utf8.csv" | "greek_mu.csv" | "comments.csv" | "units_row.csv" | "wide_unit.csv" => {
            (options.reference, options.kind) = (None, None);
        }
        "re_1_pa.csv" | "linear_upa2.csv" | "linear_pa.csv" => (options.reference, options.kind) = (None, None),
        // The edges are in the file.
        "band_edges.csv" => options.bands = None,
        _ => {}
    }
    if name.starts_with("wide") || name == "pq_wide.parquet" {
        options.site = Some("A".to_owned());
    }
    options
}

fn check(name: &str, tolerance_db: f64) {
    let (rows, table) =
        rows_of(&fixtures().join("same").join(name), &options_of(name)).unwrap_or_else(|e| panic!("{name}: {e}"));
    let truth = truth();
    assert_eq!(rows.len(), truth.len(), "{name}");
    assert_eq!(table.names().sites, ["A"], "{name}");
    assert_eq!(table.names().bands.len(), 3, "{name}");
    for (LevelRow { band, window, level_db, reason, .. }, expected) in rows.iter().zip(&truth) {
        assert_eq!((window.start.0, window.end.0), (expected.start_ms, expected.end_ms), "{name}");
        let centre_hz = table.names().bands[*band as usize].centre_hz;
        assert!((centre_hz / expected.centre_hz - 1.0).abs() < 1e-7, "{name}: {centre_hz}");
        assert!((level_db - expected.level_db).abs() <= tolerance_db, "{name}: {level_db} for {}", expected.level_db);
        assert_eq!(*reason, None, "{name}");
    }
}

#[test]
fn every_form_of_the_same_table_reads_the_same() {
    let mut names: Vec<String> = std::fs::read_dir(fixtures().join("same"))
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    assert!(names.len() >= 80, "{} files", names.len());
    for name in &names {
        let tolerance_db = match name.as_str() {
            // Float32 keeps seven digits.
            "pq_float32.parquet" => 4e-6,
            "re_1_pa.csv" | "linear_upa2.csv" | "linear_pa.csv" => 1e-9,
            _ => 0.0,
        };
        check(name, tolerance_db);
    }
}

#[test]
fn naive_times_are_told_once_and_zoned_ones_are_not() {
    let note = "times without zone are taken as UTC (set `levels.time_zone` if they are not)";
    for (name, said) in [
        ("time_naive.csv", 1),
        ("time_z.csv", 0),
        ("pq_ms_naive.parquet", 1),
        ("pq_ms_sydney.parquet", 0),
        ("pq_int96.parquet", 1),
    ] {
        let (_, table) = rows_of(&fixtures().join("same").join(name), &stated()).unwrap();
        let count = table.notes().iter().filter(|found| found.as_str() == note).count();
        assert_eq!(count, said, "{name}: {:?}", table.notes());
    }
    let mut options = stated();
    options.time_zone = Some("UTC".to_owned());
    let (_, table) = rows_of(&fixtures().join("same/time_naive.csv"), &options).unwrap();
    assert!(table.notes().is_empty(), "{:?}", table.notes());
}

#[test]
fn a_stated_offset_shifts_naive_times_and_only_those() {
    let options = LevelOptions { time_zone: Some("+10:00".to_owned()), ..stated() };
    let start = |name: &str| rows_of(&fixtures().join("same").join(name), &options).unwrap().0[0].window.start.iso();
    // A local 00:00 at +10:00 is 14:00 UTC of the day before.
    for naive in ["time_naive.csv", "pq_ms_naive.parquet", "pq_int96.parquet"] {
        assert_eq!(start(naive), "2031-02-28T14:00:00Z", "{naive}");
    }
    for zoned in ["time_z.csv", "pq_us_sydney.parquet", "pq_text.parquet"] {
        assert_eq!(start(zoned), "2031-03-01T00:00:00Z", "{zoned}");
    }
}

#[test]
fn conversions_are_told() {
    let notes = |name: &str| -> String {
        let (_, table) = rows_of(&fixtures().join("same").join(name), &options_of(name)).unwrap();
        table.describe().files[0].notes.join("; ")
    };
    assert!(
        notes("re_1_pa.csv").contains("+120.0000 dB are added to refer levels to 1 uPa instead of 1 Pa"),
        "{}",
        notes("re_1_pa.csv")
    );
    assert!(notes("linear_pa.csv").contains("20 log10 of the root mean square"));
    assert!(notes("semicolons.csv").contains("numbers are read with a decimal comma"));
    assert!(notes("latin1.csv").contains("taken as Latin-1"));
    assert!(notes("units_row.csv").contains("line 2 is read as a row of units"));
    assert!(notes("wide_bare.csv").contains("band columns without a unit are taken as Hz"));
    assert!(
        notes("wide_others.csv").contains("columns not used: `temp_2`, `depth`, `wind_10m`, `n_samples`, `qc`"),
        "{}",
        notes("wide_others.csv")
    );
    assert!(notes("pq_named_wrong.csv").contains("the file is Parquet although its name says otherwise"));
}

#[test]
fn line_numbers_point_at_the_line() {
    for (name, first) in [
        ("time_z.csv", 2),
        ("comments.csv", 4),
        ("units_row.csv", 3),
        ("cr.csv", 2),
        ("utf16be.csv", 2),
        ("long.csv.gz", 2),
        ("pq_row_groups.parquet", 1),
    ] {
        let (rows, _) = rows_of(&fixtures().join("same").join(name), &options_of(name)).unwrap();
        assert_eq!(rows[0].row, first, "{name}");
    }
    // A comment line and a blank line stand before the fourth row; quoted rows count their lines too.
    let (rows, _) = rows_of(&fixtures().join("same/comments.csv"), &options_of("comments.csv")).unwrap();
    assert_eq!(rows[3].row, 9);
    let (rows, _) = rows_of(&fixtures().join("same/quoted.csv"), &options_of("quoted.csv")).unwrap();
    assert_eq!(rows[35].row, 37);
    let (rows, _) = rows_of(&fixtures().join("same/pq_row_groups.parquet"), &stated()).unwrap();
    assert_eq!(rows[35].row, 36);
}

#[test]
fn several_files_of_different_form_are_one_table() {
    let same = fixtures().join("same");
    let files = [same.join("time_z.csv"), same.join("pq_us_utc.parquet"), same.join("semicolons.csv")];
    let mut table = underwind::io::levels::open_levels(&files, &stated()).unwrap();
    let survey = table.survey().unwrap();
    assert_eq!((survey.samples, survey.usable), (108, 108));
    assert_eq!(table.names().bands.len(), 3);
    // The second and third file go back in time once a band each.
    assert_eq!(survey.out_of_order, 6);
    assert_eq!(survey.overlapping, 0);
}
