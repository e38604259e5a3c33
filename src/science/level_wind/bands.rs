//! Several bands of a site together: one onset for all, and whether they have one.

use crate::model::{CommonOnset, Relation, Resolved, Verdict};
use crate::numerics::quantile::quantiles;
use crate::numerics::student_t::chi_squared_tail;
use crate::numerics::symmetric::Symmetric;

/// Common onset by inverse variance over bands with a named onset, from replicates that share their draws (so the covariance
/// between bands is kept), and a Wald test of equality. The relations must carry replicates
/// ([`super::KeepReplicates::Yes`]). `None` with fewer than two such bands or 20 replicates.
pub fn common_onset(relations: &[Relation]) -> Option<CommonOnset> {
    const LEAST_REPLICATES: usize = 20;
    let named = |relation: &Relation| {
        matches!(relation.verdict, Verdict::Saturation | Verdict::FallsAfterOnset | Verdict::SlopeBreak)
    };
    let mut bands = Vec::new();
    let mut estimates = Vec::new();
    let mut replicates: Vec<&[f64]> = Vec::new();
    for (index, relation) in relations.iter().enumerate().filter(|(_, relation)| named(relation)) {
        if let (Some(kept), Some(onset)) = (&relation.replicates, relation.diagnostics.fitted_onset_m_s) {
            bands.push(index);
            estimates.push(libm::log10(onset / 10.0));
            replicates.push(&kept.onset_log10);
        }
    }
    let count = replicates.iter().map(|values| values.len()).min()?;
    if bands.len() < 2 || count < LEAST_REPLICATES {
        return None;
    }
    let covariance = covariance(&replicates, count);
    let weights: Vec<f64> = (0..bands.len()).map(|band| 1.0 / covariance.get(band, band).max(1e-12)).collect();
    let total: f64 = weights.iter().sum();
    let mean = |values: &dyn Fn(usize) -> f64| -> f64 {
        weights.iter().enumerate().map(|(band, weight)| weight * values(band)).sum::<f64>() / total
    };
    let common = mean(&|band| estimates[band]);
    let common_replicates: Vec<f64> = (0..count).map(|index| mean(&|band| replicates[band][index])).collect();
    let [low, high] = quantiles(&common_replicates, [0.025, 0.975]);
    let contrasts: Vec<Vec<f64>> = replicates
        .iter()
        .map(|values| values[..count].iter().zip(&common_replicates).map(|(value, mean)| value - mean).collect())
        .collect();
    let contrast_covariance = self::covariance(&contrasts.iter().map(Vec::as_slice).collect::<Vec<_>>(), count);
    let off: Vec<f64> = estimates.iter().map(|estimate| estimate - common).collect();
    let degrees = bands.len() - 1;
    // The contrasts add up to zero under the weights, so one direction has no variance and is cut off.
    let inverse = contrast_covariance.pseudo_inverse(1e-6);
    // An inverse of an estimated covariance is too large by this factor (Hartlap, Simon and Schneider 2007).
    let debias = (count as f64 - degrees as f64 - 2.0).max(1.0) / (count as f64 - 1.0);
    let wald = debias * inverse.times(&off).iter().zip(&off).map(|(a, b)| a * b).sum::<f64>();
    let wind = |x: f64| 10.0 * libm::exp10(x);
    Some(CommonOnset {
        bands,
        onset_m_s: Resolved::with_interval(wind(common), wind(low), wind(high)),
        wald,
        degrees,
        p_equal: chi_squared_tail(wald, degrees as f64),
    })
}

fn covariance(replicates: &[&[f64]], count: usize) -> Symmetric {
    let means: Vec<f64> = replicates.iter().map(|values| values[..count].iter().sum::<f64>() / count as f64).collect();
    let mut covariance = Symmetric::zeros(replicates.len());
    for row in 0..replicates.len() {
        for column in 0..=row {
            let sum: f64 = (0..count)
                .map(|index| (replicates[row][index] - means[row]) * (replicates[column][index] - means[column]))
                .sum();
            covariance.add(row, column, sum / (count as f64 - 1.0));
        }
    }
    covariance
}
