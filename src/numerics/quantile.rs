//! Quantiles by linear interpolation between order statistics.

/// Quantile of values that are already in increasing order, by linear interpolation between order statistics (type 7 of
/// Hyndman and Fan 1996, the default of numpy). NaN for an empty slice.
pub fn quantile_sorted(sorted: &[f64], probability: f64) -> f64 {
    let Some(last) = sorted.len().checked_sub(1) else { return f64::NAN };
    let position = probability.clamp(0.0, 1.0) * last as f64;
    let below = (position.floor() as usize).min(last);
    let above = (below + 1).min(last);
    sorted[below] + (position - below as f64) * (sorted[above] - sorted[below])
}

/// A sorted copy; the values must not contain NaN for the order to mean anything (NaN sorts last).
pub fn sorted(values: &[f64]) -> Vec<f64> {
    let mut copy = values.to_vec();
    copy.sort_unstable_by(f64::total_cmp);
    copy
}

/// Quantile of values in any order; see [`quantile_sorted`]. It selects and does not sort.
pub fn quantile(values: &[f64], probability: f64) -> f64 {
    quantile_in(&mut values.to_vec(), probability)
}

/// As [`quantile`], reordering the values.
fn quantile_in(values: &mut [f64], probability: f64) -> f64 {
    let Some(last) = values.len().checked_sub(1) else { return f64::NAN };
    let position = probability.clamp(0.0, 1.0) * last as f64;
    let below = (position.floor() as usize).min(last);
    let (_, &mut low, above) = values.select_nth_unstable_by(below, f64::total_cmp);
    let high = above.iter().copied().min_by(f64::total_cmp).unwrap_or(low);
    low + (position - below as f64) * (high - low)
}

/// Median; NaN for an empty slice.
pub fn median(values: &[f64]) -> f64 {
    quantile(values, 0.5)
}

/// Several quantiles of values in any order.
pub fn quantiles<const COUNT: usize>(values: &[f64], probabilities: [f64; COUNT]) -> [f64; COUNT] {
    let mut copy = values.to_vec();
    probabilities.map(|probability| quantile_in(&mut copy, probability))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agrees_with_the_definition() {
        // Hyndman and Fan 1996, type 7: position (n - 1) p from the smallest value.
        let values = [4.0, 1.0, 3.0, 2.0];
        assert!((quantile(&values, 0.25) - 1.75).abs() < 1e-15);
        assert!((median(&values) - 2.5).abs() < 1e-15);
        assert!((quantile(&values, 1.0) - 4.0).abs() < 1e-15);
        assert!(median(&[]).is_nan());
        let many: Vec<f64> = (0..101).map(|index| f64::from(index * 37 % 101)).collect();
        for probability in [0.0, 0.013, 0.5, 0.975, 1.0] {
            assert!((quantile(&many, probability) - quantile_sorted(&sorted(&many), probability)).abs() < 1e-12);
        }
        let [least, greatest] = quantiles(&many, [0.0, 1.0]);
        assert!(least.abs() < 1e-12 && (greatest - 100.0).abs() < 1e-12);
    }
}
