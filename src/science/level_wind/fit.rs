//! The whole fit, step by step.

use super::bootstrap::{Replicas, SharedRows};
use super::draws::Draws;
use super::law::{Corner, Law, wind_of};
use super::options::Options;
use super::point::{PointFit, check};
use super::record::Record;
use super::{outcome, resolve, summary};
use crate::model::{LevelLaw, NotResolved, RELATION_SCHEMA, Relation, RelationDiagnostics, Resolved, Verdict};
use crate::numerics::quantile::median;
use rayon::prelude::*;
use std::sync::Arc;

/// Levels of a site's bands beside the wind overhead. All columns have one entry per time window.
#[derive(Debug, Clone)]
pub struct SiteRecord<'a> {
    /// Centre of each window, milliseconds since 1970-01-01 UTC; in any order.
    pub times_ms: &'a [i64],
    /// Wind speed at 10 m, m/s; NaN where missing.
    pub wind_speed_m_s: &'a [f64],
    /// Deployment (or any other segment) of each window.
    pub deployment: Option<&'a [u32]>,
    /// Level of each band, dB; NaN where missing.
    pub levels_db: Vec<&'a [f64]>,
}

/// Fits every band of a site. The result does not depend on the number of threads nor on the order of the rows.
///
/// # Panics
///
/// Never: the expectation inside states that every fit has its result.
pub fn fit_site(site: &SiteRecord<'_>, options: &Options) -> Vec<Relation> {
    let points: Vec<Result<PointFit, Box<Relation>>> =
        site.levels_db.par_iter().map(|levels| point_fit(site, levels, options)).collect();
    let fits: Vec<&PointFit> = points.iter().filter_map(|point| point.as_ref().ok()).collect();
    let Some(draws) = draws(site, &fits, options) else {
        return points.into_iter().map(|point| point.map_or_else(|other| *other, |fit| point_relation(&fit))).collect();
    };
    let shared = shared_rows(&fits, &draws);
    let mut resolved: Vec<Relation> =
        fits.par_iter().zip(&shared).map(|(fit, rows)| resolved_relation(fit, rows, &draws, options)).collect();
    resolved.reverse();
    points
        .into_iter()
        .map(|point| match point {
            Ok(_) => resolved.pop().expect("one result for every fit"),
            Err(other) => *other,
        })
        .collect()
}

/// Fits one band; see [`SiteRecord`] for the columns.
///
/// # Panics
///
/// Never: the expectation inside states that one band in gives one relation out.
pub fn fit_band(
    times_ms: &[i64],
    wind_speed_m_s: &[f64],
    levels_db: &[f64],
    deployment: Option<&[u32]>,
    options: &Options,
) -> Relation {
    let site = SiteRecord { times_ms, wind_speed_m_s, deployment, levels_db: vec![levels_db] };
    fit_site(&site, options).pop().expect("one band in, one relation out")
}

/// Point estimate of a band, or the relation that says why there is none.
fn point_fit(site: &SiteRecord<'_>, levels: &[f64], options: &Options) -> Result<PointFit, Box<Relation>> {
    let record = Record::new(site.times_ms, site.wind_speed_m_s, levels, site.deployment);
    match check(&record) {
        Ok(()) => Ok(PointFit::new(record, options)),
        Err(why @ NotResolved::WindRangeTooSmall) => Err(Box::new(constant_relation(why, &record))),
        Err(why) => Err(Box::new(Relation::not_fitted(why, summary::record_diagnostics(&record)))),
    }
}

/// Draws of blocks for all bands of a site, unless no replicates were asked for or the record has no length.
fn draws(site: &SiteRecord<'_>, fits: &[&PointFit], options: &Options) -> Option<Draws> {
    let block_h = resampled_block_h(fits)?;
    if options.replicates == 0 || block_h <= 0.0 {
        return None;
    }
    let mut used = vec![false; site.times_ms.len()];
    for fit in fits {
        fit.band.record.source_row.iter().for_each(|&row| used[row] = true);
    }
    Some(Draws::new(site.times_ms, &used, block_h, options.replicates, options.seed))
}

/// Length of the blocks that are resampled: twice that of the band that remembers longest, but not more than twice the
/// site's median (a single odd band must not coarsen all intervals); at least a thousandth of the record (more blocks cost
/// memory and bring nothing), and at most one eighth of it.
fn resampled_block_h(fits: &[&PointFit]) -> Option<f64> {
    let lengths: Vec<f64> = fits.iter().map(|fit| fit.block_h).collect();
    let longest = lengths.iter().copied().reduce(f64::max)?;
    let span_h = fits.iter().map(|fit| fit.band.record.span_h()).fold(0.0, f64::max);
    Some((2.0 * longest.min(2.0 * median(&lengths))).max(span_h / 1000.0).min(span_h / 8.0))
}

/// Row sums of replicates, computed once for all bands with the same samples and rows.
fn shared_rows(fits: &[&PointFit], draws: &Draws) -> Vec<Arc<SharedRows>> {
    let same = |a: &PointFit, b: &PointFit| {
        a.band.rows.of_sample == b.band.rows.of_sample && a.band.record.source_row == b.band.record.source_row
    };
    let mut leaders: Vec<&PointFit> = Vec::new();
    let mut leader_of = Vec::new();
    for fit in fits {
        let known = leaders.iter().position(|leader| same(leader, fit));
        leader_of.push(known.unwrap_or(leaders.len()));
        if known.is_none() {
            leaders.push(fit);
        }
    }
    let rows: Vec<Arc<SharedRows>> =
        leaders.par_iter().map(|leader| Arc::new(SharedRows::new(&leader.band, draws))).collect();
    leader_of.into_iter().map(|leader| Arc::clone(&rows[leader])).collect()
}

fn resolved_relation(fit: &PointFit, rows: &Arc<SharedRows>, draws: &Draws, options: &Options) -> Relation {
    let replicas = Replicas::new(&fit.band, fit.scatter.as_ref(), Arc::clone(rows), draws, options.loss);
    let found = resolve::findings(fit, &replicas, options, &outcome::curve_x(fit));
    outcome::relation(fit, found, draws, options, &replicas.mean_levels())
}

/// A band whose level is given as a constant, and why.
fn constant_relation(why: NotResolved, record: &Record) -> Relation {
    let level_db = median(&record.level_db);
    let curve = summary::constant_curve(level_db);
    Relation {
        verdict: Verdict::NoSlope,
        law: LevelLaw::Constant,
        level_at_10_m_s_db: Resolved::point(level_db),
        wind_classes: summary::wind_classes(record, &curve),
        curve_band: summary::curve_points(record, &curve),
        curve: Some(curve),
        ..Relation::not_fitted(why, summary::record_diagnostics(record))
    }
}

/// A fit without intervals: floor and knee as they are.
fn point_relation(fit: &PointFit) -> Relation {
    let at = &fit.band.polish_samples(Law::Knee, Corner::Floor, &fit.at);
    let curve = summary::mean_curve(&fit.band, Law::Knee, Corner::Floor, at, 0);
    Relation {
        schema: RELATION_SCHEMA,
        verdict: Verdict::PointOnly,
        not_fitted: None,
        law: LevelLaw::FloorAndKnee,
        floor_db: Resolved::point(at.floor_db[0]),
        slope_db_per_decade: Resolved::point(at.slope),
        mean_square_pressure_exponent: Resolved::point(at.slope / 10.0),
        wind_component_at_10_m_s_db: Resolved::point(at.wind_db[0]),
        level_at_10_m_s_db: Resolved::point(curve.level_db(10.0)),
        onset_m_s: Resolved::point(wind_of(at.bend)),
        post_onset_slope_db_per_decade: Resolved::NotResolved(NotResolved::NotComputed),
        curve_band: summary::curve_points(&fit.band.record, &curve),
        wind_classes: summary::wind_classes(&fit.band.record, &curve),
        curve: Some(curve),
        selected: None,
        scatter: Some(summary::scatter_of(fit)),
        deployments: summary::deployment_points(fit, at),
        deployment_difference: None,
        diagnostics: RelationDiagnostics {
            fitted_onset_m_s: Some(wind_of(at.bend)),
            ..summary::point_diagnostics(fit)
        },
        warnings: Vec::new(),
        replicates: None,
    }
}
