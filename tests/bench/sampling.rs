//! How fast gridded wind is sampled: a year of hourly wind at twenty sites, with one thread and with all.
//!
//! Run: `cargo bench --bench sampling -- WIND.nc [SITES.csv]` (columns `site_id,lat,lon`). Without arguments nothing is
//! measured: the file is large and is made elsewhere. Prints wall seconds, CPU seconds and the peak of resident memory so
//! far (Linux); read the file once before, so that it is in the page cache.

#![expect(clippy::print_stdout, reason = "a bench prints its figures")]

use std::path::PathBuf;
use std::time::Instant as Clock;
use underwind::io::netcdf::{WindOptions, open_wind};
use underwind::model::{FieldSource, Point, Site, SourceId, SpatialRule, Track};
use underwind::pipeline::{Silent, sample_wind};

type Failed = Box<dyn std::error::Error>;

/// Sites of a plain table; without one, twenty along a diagonal of the grid.
fn sites(table: Option<PathBuf>, limits: [f64; 4]) -> Result<Vec<Site>, Failed> {
    let places: Vec<(f64, f64)> = match table {
        Some(path) => std::fs::read_to_string(path)?
            .lines()
            .skip(1)
            .map(|line| {
                let fields: Vec<&str> = line.split(',').collect();
                Ok((fields[1].parse()?, fields[2].parse()?))
            })
            .collect::<Result<_, Failed>>()?,
        None => {
            let [south, north, west, east] = limits;
            (0..20)
                .map(|k| (f64::from(k) + 0.37) / 20.0)
                .map(|share| (south + share * (north - south), west + share * (east - west)))
                .collect()
        }
    };
    let site = |(k, (latitude, longitude)): (usize, (f64, f64))| {
        let turned = (longitude + 180.0).rem_euclid(360.0) - 180.0;
        let track = Track::Fixed(Point::new(latitude, turned)?);
        Ok(Site { id: format!("S{k:02}"), track, sensors: Vec::new() })
    };
    places.into_iter().enumerate().map(site).collect()
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
    let mut arguments = std::env::args().skip(1).filter(|argument| !argument.starts_with("--")).map(PathBuf::from);
    let Some(file) = arguments.next() else {
        println!("sampling: no file given, nothing measured");
        return Ok(());
    };
    let table = arguments.next();
    let all = std::thread::available_parallelism()?.get();
    println!("threads  open s  wall s   CPU s  peak MB  values  checksum");
    for threads in [1, all] {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build()?;
        let (cpu_before, _) = usage();
        let start = Clock::now();
        let source = open_wind(SourceId("model".into()), std::slice::from_ref(&file), &WindOptions::default())?;
        let opened_s = start.elapsed().as_secs_f64();
        let grid = &source.meta().grid;
        let [south, north, west, east] = grid.limits();
        let sites = sites(table.clone(), [south, north, west, east])?;
        let series = pool.install(|| sample_wind(&source, &sites, None, &SpatialRule::default(), &Silent))?;
        let wall_s = start.elapsed().as_secs_f64();
        let (cpu_after, peak_mb) = usage();
        let values: usize = series.iter().map(|one| one.missing.iter().filter(|why| why.is_none()).count()).sum();
        // The same bits for any number of threads.
        let checksum = series
            .iter()
            .flat_map(|one| one.eastward_m_s.iter().chain(&one.northward_m_s))
            .fold(0_u64, |sum, value| sum.rotate_left(5) ^ value.to_bits());
        println!(
            "{threads:>7} {opened_s:>7.2} {wall_s:>7.2} {:>7.2} {peak_mb:>8.1} {values:>7}  {checksum:016x}",
            cpu_after - cpu_before
        );
    }
    Ok(())
}
