//! p values of several tests at once.

/// p values adjusted by Holm's step-down method (Holm 1979), in the order given. They control the chance of any false
/// rejection, whatever the dependence.
pub fn holm(p_values: &[f64]) -> Vec<f64> {
    let count = p_values.len();
    let mut order: Vec<usize> = (0..count).collect();
    order.sort_by(|&a, &b| p_values[a].total_cmp(&p_values[b]));
    let mut adjusted = vec![1.0; count];
    let mut least = 0.0_f64;
    for (rank, index) in order.into_iter().enumerate() {
        least = least.max((count - rank) as f64 * p_values[index]);
        adjusted[index] = least.min(1.0);
    }
    adjusted
}

/// p values adjusted by the method of Benjamini and Yekutieli (2001), in the order given. They control the expected share of
/// false rejections under any dependence.
pub fn benjamini_yekutieli(p_values: &[f64]) -> Vec<f64> {
    let count = p_values.len();
    let mut order: Vec<usize> = (0..count).collect();
    order.sort_by(|&a, &b| p_values[b].total_cmp(&p_values[a]));
    let harmonic: f64 = (1..=count).map(|index| 1.0 / index as f64).sum();
    let mut adjusted = vec![1.0; count];
    let mut least = 1.0_f64;
    for (from_top, index) in order.into_iter().enumerate() {
        let rank = (count - from_top) as f64;
        least = least.min(harmonic * count as f64 / rank * p_values[index]);
        adjusted[index] = least;
    }
    adjusted
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn adjusted_values_agree_with_a_library() {
        // statsmodels 0.15.0, stats.multitest.multipletests, methods "holm" and "fdr_by".
        let p = [0.01, 0.04, 0.03, 0.005];
        for (found, expected) in holm(&p).iter().zip([0.03, 0.06, 0.06, 0.02]) {
            assert!((found - expected).abs() < 1e-12);
        }
        let expected =
            [0.041_666_666_666_666_67, 0.083_333_333_333_333_33, 0.083_333_333_333_333_33, 0.041_666_666_666_666_67];
        for (found, expected) in benjamini_yekutieli(&p).iter().zip(expected) {
            assert!((found - expected).abs() < 1e-12);
        }
        assert!(holm(&[]).is_empty() && benjamini_yekutieli(&[]).is_empty());
    }
}
