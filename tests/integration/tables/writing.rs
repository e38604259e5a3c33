//! The writer of tables: same bytes, round trips, and nothing half-written.

use std::io::Write;
use underwind::io::levels::{LevelOptions, open_levels};
use underwind::io::replace_file::{ReplaceFile, replace_with};
use underwind::io::table::{TableWriter, write_dictionary};
use underwind::model::{ColumnData, LevelRow, Table};

fn part(from: i64, rows: i64) -> Table {
    let mut table = Table::default();
    let range = || from..from + rows;
    table.push(
        "time",
        "",
        "start of the window, UTC",
        ColumnData::Time(range().map(|k| 1_930_089_600_000 + k * 600_000).collect()),
    );
    let names: Vec<&str> = range().map(|k| if k % 5 == 0 { "deep, north" } else { "say \"A\"" }).collect();
    table.push("site", "", "name of the site", ColumnData::from_texts(names));
    table.push(
        "band_hz",
        "Hz",
        "mid-band frequency",
        ColumnData::Number(range().map(|k| if k % 2 == 0 { 63.0 } else { 125.0 }).collect()),
    );
    table.push(
        "level_db",
        "dB",
        "level",
        ColumnData::Number(range().map(|k| if k % 7 == 3 { f64::NAN } else { 80.0 + k as f64 / 3.0 % 20.0 }).collect()),
    );
    table.push("n", "1", "samples", ColumnData::Integer(range().collect()));
    table.push("use", "", "whether it is used", ColumnData::Truth(range().map(|k| k % 3 == 0).collect()));
    table
}

fn write(path: &std::path::Path, parts: &[Table]) -> u64 {
    let mut writer = TableWriter::create(path).unwrap();
    for part in parts {
        writer.append(part).unwrap();
    }
    writer.finish().unwrap()
}

#[test]
fn csv_is_what_it_should_be() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.csv");
    let mut table = part(0, 4);
    table.columns[3].decimals = Some(2);
    assert_eq!(write(&path, &[table]), 4);
    assert_eq!(
        std::fs::read_to_string(&path).unwrap(),
        "time,site,band_hz,level_db,n,use\n\
         2031-03-01T00:00:00Z,\"deep, north\",63,80.00,0,true\n\
         2031-03-01T00:10:00Z,\"say \"\"A\"\"\",125,80.33,1,false\n\
         2031-03-01T00:20:00Z,\"say \"\"A\"\"\",63,80.67,2,false\n\
         2031-03-01T00:30:00Z,\"say \"\"A\"\"\",125,,3,true\n"
    );
}

#[test]
fn both_formats_read_back_as_levels() {
    let folder = tempfile::tempdir().unwrap();
    let parts = [part(0, 50), part(50, 1), part(51, 100)];
    let mut options = LevelOptions {
        columns: underwind::io::levels::LevelColumns { qc: Some("use".to_owned()), ..Default::default() },
        ..super::support::stated()
    };
    options.qc_keep = vec!["true".to_owned(), "false".to_owned()];
    let mut tables: Vec<Vec<LevelRow>> = Vec::new();
    for name in ["levels.csv", "levels.parquet"] {
        let path = folder.path().join(name);
        assert_eq!(write(&path, &parts), 151);
        let mut table = open_levels(&[path], &options).unwrap();
        let mut rows = Vec::new();
        table
            .for_each(|names, row| -> Result<(), underwind::io::levels::LevelError> {
                assert!((row.site as usize) < names.sites.len());
                rows.push(row);
                Ok(())
            })
            .unwrap();
        assert_eq!(table.names().sites, ["deep, north", "say \"A\""]);
        tables.push(rows);
    }
    for (csv, parquet) in tables[0].iter().zip(&tables[1]) {
        // Shortest round-trip text: the same bits.
        assert_eq!(csv.level_db.to_bits(), parquet.level_db.to_bits());
        assert_eq!(
            (csv.window, csv.site, csv.band, csv.reason, csv.row),
            (parquet.window, parquet.site, parquet.band, parquet.reason, parquet.row + 1)
        );
    }
}

#[test]
fn bytes_depend_on_the_table_alone() {
    let folder = tempfile::tempdir().unwrap();
    for extension in ["csv", "parquet"] {
        let bytes: Vec<Vec<u8>> = (0..2)
            .map(|round| {
                let path = folder.path().join(format!("{round}.{extension}"));
                write(&path, &[part(0, 5000), part(5000, 3000)]);
                std::fs::read(path).unwrap()
            })
            .collect();
        assert_eq!(bytes[0], bytes[1], "{extension}");
    }
}

#[test]
fn a_table_appears_only_when_finished_and_an_earlier_one_stays() {
    let folder = tempfile::tempdir().unwrap();
    for name in ["out.csv", "out.parquet"] {
        let path = folder.path().join(name);
        write(&path, &[part(0, 3)]);
        let before = std::fs::read(&path).unwrap();
        let mut writer = TableWriter::create(&path).unwrap();
        writer.append(&part(0, 3000)).unwrap();
        assert_eq!(std::fs::read(&path).unwrap(), before);
        drop(writer);
        assert_eq!(std::fs::read(&path).unwrap(), before);
    }
    let left: Vec<_> = std::fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(left.len(), 2, "{left:?}");
}

#[test]
fn faults_while_writing_are_named() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    let shown = |error: String| {
        error.replace(&format!("{}/", folder.path().display()), "").replace(&folder.path().display().to_string(), ".")
    };
    let create = |name: &str| shown(TableWriter::create(&at(name)).unwrap_err().to_string());
    assert_eq!(
        create("none/out.csv"),
        "none/out.csv: the folder none does not exist; create it, or set another output folder"
    );
    assert_eq!(create("out.xlsx"), "out.xlsx: the name ends in .xlsx; expected a name that ends in .csv or .parquet");
    assert_eq!(create("out"), "out: the name ends in nothing; expected a name that ends in .csv or .parquet");
    std::fs::create_dir(at("taken.csv")).unwrap();
    assert_eq!(create("taken.csv"), "taken.csv: a folder stands in the place of the file; expected a free name");
    let writer = TableWriter::create(&at("out.csv")).unwrap();
    assert_eq!(shown(writer.finish().unwrap_err().to_string()), "out.csv: the table has no columns");
    let mut writer = TableWriter::create(&at("out.csv")).unwrap();
    writer.append(&part(0, 1)).unwrap();
    let mut other = Table::default();
    other.push("n", "1", "samples", ColumnData::Integer(vec![1]));
    let error = shown(writer.append(&other).unwrap_err().to_string());
    assert!(
        error
            .starts_with("out.csv: a part of the table has the columns n (integer); expected time (time), site (text)"),
        "{error}"
    );
}

#[test]
fn an_unfinished_file_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.txt");
    replace_with(&path, b"first").unwrap();
    let mut file = ReplaceFile::create(&path).unwrap();
    file.write_all(b"second").unwrap();
    drop(file);
    assert_eq!(std::fs::read(&path).unwrap(), b"first");
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
}

/// Not a test by itself: writes tables again and again into the folder that the test below names.
#[test]
#[ignore = "a helper of the tests that kill and starve it"]
fn helper_writes_tables_for_ever() {
    let Some(folder) = std::env::var_os("UNDERWIND_TEST_FOLDER") else { return };
    let parts = [part(0, 20_000), part(20_000, 20_000)];
    for round in 0.. {
        for name in ["out.csv", "out.parquet"] {
            let mut writer = TableWriter::create(&std::path::Path::new(&folder).join(name)).unwrap();
            let failed = parts.iter().find_map(|part| writer.append(part).err()).or_else(|| writer.finish().err());
            if let Some(error) = failed {
                std::fs::write(std::path::Path::new(&folder).join("error"), error.to_string()).unwrap();
                return;
            }
        }
        if round == 1_000 {
            return;
        }
    }
}

#[cfg(unix)]
fn helper(folder: &std::path::Path, shell: &str) -> std::process::Command {
    let mut command = std::process::Command::new("sh");
    command
        .arg("-c")
        .arg(format!("{shell} exec \"$0\" --ignored --exact tables::writing::helper_writes_tables_for_ever"))
        .arg(std::env::current_exe().unwrap())
        .env("UNDERWIND_TEST_FOLDER", folder)
        .stdout(std::process::Stdio::null())
        .stderr(std::process::Stdio::null());
    command
}

#[cfg(unix)]
#[test]
fn a_writer_killed_at_any_moment_leaves_whole_files() {
    let folder = tempfile::tempdir().unwrap();
    let mut whole = 0;
    for round in 0..15 {
        let mut child = helper(folder.path(), "").spawn().unwrap();
        std::thread::sleep(std::time::Duration::from_millis(30 + 17 * round));
        child.kill().unwrap();
        child.wait().unwrap();
        for name in ["out.csv", "out.parquet"] {
            let path = folder.path().join(name);
            if path.exists() {
                let pairs = open_levels(
                    &[path],
                    &LevelOptions { bands: Some(underwind::model::BandScheme::Decidecade), ..super::support::stated() },
                );
                assert_eq!(pairs.unwrap().survey().unwrap().samples, 40_000, "{name} after round {round}");
                whole += 1;
            }
        }
    }
    assert!(whole > 3, "{whole} files were seen");
}

#[cfg(unix)]
#[test]
fn a_disk_that_takes_no_more_is_named_and_the_earlier_file_stays() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.csv");
    replace_with(&path, b"earlier").unwrap();
    // A limit on the size of files stands for a full disk: 64 blocks of 512 bytes.
    let status = helper(folder.path(), "trap '' XFSZ; ulimit -f 64;").status().unwrap();
    assert!(status.success());
    let error = std::fs::read_to_string(folder.path().join("error")).unwrap();
    assert_eq!(
        error,
        format!(
            "{}: cannot be written (the file is larger than the system allows); an earlier file of that name is untouched",
            path.display()
        )
    );
    assert_eq!(std::fs::read(&path).unwrap(), b"earlier");
}

#[cfg(target_os = "linux")]
#[test]
fn a_folder_that_takes_no_file_is_named() {
    let error = TableWriter::create(std::path::Path::new("/proc/out.csv")).unwrap_err();
    assert_eq!(
        error.to_string(),
        "/proc/out.csv: no file can be written in /proc; expected a folder with write permission"
    );
    assert!(std::error::Error::source(&error).is_some());
}

#[test]
fn an_empty_part_keeps_the_columns() {
    let folder = tempfile::tempdir().unwrap();
    for name in ["out.csv", "out.parquet"] {
        let path = folder.path().join(name);
        assert_eq!(write(&path, &[part(0, 0)]), 0);
        assert!(std::fs::metadata(&path).unwrap().len() > 0);
    }
    assert_eq!(std::fs::read_to_string(folder.path().join("out.csv")).unwrap(), "time,site,band_hz,level_db,n,use\n");
}

#[test]
fn the_dictionary_lists_the_columns() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("columns.csv");
    write_dictionary(&path, &part(0, 0)).unwrap();
    let text = std::fs::read_to_string(&path).unwrap();
    assert!(text.starts_with("name,unit,meaning\ntime,,\"start of the window, UTC\"\nsite,,name of the site\nband_hz,Hz,mid-band frequency\n"), "{text}");
}
