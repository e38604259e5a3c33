//! The same settings give the same bytes.

use super::support::{BAND, study};
use crate::support::{project, underwind, write};
use std::collections::BTreeMap;
use std::path::Path;

/// The files of a folder; not what lies in folders below, such as the demo's own results.
fn files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let entries = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap());
    entries
        .filter(|entry| entry.file_type().unwrap().is_file())
        .map(|entry| (entry.file_name().to_string_lossy().into_owned(), std::fs::read(entry.path()).unwrap()))
        .collect()
}

#[test]
fn the_same_seed_gives_the_same_bytes_and_another_seed_others() {
    let folder = tempfile::tempdir().unwrap();
    write(folder.path(), "plan.toml", &study("", &format!("days = 20\nship_gap_h = 12\n{BAND}")));
    for (output, seed, threads) in [("a", "7", "1"), ("b", "7", "2"), ("c", "8", "2")] {
        underwind(folder.path(), &["simulate", "plan.toml", "-o", output, "--seed", seed, "--threads", threads])
            .succeeds();
    }
    let [a, b, c] = ["a", "b", "c"].map(|name| files(&folder.path().join(name)));
    assert_eq!(a.len(), 7, "{:?}", a.keys());
    for (name, bytes) in &a {
        assert!(*bytes == b[name], "{name} differs between two runs of one seed");
    }
    for name in ["wind.nc", "levels.csv.gz", "true_wind.csv.gz", "truth.toml"] {
        assert!(a[name] != c[name], "{name} is the same for two seeds");
    }
}

#[test]
fn the_demo_is_what_its_settings_make() {
    let folder = tempfile::tempdir().unwrap();
    let output = folder.path().join("demo");
    underwind(project(), &["simulate", "demo-data/simulate.toml", "--output", output.to_str().unwrap()]).succeeds();
    let committed = files(&project().join("demo-data"));
    for (name, bytes) in files(&output) {
        if name != "README.md" {
            assert!(committed.get(&name) == Some(&bytes), "demo-data/{name} is not what demo-data/simulate.toml makes");
        }
    }
    let size: usize = committed.values().map(Vec::len).sum();
    assert!(size < 5_000_000, "{size} bytes");
}
