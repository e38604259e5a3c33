//! Verdicts, laws, reasons and warnings, each with its name and one sentence.

use crate::model::outcome::causes;
use serde::{Deserialize, Serialize};

causes! {
    /// What the fit says about the onset of saturation.
    Verdict {
        Saturation = "saturation": "the level rises with wind up to the onset and stays the same above it",
        FallsAfterOnset = "falls after onset": "the level rises with wind up to the onset and falls above it",
        SlopeBreak = "slope break": "the slope is smaller but still positive above the onset",
        SlopeDecreases = "slope decreases": "the slope decreases with wind, no onset can be named",
        AboveOnly = "above": "an onset is likely, but only a lower bound of its wind speed can be given",
        BelowOnly = "below": "an onset is likely, but only an upper bound of its wind speed can be given",
        NoOnset = "no onset": "no onset is resolved; if there is one, it lies above the bound given",
        NoSlope = "no slope": "the level does not rise resolvably with wind",
        PointOnly = "point estimate only": "no intervals were computed, so nothing is said about the onset",
        NotFitted = "not fitted": "no relation was fitted",
    }
}

causes! {
    /// Why a quantity has no value.
    NotResolved {
        NoData = "no_data": "there is no pair of wind and level",
        TooFewMatchups = "too_few_matchups": "there are fewer than 30 pairs of wind and level",
        WindRangeTooSmall = "wind_range_too_small": "the 95 % quantile of the wind is less than 1.5 times the 5 % quantile",
        NoRise = "no_rise": "the level does not rise resolvably with wind",
        NoOnset = "no_onset": "no onset is resolved",
        CurvatureWithoutOnset = "curvature_without_onset": "the slope decreases smoothly, without an onset that can be named",
        FloorNotReached = "floor_not_reached": "the level does not flatten resolvably at low wind",
        NotPartOfLaw = "not_part_of_law": "the law that describes the band has no such parameter",
        NotComputed = "not_computed": "it was not asked for",
    }
}

causes! {
    /// What the reader of a relation should know.
    RelationWarning {
        FewBlocks = "few_blocks": "the record holds fewer than 8 independent blocks, so nothing can be tested",
        FewIndependentSamples = "few_independent_samples": "fewer than 30 effectively independent samples",
        BlocksCapped = "blocks_capped": "the residuals are correlated for longer than one eighth of the record, so intervals may be too narrow",
        FloorNotResolved = "floor_not_resolved": "the floor is not resolved; the slope below the onset is also given without a floor",
        SlopeAtLimit = "slope_at_limit": "the slope lies at the limit of 150 dB per decade",
        CurvedLawClose = "curved_law_close": "a curved law without onset predicts best, but not clearly; the intervals of floor and slope cover both laws",
        CurvedLawReported = "curved_law_reported": "a curved law without onset predicts best, so floor and slope come from it",
        DeploymentsDiffer = "deployments_differ": "deployments differ and were given their own floor and wind part",
        WindClimatesDiffer = "wind_climates_differ": "the median wind differs by more than a quarter between deployments, so errors of the law can pass for differences between them",
        ScatterMisfit = "scatter_misfit": "the spread of the levels differs from the scatter model in more than a fifth of the wind classes",
        ShapeMisfit = "shape_misfit": "flattened weights move a parameter by more than two standard errors, so the law does not describe the band",
        OnsetEdge = "onset_at_edge": "the best onset lies at the edge of what the winds in the record allow",
        ManyRejected = "many_rejected": "more than one tenth of the samples lie so far off that they were given no weight",
        NotConverged = "not_converged": "the iteration for the robust fit did not settle",
    }
}

causes! {
    /// Which scatter model describes the band.
    ScatterFamily {
        FixedPowerSum = "fixed power sum": "floor and wind part add in power without fluctuating against each other",
        HardCorner = "hard corner": "the higher of floor and wind part counts, with scatter of the whole level; they do not add in power",
        TotalScatter = "total scatter": "the whole level fluctuates, with occasional upward outliers",
        RandomFloor = "random floor": "floor and wind part fluctuate on their own before they add in power",
        RandomFloorWithShips = "random floor with ships": "as with a random floor, and passing ships add power part of the time",
    }
}

causes! {
    /// The law from which floor and slope are reported.
    LevelLaw {
        FloorAndKnee = "floor and knee": "a floor added in power to a wind part that rises to the onset and is constant above it",
        FloorAndFreeKnee = "floor and knee with free slope": "a floor added in power to a wind part that has one slope below and another above the onset",
        FloorAndLine = "floor and line": "a floor added in power to a wind part that rises without end",
        Line = "line": "a wind part that rises without end, no floor",
        Knee = "knee": "a wind part that rises to the onset and is constant above it, no floor",
        FreeKnee = "knee with free slope": "a wind part with one slope below and another above the onset, no floor",
        FloorAndQuadratic = "floor and quadratic": "a floor added in power to a wind part that is quadratic in the logarithm of the wind",
        FloorAndThreshold = "floor and threshold": "a floor added in power to a power law of the wind above a threshold",
        Quadratic = "quadratic": "a wind part that is quadratic in the logarithm of the wind, no floor",
        Threshold = "threshold": "a power law of the wind above a threshold, no floor",
        Constant = "constant": "one level at all winds",
        NoLaw = "none": "no law was fitted",
    }
}

causes! {
    /// How deployments differ.
    DeploymentDifference {
        Floor = "floor differs": "the wind part is the same within its interval, only the floor differs",
        GainStep = "gain step": "floor and wind part differ by the same amount",
        FloorAndWindPart = "floor and wind part": "floor and wind part differ, and not by the same amount",
        NotAssessed = "not assessed": "no intervals were computed",
    }
}
