//! Which variable holds the spectra.

use super::axes::{is_direction, is_frequency, standard_name};
use super::options::SpectraOptions;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::{Header, Variable};
use crate::io::netcdf::read::Reader;

const STANDARD: &str = "sea_surface_wave_directional_variance_spectral_density";
/// Short names of the trade for a density over frequency and direction.
const SHORT: [&str; 10] =
    ["efth", "e", "d2fd", "spec2d", "spec", "spectra", "spectrum", "variance_density", "wave_spectrum", "s"];

fn has_axes(header: &Header, variable: &Variable) -> (bool, bool) {
    let names = header.dimension_names(variable);
    let any = |is: fn(&str, Option<&Variable>) -> bool| names.iter().any(|name| is(name, header.variable(name)));
    (any(is_frequency), any(is_direction))
}

/// Finds the variable of the density over frequency and direction.
pub(super) fn density<'a>(reader: &'a Reader, options: &SpectraOptions) -> Result<&'a Variable, NetcdfError> {
    let header = &reader.header;
    if let Some(name) = &options.density {
        return header.variable(name).ok_or_else(|| NetcdfError::NoSuchVariable {
            path: header.path.clone(),
            name: name.clone(),
            key: "spectra.density",
            found: header.variable_names(),
        });
    }
    let fields: Vec<&Variable> = header
        .variables
        .iter()
        .filter(|variable| variable.number_type().is_some() && variable.dimensions.len() >= 2)
        .collect();
    let mut found: Vec<&Variable> =
        fields.iter().copied().filter(|variable| standard_name(variable) == STANDARD).collect();
    if found.is_empty() {
        found = fields
            .iter()
            .copied()
            .filter(|variable| {
                variable.text("standard_name").is_none_or(|name| name.contains("spectral_density"))
                    && SHORT.contains(&variable.name.to_lowercase().as_str())
            })
            .collect();
    }
    if found.is_empty() {
        found = fields.iter().copied().filter(|variable| has_axes(header, variable) == (true, true)).collect();
    }
    match found[..] {
        [one] => Ok(one),
        _ => {
            let candidates: Vec<&str> =
                if found.is_empty() { &fields } else { &found }.iter().map(|variable| variable.name.as_str()).collect();
            Err(NetcdfError::NoVariable {
                path: header.path.clone(),
                wanted: "the density over wave frequency and direction",
                candidates: if candidates.is_empty() { "none".to_owned() } else { candidates.join(", ") },
                key: "spectra.density",
            })
        }
    }
}
