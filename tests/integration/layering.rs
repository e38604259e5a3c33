//! The layers stay layers: a folder uses only itself and what is listed for it.

use std::path::Path;

/// What each layer may use. Siblings do not see each other.
const ALLOWED: &[(&str, &[&str])] = &[
    ("units", &[]),
    ("numerics", &["units"]),
    ("model", &["units", "numerics"]),
    ("science", &["units", "numerics", "model"]),
    ("io", &["units", "numerics", "model"]),
    ("report", &["units", "numerics", "model"]),
    ("config", &["units", "numerics", "model", "science", "io", "report"]),
    ("pipeline", &["units", "numerics", "model", "science", "io", "report", "config", "error", "Error"]),
    ("cli", &["units", "numerics", "model", "science", "io", "report", "config", "pipeline", "error", "Error"]),
];

#[test]
fn every_layer_uses_only_those_below() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut checked = 0;
    for (layer, allowed) in ALLOWED {
        for file in rust_files(&root.join(layer)) {
            let text = std::fs::read_to_string(&file).unwrap();
            for used in used_layers(&text) {
                assert!(
                    used == *layer || allowed.contains(&used.as_str()),
                    "{} uses crate::{used}, which the layer `{layer}` must not",
                    file.display()
                );
                checked += 1;
            }
        }
    }
    assert!(checked > 50, "only {checked} uses found: the search is broken");
}

#[test]
fn only_io_knows_the_file_libraries_and_only_cli_the_command_line() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    for (library, home) in
        [("polars", "io"), ("netcdf::", "io"), ("hdf5_metno", "io"), ("clap", "cli"), ("indicatif", "cli")]
    {
        for file in rust_files(&root) {
            if file.starts_with(root.join(home)) {
                continue;
            }
            let text = std::fs::read_to_string(&file).unwrap();
            let code = text.lines().filter(|line| !line.trim_start().starts_with("//"));
            for line in code {
                let uses = line.contains(&format!("use {library}")) || line.contains(&format!(" {library}::"));
                assert!(!uses, "{}: `{}` uses {library}", file.display(), line.trim());
            }
        }
    }
}

fn used_layers(text: &str) -> Vec<String> {
    let mut found = Vec::new();
    for line in text.lines().filter(|line| !line.trim_start().starts_with("//")) {
        let mut rest = line;
        while let Some(at) = rest.find("crate::") {
            // `$crate::` and `some_crate::` are other things.
            let before = rest[..at].chars().next_back();
            rest = &rest[at + "crate::".len()..];
            if before.is_some_and(|c| c.is_alphanumeric() || c == '_' || c == '$') {
                continue;
            }
            let name: String = rest.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
            if !name.is_empty() {
                found.push(name);
            }
        }
    }
    found
}

fn rust_files(folder: &Path) -> Vec<std::path::PathBuf> {
    let mut files = Vec::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files.extend(rust_files(&path));
        } else if path.extension().is_some_and(|e| e == "rs") {
            files.push(path);
        }
    }
    files.sort();
    files
}
