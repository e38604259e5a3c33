//! The study's rules, read and applied.

use crate::Error;
use crate::config::{ExcludeWhat, Study};
use crate::io::intervals::read_intervals;
use crate::model::{Conditions, SensorRecord};
use crate::science::exclusion::{Interval, Rule, RuleKind, exclude};
use std::path::PathBuf;

/// The rules of a study with their reasons; a list of intervals gives one rule for each reason in it.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Rules {
    rules: Vec<Rule>,
    /// One for each rule.
    pub(super) reasons: Vec<String>,
    /// Remarks on the lists.
    pub(super) notes: Vec<String>,
}

impl Rules {
    /// Reads the lists of a study.
    ///
    /// # Errors
    /// When one cannot be read.
    pub(super) fn read(study: &Study) -> Result<Self, Error> {
        let mut all = Self::default();
        for input in &study.exclude {
            let rule = |kind| Rule { sites: input.sites.clone(), sensors: input.sensors.clone(), kind };
            match &input.what {
                ExcludeWhat::When { condition, .. } => {
                    all.add(rule(RuleKind::Condition(condition.clone())), &input.reason);
                }
                ExcludeWhat::Intervals(path) => {
                    let (listed, notes) = read_intervals(path)?;
                    all.notes.extend(notes);
                    let reason_of =
                        |given: &str| if given.is_empty() { input.reason.clone() } else { given.to_owned() };
                    let mut reasons: Vec<String> = Vec::new();
                    for interval in &listed {
                        let reason = reason_of(&interval.reason);
                        if !reasons.contains(&reason) {
                            reasons.push(reason);
                        }
                    }
                    for reason in reasons {
                        let intervals = listed.iter().filter(|interval| reason_of(&interval.reason) == reason);
                        let intervals = intervals.map(|listed| Interval {
                            window: listed.window,
                            site: listed.site.clone(),
                            sensor: listed.sensor.clone(),
                            band_hz: listed.band_hz,
                        });
                        all.add(rule(RuleKind::Intervals(intervals.collect())), &reason);
                    }
                }
            }
        }
        Ok(all)
    }

    fn add(&mut self, rule: Rule, reason: &str) {
        self.rules.push(rule);
        self.reasons.push(reason.to_owned());
    }

    /// Applies the rules to one sensor and wind source.
    pub(super) fn apply(&self, record: &SensorRecord, conditions: &mut Conditions) {
        let rules: Vec<&Rule> = self.rules.iter().collect();
        conditions.exclusion = exclude(record, conditions, &rules);
    }
}

/// The lists that a study names, for the provenance.
pub(super) fn interval_files(study: &Study) -> impl Iterator<Item = PathBuf> {
    study.exclude.iter().filter_map(|input| match &input.what {
        ExcludeWhat::Intervals(path) => Some(path.clone()),
        ExcludeWhat::When { .. } => None,
    })
}
