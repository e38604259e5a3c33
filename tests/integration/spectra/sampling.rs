//! Whole series at sites: the same from any layout of storage, any split into files and any number of threads.

use super::support::fixture;
use std::path::PathBuf;
use underwind::io::netcdf::{SpectraOptions, open_spectra};
use underwind::model::{Point, SeaRow, Site, SourceId, SpectraSeries, Track};
use underwind::pipeline::{Silent, SpectraRules, sample_spectra};

fn sites() -> Vec<Site> {
    [("A", 45.3, -31.6), ("B", 46.0, -31.0), ("C", 45.9, -31.2), ("D", 50.0, -31.2)]
        .into_iter()
        .map(|(id, latitude, longitude)| Site {
            id: id.into(),
            track: Track::Fixed(Point::new(latitude, longitude).unwrap()),
            sensors: Vec::new(),
        })
        .collect()
}

fn sample(names: &[&str]) -> Vec<SpectraSeries> {
    let files: Vec<PathBuf> = names.iter().map(|name| fixture(name)).collect();
    let source = open_spectra(SourceId("sea".into()), &files, &SpectraOptions::default()).unwrap();
    sample_spectra(&source, &sites(), &[], None, &SpectraRules::default(), &Silent).unwrap()
}

/// Rows that are numbers in every step.
const ROWS: [SeaRow; 7] =
    [SeaRow::Density, SeaRow::A1, SeaRow::B1, SeaRow::Total, SeaRow::Diagonal, SeaRow::Own, SeaRow::ZeroPairs];

fn assert_same(a: &[SpectraSeries], b: &[SpectraSeries], tolerance: f32, what: &str) {
    for (a, b) in a.iter().zip(b) {
        assert_eq!((a.steps.len(), &a.missing), (b.steps.len(), &b.missing), "{what}");
        for step in (0..a.steps.len()).filter(|step| a.is_known(*step)) {
            for row in ROWS.into_iter().chain((step + 1 < a.steps.len()).then_some(SeaRow::WithNext)) {
                for (x, y) in a.row(step, row).iter().zip(b.row(step, row)) {
                    let close = (x - y).abs() <= tolerance * x.abs().max(1e-12);
                    assert!(close, "{what}: site {}, step {step}, {row:?}: {x} and {y}", a.site);
                }
            }
        }
    }
}

#[test]
fn layouts_files_and_order_do_not_matter() {
    let plain = sample(&["plain.nc"]);
    assert!(plain[0].is_known(0) && plain[3].missing[0].is_some());
    for names in
        [&["classic.nc"][..], &["turned.nc"], &["turned_classic.nc"], &["first.nc", "second.nc"], &["unsorted.nc"]]
    {
        assert_same(&plain, &sample(names), 0.0, &format!("{names:?}"));
    }
    assert_same(&plain, &sample(&["tiles.nc"]), 1e-4, "tiles.nc");
}

#[test]
fn any_number_of_threads_gives_the_same_bits() {
    let on = |threads: usize| {
        rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap().install(|| sample(&["single.nc"]))
    };
    let one = on(1);
    for threads in [2, 4] {
        let other = on(threads);
        for (a, b) in one.iter().zip(&other) {
            for step in 0..a.steps.len() {
                for row in ROWS.into_iter().chain([SeaRow::WithNext]) {
                    let bits = |series: &SpectraSeries| -> Vec<u32> {
                        series.row(step, row).iter().map(|value| value.to_bits()).collect()
                    };
                    assert_eq!(bits(a), bits(b), "{threads} threads");
                }
            }
        }
    }
}
