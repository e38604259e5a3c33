//! How fast directional spectra are sampled and reduced: a year of 3-hourly spectra at twenty sites, with one thread and
//! with all.
//!
//! Run: `cargo bench --bench spectra -- SPECTRA.nc SITES.csv` (columns `site_id,lat,lon`). Without arguments nothing is
//! measured: the file is large and is made elsewhere. Prints wall seconds, CPU seconds and the peak of resident memory so
//! far (Linux); read the file once before, so that it is in the page cache. A third argument, a number, is the only thread
//! count.

#![expect(clippy::print_stdout, reason = "a bench prints its figures")]

use std::path::PathBuf;
use std::time::Instant as Clock;
use underwind::io::netcdf::{SpectraOptions, open_spectra};
use underwind::model::{Point, SeaRow, Site, SourceId, Track};
use underwind::pipeline::{Silent, SpectraRules, sample_spectra};
use underwind::science::waves::{Reducer, sea_over_windows};
use underwind::units::Window;

type Failed = Box<dyn std::error::Error>;

fn sites(table: &str) -> Result<Vec<Site>, Failed> {
    let site = |(k, line): (usize, &str)| -> Result<Site, Failed> {
        let fields: Vec<&str> = line.split(',').collect();
        let longitude: f64 = fields[2].parse()?;
        let turned = (longitude + 180.0).rem_euclid(360.0) - 180.0;
        let track = Track::Fixed(Point::new(fields[1].parse()?, turned)?);
        Ok(Site { id: format!("S{k:02}"), track, sensors: Vec::new() })
    };
    table.lines().skip(1).enumerate().map(site).collect()
}

/// CPU seconds of this process and the peak of its resident memory in MB, as Linux states them.
fn usage() -> (f64, f64) {
    let stat = std::fs::read_to_string("/proc/self/stat").unwrap_or_default();
    let fields: Vec<&str> = stat.rsplit(')').next().unwrap_or_default().split_whitespace().collect();
    let ticks: f64 = [11, 12].iter().filter_map(|at| fields.get(*at)?.parse::<f64>().ok()).sum();
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let peak = status.lines().find_map(|line| line.strip_prefix("VmHWM:")).unwrap_or_default();
    let peak_kb: f64 = peak.trim().trim_end_matches(" kB").parse().unwrap_or(f64::NAN);
    // The kernel's clock has 100 ticks a second on every common system.
    (ticks / 100.0, peak_kb / 1024.0)
}

fn main() -> Result<(), Failed> {
    // Cargo adds `--bench` of its own.
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| !argument.starts_with("--")).collect();
    let [file, table, rest @ ..] = arguments.as_slice() else {
        println!("spectra: no files given, nothing measured");
        return Ok(());
    };
    let all = std::thread::available_parallelism()?.get();
    let counts = match rest.first() {
        Some(text) => vec![text.parse()?],
        None => vec![1, all],
    };
    println!("threads  wall s   CPU s  peak MB  of it hourly seas: CPU s  steps  checksum");
    for threads in counts {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build()?;
        let (cpu_before, _) = usage();
        let start = Clock::now();
        let source = open_spectra(SourceId("sea".into()), &[PathBuf::from(file)], &SpectraOptions::default())?;
        let sites = sites(&std::fs::read_to_string(table)?)?;
        let rules = SpectraRules::default();
        let series = pool.install(|| sample_spectra(&source, &sites, &[], None, &rules, &Silent))?;
        let (cpu_sampled, _) = usage();
        // The peer also gives hourly parameters and overlaps: so do we, window by window.
        let mut heights = 0.0;
        for one in &series {
            let (Some(first), Some(last)) = (one.steps.first(), one.steps.last()) else { continue };
            let reducer = Reducer::new(&one.axes, &rules.water, rules.reduce);
            let windows: Vec<Window> = (0..=(last.0 - first.0) / 3_600_000)
                .map(|hour| first.plus_ms(hour * 3_600_000))
                .map(|time| Window { start: time, end: time })
                .collect();
            for sea in sea_over_windows(one, &reducer, &windows, |_| None) {
                heights += sea.value().map_or(0.0, |sea| sea.state.hs_m + sea.overlap_2pi_per_rad(20));
            }
        }
        let wall_s = start.elapsed().as_secs_f64();
        let (cpu_after, peak_mb) = usage();
        let steps: usize = series.iter().map(|one| one.missing.iter().filter(|why| why.is_none()).count()).sum();
        // The same bits for any number of threads.
        let checksum = series
            .iter()
            .flat_map(|one| (0..one.steps.len()).flat_map(|step| one.row(step, SeaRow::WithNext)))
            .fold(heights.to_bits(), |sum, value| sum.rotate_left(5) ^ u64::from(value.to_bits()));
        println!(
            "{threads:>7} {wall_s:>7.2} {:>7.2} {peak_mb:>8.1} {:>26.2} {steps:>6}  {checksum:016x}",
            cpu_after - cpu_before,
            cpu_after - cpu_sampled
        );
    }
    Ok(())
}
