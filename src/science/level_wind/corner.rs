//! The corner between floor and wind part: the scatter model and the table h that follows from it.
//!
//! `level = 10 log10(10^((F+a)/10) [+ ship] + 10^((W+b)/10)) + c` with normal a (floor), b (wind part) and c (whole level),
//! each of its own standard deviation, and, with probability `outlier_share`, an upward outlier; with probability `ship_share` a ship adds
//! power at F + a + G dB, G ~ Gamma(2) with mean `ship_mean_db`. h(d) is the location, in the sense of the loss, of
//! level - F at W - F = d, so that robust means of levels estimate exactly what the table predicts.

use super::options::Loss;
use crate::numerics::ramp_table::RampTable;

/// First argument of the table, dB.
pub(crate) const TABLE_START_DB: f64 = -45.0;
/// Step of the table, dB.
pub(crate) const TABLE_STEP_DB: f64 = 1.0;
/// Number of entries.
pub(crate) const TABLE_LENGTH: usize = 91;
/// ln(10) / 10: natural logarithm of a power ratio of one decibel.
pub(crate) const NEPER_PER_DB: f64 = std::f64::consts::LN_10 / 10.0;
/// Least scale of the scatter, dB.
const LEAST_SCALE_DB: f64 = 0.1;
/// Least rounding of a hard corner: the table needs a width.
const LEAST_ROUNDING_DB: f64 = 1e-6;

/// Gauss-Hermite nodes and weights for a standard normal variable (numpy 2.4.6, `hermegauss`), checked by moments below.
const NORMAL_7: [(f64, f64); 7] = [
    (-3.750_439_717_725_742_5, 0.000_548_268_855_972_217),
    (-2.366_759_410_734_541, 0.030_757_123_967_586_52),
    (-1.154_405_394_739_968_2, 0.240_123_178_605_012_7),
    (0.0, 0.457_142_857_142_857_24),
    (1.154_405_394_739_968_2, 0.240_123_178_605_012_7),
    (2.366_759_410_734_541, 0.030_757_123_967_586_52),
    (3.750_439_717_725_742_5, 0.000_548_268_855_972_217),
];
const NORMAL_5: [(f64, f64); 5] = [
    (-2.856_970_013_872_805_6, 0.011_257_411_327_720_677),
    (-1.355_626_179_974_266, 0.222_075_922_005_612_57),
    (0.0, 0.533_333_333_333_333_5),
    (1.355_626_179_974_266, 0.222_075_922_005_612_57),
    (2.856_970_013_872_805_6, 0.011_257_411_327_720_677),
];
const NORMAL_3: [(f64, f64); 3] =
    [(-1.732_050_807_568_877_2, 1.0 / 6.0), (0.0, 2.0 / 3.0), (1.732_050_807_568_877_2, 1.0 / 6.0)];
/// Quantiles 0.1, 0.3, 0.5, 0.7, 0.9 of Gamma(2), divided by their mean (scipy 1.17.1).
pub(crate) const SHIP_QUANTILES: [f64; 5] = [
    0.275_937_671_032_367_3,
    0.569_374_531_758_797,
    0.870_833_115_154_745_5,
    1.265_620_578_644_834_7,
    2.018_234_103_409_255_5,
];
/// Levels over the undisturbed one that stand for outliers, dB.
pub(crate) const OUTLIERS_DB: [f64; 4] = [3.0, 7.0, 12.0, 22.0];

/// Parameters of the scatter model.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Scatter {
    /// Standard deviation of the floor, dB.
    pub(crate) floor_sd_db: f64,
    /// Standard deviation of the wind part, dB.
    pub(crate) wind_sd_db: f64,
    /// Standard deviation of the whole level, dB.
    pub(crate) total_sd_db: f64,
    /// Share of time with a ship.
    pub(crate) ship_share: f64,
    /// Mean level of a ship over the floor, dB.
    pub(crate) ship_mean_db: f64,
    /// Share of outliers.
    pub(crate) outlier_share: f64,
}

impl Scatter {
    /// Only the whole level fluctuates.
    pub(crate) fn total(sd_db: f64) -> Self {
        Self { total_sd_db: sd_db, ..Self::NONE }
    }

    /// Nothing fluctuates.
    pub(crate) const NONE: Self = Self {
        floor_sd_db: 0.0,
        wind_sd_db: 0.0,
        total_sd_db: 0.0,
        ship_share: 0.0,
        ship_mean_db: 8.0,
        outlier_share: 0.0,
    };

    /// Parameters in the order floor, wind part, whole level, ship share, ship mean, outlier share.
    pub(crate) fn to_array(self) -> [f64; 6] {
        [self.floor_sd_db, self.wind_sd_db, self.total_sd_db, self.ship_share, self.ship_mean_db, self.outlier_share]
    }

    /// Inverse of [`Self::to_array`].
    pub(crate) fn from_array(values: [f64; 6]) -> Self {
        let [floor_sd_db, wind_sd_db, total_sd_db, ship_share, ship_mean_db, outlier_share] = values;
        Self { floor_sd_db, wind_sd_db, total_sd_db, ship_share, ship_mean_db, outlier_share }
    }
}

/// 10 log10(10^(a/10) + 10^(b/10)): powers of two levels added.
pub(crate) fn power_sum_db(a: f64, b: f64) -> f64 {
    a.max(b) + libm::log1p(libm::exp(-(a - b).abs() * NEPER_PER_DB)) / NEPER_PER_DB
}

/// Share of `wind` in the power of `floor` and `wind` together.
pub(crate) fn wind_share(floor: f64, wind: f64) -> f64 {
    1.0 / (1.0 + libm::exp(((floor - wind) * NEPER_PER_DB).clamp(-50.0, 50.0)))
}

/// h for levels that add in power without scatter: 10 log10(1 + 10^(d/10)).
pub(crate) fn plain_table() -> RampTable {
    RampTable::new(TABLE_START_DB, TABLE_STEP_DB, arguments().map(|d| power_sum_db(0.0, d)).collect())
}

/// What h adds to the wind part far above the floor: nothing for a fixed power sum, the bias of the loss under outliers
/// otherwise.
#[inline]
pub(crate) fn top_offset_db(table: &RampTable) -> f64 {
    /// 10 log10(1 + 10^4.5), the power sum at the top of the table.
    const POWER_SUM_AT_TOP_DB: f64 = 45.000_137_333_802_38;
    let (argument, value) = table.end();
    // The table of a hard corner ends early: there the level is the wind part itself.
    if argument < -TABLE_START_DB { value - argument } else { value - POWER_SUM_AT_TOP_DB }
}

fn arguments() -> impl Iterator<Item = f64> {
    (0..TABLE_LENGTH).map(|index| TABLE_START_DB + TABLE_STEP_DB * index as f64)
}

/// The table h and the scale of the scatter along it.
#[derive(Debug, Clone)]
pub(crate) struct CornerTable {
    pub(crate) h: RampTable,
    /// Standard deviation of the level without ships and outliers, at the arguments of the table, dB.
    pub(crate) scale_db: Vec<f64>,
    pub(crate) scatter: Scatter,
}

impl CornerTable {
    /// Fixed power sum with one scale everywhere.
    pub(crate) fn plain(scale_db: f64) -> Self {
        Self { h: plain_table(), scale_db: vec![scale_db; TABLE_LENGTH], scatter: Scatter::total(scale_db) }
    }

    /// The higher of floor and wind part, with one scale everywhere. As a mean over a class of winds does, the corner is
    /// rounded: over `rounding_db` to both sides.
    pub(crate) fn hard(scale_db: f64, rounding_db: f64) -> Self {
        let rounding_db = rounding_db.max(LEAST_ROUNDING_DB);
        // Cubic pieces with slope 0 at the left and 1 at the right end are here the parabola (d + r)^2 / (4 r), which is the
        // mean of max(0, d') over d - r to d + r.
        let h = RampTable::new(-rounding_db, 2.0 * rounding_db, vec![0.0, rounding_db]);
        Self { h, scale_db: vec![scale_db; TABLE_LENGTH], scatter: Scatter::total(scale_db) }
    }

    /// For a scatter model.
    pub(crate) fn new(scatter: Scatter, loss: Loss) -> Self {
        let scale_db: Vec<f64> = arguments().map(|d| scale_at(&scatter, d).max(LEAST_SCALE_DB)).collect();
        let values = locations(&scatter, &scale_db, loss, None);
        Self { h: RampTable::new(TABLE_START_DB, TABLE_STEP_DB, values), scale_db, scatter }
    }

    /// Values of h for another scatter model with the scale of this one.
    pub(crate) fn values_for(&self, scatter: Scatter, loss: Loss) -> Vec<f64> {
        locations(&scatter, &self.scale_db, loss, Some(self.h.values()))
    }

    /// Scale of the scatter at an argument, linear between entries, dB.
    pub(crate) fn scale_at(&self, excess_db: f64) -> f64 {
        let position = ((excess_db - TABLE_START_DB) / TABLE_STEP_DB).clamp(0.0, (TABLE_LENGTH - 1) as f64);
        let index = (position as usize).min(TABLE_LENGTH - 2);
        let part = position - index as f64;
        self.scale_db[index] + part * (self.scale_db[index + 1] - self.scale_db[index])
    }
}

/// Standard deviation of the level at W - F = d, without ships and outliers, dB.
fn scale_at(scatter: &Scatter, d: f64) -> f64 {
    let (mut mean, mut square, mut share) = (0.0, 0.0, 0.0);
    for (node, weight) in NORMAL_7 {
        let floor = scatter.floor_sd_db * node;
        let level = power_sum_db(floor, d);
        let wind = wind_share(floor, d);
        mean += weight * level;
        square += weight * level * level;
        share += weight * wind * wind;
    }
    let wind_part = scatter.wind_sd_db * scatter.wind_sd_db * share;
    ((square - mean * mean).max(0.0) + wind_part + scatter.total_sd_db * scatter.total_sd_db).sqrt()
}

/// h at the arguments of the table: the location M with E psi((level - F - M) / scale) = 0, by Newton's method.
fn locations(scatter: &Scatter, scale_db: &[f64], loss: Loss, start: Option<&[f64]>) -> Vec<f64> {
    let common = common_nodes(scatter);
    let floors = floor_nodes(scatter);
    let winds: Vec<(f64, f64)> = if scatter.wind_sd_db > 0.0 {
        NORMAL_3.iter().map(|(node, weight)| (scatter.wind_sd_db * node, *weight)).collect()
    } else {
        vec![(0.0, 1.0)]
    };
    let mut values: Vec<f64> = Vec::with_capacity(TABLE_LENGTH);
    let mut nodes = Vec::with_capacity(floors.len() * winds.len());
    for (index, d) in arguments().enumerate() {
        nodes.clear();
        for (floor, floor_weight) in &floors {
            for (wind, wind_weight) in &winds {
                nodes.push((power_sum_db(*floor, d + wind), floor_weight * wind_weight));
            }
        }
        let guess = match start {
            Some(start) => start[index],
            None if index == 0 => power_sum_db(0.0, d),
            None => values[index - 1] + (power_sum_db(0.0, d) - power_sum_db(0.0, d - TABLE_STEP_DB)).max(0.0),
        };
        values.push(location(&nodes, &common, guess, scale_db[index], loss));
    }
    values
}

fn location(nodes: &[(f64, f64)], common: &[(f64, f64)], guess: f64, scale_db: f64, loss: Loss) -> f64 {
    if loss == Loss::LeastSquares {
        let mean: f64 = nodes.iter().map(|(level, weight)| level * weight).sum();
        return mean + common.iter().map(|(level, weight)| level * weight).sum::<f64>();
    }
    let mut location = guess;
    for _ in 0..8 {
        let (mut sum, mut slope) = (0.0, 0.0);
        for (level, weight) in nodes {
            for (shift, share) in common {
                let (psi, derivative) = loss.psi((level + shift - location) / scale_db);
                sum += weight * share * psi;
                slope += weight * share * derivative;
            }
        }
        // A flat psi must not throw the iteration far away.
        let step = sum / slope.max(0.2) * scale_db;
        location += step;
        if step.abs() < 1e-4 {
            break;
        }
    }
    location
}

/// Nodes of c: five normal ones and four outliers. Nodes without weight are left out.
fn common_nodes(scatter: &Scatter) -> Vec<(f64, f64)> {
    let share = 1.0 - scatter.outlier_share;
    let normal = NORMAL_5.iter().map(|(node, weight)| (scatter.total_sd_db * node, share * weight));
    let outliers = OUTLIERS_DB.iter().map(|shift| (*shift, scatter.outlier_share / OUTLIERS_DB.len() as f64));
    normal.chain(outliers).filter(|(_, weight)| *weight > 0.0).collect()
}

/// Nodes of the floor: seven normal ones, each without a ship and with five sizes of ships.
pub(crate) fn floor_nodes(scatter: &Scatter) -> Vec<(f64, f64)> {
    let normal: &[(f64, f64)] = if scatter.floor_sd_db > 0.0 { &NORMAL_7 } else { &[(0.0, 1.0)] };
    let mut nodes = Vec::new();
    for (node, weight) in normal {
        let floor = scatter.floor_sd_db * node;
        nodes.push((floor, weight * (1.0 - scatter.ship_share)));
        if scatter.ship_share > 0.0 {
            for quantile in SHIP_QUANTILES {
                let ship = floor + scatter.ship_mean_db * quantile;
                nodes.push((power_sum_db(floor, ship), weight * scatter.ship_share / SHIP_QUANTILES.len() as f64));
            }
        }
    }
    nodes
}

#[cfg(test)]
mod tests {
    use super::*;

    fn moment(nodes: &[(f64, f64)], order: i32) -> f64 {
        nodes.iter().map(|(node, weight)| weight * node.powi(order)).sum()
    }

    #[test]
    fn nodes_have_the_moments_of_a_normal_variable() {
        for (order, expected) in [(0, 1.0), (1, 0.0), (2, 1.0), (3, 0.0), (4, 3.0)] {
            for nodes in [&NORMAL_7[..], &NORMAL_5[..], &NORMAL_3[..]] {
                assert!((moment(nodes, order) - expected).abs() < 1e-12, "{order}");
            }
        }
        assert!((moment(&NORMAL_7, 12) - 10_395.0).abs() < 1e-6);
        assert!((moment(&NORMAL_5, 8) - 105.0).abs() < 1e-9);
    }

    #[test]
    fn ship_quantiles_are_those_of_a_gamma_variable() {
        // P(G < q) = 1 - (1 + q) exp(-q) for Gamma(2); closed form. The mean of the five quantiles is solved for first.
        let quantile = |probability: f64| {
            let (mut low, mut high) = (0.0_f64, 20.0_f64);
            for _ in 0..80 {
                let middle = 0.5 * (low + high);
                if 1.0 - (1.0 + middle) * libm::exp(-middle) < probability { low = middle } else { high = middle }
            }
            low
        };
        let quantiles = [0.1, 0.3, 0.5, 0.7, 0.9].map(quantile);
        let mean = quantiles.iter().sum::<f64>() / 5.0;
        for (expected, used) in quantiles.iter().zip(SHIP_QUANTILES) {
            assert!((expected / mean - used).abs() < 1e-10);
        }
    }

    #[test]
    fn without_scatter_the_table_is_the_power_sum() {
        let table = CornerTable::new(Scatter::total(2.0), Loss::Tukey);
        for (value, d) in table.h.values().iter().zip(arguments()) {
            assert!((value - 10.0 * libm::log10(1.0 + libm::pow(10.0, d / 10.0))).abs() < 1e-6);
        }
        assert!(top_offset_db(&table.h).abs() < 1e-9);
    }

    #[test]
    fn a_hard_corner_is_the_mean_of_the_higher_level_over_a_class() {
        let table = CornerTable::hard(1.0, 0.3);
        for d in [-5.0, -0.31, -0.2, 0.0, 0.1, 0.29, 0.5, 40.0] {
            // Midpoint rule over the class.
            let steps = 20_000;
            let mean: f64 = (0..steps)
                .map(|index| (d - 0.3 + 0.6 * (f64::from(index) + 0.5) / f64::from(steps)).max(0.0))
                .sum::<f64>()
                / f64::from(steps);
            assert!((table.h.value_and_slope(d).0 - mean).abs() < 1e-7, "{d}");
        }
        assert!(top_offset_db(&table.h).abs() < 1e-12);
    }

    #[test]
    fn a_random_floor_lifts_the_corner() {
        // Least squares, d = 0: the second derivative of 10 log10(1 + 10^(d/10)) is LN10/40 there, so the lift is close to
        // that times sd^2 / 2 (Taylor series; higher terms take some of it off).
        let scatter = Scatter { floor_sd_db: 1.5, ..Scatter::total(1.0) };
        let table = CornerTable::new(scatter, Loss::LeastSquares);
        let lift = table.h.values()[45] - 10.0 * libm::log10(2.0);
        let expected = std::f64::consts::LN_10 / 40.0 * 1.5 * 1.5 / 2.0;
        assert!((lift - expected).abs() < 0.05 * expected, "{lift} {expected}");
    }
}
