//! Gridded integral parameters of the sea (height, periods, direction, spread), read by the same code as wind: a height or a
//! period is interpolated like a speed, a direction like that of a wind whose speed is the wave height.

use super::error::NetcdfError;
use super::header::{Header, Variable};
use super::wind::{WindSource, open_wind, read_header};
use super::wind_options::{DirectionSense, WindOptions};
use crate::model::SourceId;
use std::path::PathBuf;

/// A parameter of the sea.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum WaveParameter {
    /// Significant height, m.
    Height,
    /// Peak period, s.
    PeakPeriod,
    /// Mean period m0/m1, s.
    MeanPeriod1,
    /// Mean period sqrt(m0/m2), s.
    MeanPeriod2,
    /// Energy period m-1/m0, s.
    EnergyPeriod,
    /// Mean direction that waves come from, degrees.
    FromDirection,
    /// Directional spread, degrees.
    Spread,
}

/// How a parameter is found: in words, key, standard names, short names of the trade.
struct Known {
    words: &'static str,
    standard: &'static [&'static str],
    short: &'static [&'static str],
}

impl WaveParameter {
    fn known(self) -> Known {
        match self {
            Self::Height => Known {
                words: "the significant wave height",
                standard: &["sea_surface_wave_significant_height", "significant_height_of_wind_and_swell_waves"],
                short: &["hs", "swh", "htsgw", "vhm0", "wvht"],
            },
            Self::PeakPeriod => Known {
                words: "the peak period of waves",
                standard: &[
                    "sea_surface_wave_period_at_variance_spectral_density_maximum",
                    "sea_surface_wave_peak_period",
                ],
                short: &["tp", "pp1d", "perpw", "vtpk", "dpd"],
            },
            Self::MeanPeriod1 => Known {
                words: "the mean period of waves from the first moment",
                standard: &["sea_surface_wave_mean_period_from_variance_spectral_density_first_frequency_moment"],
                short: &["t01", "tm01", "mp1"],
            },
            Self::MeanPeriod2 => Known {
                words: "the mean period of waves from the second moment",
                standard: &["sea_surface_wave_mean_period_from_variance_spectral_density_second_frequency_moment"],
                short: &["t02", "tm02", "vtm02", "mp2"],
            },
            Self::EnergyPeriod => Known {
                words: "the energy period of waves",
                standard: &["sea_surface_wave_mean_period_from_variance_spectral_density_inverse_frequency_moment"],
                short: &["t0m1", "tm10", "vtm10", "mwp"],
            },
            Self::FromDirection => Known {
                words: "the mean wave direction",
                standard: &["sea_surface_wave_from_direction", "sea_surface_wave_to_direction"],
                short: &["dir", "mwd", "vmdr", "mean_wave_direction"],
            },
            Self::Spread => Known {
                words: "the directional spread of waves",
                standard: &["sea_surface_wave_directional_spread"],
                short: &["spr", "dspr"],
            },
        }
    }

    /// Factor to the parameter's own unit, or what was expected.
    fn unit(self, text: Option<&str>) -> Result<f64, &'static str> {
        let lower = text.map(str::to_lowercase);
        let (known, expected): (&[(&str, f64)], _) = match self {
            Self::Height => (
                &[
                    ("m", 1.0),
                    ("metre", 1.0),
                    ("metres", 1.0),
                    ("meter", 1.0),
                    ("meters", 1.0),
                    ("cm", 0.01),
                    ("ft", 0.3048),
                ],
                "m",
            ),
            Self::FromDirection | Self::Spread => (
                &[("degree", 1.0), ("degrees", 1.0), ("deg", 1.0), ("degree_true", 1.0), ("degrees_true", 1.0)],
                "degree",
            ),
            _ => (&[("s", 1.0), ("sec", 1.0), ("second", 1.0), ("seconds", 1.0)], "s"),
        };
        known.iter().find(|(name, _)| lower.as_deref() == Some(*name)).map(|(_, factor)| *factor).ok_or(expected)
    }
}

/// Opens a parameter: the source, whose scalar speed is the parameter in its own unit (times the factor), or, for a direction,
/// whose components are those of a wind from where the waves come. `named` is the variable, where the user names it.
///
/// # Errors
/// When the variable cannot be found, its unit or sense cannot be known, or the files cannot be read.
pub fn open_waves(
    files: &[PathBuf],
    parameter: WaveParameter,
    named: Option<&str>,
    options: &WindOptions,
) -> Result<(WindSource, f64), NetcdfError> {
    let path = files.first().ok_or(NetcdfError::NoFiles)?;
    let header = read_header(path)?;
    let variable = find(&header, parameter, named)?;
    let refuse =
        |problem: String| NetcdfError::Variable { path: path.clone(), variable: variable.name.clone(), problem };
    let factor = parameter.unit(variable.text("units")).map_err(|expected| {
        let found = variable.text("units").map_or("no units".to_owned(), |text| format!("units `{text}`"));
        refuse(format!("it has {found}; expected {expected}"))
    })?;
    let mut options = WindOptions { units: Some("m/s".to_owned()), height_m: None, ..options.clone() };
    if parameter == WaveParameter::FromDirection {
        let height = find(&header, WaveParameter::Height, None)?;
        options.speed = Some(height.name.clone());
        options.direction = Some(variable.name.clone());
        options.direction_sense = options.direction_sense.or(match variable.text("standard_name") {
            Some("sea_surface_wave_from_direction") => Some(DirectionSense::From),
            Some("sea_surface_wave_to_direction") => Some(DirectionSense::To),
            _ => None,
        });
    } else {
        options.speed = Some(variable.name.clone());
    }
    let source = open_wind(SourceId("waves".into()), files, &options).map_err(|error| match error {
        NetcdfError::Variable { path, variable, problem } => {
            NetcdfError::Variable { path, variable, problem: problem.replace("`wind.", "`waves.") }
        }
        other => other,
    })?;
    Ok((source, factor))
}

fn find<'a>(header: &'a Header, parameter: WaveParameter, named: Option<&str>) -> Result<&'a Variable, NetcdfError> {
    let known = parameter.known();
    let fields = || header.variables.iter().filter(|v| v.number_type().is_some() && v.dimensions.len() >= 2);
    let found: Vec<&Variable> = match named {
        Some(name) => header.variable(name).into_iter().collect(),
        None => {
            let by_standard: Vec<&Variable> = fields()
                .filter(|v| v.text("standard_name").is_some_and(|name| known.standard.contains(&name)))
                .collect();
            if by_standard.is_empty() {
                fields().filter(|v| known.short.contains(&v.name.to_lowercase().as_str())).collect()
            } else {
                by_standard
            }
        }
    };
    match found[..] {
        [one] => Ok(one),
        _ => Err(NetcdfError::NoVariable {
            path: header.path.clone(),
            wanted: known.words,
            candidates: header.variable_names(),
            key: "waves.variable",
        }),
    }
}
