//! What a comparison says, and what must not change it.

use super::deployments::{Deployment, Model, Obstacle, deployment};
use underwind::model::{
    BandComparison, ClassComparison, NotIdentified, NotRadiated, RadiationFlag, SpreadVerdict, density_words,
};
use underwind::science::spreading::{BandFloor, LawTable, SpreadOptions, compare, testability};

const HOURS: usize = 4380;

fn judged(deployment: &Deployment) -> BandComparison {
    deployment.compare(&LawTable::new(1.0), &SpreadOptions::default())
}

fn class(comparison: &BandComparison, low: f64) -> &ClassComparison {
    comparison.classes.iter().find(|c| c.class.all_winds() && c.class.x_low >= low).unwrap()
}

#[test]
fn a_constant_offset_changes_nothing_but_the_offset() {
    let mut deployment = deployment(21, Model::Narrow, Obstacle::None, HOURS);
    let before = judged(&deployment);
    deployment.level_db.iter_mut().for_each(|level| *level += 11.0);
    deployment.floor_db += 11.0;
    let after = judged(&deployment);
    let offset = |c: &BandComparison| c.reference.unwrap().offset_db;
    assert!((offset(&after) - offset(&before) - 11.0).abs() < 1e-9);
    for (a, b) in before.classes.iter().zip(&after.classes) {
        assert_eq!(a.verdict, b.verdict);
        if let (Some(a), Some(b)) = (a.difference, b.difference) {
            assert!((a.difference_db - b.difference_db).abs() < 1e-9 && (a.low_db - b.low_db).abs() < 1e-9);
        }
    }
}

#[test]
fn the_verdict_is_said_in_words() {
    let narrow = judged(&deployment(21, Model::Narrow, Obstacle::None, HOURS));
    let words = class(&narrow, 1.5).words("E taken as known to 1 dB");
    assert!(words.starts_with("model spreads too narrowly between 1.5 and 2 fp by "), "{words}");
    assert!(words.contains(" \u{b1} 5 dB (E taken as known to 1 dB)"), "{words}");
    let words = class(&narrow, 4.0).words("");
    assert!(words.starts_with("above 4 fp: not identified: spreading laws agree here"), "{words}");
    assert_eq!(class(&narrow, 0.0).verdict, SpreadVerdict::NotIdentified(NotIdentified::BelowPeak));
}

#[test]
fn each_obstacle_has_its_own_reason() {
    let verdict = |obstacle| class(&judged(&deployment(22, Model::Narrow, obstacle, HOURS)), 1.5).verdict;
    assert_eq!(verdict(Obstacle::Tail), SpreadVerdict::NotIdentified(NotIdentified::NoReference));
    assert_eq!(verdict(Obstacle::Floor), SpreadVerdict::NotIdentified(NotIdentified::Floor));
    assert_eq!(verdict(Obstacle::NoReference), SpreadVerdict::NotIdentified(NotIdentified::NoReference));

    let plain = deployment(22, Model::Narrow, Obstacle::None, HOURS);
    let with = |change: &dyn Fn(&mut Deployment)| {
        let mut changed = plain.clone();
        change(&mut changed);
        class(&judged(&changed), 1.5).verdict.reason()
    };
    let flagged = |flag: RadiationFlag| {
        with(&|d| d.radiated.iter_mut().for_each(|r| *r = r.map(|level| level.flag_if(true, flag))))
    };
    assert_eq!(flagged(RadiationFlag::Tail), Some(NotIdentified::TailOnly));
    assert_eq!(flagged(RadiationFlag::Blended), Some(NotIdentified::Blended));
    assert_eq!(flagged(RadiationFlag::ShallowSensor), Some(NotIdentified::SensorTooShallow));
    assert_eq!(flagged(RadiationFlag::LowerBound), Some(NotIdentified::LowerBound));
    let steady = with(&|d| d.radiated.iter_mut().for_each(|r| *r = Err(NotRadiated::NoOpposingEnergy)));
    assert_eq!(steady, Some(NotIdentified::NoOpposingEnergy));
    assert_eq!(with(&|d| d.level_db.iter_mut().for_each(|l| *l = f64::NAN)), Some(NotIdentified::FewWindows));
    assert_eq!(with(&|_| {}), None);

    let mut windows = plain.windows();
    windows.floor = BandFloor { fitted_db: None, instrument_db: Some(200.0) };
    let laws = LawTable::new(1.0);
    let (comparison, _) = compare(&windows, &[plain.model("a")], &laws, &SpreadOptions::default());
    assert_eq!(class(&comparison[0], 1.5).verdict.reason(), Some(NotIdentified::Instrument));
}

#[test]
fn what_the_reader_should_know_is_said() {
    let mut deployment = deployment(22, Model::Right, Obstacle::None, HOURS);
    deployment.band = underwind::model::Band::from_edges(0.7, 0.9).unwrap();
    let known = judged(&deployment);
    assert!(known.floor_known && known.remarks().len() == 1 && known.remarks()[0].contains("distant seas"));
    let windows = underwind::science::spreading::BandWindows { floor: BandFloor::default(), ..deployment.windows() };
    let (comparison, _) = compare(&windows, &[deployment.model("a")], &LawTable::new(1.0), &SpreadOptions::default());
    assert!(!comparison[0].floor_known && comparison[0].remarks().len() == 2);
    assert_eq!(density_words(0.5, true), "a buoy bounds E to 0.5 dB");
}

#[test]
fn an_empty_record_is_not_a_panic() {
    let mut empty = deployment(1, Model::Right, Obstacle::None, 48);
    empty.times_ms.clear();
    let windows = underwind::science::spreading::BandWindows {
        times_ms: &[],
        level_db: &[],
        wind_speed_m_s: &[],
        ..empty.windows()
    };
    let model =
        underwind::science::spreading::ModelWindows { model: "a", radiated: &[], f_over_fp: &[], overlap_db: &[] };
    let (comparison, pairs) = compare(&windows, &[model], &LawTable::new(1.0), &SpreadOptions::default());
    assert!(comparison[0].classes.iter().all(|c| c.verdict.reason().is_some()) && pairs.is_empty());
}

#[test]
fn two_models_are_compared_on_the_same_draws() {
    // The same sea and sound; the second model has the right spreading in place of the narrow one.
    let narrow = deployment(21, Model::Narrow, Obstacle::None, HOURS);
    let mut right = narrow.clone();
    for h in 0..HOURS {
        let difference = narrow.true_difference_db[h];
        right.radiated[h] = narrow.radiated[h]
            .map(|level| level.with_level(level.band_level_db + difference, level.tail_sensitivity_db));
        right.overlap_db[h] += difference;
    }
    let laws = LawTable::new(1.0);
    let models = [narrow.model("narrow"), right.model("right")];
    let (comparisons, pairs) = compare(&narrow.windows(), &models, &laws, &SpreadOptions::default());
    let pair = pairs.iter().find(|p| p.class.all_winds() && p.class.x_low > 1.0).unwrap();
    assert_eq!(pair.nearer(), Some("right"), "{pair:?}");
    let distance = |at: usize| class(&comparisons[at], 1.5).difference.unwrap().difference_db.abs();
    assert!((pair.farther_db - (distance(0) - distance(1))).abs() < 1e-9);
    // A model against itself: no difference at all.
    let (_, same) = compare(&narrow.windows(), &[models[0], models[0]], &laws, &SpreadOptions::default());
    assert!(same.iter().all(|p| p.farther_db.abs() < 1e-12 && p.nearer().is_none()));
}

#[test]
fn the_testability_map_counts_every_window_once() {
    let plain = deployment(23, Model::Right, Obstacle::None, HOURS);
    let months = |d: &Deployment| {
        let month_of = |ms: i64| (2031, 1 + (ms / (30 * 86_400_000)) as u32);
        testability(&d.windows(), &d.model("a"), &LawTable::new(1.0), &SpreadOptions::default(), month_of)
    };
    let found = months(&plain);
    assert_eq!(found.len(), 7);
    assert_eq!(found.iter().map(|m| m.windows).sum::<usize>(), HOURS);
    for month in &found {
        let others: usize = month.reasons.iter().map(|(_, count)| count).sum();
        assert_eq!(others + month.testable, month.windows);
    }
    // By count of f / fp alone: where laws part by 6 dB or more, x runs from 1.5 to about 2.6.
    let parted = plain.f_over_fp.iter().filter(|x| (1.5..2.6).contains(*x)).count();
    let testable: usize = found.iter().map(|m| m.testable).sum();
    assert!(testable > parted / 2 && testable < parted * 5 / 4, "{testable} of {parted}");
    let tail = months(&deployment(23, Model::Right, Obstacle::Tail, HOURS));
    assert!(tail.iter().any(|m| m.reasons.iter().any(|(why, _)| *why == NotIdentified::TailOnly)));
}
