//! The whole program is killed, starved or run twice at once: no half file, no lost earlier result, a clear message.

use crate::support::{project, underwind, write};
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

/// Moments of a run at which it is killed.
const MOMENTS: u32 = 40;

/// Every output file of a folder and its figures, with its bytes; hidden parts of killed runs apart.
fn outputs(folder: &Path) -> (BTreeMap<PathBuf, Vec<u8>>, usize) {
    let (mut whole, mut parts) = (BTreeMap::new(), 0);
    for entry in [folder.to_owned(), folder.join("figures")].iter().filter_map(|f| std::fs::read_dir(f).ok()).flatten()
    {
        let path = entry.unwrap().path();
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        if name.starts_with('.') && path.extension().is_some_and(|extension| extension == "part") {
            parts += 1;
        } else if path.is_file() {
            whole.insert(path.strip_prefix(folder).unwrap().to_owned(), std::fs::read(&path).unwrap());
        }
    }
    (whole, parts)
}

/// A small study of thirty hours in a folder; levels are shifted by an offset, so that two studies differ in every file of
/// numbers.
fn study(folder: &Path, name: &str, offset_db: f64, output: &str) -> String {
    let mut levels = String::from("time,site,band_hz,level_db\n");
    for hour in 0..30 {
        for (band, base_db) in [(63, 80.0), (125, 75.0), (250, 70.0)] {
            let level_db = base_db + offset_db + f64::from(hour * 7 % 11) / 2.0;
            levels.push_str(&format!(
                "2031-01-{:02}T{:02}:00:00Z,reef,{band},{level_db:.2}\n",
                10 + hour / 24,
                hour % 24
            ));
        }
    }
    write(folder, &format!("{name}.csv"), &levels);
    let wind = project().join("tests/fixtures/grids/classic.nc");
    let text = format!(
        "[study]\nname = \"{name}\"\noutput = \"{output}\"\n[[site]]\nid = \"reef\"\nlatitude_deg = 45.2\nlongitude_deg = -31.3\ndepth_m = 100\n\
         [[wind]]\nid = \"model\"\nfiles = [{:?}]\n[[levels]]\nfiles = [\"{name}.csv\"]\nreference = \"1 uPa\"\nkind = \"band_level\"\n\
         bands = \"decidecade\"\nwindow_s = 3600\nstamp = \"start\"\n",
        wind.display().to_string()
    );
    write(folder, &format!("{name}.toml"), &text);
    format!("{name}.toml")
}

fn command(folder: &Path, arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_underwind"));
    command.args(arguments).current_dir(folder).stdout(Stdio::null()).stderr(Stdio::null());
    command
}

#[test]
fn a_run_killed_at_any_moment_leaves_each_file_whole_old_or_new() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    let new = study(at, "new", 3.0, "expected_new");
    underwind(at, &["run", "--quiet", &new]).succeeds();
    let old = study(at, "old", 0.0, "out");
    let begun = Instant::now();
    underwind(at, &["run", "--quiet", &old]).succeeds();
    let whole_run = begun.elapsed();
    let (expected_old, parts) = outputs(&at.join("out"));
    assert!(parts == 0 && expected_old.len() > 10, "{} files, {parts} parts", expected_old.len());
    // The same study writes the same bytes wherever it writes, but for the file that names its places.
    let (mut expected_new, _) = outputs(&at.join("expected_new"));
    expected_new.remove(Path::new("provenance.json"));
    assert_eq!(expected_new.keys().filter(|name| !expected_old.contains_key(*name)).count(), 0);
    let differing = expected_new.iter().filter(|(name, bytes)| expected_old[*name] != **bytes).count();
    assert!(differing > 5, "the two studies differ in {differing} files");
    study(at, "new", 3.0, "out");
    let (mut half_way, mut killed) = (0, 0);
    for moment in 0..MOMENTS {
        // The earlier result stands again before each run.
        for (name, bytes) in &expected_old {
            std::fs::write(at.join("out").join(name), bytes).unwrap();
        }
        let mut child = command(at, &["run", "--quiet", "new.toml"]).spawn().unwrap();
        std::thread::sleep(whole_run * (moment + 1) / MOMENTS);
        child.kill().unwrap();
        killed += usize::from(!child.wait().unwrap().success());
        let (found, _) = outputs(&at.join("out"));
        let mut renewed = 0;
        for (name, old) in &expected_old {
            let now = found.get(name).unwrap_or_else(|| panic!("{} is lost at moment {moment}", name.display()));
            if now == old {
                continue;
            }
            renewed += 1;
            match expected_new.get(name) {
                Some(new) => assert!(now == new, "{} is half written at moment {moment}", name.display()),
                None => {
                    serde_json::from_slice::<serde_json::Value>(now).expect("whole JSON");
                }
            }
        }
        half_way += usize::from(renewed > 0 && renewed < differing);
    }
    assert!(killed > 20, "{killed} runs were killed");
    assert!(half_way > 0, "no run was killed between two files");
    // What the killed runs left behind does not stop the next one.
    underwind(at, &["run", "--quiet", "new.toml"]).succeeds();
    let (found, _) = outputs(&at.join("out"));
    for (name, bytes) in &expected_new {
        assert!(found[name] == *bytes, "{}", name.display());
    }
}

#[test]
fn without_room_the_earlier_result_stays_and_the_file_is_named() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    let old = study(at, "old", 0.0, "out");
    underwind(at, &["match", "--quiet", &old]).succeeds();
    let (before, _) = outputs(&at.join("out"));
    study(at, "new", 3.0, "out");
    let mut refused = 0;
    // Limits on the size of files stand for a disk that is full: blocks of 512 bytes.
    for blocks in [0, 1, 2, 4, 8, 12, 16, 24, 32] {
        for (name, bytes) in &before {
            std::fs::write(at.join("out").join(name), bytes).unwrap();
        }
        // Errors go to a pipe: a file would meet the same limit.
        let output = Command::new("sh")
            .arg("-c")
            .arg(format!("trap '' XFSZ; ulimit -f {blocks}; exec \"$0\" match --quiet new.toml"))
            .arg(env!("CARGO_BIN_EXE_underwind"))
            .current_dir(at)
            .output()
            .unwrap();
        let said = String::from_utf8_lossy(&output.stderr);
        if output.status.success() {
            continue;
        }
        refused += 1;
        assert_eq!(output.status.code(), Some(6), "{said}");
        assert_eq!(said.lines().count(), 1, "{said}");
        let wanted =
            "cannot be written (the file is larger than the system allows); an earlier file of that name is untouched";
        assert!(said.starts_with("error: out/") && said.contains(wanted), "{said}");
        let named = said.trim_start_matches("error: out/").split(':').next().unwrap();
        let (found, parts) = outputs(&at.join("out"));
        assert_eq!(parts, 0, "parts are left with {blocks} blocks");
        assert!(found[Path::new(named)] == before[Path::new(named)], "{named} with {blocks} blocks");
        assert_eq!(found.keys().collect::<Vec<_>>(), before.keys().collect::<Vec<_>>());
    }
    assert!(refused > 3, "{refused}");
}

#[test]
fn two_runs_at_once_leave_whole_files() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    for (name, offset_db) in [("old", 0.0), ("new", 3.0)] {
        study(at, name, offset_db, &format!("expected_{name}"));
        underwind(at, &["match", "--quiet", &format!("{name}.toml")]).succeeds();
        study(at, name, offset_db, "out");
    }
    let (old, new) = (outputs(&at.join("expected_old")).0, outputs(&at.join("expected_new")).0);
    for round in 0..6_u64 {
        let mut first = command(at, &["match", "--quiet", "old.toml"]).spawn().unwrap();
        std::thread::sleep(Duration::from_millis(5 * round));
        let mut second = command(at, &["match", "--quiet", "new.toml"]).spawn().unwrap();
        assert!(first.wait().unwrap().success() && second.wait().unwrap().success(), "round {round}");
        let (found, parts) = outputs(&at.join("out"));
        assert_eq!((parts, found.len()), (0, old.len()), "round {round}");
        for (name, bytes) in found.iter().filter(|(name, _)| name.as_path() != Path::new("provenance.json")) {
            assert!(*bytes == old[name] || *bytes == new[name], "{} in round {round}", name.display());
        }
    }
}

#[test]
fn an_output_folder_that_cannot_be_is_named() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    write(at, "taken", "a file, not a folder");
    let here = study(at, "here", 0.0, "taken");
    let said = underwind(at, &["match", "--quiet", &here]).fails(6, &["taken"]).stderr;
    assert_eq!(said.lines().count(), 1, "{said}");
    assert_eq!(std::fs::read_to_string(at.join("taken")).unwrap(), "a file, not a folder");
    #[cfg(target_os = "linux")]
    {
        // The system's own folder takes no files, whoever asks.
        let there = study(at, "there", 0.0, "/proc/underwind");
        let said = underwind(at, &["match", "--quiet", &there]).fails(6, &["/proc/underwind"]).stderr;
        assert_eq!(said.lines().count(), 1, "{said}");
    }
}
