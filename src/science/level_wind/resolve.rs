//! From a point estimate and its replicates to what can be said: tests, intervals, verdict.

use super::bootstrap::{Replicas, Replicate, move_replicates, values_of};
use super::cross_validation::Folds;
use super::dependence::{Side, independent_storms};
use super::fits::{Fit, Starts};
use super::law::{Corner, Law, Parameters};
use super::need::{self, Departure, NullCurve, Purpose};
use super::options::Options;
use super::point::{LEAST_STORMS, PointFit};
use super::record::Cells;
use super::verdict::{BranchEvidence, Evidence, NOISE_FREE_MISFIT_DB, TEST_LEVEL};
use crate::model::{PredictionErrors, Verdict};
use crate::numerics::quantile::{quantile, quantiles};

/// Everything that was found out about a band.
pub(crate) struct Findings {
    pub(crate) p_slope: f64,
    /// The rest is gathered only when there is a slope.
    pub(crate) sloped: Option<Sloped>,
}

/// Findings of a band whose level rises with wind.
pub(crate) struct Sloped {
    pub(crate) p_floor: f64,
    pub(crate) floor_resolved: bool,
    pub(crate) evidence: Evidence,
    pub(crate) verdict: Verdict,
    /// The fit with floor and knee on all samples, and its replicates.
    pub(crate) encompassing: Parameters,
    pub(crate) replicates: Vec<Replicate>,
    /// Fit with a knee and no floor, and its replicates where the floor is not resolved.
    pub(crate) floorless_replicates: Option<(Parameters, Vec<Replicate>)>,
    /// Straight law with the corner that was found.
    pub(crate) straight: Fit,
    pub(crate) branch: Option<Branch>,
    /// Lower bound of the onset in x, for the verdicts that have one.
    pub(crate) onset_bound: f64,
    pub(crate) storms_below: f64,
    pub(crate) storms_above: f64,
}

/// Fits of what may come after an onset.
pub(crate) struct Branch {
    pub(crate) free: Parameters,
    pub(crate) free_replicates: Vec<Replicate>,
    pub(crate) p_knee_given_curve: f64,
    /// The curved law that predicts best, its fit and its replicates, where it predicts better than line and knee.
    pub(crate) curved: Option<(Law, Parameters, Vec<Replicate>)>,
}

/// Gathers the findings. `curve_x` are the points at which replicate curves are evaluated.
pub(crate) fn findings(fit: &PointFit, replicas: &Replicas<'_>, options: &Options, curve_x: &[f64]) -> Findings {
    let cells = fit.blocks();
    let p_slope = if cells.count < need::LEAST_BLOCKS { 1.0 } else { need::p_no_rise(&fit.band, &cells, options.seed) };
    if p_slope > TEST_LEVEL {
        return Findings { p_slope, sloped: None };
    }
    Findings { p_slope, sloped: Some(sloped(fit, replicas, &cells, options.seed, curve_x)) }
}

fn sloped(fit: &PointFit, replicas: &Replicas<'_>, cells: &Cells, seed: u64, curve_x: &[f64]) -> Sloped {
    let band = &fit.band;
    let at = &fit.at;
    let straight_floor = band.fit(Law::Line, Corner::Floor, at, Starts::AndLine);
    let floorless = band.fit(Law::Knee, Corner::Bare, at, Starts::AndLine);
    let p_floor = p_floor(fit, &floorless.at, cells, seed);
    let onset_null = NullCurve::new(band, Law::Line, Corner::Floor, &straight_floor.at, false);
    let p_onset =
        onset_null.p_value(band, knee_columns(fit, &onset_null), cells, Departure::OneSided, seed, Purpose::Onset);
    let floor_misfit = band.row_misfit_db(Law::Knee, Corner::Bare, &floorless.at);
    let floor_resolved = p_floor < TEST_LEVEL && floor_misfit > NOISE_FREE_MISFIT_DB;
    let corner = if floor_resolved { Corner::Floor } else { Corner::Bare };
    let begin = if floor_resolved { at } else { &floorless.at };

    let (encompassing, replicates) = resample(fit, replicas, Law::Knee, Corner::Floor, at, curve_x);
    let onsets = values_of(&replicates, |at| at.bend);
    let floorless_replicates =
        (!floor_resolved).then(|| resample(fit, replicas, Law::Knee, Corner::Bare, &floorless.at, &[]));
    let straight = band.fit(Law::Line, corner, begin, Starts::AndLine);
    let mut evidence = Evidence {
        p_onset,
        straight_misfit_db: band.row_misfit_db(Law::Line, Corner::Floor, &straight_floor.at),
        tried: (
            band.onsets.first().copied().unwrap_or(f64::NEG_INFINITY),
            band.onsets.last().copied().unwrap_or(f64::INFINITY),
        ),
        onset: encompassing.bend,
        onset_interval: replicas.draws.interval(&onsets, 0.95),
        onset_lower: quantile(&onsets, 0.1),
        onset_upper: quantile(&onsets, 0.9),
        branch: None,
    };
    let mut branch = None;
    if evidence.onset_likely() && !evidence.reaches_bottom() {
        let (found, of_branch) = follow_branch(fit, replicas, corner, begin, &straight, cells, seed, curve_x);
        evidence.branch = Some(of_branch);
        branch = Some(found);
    }
    let verdict = evidence.verdict();
    let onset_bound = match verdict {
        Verdict::NoOnset | Verdict::AboveOnly => onset_above(fit, corner, begin, &onsets),
        Verdict::BelowOnly => evidence.onset_interval.1.max(evidence.tried.0),
        _ => f64::NAN,
    };
    Sloped {
        p_floor,
        floor_resolved,
        verdict,
        encompassing,
        replicates,
        floorless_replicates,
        straight,
        branch,
        onset_bound,
        storms_below: independent_storms(&band.record, cells, at.bend, Side::Below),
        storms_above: independent_storms(&band.record, cells, at.bend, Side::Above),
        evidence,
    }
}

/// A fit improved on all samples, and replicates around it.
fn resample(
    fit: &PointFit,
    replicas: &Replicas<'_>,
    law: Law,
    corner: Corner,
    at: &Parameters,
    curve_x: &[f64],
) -> (Parameters, Vec<Replicate>) {
    let band = &fit.band;
    let polished = band.polish_samples(law, corner, at);
    let mut replicates = replicas.fit(band, law, corner, at, curve_x);
    let form = band.form(law, corner).at_points();
    let shift: Vec<f64> =
        curve_x.iter().map(|&x| form.level(&polished, 0, x).level_db - form.level(at, 0, x).level_db).collect();
    move_replicates(&mut replicates, at, &polished, band.bend(law), &shift);
    (polished, replicates)
}

/// p value against no floor: candidates are hinges (c - x)+ with enough storms below c.
fn p_floor(fit: &PointFit, floorless: &Parameters, cells: &Cells, seed: u64) -> f64 {
    let band = &fit.band;
    let null = NullCurve::new(band, Law::Knee, Corner::Bare, floorless, false);
    let [low, high] = quantiles(&band.record.x, [0.02, 0.6]);
    let candidates = (0..40)
        .map(|index| low + (high - low) * f64::from(index) / 39.0)
        .filter(|&x| independent_storms(&band.record, cells, x, Side::Below) >= LEAST_STORMS)
        .map(|corner| band.rows.x.iter().map(|x| (corner - x).max(0.0)).collect())
        .collect();
    null.p_value(band, candidates, cells, Departure::OneSided, seed, Purpose::Floor)
}

/// Candidates of the onset test: -h' (x - c)+ with enough storms above c.
fn knee_columns(fit: &PointFit, null: &NullCurve) -> Vec<Vec<f64>> {
    let band = &fit.band;
    let Some(greatest) = fit.greatest_testable_onset else { return Vec::new() };
    band.onsets
        .iter()
        .filter(|&&onset| onset <= greatest)
        .map(|onset| band.rows.x.iter().zip(&null.wind_share).map(|(x, share)| -share * (x - onset).max(0.0)).collect())
        .collect()
}

fn follow_branch(
    fit: &PointFit,
    replicas: &Replicas<'_>,
    corner: Corner,
    begin: &Parameters,
    straight: &Fit,
    cells: &Cells,
    seed: u64,
    curve_x: &[f64],
) -> (Branch, BranchEvidence) {
    let band = &fit.band;
    let knee = band.fit(Law::Knee, corner, &fit.at, Starts::Given);
    let quadratic = band.fit(Law::Quadratic, corner, &fit.at, Starts::AndLine);
    let threshold_start = Parameters { slope: 20.0, bend: 1.0, post_slope: 0.0, ..begin.clone() };
    let threshold = band.fit(Law::Threshold, corner, &threshold_start, Starts::AndLine);
    let free = band.fit(Law::FreeKnee, corner, begin, Starts::AndLine);
    let folds = Folds::new(band, 2.0 * fit.block_h);
    let of_line = folds.predictions(band, Law::Line, corner, straight);
    let of_knee = folds.predictions(band, Law::Knee, corner, &knee);
    let of_quadratic = folds.predictions(band, Law::Quadratic, corner, &quadratic);
    let of_threshold = folds.predictions(band, Law::Threshold, corner, &threshold);
    let errors = PredictionErrors {
        line: of_line.error,
        knee: of_knee.error,
        quadratic: of_quadratic.error,
        threshold: of_threshold.error,
    };
    let of_curve = if errors.quadratic <= errors.threshold { &of_quadratic } else { &of_threshold };
    let (free_at, free_replicates) = resample(fit, replicas, Law::FreeKnee, corner, &free.at, curve_x);
    let post_slopes = values_of(&free_replicates, |at| at.post_slope);
    let evidence = BranchEvidence {
        errors,
        free_knee_error: folds.predictions(band, Law::FreeKnee, corner, &free).error,
        curved_gain: folds.gain(band, &of_knee, of_curve),
        free_onset: free_at.bend,
        free_slope: free_at.slope,
        post_slope_95: replicas.draws.interval(&post_slopes, 0.95),
        post_slope_99: replicas.draws.interval(&post_slopes, 0.99),
    };
    let nearer = if quadratic.sum_squares < threshold.sum_squares {
        (Law::Quadratic, &quadratic)
    } else {
        (Law::Threshold, &threshold)
    };
    let curve_null = NullCurve::new(band, nearer.0, corner, &nearer.1.at, false);
    let columns = knee_columns(fit, &curve_null);
    let p_knee_given_curve =
        curve_null.p_value(band, columns, cells, Departure::OneSided, seed, Purpose::KneeGivenCurve);
    let curved = evidence.curved_predicts_best().then(|| {
        let (law, full) = if errors.quadratic <= errors.threshold {
            (Law::Quadratic, quadratic)
        } else {
            (Law::Threshold, threshold)
        };
        let (at, replicates) = resample(fit, replicas, law, corner, &full.at, curve_x);
        (law, at, replicates)
    });
    (Branch { free: free_at, free_replicates, p_knee_given_curve, curved }, evidence)
}

/// Lower bound of an onset that is not resolved, in x: the lower end of the 90 % profile interval, or the 5 % quantile of the
/// replicates where that is lower.
fn onset_above(fit: &PointFit, corner: Corner, begin: &Parameters, onsets: &[f64]) -> f64 {
    /// 90 % quantile of chi-squared with one degree of freedom.
    const CHI_SQUARED_90: f64 = 2.706;
    let band = &fit.band;
    let (best, profile) = band.fit_profile(Law::Knee, corner, begin, Starts::AndLine);
    let mut within_rows = 0.0;
    for (&level, &row) in band.level_db.iter().zip(&band.rows.of_sample) {
        let off = level - band.row_level_db[row];
        within_rows += band.rows.weight[row] * off * off;
    }
    let least = profile.iter().copied().fold(best.sum_squares, f64::min);
    let effective = band.record.len() as f64 / fit.inflation;
    let likely =
        |sum_squares: f64| effective * libm::log((within_rows + sum_squares) / (within_rows + least)) <= CHI_SQUARED_90;
    let bound = band.onsets.iter().zip(&profile).find(|(_, sum)| likely(**sum)).map(|(onset, _)| *onset);
    let from_replicates = quantile(onsets, 0.05);
    bound.map_or(from_replicates, |bound| bound.min(from_replicates))
}
