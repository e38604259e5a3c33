//! Tables that must be refused, with the whole message: hazards L1, L2, L6.

use std::fmt::Write;

use super::support::{fixtures, message, rows_of, scratch, short, stated};
use underwind::io::levels::{LevelOptions, open_levels};

const HEAD: &str = "time,site,band_hz,level_db\n";

fn with_time(time: &str) -> String {
    message(format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n{time},A,63,81\n"), &stated())
}

#[test]
fn times_that_could_be_two_things_are_refused_with_their_line() {
    let expect = |time: &str, expected: &str| {
        assert_eq!(
            with_time(time),
            format!("levels.csv: line 3, column `time`: `{time}` is no time; expected {expected}")
        );
    };
    let order = "a time whose day and month are sure: \"dmy\" or \"mdy\" (set `levels.date_order`)";
    expect("03/04/2031 00:10", order);
    expect("3.4.2031 00:10", order);
    let iso = "an ISO 8601 time such as 2031-05-04T13:00:00Z";
    expect("soon", iso);
    expect("2031-03-01T00", iso);
    expect("2031-03-01T00:10:00.Z", iso);
    expect("2031-02-29T00:10:00Z", "a day and hour that exist");
    expect("2031-03-01T24:10:00Z", "a day and hour that exist");
    expect("2031-03-01T00:61:00Z", "a day and hour that exist");
    expect("2031-03-01T00:10:00 CET", "Z, an offset such as +02:00, or no zone");
    expect("2031-03-01T00:10:00+25:00", "Z, an offset such as +02:00, or no zone");
    expect("00:10:00", "a date and a time in one cell");
    expect("", "a time in every row");
    expect(
        "1930000000",
        "a unit for times that are numbers: \"s\", \"ms\", \"us\", \"ns\", \"spreadsheet_days\" or \"day_number\" (set `levels.time_unit`)",
    );
}

#[test]
fn leap_seconds_and_hour_24_are_the_next_instant_and_told() {
    let text = format!(
        "{HEAD}2016-12-31T23:59:60Z,A,63,80\n2017-01-01T24:00:00Z,A,63,81\n2017-01-03T00:00:00.9996Z,A,63,82\n"
    );
    let file = scratch("levels.csv", text);
    let (rows, table) = rows_of(&file.path, &stated()).unwrap();
    // 2017-01-01T00:00:00Z is 1483228800 s after 1970 (POSIX; Python's datetime).
    let starts: Vec<i64> = rows.iter().map(|row| row.window.start.0).collect();
    assert_eq!(starts, [1_483_228_800_000, 1_483_315_200_000, 1_483_401_601_000]);
    assert_eq!(
        table.notes(),
        ["a 60th second is counted as the next second (a leap second)", "24:00 is counted as 00:00 of the next day"]
    );
}

#[test]
fn zones_by_name_are_refused_outside_parquet() {
    let mut options = stated();
    options.time_zone = Some("Australia/Sydney".to_owned());
    assert_eq!(
        message(format!("{HEAD}2031-03-01T00:00:00,A,63,80\n"), &options),
        "`levels.time_zone` is \"Australia/Sydney\"; expected \"UTC\" or a fixed offset such as \"+02:00\" (named zones are understood only where Parquet times carry them)"
    );
    options.time_zone = None;
    options.time_unit = Some("hours".to_owned());
    assert_eq!(
        message(HEAD, &options),
        "`levels.time_unit` is \"hours\"; expected \"s\", \"ms\", \"us\", \"ns\", \"spreadsheet_days\" or \"day_number\""
    );
}

#[test]
fn a_clock_change_cannot_hide() {
    // Local times that go back an hour read as they stand, and the survey counts the step back.
    let text = format!("{HEAD}2031-10-26T02:50:00,A,63,80\n2031-10-26T02:00:00,A,63,81\n");
    let file = scratch("levels.csv", text);
    let (_, mut table) = rows_of(&file.path, &stated()).unwrap();
    assert_eq!(table.survey().unwrap().out_of_order, 1);
}

#[test]
fn shapes_that_are_no_table_are_refused_with_their_line() {
    let options = stated();
    for (content, expected) in [
        (String::new(), "levels.csv: the file has no rows at all; expected a header line and data"),
        ("\n\n  \n".to_owned(), "levels.csv: the file has no rows at all; expected a header line and data"),
        (HEAD.to_owned(), "levels.csv: there is a header (line 1) and no data row after it"),
        (
            "2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:10:00Z,A,63,81\n".to_owned(),
            "levels.csv: line 1 holds data (`2031-03-01T00:00:00Z,A,63,80`); expected column names: add a header line",
        ),
        (
            format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:10:00Z,A,63\n"),
            "levels.csv: line 3 has 3 cells; expected 4 as in the header (line 1)",
        ),
        (
            format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:10:00Z,A,63,81,5\n"),
            "levels.csv: line 3 has 5 cells; expected 4 as in the header (line 1)",
        ),
        (
            format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:10:00Z,\"A,63,81\n"),
            "levels.csv: the quoted cell that begins in line 3 never ends; expected a closing \"",
        ),
        (
            format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:10:00Z,,63,81\n"),
            "levels.csv: line 3, column `site`: `` is no site; expected a site in every row",
        ),
        (
            format!("{HEAD}2031-03-01T00:00:00Z,A,63,\"1,080.5\"\n"),
            "levels.csv: line 2, column `level_db`: `1,080.5` is no level; expected a number, or a code in the setting (set `levels.missing_codes`)",
        ),
        (
            "time,depth,level_db\n2031-03-01T00:00:00Z,63,80\n".to_owned(),
            "levels.csv: no column is recognised as the band; the columns are `time`, `depth`, `level_db`; set `levels.band`",
        ),
        (
            "time,site,band_hz,depth\n2031-03-01T00:00:00Z,A,63,80\n".to_owned(),
            "levels.csv: no column is recognised as a level (long table) or as a band such as `63 Hz` (wide table); the columns are `time`, `site`, `band_hz`, `depth`; set `levels.level`",
        ),
        (
            "when,site,band_hz,level_db\n1,A,63,80\n".to_owned(),
            "levels.csv: no column is recognised as the time; the columns are `when`, `site`, `band_hz`, `level_db`; set `levels.time`",
        ),
        (
            "date,time,site,band_hz,level_db\n2031-03-01,00:10:00,A,63,80\n".to_owned(),
            "levels.csv: columns `time` and `date` could both be the time; set `levels.time`",
        ),
        (
            "time,time,site,band_hz,level_db\n1,2,A,63,80\n".to_owned(),
            "levels.csv: columns `time` and `time` could both be the time; set `levels.time`",
        ),
    ] {
        assert_eq!(message(&content, &options), expected, "{content}");
    }
    let mut named = stated();
    named.columns.level = Some("spl".to_owned());
    assert_eq!(
        message(format!("{HEAD}2031-03-01T00:00:00Z,A,63,80\n"), &named),
        "levels.csv: there is no column `spl` (`levels.level`); the columns are `time`, `site`, `band_hz`, `level_db`"
    );
    assert_eq!(
        open_levels(&[], &LevelOptions::default()).unwrap_err().to_string(),
        "`levels.files` names no file; expected at least one level table"
    );
}

#[test]
fn text_below_the_first_rows_is_found_with_its_line() {
    // Hazard L5: a word far below what a reader looks at to decide on types.
    let mut text = HEAD.to_owned();
    for minute in 0..20_000_i64 {
        let time = underwind::units::Instant(minute * 60_000).iso();
        let level = if minute == 19_000 { "loud" } else { "80.5" };
        writeln!(text, "{time},A,63,{level}").unwrap();
    }
    assert!(message(text, &stated()).starts_with("levels.csv: line 19002, column `level_db`: `loud` is no level;"));
}

#[test]
fn line_ends_within_quotes_count_as_lines() {
    let text = format!("{HEAD}2031-03-01T00:00:00Z,\"A\nnorth\",63,80\n2031-03-01T00:10:00Z,A,63,bad\n");
    assert!(message(text, &stated()).starts_with("levels.csv: line 4, column `level_db`: `bad` is no level;"));
}

#[test]
fn files_of_another_kind_are_named() {
    for (content, found) in [
        (b"\x89HDF\r\n\x1a\n........".to_vec(), "an HDF5 or NetCDF-4 file"),
        (b"CDF\x01....".to_vec(), "a classic NetCDF file"),
        (b"PK\x03\x04....".to_vec(), "a ZIP archive (a spreadsheet file is one too)"),
        (b"<!DOCTYPE html><html>".to_vec(), "an HTML page"),
        (b"GRIB....".to_vec(), "a GRIB file"),
    ] {
        assert_eq!(message(&content, &stated()), format!("levels.csv: this is {found}; expected a text table"));
    }
    let folder = tempfile::tempdir().unwrap();
    let error = open_levels(&[folder.path().to_owned()], &stated()).unwrap_err().to_string();
    assert_eq!(error, format!("{}: this is a folder; expected a table", folder.path().display()));
    let none = folder.path().join("none.csv");
    let error = open_levels(std::slice::from_ref(&none), &stated()).unwrap_err().to_string();
    assert_eq!(error, format!("{}: cannot be read", none.display()));
}

#[test]
fn cut_and_damaged_gzip_is_refused_at_its_line() {
    let whole = std::fs::read(fixtures().join("same/long.csv.gz")).unwrap();
    let file = scratch("long.csv.gz", &whole[..whole.len() * 2 / 3]);
    let error = short(&rows_of(&file.path, &stated()).unwrap_err().to_string(), &file);
    assert!(error.starts_with("long.csv.gz: the gzip data are cut short or damaged after line "), "{error}");
    assert!(error.ends_with("; expected a whole file (copy it again)"), "{error}");
    let mut flipped = whole.clone();
    let middle = flipped.len() / 2;
    flipped[middle] ^= 0x55;
    let file = scratch("long.csv.gz", &flipped);
    assert!(rows_of(&file.path, &stated()).is_err());
}

#[test]
fn encodings_that_do_not_fit_are_refused() {
    let mut options = stated();
    options.text.encoding = Some("klingon".to_owned());
    assert_eq!(
        message(HEAD, &options),
        "`levels.encoding` is \"klingon\", which is no known text encoding; expected for example \"utf-8\", \"latin-1\" or \"utf-16le\""
    );
    // A Latin-1 site name far below the sample of a file that begins as UTF-8.
    let mut bytes = HEAD.as_bytes().to_vec();
    for _ in 0..4000 {
        bytes.extend_from_slice(b"2031-03-01T00:00:00Z,A,63,80\n");
    }
    bytes.extend_from_slice(b"2031-03-01T00:00:00Z,\xc5land,63,80\n");
    assert_eq!(
        message(&bytes, &stated()),
        "levels.csv: line 4002, column `site`: the text is not valid UTF-8; set `levels.encoding` (for example \"latin-1\")"
    );
    options.text.encoding = Some("latin-1".to_owned());
    let file = scratch("levels.csv", &bytes);
    let (_, table) = rows_of(&file.path, &options).unwrap();
    assert_eq!(table.names().sites, ["A", "\u{c5}land"]);
}

#[test]
fn parquet_that_is_cut_or_of_unknown_types_is_refused() {
    let whole = std::fs::read(fixtures().join("same/pq_ms_utc.parquet")).unwrap();
    let cut = |bytes: &[u8]| {
        let file = scratch("cut.parquet", bytes);
        short(&rows_of(&file.path, &stated()).unwrap_err().to_string(), &file)
    };
    assert_eq!(
        cut(&whole[..whole.len() / 2]),
        "cut.parquet: the Parquet file is cut short (it does not end with PAR1); expected a whole file (copy it again)"
    );
    assert_eq!(
        cut(b"PAR1"),
        "cut.parquet: the Parquet file is cut short (4 bytes in all); expected a whole file (copy it again)"
    );
    let mut long_footer = whole.clone();
    let at = long_footer.len() - 8;
    long_footer[at..at + 4].copy_from_slice(&1_000_000_u32.to_le_bytes());
    assert_eq!(
        cut(&long_footer),
        format!(
            "cut.parquet: the Parquet file is cut short (a footer of 1000000 bytes in a file of {} bytes); expected a whole file (copy it again)",
            whole.len()
        )
    );
    let mut options = stated();
    options.site = Some("A".to_owned());
    let error = |name: &str| {
        rows_of(&fixtures().join(name), &options)
            .unwrap_err()
            .to_string()
            .replace(&format!("{}/", fixtures().display()), "")
    };
    assert_eq!(
        error("nested.parquet"),
        "nested.parquet: column `level_db` is of type list; expected numbers, text, times or dates"
    );
    assert_eq!(
        error("null_time.parquet"),
        "null_time.parquet: row 2, column `time`: `null` is no time; expected a time in every row"
    );
    let error = rows_of(&fixtures().join("same/pq_epoch_ms.parquet"), &stated()).unwrap_err().to_string();
    assert!(error.contains("pq_epoch_ms.parquet: row 1, column `time`: `1930089600000` is no time; expected a unit for times that are numbers"), "{error}");
    // One flipped bit in a level, caught by the checksum that the writer stored: the last page ends before the footer.
    let mut flipped = std::fs::read(fixtures().join("same/pq_checksums.parquet")).unwrap();
    let needle = 80.37_f64.to_le_bytes();
    let at = flipped.windows(8).position(|window| window == needle).unwrap();
    flipped[at + 3] ^= 1;
    let error = cut(&flipped);
    assert!(
        error.starts_with("cut.parquet: column `level_db`: a page of the Parquet file is damaged (the page at byte "),
        "{error}"
    );
    assert!(error.ends_with(" fails its checksum); expected a whole file (copy it again)"), "{error}");
    // Dates are their midnights.
    let (rows, _) = rows_of(&fixtures().join("dates.parquet"), &options).unwrap();
    assert_eq!(rows[1].window.start.iso(), "2031-03-02T00:00:00Z");
}

#[test]
fn mutated_files_never_panic() {
    // Every kept fixture, cut and with single bytes changed; reading must end in a value or in an error.
    let mut state = 0x9e37_79b9_7f4a_7c15_u64;
    let mut random = move || {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        state as usize
    };
    let names = [
        "time_z.csv",
        "quoted.csv",
        "utf16le.csv",
        "long.csv.gz",
        "comments.csv",
        "wide_others.csv",
        "semicolons.csv",
        "pq_row_groups.parquet",
        "pq_uncompressed_plain.parquet",
        "pq_dictionary.parquet",
        "pq_int96.parquet",
    ];
    let mut refused = 0;
    for name in names {
        let whole = std::fs::read(fixtures().join("same").join(name)).unwrap();
        for round in 0..60 {
            let mut bytes = whole.clone();
            if round % 3 == 0 {
                bytes.truncate(random() % whole.len());
            }
            for _ in 0..=(round % 4) {
                if !bytes.is_empty() {
                    let at = random() % bytes.len();
                    bytes[at] = random() as u8;
                }
            }
            let file = scratch(name, &bytes);
            let mut options = stated();
            options.site = name.starts_with("wide").then(|| "A".to_owned());
            refused += usize::from(rows_of(&file.path, &options).is_err());
        }
    }
    assert!(refused > 50, "{refused}");
}
