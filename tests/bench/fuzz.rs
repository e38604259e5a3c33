//! Readers under random damage to what they read: study files, level tables, units of time, headers of classic NetCDF, site
//! lists.
//!
//! Run: `cargo bench --bench fuzz`, or with seconds for each reader and a seed: `cargo bench --bench fuzz -- 60 7`. Inputs are
//! the tests' own files with bytes and words changed; an input that makes a reader panic, or takes longer than two seconds, is
//! kept in the folder `underwind-fuzz` of the system's temporary folder and named. Ends with status 1 if there was one.

#![expect(clippy::print_stdout, reason = "a bench prints its figures")]

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant as Clock};
use underwind::config::{read_study, wind_options_from};
use underwind::io::levels::{LevelError, LevelOptions, open_levels};
use underwind::io::netcdf::{WindOptions, open_wind};
use underwind::io::sites::{SiteOptions, read_sites};
use underwind::model::{BandScheme, LevelKind, PressureReference, SourceId, Stamp};

type Failed = Box<dyn std::error::Error>;

/// A reader takes no longer than this over a small input.
const SLOW: Duration = Duration::from_secs(2);

/// Words that readers know.
const WORDS: [&str; 32] = [
    "since",
    "hours",
    "1900-01-01",
    "T24:00",
    "+02:00",
    "-",
    "e308",
    "NaN",
    "inf",
    "1e-320",
    "9223372036854775807",
    "\"",
    ",",
    ";",
    "\n",
    "\r",
    "\t",
    "\u{feff}",
    "\u{b5}",
    "\0",
    "[[wind]]",
    "[[site]]",
    "= [",
    "latitude",
    "level_db",
    "63 Hz",
    "W",
    "90.0001",
    "0x7f",
    "31/12/2031",
    "60",
    "#",
];

/// Random numbers (splitmix64: Steele, Lea, Flood 2014).
struct Chance(u64);

impl Chance {
    fn below(&mut self, limit: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = self.0;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((mixed ^ (mixed >> 31)) % limit.max(1) as u64) as usize
    }
}

/// A damaged input: one to six changes.
fn damaged(seeds: &[Vec<u8>], chance: &mut Chance) -> Vec<u8> {
    let mut bytes = seeds[chance.below(seeds.len())].clone();
    for _ in 0..=chance.below(6) {
        let at = chance.below(bytes.len() + 1);
        let end = (at + 1 + chance.below(24)).min(bytes.len());
        match chance.below(8) {
            0 | 1 if at < bytes.len() => bytes[at] ^= 1 << chance.below(8),
            2 if at < bytes.len() => bytes[at] = chance.below(256) as u8,
            3 => drop(bytes.drain(at.min(end)..end)),
            4 => {
                let copied = bytes[at.min(end)..end].to_vec();
                bytes.splice(at..at, copied);
            }
            5 => {
                let other = &seeds[chance.below(seeds.len())];
                let from = chance.below(other.len() + 1);
                let to = (from + chance.below(60)).min(other.len());
                bytes.splice(at..at, other[from..to].iter().copied());
            }
            6 => bytes.truncate(at.max(1)),
            _ => {
                let word = WORDS[chance.below(WORDS.len())];
                bytes.splice(at..at, word.bytes());
            }
        }
    }
    bytes
}

/// A reader: the name of its input file, its seeds, and whether it accepts a file.
struct Target {
    name: &'static str,
    file: &'static str,
    seeds: Vec<Vec<u8>>,
    accepts: fn(&Path) -> bool,
}

fn levels(path: &Path) -> bool {
    let options = LevelOptions {
        reference: Some(PressureReference::Micropascal),
        kind: Some(LevelKind::BandLevel),
        bands: Some(BandScheme::Decidecade),
        window_s: Some(600.0),
        stamp: Some(Stamp::Start),
        ..LevelOptions::default()
    };
    let Ok(mut table) = open_levels(&[path.to_owned()], &options) else { return false };
    table.for_each(|_, _| -> Result<(), LevelError> { Ok(()) }).is_ok()
}

fn time_units(path: &Path) -> bool {
    let Ok(text) = std::fs::read_to_string(path) else { return false };
    let file = project().join("tests/fixtures/grids/classic.nc");
    let mut lines = text.lines();
    let options = WindOptions {
        time_units: lines.next().map(str::to_owned),
        calendar: lines.next().map(str::to_owned),
        ..WindOptions::default()
    };
    open_wind(SourceId("m".into()), &[file], &options).is_ok()
}

fn header(path: &Path) -> bool {
    open_wind(SourceId("m".into()), &[path.to_owned()], &WindOptions::default()).is_ok()
}

fn study(path: &Path) -> bool {
    let text = std::fs::read_to_string(path).unwrap_or_default();
    let _ = wind_options_from(&text.lines().map(str::to_owned).collect::<Vec<_>>());
    read_study(path).is_ok()
}

fn project() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Small files of a folder that end in one of these.
fn files(folder: &str, endings: &[&str]) -> Result<Vec<Vec<u8>>, Failed> {
    let mut paths: Vec<PathBuf> =
        std::fs::read_dir(project().join(folder))?.map(|entry| entry.map(|e| e.path())).collect::<Result<_, _>>()?;
    paths.sort();
    let mut seeds = Vec::new();
    for path in paths {
        let name = path.to_string_lossy();
        if endings.iter().any(|ending| name.ends_with(ending)) && path.metadata()?.len() < 40_000 {
            seeds.push(std::fs::read(path)?);
        }
    }
    Ok(seeds)
}

fn targets() -> Result<Vec<Target>, Failed> {
    let classic = |seeds: Vec<Vec<u8>>| seeds.into_iter().filter(|seed| seed.starts_with(b"CDF")).collect();
    let units = [
        "hours since 1900-01-01 00:00:00.0\nstandard",
        "days since 1-1-1\njulian",
        "Seconds Since 1970-01-01T00:00:00Z\n360_day",
        "minutes since 2031-02-28 23:59:59.999 -03:30\nnoleap",
        "hours since 0000-01-01\nproleptic_gregorian",
    ];
    Ok(vec![
        Target {
            name: "study files",
            file: "study.toml",
            seeds: [files("config", &[".toml"])?, files("demo-data", &[".toml"])?].concat(),
            accepts: study,
        },
        Target {
            name: "level tables, text",
            file: "levels.csv",
            seeds: files("tests/fixtures/tables/same", &[".csv", ".tsv", ".txt"])?,
            accepts: levels,
        },
        Target {
            name: "level tables, gzip",
            file: "levels.csv.gz",
            seeds: files("tests/fixtures/tables/same", &[".gz"])?,
            accepts: levels,
        },
        Target {
            name: "level tables, Parquet",
            file: "levels.parquet",
            seeds: files("tests/fixtures/tables/same", &[".parquet"])?,
            accepts: levels,
        },
        Target {
            name: "units of time",
            file: "units.txt",
            seeds: units.iter().map(|text| text.as_bytes().to_vec()).collect(),
            accepts: time_units,
        },
        Target {
            name: "classic headers",
            file: "wind.nc",
            seeds: classic(files("tests/fixtures/grids", &[".nc"])?),
            accepts: header,
        },
        Target {
            name: "site lists",
            file: "sites.csv",
            seeds: [
                files("demo-data", &["sites.csv"])?,
                vec![
                    b"id;lat;lon;depth\nA;44\xc2\xb030.5'N;31 15 W;120\nB;-12,5;179,9;-30\n".to_vec(),
                    b"site,time,latitude,longitude\nA,2031-01-10T00:00Z,44.5,179.9\nA,2031-01-10T06:00Z,44.6,-179.9\n"
                        .to_vec(),
                ],
            ]
            .concat(),
            accepts: |path| read_sites(path, &SiteOptions::default()).is_ok(),
        },
    ])
}

fn main() -> Result<(), Failed> {
    let mut numbers = std::env::args().skip(1).filter_map(|argument| argument.parse::<u64>().ok());
    let span = Duration::from_secs(numbers.next().unwrap_or(20));
    let mut chance = Chance(numbers.next().unwrap_or(1));
    let kept = std::env::temp_dir().join("underwind-fuzz");
    let folder = tempfile::tempdir()?;
    std::panic::set_hook(Box::new(|_| {}));
    let mut found = 0;
    for target in targets()? {
        let begun = Clock::now();
        let (mut tried, mut accepted, mut slowest) = (0_u64, 0_u64, Duration::ZERO);
        while begun.elapsed() < span {
            let bytes = damaged(&target.seeds, &mut chance);
            let path = folder.path().join(target.file);
            std::fs::write(&path, &bytes)?;
            let start = Clock::now();
            let ended = catch_unwind(AssertUnwindSafe(|| (target.accepts)(&path)));
            let took = start.elapsed();
            slowest = slowest.max(took);
            tried += 1;
            accepted += u64::from(matches!(ended, Ok(true)));
            if ended.is_err() || took > SLOW {
                found += 1;
                std::fs::create_dir_all(&kept)?;
                let name = kept.join(format!("{found}_{}", target.file));
                std::fs::write(&name, &bytes)?;
                let what = if ended.is_err() { "panics" } else { "is slow" };
                println!("{}: {what} on {}", target.name, name.display());
            }
        }
        println!(
            "{}: {tried} inputs in {} s, {accepted} accepted, the slowest took {} ms",
            target.name,
            span.as_secs(),
            slowest.as_millis()
        );
    }
    println!("{found} inputs with a panic or longer than {} s", SLOW.as_secs());
    if found > 0 { Err("some inputs were not taken well".into()) } else { Ok(()) }
}
