//! What can be typed: one struct a command, no logic beyond conversion.

mod fit;
mod sample;
mod study;

pub(crate) use fit::FitArgs;
pub(crate) use sample::{SampleArgs, SampleKind, Spatial};
pub(crate) use study::{CheckArgs, RunArgs, SimulateArgs, StudyArgs};

use clap::{Parser, Subcommand};

const LONG_ABOUT: &str = "\
underwind relates underwater sound levels to the modelled wind overhead.

It reads band levels from one or more sensors and the 10 m wind of an atmosphere model, takes the wind \
at every sensor for every level, and fits, band by band, the quiet floor, the slope and the wind speed \
at which the band stops responding. With directional wave spectra it also compares the sound that \
opposing waves radiate with the sound measured. It writes tables, figures and one HTML page.

A study file (TOML) names the inputs. Start with `underwind check STUDY`: it says what was understood \
of every input and computes nothing. `underwind run STUDY` does the whole job.";

const AFTER_HELP: &str = "\
Exit status:
  0  done
  1  defect in the program
  2  command line
  3  study file
  4  an input cannot be read or used
  5  the inputs have nothing in common
  6  an output cannot be written

Results go to standard output, remarks to standard error. NO_COLOR and TERM=dumb are respected.
Results describe levels at the sensors. They do not replace the rules, standards and qualified people \
that an impact assessment or a safety decision needs.";

/// The command line.
#[derive(Debug, Parser)]
#[command(name = "underwind", version, about = "Underwater sound levels against the modelled wind overhead", long_about = LONG_ABOUT, after_help = AFTER_HELP, max_term_width = 100)]
pub(crate) struct Cli {
    #[command(flatten)]
    pub(crate) global: GlobalArgs,
    #[command(subcommand)]
    pub(crate) command: Command,
}

/// What every command takes.
#[derive(Debug, clap::Args)]
pub(crate) struct GlobalArgs {
    /// Only errors on standard error: no progress, no remarks
    #[arg(long, short, global = true)]
    pub(crate) quiet: bool,
    /// Number of threads [default: one a core]
    #[arg(long, global = true, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Open every input and say what was understood of it
    Check(CheckArgs),
    /// Look one value up in files, at a position and a time
    Sample(SampleArgs),
    /// Write the wind at the sites and the matchup tables
    Match(StudyArgs),
    /// Fit level against wind speed, per site and band
    Fit(Box<FitArgs>),
    /// Compare a wave model's directional spreading with the sound that opposing waves radiate
    Spread(RunArgs),
    /// Draw the figures and write the HTML page
    Report(StudyArgs),
    /// Do the whole job: match, fit, report
    Run(RunArgs),
    /// Write a deployment with known truth, to try a plan or the tool on
    Simulate(SimulateArgs),
    /// Open a file in a process of its own, so that a crash of the file library harms nothing
    #[command(hide = true, name = "probe-file")]
    Probe {
        /// The file
        file: std::path::PathBuf,
    },
}
