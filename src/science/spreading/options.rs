//! Settings of the spreading comparison.

use crate::model::SpreadClass;

/// Settings of the spreading comparison.
#[derive(Debug, Clone, PartialEq)]
pub struct SpreadOptions {
    /// Ends of the classes of f / fp. The last class (above the last end) is the reference.
    pub x_ends: Vec<f64>,
    /// Below this f / fp nothing is judged.
    pub least_x: f64,
    /// Ends of the wind classes, m/s.
    pub wind_ends_m_s: Vec<f64>,
    /// Standard uncertainty of the model's E(f) between class and reference, dB; it counts twice in the sound.
    pub density_sd_db: f64,
    /// By how much the sea may differ from the middle of the published laws in the reference class, dB: taken as the half-width of a
    /// 95 % interval.
    pub law_spread_db: f64,
    /// Where published laws differ by less than this the sound tests the density alone, dB.
    pub least_law_range_db: f64,
    /// The median level of a class must exceed the floor by this, dB.
    pub floor_margin_db: f64,
    /// Fewest windows of a class or of the reference.
    pub least_windows: usize,
    /// Fewest separate episodes of a class or of the reference.
    pub least_episodes: usize,
    /// Length of a block of the bootstrap, h: longer than the weather remembers.
    pub block_h: f64,
    /// Replicates of the bootstrap.
    pub replicates: usize,
    /// Seed of the bootstrap.
    pub seed: u64,
}

impl Default for SpreadOptions {
    fn default() -> Self {
        Self {
            x_ends: vec![1.5, 2.0, 3.0, 4.0],
            least_x: 1.5,
            wind_ends_m_s: vec![5.0, 8.0, 12.0],
            density_sd_db: 1.0,
            law_spread_db: 3.0,
            least_law_range_db: 6.0,
            floor_margin_db: 6.0,
            least_windows: 40,
            least_episodes: 6,
            block_h: 96.0,
            replicates: 400,
            seed: 1,
        }
    }
}

impl SpreadOptions {
    /// Classes of f / fp over all winds, the reference last; then each class below the reference by wind.
    pub fn classes(&self) -> Vec<SpreadClass> {
        let ends = |ends: &[f64]| -> Vec<(f64, f64)> {
            let mut lows = vec![0.0];
            lows.extend_from_slice(ends);
            let mut highs = ends.to_vec();
            highs.push(f64::INFINITY);
            lows.into_iter().zip(highs).collect()
        };
        let x = ends(&self.x_ends);
        let class =
            |(x_low, x_high), (wind_low_m_s, wind_high_m_s)| SpreadClass { x_low, x_high, wind_low_m_s, wind_high_m_s };
        let all_winds = (0.0, f64::INFINITY);
        let mut classes: Vec<SpreadClass> = x.iter().map(|x| class(*x, all_winds)).collect();
        for x in &x[..x.len() - 1] {
            if x.0 >= self.least_x {
                classes.extend(ends(&self.wind_ends_m_s).into_iter().map(|wind| class(*x, wind)));
            }
        }
        classes
    }

    /// The reference class.
    pub fn reference(&self) -> SpreadClass {
        SpreadClass {
            x_low: self.x_ends.last().copied().unwrap_or(0.0),
            x_high: f64::INFINITY,
            wind_low_m_s: 0.0,
            wind_high_m_s: f64::INFINITY,
        }
    }
}
