//! Tables of band levels, long or wide, in delimited text or Parquet, streamed row by row.

mod band_text;
mod columns;
mod convert;
mod describe;
mod error;
mod from_parquet;
mod from_text;
mod open;
mod options;
mod plan;
mod registry;
mod unit_text;

pub use band_text::{BandText, parse_band_text};
pub use describe::{LevelFileSummary, LevelSummary, LevelSurvey};
pub use error::{Asked, LevelError};
pub use open::{LevelTable, open_levels};
pub use options::{BandEdges, Layout, LevelColumns, LevelOptions};
pub use registry::LevelNames;
pub use unit_text::{StatedUnit, stated_unit};
