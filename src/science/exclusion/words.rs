//! The words of a condition: numbers, names, signs.

use super::expression::ExpressionError;

/// What a word is.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Kind {
    Number(f64),
    Name(String),
    Sign(&'static str),
}

/// A word with its place.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Word {
    /// Characters from 1.
    pub(super) at: usize,
    pub(super) kind: Kind,
}

impl Word {
    pub(super) fn text(&self) -> String {
        match &self.kind {
            Kind::Number(number) => number.to_string(),
            Kind::Name(name) => name.clone(),
            Kind::Sign(sign) => (*sign).to_owned(),
        }
    }
}

/// Longest first, so that `<=` is not read as `<`.
const SIGNS: [&str; 13] = ["<=", ">=", "!=", "==", "<", ">", "=", "+", "-", "*", "/", "(", ")"];

/// Splits a condition into its words.
pub(super) fn words(text: &str) -> Result<Vec<Word>, ExpressionError> {
    let mut words = Vec::new();
    let mut rest = text;
    let mut at = 1;
    while let Some(first) = rest.chars().next() {
        let (kind, length) = if first.is_whitespace() {
            at += 1;
            rest = &rest[first.len_utf8()..];
            continue;
        } else if let Some(sign) = SIGNS.iter().find(|sign| rest.starts_with(**sign)) {
            (Kind::Sign(if *sign == "==" { "=" } else { sign }), sign.len())
        } else if first.is_ascii_digit() || first == '.' {
            number(rest, at)?
        } else if first.is_ascii_alphabetic() || first == '_' {
            let length = rest.find(|c: char| !c.is_ascii_alphanumeric() && c != '_').unwrap_or(rest.len());
            (Kind::Name(rest[..length].to_owned()), length)
        } else {
            let problem =
                format!("`{first}` is not understood; expected a column, a number or one of {}", SIGNS.join(" "));
            return Err(ExpressionError { at, problem });
        };
        words.push(Word { at, kind });
        // Everything that is read here is ASCII: bytes are characters.
        at += length;
        rest = &rest[length..];
    }
    Ok(words)
}

fn number(rest: &str, at: usize) -> Result<(Kind, usize), ExpressionError> {
    let bytes = rest.as_bytes();
    let digits = |from: usize| from + bytes[from..].iter().take_while(|b| b.is_ascii_digit() || **b == b'.').count();
    let mut length = digits(0);
    if matches!(bytes.get(length), Some(b'e' | b'E')) {
        let signed = length + 1 + usize::from(matches!(bytes.get(length + 1), Some(b'+' | b'-')));
        if bytes.get(signed).is_some_and(u8::is_ascii_digit) {
            length = digits(signed);
        }
    }
    let text = &rest[..length];
    match text.parse::<f64>() {
        Ok(number) if number.is_finite() => Ok((Kind::Number(number), length)),
        _ => Err(ExpressionError { at, problem: format!("`{text}` is no number") }),
    }
}
