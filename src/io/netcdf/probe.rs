//! A file tried out in a process of its own first: damaged NetCDF-4 files make the C libraries crash or run for ever, and no
//! error can be caught from that.

use super::error::NetcdfError;
use super::header::{Storage, VariableType};
use super::read::{Reader, Wanted};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::sync::OnceLock;
use std::time::{Duration, Instant};

/// Processor time after which a header is given up, s: real ones take well under one.
const LONGEST_CPU_S: f64 = 3.0;
/// The same by the clock, for slow disks and systems that do not tell processor time, s.
const LONGEST_S: f64 = 120.0;
/// Memory at which a header is given up, kB.
const MOST_KB: u64 = 900_000;
/// Numbers that only the library can read are tried up to this many; of longer variables the ends.
const TRIED: u64 = 1 << 20;
/// Texts that are tried.
const TRIED_TEXTS: u64 = 10_000;

static PROGRAM: OnceLock<PathBuf> = OnceLock::new();

/// Has files tried out by `program probe-file FILE` before they are opened here. Without this call files are trusted, as
/// in a program that uses the library alone.
pub fn probe_with(program: PathBuf) {
    // The first call counts.
    let _ = PROGRAM.set(program);
}

/// What the process of its own does: reads the header and everything that goes through the C libraries. Whatever error
/// comes up is met again, and told, by the program that asked.
pub fn probe(path: &Path) {
    let Ok(reader) = super::wind::read_trusted_header(path).and_then(Reader::open) else { return };
    for variable in &reader.header.variables {
        if !matches!(variable.storage, Storage::Library) {
            continue;
        }
        let shape = reader.header.shape(variable);
        let count = shape.iter().fold(1_u64, |count, length| count.saturating_mul(*length));
        match variable.kind {
            VariableType::Number(_) if count <= TRIED => {
                let _ = reader.all(variable);
            }
            VariableType::Number(_) => {
                let last: Vec<u64> = shape.iter().map(|length| length.saturating_sub(1)).collect();
                for fixed in [vec![0; shape.len()], last] {
                    let wanted =
                        Wanted { fixed: &fixed, step: None, row: None, column: None, steps: 0..1, nodes: &[(0, 0)] };
                    let _ = reader.gather(variable, &wanted);
                }
            }
            VariableType::Text if count <= TRIED_TEXTS => {
                let _ = reader.texts(variable);
            }
            _ => {}
        }
    }
}

/// Tries a file out.
///
/// # Errors
/// When the process that reads it dies, does not end, or takes all memory.
pub(super) fn guard(path: &Path) -> Result<(), NetcdfError> {
    let Some(program) = PROGRAM.get() else { return Ok(()) };
    let started = Command::new(program)
        .args(["probe-file", "--"])
        .arg(path)
        .stdin(Stdio::null())
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn();
    // Where no process can be started, files are trusted.
    let Ok(mut child) = started else { return Ok(()) };
    match watch(&mut child) {
        None => Ok(()),
        Some(problem) => Err(NetcdfError::Damaged {
            path: path.to_owned(),
            problem: format!("the HDF5 library {problem} on it (write the file anew, or leave it out)"),
        }),
    }
}

/// Waits for the process; what went wrong, if anything.
fn watch(child: &mut Child) -> Option<String> {
    let start = Instant::now();
    let mut pause = Duration::from_micros(500);
    loop {
        match child.try_wait() {
            Ok(Some(status)) => return death(status),
            Ok(None) => {}
            Err(_) => return None,
        }
        let cpu_s = cpu_s(child.id());
        let problem = if cpu_s.is_some_and(|cpu_s| cpu_s > LONGEST_CPU_S) || start.elapsed().as_secs_f64() > LONGEST_S {
            "does not come to an end"
        } else if resident_kb(child.id()).is_some_and(|kb| kb > MOST_KB) {
            "takes all memory"
        } else {
            std::thread::sleep(pause);
            pause = (pause * 2).min(Duration::from_millis(10));
            continue;
        };
        let _ = child.kill();
        let _ = child.wait();
        return Some(problem.to_owned());
    }
}

/// How a process died, if it did not end by itself.
fn death(status: std::process::ExitStatus) -> Option<String> {
    use std::os::unix::process::ExitStatusExt;
    status.signal().map(|signal| format!("crashes (signal {signal})"))
}

/// Processor time of a process, where the system tells: fields 14 and 15 of /proc/PID/stat, in hundredths of a second
/// (proc(5)).
fn cpu_s(process: u32) -> Option<f64> {
    let text = std::fs::read_to_string(format!("/proc/{process}/stat")).ok()?;
    let mut fields = text.rsplit_once(')')?.1.split_whitespace().skip(11);
    let ticks: u64 = fields.next()?.parse::<u64>().ok()? + fields.next()?.parse::<u64>().ok()?;
    Some(ticks as f64 / 100.0)
}

/// Memory of a process, where the system tells.
fn resident_kb(process: u32) -> Option<u64> {
    let text = std::fs::read_to_string(format!("/proc/{process}/status")).ok()?;
    text.lines().find_map(|line| line.strip_prefix("VmRSS:"))?.trim().trim_end_matches(" kB").parse().ok()
}
