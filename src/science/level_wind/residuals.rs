//! Residuals of a relation: by class (month, wind direction, hour) and over time.

use crate::model::{Relation, Resolved};
use crate::numerics::multiple_tests::holm;
use crate::numerics::quantile::median;
use crate::numerics::resample::{circular_block_weights, generator};
use crate::numerics::student_t::{student_t_cumulative, student_t_quantile};

/// Replicates of the bootstrap of residuals.
const REPLICATES: usize = 400;
/// Stream of random numbers for residuals.
const STREAM: u64 = 21;
/// Milliseconds of a mean Julian year.
const YEAR_MS: f64 = 365.25 * 86_400_000.0;

/// Mean residual of one class.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ResidualClass {
    /// The class, as it came in.
    pub class: u32,
    /// Samples in it.
    pub samples: usize,
    /// Mean residual, dB.
    pub mean_db: f64,
    /// Lower end of its 95 % interval, dB.
    pub low_db: f64,
    /// Upper end of its 95 % interval, dB.
    pub high_db: f64,
    /// p value of a mean of zero.
    pub p_value: f64,
    /// The same after Holm's correction for the number of classes.
    pub p_holm: f64,
}

/// Level minus fitted level, dB, in the order of the rows; NaN where level or wind is missing or nothing was fitted.
pub fn residuals(
    wind_speed_m_s: &[f64],
    levels_db: &[f64],
    deployment: Option<&[u32]>,
    relation: &Relation,
) -> Vec<f64> {
    let mut curves: Vec<(u32, Option<crate::model::MeanCurve>)> = Vec::new();
    wind_speed_m_s
        .iter()
        .zip(levels_db)
        .enumerate()
        .map(|(row, (&wind, &level))| {
            if !wind.is_finite() || wind < 0.0 || !level.is_finite() {
                return f64::NAN;
            }
            let label = deployment.and_then(|labels| labels.get(row)).copied().unwrap_or(0);
            let known = curves.iter().position(|(known, _)| *known == label).unwrap_or_else(|| {
                curves.push((label, relation.curve_of(label)));
                curves.len() - 1
            });
            curves[known].1.as_ref().map_or(f64::NAN, |curve| level - curve.level_db(wind))
        })
        .collect()
}

/// Residuals in order of time, cut at three robust scales so that single ships do not carry a mean, by block.
struct Series {
    /// Row, time and cut residual.
    rows: Vec<(usize, i64, f64)>,
    block_of: Vec<usize>,
    blocks: usize,
}

impl Series {
    fn new(times_ms: &[i64], residual_db: &[f64], block_h: f64) -> Self {
        const CUT: f64 = 3.0;
        let mut rows: Vec<(usize, i64, f64)> = times_ms
            .iter()
            .zip(residual_db)
            .enumerate()
            .filter(|(_, (_, residual))| residual.is_finite())
            .map(|(row, (&time, &residual))| (row, time, residual))
            .collect();
        rows.sort_by(|a, b| a.1.cmp(&b.1).then_with(|| a.2.total_cmp(&b.2)));
        let values: Vec<f64> = rows.iter().map(|row| row.2).collect();
        let middle = median(&values);
        let spread = 1.4826 * median(&values.iter().map(|value| (value - middle).abs()).collect::<Vec<_>>());
        if spread > 0.0 {
            for row in &mut rows {
                row.2 = row.2.clamp(middle - CUT * spread, middle + CUT * spread);
            }
        }
        let mut block_of = Vec::with_capacity(rows.len());
        let mut current = 0;
        let mut previous = None;
        for row in &rows {
            let hours = (i128::from(row.1) - i128::from(rows[0].1)) as f64 / 3.6e6;
            let block = (hours / block_h.max(1e-6)).floor();
            if previous.is_some_and(|previous| block > previous) {
                current += 1;
            }
            previous = Some(block);
            block_of.push(current);
        }
        let blocks = block_of.last().map_or(0, |last| last + 1);
        Self { rows, block_of, blocks }
    }

    /// Bootstrap standard deviation of a statistic of block sums.
    fn bootstrap_sd(&self, seed: u64, statistic: impl Fn(&[f64]) -> Option<f64>) -> Option<f64> {
        let mut generator = generator(seed, STREAM);
        let mut weights = vec![0.0; self.blocks];
        let mut values = Vec::with_capacity(REPLICATES);
        for _ in 0..REPLICATES {
            circular_block_weights(&mut generator, self.blocks, 1, &mut weights);
            values.extend(statistic(&weights));
        }
        if values.len() < REPLICATES / 2 {
            return None;
        }
        let mean = values.iter().sum::<f64>() / values.len() as f64;
        let square: f64 = values.iter().map(|value| (value - mean) * (value - mean)).sum();
        Some((square / (values.len() as f64 - 1.0)).sqrt())
    }
}

/// Mean residual of every class, against the mean of all residuals, with a block bootstrap interval (Student's t with the number
/// of blocks that the class touches) and Holm's correction. Rows without a class are left out of the classes. Classes that
/// touch fewer than four blocks are not given. `block_h` is the length of an independent block (twice
/// `RelationDiagnostics::block_length_h` is a safe choice).
pub fn residual_classes(
    times_ms: &[i64],
    residual_db: &[f64],
    class: &[Option<u32>],
    block_h: f64,
    seed: u64,
) -> Vec<ResidualClass> {
    const LEAST_BLOCKS: usize = 4;
    let series = Series::new(times_ms, residual_db, block_h);
    let overall = series.rows.iter().map(|row| row.2).sum::<f64>() / series.rows.len().max(1) as f64;
    let of_row = |row: usize| class.get(row).copied().flatten();
    let mut labels: Vec<u32> = series.rows.iter().filter_map(|row| of_row(row.0)).collect();
    labels.sort_unstable();
    labels.dedup();
    let mut classes = Vec::new();
    for label in labels {
        let mut sums = vec![(0.0, 0.0); series.blocks];
        for (row, &block) in series.rows.iter().zip(&series.block_of) {
            if of_row(row.0) == Some(label) {
                sums[block].0 += row.2 - overall;
                sums[block].1 += 1.0;
            }
        }
        let touched = sums.iter().filter(|sum| sum.1 > 0.0).count();
        if touched < LEAST_BLOCKS {
            continue;
        }
        let mean_of = |weights: &[f64]| {
            let (sum, count) = sums
                .iter()
                .zip(weights)
                .fold((0.0, 0.0), |(sum, count), (block, weight)| (sum + weight * block.0, count + weight * block.1));
            (count > 0.0).then(|| sum / count)
        };
        let mean = mean_of(&vec![1.0; series.blocks]);
        let (Some(mean), Some(sd)) = (mean, series.bootstrap_sd(seed, mean_of)) else { continue };
        let degrees = (touched - 1) as f64;
        let half = student_t_quantile(0.975, degrees) * sd;
        let p_value = if sd > 0.0 { 2.0 * (1.0 - student_t_cumulative(mean.abs() / sd, degrees)) } else { 1.0 };
        classes.push(ResidualClass {
            class: label,
            samples: sums.iter().map(|sum| sum.1 as usize).sum(),
            mean_db: mean,
            low_db: mean - half,
            high_db: mean + half,
            p_value,
            p_holm: p_value,
        });
    }
    let adjusted = holm(&classes.iter().map(|class| class.p_value).collect::<Vec<_>>());
    classes.iter_mut().zip(adjusted).for_each(|(class, p)| class.p_holm = p);
    classes
}

/// Linear trend of the residuals, dB per year, with its block bootstrap interval. `None` with fewer than eight blocks.
pub fn drift_db_per_year(times_ms: &[i64], residual_db: &[f64], block_h: f64, seed: u64) -> Option<Resolved> {
    const LEAST_BLOCKS: usize = 8;
    let series = Series::new(times_ms, residual_db, block_h);
    if series.blocks < LEAST_BLOCKS {
        return None;
    }
    let origin = series.rows[series.rows.len() / 2].1;
    // Sums of 1, t, t^2, r, t r by block.
    let mut sums = vec![[0.0; 5]; series.blocks];
    for (row, &block) in series.rows.iter().zip(&series.block_of) {
        let years = (i128::from(row.1) - i128::from(origin)) as f64 / YEAR_MS;
        for (sum, value) in sums[block].iter_mut().zip([1.0, years, years * years, row.2, years * row.2]) {
            *sum += value;
        }
    }
    let slope_of = |weights: &[f64]| {
        let mut total = [0.0; 5];
        for (block, weight) in sums.iter().zip(weights) {
            total.iter_mut().zip(block).for_each(|(total, value)| *total += weight * value);
        }
        let [count, t, tt, r, tr] = total;
        let spread = tt - t * t / count;
        (count > 0.0 && spread > 0.0).then(|| (tr - t * r / count) / spread)
    };
    let slope = slope_of(&vec![1.0; series.blocks])?;
    let sd = series.bootstrap_sd(seed, slope_of)?;
    let half = student_t_quantile(0.975, (series.blocks - 2) as f64) * sd;
    Some(Resolved::with_interval(slope, slope - half, slope + half))
}
