//! Difference in differences: measured minus radiated level in a class, less the same in the reference class.
//!
//! The measured level is twice the density in dB, plus the overlap, plus constants and the site's offset. A free offset would
//! absorb any constant error of the overlap. So the offset is fixed where all published laws agree (far above the peak, outside
//! the tail), from the model's density with the middle of those laws in place of the model's own overlap, and carried over to
//! the classes where they part. What is left is the model's error in E squared times overlap; it
//! is the overlap's error only as far as E is known, so the stated uncertainty of E counts twice, and so does the spread of
//! the laws in the reference class.

use super::laws::LawTable;
use super::member::{Cells, Members};
use super::options::SpreadOptions;
use super::windows::{BandWindows, Floor, ModelWindows};
use crate::model::{
    BandComparison, ClassComparison, NotIdentified, PairedComparison, ReferenceOffset, SpreadClass, SpreadDifference,
    SpreadVerdict,
};
use crate::numerics::resample::{circular_block_weights, generator};
use crate::numerics::student_t::student_t_quantile;

/// 97.5 % point of the normal distribution.
const NORMAL_95: f64 = 1.959_963_984_540_054;

struct ModelClasses {
    reference: Members,
    reference_clear: bool,
    classes: Vec<Members>,
    /// Replicates of the difference, class by class (NaN where a draw left a class empty).
    replicates: Vec<Vec<f64>>,
}

/// Compares one or more models with the levels of one band. All models share the draws of the bootstrap; the pairs follow
/// the order of the models.
pub fn compare(
    windows: &BandWindows<'_>,
    models: &[ModelWindows<'_>],
    laws: &LawTable,
    options: &SpreadOptions,
) -> (Vec<BandComparison>, Vec<PairedComparison>) {
    let classes = options.classes();
    let floor = Floor::of(windows);
    let cells = Cells::new(windows.times_ms, options);
    let mut gathered: Vec<ModelClasses> = models
        .iter()
        .map(|model| {
            let reference = Members::gather(windows, model, options.reference(), floor, cells, Some(laws));
            ModelClasses {
                reference_clear: reference.clear_of(floor, options),
                reference,
                classes: classes
                    .iter()
                    .map(|class| Members::gather(windows, model, *class, floor, cells, None))
                    .collect(),
                replicates: vec![Vec::with_capacity(options.replicates); classes.len()],
            }
        })
        .collect();
    draw(&mut gathered, cells, options);
    let comparisons = models
        .iter()
        .zip(&gathered)
        .map(|(model, gathered)| BandComparison {
            model: model.model.to_owned(),
            band: windows.band,
            reference: reference_of(gathered, options),
            floor_db: floor.level_db,
            floor_known: floor.known,
            classes: (0..classes.len()).map(|at| judge(gathered, at, classes[at], floor, laws, options)).collect(),
        })
        .collect::<Vec<_>>();
    let pairs = pairs(&comparisons, &gathered, options);
    (comparisons, pairs)
}

fn reference_of(gathered: &ModelClasses, options: &SpreadOptions) -> Option<ReferenceOffset> {
    let reference = &gathered.reference;
    (reference.enough(options) && gathered.reference_clear).then(|| ReferenceOffset {
        offset_db: reference.median_db(),
        windows: reference.used(),
        episodes: reference.episodes,
    })
}

/// The same draws for all models and classes, so that differences between models can be judged.
fn draw(gathered: &mut [ModelClasses], cells: Cells, options: &SpreadOptions) {
    let mut random = generator(options.seed, 0x5350_5244);
    let mut weights = vec![0.0; cells.count];
    for _ in 0..options.replicates {
        circular_block_weights(&mut random, cells.count, cells.block_cells, &mut weights);
        for model in gathered.iter_mut() {
            let offset = model.reference.weighted_median_db(|cell| weights[cell]);
            for (members, replicates) in model.classes.iter().zip(&mut model.replicates) {
                replicates.push(members.weighted_median_db(|cell| weights[cell]) - offset);
            }
        }
    }
}

fn judge(
    gathered: &ModelClasses,
    at: usize,
    class: SpreadClass,
    floor: Floor,
    laws: &LawTable,
    options: &SpreadOptions,
) -> ClassComparison {
    let members = &gathered.classes[at];
    let reference = reference_of(gathered, options);
    let law_range_db = laws.range_db(members.x);
    let difference =
        reference.filter(|_| members.enough(options) && class != options.reference()).and_then(|reference| {
            let difference_db = members.median_db() - reference.offset_db;
            let episodes = members.episodes.min(reference.episodes);
            interval(difference_db, &gathered.replicates[at], episodes, options)
        });
    let verdict = verdict(gathered, members, class, floor, law_range_db, difference.as_ref(), options);
    ClassComparison {
        class,
        windows: members.windows,
        used: members.used(),
        episodes: members.episodes,
        measured_db: members.measured_db,
        radiated_db: members.radiated_db,
        model_overlap_db: members.overlap_db,
        median_x: members.x,
        law_range_db,
        difference,
        verdict,
        unused: members.unused.clone(),
    }
}

/// Bootstrap, twice the uncertainty of E, and the spread of laws, in quadrature; Student's t for few episodes.
fn interval(
    difference_db: f64,
    replicates: &[f64],
    episodes: usize,
    options: &SpreadOptions,
) -> Option<SpreadDifference> {
    let finite: Vec<f64> = replicates.iter().copied().filter(|value| value.is_finite()).collect();
    // A class that many draws miss hangs on few episodes.
    if !difference_db.is_finite() || finite.len() < options.replicates * 9 / 10 || finite.len() < 20 {
        return None;
    }
    let mean = finite.iter().sum::<f64>() / finite.len() as f64;
    let variance = finite.iter().map(|value| (value - mean) * (value - mean)).sum::<f64>() / (finite.len() - 1) as f64;
    let record_sd_db = variance.sqrt();
    let record = student_t_quantile(0.975, (episodes.max(2) - 1) as f64) * record_sd_db;
    let density = NORMAL_95 * 2.0 * options.density_sd_db;
    let half = (record * record + density * density + options.law_spread_db * options.law_spread_db).sqrt();
    Some(SpreadDifference { difference_db, low_db: difference_db - half, high_db: difference_db + half, record_sd_db })
}

fn verdict(
    gathered: &ModelClasses,
    members: &Members,
    class: SpreadClass,
    floor: Floor,
    law_range_db: f64,
    difference: Option<&SpreadDifference>,
    options: &SpreadOptions,
) -> SpreadVerdict {
    let not = SpreadVerdict::NotIdentified;
    if class.x_high <= options.least_x {
        return not(NotIdentified::BelowPeak);
    }
    if class.x_low >= options.reference().x_low {
        return not(NotIdentified::LawsAgree);
    }
    if !members.enough(options) {
        // What kept most windows out, where that is more than what was left.
        return not(members
            .unused
            .first()
            .filter(|(_, count)| *count > members.used())
            .map_or(if members.windows == 0 { NotIdentified::FewWindows } else { few(members) }, |(why, _)| *why));
    }
    if law_range_db < options.least_law_range_db {
        return not(NotIdentified::LawsAgree);
    }
    if !members.clear_of(floor, options) {
        return not(floor.reason);
    }
    if !gathered.reference.enough(options) {
        return not(NotIdentified::NoReference);
    }
    if !gathered.reference_clear {
        return not(floor.reason);
    }
    match difference {
        None => not(NotIdentified::FewWindows),
        Some(d) if d.low_db > 0.0 => SpreadVerdict::TooNarrow,
        Some(d) if d.high_db < 0.0 => SpreadVerdict::TooWide,
        Some(d) if d.half_width_db() > law_range_db => not(NotIdentified::TooUncertain),
        Some(_) => SpreadVerdict::Agrees,
    }
}

fn few(members: &Members) -> NotIdentified {
    if members.used() == 0 {
        members.unused.first().map_or(NotIdentified::FewWindows, |(why, _)| *why)
    } else {
        NotIdentified::FewWindows
    }
}

/// Every two models in every class where both have a difference.
fn pairs(comparisons: &[BandComparison], gathered: &[ModelClasses], options: &SpreadOptions) -> Vec<PairedComparison> {
    let mut found = Vec::new();
    for first in 0..comparisons.len() {
        for second in first + 1..comparisons.len() {
            let classes = comparisons[first].classes.iter().zip(&comparisons[second].classes);
            for (at, (a, b)) in classes.enumerate() {
                let judged = |c: &ClassComparison| {
                    c.difference.filter(|_| c.verdict.reason().is_none_or(|why| why == NotIdentified::TooUncertain))
                };
                let (Some(one), Some(other)) = (judged(a), judged(b)) else { continue };
                let farther = |x: f64, y: f64| x.abs() - y.abs();
                let draws = gathered[first].replicates[at].iter().zip(&gathered[second].replicates[at]);
                let finite: Vec<f64> = draws.map(|(x, y)| farther(*x, *y)).filter(|value| value.is_finite()).collect();
                if finite.len() < 20 {
                    continue;
                }
                let farther_db = farther(one.difference_db, other.difference_db);
                let mean = finite.iter().sum::<f64>() / finite.len() as f64;
                let variance =
                    finite.iter().map(|value| (value - mean) * (value - mean)).sum::<f64>() / (finite.len() - 1) as f64;
                let episodes = a.episodes.min(b.episodes).max(2);
                let record = student_t_quantile(0.975, (episodes - 1) as f64) * variance.sqrt();
                // Each model has its own error in E. The sea's own law in the reference class is common to both; on opposite
                // sides of the sound it counts twice.
                let density = NORMAL_95 * 2.0 * options.density_sd_db * 2f64.sqrt();
                let opposite = one.difference_db * other.difference_db < 0.0;
                let law = if opposite { 2.0 * options.law_spread_db } else { 0.0 };
                let half = (record * record + density * density + law * law).sqrt();
                found.push(PairedComparison {
                    models: [comparisons[first].model.clone(), comparisons[second].model.clone()],
                    band: comparisons[first].band,
                    class: a.class,
                    farther_db,
                    interval_db: (farther_db - half, farther_db + half),
                });
            }
        }
    }
    found
}
