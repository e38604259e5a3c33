//! Delimited text: encodings, compression, delimiters, header, and rows with their line numbers.
//!
//! One streaming layer for level tables, site lists and wind tables. It never decides what a column means.

mod dialect;
mod error;
mod header;
mod number;
mod rows;
mod source;
mod split;

pub use dialect::TextOptions;
pub(crate) use dialect::key_of;
pub use error::DelimitedError;
pub(crate) use header::{open, plain_name};
pub(crate) use number::{Cell, DecimalMark, parse_number, plain_number, trim};
pub(crate) use rows::{Row, Rows};
pub(crate) use source::{FileKind, first_bytes, sniff};
