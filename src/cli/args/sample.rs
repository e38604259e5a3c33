//! `sample`.
#![expect(clippy::doc_markdown, reason = "doc comments are the help text; backticks would show in it")]

use std::path::PathBuf;

/// What to look a value up in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, clap::ValueEnum)]
pub(crate) enum SampleKind {
    /// Gridded 10 m wind
    Wind,
    /// Gridded wave height, periods, direction, spread
    Waves,
    /// Directional wave spectra, gridded or at stations
    Spectrum,
    /// A table of band levels
    Levels,
    /// A site list
    Sites,
}

/// How wind is taken from the grid.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, clap::ValueEnum)]
pub(crate) enum Spatial {
    /// Between the four nodes around; missing where one that is needed is land
    #[default]
    Bilinear,
    /// The same, with the weights of the other nodes scaled up, flagged
    Renormalise,
    /// The nearest node with data, at most 50 km away
    Nearest,
}

/// Look one value up.
#[derive(Debug, clap::Args)]
pub(crate) struct SampleArgs {
    /// What the files hold
    #[arg(value_enum)]
    pub(crate) kind: SampleKind,
    /// The files
    #[arg(required = true)]
    pub(crate) files: Vec<PathBuf>,
    /// Latitude, degrees north
    #[arg(long, value_name = "DEG", allow_negative_numbers = true)]
    pub(crate) latitude: Option<f64>,
    /// Longitude, degrees east (-180 to 180, or 0 to 360)
    #[arg(long, value_name = "DEG", allow_negative_numbers = true)]
    pub(crate) longitude: Option<f64>,
    /// Time, ISO 8601, UTC unless it names an offset
    #[arg(long, value_name = "TIME")]
    pub(crate) time: Option<String>,
    /// What to give. wind: wind_speed, wind_from_direction, eastward_wind, northward_wind; levels: level, count_valid,
    /// count_bands; sites: latitude, longitude, depth; spectrum: the CF names of wave height, periods, direction, spread and
    /// densities, overlap_2pi, cross_share, radiated_level, tail_start (a wrong name lists them all)
    #[arg(long, value_name = "NAME")]
    pub(crate) quantity: Option<String>,
    /// Site, where a table or list holds several
    #[arg(long, value_name = "ID")]
    pub(crate) site: Option<String>,
    /// Band centre of a level, frequency of the waves, or of the sound (radiated_level), Hz
    #[arg(long, value_name = "HZ")]
    pub(crate) frequency_hz: Option<f64>,
    /// Direction that waves go to, degrees clockwise from north, for a directional density
    #[arg(long, value_name = "DEG", allow_negative_numbers = true)]
    pub(crate) direction_deg: Option<f64>,
    /// Height of the wind to choose, m
    #[arg(long, value_name = "M")]
    pub(crate) height_m: Option<f64>,
    /// Ensemble member to choose
    #[arg(long, value_name = "N")]
    pub(crate) member: Option<i64>,
    /// How wind is taken from the grid
    #[arg(long, value_enum, default_value_t)]
    pub(crate) spatial: Spatial,
    /// A key of the study file's section for this input, such as units=knots
    #[arg(long = "set", value_name = "KEY=VALUE")]
    pub(crate) settings: Vec<String>,
    /// Print one JSON object
    #[arg(long)]
    pub(crate) json: bool,
}
