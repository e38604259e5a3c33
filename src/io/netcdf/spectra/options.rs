//! What a study adds to what spectra files say of themselves.

use crate::io::netcdf::DirectionSense;

/// How the numbers of a density are stored.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum DensityEncoding {
    /// As they are.
    #[default]
    Linear,
    /// As the decimal logarithm of the density plus a constant (0 where none was added).
    Log10 {
        /// The constant, in the unit of the density.
        added: f64,
    },
}

/// The way directions are counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DirectionRotation {
    /// Nautical: clockwise from true north.
    ClockwiseFromNorth,
    /// Mathematical: counter-clockwise from east.
    CounterclockwiseFromEast,
}

/// All that a study can say about directional spectra. Whatever is `None` is taken from the files or asked for.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct SpectraOptions {
    /// Variable of the density over frequency and direction.
    pub density: Option<String>,
    /// Variable of the frequencies.
    pub frequency: Option<String>,
    /// Unit of the frequencies.
    pub frequency_units: Option<String>,
    /// Frequencies themselves, Hz, where the axis holds index numbers.
    pub frequency_hz: Option<Vec<f64>>,
    /// Variable of the directions.
    pub direction: Option<String>,
    /// Unit of the directions.
    pub direction_units: Option<String>,
    /// Directions themselves, degrees, where the axis holds index numbers.
    pub direction_deg: Option<Vec<f64>>,
    /// Sense of the directions.
    pub direction_sense: Option<DirectionSense>,
    /// How directions are counted.
    pub direction_rotation: Option<DirectionRotation>,
    /// Unit of the density, such as "m2 s rad-1".
    pub density_units: Option<String>,
    /// How the density is stored.
    pub encoding: Option<DensityEncoding>,
    /// Ensemble member to choose.
    pub member: Option<i64>,
    /// Time variable or dimension.
    pub time: Option<String>,
    /// Time units, such as "hours since 1900-01-01".
    pub time_units: Option<String>,
    /// Calendar by its CF name.
    pub calendar: Option<String>,
    /// Latitude variable.
    pub latitude: Option<String>,
    /// Longitude variable.
    pub longitude: Option<String>,
    /// Degrees north of a single station whose file does not say it.
    pub latitude_deg: Option<f64>,
    /// Degrees east of a single station whose file does not say it.
    pub longitude_deg: Option<f64>,
    /// Farthest nearest station that serves a site, km.
    pub max_distance_km: Option<f64>,
    /// Steps farther apart than this are a gap, ms; `None`: twice the usual step.
    pub max_gap_ms: Option<i64>,
}
