//! The maximum of the composite likelihood of the scatter model, by damped scoring steps within bounds.

use super::scatter::{Evaluation, FLOOR_SD, GREATEST, LEAST, PARAMETERS, ResidualCounts, WIND_SD};
use crate::numerics::symmetric::Symmetric;

/// A maximum of the composite likelihood.
#[derive(Debug, Clone)]
pub(crate) struct Maximum {
    pub(crate) parameters: [f64; PARAMETERS],
    pub(crate) evaluation: Evaluation,
}

impl ResidualCounts {
    /// Maximises the composite log-likelihood over the free parameters: a few steps from every start, then on from the best.
    pub(crate) fn maximise(&self, starts: &[[f64; PARAMETERS]], free: &[usize]) -> Option<Maximum> {
        const FIRST_STEPS: usize = 5;
        const STEPS: usize = 80;
        let ascent = starts
            .iter()
            .map(|start| {
                let mut ascent = Ascent::new(self, start, free);
                ascent.climb(self, free, FIRST_STEPS);
                ascent
            })
            .max_by(|a, b| a.value.total_cmp(&b.value));
        ascent.map(|mut ascent| {
            ascent.climb(self, free, STEPS);
            Maximum { parameters: ascent.at, evaluation: ascent.evaluation }
        })
    }
}

/// A climb of the composite likelihood by damped scoring steps.
struct Ascent {
    at: [f64; PARAMETERS],
    evaluation: Evaluation,
    value: f64,
    damping: f64,
    ended: bool,
}

impl Ascent {
    fn new(counts: &ResidualCounts, start: &[f64; PARAMETERS], free: &[usize]) -> Self {
        let mut at = *start;
        for &index in free {
            at[index] = at[index].clamp(LEAST[index] + 1e-6, GREATEST[index]);
        }
        let evaluation = counts.evaluate(&at, free);
        let value = counts.total(&evaluation.log_density);
        Self { at, evaluation, value, damping: 1e-3, ended: false }
    }

    fn climb(&mut self, counts: &ResidualCounts, free: &[usize], steps: usize) {
        for _ in 0..steps {
            if self.ended {
                return;
            }
            self.ended = true;
            let gradient: Vec<f64> = self.evaluation.scores.iter().map(|score| counts.total(score)).collect();
            let information = counts.information(&self.evaluation);
            for _ in 0..12 {
                let trial = scoring_step(&self.at, free, &gradient, &information, self.damping);
                let evaluation = counts.evaluate(&trial, free);
                let value = counts.total(&evaluation.log_density);
                if value >= self.value {
                    self.ended = value - self.value <= 1e-8 * value.abs();
                    self.at = trial;
                    self.evaluation = evaluation;
                    self.value = value;
                    self.damping *= 0.3;
                    break;
                }
                self.damping = self.damping * 4.0 + 1e-4;
            }
        }
    }
}

/// Damped scoring step within the bounds; parameters at a bound that would leave it are held.
fn scoring_step(
    at: &[f64; PARAMETERS],
    free: &[usize],
    gradient: &[f64],
    information: &Symmetric,
    damping: f64,
) -> [f64; PARAMETERS] {
    let mut held = vec![false; free.len()];
    let mut step = vec![0.0; free.len()];
    for _ in 0..=free.len() {
        let active: Vec<usize> = (0..free.len()).filter(|&index| !held[index]).collect();
        let mut matrix = Symmetric::zeros(active.len());
        for (row, &a) in active.iter().enumerate() {
            for (column, &b) in active.iter().enumerate().take(row + 1) {
                matrix.add(row, column, information.get(a, b));
            }
            matrix.add(row, row, damping * information.get(a, a) + 1e-9);
        }
        let right: Vec<f64> = active.iter().map(|&index| gradient[index]).collect();
        step.fill(0.0);
        if let Some(solution) = matrix.solve(&right) {
            for (&index, value) in active.iter().zip(solution) {
                step[index] = value;
            }
        }
        let mut changed = false;
        for &index in &active {
            let parameter = free[index];
            let leaves = (at[parameter] <= LEAST[parameter] && step[index] < 0.0)
                || (at[parameter] >= GREATEST[parameter] && step[index] > 0.0);
            if leaves {
                held[index] = true;
                changed = true;
            }
        }
        if !changed {
            break;
        }
    }
    let mut trial = *at;
    for (&parameter, value) in free.iter().zip(&step) {
        let mut next = at[parameter] + value;
        // The likelihood is flat in a standard deviation at zero, so a step onto zero would be final.
        if matches!(parameter, FLOOR_SD | WIND_SD) {
            next = next.max(0.3 * at[parameter]);
        }
        trial[parameter] = next.clamp(LEAST[parameter], GREATEST[parameter]);
    }
    trial
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::ScatterFamily;
    use crate::science::level_wind::scatter::{STEP, TOTAL_SD, free_parameters, tests::counts};

    #[test]
    fn the_maximum_is_not_below_the_start() {
        let counts = counts();
        let free = free_parameters(ScatterFamily::RandomFloor);
        let start = [1.0, 0.5, 2.0, 0.0, 8.0, 0.01, 0.0, 0.0];
        let before = counts.total(&counts.evaluate(&start, free).log_density);
        let maximum = counts.maximise(&[start], free).unwrap();
        assert!(counts.total(&maximum.evaluation.log_density) > before);
        // The values that made the data; the composite likelihood of 6000 samples knows them to about 0.1 dB.
        assert!((maximum.parameters[FLOOR_SD] - 3.0).abs() < 0.3, "{:?}", maximum.parameters);
        assert!((maximum.parameters[TOTAL_SD] - 0.8).abs() < 0.4, "{:?}", maximum.parameters);
        let gradient: Vec<f64> = maximum.evaluation.scores.iter().map(|score| counts.total(score)).collect();
        for (&parameter, slope) in free.iter().zip(gradient) {
            let value = maximum.parameters[parameter];
            let at_bound = value <= LEAST[parameter] + 1e-9 || value >= GREATEST[parameter] - 1e-9;
            assert!(at_bound || (slope * STEP[parameter]).abs() < 0.5, "{parameter}: {slope}");
        }
    }
}
