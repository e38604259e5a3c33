//! Tables to files and pairs from files.

mod error;
mod number_text;
mod pairs;
mod read;
mod to_csv;
mod to_parquet;
mod writer;

pub use error::{BadCell, Conflict, TableError};
pub use pairs::{PairColumns, PairOptions, Pairs, TextColumn, read_pairs};
pub(crate) use read::{MissingTexts, Plain, PlainTable, PlainValues};
pub use writer::{TableWriter, write_dictionary};
