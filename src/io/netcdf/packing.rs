//! From raw numbers to values: mask first, in packed units, then scale and offset (CF section 8.1, NUG attribute conventions).

use super::error::NetcdfError;
use super::header::{AttributeValue, Header, NumberType, Variable};

/// How a variable's raw numbers become values.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Packing {
    missing: Vec<f64>,
    low: f64,
    high: f64,
    scale: f64,
    offset: f64,
    /// A signed byte or short that is meant unsigned: added to negative numbers.
    unsigned_turn: Option<f64>,
    /// Remarks.
    pub(super) notes: Vec<String>,
}

impl Packing {
    /// From a variable's attributes.
    pub(super) fn of(header: &Header, variable: &Variable) -> Result<Self, NetcdfError> {
        let refuse = |problem: String| NetcdfError::Variable {
            path: header.path.clone(),
            variable: variable.name.clone(),
            problem,
        };
        let Some(number) = variable.number_type() else {
            return Err(refuse("it holds no numbers".to_owned()));
        };
        let mut notes = Vec::new();
        let unsigned_turn = match variable.attribute("_Unsigned") {
            Some(AttributeValue::Text(text)) if text.trim().eq_ignore_ascii_case("true") => match number {
                NumberType::I8 => Some(256.0),
                NumberType::I16 => Some(65_536.0),
                NumberType::I32 => Some(4_294_967_296.0),
                _ => None,
            },
            _ => None,
        };
        let turned = |value: f64| match unsigned_turn {
            Some(turn) if value < 0.0 => value + turn,
            _ => value,
        };
        let mut missing = Vec::new();
        for name in ["_FillValue", "missing_value"] {
            match variable.attribute(name) {
                None => {}
                Some(AttributeValue::Numbers(values, _)) => {
                    missing.extend(values.iter().map(|v| turned(cast(*v, number))));
                }
                Some(AttributeValue::Text(text)) => {
                    for part in
                        text.split([' ', ',']).map(|part| part.trim_matches('\0')).filter(|part| !part.is_empty())
                    {
                        let value: f64 = part.parse().map_err(|_| {
                            refuse(format!("its attribute `{name}` is the text \"{text}\"; expected a number"))
                        })?;
                        notes.push(format!("variable `{}`: `{name}` is a text, read as {value}", variable.name));
                        missing.push(turned(cast(value, number)));
                    }
                }
            }
        }
        // Values that were never written hold the type's default fill, whether or not an attribute says so.
        if variable.attribute("_FillValue").is_none() {
            missing.extend(number.default_fill().map(turned));
        }
        missing.retain(|value| !value.is_nan());
        let mut factor = |name: &str, plain: f64| -> Result<f64, NetcdfError> {
            match variable.attribute(name) {
                None => Ok(plain),
                Some(AttributeValue::Numbers(values, _)) => match values[..] {
                    [value] if value.is_finite() => Ok(value),
                    _ => Err(refuse(format!("its attribute `{name}` is {values:?}; expected one finite number"))),
                },
                Some(AttributeValue::Text(text)) => {
                    let value: f64 = text.trim_matches(['\0', ' ']).parse().map_err(|_| {
                        refuse(format!("its attribute `{name}` is the text \"{text}\"; expected a number"))
                    })?;
                    notes.push(format!("variable `{}`: `{name}` is a text, read as {value}", variable.name));
                    Ok(value)
                }
            }
        };
        let scale = factor("scale_factor", 1.0)?;
        let offset = factor("add_offset", 0.0)?;
        let mut packing =
            Self { missing, low: f64::NEG_INFINITY, high: f64::INFINITY, scale, offset, unsigned_turn, notes };
        packing.take_ranges(variable, number);
        Ok(packing)
    }

    /// Limits outside which raw numbers are missing. They are stated in packed units, unless their type is that of the
    /// unpacked values (NUG, attribute conventions: where `valid_range` has the type of `scale_factor` and
    /// this is wider than the packed type).
    fn take_ranges(&mut self, variable: &Variable, number: NumberType) {
        let is_packed = number.is_integer() && (self.resolution() > 0.0 || self.offset != 0.0);
        for name in ["valid_range", "valid_min", "valid_max"] {
            let Some((values, kind)) = numbers(variable, name) else { continue };
            let (from, to) = match (name, values) {
                ("valid_range", [from, to]) => (Some(*from), Some(*to)),
                ("valid_min", [from]) => (Some(*from), None),
                ("valid_max", [to]) => (None, Some(*to)),
                _ => {
                    self.notes.push(format!(
                        "variable `{}`: `{name}` has {} values, which is not what it should have: not used",
                        variable.name,
                        values.len()
                    ));
                    continue;
                }
            };
            let unpacked = is_packed && !kind.is_integer();
            if unpacked {
                self.notes.push(format!(
                    "variable `{}`: `{name}` is taken in the units of the unpacked values, as its type says",
                    variable.name
                ));
            }
            let raw = |value: f64| {
                if unpacked {
                    (value - self.offset) / self.scale
                } else {
                    match self.unsigned_turn {
                        Some(turn) if value < 0.0 => value + turn,
                        _ => cast(value, number),
                    }
                }
            };
            // A negative scale turns the limits round; a hair of room for the rounding of the division.
            let (from, to) = (from.map(raw), to.map(raw));
            let (from, to) = if unpacked && self.scale < 0.0 { (to, from) } else { (from, to) };
            let room = if unpacked { 1e-6 } else { 0.0 };
            self.low = from.map_or(self.low, |from| self.low.max(from - room));
            self.high = to.map_or(self.high, |to| self.high.min(to + room));
        }
    }

    /// Least and greatest value that the valid range leaves, in the variable's units; `None` without a range.
    pub(super) fn valid_span(&self) -> Option<(f64, f64)> {
        if self.low.is_infinite() && self.high.is_infinite() {
            return None;
        }
        let (a, b) = (self.low * self.scale + self.offset, self.high * self.scale + self.offset);
        Some((a.min(b), a.max(b)))
    }

    /// The raw numbers that are missing, where nothing else has to be done to raw numbers: no scale, no valid range.
    pub(super) fn only_missing(&self) -> Option<&[f64]> {
        let identity = (self.scale - 1.0).abs() < f64::EPSILON && self.offset == 0.0 && self.unsigned_turn.is_none();
        (identity && self.low.is_infinite() && self.high.is_infinite()).then_some(self.missing.as_slice())
    }

    /// The value of a raw number; NaN when it is missing.
    pub(super) fn value(&self, raw: f64) -> f64 {
        let raw = match self.unsigned_turn {
            Some(turn) if raw < 0.0 => raw + turn,
            _ => raw,
        };
        if raw.is_nan() || raw < self.low || raw > self.high || self.missing.contains(&raw) {
            return f64::NAN;
        }
        raw * self.scale + self.offset
    }
}

fn numbers<'a>(variable: &'a Variable, name: &str) -> Option<(&'a [f64], NumberType)> {
    match variable.attribute(name)? {
        AttributeValue::Numbers(values, kind) => Some((values, *kind)),
        AttributeValue::Text(_) => None,
    }
}

/// An attribute's number as the variable's type would hold it: 1e20 in double is another number in float.
fn cast(value: f64, number: NumberType) -> f64 {
    match number {
        NumberType::F32 => f64::from(value as f32),
        _ => value,
    }
}

impl Packing {
    /// The step between neighbouring packed values, in the variable's units; 0 for numbers that are not packed.
    pub(super) fn resolution(&self) -> f64 {
        if (self.scale - 1.0).abs() < f64::EPSILON { 0.0 } else { self.scale.abs() }
    }
}
