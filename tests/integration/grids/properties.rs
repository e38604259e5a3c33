//! What must hold for every place, window, order and number of threads.

use super::support::{fixture, open, sample, series, site};
use proptest::prelude::*;
use std::sync::LazyLock;
use underwind::io::netcdf::WindSource;
use underwind::model::{FieldSource, Point, Site, SpatialRule, Track, WindSeries};
use underwind::pipeline::{Silent, sample_wind};
use underwind::science::matchup::wind_at;
use underwind::units::{Instant, Window};

fn opened(names: &[&str]) -> WindSource {
    open(&names.iter().map(|name| fixture(name)).collect::<Vec<_>>(), &[]).unwrap()
}

/// One global field in five writings: 0 to 330, -180 to 150, falling, with the end column twice, both.
static TURNED: LazyLock<Vec<WindSource>> = LazyLock::new(|| {
    ["g02_global.nc", "g02_global_180.nc", "g02_falling.nc", "g03_twice.nc"].map(|name| opened(&[name])).into()
});
/// One regional field across the antimeridian in four writings.
static ACROSS: LazyLock<Vec<WindSource>> = LazyLock::new(|| {
    ["g05_unwrapped.nc", "g05_jump.nc", "g05_jump_late.nc", "g05_negative.nc"].map(|name| opened(&[name])).into()
});
/// Fields with gaps, a masked step, steps out of order, and several files.
static STEPPED: LazyLock<Vec<WindSource>> = LazyLock::new(|| {
    [
        &["t08_gap.nc"][..],
        &["g14_step.nc"],
        &["t07_unsorted.nc"],
        &["t07_twice.nc"],
        &["t10_b.nc", "t10_a.nc", "t10_overlap.nc"],
        &["t08_change.nc"],
        &["d02_split.nc"],
    ]
    .map(opened)
    .into()
});

fn at(source: &WindSource, latitude: f64, longitude: f64) -> WindSeries {
    sample(source, latitude, longitude)
}

/// The same to rounding, missing where the other is.
fn same(a: &WindSeries, b: &WindSeries) -> bool {
    let close = |a: &[f64], b: &[f64]| {
        a.len() == b.len() && a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-9 || (a.is_nan() && b.is_nan()))
    };
    close(&a.eastward_m_s, &b.eastward_m_s) && close(&a.northward_m_s, &b.northward_m_s) && a.missing == b.missing
}

proptest! {
    #[test]
    fn turning_the_grid_or_the_site_by_a_full_turn_changes_nothing(latitude in -90.0..90.0f64, longitude in -180.0..180.0f64) {
        let here = at(&TURNED[0], latitude, longitude);
        prop_assert!(here.missing.iter().all(Option::is_none));
        for source in TURNED.iter() {
            for turned in [longitude, if longitude < 0.0 { longitude + 360.0 } else { longitude }] {
                prop_assert!(same(&here, &at(source, latitude, turned)), "{latitude} {turned}");
            }
        }
        let across = at(&ACROSS[0], latitude, longitude);
        for source in ACROSS.iter() {
            prop_assert!(same(&across, &at(source, latitude, longitude)), "{latitude} {longitude}");
        }
    }

    #[test]
    fn a_value_lies_within_those_of_its_corners(latitude in -90.0..90.0f64, longitude in 0.0..360.0f64) {
        let source = &TURNED[0];
        let here = at(source, latitude, longitude);
        // Rows every 45 degrees, columns every 30.
        let (south, west) = ((latitude / 45.0).floor() * 45.0, (longitude / 30.0).floor() * 30.0);
        let corners: Vec<WindSeries> = [(south, west), (south + 45.0, west), (south, west + 30.0), (south + 45.0, west + 30.0)]
            .into_iter()
            .map(|(latitude, longitude)| at(source, latitude.min(90.0), longitude))
            .collect();
        for k in 0..here.steps.len() {
            let components: [fn(&WindSeries) -> &[f64]; 2] = [|series| &series.eastward_m_s, |series| &series.northward_m_s];
            for of in components {
                let low = corners.iter().map(|corner| of(corner)[k]).fold(f64::INFINITY, f64::min);
                let high = corners.iter().map(|corner| of(corner)[k]).fold(f64::NEG_INFINITY, f64::max);
                prop_assert!((low - 1e-9..=high + 1e-9).contains(&of(&here)[k]));
            }
            // By the triangle inequality the scalar speed is never below that of the components.
            let speed = here.eastward_m_s[k].hypot(here.northward_m_s[k]);
            prop_assert!(here.scalar_speed_m_s[k] >= speed - 1e-9);
        }
    }

    #[test]
    fn a_window_answers_as_the_whole_record_does(which in 0usize..7, start_min in -120i64..1100, length_min in 0i64..400) {
        let source = &STEPPED[which];
        let start = Instant::parse("2031-01-10T00:00:00Z").unwrap().plus_ms(start_min * 60_000);
        let window = Window { start, end: start.plus_ms(length_min * 60_000) };
        let place = site(45.0, 229.0);
        let rule = SpatialRule::default();
        let part = sample_wind(source, std::slice::from_ref(&place), Some(window), &rule, &Silent).unwrap().remove(0);
        let whole = sample_wind(source, &[place], None, &rule, &Silent).unwrap().remove(0);
        for share in [0, 1, 2, 3] {
            let instant = start.plus_ms(share * length_min * 20_000);
            prop_assert_eq!(wind_at(&part, instant), wind_at(&whole, instant), "{:?} {}", window, instant);
        }
    }
}

/// A site that moves answers at each step as a site that stays at its place then.
#[test]
fn a_moving_site_is_at_its_place_at_every_step() {
    let source = opened(&["contiguous.nc"]);
    let steps = source.meta().steps.clone();
    let (first, last) = (steps[3], steps[20]);
    let (from, to) = (Point::new(44.6, -31.9).unwrap(), Point::new(45.9, -30.6).unwrap());
    let track = Track::Moving(vec![(first, from), (last, to)]);
    let moving = Site { id: "M".into(), track: track.clone(), sensors: Vec::new() };
    for window in [None, Some(Window { start: steps[5].plus_ms(60_000), end: steps[9] })] {
        let found = sample_wind(&source, std::slice::from_ref(&moving), window, &SpatialRule::default(), &Silent)
            .unwrap()
            .remove(0);
        for (k, step) in found.steps.iter().enumerate() {
            match track.at(*step) {
                Some(place) => {
                    let fixed = at(&source, place.latitude_deg(), place.longitude_deg());
                    let whole = fixed.steps.binary_search(step).unwrap();
                    assert_eq!(
                        (found.eastward_m_s[k], found.northward_m_s[k]),
                        (fixed.eastward_m_s[whole], fixed.northward_m_s[whole])
                    );
                }
                None => assert_eq!(found.missing[k], Some(underwind::model::Missing::NoPosition)),
            }
        }
        assert!(found.missing.iter().filter(|why| why.is_none()).count() >= 6);
    }
}

#[test]
fn one_thread_and_many_give_the_same_bits() {
    for names in [
        &["deflate_shuffle_checksum.nc"][..],
        &["time_last.nc"],
        &["first_half.nc", "second_half.nc"],
        &["f02_scaleoffset.nc"],
    ] {
        let grid = opened(names).meta().grid.clone();
        let [south, north, west, east] = grid.limits();
        let sites: Vec<Site> = (0..9)
            .map(|k| f64::from(k) / 8.0)
            .map(|share| {
                let longitude = west + share * (east - west);
                site(south + share * share * (north - south), (longitude + 180.0).rem_euclid(360.0) - 180.0)
            })
            .collect();
        for rule in [SpatialRule::default(), SpatialRule::Footprint { radius_km: 150.0 }] {
            let by = |threads: usize| {
                let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
                pool.install(|| sample_wind(&opened(names), &sites, None, &rule, &Silent).unwrap())
            };
            let bits = |series: &[WindSeries]| -> Vec<u64> {
                series
                    .iter()
                    .flat_map(|one| one.eastward_m_s.iter().chain(&one.northward_m_s).chain(&one.scalar_speed_m_s))
                    .map(|value| value.to_bits())
                    .collect()
            };
            let one = bits(&by(1));
            assert!(one.iter().any(|bits| f64::from_bits(*bits).is_finite()), "{names:?}");
            for threads in [2, 4] {
                assert_eq!(one, bits(&by(threads)), "{names:?} with {threads} threads");
            }
        }
    }
}

#[test]
fn order_of_files_and_repeats_change_nothing() {
    let whole = series(&["t10_a.nc", "t10_b.nc"].map(fixture), 45.2, 228.7);
    for names in [
        &["t10_b.nc", "t10_a.nc"][..],
        &["t10_overlap.nc", "t10_b.nc", "t10_a.nc"],
        &["t10_a.nc", "t10_a.nc", "t10_b.nc"],
    ] {
        let files: Vec<_> = names.iter().map(|name| fixture(name)).collect();
        assert_eq!(series(&files, 45.2, 228.7), whole, "{names:?}");
    }
}

/// 650 million nodes: neither the search for the nearest nor the reading may touch them all.
#[test]
fn a_wide_grid_costs_what_its_few_nodes_cost() {
    let start = std::time::Instant::now();
    let source = opened(&["f05_sparse.nc"]);
    for rule in [SpatialRule::Nearest { max_distance_km: 3.0 }, SpatialRule::Footprint { radius_km: 3.0 }] {
        let found = sample_wind(&source, &[site(45.05, 229.05)], None, &rule, &Silent).unwrap().remove(0);
        assert!(found.eastward_m_s.iter().all(|value| (value - 3.0).abs() < 1e-9), "{:?}", found.eastward_m_s);
    }
    // A scan of all nodes takes minutes.
    assert!(start.elapsed().as_secs() < 30, "{:?}", start.elapsed());
}
