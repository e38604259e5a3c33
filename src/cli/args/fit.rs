//! `fit`.
#![expect(clippy::struct_excessive_bools, reason = "switches of a command line are bools")]
#![expect(clippy::doc_markdown, reason = "doc comments are the help text; backticks would show in it")]

use std::path::PathBuf;

/// Fit level against wind speed.
#[derive(Debug, clap::Args)]
pub(crate) struct FitArgs {
    /// The study file (TOML)
    #[arg(required_unless_present = "matchups", conflicts_with = "matchups")]
    pub(crate) study: Option<PathBuf>,
    /// Fit this table of pairs (CSV or Parquet) instead of a study: columns time (or window_start_utc, or time_h),
    /// wind_speed_m_s, level_db; optional site, band_centre_hz, deployment
    #[arg(long, value_name = "TABLE")]
    pub(crate) matchups: Option<PathBuf>,
    /// With --matchups: name of the column that holds the time
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) time_column: Option<String>,
    /// With --matchups: name of the column that holds the wind speed, m/s
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) wind_column: Option<String>,
    /// With --matchups: name of the column that holds the level, dB
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) level_column: Option<String>,
    /// With --matchups: name of the column that holds the site
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) site_column: Option<String>,
    /// With --matchups: name of the column that holds the band centre, Hz
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) band_column: Option<String>,
    /// With --matchups: name of the column that holds the deployment
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) deployment_column: Option<String>,
    /// With --matchups: unit of times that are numbers: s, ms, us, ns, spreadsheet_days, day_number
    #[arg(long, value_name = "UNIT", requires = "matchups")]
    pub(crate) time_unit: Option<String>,
    /// With --matchups: what separates the cells of a text table
    #[arg(long, value_name = "CHAR", requires = "matchups")]
    pub(crate) delimiter: Option<String>,
    /// With --matchups: decimal mark of a text table
    #[arg(long, value_name = "CHAR", requires = "matchups")]
    pub(crate) decimal_mark: Option<String>,
    /// With --matchups: encoding of a text table
    #[arg(long, value_name = "NAME", requires = "matchups")]
    pub(crate) encoding: Option<String>,
    /// Fit again under every other reasonable choice, one at a time, and say which moves the result by how much: writes
    /// the table `sensitivity` and figures
    #[arg(long, conflicts_with = "matchups")]
    pub(crate) sensitivity: bool,
    /// Print the results as JSON
    #[arg(long)]
    pub(crate) json: bool,
    /// Bootstrap replicates behind the intervals; 0 for estimates alone [default: 400]
    #[arg(long, value_name = "N")]
    pub(crate) replicates: Option<u32>,
    /// Seed of the bootstrap [default: 1]
    #[arg(long)]
    pub(crate) seed: Option<u64>,
    /// Loss: how residuals count
    #[arg(long, value_name = "LOSS", value_parser = ["tukey", "huber", "least_squares"])]
    pub(crate) loss: Option<String>,
    /// Keep the bootstrap replicates, as the table `replicates`
    #[arg(long)]
    pub(crate) keep_replicates: bool,
    /// Let every deployment have an offset in dB, which moves floor and wind part together
    #[arg(long, value_name = "WHAT", value_parser = ["deployment"])]
    pub(crate) offset_by: Option<String>,
    /// Let every deployment or calendar month have a floor of its own
    #[arg(long, value_name = "WHAT", value_parser = ["deployment", "month"])]
    pub(crate) floor_by: Option<String>,
    /// Leave out short events (a few hours) that raise most bands at once, such as passing ships; the relation with them is
    /// kept beside
    #[arg(long)]
    pub(crate) screen: bool,
    /// Show, beside the plain estimates, those for a random error of the wind speed of this standard deviation, m/s
    #[arg(long, value_name = "SD")]
    pub(crate) wind_error_sd: Option<f64>,
    /// Folder for the outputs [default: the study's `output`; none with --matchups]
    #[arg(long, short, value_name = "FOLDER")]
    pub(crate) output: Option<PathBuf>,
}
