//! The choices that are tried, each as a change of the study.

use crate::config::{Study, WindOrigin, WindowSpeed};
use crate::model::{Choice, CoastRule, LevelStatistic, SourceId, SpatialRule};
use crate::science::level_wind::{Loss, ScatterModel, Segments};

/// A choice with what has to be done for it.
pub(super) struct Trial {
    pub choice: Choice,
    pub change: Change,
}

/// What has to be done for a choice.
pub(super) enum Change {
    /// The relation of another wind source, which the study has anyway.
    Source(SourceId),
    /// Levels and wind are brought together anew.
    Match(Box<Study>),
    /// The same pairs are fitted another way.
    Fit(Box<Study>),
    /// The same pairs, with the wind this many windows earlier (positive) or later.
    Lag(i32),
}

/// What of the data decides which choices there are.
pub(super) struct Grounds {
    /// Whether a window holds more than one level sample.
    pub several_samples: bool,
    /// Whether a sensor has more than one deployment.
    pub deployments: bool,
    /// Whether a site needs a node that is land.
    pub land: bool,
}

/// All choices other than the study's own that the data leave open.
pub(super) fn trials(study: &Study, grounds: &Grounds) -> Vec<Trial> {
    let mut trials = Vec::new();
    let mut add = |about, taken: String, change| trials.push(Trial { choice: Choice { about, taken }, change });
    for wind in study.wind.iter().skip(1) {
        add("wind source", wind.id.0.clone(), Change::Source(wind.id.clone()));
    }
    if matches!(study.wind.first().map(|wind| &wind.origin), Some(WindOrigin::Grid { .. })) {
        for (taken, rule) in other_spatial_rules(study.matching.spatial, grounds.land) {
            let mut other = study.clone();
            other.matching.spatial = rule;
            add("wind at the site", taken, Change::Match(Box::new(other)));
        }
    }
    for (taken, speed) in [
        ("mean of the speed", WindowSpeed::SpeedMean),
        ("speed of the mean components", WindowSpeed::SpeedOfMean),
        ("mean of the speed as a scalar", WindowSpeed::ScalarSpeedMean),
    ] {
        if speed != study.matching.wind_speed {
            let mut other = study.clone();
            other.matching.wind_speed = speed;
            add("wind over the window", taken.to_owned(), Change::Fit(Box::new(other)));
        }
    }
    if grounds.several_samples {
        let (taken, statistic) = match study.matching.statistic {
            LevelStatistic::Median => ("power mean", LevelStatistic::PowerMean),
            LevelStatistic::PowerMean => ("median", LevelStatistic::Median),
        };
        let mut other = study.clone();
        other.matching.statistic = statistic;
        add("level of the window", taken.to_owned(), Change::Match(Box::new(other)));
    }
    let mut other = study.clone();
    other.relation.screen = !study.relation.screen;
    let taken = if study.relation.screen { "left in" } else { "screened out" };
    add("short events", taken.to_owned(), Change::Match(Box::new(other)));
    if !study.exclude.is_empty() {
        let mut other = study.clone();
        other.exclude.clear();
        add("exclusion rules", "not applied".to_owned(), Change::Match(Box::new(other)));
    }
    for lag in [-1, 1] {
        let taken = if lag > 0 { "level one window after the wind" } else { "level one window before the wind" };
        add("lag", taken.to_owned(), Change::Lag(lag));
    }
    fit_options(study, grounds.deployments, &mut add);
    trials
}

fn fit_options(study: &Study, deployments: bool, add: &mut dyn FnMut(&'static str, String, Change)) {
    let options = &study.relation.options;
    for (taken, loss) in
        [("Tukey's bisquare", Loss::Tukey), ("Huber's", Loss::Huber), ("least squares", Loss::LeastSquares)]
    {
        if loss != options.loss {
            let mut other = study.clone();
            other.relation.options.loss = loss;
            add("loss", taken.to_owned(), Change::Fit(Box::new(other)));
        }
    }
    for (taken, scatter) in [
        ("scatter estimated", ScatterModel::Estimated),
        ("steady floor, fixed", ScatterModel::FixedPowerSum),
        ("the higher counts (hard corner)", ScatterModel::HardCorner),
    ] {
        if scatter != options.scatter {
            let mut other = study.clone();
            other.relation.options.scatter = scatter;
            add("floor and wind part", taken.to_owned(), Change::Fit(Box::new(other)));
        }
    }
    if deployments {
        for (taken, segments) in [
            ("pooled", Segments::Pooled),
            ("an offset each", Segments::Offset),
            ("a floor each", Segments::Floor),
            ("floor and wind part each", Segments::FloorAndWindPart),
        ] {
            if segments != options.segments {
                let mut other = study.clone();
                other.relation.options.segments = segments;
                add("deployments", taken.to_owned(), Change::Fit(Box::new(other)));
            }
        }
    }
}

/// Rules other than the study's, with distances that suit any grid: the nearest node, and the mean of the nodes around.
fn other_spatial_rules(chosen: SpatialRule, land: bool) -> Vec<(String, SpatialRule)> {
    const KM: f64 = 50.0;
    let bilinear = SpatialRule::Bilinear(CoastRule::Missing);
    let renormalised = SpatialRule::Bilinear(CoastRule::Renormalise);
    let nearest = SpatialRule::Nearest { max_distance_km: KM };
    let footprint = SpatialRule::Footprint { radius_km: KM };
    let same_kind = |rule: &SpatialRule| std::mem::discriminant(rule) == std::mem::discriminant(&chosen);
    let mut rules = Vec::new();
    if !same_kind(&bilinear) {
        rules.push(("bilinear".to_owned(), bilinear));
    } else if land && chosen != renormalised {
        rules.push(("bilinear, land left out".to_owned(), renormalised));
    }
    if !same_kind(&nearest) {
        rules.push((format!("nearest node within {KM} km"), nearest));
    }
    if !same_kind(&footprint) {
        rules.push((format!("mean of the nodes within {KM} km"), footprint));
    }
    rules
}
