//! A tabulated function that is constant far to the left and rises with slope one far to the right.

use serde::{Deserialize, Serialize};

/// Cubic Hermite interpolation in a table of equal steps: constant below the table, slope one above it, slopes inside from a
/// five-point difference (three-point next to the ends).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(from = "Plain", into = "Plain")]
pub struct RampTable {
    start: f64,
    step: f64,
    inverse_step: f64,
    values: Vec<f64>,
    /// Coefficients of each piece in its own coordinate, 0 to 1.
    pieces: Vec<[f64; 4]>,
}

/// What is written of a table.
#[derive(Debug, Clone, Serialize, Deserialize)]
struct Plain {
    start: f64,
    step: f64,
    values: Vec<f64>,
}

impl From<Plain> for RampTable {
    fn from(plain: Plain) -> Self {
        Self::new(plain.start, plain.step, plain.values)
    }
}

impl From<RampTable> for Plain {
    fn from(table: RampTable) -> Self {
        Self { start: table.start, step: table.step, values: table.values }
    }
}

impl RampTable {
    /// A table of at least two values at `start`, `start + step`, ... With fewer values the function is zero up to `start`
    /// and rises from there.
    pub fn new(start: f64, step: f64, mut values: Vec<f64>) -> Self {
        let fallback = values.last().copied().unwrap_or(0.0);
        while values.len() < 2 {
            values.push(fallback);
        }
        let mut table =
            Self { start, step, inverse_step: 1.0 / step, pieces: vec![[0.0; 4]; values.len() - 1], values };
        table.interpolate();
        table
    }

    /// The tabulated values.
    pub fn values(&self) -> &[f64] {
        &self.values
    }

    /// Argument of each tabulated value.
    pub fn arguments(&self) -> impl Iterator<Item = f64> {
        let (start, step) = (self.start, self.step);
        (0..self.values.len()).map(move |index| start + step * index as f64)
    }

    /// The value at the last entry of the table, and the argument there.
    pub fn end(&self) -> (f64, f64) {
        let last = self.values.len() - 1;
        (self.start + self.step * last as f64, self.values[last])
    }

    /// Changes the values in place, without allocating; `change` sees all values.
    pub fn update(&mut self, change: impl FnOnce(&mut [f64])) {
        change(&mut self.values);
        self.interpolate();
    }

    /// Value and slope at an argument.
    #[inline]
    pub fn value_and_slope(&self, argument: f64) -> (f64, f64) {
        let position = (argument - self.start) * self.inverse_step;
        if position <= 0.0 {
            return (self.values[0], 0.0);
        }
        // A NaN argument ends in the first piece and stays NaN.
        let index = position as usize;
        let Some(&[c0, c1, c2, c3]) = self.pieces.get(index) else {
            let (end, value) = self.end();
            return (value + (argument - end), 1.0);
        };
        let part = position - index as f64;
        let value = c0 + part * (c1 + part * (c2 + part * c3));
        let slope = (c1 + part * (2.0 * c2 + part * 3.0 * c3)) * self.inverse_step;
        (value, slope)
    }

    fn slope_at(&self, index: usize) -> f64 {
        let values = &self.values;
        let last = values.len() - 1;
        if index == 0 {
            0.0
        } else if index == last {
            1.0
        } else if index == 1 || index + 1 == last {
            (values[index + 1] - values[index - 1]) / (2.0 * self.step)
        } else {
            (8.0 * (values[index + 1] - values[index - 1]) - (values[index + 2] - values[index - 2]))
                / (12.0 * self.step)
        }
    }

    fn interpolate(&mut self) {
        let mut left = self.slope_at(0) * self.step;
        for index in 0..self.pieces.len() {
            let right = self.slope_at(index + 1) * self.step;
            let (a, b) = (self.values[index], self.values[index + 1]);
            self.pieces[index] = [a, left, 3.0 * (b - a) - 2.0 * left - right, 2.0 * (a - b) + left + right];
            left = right;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn constant_below_and_slope_one_above() {
        let table = RampTable::new(-2.0, 1.0, vec![1.0, 1.0, 1.5, 2.2, 3.0]);
        assert_eq!(table.value_and_slope(-9.0), (1.0, 0.0));
        let (value, slope) = table.value_and_slope(7.0);
        assert!((value - 8.0).abs() < 1e-12 && (slope - 1.0).abs() < 1e-12);
        for (argument, value) in table.arguments().zip(table.values()) {
            assert!((table.value_and_slope(argument).0 - value).abs() < 1e-12);
        }
    }

    #[test]
    fn the_slope_is_the_derivative() {
        let table = RampTable::new(-2.0, 1.0, vec![1.0, 1.1, 1.5, 2.2, 3.0]);
        for argument in [-1.7, -0.3, 0.4, 1.9, 2.5] {
            let step = 1e-6;
            let numeric = (table.value_and_slope(argument + step).0 - table.value_and_slope(argument - step).0) / 2e-6;
            assert!((numeric - table.value_and_slope(argument).1).abs() < 1e-6);
        }
    }
}
