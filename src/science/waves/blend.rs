//! Overlap under linear weights of nodes and steps, as a quadratic form.
//!
//! A site between nodes and steps gets the spectrum sum `w_a E_a`. Its overlap is the sum over all pairs of stored spectra of
//! `w_a w_b O_ab`. Per step of a site three numbers a frequency are kept (total, diagonal, own), and one for each pair of
//! neighbouring steps; from these the overlap at any instant between steps, and its mean over any window, is exact.

use super::opposing::Opposing;
use crate::model::OverlapParts;

/// Overlap at one site and native step, frequency by frequency; the meanings are those of [`OverlapParts`].
#[derive(Debug, Clone, PartialEq, Default)]
pub struct StepOverlap {
    /// Overlap of the spectrum blended over nodes.
    pub total: Vec<f64>,
    /// Nodes with themselves, squared weights.
    pub diagonal: Vec<f64>,
    /// Nodes on their own, plain weights.
    pub own: Vec<f64>,
}

impl StepOverlap {
    /// Room for so many frequencies.
    pub fn with_frequencies(frequencies: usize) -> Self {
        Self {
            total: vec![f64::NAN; frequencies],
            diagonal: vec![f64::NAN; frequencies],
            own: vec![f64::NAN; frequencies],
        }
    }
}

/// The spectrum of a site from those of its nodes: sum of weight times density, into `out`. Nodes of weight zero are left
/// out, so that a missing neighbour that is not needed does no harm.
pub fn blend_nodes<T: Copy + Into<f64>>(nodes: &[(&[T], f64)], out: &mut [f64]) {
    out.fill(0.0);
    for (densities, weight) in nodes.iter().filter(|(_, weight)| *weight != 0.0) {
        for (sum, density) in out.iter_mut().zip(*densities) {
            *sum += weight * (*density).into();
        }
    }
}

/// Overlap of one step. `blended` is what [`blend_nodes`] made of the same nodes; `out` has room for the frequencies. No
/// memory is taken.
pub fn step_overlap<T: Copy + Into<f64>>(
    table: &Opposing,
    nodes: &[(&[T], f64)],
    blended: &[f64],
    out: &mut StepOverlap,
) {
    let frequencies = out.total.len();
    let directions = blended.len() / frequencies.max(1);
    let used = nodes.iter().filter(|(_, weight)| *weight != 0.0);
    let single = used.clone().count() == 1;
    for k in 0..frequencies {
        let row = k * directions..(k + 1) * directions;
        out.total[k] = table.own(&blended[row.clone()]);
        if single {
            // One node of weight one: the blend is the node.
            (out.diagonal[k], out.own[k]) = (out.total[k], out.total[k]);
            continue;
        }
        let (mut diagonal, mut own) = (0.0, 0.0);
        for (densities, weight) in used.clone() {
            let overlap = table.own(&densities[row.clone()]);
            diagonal += weight * weight * overlap;
            own += weight * overlap;
        }
        (out.diagonal[k], out.own[k]) = (diagonal, own);
    }
}

/// Overlap of the blended spectra of two neighbouring steps, frequency by frequency, into `out`.
pub fn pair_overlap(table: &Opposing, earlier: &[f64], later: &[f64], out: &mut [f64]) {
    let directions = earlier.len() / out.len().max(1);
    let rows = earlier.chunks_exact(directions).zip(later.chunks_exact(directions));
    for (overlap, (before, after)) in out.iter_mut().zip(rows) {
        *overlap = table.overlap(before, after);
    }
}

/// What a step and the pair with its successor weigh in a mean over time.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct StepWeight {
    /// Position of the step.
    pub step: usize,
    /// Mean of its linear weight: for densities and moments.
    pub linear: f64,
    /// Mean of the square of its weight.
    pub square: f64,
    /// Mean of twice the product of its weight and that of the next step.
    pub with_next: f64,
}

/// Weights of the mean over [start, end) (an instant when they are equal) of a series that runs linearly between steps.
/// `None` where the window leaves the steps or meets a gap longer than `max_gap_ms`.
pub fn window_weights(steps_ms: &[i64], start_ms: i64, end_ms: i64, max_gap_ms: i64) -> Option<Vec<StepWeight>> {
    let (first, last) = (*steps_ms.first()?, *steps_ms.last()?);
    if start_ms < first || end_ms > last || end_ms < start_ms {
        return None;
    }
    let from = steps_ms.partition_point(|step| *step <= start_ms) - 1;
    if start_ms == end_ms && steps_ms[from] == start_ms {
        return Some(vec![StepWeight { step: from, linear: 1.0, square: 1.0, with_next: 0.0 }]);
    }
    let length = (end_ms - start_ms) as f64;
    let mut weights = vec![StepWeight { step: from, ..StepWeight::default() }];
    for step in from..steps_ms.len() - 1 {
        let (begin, stop) = (steps_ms[step], steps_ms[step + 1]);
        if begin > end_ms || (begin == end_ms && step > from) {
            break;
        }
        if stop - begin > max_gap_ms {
            return None;
        }
        let span = (stop - begin) as f64;
        let low = (start_ms.max(begin) - begin) as f64 / span;
        let high = (end_ms.min(stop) - begin) as f64 / span;
        let share = if length > 0.0 { (high - low) * span / length } else { 1.0 };
        let mean = mean_products(low, high);
        if let Some(before) = weights.last_mut() {
            before.linear += share * mean.before;
            before.square += share * mean.before_squared;
            before.with_next = share * mean.twice_product;
        }
        weights.push(StepWeight {
            step: step + 1,
            linear: share * (1.0 - mean.before),
            square: share * mean.after_squared,
            with_next: 0.0,
        });
    }
    Some(weights)
}

struct MeanProducts {
    before: f64,
    before_squared: f64,
    after_squared: f64,
    twice_product: f64,
}

/// Means over t in [low, high] of 1 - t, (1 - t)^2, t^2 and 2 t (1 - t).
fn mean_products(low: f64, high: f64) -> MeanProducts {
    let t = 0.5 * (low + high);
    let t_squared = (low * low + low * high + high * high) / 3.0;
    MeanProducts {
        before: 1.0 - t,
        before_squared: 1.0 - 2.0 * t + t_squared,
        after_squared: t_squared,
        twice_product: 2.0 * (t - t_squared),
    }
}

/// Mean overlap over a window at one frequency. `step(s)` gives total, diagonal and own overlap of step s there, `pair(s)`
/// the overlap of steps s and s + 1.
pub fn window_overlap(
    weights: &[StepWeight],
    step: impl Fn(usize) -> [f64; 3],
    pair: impl Fn(usize) -> f64,
) -> OverlapParts {
    let mut parts = OverlapParts::default();
    for weight in weights {
        let [total, diagonal, own] = step(weight.step);
        let across = if weight.with_next == 0.0 { 0.0 } else { weight.with_next * pair(weight.step) };
        parts.diagonal += weight.square * diagonal;
        parts.cross += weight.square * (total - diagonal) + across;
        parts.own += weight.linear * own;
    }
    parts
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::Distribution;
    use super::*;
    use crate::model::SpectrumAxes;
    use proptest::prelude::*;
    use std::f64::consts::TAU;

    fn axes() -> SpectrumAxes {
        SpectrumAxes::new(vec![0.1, 0.2], None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
    }

    fn sea(s: f64, mean: f64, scale: f64) -> Vec<f64> {
        let law = Distribution::CosinePower { s };
        let row: Vec<f64> = axes().direction_to_rad.iter().map(|to| scale * law.per_rad(to - mean)).collect();
        [row.clone(), row].concat()
    }

    // The physics reference measured what blending makes of one sea that turned, at the midpoint of two steps, dB.
    #[test]
    fn blending_two_seas_invents_the_overlap_that_was_measured() {
        let axes = axes();
        let table = Opposing::new(&axes);
        for (turn_deg, s, excess_db) in [
            (30.0, 2.0, 1.1),
            (30.0, 4.0, 3.6),
            (30.0, 10.0, 14.6),
            (90.0, 2.0, 5.2),
            (90.0, 4.0, 13.9),
            (90.0, 10.0, 41.6),
            (180.0, 2.0, 8.0),
            (180.0, 4.0, 19.7),
            (180.0, 10.0, 55.7),
        ] {
            let (before, after) = (sea(s, 0.0, 1.0), sea(s, f64::to_radians(turn_deg), 1.0));
            let weights = window_weights(&[0, 1000], 500, 500, 5000).unwrap();
            let mut steps = Vec::new();
            for spectrum in [&before, &after] {
                let mut out = StepOverlap::with_frequencies(2);
                step_overlap(&table, &[(spectrum.as_slice(), 1.0)], spectrum, &mut out);
                steps.push(out);
            }
            let mut pairs = vec![0.0; 2];
            pair_overlap(&table, &before, &after, &mut pairs);
            let parts = window_overlap(
                &weights,
                |step| [steps[step].total[0], steps[step].diagonal[0], steps[step].own[0]],
                |_| pairs[0],
            );
            let turned = Distribution::CosinePower { s }.overlap_2pi_per_rad();
            let excess = 10.0 * (parts.total() / turned).log10();
            assert!((excess - excess_db).abs() < 0.06, "{turn_deg} {s}: {excess}");
            // A share above one half is an excess above 3 dB.
            assert_eq!(parts.cross_share() > crate::model::CROSS_SHARE_LIMIT, excess > 3.0103);
        }
    }

    #[test]
    fn a_steady_sea_is_not_flagged_anywhere() {
        let table = Opposing::new(&axes());
        let sea = sea(2.0, 0.3, 1.0);
        let nodes: Vec<(&[f64], f64)> = vec![(&sea, 0.25); 4];
        let mut blended = vec![0.0; sea.len()];
        blend_nodes(&nodes, &mut blended);
        let mut out = StepOverlap::with_frequencies(2);
        step_overlap(&table, &nodes, &blended, &mut out);
        let parts = OverlapParts { diagonal: out.diagonal[0], cross: out.total[0] - out.diagonal[0], own: out.own[0] };
        assert!((parts.total() / 0.026_525_823_85 - 1.0).abs() < 1e-9);
        assert!((parts.cross / parts.total() - 0.75).abs() < 1e-9 && parts.cross_share() < 1e-9);
    }

    #[test]
    fn windows_outside_the_steps_or_across_a_gap_have_no_weights() {
        let steps = [0, 10, 20, 60];
        assert!(window_weights(&steps, -1, 5, 20).is_none());
        assert!(window_weights(&steps, 50, 61, 100).is_none());
        assert!(window_weights(&steps, 15, 25, 20).is_none());
        assert!(window_weights(&steps, 15, 20, 20).is_some());
        assert!(window_weights(&[], 0, 0, 1).is_none());
        assert_eq!(window_weights(&steps, 60, 60, 20).unwrap().len(), 1);
    }

    proptest! {
        /// The quadratic form is the overlap of the blended spectrum: against a fine sum over instants.
        #[test]
        fn the_mean_over_a_window_is_that_of_many_instants(
            start in 0_i64..20_000, length in 1_i64..15_000,
            means in prop::array::uniform4(0.0..TAU), scales in prop::array::uniform4(0.1..2.0_f64)
        ) {
            let table = Opposing::new(&axes());
            let steps_ms = [0, 10_000, 22_000, 40_000];
            let spectra: Vec<Vec<f64>> = (0..4).map(|i| sea(2.0, means[i], scales[i])).collect();
            let weights = window_weights(&steps_ms, start, start + length, 20_000).unwrap();
            prop_assert!((weights.iter().map(|w| w.linear).sum::<f64>() - 1.0).abs() < 1e-12);
            let own: Vec<f64> = spectra.iter().map(|s| table.own(&s[..36])).collect();
            let parts = window_overlap(
                &weights,
                |s| [own[s]; 3],
                |s| table.overlap(&spectra[s][..36], &spectra[s + 1][..36]),
            );
            let instants = 4000;
            let mut mean = 0.0;
            for i in 0..instants {
                let at = start as f64 + (f64::from(i) + 0.5) / f64::from(instants) * length as f64;
                let step = steps_ms.partition_point(|s| (*s as f64) <= at) - 1;
                let t = (at - steps_ms[step] as f64) / (steps_ms[step + 1] - steps_ms[step]) as f64;
                let mut blended = vec![0.0; 72];
                blend_nodes(&[(spectra[step].as_slice(), 1.0 - t), (spectra[step + 1].as_slice(), t)], &mut blended);
                mean += table.own(&blended[..36]) / f64::from(instants);
            }
            prop_assert!((parts.total() / mean - 1.0).abs() < 1e-5, "{} {}", parts.total(), mean);
        }
    }
}
