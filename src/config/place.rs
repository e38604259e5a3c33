//! File patterns and checked numbers of the study file.

use super::error::{Complaint, StudyError};
use crate::io::time_text::{DateOrder, TimeRules, TimeUnit, zone_minutes};
use serde::de::{Deserialize, Deserializer, SeqAccess, Visitor};
use std::path::{Path, PathBuf};
use toml::Spanned;

/// A list of files and patterns.
#[derive(Debug, Clone)]
pub(super) struct FilePatterns(Vec<Spanned<String>>);

impl<'de> Deserialize<'de> for FilePatterns {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct List;
        impl<'de> Visitor<'de> for List {
            type Value = FilePatterns;

            fn expecting(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                formatter.write_str("a list of files or patterns in brackets, such as [\"wind_*.nc\"]")
            }

            fn visit_seq<A: SeqAccess<'de>>(self, mut list: A) -> Result<FilePatterns, A::Error> {
                let mut patterns = Vec::new();
                while let Some(pattern) = list.next_element()? {
                    patterns.push(pattern);
                }
                Ok(FilePatterns(patterns))
            }
        }
        deserializer.deserialize_seq(List)
    }
}

impl FilePatterns {
    /// The files, sorted within each pattern, none twice.
    pub(super) fn resolve(&self, base: &Path, key: &str, complaint: Complaint<'_>) -> Result<Vec<PathBuf>, StudyError> {
        let mut files = Vec::new();
        for pattern in &self.0 {
            let place = pattern.span().start;
            let full = base.join(pattern.get_ref());
            let has_wildcard = pattern.get_ref().contains(['*', '?', '[']);
            if !has_wildcard {
                if !full.exists() {
                    return Err(complaint.at(place, format!("`{key}`: there is no file {}", full.display())));
                }
                push_new(&mut files, full);
                continue;
            }
            let folder = if base.as_os_str().is_empty() { Path::new("this folder") } else { base };
            let paths = glob::glob(&full.to_string_lossy()).map_err(|error| {
                complaint.at(place, format!("`{key}`: `{}` is no pattern: {}", pattern.get_ref(), error.msg))
            })?;
            let mut found: Vec<PathBuf> = paths.filter_map(Result::ok).filter(|path| path.is_file()).collect();
            if found.is_empty() {
                return Err(complaint.at(
                    place,
                    format!("`{key}`: the pattern `{}` matches no file in {}", pattern.get_ref(), folder.display()),
                ));
            }
            found.sort();
            found.into_iter().for_each(|path| push_new(&mut files, path));
        }
        if files.is_empty() {
            return Err(complaint.lacking(format!("`{key}` is empty; expected at least one file or pattern")));
        }
        Ok(files)
    }
}

fn push_new(files: &mut Vec<PathBuf>, path: PathBuf) {
    if !files.contains(&path) {
        files.push(path);
    }
}

/// Declares a number type that serde checks while parsing, so that the parser can name the line.
macro_rules! checked_number {
    ($(#[$outer:meta])* $name:ident, $low:expr, $high:expr, $expected:literal) => {
        $(#[$outer])*
        #[derive(Debug, Clone, Copy, PartialEq, serde::Deserialize)]
        #[serde(try_from = "f64")]
        pub(super) struct $name(pub(super) f64);

        impl TryFrom<f64> for $name {
            type Error = String;
            fn try_from(value: f64) -> Result<Self, String> {
                if ($low..=$high).contains(&value) {
                    Ok(Self(value))
                } else {
                    Err(format!(concat!("{} is not allowed; expected ", $expected), value))
                }
            }
        }
    };
}

checked_number!(
    /// Degrees north.
    LatitudeDeg, -90.0, 90.0, "a latitude of -90 to 90 degrees north"
);
checked_number!(
    /// Degrees east.
    LongitudeDeg, -180.0, 360.0, "a longitude of -180 to 360 degrees east"
);
checked_number!(
    /// A depth below the surface.
    DepthM, 0.0, 12_000.0, "a depth of 0 to 12000 m, positive down"
);
checked_number!(
    /// A span of time.
    SpanS, 0.001, 31_622_400.0, "a span of 0.001 s to 366 days, in seconds"
);
checked_number!(
    /// The window of a level sample.
    WindowS, 0.0, 31_622_400.0, "a window of 0 s (an instant) to 366 days, in seconds"
);
checked_number!(
    /// A span of time.
    SpanH, 0.001, 8784.0, "a span of 0.001 h to 366 days, in hours"
);
checked_number!(
    /// A wind speed.
    WindSpeedMS, 0.0, 75.0, "a wind speed of 0 to 75 m/s"
);
checked_number!(
    /// A height above the sea.
    HeightM, 0.1, 1000.0, "a height of 0.1 to 1000 m"
);
checked_number!(
    /// A distance along the sphere.
    DistanceKm, 0.0, 20_038.0, "a distance of 0 to 20038 km"
);

/// A code for a missing level: a text or a number.
#[derive(Debug, Clone, serde::Deserialize)]
#[serde(try_from = "toml::Value")]
pub(super) struct Code(pub(super) String);

impl TryFrom<toml::Value> for Code {
    type Error = String;

    fn try_from(value: toml::Value) -> Result<Self, String> {
        match value {
            toml::Value::String(text) => Ok(Self(text)),
            toml::Value::Integer(number) => Ok(Self(number.to_string())),
            toml::Value::Float(number) => Ok(Self(number.to_string())),
            toml::Value::Boolean(truth) => Ok(Self(truth.to_string())),
            other => Err(format!("{other} is no code; expected a text or a number")),
        }
    }
}

/// Options as the provenance shows them: the plain debug text names every field.
pub(super) fn in_words<T: std::fmt::Debug, S: serde::Serializer>(value: &T, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.collect_str(&format_args!("{value:?}"))
}

/// The rules for times without zone, as numbers, or with day and month in an unusual order; `section` names the keys.
pub(super) fn time_rules(
    section: &str,
    zone: Option<&str>,
    unit: Option<&str>,
    order: Option<&str>,
) -> Result<TimeRules, String> {
    let wrong = |key: &str, found: &str, expected: &str| format!("`{section}.{key}` is `{found}`; expected {expected}");
    let zone_minutes = zone
        .map(|text| {
            zone_minutes(text).ok_or_else(|| wrong("time_zone", text, "\"UTC\" or an offset such as \"+02:00\""))
        })
        .transpose()?;
    let unit = unit
        .map(|text| {
            TimeUnit::from_name(text)
                .ok_or_else(|| wrong("time_unit", text, "s, ms, us, ns, spreadsheet_days or day_number"))
        })
        .transpose()?;
    let order = order
        .map(|text| DateOrder::from_name(text).ok_or_else(|| wrong("date_order", text, "\"dmy\" or \"mdy\"")))
        .transpose()?;
    Ok(TimeRules { zone_minutes, unit, order })
}
