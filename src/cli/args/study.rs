//! Commands that take a study file and little else.

use std::path::PathBuf;

/// A study file.
#[derive(Debug, clap::Args)]
pub(crate) struct StudyArgs {
    /// The study file (TOML)
    pub(crate) study: PathBuf,
    /// Folder for the outputs [default: the study's `output`]
    #[arg(long, short, value_name = "FOLDER")]
    pub(crate) output: Option<PathBuf>,
}

/// `check`.
#[derive(Debug, clap::Args)]
pub(crate) struct CheckArgs {
    /// The study file (TOML)
    #[arg(required_unless_present = "reasons")]
    pub(crate) study: Option<PathBuf>,
    /// Print what was understood as JSON
    #[arg(long)]
    pub(crate) json: bool,
    /// Explain every flag and every reason for a row that is not used, and stop
    #[arg(long)]
    pub(crate) reasons: bool,
}

/// `run`.
#[derive(Debug, clap::Args)]
pub(crate) struct RunArgs {
    #[command(flatten)]
    pub(crate) study: StudyArgs,
    /// Print the results as JSON instead of text
    #[arg(long)]
    pub(crate) json: bool,
}

/// `simulate`.
#[derive(Debug, clap::Args)]
pub(crate) struct SimulateArgs {
    /// The study file (TOML) with a `[simulate]` section
    pub(crate) study: PathBuf,
    /// Folder for the simulated inputs, their truth and a study file that reads them
    #[arg(long, short, value_name = "FOLDER")]
    pub(crate) output: PathBuf,
    /// Seed, instead of the study's
    #[arg(long)]
    pub(crate) seed: Option<u64>,
}
