//! The usable pairs of wind and level of one band, in order of time, and their classes of wind speed.

use super::law::{BIN_LOW, BIN_WIDTH, BINS, Parameters, x_of};
use crate::model::LEAST_WIND_M_S;

/// Pairs of wind and level in order of time. Ties in time are ordered by wind, level and deployment, so that the order in
/// which rows arrive does not matter.
#[derive(Debug, Clone)]
pub(crate) struct Record {
    /// Row of the input that each sample came from.
    pub(crate) source_row: Vec<usize>,
    /// Hours since the first sample.
    pub(crate) hours: Vec<f64>,
    /// Wind speed, m/s, at least 0.5.
    pub(crate) wind_m_s: Vec<f64>,
    /// log10(wind / 10 m/s).
    pub(crate) x: Vec<f64>,
    /// Level, dB.
    pub(crate) level_db: Vec<f64>,
    /// Index into `labels`.
    pub(crate) deployment: Vec<usize>,
    /// Labels of the deployments, increasing.
    pub(crate) labels: Vec<u32>,
    /// Class of wind speed.
    pub(crate) bin: Vec<usize>,
    /// Rows of the input without usable wind or level.
    pub(crate) left_out: usize,
}

impl Record {
    /// From columns of equal length (the shortest counts). A pair is usable when the level is finite and the wind finite
    /// and not negative.
    pub(crate) fn new(times_ms: &[i64], wind_m_s: &[f64], level_db: &[f64], deployment: Option<&[u32]>) -> Self {
        let rows = times_ms.len().min(wind_m_s.len()).min(level_db.len());
        let label = |row: usize| deployment.and_then(|labels| labels.get(row)).copied().unwrap_or(0);
        let usable = |row: &usize| level_db[*row].is_finite() && wind_m_s[*row].is_finite() && wind_m_s[*row] >= 0.0;
        let mut order: Vec<usize> = (0..rows).filter(usable).collect();
        let left_out = rows - order.len();
        order.sort_by(|&a, &b| {
            times_ms[a]
                .cmp(&times_ms[b])
                .then_with(|| wind_m_s[a].total_cmp(&wind_m_s[b]))
                .then_with(|| level_db[a].total_cmp(&level_db[b]))
                .then_with(|| label(a).cmp(&label(b)))
        });
        let first_ms = order.first().map_or(0, |&row| times_ms[row]);
        let mut labels: Vec<u32> = order.iter().map(|&row| label(row)).collect();
        labels.sort_unstable();
        labels.dedup();
        let wind: Vec<f64> = order.iter().map(|&row| wind_m_s[row].max(LEAST_WIND_M_S)).collect();
        let x: Vec<f64> = wind.iter().map(|&wind| x_of(wind)).collect();
        Self {
            hours: order.iter().map(|&row| (i128::from(times_ms[row]) - i128::from(first_ms)) as f64 / 3.6e6).collect(),
            level_db: order.iter().map(|&row| level_db[row]).collect(),
            deployment: order.iter().map(|&row| labels.partition_point(|known| *known < label(row))).collect(),
            bin: x.iter().map(|&x| bin_of(x)).collect(),
            wind_m_s: wind,
            x,
            labels,
            left_out,
            source_row: order,
        }
    }

    /// Number of samples.
    pub(crate) fn len(&self) -> usize {
        self.x.len()
    }

    /// Hours from the first to the last sample.
    pub(crate) fn span_h(&self) -> f64 {
        self.hours.last().copied().unwrap_or(0.0)
    }

    /// Median time between samples, hours; 1 when it is zero.
    pub(crate) fn step_h(&self) -> f64 {
        let steps: Vec<f64> = self.hours.windows(2).map(|pair| pair[1] - pair[0]).collect();
        let median = crate::numerics::quantile::median(&steps);
        if median > 0.0 { median } else { 1.0 }
    }

    /// Cells of a length in hours. Runs of empty cells are shortened to `longest_gap` cells, so that a gap in the record
    /// (or a stray time stamp) does not count as data.
    pub(crate) fn cells(&self, length_h: f64, longest_gap: usize) -> Cells {
        let length = if length_h > 0.0 { length_h } else { 1.0 };
        let mut of_sample = Vec::with_capacity(self.len());
        let mut previous = 0.0;
        let mut current = 0;
        for hours in &self.hours {
            let cell = (hours / length).floor();
            if cell > previous {
                current += ((cell - previous - 1.0).min(longest_gap as f64)) as usize + 1;
                previous = cell;
            }
            of_sample.push(current);
        }
        let count = of_sample.last().map_or(0, |last| last + 1);
        Cells { of_sample, count }
    }
}

/// Cells in time.
#[derive(Debug, Clone)]
pub(crate) struct Cells {
    /// Cell of every sample.
    pub(crate) of_sample: Vec<usize>,
    /// Number of cells, empty ones included.
    pub(crate) count: usize,
}

/// Class of wind speed of an x.
fn bin_of(x: f64) -> usize {
    // The cast cuts negative numbers to zero.
    (((x - BIN_LOW) / BIN_WIDTH) as usize).min(BINS - 1)
}

/// Rows: the non-empty pairs of deployment and class of wind speed, ordered by deployment, then wind.
#[derive(Debug, Clone)]
pub(crate) struct Rows {
    /// Row of every sample.
    pub(crate) of_sample: Vec<usize>,
    /// Deployment of every sample, as the fit sees it (all 0 when pooled).
    pub(crate) deployment_of_sample: Vec<usize>,
    /// First row of each deployment, and the number of rows.
    pub(crate) starts: Vec<usize>,
    /// Class of each row.
    pub(crate) bin: Vec<usize>,
    /// Samples in each row.
    pub(crate) count: Vec<f64>,
    /// Mean x of each row.
    pub(crate) x: Vec<f64>,
    /// Relative weight of a sample of the row; mean 1 over samples.
    pub(crate) weight: Vec<f64>,
}

impl Rows {
    /// Rows of a record; `separate` gives every deployment its own.
    pub(crate) fn new(record: &Record, separate: bool) -> Self {
        let deployments = if separate { record.labels.len().max(1) } else { 1 };
        let deployment_of_sample: Vec<usize> = if separate { record.deployment.clone() } else { vec![0; record.len()] };
        let key = |sample: usize| deployment_of_sample[sample] * BINS + record.bin[sample];
        let mut samples_in_key = vec![0_usize; deployments * BINS];
        for sample in 0..record.len() {
            samples_in_key[key(sample)] += 1;
        }
        let mut row_of_key = vec![usize::MAX; samples_in_key.len()];
        let mut starts = vec![0; deployments + 1];
        let mut bin = Vec::new();
        let mut count = Vec::new();
        for (index, &samples) in samples_in_key.iter().enumerate() {
            if samples > 0 {
                row_of_key[index] = bin.len();
                bin.push(index % BINS);
                count.push(samples as f64);
            }
            starts[index / BINS + 1] = bin.len();
        }
        let of_sample: Vec<usize> = (0..record.len()).map(|sample| row_of_key[key(sample)]).collect();
        let mut rows =
            Self { of_sample, deployment_of_sample, starts, weight: vec![1.0; bin.len()], bin, count, x: Vec::new() };
        rows.x = rows.means(&record.x);
        rows
    }

    /// Number of rows.
    pub(crate) fn len(&self) -> usize {
        self.bin.len()
    }

    /// Number of deployments.
    pub(crate) fn deployments(&self) -> usize {
        self.starts.len() - 1
    }

    /// Deployment of every row.
    pub(crate) fn deployment_of_row(&self) -> Vec<usize> {
        (0..self.deployments())
            .flat_map(|deployment| {
                std::iter::repeat_n(deployment, self.starts[deployment + 1] - self.starts[deployment])
            })
            .collect()
    }

    /// Sum over the samples of each row.
    pub(crate) fn sums(&self, values: &[f64]) -> Vec<f64> {
        let mut sums = vec![0.0; self.len()];
        for (&row, value) in self.of_sample.iter().zip(values) {
            sums[row] += value;
        }
        sums
    }

    /// Mean over the samples of each row.
    pub(crate) fn means(&self, values: &[f64]) -> Vec<f64> {
        let mut means = self.sums(values);
        for (mean, count) in means.iter_mut().zip(&self.count) {
            *mean /= count;
        }
        means
    }

    /// Weight of each row: samples times relative weight.
    pub(crate) fn total_weight(&self) -> Vec<f64> {
        self.count.iter().zip(&self.weight).map(|(count, weight)| count * weight).collect()
    }

    /// Argument d = W - F of h for every sample.
    pub(crate) fn sample_excess(&self, record: &Record, law: super::law::Law, at: &Parameters) -> Vec<f64> {
        record
            .x
            .iter()
            .zip(&self.deployment_of_sample)
            .map(|(&x, &deployment)| {
                let term = super::law::wind_term(law, at.slope, at.bend, at.post_slope, x, super::law::POINT_WIDTH);
                at.wind_db[deployment] + term.value - at.floor_db[deployment]
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unusable_rows_are_left_out_and_counted() {
        let record = Record::new(
            &[3, 1, 2, 4, 5],
            &[5.0, f64::NAN, 3.0, -1.0, 0.0],
            &[60.0, 61.0, f64::INFINITY, 62.0, 63.0],
            None,
        );
        assert_eq!((record.len(), record.left_out), (2, 3));
        assert_eq!(record.source_row, [0, 4]);
        assert!((record.wind_m_s[1] - 0.5).abs() < 1e-15);
    }

    #[test]
    fn rows_are_ordered_by_deployment_and_wind() {
        let record = Record::new(&[0, 1, 2, 3], &[12.0, 3.0, 3.0, 12.0], &[1.0, 2.0, 3.0, 4.0], Some(&[7, 7, 9, 9]));
        let rows = Rows::new(&record, true);
        assert_eq!(rows.of_sample, [1, 0, 2, 3]);
        assert_eq!(rows.starts, [0, 2, 4]);
        assert_eq!(Rows::new(&record, false).len(), 2);
    }
}
