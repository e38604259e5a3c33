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
                Some(AttributeValue::Numbers(values)) => {
                    missing.extend(values.iter().map(|v| turned(cast(*v, number))))
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
        let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
        if let Some(range) = numbers(variable, "valid_range") {
            if let [from, to] = range[..] {
                (low, high) = (turned(from), turned(to));
            } else {
                notes.push(format!(
                    "variable `{}`: `valid_range` has {} values, not two: not used",
                    variable.name,
                    range.len()
                ));
            }
        }
        if let Some([from]) = numbers(variable, "valid_min") {
            low = turned(*from);
        }
        if let Some([to]) = numbers(variable, "valid_max") {
            high = turned(*to);
        }
        let mut factor = |name: &str, plain: f64| -> Result<f64, NetcdfError> {
            match variable.attribute(name) {
                None => Ok(plain),
                Some(AttributeValue::Numbers(values)) => match values[..] {
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
        // Ranges are stated in packed units (NUG); a range in other units would mask everything: see the check of the reader.
        Ok(Self { missing, low, high, scale, offset, unsigned_turn, notes })
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

fn numbers<'a>(variable: &'a Variable, name: &str) -> Option<&'a [f64]> {
    match variable.attribute(name)? {
        AttributeValue::Numbers(values) => Some(values),
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
