//! Reading Parquet as plain columns. The only reader that knows polars.

mod error;
mod file;
mod pages;

pub use error::ParquetError;
pub(crate) use file::{ColumnKind, ParquetFile, Values};
