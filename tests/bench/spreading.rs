//! `cargo bench --bench spreading [RUNS]`: the long simulation study of the spreading comparison. Deployments of a year with a
//! random law, band, wind climate, site offset of up to 6 dB, density error of 1 dB and a floor that crosses the band.

#![expect(clippy::unwrap_used, clippy::print_stdout, reason = "a program for developers")]

#[path = "../integration/spreading/deployments.rs"]
mod deployments;

use deployments::{Model, Obstacle, tally};

fn main() {
    let runs: u64 = std::env::args().skip(1).find_map(|argument| argument.parse().ok()).unwrap_or(200);
    println!("{runs} deployments a line, hourly for a year; classes over all winds");
    let cases = [
        (Model::Narrow, Obstacle::None, 1.5),
        (Model::Right, Obstacle::None, 1.5),
        (Model::Wide, Obstacle::None, 1.5),
        (Model::Narrow, Obstacle::None, 2.0),
        (Model::Right, Obstacle::None, 2.0),
        (Model::Wide, Obstacle::None, 2.0),
        // What cannot be identified: tail only, floor, no reference, and where laws agree.
        (Model::Narrow, Obstacle::Tail, 1.5),
        (Model::Narrow, Obstacle::Floor, 1.5),
        (Model::Narrow, Obstacle::NoReference, 1.5),
        (Model::Narrow, Obstacle::None, 3.0),
        (Model::Narrow, Obstacle::None, 4.0),
    ];
    for (at, (model, obstacle, low)) in cases.into_iter().enumerate() {
        let first = 1_000_000 * at as u64;
        let t = tally(first..first + runs, model, obstacle, 8760, low);
        println!(
            "model {model:?}, obstacle {obstacle:?}, from {low} fp: too narrow {}, agrees {}, too wide {}, not identified {}; \
             covered {} of {} ({:.1} %), mean half-width {:.1} dB; {} of {} with a true difference of 1.5 half-widths told",
            t.narrow,
            t.agrees,
            t.wide,
            t.not_identified,
            t.covered,
            t.judged,
            100.0 * t.covered as f64 / t.judged.max(1) as f64,
            t.half_width_db,
            t.told,
            t.far
        );
    }
}
