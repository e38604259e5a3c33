//! Autocovariance of a series by direct sums.

use super::dot::dot;

/// Autocovariances of a series (biased: divided by its length), computed lag by lag as they are asked for.
#[derive(Debug)]
pub struct Autocovariance {
    centred: Vec<f64>,
    known: Vec<f64>,
}

impl Autocovariance {
    /// Of a series; its mean is taken off.
    pub fn new(series: &[f64]) -> Self {
        let mean = series.iter().sum::<f64>() / series.len().max(1) as f64;
        Self { centred: series.iter().map(|value| value - mean).collect(), known: Vec::new() }
    }

    /// Length of the series.
    pub fn count(&self) -> usize {
        self.centred.len()
    }

    /// At a lag in samples; zero beyond the series.
    pub fn at(&mut self, lag: usize) -> f64 {
        let count = self.centred.len();
        if lag >= count {
            return 0.0;
        }
        while self.known.len() <= lag {
            let next = self.known.len();
            let sum = dot(&self.centred[next..], &self.centred[..count - next]);
            self.known.push(sum / count as f64);
        }
        self.known[lag]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agrees_with_the_definition() {
        let series: Vec<f64> = (0..37).map(|index| f64::from(index * index % 11)).collect();
        let mean = series.iter().sum::<f64>() / 37.0;
        let mut covariance = Autocovariance::new(&series);
        for lag in [5_usize, 0, 12, 36] {
            let direct: f64 = (lag..37).map(|index| (series[index] - mean) * (series[index - lag] - mean)).sum();
            assert!((covariance.at(lag) - direct / 37.0).abs() < 1e-12);
        }
        assert!(covariance.at(37).abs() < 1e-300);
    }
}
