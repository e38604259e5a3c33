//! What can be wrong with a study file.

use std::path::PathBuf;

/// A study file that cannot be used. The message is one line: file, line where there is one, what was found, what was
/// expected.
#[derive(Debug, thiserror::Error)]
pub enum StudyError {
    /// The file cannot be read.
    #[error("study file {}: cannot be read: {source}", path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// The system's cause.
        source: std::io::Error,
    },
    /// A key that no section knows.
    #[error("{}, line {line}: unknown key `{key}`{}; known here: {known}", path.display(), hint(suggestion.as_deref()))]
    UnknownKey {
        /// The file.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// The key as written.
        key: String,
        /// The nearest known key.
        suggestion: Option<String>,
        /// All keys of the section.
        known: String,
    },
    /// A value or a structure that does not fit.
    #[error("{}, line {line}: {problem}", path.display())]
    Value {
        /// The file.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// What was found and what was expected.
        problem: String,
    },
    /// A section or key that the work needs.
    #[error("{}: {problem}", path.display())]
    Lacking {
        /// The file.
        path: PathBuf,
        /// What lacks, and how to give it.
        problem: String,
    },
}

fn hint(suggestion: Option<&str>) -> String {
    suggestion.map(|key| format!(", did you mean `{key}`?")).unwrap_or_default()
}

/// Where a byte of the study text stands, and how to complain about it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Complaint<'a> {
    pub(super) path: &'a std::path::Path,
    pub(super) text: &'a str,
}

impl Complaint<'_> {
    /// The error for a problem at a byte of the text.
    pub(super) fn at(&self, byte: usize, problem: impl Into<String>) -> StudyError {
        StudyError::Value { path: self.path.to_owned(), line: line_of(self.text, byte), problem: problem.into() }
    }

    /// The error for something that is not there.
    pub(super) fn lacking(&self, problem: impl Into<String>) -> StudyError {
        StudyError::Lacking { path: self.path.to_owned(), problem: problem.into() }
    }

    /// The parser's error in our one line.
    pub(super) fn parser(&self, error: &toml::de::Error) -> StudyError {
        let line = error.span().map_or(1, |span| line_of(self.text, span.start));
        let message = error.message().lines().map(str::trim).collect::<Vec<_>>().join(" ");
        if let Some(rest) = message.strip_prefix("unknown field `")
            && let Some((key, rest)) = rest.split_once('`')
        {
            let known: Vec<String> = rest.split('`').skip(1).step_by(2).map(str::to_owned).collect();
            let suggestion = known
                .iter()
                .map(|candidate| (strsim::damerau_levenshtein(key, candidate), candidate))
                .filter(|(distance, candidate)| *distance <= 1 + candidate.len() / 4)
                .min_by_key(|(distance, _)| *distance)
                .map(|(_, candidate)| candidate.clone());
            return StudyError::UnknownKey {
                path: self.path.to_owned(),
                line,
                key: key.to_owned(),
                suggestion,
                known: known.join(", "),
            };
        }
        StudyError::Value { path: self.path.to_owned(), line, problem: message }
    }
}

fn line_of(text: &str, byte: usize) -> usize {
    1 + text[..byte.min(text.len())].matches('\n').count()
}
