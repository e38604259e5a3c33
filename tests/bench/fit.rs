//! How long a fit of many bands takes, and the long simulation study.
//!
//! `cargo bench --bench fit` times 30 bands of 20,000 hourly samples with 1000 replicates, and 20 sites of 30 bands of 8,760
//! samples with 1000 replicates.
//!
//! `cargo bench --bench fit -- study RUNS SAMPLES [FIRST_SEED [CASE...]]` runs the simulation study: RUNS seeds of every
//! case from the first on (2001 where none is given), 400 replicates. It prints verdict shares, bias, root mean square
//! error, coverage, and the median interval width over 3.92 standard deviations of the estimates (the width that one who
//! knew the distribution of the estimate would use). `STUDY.md` keeps what it printed.

#![expect(clippy::unwrap_used, clippy::print_stdout, reason = "a program for developers")]

#[expect(dead_code, reason = "shared with the tests, which use more of it")]
#[path = "../integration/estimator/simulator.rs"]
mod simulator;
#[path = "study.rs"]
mod study;

use simulator::{Scatter, Truth, record};
use std::time::Instant;
use underwind::science::level_wind::{Options, SiteRecord, fit_site};

/// Bands of one site: the same wind, another crossover and scatter in each.
fn site(bands: usize, samples: usize, seed: u64) -> (Vec<i64>, Vec<f64>, Vec<Vec<f64>>) {
    let plain = record(Truth::default(), samples, seed);
    let levels = (0..bands)
        .map(|band| {
            let scatter = match band % 5 {
                0 | 1 => Scatter::Total { memory_h: 8.0 },
                2 => Scatter::Outliers,
                3 => Scatter::RandomFloor,
                _ => Scatter::Ships,
            };
            let truth = Truth { crossover_m_s: 2.5 + 0.1 * band as f64, scatter, ..Truth::default() };
            // The wind is drawn first, so the same seed gives the same wind.
            record(truth, samples, seed).level_db
        })
        .collect();
    (plain.times_ms, plain.wind_m_s, levels)
}

fn time(sites: usize, bands: usize, samples: usize, replicates: usize) {
    let data: Vec<_> = (0..sites.min(2)).map(|index| site(bands, samples, 100 + index as u64)).collect();
    let options = Options { replicates, ..Options::default() };
    let start = Instant::now();
    let mut resolved = 0;
    for index in 0..sites {
        let (times, wind, levels) = &data[index % data.len()];
        let record = SiteRecord {
            times_ms: times,
            wind_speed_m_s: wind,
            deployment: None,
            levels_db: levels.iter().map(Vec::as_slice).collect(),
        };
        let relations = fit_site(&record, &options);
        resolved += relations.iter().filter(|relation| relation.slope_db_per_decade.estimate().is_some()).count();
    }
    println!(
        "{sites} sites x {bands} bands x {replicates} replicates x {samples} samples: {:.2} s ({resolved} slopes)",
        start.elapsed().as_secs_f64()
    );
}

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| argument != "--bench").collect();
    match arguments.first().map(String::as_str) {
        Some("study") => study::run(&arguments[1..]),
        Some("one") => time(1, 30, 20_000, 1000),
        _ => {
            time(1, 30, 20_000, 0);
            time(1, 30, 20_000, 1000);
            time(20, 30, 8_760, 1000);
        }
    }
}
