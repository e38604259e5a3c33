//! The error of every job, and the exit statuses of the program.

use crate::io::table::TableError;
use crate::model::SourceId;
use std::path::PathBuf;

/// Exit statuses, as `--help` documents them.
pub mod status {
    /// A defect in the program.
    pub const DEFECT: u8 = 1;
    /// The command line.
    pub const COMMAND_LINE: u8 = 2;
    /// The study file.
    pub const STUDY: u8 = 3;
    /// An input cannot be read or used.
    pub const INPUT: u8 = 4;
    /// The inputs have nothing in common.
    pub const NOTHING_IN_COMMON: u8 = 5;
    /// An output cannot be written.
    pub const OUTPUT: u8 = 6;
}

/// Why a job ended without a result. One line each.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// The command line asks for something that cannot be.
    #[error("{0}")]
    CommandLine(String),
    /// The study file.
    #[error(transparent)]
    Study(#[from] crate::config::StudyError),
    /// A section that the job needs.
    #[error("{}: there is no `{section}`; this job needs at least one", study.display())]
    Lacking {
        /// The study file.
        study: PathBuf,
        /// The section.
        section: &'static str,
    },
    /// A site that is written in the study and in its list.
    #[error("{}: site `{site}` is also written in the study file; expected each site once", path.display())]
    SiteTwice {
        /// The list.
        path: PathBuf,
        /// The site.
        site: String,
    },
    /// A wind table for a site that is not there.
    #[error("{}: wind `{wind}` is for the site `{site}`, which the study does not have", study.display())]
    NoSuchSite {
        /// The study file.
        study: PathBuf,
        /// The wind input.
        wind: SourceId,
        /// The site.
        site: String,
    },
    /// Gridded or station data.
    #[error(transparent)]
    Grid(#[from] crate::io::netcdf::NetcdfError),
    /// A level table.
    #[error(transparent)]
    Levels(#[from] crate::io::levels::LevelError),
    /// Texts of a buoy archive.
    #[error(transparent)]
    Buoy(#[from] crate::io::buoy_spectra::BuoyError),
    /// A site list or track.
    #[error(transparent)]
    Sites(#[from] crate::io::sites::SiteError),
    /// A list of intervals.
    #[error(transparent)]
    Intervals(#[from] crate::io::intervals::IntervalError),
    /// A wind table.
    #[error(transparent)]
    WindTable(#[from] crate::io::wind_table::WindTableError),
    /// Levels that cannot be gathered.
    #[error("level tables: {0}")]
    LevelWindows(#[from] crate::science::matchup::LevelWindowsError),
    /// An input that cannot be read to its end.
    #[error(transparent)]
    Checksum(#[from] crate::io::checksum::ChecksumError),
    /// No pair of wind and level.
    #[error("levels and wind have nothing in common: {levels}; {wind}; pairs not used: {reasons}")]
    NothingInCommon {
        /// The times of the levels.
        levels: String,
        /// The times of the winds.
        wind: String,
        /// Why pairs are not used, with counts.
        reasons: String,
    },
    /// A table that cannot be read or written.
    #[error(transparent)]
    Table(#[from] TableError),
    /// An output that cannot be written.
    #[error(transparent)]
    Write(#[from] crate::io::replace_file::WriteError),
    /// A folder that cannot be made.
    #[error("folder {}: cannot be made: {source}", path.display())]
    Folder {
        /// The folder.
        path: PathBuf,
        /// The system's cause.
        source: std::io::Error,
    },
    /// A drawing that the renderer refused.
    #[error(transparent)]
    Figure(#[from] crate::report::FigureError),
}

impl Error {
    /// The program's exit status for this error.
    pub fn exit_status(&self) -> u8 {
        match self {
            Self::Table(TableError::Write(_)) | Self::Write(_) | Self::Folder { .. } => status::OUTPUT,
            Self::CommandLine(_) => status::COMMAND_LINE,
            Self::Study(_) | Self::Lacking { .. } | Self::NoSuchSite { .. } => status::STUDY,
            Self::SiteTwice { .. }
            | Self::Grid(_)
            | Self::Levels(_)
            | Self::Sites(_)
            | Self::Intervals(_)
            | Self::Buoy(_)
            | Self::WindTable(_)
            | Self::LevelWindows(_)
            | Self::Checksum(_)
            | Self::Table(_) => status::INPUT,
            Self::NothingInCommon { .. } => status::NOTHING_IN_COMMON,
            Self::Figure(_) => status::DEFECT,
        }
    }
}
