//! From bytes to the model and back: the only code that knows netcdf, hdf5 and polars.

pub mod buoy_spectra;
pub mod checksum;
mod contain;
pub mod delimited;
pub mod intervals;
pub mod levels;
pub mod netcdf;
pub mod netcdf_write;
pub mod parquet;
pub mod replace_file;
pub mod sites;
pub mod table;
pub mod time_text;
pub mod wind_table;
