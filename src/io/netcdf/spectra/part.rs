//! One file of a spectra source: its variable, its unit, its steps, and how raw numbers become densities.

use super::axes::{StoredAxes, stored_axes};
use super::options::{DensityEncoding, SpectraOptions};
use super::place::{Placement, Sites, placement};
use super::units::density_unit;
use crate::io::netcdf::error::NetcdfError;
use crate::io::netcdf::header::Variable;
use crate::io::netcdf::packing::Packing;
use crate::io::netcdf::read::Reader;
use crate::io::netcdf::time_axis;
use crate::units::Instant;

/// Negative densities up to this share of a spectrum's largest are rounding and count as zero; beyond it the file is refused.
const ROUNDING_SHARE: f64 = 1e-3;

/// One file.
#[derive(Debug)]
pub(super) struct Part {
    pub(super) reader: usize,
    pub(super) variable: String,
    pub(super) placement: Placement,
    pub(super) sites: Sites,
    pub(super) axes: StoredAxes,
    pub(super) packing: Packing,
    pub(super) factor: f64,
    pub(super) encoding: DensityEncoding,
    /// For each stored step its place among the source's, where it has one.
    pub(super) merged: Vec<Option<usize>>,
    pub(super) notes: Vec<String>,
}

/// Understands the density of a file; with it come the instants of its stored steps.
pub(super) fn part(
    reader: &Reader,
    index: usize,
    variable: &Variable,
    options: &SpectraOptions,
) -> Result<(Part, Vec<Option<Instant>>), NetcdfError> {
    let refuse = |problem: String| reader.of_variable(variable, problem);
    let mut placement = placement(reader, variable, true, options)?;
    let sites = placement.sites(reader, variable, options)?;
    let (names, shape) = (reader.header.dimension_names(variable), reader.header.shape(variable));
    let direction = placement.direction.expect("a directional density has one");
    let axes = stored_axes(
        reader,
        variable,
        (names[placement.frequency], shape[placement.frequency] as usize),
        (names[direction], shape[direction] as usize),
        options,
    )?;
    let mut notes = placement.notes.clone();
    notes.extend(axes.notes.iter().cloned());
    let (factor, encoding) = unit(variable, options, &mut notes).map_err(refuse)?;
    let packing = Packing::of(&reader.header, variable)?;
    notes.extend(packing.notes.iter().cloned());
    let steps = steps(reader, variable, placement.step, options, &mut notes)?;
    let part = Part {
        reader: index,
        variable: variable.name.clone(),
        placement,
        sites,
        axes,
        packing,
        factor,
        encoding,
        merged: Vec::new(),
        notes,
    };
    Ok((part, steps))
}

fn unit(
    variable: &Variable,
    options: &SpectraOptions,
    notes: &mut Vec<String>,
) -> Result<(f64, DensityEncoding), String> {
    let expected = "expected m2 s rad-1, m2 s degree-1, m2/Hz/deg, J m-2 Hz-1 rad-1 or log10 of one of them (set `spectra.density_units`)";
    let text = options.density_units.as_deref().or_else(|| variable.text("units"));
    let Some(text) = text else { return Err(format!("it has no units; {expected}")) };
    let unit = density_unit(text, true).map_err(|why| format!("its units are `{text}`: {why}; {expected}"))?;
    let archive = variable.name.eq_ignore_ascii_case("d2fd");
    let long = variable.text("long_name").unwrap_or_default().to_lowercase();
    let encoding = match (options.encoding, unit.encoding) {
        (Some(stated), _) => stated,
        (None, Some(read)) => {
            notes.push(format!("its numbers are decimal logarithms (`{text}`); they were undone"));
            read
        }
        (None, None) if archive || long.contains("log10") => {
            notes.push(
                "its numbers are taken as decimal logarithms of the density, as the archive that uses this name stores them (set `spectra.encoding` to override)".to_owned(),
            );
            DensityEncoding::Log10 { added: 0.0 }
        }
        (None, None) => DensityEncoding::Linear,
    };
    if text.to_lowercase().contains('j') {
        notes.push("its unit is one of energy; variance is energy over 1025 kg/m3 times 9.80665 m/s2".to_owned());
    }
    Ok((unit.factor, encoding))
}

/// Instants of the stored steps of a variable.
pub(super) fn steps(
    reader: &Reader,
    variable: &Variable,
    step: Option<usize>,
    options: &SpectraOptions,
    notes: &mut Vec<String>,
) -> Result<Vec<Option<Instant>>, NetcdfError> {
    let header = &reader.header;
    let refuse = |problem: String| reader.of_variable(variable, problem);
    let dimension = step.map(|place| header.dimension_names(variable)[place]);
    let name = options.time.as_deref().or(dimension).unwrap_or("time");
    let Some(time) = header.variable(name).filter(|time| time.number_type().is_some()) else {
        return Err(refuse(format!("there is no time variable `{name}` for it (set `spectra.time`)")));
    };
    if time.dimensions.len() > 1 {
        return Err(refuse(format!(
            "its time `{name}` has several dimensions (a forecast with lead times?); choose one lead time first"
        )));
    }
    let axis = time_axis::decode(reader, time, options.time_units.as_deref(), options.calendar.as_deref())?;
    notes.extend(axis.notes);
    let count = step.map_or(1, |place| header.shape(variable)[place] as usize);
    if axis.steps.len() != count {
        return Err(refuse(format!("it has {count} steps, but its time `{name}` has {}", axis.steps.len())));
    }
    if count == 0 {
        return Err(refuse("it has no step".to_owned()));
    }
    Ok(axis.steps)
}

impl Part {
    /// Raw numbers of one spectrum to densities, m2/Hz/rad. Missing ones are NaN.
    ///
    /// # Errors
    /// A sentence, when densities are negative beyond rounding.
    pub(super) fn convert(&self, spectrum: &mut [f64]) -> Result<(), String> {
        match (self.packing.only_missing(), self.encoding) {
            (Some(&[missing]), DensityEncoding::Linear) => {
                // Raw numbers are exact: the missing one has one pattern of bits.
                let missing = missing.to_bits();
                for value in spectrum.iter_mut() {
                    *value = if value.to_bits() == missing { f64::NAN } else { *value * self.factor };
                }
            }
            (_, DensityEncoding::Linear) => {
                for value in spectrum.iter_mut() {
                    *value = self.packing.value(*value) * self.factor;
                }
            }
            (_, DensityEncoding::Log10 { added }) => {
                let mut known = false;
                for value in spectrum.iter_mut() {
                    let logarithm = self.packing.value(*value);
                    known |= !logarithm.is_nan();
                    *value = (libm::exp10(logarithm) - added).max(0.0) * self.factor;
                    if logarithm.is_nan() {
                        *value = f64::NAN;
                    }
                }
                // Bins below the least energy that is encoded are missing; a wholly missing spectrum is land.
                if known {
                    spectrum.iter_mut().filter(|value| value.is_nan()).for_each(|value| *value = 0.0);
                }
                return Ok(());
            }
        }
        let below: usize = spectrum.iter().map(|value| usize::from(*value < 0.0)).sum();
        if below > 0 {
            let least = spectrum.iter().copied().fold(0.0, f64::min);
            let most = spectrum.iter().copied().fold(0.0, f64::max);
            if -least > ROUNDING_SHARE * most {
                return Err(format!(
                    "its density goes down to {least}; expected none below zero (logarithms? set `spectra.encoding`)"
                ));
            }
            spectrum.iter_mut().filter(|value| **value < 0.0).for_each(|value| *value = 0.0);
        }
        Ok(())
    }
}
