//! The relation of one band.

use super::{
    CurveBandPoint, DeploymentDifference, DeploymentFit, LevelLaw, MeanCurve, NotResolved, RelationDiagnostics,
    RelationWarning, Replicates, Resolved, ScatterEstimate, SelectedFit, Verdict, WindClassSummary,
};
use serde::{Deserialize, Serialize};

/// Version of the layout of [`Relation`].
pub const RELATION_SCHEMA: u32 = 1;

/// The relation of a band's level to the wind speed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Relation {
    /// [`RELATION_SCHEMA`].
    pub schema: u32,
    /// What can be said of the onset.
    pub verdict: Verdict,
    /// Why nothing was fitted, where nothing was.
    pub not_fitted: Option<NotResolved>,
    /// The law from which floor and slope are reported.
    pub law: LevelLaw,
    /// F: level of the floor without ships (mean of its distribution in dB), dB. Of the first deployment where
    /// deployments have their own.
    pub floor_db: Resolved,
    /// S: rise of the wind part per factor ten in wind speed (below the onset; at 10 m/s for a curved law), dB.
    pub slope_db_per_decade: Resolved,
    /// n in p^2 ~ U^n: a tenth of the slope.
    pub mean_square_pressure_exponent: Resolved,
    /// A: the wind part alone at 10 m/s, along the law below the onset, dB.
    pub wind_component_at_10_m_s_db: Resolved,
    /// The fitted level at 10 m/s, floor included, dB.
    pub level_at_10_m_s_db: Resolved,
    /// Wind speed of the onset, m/s.
    pub onset_m_s: Resolved,
    /// S2: slope of the wind part above the onset, dB per decade.
    pub post_onset_slope_db_per_decade: Resolved,
    /// The fitted mean curve (of the first deployment).
    pub curve: Option<MeanCurve>,
    /// The curve with its interval on a grid of wind speeds.
    pub curve_band: Vec<CurveBandPoint>,
    /// The data by class of wind speed.
    pub wind_classes: Vec<WindClassSummary>,
    /// The simplest law that the tests support.
    pub selected: Option<SelectedFit>,
    /// The scatter model.
    pub scatter: Option<ScatterEstimate>,
    /// One entry per deployment where deployments have their own floor and wind part.
    pub deployments: Vec<DeploymentFit>,
    /// How they differ.
    pub deployment_difference: Option<DeploymentDifference>,
    /// How sure all this can be.
    pub diagnostics: RelationDiagnostics,
    /// What the reader should know.
    pub warnings: Vec<RelationWarning>,
    /// Replicates, when they were asked for.
    pub replicates: Option<Replicates>,
}

impl Relation {
    /// A relation that was not fitted, and why.
    pub fn not_fitted(why: NotResolved, diagnostics: RelationDiagnostics) -> Self {
        let none = Resolved::NotResolved(why);
        Self {
            schema: RELATION_SCHEMA,
            verdict: Verdict::NotFitted,
            not_fitted: Some(why),
            law: LevelLaw::NoLaw,
            floor_db: none,
            slope_db_per_decade: none,
            mean_square_pressure_exponent: none,
            wind_component_at_10_m_s_db: none,
            level_at_10_m_s_db: none,
            onset_m_s: none,
            post_onset_slope_db_per_decade: none,
            curve: None,
            curve_band: Vec::new(),
            wind_classes: Vec::new(),
            selected: None,
            scatter: None,
            deployments: Vec::new(),
            deployment_difference: None,
            diagnostics,
            warnings: Vec::new(),
            replicates: None,
        }
    }

    /// Fitted level at a wind speed, dB, if a curve was fitted.
    pub fn level_db(&self, wind_speed_m_s: f64) -> Option<f64> {
        self.curve.as_ref().map(|curve| curve.level_db(wind_speed_m_s))
    }

    /// The mean curve of one deployment: that of the relation, with the deployment's own floor and wind part where it has them.
    pub fn curve_of(&self, deployment: u32) -> Option<MeanCurve> {
        let mut curve = self.curve.clone()?;
        if let Some(own) = self.deployments.iter().find(|own| own.deployment == deployment) {
            if let (Some(floor), Some(own_floor)) = (&mut curve.floor_db, own.floor_db.estimate()) {
                *floor = own_floor;
            }
            if let Some(wind) = own.wind_component_at_10_m_s_db.estimate() {
                curve.wind_component_at_10_m_s_db = wind;
            }
        }
        Some(curve)
    }

    /// Pointwise 95 % interval of the fitted level at a wind speed, dB, interpolated in the logarithm of the wind; `None`
    /// without replicates or outside the winds that were used.
    pub fn level_interval_db(&self, wind_speed_m_s: f64) -> Option<(f64, f64)> {
        let x = |point: &CurveBandPoint| libm::log10(point.wind_speed_m_s);
        let at = libm::log10(wind_speed_m_s);
        self.curve_band.windows(2).find_map(|pair| {
            let (left, right) = (&pair[0], &pair[1]);
            let (x_left, x_right) = (x(left), x(right));
            if !(x_left - 1e-12..=x_right + 1e-12).contains(&at) {
                return None;
            }
            let share = (at - x_left) / (x_right - x_left);
            let low = left.low_db? + share * (right.low_db? - left.low_db?);
            let high = left.high_db? + share * (right.high_db? - left.high_db?);
            Some((low, high))
        })
    }

    /// The verdict in words, with the numbers that it allows.
    pub fn verdict_text(&self) -> String {
        let bound = match self.onset_m_s {
            Resolved::AtLeast(bound) => format!("above {bound:.1} m/s"),
            Resolved::AtMost(bound) => format!("below {bound:.1} m/s"),
            Resolved::Value { estimate, low: Some(low), high: Some(high) } => {
                format!("{estimate:.1} m/s ({low:.1} to {high:.1})")
            }
            Resolved::Value { estimate, .. } => format!("{estimate:.1} m/s"),
            Resolved::NotResolved(_) => String::new(),
        };
        match self.verdict {
            Verdict::Saturation => format!("saturation, onset {bound}"),
            Verdict::FallsAfterOnset => format!("falls after onset at {bound}"),
            Verdict::SlopeBreak => format!("slope break at {bound}"),
            Verdict::SlopeDecreases => "slope decreases with wind, no onset".to_owned(),
            Verdict::AboveOnly | Verdict::NoOnset if !bound.is_empty() => format!("onset not resolved: {bound}"),
            Verdict::AboveOnly | Verdict::NoOnset => "onset not resolved".to_owned(),
            Verdict::BelowOnly => format!("onset {bound}"),
            Verdict::NoSlope => match self.not_fitted {
                Some(why) => format!("no slope: {}", why.sentence()),
                None => "no slope: the level does not rise resolvably with wind".to_owned(),
            },
            Verdict::PointOnly => "point estimate only, onset not assessed".to_owned(),
            Verdict::NotFitted => match self.not_fitted {
                Some(why) => format!("not fitted: {}", why.sentence()),
                None => "not fitted".to_owned(),
            },
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_follow_the_verdict() {
        let mut relation = Relation::not_fitted(NotResolved::TooFewMatchups, RelationDiagnostics::default());
        assert_eq!(relation.verdict_text(), "not fitted: there are fewer than 30 pairs of wind and level");
        relation.verdict = Verdict::NoOnset;
        relation.onset_m_s = Resolved::AtLeast(11.31);
        assert_eq!(relation.verdict_text(), "onset not resolved: above 11.3 m/s");
        relation.verdict = Verdict::SlopeDecreases;
        assert_eq!(relation.verdict_text(), "slope decreases with wind, no onset");
    }
}
