//! `--set key=value`: the keys of an input's section, from the command line.

use super::error::{Complaint, StudyError};
use serde::de::DeserializeOwned;
use std::path::Path;

/// Reads `key=value` texts as a section. A value is TOML (a number, a quoted text, a list), else taken as a text.
///
/// # Errors
/// When a text has no `=`, a key is unknown or a value does not fit.
pub(super) fn parse<T: DeserializeOwned>(settings: &[String]) -> Result<T, StudyError> {
    let mut text = String::new();
    for setting in settings {
        let Some((key, value)) = setting.split_once('=') else {
            let problem = format!("`{setting}` is no setting; expected key=value, such as units=knots");
            return Err(StudyError::Lacking { path: "--set".into(), problem });
        };
        let (key, value) = (key.trim(), value.trim());
        let is_toml = format!("x = {value}").parse::<toml::Table>().is_ok();
        let quoted = toml::Value::String(value.to_owned()).to_string();
        text.push_str(&format!("{key} = {}\n", if is_toml { value } else { &quoted }));
    }
    let complaint = Complaint { path: Path::new("--set"), text: &text };
    toml::from_str(&text).map_err(|error| complaint.parser(&error))
}
