//! The rules that turn evidence into a verdict on the onset.

use crate::model::{PredictionErrors, Verdict};

/// Level of the tests for slope, floor and onset.
pub(crate) const TEST_LEVEL: f64 = 0.05;
/// A straight law that leaves less than this of the row means, dB, needs no knee (data without scatter).
pub(crate) const NOISE_FREE_MISFIT_DB: f64 = 0.02;
/// An optimum closer than this to an end of the tried onsets, in decades, lies at the edge.
const EDGE: f64 = 0.02;
/// An interval that comes this close to an end, in decades, reaches it.
const TOUCH: f64 = 0.002;

/// What the verdict rests on. Onsets are in x = log10(U / 10 m/s).
#[derive(Debug, Clone)]
pub(crate) struct Evidence {
    pub(crate) p_onset: f64,
    /// What the straight law leaves of the row means, dB.
    pub(crate) straight_misfit_db: f64,
    /// Ends of the onsets tried.
    pub(crate) tried: (f64, f64),
    /// Best onset with a flat upper branch, and its 95 % interval.
    pub(crate) onset: f64,
    pub(crate) onset_interval: (f64, f64),
    /// 10 and 90 % quantiles of the onset over replicates: one that reaches an end of the onsets tried leaves the onset open
    /// on that side.
    pub(crate) onset_lower: f64,
    pub(crate) onset_upper: f64,
    /// Evidence that is only gathered when an onset is likely.
    pub(crate) branch: Option<BranchEvidence>,
}

/// Evidence on what comes after the onset.
#[derive(Debug, Clone)]
pub(crate) struct BranchEvidence {
    pub(crate) errors: PredictionErrors,
    /// Error of prediction of the knee with a free slope above the onset.
    pub(crate) free_knee_error: f64,
    /// Best onset when the slope above is free.
    pub(crate) free_onset: f64,
    /// Slope below it in the same fit.
    pub(crate) free_slope: f64,
    /// 95 and 99 % intervals of the slope above the onset.
    pub(crate) post_slope_95: (f64, f64),
    pub(crate) post_slope_99: (f64, f64),
    /// Gain in prediction of the better curved law over the knee, in standard errors.
    pub(crate) curved_gain: f64,
}

impl BranchEvidence {
    fn curved_error(&self) -> f64 {
        self.errors.quadratic.min(self.errors.threshold)
    }

    /// Whether a curved law predicts best of all.
    pub(crate) fn curved_predicts_best(&self) -> bool {
        self.curved_error() < self.errors.line.min(self.errors.knee)
    }
}

impl BranchEvidence {
    /// Whether the knee predicts better than both curved laws, by enough that chance does not often do it. (Chosen on
    /// simulations: 0.3 standard errors keep false saturation of curved truths below 5 % at 2000 hours.)
    fn knee_supported(&self) -> bool {
        const MARGIN: f64 = 0.3;
        self.errors.knee < self.curved_error() && self.curved_gain < -MARGIN
    }

    /// Whether a curved law predicts so much better than the knee that the knee need not be considered.
    pub(crate) fn curved_clearly_better(&self) -> bool {
        /// Standard errors that count as clear.
        const CLEAR: f64 = 0.7;
        self.curved_predicts_best() && self.curved_gain > CLEAR
    }
}

impl Evidence {
    /// Whether an onset is likely at all.
    pub(crate) fn onset_likely(&self) -> bool {
        self.p_onset < TEST_LEVEL && self.straight_misfit_db > NOISE_FREE_MISFIT_DB
    }

    /// Whether the onset lies, or may lie, below all onsets tried.
    pub(crate) fn reaches_bottom(&self) -> bool {
        self.onset < self.tried.0 + EDGE || (self.onset_lower <= self.tried.0 + TOUCH && self.p_onset < TEST_LEVEL)
    }

    fn reaches_top(&self) -> bool {
        self.onset_upper >= self.tried.1 - TOUCH
    }

    /// The verdict. Without branch evidence an onset that is likely and off the lower edge cannot be judged further.
    pub(crate) fn verdict(&self) -> Verdict {
        if !self.onset_likely() {
            return Verdict::NoOnset;
        }
        if self.reaches_bottom() {
            return Verdict::BelowOnly;
        }
        let Some(branch) = &self.branch else { return Verdict::AboveOnly };
        if self.reaches_top() {
            return if branch.curved_predicts_best() { Verdict::SlopeDecreases } else { Verdict::AboveOnly };
        }
        let inside = branch.free_onset > self.tried.0 + EDGE && branch.free_onset < self.tried.1 - EDGE;
        let knee_supported = branch.knee_supported();
        if knee_supported && branch.post_slope_99.1 < 0.0 && inside {
            Verdict::FallsAfterOnset
        } else if knee_supported && branch.post_slope_95.0 <= 0.0 && branch.post_slope_99.1 >= 0.0 {
            Verdict::Saturation
        } else if branch.free_knee_error < branch.curved_error().min(branch.errors.line)
            && branch.post_slope_99.0 > 0.0
            && branch.post_slope_95.1 < branch.free_slope
            && inside
        {
            Verdict::SlopeBreak
        } else {
            Verdict::SlopeDecreases
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn saturating() -> Evidence {
        Evidence {
            p_onset: 0.002,
            straight_misfit_db: 0.5,
            tried: (-0.4, 0.3),
            onset: 0.08,
            onset_interval: (0.05, 0.11),
            onset_lower: 0.06,
            onset_upper: 0.1,
            branch: Some(BranchEvidence {
                errors: PredictionErrors { line: 9.0, knee: 2.0, quadratic: 3.0, threshold: 4.0 },
                free_knee_error: 2.1,
                free_onset: 0.08,
                free_slope: 30.0,
                post_slope_95: (-6.0, 5.0),
                post_slope_99: (-9.0, 8.0),
                curved_gain: -2.0,
            }),
        }
    }

    #[test]
    fn rules_apply_in_their_order() {
        assert_eq!(saturating().verdict(), Verdict::Saturation);
        assert_eq!(Evidence { p_onset: 0.2, ..saturating() }.verdict(), Verdict::NoOnset);
        assert_eq!(Evidence { straight_misfit_db: 0.01, ..saturating() }.verdict(), Verdict::NoOnset);
        assert_eq!(Evidence { onset: -0.39, ..saturating() }.verdict(), Verdict::BelowOnly);
        assert_eq!(Evidence { onset_lower: -0.4, ..saturating() }.verdict(), Verdict::BelowOnly);
        assert_eq!(Evidence { onset_upper: 0.3, ..saturating() }.verdict(), Verdict::AboveOnly);
    }

    #[test]
    fn the_word_saturation_needs_the_best_prediction_and_a_flat_branch() {
        let change = |change: &dyn Fn(&mut BranchEvidence)| {
            let mut evidence = saturating();
            change(evidence.branch.as_mut().unwrap());
            evidence.verdict()
        };
        assert_eq!(change(&|branch| branch.errors.quadratic = 1.0), Verdict::SlopeDecreases);
        assert_eq!(
            change(&|branch| (branch.post_slope_95, branch.post_slope_99) = ((-9.0, -4.0), (-11.0, -2.0))),
            Verdict::FallsAfterOnset
        );
        assert_eq!(
            change(&|branch| (branch.post_slope_95, branch.post_slope_99) = ((4.0, 9.0), (2.0, 11.0))),
            Verdict::SlopeBreak
        );
        // A slope that grows is no break of a rise.
        assert_eq!(
            change(&|branch| (branch.post_slope_95, branch.post_slope_99) = ((40.0, 60.0), (35.0, 70.0))),
            Verdict::SlopeDecreases
        );
        assert_eq!(
            change(&|branch| (branch.post_slope_95, branch.post_slope_99) = ((1.0, 9.0), (-2.0, 11.0))),
            Verdict::SlopeDecreases
        );
    }
}
