//! The bands of one sensor together: their relations and what is checked beside them.

use super::segments::SegmentLabels;
use crate::model::{BandChecks, CommonOnset, Lag, Relation, Screened};
use crate::numerics::multiple_tests::benjamini_yekutieli;
use crate::science::level_wind::{
    KeepReplicates, Options, ScreenOptions, SiteRecord, common_onset, correct_for_wind_error, drift_db_per_year,
    fit_site, residuals, screen_short_events, search_lag,
};
use rayon::prelude::*;

/// Longest lag that is tried, in steps of the record, in both directions.
const LONGEST_LAG_STEPS: u32 = 6;

/// Bands of one sensor on one time line, as the fit wants them.
pub(super) struct Together {
    pub times_ms: Vec<i64>,
    pub wind_m_s: Vec<f64>,
    pub segments: Option<SegmentLabels>,
    /// By band; NaN where a pair is not used.
    pub levels_db: Vec<Vec<f64>>,
}

/// What was found for the bands of one sensor.
pub(super) struct Found {
    pub bands: Vec<(Relation, BandChecks)>,
    pub common_onset: Option<CommonOnset>,
    /// Names of the segments.
    pub segments: Vec<String>,
    pub screen: Option<Screened>,
}

impl Found {
    pub(super) fn unchecked(relations: Vec<Relation>) -> Self {
        let bands = relations.into_iter().map(|relation| (relation, BandChecks::default())).collect();
        Self { bands, common_onset: None, segments: Vec::new(), screen: None }
    }

    /// Bands that share no time line: nothing can be said of them together.
    pub(super) fn of_bands(each: impl Iterator<Item = Self>) -> Self {
        Self {
            bands: each.flat_map(|found| found.bands).collect(),
            common_onset: None,
            segments: Vec::new(),
            screen: None,
        }
    }

    /// Keeps the relations with short events left in beside the others.
    pub(super) fn add_unscreened(&mut self, relations: Vec<Relation>) {
        for ((_, checks), relation) in self.bands.iter_mut().zip(relations) {
            checks.unscreened = Some(Box::new(relation));
        }
    }
}

impl Together {
    fn labels(&self) -> Option<&[u32]> {
        self.segments.as_ref().map(|segments| segments.labels.as_slice())
    }

    /// The relations alone.
    pub(super) fn fit(&self, options: &Options) -> Vec<Relation> {
        let record = SiteRecord {
            times_ms: &self.times_ms,
            wind_speed_m_s: &self.wind_m_s,
            deployment: self.labels(),
            levels_db: self.levels_db.iter().map(Vec::as_slice).collect(),
        };
        fit_site(&record, options)
    }

    /// The relations with their checks; checks need replicates.
    pub(super) fn fit_and_check(&self, options: &Options) -> Found {
        let segments = self.segments.as_ref().map_or_else(Vec::new, |segments| segments.names.clone());
        if options.replicates == 0 {
            return Found { segments, ..Found::unchecked(self.fit(options)) };
        }
        let mut relations = self.fit(&Options { keep_replicates: KeepReplicates::Yes, ..options.clone() });
        let common_onset = common_onset(&relations);
        if options.keep_replicates == KeepReplicates::No {
            relations.iter_mut().for_each(|relation| relation.replicates = None);
        }
        let tested: Vec<f64> = relations.iter().filter_map(|relation| relation.diagnostics.p_onset).collect();
        let mut adjusted = benjamini_yekutieli(&tested).into_iter();
        let mut checks: Vec<BandChecks> =
            relations.par_iter().zip(&self.levels_db).map(|(r, levels)| self.check(r, levels, options)).collect();
        for (relation, checks) in relations.iter().zip(&mut checks) {
            checks.p_onset_false_discovery = relation.diagnostics.p_onset.and_then(|_| adjusted.next());
        }
        Found { bands: relations.into_iter().zip(checks).collect(), common_onset, segments, screen: None }
    }

    /// As [`Self::fit_and_check`], with short events screened out first where asked for.
    pub(super) fn fit_screened(self, options: &Options, screen: bool) -> Found {
        if !screen {
            return self.fit_and_check(options);
        }
        let columns: Vec<&[f64]> = self.levels_db.iter().map(Vec::as_slice).collect();
        let events = screen_short_events(&self.times_ms, &columns, &ScreenOptions::default());
        let all = self.fit(options);
        let keep = |levels: &Vec<f64>| -> Vec<f64> {
            levels.iter().zip(&events.marked).map(|(level, marked)| if *marked { f64::NAN } else { *level }).collect()
        };
        let mut found = Self { levels_db: self.levels_db.iter().map(keep).collect(), ..self }.fit_and_check(options);
        found.add_unscreened(all);
        found.screen = Some(events.summary());
        found
    }

    fn check(&self, relation: &Relation, levels_db: &[f64], options: &Options) -> BandChecks {
        let deployment = self.labels();
        let wind_error = correct_for_wind_error(&self.times_ms, &self.wind_m_s, levels_db, deployment, options);
        let mut checks =
            BandChecks { wind_error: wind_error.map_or_else(Vec::new, Vec::from), ..BandChecks::default() };
        if let (Some(block_h), true) = (relation.diagnostics.resampled_block_length_h, relation.curve.is_some()) {
            let residuals = residuals(&self.wind_m_s, levels_db, deployment, relation);
            checks.drift_db_per_year = drift_db_per_year(&self.times_ms, &residuals, block_h, options.seed);
            checks.lag = self.lag(levels_db, block_h);
        }
        checks
    }

    fn lag(&self, levels_db: &[f64], block_h: f64) -> Option<Lag> {
        let search = search_lag(&self.times_ms, &self.wind_m_s, levels_db, LONGEST_LAG_STEPS, block_h)?;
        let others = search.losses.iter().filter(|loss| loss.steps != 0);
        let best = others.max_by(|a, b| a.gain_in_standard_errors.total_cmp(&b.gain_in_standard_errors))?;
        Some(Lag {
            lag_h: f64::from(search.steps) * search.step_h,
            gain_in_standard_errors: best.gain_in_standard_errors,
            longest_h: f64::from(LONGEST_LAG_STEPS) * search.step_h,
        })
    }
}
