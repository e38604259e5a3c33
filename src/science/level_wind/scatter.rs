//! Fit of the scatter model to the residuals by composite likelihood (Varin, Reid and Firth 2011).
//!
//! Residuals are counted by groups of d = W - F and cells of 0.6 dB, so the cost does not depend on the number of samples.
//! Free are the parameters of the family and two shifts of floor and wind part; without the shifts the location parameters
//! creep. The derivatives are exact; the maximum is found by damped scoring steps within bounds.

use super::corner::{NEPER_PER_DB, SHIP_QUANTILES, Scatter, power_sum_db, wind_share};
use crate::model::ScatterFamily;
use crate::numerics::symmetric::Symmetric;

/// Parameters: the six of [`Scatter`], then the shifts of floor and wind part, dB.
pub(crate) const PARAMETERS: usize = 8;
pub(crate) const FLOOR_SD: usize = 0;
pub(crate) const WIND_SD: usize = 1;
pub(crate) const TOTAL_SD: usize = 2;
const SHIP_SHARE: usize = 3;
const SHIP_MEAN: usize = 4;
const OUTLIER_SHARE: usize = 5;
const FLOOR_SHIFT: usize = 6;
const WIND_SHIFT: usize = 7;

/// Least values of the parameters.
pub(crate) const LEAST: [f64; PARAMETERS] = [0.0, 0.0, 0.25, 0.0, 3.0, 0.0, -12.0, -8.0];
/// Greatest values of the parameters.
pub(crate) const GREATEST: [f64; PARAMETERS] = [8.0, 6.0, 8.0, 0.45, 20.0, 0.15, 6.0, 8.0];
/// A step that matters, per parameter.
pub(crate) const STEP: [f64; PARAMETERS] = [0.05, 0.05, 0.05, 0.01, 0.2, 0.005, 0.05, 0.05];

/// Inner edges of the groups of d, dB.
const GROUP_EDGES_DB: [f64; 14] = [-12.0, -9.0, -7.0, -5.0, -3.0, -1.5, 0.0, 1.5, 3.0, 5.0, 7.0, 9.0, 12.0, 16.0];
const GROUPS: usize = GROUP_EDGES_DB.len() + 1;
/// Lower edge of the first cell of residuals, dB.
const CELL_START_DB: f64 = -20.0;
/// Width of a cell of residuals, dB.
const CELL_WIDTH_DB: f64 = 0.6;
const CELLS: usize = 100;
/// Nodes of the floor, in its standard deviations: a uniform grid. Seven Gauss-Hermite nodes make the density lumpy and pull
/// the standard deviation of the floor down.
const NODE_STEP: f64 = 0.3;
const NODES_EACH_SIDE: i32 = 12;
/// With a ship, every third node serves: the sizes of ships spread the density anyway.
const SHIP_NODE_STRIDE: i32 = 3;

/// Parameters that a family leaves free.
pub(crate) fn free_parameters(family: ScatterFamily) -> &'static [usize] {
    match family {
        ScatterFamily::FixedPowerSum | ScatterFamily::HardCorner | ScatterFamily::TotalScatter => {
            &[TOTAL_SD, OUTLIER_SHARE, FLOOR_SHIFT, WIND_SHIFT]
        }
        ScatterFamily::RandomFloor => &[FLOOR_SD, WIND_SD, TOTAL_SD, OUTLIER_SHARE, FLOOR_SHIFT, WIND_SHIFT],
        ScatterFamily::RandomFloorWithShips => {
            &[FLOOR_SD, WIND_SD, TOTAL_SD, SHIP_SHARE, SHIP_MEAN, OUTLIER_SHARE, FLOOR_SHIFT, WIND_SHIFT]
        }
    }
}

/// One group of d with its counts of residuals.
#[derive(Debug, Clone)]
struct Group {
    mean_excess_db: f64,
    variance_db2: f64,
    /// h and h' at the mean.
    table_db: f64,
    wind_share: f64,
    counts: [f64; CELLS],
}

/// Counts of residuals, and the group and cell of every sample.
#[derive(Debug, Clone)]
pub(crate) struct ResidualCounts {
    groups: Vec<Group>,
    /// Group and cell of every sample.
    pub(crate) of_sample: Vec<(usize, usize)>,
}

impl ResidualCounts {
    /// Counts residuals (dB) by d (dB); `h` gives value and slope of the corner table.
    pub(crate) fn new(excess_db: &[f64], residual_db: &[f64], h: impl Fn(f64) -> (f64, f64)) -> Self {
        let clipped = |d: f64| d.clamp(-40.0, 40.0);
        let group_of = |d: f64| GROUP_EDGES_DB.partition_point(|edge| *edge <= d);
        let mut count = [0.0; GROUPS];
        let mut sum = [0.0; GROUPS];
        for &d in excess_db {
            count[group_of(clipped(d))] += 1.0;
            sum[group_of(clipped(d))] += clipped(d);
        }
        let mut square = [0.0; GROUPS];
        for &d in excess_db {
            let group = group_of(clipped(d));
            let off = clipped(d) - sum[group] / count[group];
            square[group] += off * off;
        }
        let mut index_of_group = [usize::MAX; GROUPS];
        let mut groups = Vec::new();
        for group in (0..GROUPS).filter(|group| count[*group] > 0.0) {
            index_of_group[group] = groups.len();
            let mean = sum[group] / count[group];
            let (table_db, wind_share) = h(mean);
            groups.push(Group {
                mean_excess_db: mean,
                variance_db2: square[group] / count[group],
                table_db,
                wind_share,
                counts: [0.0; CELLS],
            });
        }
        let mut of_sample = Vec::with_capacity(excess_db.len());
        for (&d, &residual) in excess_db.iter().zip(residual_db) {
            let group = index_of_group[group_of(clipped(d))];
            let cell = (((residual - CELL_START_DB) / CELL_WIDTH_DB) as usize).min(CELLS - 1);
            groups[group].counts[cell] += 1.0;
            of_sample.push((group, cell));
        }
        Self { groups, of_sample }
    }

    /// Log-density of every cell and, for the parameters in `free`, its derivatives.
    pub(crate) fn evaluate(&self, parameters: &[f64; PARAMETERS], free: &[usize]) -> Evaluation {
        let nodes = nodes(parameters, free);
        let mut evaluation = Evaluation { log_density: Vec::new(), scores: Vec::new() };
        let mut density = [0.0; CELLS];
        let mut derivatives = vec![[0.0; CELLS]; free.len()];
        for group in &self.groups {
            density.fill(0.0);
            for derivative in &mut derivatives {
                derivative.fill(0.0);
            }
            for node in &nodes {
                add_node(node, group, parameters, free, &mut density, &mut derivatives);
            }
            finish_group(parameters, free, &density, &mut derivatives, &mut evaluation);
        }
        evaluation
    }

    /// Sum over all samples of a quantity per group and cell.
    pub(crate) fn total(&self, per_cell: &[[f64; CELLS]]) -> f64 {
        self.groups
            .iter()
            .zip(per_cell)
            .map(|(group, values)| group.counts.iter().zip(values).map(|(count, value)| count * value).sum::<f64>())
            .sum()
    }

    /// Outer-product information of the free parameters.
    pub(crate) fn information(&self, evaluation: &Evaluation) -> Symmetric {
        let size = evaluation.scores.len();
        let mut information = Symmetric::zeros(size);
        for row in 0..size {
            for column in 0..=row {
                let mut sum = 0.0;
                for (index, group) in self.groups.iter().enumerate() {
                    let (a, b) = (&evaluation.scores[row][index], &evaluation.scores[column][index]);
                    for cell in 0..CELLS {
                        sum += group.counts[cell] * a[cell] * b[cell];
                    }
                }
                information.add(row, column, sum);
            }
        }
        information
    }
}

/// Log-density by group and cell, and its derivatives by free parameter, group and cell.
#[derive(Debug, Clone)]
pub(crate) struct Evaluation {
    pub(crate) log_density: Vec<[f64; CELLS]>,
    pub(crate) scores: Vec<Vec<[f64; CELLS]>>,
}

/// A node of the floor, with or without a ship, and its derivatives.
#[derive(Debug, Clone, Copy)]
struct Node {
    /// Level of floor and ship, dB over F.
    floor_db: f64,
    weight: f64,
    by_floor_sd: f64,
    by_ship_mean: f64,
    /// Derivative of the logarithm of the weight by the share of ships.
    weight_by_ship_share: f64,
    /// Variance between neighbouring nodes in units of the floor's variance.
    grain: f64,
}

fn nodes(parameters: &[f64; PARAMETERS], free: &[usize]) -> Vec<Node> {
    let spread = parameters[FLOOR_SD] > 0.0 || free.contains(&FLOOR_SD);
    let ships = parameters[SHIP_SHARE] > 0.0 || free.contains(&SHIP_SHARE);
    let range = if spread { -NODES_EACH_SIDE..=NODES_EACH_SIDE } else { 0..=0 };
    let density = |step: i32| libm::exp(-0.5 * (NODE_STEP * f64::from(step)) * (NODE_STEP * f64::from(step)));
    let total: f64 = range.clone().map(density).sum();
    let in_ship_grid = |step: &i32| step.rem_euclid(SHIP_NODE_STRIDE) == 0;
    let ship_total: f64 = range.clone().filter(in_ship_grid).map(density).sum();
    let ship_step = NODE_STEP * f64::from(SHIP_NODE_STRIDE);
    let share = parameters[SHIP_SHARE];
    let mut nodes = Vec::new();
    for step in range {
        let node = NODE_STEP * f64::from(step);
        let floor = parameters[FLOOR_SD] * node + parameters[FLOOR_SHIFT];
        nodes.push(Node {
            floor_db: floor,
            weight: density(step) / total * (1.0 - share),
            by_floor_sd: node,
            by_ship_mean: 0.0,
            weight_by_ship_share: -1.0 / (1.0 - share),
            grain: NODE_STEP * NODE_STEP / 12.0,
        });
        if !ships || !in_ship_grid(&step) {
            continue;
        }
        // A share of exactly zero would hide its own derivative.
        let used_share = share.max(1e-9);
        for quantile in SHIP_QUANTILES {
            let excess = parameters[SHIP_MEAN] * quantile;
            nodes.push(Node {
                floor_db: power_sum_db(floor, floor + excess),
                weight: density(step) / ship_total * used_share / SHIP_QUANTILES.len() as f64,
                by_floor_sd: node,
                by_ship_mean: quantile * wind_share(0.0, excess),
                weight_by_ship_share: 1.0 / used_share,
                grain: ship_step * ship_step / 12.0,
            });
        }
    }
    nodes
}

/// Adds a node's kernel, and its derivatives, to the density of a group.
fn add_node(
    node: &Node,
    group: &Group,
    parameters: &[f64; PARAMETERS],
    free: &[usize],
    density: &mut [f64; CELLS],
    derivatives: &mut [[f64; CELLS]],
) {
    /// Variance of a cell of 0.6 dB, dB squared.
    const CELL_VARIANCE_DB2: f64 = 0.03;
    if node.weight < 1e-14 {
        return;
    }
    let wind = group.mean_excess_db + parameters[WIND_SHIFT];
    let share = wind_share(node.floor_db, wind);
    let floor_share = 1.0 - share;
    let grain = node.grain;
    let (floor_sd, wind_sd, total_sd) = (parameters[FLOOR_SD], parameters[WIND_SD], parameters[TOTAL_SD]);
    // The fluctuation of the wind part is carried to second order: it moves the centre by half the curvature of the power sum
    // times its variance. Without that term the fluctuations of floor and wind part come out too small.
    let curvature = NEPER_PER_DB * share * floor_share;
    let centre = power_sum_db(node.floor_db, wind) + 0.5 * curvature * wind_sd * wind_sd - group.table_db;
    let centre_by_share = 0.5 * NEPER_PER_DB * (1.0 - 2.0 * share) * wind_sd * wind_sd;
    let off = share - group.wind_share;
    let variance = total_sd * total_sd
        + share * share * wind_sd * wind_sd
        + grain * floor_sd * floor_sd * floor_share * floor_share
        + off * off * group.variance_db2
        + CELL_VARIANCE_DB2;
    let sd = variance.sqrt();
    let variance_by_share = 2.0 * share * wind_sd * wind_sd - 2.0 * grain * floor_sd * floor_sd * floor_share
        + 2.0 * off * group.variance_db2;
    let share_by_wind = curvature;

    let by_floor_level = floor_share - centre_by_share * share_by_wind;

    let first = ((centre - 5.0 * sd - CELL_START_DB) / CELL_WIDTH_DB).max(0.0) as usize;
    let end = (((centre + 5.0 * sd - CELL_START_DB) / CELL_WIDTH_DB + 1.0).max(0.0) as usize).min(CELLS);
    if first >= end {
        return;
    }
    // The kernel along the cells by recurrence: exp(-(u + s)^2/2) = exp(-u^2/2) exp(-u s - s^2/2).
    let step = CELL_WIDTH_DB / sd;
    let mut u = (CELL_START_DB + (first as f64 + 0.5) * CELL_WIDTH_DB - centre) / sd;
    let normaliser = node.weight / (sd * (2.0 * std::f64::consts::PI).sqrt());
    let mut value = normaliser * libm::exp(-0.5 * u * u);
    let mut ratio = libm::exp(-u * step - 0.5 * step * step);
    let ratio_of_ratios = libm::exp(-step * step);
    let mut kernel = [0.0; CELLS];
    let mut offsets = [0.0; CELLS];
    for cell in first..end {
        kernel[cell] = value;
        offsets[cell] = u;
        density[cell] += value;
        value *= ratio;
        ratio *= ratio_of_ratios;
        u += step;
    }
    for (&parameter, derivative) in free.iter().zip(derivatives) {
        let (weight, centre_by, variance_by) = match parameter {
            FLOOR_SD => (
                0.0,
                by_floor_level * node.by_floor_sd,
                2.0 * grain * floor_sd * floor_share * floor_share
                    - variance_by_share * share_by_wind * node.by_floor_sd,
            ),
            WIND_SD => (0.0, curvature * wind_sd, 2.0 * wind_sd * share * share),
            TOTAL_SD => (0.0, 0.0, 2.0 * total_sd),
            SHIP_SHARE => (node.weight_by_ship_share, 0.0, 0.0),
            SHIP_MEAN => {
                (0.0, by_floor_level * node.by_ship_mean, -variance_by_share * share_by_wind * node.by_ship_mean)
            }
            FLOOR_SHIFT => (0.0, by_floor_level, -variance_by_share * share_by_wind),
            WIND_SHIFT => (0.0, share + centre_by_share * share_by_wind, variance_by_share * share_by_wind),
            _ => continue,
        };
        let linear = centre_by / sd;
        let square = variance_by / (2.0 * variance);
        let constant = weight - square;
        for cell in first..end {
            let u = offsets[cell];
            derivative[cell] += kernel[cell] * (constant + u * (linear + square * u));
        }
    }
}

/// Mixes in the outliers and takes logarithms.
fn finish_group(
    parameters: &[f64; PARAMETERS],
    free: &[usize],
    density: &[f64; CELLS],
    derivatives: &mut [[f64; CELLS]],
    evaluation: &mut Evaluation,
) {
    let share = parameters[OUTLIER_SHARE];
    let mut log_density = [0.0; CELLS];
    let mut inverse = [0.0; CELLS];
    for cell in 0..CELLS {
        let outlier = outlier_density(cell);
        let mixed = (1.0 - share) * density[cell] + share * outlier + 1e-12;
        log_density[cell] = libm::log(mixed);
        inverse[cell] = 1.0 / mixed;
    }
    evaluation.log_density.push(log_density);
    if evaluation.scores.is_empty() {
        evaluation.scores.resize(free.len(), Vec::new());
    }
    for ((&parameter, derivative), scores) in free.iter().zip(derivatives).zip(&mut evaluation.scores) {
        let mut score = [0.0; CELLS];
        for cell in 0..CELLS {
            let change = if parameter == OUTLIER_SHARE {
                outlier_density(cell) - density[cell]
            } else {
                (1.0 - share) * derivative[cell]
            };
            score[cell] = change * inverse[cell];
        }
        scores.push(score);
    }
}

/// Density of an outlier's residual: exponential upward with mean 9 dB, and a tenth spread over all cells.
fn outlier_density(cell: usize) -> f64 {
    let residual = CELL_START_DB + (cell as f64 + 0.5) * CELL_WIDTH_DB;
    let upward = if residual > 0.0 { 0.9 * libm::exp(-residual / 9.0) / 9.0 } else { 0.0 };
    upward + 0.1 / 60.0
}

/// Scatter model of a vector of parameters.
pub(crate) fn scatter_of(parameters: &[f64; PARAMETERS]) -> Scatter {
    let [a, b, c, d, e, f, _, _] = *parameters;
    Scatter::from_array([a, b, c, d, e, f])
}

/// Shifts of floor and wind part, dB.
pub(crate) fn shifts_of(parameters: &[f64; PARAMETERS]) -> (f64, f64) {
    (parameters[FLOOR_SHIFT], parameters[WIND_SHIFT])
}

#[cfg(test)]
pub(crate) mod tests {
    use super::*;
    use crate::science::level_wind::corner::plain_table;

    /// Residuals of a pseudo-random floor and wind part added in power.
    pub(crate) fn counts() -> ResidualCounts {
        let mut state = 1_u64;
        let mut normal = || {
            let mut sum = -6.0;
            for _ in 0..12 {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                sum += (state >> 11) as f64 / (1_u64 << 53) as f64;
            }
            sum
        };
        let table = plain_table();
        let excess: Vec<f64> = (0..6000).map(|index| f64::from(index % 61) * 0.6 - 18.0).collect();
        let residual: Vec<f64> = excess
            .iter()
            .map(|&d| power_sum_db(3.0 * normal(), d + normal()) + 0.8 * normal() - table.value_and_slope(d).0)
            .collect();
        ResidualCounts::new(&excess, &residual, |d| table.value_and_slope(d))
    }

    #[test]
    fn scores_are_derivatives_of_the_log_likelihood() {
        let counts = counts();
        let free = free_parameters(ScatterFamily::RandomFloorWithShips);
        let at = [2.0, 1.0, 1.5, 0.2, 8.0, 0.02, 0.3, -0.2];
        let evaluation = counts.evaluate(&at, free);
        for (&parameter, score) in free.iter().zip(&evaluation.scores) {
            let value = |shift: f64| {
                let mut moved = at;
                moved[parameter] += shift;
                counts.total(&counts.evaluate(&moved, &[]).log_density)
            };
            let numeric = (value(1e-4) - value(-1e-4)) / 2e-4;
            let exact = counts.total(score);
            // The kernel is cut five standard deviations off, which the difference quotient sees as small steps.
            assert!((numeric - exact).abs() < 2e-3 * exact.abs().max(100.0), "{parameter}: {numeric} {exact}");
        }
    }
}
