//! How fast level tables are streamed: a long and a wide table as text, the long one as gzip and as Parquet.
//!
//! Run: `cargo bench --bench levels` (10 million rows, about 1 GB in the system's temporary folder), or with a number of
//! rows as argument. Prints wall seconds, CPU seconds and the peak of resident memory so far (Linux).

#![expect(clippy::print_stdout, reason = "a bench prints its figures")]

use std::io::Write;
use std::path::{Path, PathBuf};
use std::time::Instant as Clock;
use underwind::io::levels::{LevelError, LevelOptions, open_levels};
use underwind::io::table::TableWriter;
use underwind::model::{BandScheme, ColumnData, LevelKind, PressureReference, Stamp, Table};
use underwind::units::Instant;

const SITES: usize = 20;
const BANDS: usize = 30;
const STEP_MS: i64 = 600_000;

type Failed = Box<dyn std::error::Error>;

/// Levels without a generator of random numbers: a fixed scramble of the row's number.
fn level_centidb(row: u64) -> u64 {
    let mut mixed = row.wrapping_mul(0x9e37_79b9_7f4a_7c15);
    mixed ^= mixed >> 29;
    6_000 + mixed.wrapping_mul(0xbf58_476d_1ce4_e5b9) % 6_000
}

fn centre_text(band: usize) -> String {
    format!("{:.4}", 10_f64.powf(band as f64 / 10.0))
}

fn write_long(path: &Path, steps: usize) -> Result<u64, Failed> {
    let mut out = std::io::BufWriter::with_capacity(1 << 20, std::fs::File::create(path)?);
    writeln!(out, "site_id,time,band_hz,level_db")?;
    let centres: Vec<String> = (0..BANDS).map(centre_text).collect();
    let mut row = 0;
    for site in 0..SITES {
        for step in 0..steps {
            let time = Instant(1_577_838_600_000 + step as i64 * STEP_MS).iso();
            for centre in &centres {
                let level = level_centidb(row);
                writeln!(out, "S{site:02},{time},{centre},{}.{:02}", level / 100, level % 100)?;
                row += 1;
            }
        }
    }
    out.flush()?;
    Ok(row)
}

fn write_wide(path: &Path, steps: usize) -> Result<u64, Failed> {
    let mut out = std::io::BufWriter::with_capacity(1 << 20, std::fs::File::create(path)?);
    let names: Vec<String> = (0..BANDS).map(|band| format!("{} Hz", centre_text(band))).collect();
    writeln!(out, "site_id,time,{}", names.join(","))?;
    let mut row = 0;
    for site in 0..SITES {
        for step in 0..steps {
            write!(out, "S{site:02},{}", Instant(1_577_838_600_000 + step as i64 * STEP_MS).iso())?;
            for _ in 0..BANDS {
                let level = level_centidb(row);
                write!(out, ",{}.{:02}", level / 100, level % 100)?;
                row += 1;
            }
            writeln!(out)?;
        }
    }
    out.flush()?;
    Ok(row)
}

fn write_gzip(from: &Path, to: &Path) -> Result<(), Failed> {
    let mut out = flate2::write::GzEncoder::new(std::fs::File::create(to)?, flate2::Compression::new(4));
    std::io::copy(&mut std::fs::File::open(from)?, &mut out)?;
    out.finish()?;
    Ok(())
}

fn write_parquet(path: &Path, steps: usize) -> Result<(), Failed> {
    let mut writer = TableWriter::create(path)?;
    for site in 0..SITES {
        let rows = steps * BANDS;
        let first = (site * rows) as u64;
        let mut table = Table::default();
        table.push(
            "site_id",
            "",
            "site",
            ColumnData::Text { texts: vec![format!("S{site:02}")], codes: vec![0; rows] },
        );
        let times = (0..rows).map(|row| 1_577_838_600_000 + (row / BANDS) as i64 * STEP_MS).collect();
        table.push("time", "", "time", ColumnData::Time(times));
        let bands = (0..rows).map(|row| 10_f64.powf((row % BANDS) as f64 / 10.0)).collect();
        table.push("band_hz", "Hz", "band", ColumnData::Number(bands));
        let levels = (0..rows).map(|row| level_centidb(first + row as u64) as f64 / 100.0).collect();
        table.push("level_db", "dB", "level", ColumnData::Number(levels));
        writer.append(&table)?;
    }
    writer.finish()?;
    Ok(())
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

fn stream(name: &str, path: &Path) -> Result<(), Failed> {
    let options = LevelOptions {
        reference: Some(PressureReference::Micropascal),
        kind: Some(LevelKind::BandLevel),
        bands: Some(BandScheme::Decidecade),
        window_s: Some(600.0),
        stamp: Some(Stamp::Start),
        ..LevelOptions::default()
    };
    let (cpu_before, _) = usage();
    let clock = Clock::now();
    let mut table = open_levels(&[path.to_owned()], &options)?;
    let (mut rows, mut sum_db) = (0_u64, 0.0);
    table.for_each(|_, row| -> Result<(), LevelError> {
        rows += 1;
        sum_db += row.level_db;
        Ok(())
    })?;
    let wall_s = clock.elapsed().as_secs_f64();
    let (cpu, peak_mb) = usage();
    let size_mb = std::fs::metadata(path)?.len() as f64 / 1e6;
    let cpu_s = cpu - cpu_before;
    println!(
        "{name:<14} {rows:>9} levels {size_mb:>7.1} MB  wall {wall_s:>6.2} s  CPU {cpu_s:>6.2} s  peak {peak_mb:>6.1} MB  mean {:.6} dB",
        sum_db / rows as f64
    );
    Ok(())
}

fn main() -> Result<(), Failed> {
    let rows = std::env::args().skip(1).find_map(|text| text.parse::<usize>().ok()).unwrap_or(10_000_000);
    let steps = rows.div_ceil(SITES * BANDS);
    let folder = std::env::temp_dir().join(format!("underwind-bench-levels-{}", std::process::id()));
    std::fs::create_dir_all(&folder)?;
    let at = |name: &str| -> PathBuf { folder.join(name) };
    let made = (|| -> Result<(), Failed> {
        write_long(&at("long.csv"), steps)?;
        stream("long CSV", &at("long.csv"))?;
        write_wide(&at("wide.csv"), steps)?;
        stream("wide CSV", &at("wide.csv"))?;
        write_gzip(&at("long.csv"), &at("long.csv.gz"))?;
        stream("long CSV gzip", &at("long.csv.gz"))?;
        let clock = Clock::now();
        write_parquet(&at("long.parquet"), steps)?;
        println!("writing Parquet: {:.2} s", clock.elapsed().as_secs_f64());
        stream("long Parquet", &at("long.parquet"))
    })();
    std::fs::remove_dir_all(&folder)?;
    made
}
