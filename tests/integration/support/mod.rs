//! Helpers that speak the trade: temporary folders, the program, places of shared data.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// The project's folder.
pub(crate) fn project() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

#[expect(clippy::print_stdout, reason = "a skipped test says so")]
/// A folder of material that is not part of the project; `None`, with a message, where it is absent.
pub(crate) fn shared(folder: &str) -> Option<PathBuf> {
    let variable = if folder == "data" { "UNDERWIND_REAL_DATA" } else { "UNDERWIND_SHARED" };
    let path = match (std::env::var_os(variable), folder) {
        (Some(path), "data") => PathBuf::from(path),
        (Some(path), _) => PathBuf::from(path).join(folder),
        (None, _) => project().join("../shared").join(folder),
    };
    if path.is_dir() {
        Some(path)
    } else {
        println!("skipped: no folder {} (set {variable})", path.display());
        None
    }
}

/// A run of the program.
pub(crate) struct Run {
    pub(crate) status: i32,
    pub(crate) stdout: String,
    pub(crate) stderr: String,
}

/// Runs the program in a folder.
pub(crate) fn underwind(folder: &Path, arguments: &[&str]) -> Run {
    let output: Output = Command::new(env!("CARGO_BIN_EXE_underwind"))
        .args(arguments)
        .current_dir(folder)
        .env_remove("NO_COLOR")
        .output()
        .expect("the program starts");
    Run {
        status: output.status.code().unwrap_or(-1),
        stdout: String::from_utf8_lossy(&output.stdout).into_owned(),
        stderr: String::from_utf8_lossy(&output.stderr).into_owned(),
    }
}

impl Run {
    /// The run, after checking that it ended well.
    pub(crate) fn succeeds(self) -> Self {
        assert_eq!(self.status, 0, "{}\n{}", self.stdout, self.stderr);
        self
    }

    /// The run, after checking its status and that its one line of error contains all of these.
    pub(crate) fn fails(self, status: i32, parts: &[&str]) -> Self {
        assert_eq!(self.status, status, "{}\n{}", self.stdout, self.stderr);
        let error: Vec<&str> = self.stderr.lines().filter(|line| line.starts_with("error:")).collect();
        assert_eq!(error.len(), 1, "one line of error:\n{}", self.stderr);
        for part in parts {
            assert!(error[0].contains(part), "expected `{part}` in: {}", error[0]);
        }
        self
    }
}

/// Writes a file in a folder.
pub(crate) fn write(folder: &Path, name: &str, text: &str) {
    std::fs::write(folder.join(name), text).expect("a temporary folder can be written");
}

/// Rows of a CSV table by column name.
pub(crate) fn rows(path: &Path) -> Vec<BTreeMap<String, String>> {
    let mut reader = csv::Reader::from_path(path).unwrap();
    let names = reader.headers().unwrap().clone();
    reader
        .records()
        .map(|row| names.iter().map(str::to_owned).zip(row.unwrap().iter().map(str::to_owned)).collect())
        .collect()
}
