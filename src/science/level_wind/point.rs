//! The point estimate of a band: robust fit, deployments, scatter model, block length, onsets that can be tried.

use super::ascent::Maximum;
use super::corner::{CornerTable, Scatter};
use super::dependence::{Side, block_length_samples, independent_storms, variance_inflation};
use super::fits::{Band, Starts, grid};
use super::hard_corner;
use super::law::{Corner, Law, Parameters};
use super::need;
use super::options::{Loss, Options, ScatterModel, Segments};
use super::record::{Cells, Record, Rows};
use super::robust::{Settled, residual_scale_db, settle};
use super::scatter::{PARAMETERS, ResidualCounts, free_parameters, scatter_of, shifts_of};
use super::start;
use crate::model::{NotResolved, ScatterFamily};
use crate::numerics::quantile::sorted;

/// Fewest pairs that are fitted.
const LEAST_SAMPLES: usize = 30;
/// Fewest pairs from which the scatter model is estimated.
const LEAST_SAMPLES_FOR_SCATTER: usize = 200;
/// Residual scale up to which the data are taken as free of scatter, dB.
const NOISE_FREE_DB: f64 = 0.15;
/// Independent storms needed on each side of an onset.
pub(crate) const LEAST_STORMS: f64 = 5.0;

/// The scatter model as fitted.
#[derive(Debug, Clone)]
pub(crate) struct ScatterFit {
    pub(crate) family: ScatterFamily,
    pub(crate) gain_random_floor: Option<f64>,
    pub(crate) gain_ships: Option<f64>,
    pub(crate) counts: ResidualCounts,
    pub(crate) maximum: Maximum,
}

/// A band with its point estimate: the fit with floor and knee.
#[derive(Debug, Clone)]
pub(crate) struct PointFit {
    pub(crate) band: Band,
    pub(crate) at: Parameters,
    pub(crate) scatter: Option<ScatterFit>,
    pub(crate) settled: Settled,
    /// Whether the higher of floor and wind part counts instead of the sum of their powers.
    pub(crate) hard_corner: bool,
    pub(crate) p_deployments: Option<f64>,
    /// Length of an independent block, hours.
    pub(crate) block_h: f64,
    /// Whether the length was cut to one eighth of the record.
    pub(crate) block_capped: bool,
    /// Variance inflation of a mean residual.
    pub(crate) inflation: f64,
    /// Greatest onset with enough storms above, if there is one.
    pub(crate) greatest_testable_onset: Option<f64>,
}

impl PointFit {
    /// Fits a record that passed [`check`].
    pub(crate) fn new(record: Record, options: &Options) -> Self {
        let (mut fit, scale_db) = Self::first(record, options);
        fit.separate_deployments(options);
        fit.fit_scatter(scale_db, options);
        fit.measure_dependence();
        fit.choose_onsets();
        if let Some(hard) = hard_corner::prefer(&fit, options) {
            (fit.band, fit.at, fit.settled) = (hard.band, hard.at, hard.settled);
            (fit.hard_corner, fit.scatter) = (true, None);
            fit.measure_dependence();
        }
        fit
    }

    /// Total scatter only, deployments pooled.
    fn first(record: Record, options: &Options) -> (Self, f64) {
        let lowest = record.level_db.iter().copied().fold(f64::INFINITY, f64::min);
        let (low, high) = onset_limits(&record);
        let rows = Rows::new(&record, false);
        let level_db = match options.loss {
            Loss::LeastSquares => record.level_db.clone(),
            Loss::Tukey | Loss::Huber => start::class_medians(&record),
        };
        let mut band = Band {
            row_level_db: rows.means(&level_db),
            rows,
            segments: Segments::Pooled,
            level_db,
            table: CornerTable::plain(1.0),
            hard_corner_rounding_db: None,
            least_floor_db: lowest - 20.0,
            onsets: grid(low, high, 40),
            record,
        };
        let begin = start::hinge(&band.record, &band.level_db);
        let mut at = band.fit(Law::Knee, Corner::Floor, &begin, Starts::AndLine).at;
        let mut scale_db = 0.0;
        let mut settled = Settled::No;
        for _ in 0..2 {
            scale_db = residual_scale_db(&band, Law::Knee, Corner::Floor, &at);
            band.table.scale_db.fill(scale_db);
            band.table.scatter = Scatter::total(scale_db);
            settled = settle(&mut band, &mut at, options.loss);
        }
        let fit = Self {
            band,
            at,
            scatter: None,
            settled,
            hard_corner: false,
            p_deployments: None,
            block_h: 0.0,
            block_capped: false,
            inflation: 1.0,
            greatest_testable_onset: None,
        };
        (fit, scale_db)
    }

    /// Independent blocks in time, for tests; not more than 2000 of them (longer blocks are independent as well).
    pub(crate) fn blocks(&self) -> Cells {
        const MOST_BLOCKS: f64 = 2000.0;
        let record = &self.band.record;
        record.cells(self.block_h.max(record.span_h() / MOST_BLOCKS), 0)
    }

    /// Gives deployments their own floor and wind part where asked for or needed.
    fn separate_deployments(&mut self, options: &Options) {
        /// Level of the test of need.
        const LEVEL: f64 = 0.02;
        self.measure_block();
        if self.band.record.labels.len() < 2 || options.segments == Segments::Pooled {
            return;
        }
        let pooled = self.at.clone();
        let segments = match options.segments {
            Segments::Tested | Segments::Pooled => Segments::FloorAndWindPart,
            asked @ (Segments::FloorAndWindPart | Segments::Floor | Segments::Offset) => asked,
        };
        self.band.set_segments(segments);
        let repeated = pooled.repeated(self.band.rows.deployments());
        let cells = self.blocks();
        let p = need::p_deployments(&self.band, &repeated, &cells, options.seed);
        self.p_deployments = Some(p);
        if p < LEVEL || options.segments != Segments::Tested {
            self.at = repeated;
            self.settled = settle(&mut self.band, &mut self.at, options.loss);
        } else {
            self.band.set_segments(Segments::Pooled);
        }
    }

    /// Estimates the scatter model, and with it corner and weights, in two rounds.
    fn fit_scatter(&mut self, scale_db: f64, options: &Options) {
        let count = self.band.record.len();
        if options.scatter != ScatterModel::Estimated || scale_db <= NOISE_FREE_DB || count < LEAST_SAMPLES_FOR_SCATTER
        {
            return;
        }
        let mut found = self.choose_scatter(scale_db);
        self.use_scatter(&found.maximum, options.loss);
        let again = self.residual_counts();
        let mut begin = found.maximum.parameters;
        begin[6] = 0.0;
        begin[7] = 0.0;
        if let Some(maximum) = again.maximise(&[begin], free_parameters(found.family)) {
            found.maximum = maximum;
        }
        found.counts = again;
        self.use_scatter(&found.maximum, options.loss);
        self.scatter = Some(found);
    }

    fn residual_counts(&self) -> ResidualCounts {
        let band = &self.band;
        let excess = band.rows.sample_excess(&band.record, Law::Knee, &self.at);
        let fitted = band.fitted(Law::Knee, Corner::Floor, &self.at);
        let residual: Vec<f64> = band.record.level_db.iter().zip(&fitted).map(|(level, fit)| level - fit).collect();
        ResidualCounts::new(&excess, &residual, |d| band.table.h.value_and_slope(d))
    }

    /// Fits the families from the simplest up; a richer one must gain enough in log-likelihood after correction for dependence.
    fn choose_scatter(&self, scale_db: f64) -> ScatterFit {
        /// Gains that a random floor and then ships must bring. (Chosen on simulations: with 3 for ships, a random floor is
        /// taken for ships in 8 % of the records and its fluctuation comes out too small.)
        const LEAST_GAINS: [f64; 2] = [3.0, 4.5];
        let counts = self.residual_counts();
        let mut family = ScatterFamily::TotalScatter;
        let mut chosen = best_of(&counts, family, scale_db);
        let mut gains = [None, None];
        let richer = [ScatterFamily::RandomFloor, ScatterFamily::RandomFloorWithShips];
        for ((candidate, least), gain) in richer.into_iter().zip(LEAST_GAINS).zip(&mut gains) {
            let next = best_of(&counts, candidate, scale_db);
            let value = self.corrected_gain(&counts, &chosen, &next);
            *gain = Some(value);
            if value > least {
                family = candidate;
                chosen = next;
            }
        }
        ScatterFit { family, gain_random_floor: gains[0], gain_ships: gains[1], counts, maximum: chosen }
    }

    /// Difference of log-likelihoods divided by the variance inflation of its terms over blocks (Vuong 1989 for the idea).
    fn corrected_gain(&self, counts: &ResidualCounts, from: &Maximum, to: &Maximum) -> f64 {
        let difference: Vec<f64> = counts
            .of_sample
            .iter()
            .map(|&(group, cell)| to.evaluation.log_density[group][cell] - from.evaluation.log_density[group][cell])
            .collect();
        let mean = difference.iter().sum::<f64>() / difference.len().max(1) as f64;
        let cells = self.blocks();
        let mut sums = vec![0.0; cells.count];
        let mut squares = 0.0;
        for (&cell, value) in cells.of_sample.iter().zip(&difference) {
            sums[cell] += value - mean;
            squares += (value - mean) * (value - mean);
        }
        let inflation = (sums.iter().map(|sum| sum * sum).sum::<f64>() / squares.max(1e-9)).max(1.0);
        mean * difference.len() as f64 / inflation
    }

    /// Rebuilds corner and weights for a scatter model and settles the fit again.
    fn use_scatter(&mut self, maximum: &Maximum, loss: Loss) {
        let (floor, wind) = shifts_of(&maximum.parameters);
        self.at.floor_db.iter_mut().for_each(|value| *value += floor);
        self.at.wind_db.iter_mut().for_each(|value| *value += wind);
        self.band.table = CornerTable::new(scatter_of(&maximum.parameters), loss);
        self.weigh_rows();
        self.settled = settle(&mut self.band, &mut self.at, loss);
    }

    /// Weights of the rows, 1 / scale^2, with the range limited to ten, and mean one over samples.
    fn weigh_rows(&mut self) {
        let band = &mut self.band;
        let mut weight: Vec<f64> = band
            .row_excess(Law::Knee, &self.at)
            .iter()
            .map(|&excess| {
                let scale = band.table.scale_at(excess);
                1.0 / (scale * scale)
            })
            .collect();
        let greatest = weight.iter().copied().fold(0.0, f64::max);
        for weight in &mut weight {
            *weight = weight.max(0.1 * greatest);
        }
        let total: f64 = weight.iter().zip(&band.rows.count).map(|(weight, count)| weight * count).sum();
        let samples: f64 = band.rows.count.iter().sum();
        for weight in &mut weight {
            *weight *= samples / total;
        }
        band.rows.weight = weight;
    }

    fn measure_block(&mut self) {
        /// A block is at most this share of the record.
        const MOST_SHARE: f64 = 1.0 / 8.0;
        let band = &self.band;
        let form = band.form(Law::Knee, Corner::Floor);
        let samples = block_length_samples(&band.record, &band.rows, &band.level_db, &form, &self.at);
        let wanted = samples * band.record.step_h();
        let most = band.record.span_h() * MOST_SHARE;
        self.block_capped = wanted > most;
        self.block_h = wanted.min(most);
    }

    fn measure_dependence(&mut self) {
        self.measure_block();
        let band = &self.band;
        let fitted = band.fitted(Law::Knee, Corner::Floor, &self.at);
        let residual: Vec<f64> = band.level_db.iter().zip(&fitted).map(|(level, fit)| level - fit).collect();
        self.inflation = variance_inflation(&residual);
    }

    /// Limits the onsets to those with enough independent storms below, and fits again.
    fn choose_onsets(&mut self) {
        let (low, high) = onset_limits(&self.band.record);
        let cells = self.blocks();
        let tried = grid(low, high, 60);
        let enough = |x: f64, side| independent_storms(&self.band.record, &cells, x, side) >= LEAST_STORMS;
        let least = tried.iter().copied().find(|&x| enough(x, Side::Below));
        self.greatest_testable_onset = tried.iter().copied().rev().find(|&x| enough(x, Side::Above));
        if let Some(least) = least {
            self.band.onsets = grid(least, high, 48);
            self.at = self.band.fit(Law::Knee, Corner::Floor, &self.at, Starts::AndLine).at;
        }
    }
}

/// Whether a record can be fitted at all.
pub(crate) fn check(record: &Record) -> Result<(), NotResolved> {
    /// Least ratio of the 95 % to the 5 % quantile of the wind.
    const LEAST_WIND_RATIO: f64 = 1.5;
    if record.len() == 0 {
        return Err(NotResolved::NoData);
    }
    if record.len() < LEAST_SAMPLES {
        return Err(NotResolved::TooFewMatchups);
    }
    let [low, high] = crate::numerics::quantile::quantiles(&record.wind_m_s, [0.05, 0.95]);
    if high / low < LEAST_WIND_RATIO {
        return Err(NotResolved::WindRangeTooSmall);
    }
    Ok(())
}

/// x with max(1 %, 10) samples below, and with as many above.
pub(crate) fn onset_limits(record: &Record) -> (f64, f64) {
    let sorted = sorted(&record.x);
    let aside = (sorted.len() / 100).max(10).min(sorted.len() - 1);
    (sorted[aside], sorted[sorted.len() - 1 - aside])
}

/// The best maximum of a family over its starts.
fn best_of(counts: &ResidualCounts, family: ScatterFamily, scale_db: f64) -> Maximum {
    let starts: &[[f64; PARAMETERS]] = match family {
        ScatterFamily::FixedPowerSum | ScatterFamily::HardCorner | ScatterFamily::TotalScatter => {
            &[[0.0, 0.0, 1.0, 0.0, 8.0, 0.01, 0.0, 0.0]]
        }
        ScatterFamily::RandomFloor => &[
            [0.5, 0.3, 0.8, 0.0, 8.0, 0.01, 0.0, 0.0],
            [1.3, 0.7, 0.4, 0.0, 8.0, 0.01, 0.0, 0.0],
            [1.45, 0.55, 0.12, 0.0, 8.0, 0.01, 0.0, 0.0],
        ],
        ScatterFamily::RandomFloorWithShips => {
            &[[0.3, 0.3, 0.8, 0.2, 9.0, 0.01, 0.0, 0.0], [1.2, 0.6, 0.5, 0.1, 9.0, 0.01, 0.0, 0.0]]
        }
    };
    let scaled: Vec<[f64; PARAMETERS]> = starts
        .iter()
        .map(|start| {
            let mut start = *start;
            // The first three are standard deviations in units of the residual scale.
            start[..3].iter_mut().for_each(|value| *value *= scale_db);
            start
        })
        .collect();
    counts.maximise(&scaled, free_parameters(family)).expect("every family has a start")
}
