//! Whether the levels lag the wind: every lag is refitted on the same rows and judged by held-out blocks of time. Never from
//! the correlation of residuals, which a fit at the wrong lag has already shaped.

use super::corner::CornerTable;
use super::fits::{Band, Starts, grid};
use super::law::{Corner, Law, x_of};
use super::options::Segments;
use super::point::onset_limits;
use super::record::{Record, Rows};
use super::robust::huber;
use super::start;
use crate::model::LEAST_WIND_M_S;
use crate::numerics::quantile::median;
use rayon::prelude::*;

/// Held-out loss at one lag.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LagLoss {
    /// Steps by which the level follows the wind.
    pub steps: i32,
    /// Mean Huber loss of held-out samples, in units of the residual scale squared.
    pub loss: f64,
    /// Gain over no lag in standard errors of paired blocks; 0 at no lag.
    pub gain_in_standard_errors: f64,
}

/// Result of a search.
#[derive(Debug, Clone, PartialEq)]
pub struct LagSearch {
    /// Chosen lag in steps: 0 unless another lag predicts better by more than two standard errors.
    pub steps: i32,
    /// Length of a step, hours.
    pub step_h: f64,
    /// Every lag that was tried, in increasing order.
    pub losses: Vec<LagLoss>,
    /// Rows on which all lags were fitted.
    pub samples: usize,
}

/// Tries lags of up to `greatest_steps` in both directions. A positive lag means that the level follows the wind.
/// `None` when fewer than 100 rows have wind at all lags, or fewer than ten blocks remain.
pub fn search_lag(
    times_ms: &[i64],
    wind_speed_m_s: &[f64],
    levels_db: &[f64],
    greatest_steps: u32,
    block_h: f64,
) -> Option<LagSearch> {
    /// Fewest rows.
    const LEAST_ROWS: usize = 100;
    /// Fewest blocks.
    const LEAST_BLOCKS: usize = 10;
    /// Standard errors by which another lag must win.
    const CLEAR: f64 = 2.0;
    let greatest = i32::try_from(greatest_steps.min(1000)).ok()?;
    let lags: Vec<i32> = (-greatest..=greatest).collect();
    let aligned = Aligned::new(times_ms, wind_speed_m_s, levels_db, &lags)?;
    let step_h = aligned.step_ms as f64 / 3.6e6;
    if aligned.level_db.len() < LEAST_ROWS {
        return None;
    }
    let first = *aligned.times_ms.first()?;
    let blocks: Vec<usize> = aligned
        .times_ms
        .iter()
        .map(|time| ((i128::from(*time) - i128::from(first)) as f64 / 3.6e6 / block_h.max(step_h)).floor() as usize)
        .collect();
    let compact = compact(&blocks);
    let count = compact.last()? + 1;
    if count < LEAST_BLOCKS {
        return None;
    }
    let scale_db = scale_without_lag(&aligned, greatest as usize)?;
    let losses: Vec<Vec<f64>> =
        aligned.wind_m_s.par_iter().map(|wind| block_losses(&aligned, wind, &compact, count, scale_db)).collect();
    let none = &losses[greatest as usize];
    let result: Vec<LagLoss> = lags
        .iter()
        .zip(&losses)
        .map(|(&steps, losses)| {
            let gains: Vec<f64> = none.iter().zip(losses).map(|(none, loss)| none - loss).collect();
            LagLoss {
                steps,
                loss: losses.iter().sum::<f64>() / aligned.level_db.len() as f64,
                gain_in_standard_errors: standard_errors(&gains),
            }
        })
        .collect();
    let best = result.iter().min_by(|a, b| a.loss.total_cmp(&b.loss))?;
    let steps = if best.gain_in_standard_errors > CLEAR { best.steps } else { 0 };
    Some(LagSearch { steps, step_h, losses: result, samples: aligned.level_db.len() })
}

/// Rows that have wind at every lag.
struct Aligned {
    step_ms: i64,
    times_ms: Vec<i64>,
    level_db: Vec<f64>,
    /// By lag.
    wind_m_s: Vec<Vec<f64>>,
}

impl Aligned {
    fn new(times_ms: &[i64], wind_m_s: &[f64], levels_db: &[f64], lags: &[i32]) -> Option<Self> {
        let rows = times_ms.len().min(wind_m_s.len()).min(levels_db.len());
        let mut order: Vec<usize> = (0..rows).collect();
        order.sort_by(|&a, &b| {
            times_ms[a]
                .cmp(&times_ms[b])
                .then_with(|| wind_m_s[a].total_cmp(&wind_m_s[b]))
                .then_with(|| levels_db[a].total_cmp(&levels_db[b]))
        });
        let steps: Vec<f64> =
            order.windows(2).map(|pair| times_ms[pair[1]].saturating_sub(times_ms[pair[0]]) as f64).collect();
        let step_ms = median(&steps) as i64;
        if step_ms <= 0 {
            return None;
        }
        let windy: Vec<(i64, f64)> = order
            .iter()
            .filter(|&&row| wind_m_s[row].is_finite() && wind_m_s[row] >= 0.0)
            .map(|&row| (times_ms[row], wind_m_s[row]))
            .collect();
        let wind_at = |time: i64| -> Option<f64> {
            let after = windy.partition_point(|(known, _)| *known < time);
            [after.checked_sub(1), Some(after)]
                .into_iter()
                .flatten()
                .filter_map(|index| windy.get(index))
                .filter(|(known, _)| known.abs_diff(time) <= step_ms.unsigned_abs() / 4)
                .min_by_key(|(known, _)| known.abs_diff(time))
                .map(|(_, wind)| *wind)
        };
        let mut aligned =
            Self { step_ms, times_ms: Vec::new(), level_db: Vec::new(), wind_m_s: vec![Vec::new(); lags.len()] };
        for row in order.into_iter().filter(|&row| levels_db[row].is_finite()) {
            let winds: Option<Vec<f64>> = lags
                .iter()
                .map(|&lag| wind_at(times_ms[row].saturating_sub(i64::from(lag).saturating_mul(step_ms))))
                .collect();
            if let Some(winds) = winds {
                aligned.times_ms.push(times_ms[row]);
                aligned.level_db.push(levels_db[row]);
                aligned.wind_m_s.iter_mut().zip(winds).for_each(|(column, wind)| column.push(wind));
            }
        }
        Some(aligned)
    }
}

/// Numbers blocks without leaving any out.
fn compact(blocks: &[usize]) -> Vec<usize> {
    let mut current = 0;
    let mut previous = blocks.first().copied().unwrap_or(0);
    blocks
        .iter()
        .map(|&block| {
            if block != previous {
                current += 1;
                previous = block;
            }
            current
        })
        .collect()
}

/// A band with the plain corner, fitted to class medians.
fn quick_fit(times_ms: &[i64], wind_m_s: &[f64], level_db: &[f64]) -> Option<(Band, super::law::Parameters)> {
    let record = Record::new(times_ms, wind_m_s, level_db, None);
    if record.len() < 30 {
        return None;
    }
    let (low, high) = onset_limits(&record);
    let rows = Rows::new(&record, false);
    let medians = start::class_medians(&record);
    let lowest = record.level_db.iter().copied().fold(f64::INFINITY, f64::min);
    let band = Band {
        row_level_db: rows.means(&medians),
        rows,
        segments: Segments::Pooled,
        level_db: medians,
        table: CornerTable::plain(1.0),
        hard_corner_rounding_db: None,
        least_floor_db: lowest - 20.0,
        // A lag shows long before the onset is sharp: a coarse profile will do.
        onsets: grid(low, high, 8),
        record,
    };
    let begin = start::hinge(&band.record, &band.level_db);
    let at = band.fit(Law::Knee, Corner::Floor, &begin, Starts::AndLine).at;
    Some((band, at))
}

fn scale_without_lag(aligned: &Aligned, index: usize) -> Option<f64> {
    let (band, at) = quick_fit(&aligned.times_ms, &aligned.wind_m_s[index], &aligned.level_db)?;
    Some(super::robust::residual_scale_db(&band, Law::Knee, Corner::Floor, &at))
}

/// Sum of held-out Huber losses by block.
fn block_losses(aligned: &Aligned, wind_m_s: &[f64], blocks: &[usize], count: usize, scale_db: f64) -> Vec<f64> {
    const FOLDS: usize = 5;
    let mut losses = vec![0.0; count];
    for fold in 0..FOLDS {
        let train: Vec<usize> = (0..blocks.len()).filter(|&row| blocks[row] % FOLDS != fold).collect();
        let times: Vec<i64> = train.iter().map(|&row| aligned.times_ms[row]).collect();
        let wind: Vec<f64> = train.iter().map(|&row| wind_m_s[row]).collect();
        let level: Vec<f64> = train.iter().map(|&row| aligned.level_db[row]).collect();
        let Some((mut band, at)) = quick_fit(&times, &wind, &level) else {
            return vec![f64::INFINITY; count];
        };
        // One step of a robust fit: residuals cut at two scales.
        let fitted = band.fitted(Law::Knee, Corner::Floor, &at);
        let cut: Vec<f64> = band
            .record
            .level_db
            .iter()
            .zip(&fitted)
            .map(|(level, fit)| fit + (level - fit).clamp(-2.0 * scale_db, 2.0 * scale_db))
            .collect();
        band.set_levels(cut);
        let at = band.fit(Law::Knee, Corner::Floor, &at, Starts::Given).at;
        let form = band.form(Law::Knee, Corner::Floor).at_points();
        for row in (0..blocks.len()).filter(|&row| blocks[row] % FOLDS == fold) {
            let x = x_of(wind_m_s[row].max(LEAST_WIND_M_S));
            losses[blocks[row]] += huber((aligned.level_db[row] - form.level(&at, 0, x).level_db) / scale_db);
        }
    }
    losses
}

/// Sum over its standard error, for independent terms.
fn standard_errors(gains: &[f64]) -> f64 {
    let count = gains.len() as f64;
    let mean = gains.iter().sum::<f64>() / count;
    let variance = gains.iter().map(|gain| (gain - mean) * (gain - mean)).sum::<f64>() / (count - 1.0).max(1.0);
    if variance > 0.0 { mean * count.sqrt() / variance.sqrt() } else { 0.0 }
}
