//! Straight lines by least squares.

/// A straight line `intercept + slope * x`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Value at x = 0.
    pub intercept: f64,
    /// Change per unit of x.
    pub slope: f64,
}

/// Ordinary least squares of a straight line. `None` when fewer than two points are given or all x are equal.
pub fn straight_line(x: &[f64], y: &[f64]) -> Option<Line> {
    let count = x.len().min(y.len());
    if count < 2 {
        return None;
    }
    let x_mean = x[..count].iter().sum::<f64>() / count as f64;
    let y_mean = y[..count].iter().sum::<f64>() / count as f64;
    let mut spread = 0.0;
    let mut product = 0.0;
    for (x, y) in x.iter().zip(y) {
        spread += (x - x_mean) * (x - x_mean);
        product += (x - x_mean) * (y - y_mean);
    }
    if spread <= f64::EPSILON * count as f64 {
        return None;
    }
    let slope = product / spread;
    Some(Line { intercept: y_mean - slope * x_mean, slope })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_is_recovered() {
        let x = [0.0, 1.0, 2.0, 5.0];
        let y = x.map(|x| 3.0 - 2.0 * x);
        let line = straight_line(&x, &y).unwrap();
        assert!((line.slope + 2.0).abs() < 1e-12 && (line.intercept - 3.0).abs() < 1e-12);
        assert_eq!(straight_line(&[1.0, 1.0], &[2.0, 3.0]), None);
    }
}
