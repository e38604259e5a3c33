//! Random processes, each from its own stream of one seed: what is drawn for one thing never depends on another.

use rand::RngExt;
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::SeedableRng;

/// What random numbers are drawn for.
pub(super) mod purpose {
    pub(in super::super) const WAVES: u64 = 1;
    pub(in super::super) const FRONTS: u64 = 2;
    pub(in super::super) const SHIPS: u64 = 3;
    pub(in super::super) const GAPS: u64 = 4;
    pub(in super::super) const FLOOR: u64 = 5;
    pub(in super::super) const SLOW_NOISE: u64 = 6;
    pub(in super::super) const WHITE_NOISE: u64 = 7;
    pub(in super::super) const OUTLIERS: u64 = 8;
}

/// A stream of random numbers for one purpose.
#[derive(Debug)]
pub(super) struct Stream(ChaCha12Rng);

impl Stream {
    /// The stream of a purpose for one thing (a site or sensor) and one part of it (a band); different numbers give
    /// independent streams.
    pub(super) fn new(seed: u64, purpose: u64, thing: u64, part: u64) -> Self {
        let mut generator = ChaCha12Rng::seed_from_u64(seed);
        generator.set_stream((purpose << 56) | ((thing & 0xff_ffff) << 24) | (part & 0xff_ffff));
        Self(generator)
    }

    /// Uniform on [0, 1).
    pub(super) fn uniform(&mut self) -> f64 {
        self.0.random::<f64>()
    }

    /// Standard normal (Box and Muller 1958), with `libm` so that every processor draws the same.
    pub(super) fn normal(&mut self) -> f64 {
        let radius = (-2.0 * libm::log(1.0 - self.uniform())).sqrt();
        radius * libm::cos(2.0 * std::f64::consts::PI * self.uniform())
    }

    /// Exponential with this mean.
    pub(super) fn exponential(&mut self, mean: f64) -> f64 {
        -mean * libm::log(1.0 - self.uniform())
    }

    /// A stationary first-order autoregressive series of standard deviation 1: correlation falls to 1/e in `scale` steps.
    pub(super) fn autoregressive(&mut self, length: usize, scale: f64) -> Vec<f64> {
        let kept = libm::exp(-1.0 / scale);
        let fresh = (1.0 - kept * kept).sqrt();
        let mut value = self.normal();
        (0..length)
            .map(|step| {
                if step > 0 {
                    value = kept * value + fresh * self.normal();
                }
                value
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_autoregressive_series_has_its_variance_and_its_memory() {
        let series = Stream::new(3, purpose::FLOOR, 0, 0).autoregressive(200_000, 8.0);
        let mean = |values: &mut dyn Iterator<Item = f64>| values.sum::<f64>() / 200_000.0;
        let variance = mean(&mut series.iter().map(|v| v * v));
        assert!((variance - 1.0).abs() < 0.05, "{variance}");
        // Closed form: correlation at lag 8 is 1/e.
        let lag = mean(&mut series.iter().zip(&series[8..]).map(|(a, b)| a * b));
        assert!((lag - (-1.0_f64).exp()).abs() < 0.05, "{lag}");
    }

    #[test]
    fn streams_are_repeatable_and_differ() {
        let draw = |seed, thing| Stream::new(seed, purpose::SHIPS, thing, 0).normal().to_bits();
        assert_eq!(draw(1, 2), draw(1, 2));
        assert_ne!(draw(1, 2), draw(1, 3));
        assert_ne!(draw(1, 2), draw(2, 2));
    }
}
