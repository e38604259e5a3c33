//! The study as a whole.

use super::error::{Complaint, StudyError};
use super::exclude::{ExcludeInput, RawExclude};
use super::fit::{RawRelation, RelationSection};
use super::levels::{LevelsInput, RawLevels};
use super::matching::{MatchSection, RawMatch};
use super::place::WindSpeedMS;
use super::sites::{RawSite, RawSites, SitesInput};
use super::spectra::{RawSpectra, SpectraInput};
use super::spreading::{RawSpreading, SpreadingSection};
use super::wind::{RawWind, WindInput};
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};
use toml::Spanned;

/// A file format for tables.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum TableFormat {
    /// Apache Parquet.
    Parquet,
    /// Comma-separated values.
    Csv,
}

/// The study file as written.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawStudy {
    study: RawHead,
    #[serde(default)]
    site: Vec<RawSite>,
    sites: Option<RawSites>,
    #[serde(default)]
    wind: Vec<Spanned<RawWind>>,
    #[serde(default)]
    spectra: Vec<Spanned<RawSpectra>>,
    #[serde(default)]
    levels: Vec<Spanned<RawLevels>>,
    #[serde(default)]
    exclude: Vec<Spanned<RawExclude>>,
    #[serde(default, rename = "match")]
    matching: RawMatch,
    #[serde(default)]
    relation: RawRelation,
    #[serde(default)]
    spreading: RawSpreading,
    #[serde(default)]
    report: RawReport,
    simulate: Option<Spanned<crate::science::simulate::Settings>>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawHead {
    name: String,
    output: Option<String>,
    tables: Option<Vec<TableFormat>>,
}

#[derive(Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawReport {
    bands_hz: Option<Vec<f64>>,
    wind_class_edges_m_s: Option<Spanned<Vec<WindSpeedMS>>>,
}

/// `[report]` with its defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ReportSection {
    /// Bands drawn in the time series, by centre, Hz; empty: a low, a middle and a high one.
    pub bands_hz: Vec<f64>,
    /// Edges between wind classes, m/s, increasing.
    pub wind_class_edges_m_s: Vec<f64>,
}

/// Default edges between calm, moderate and strong wind, m/s: Beaufort 0 to 3, 4 to 6, 7 and above (limits of
/// the Beaufort scale at 10 m, WMO code table 1100: force 4 begins at 5.5 m/s, force 7 at 13.9 m/s).
const WIND_CLASS_EDGES_M_S: [f64; 2] = [5.5, 13.9];

/// A study, resolved: defaults filled in, files found, sections checked against each other.
#[derive(Debug, Clone, Serialize)]
pub struct Study {
    /// The study file.
    #[serde(skip)]
    pub path: PathBuf,
    /// Name of the study, for titles.
    pub name: String,
    /// Folder for the outputs.
    #[serde(skip)]
    pub output: PathBuf,
    /// Formats of the tables.
    pub tables: Vec<TableFormat>,
    /// Sites and sensors.
    pub sites: SitesInput,
    /// Wind inputs.
    pub wind: Vec<WindInput>,
    /// Inputs of directional wave spectra.
    pub spectra: Vec<SpectraInput>,
    /// Level tables.
    pub levels: Vec<LevelsInput>,
    /// What is left out by rule.
    pub exclude: Vec<ExcludeInput>,
    /// How levels and wind are brought together.
    #[serde(rename = "match")]
    pub matching: MatchSection,
    /// How level is fitted against wind speed.
    pub relation: RelationSection,
    /// The sound of opposing waves and how spreading is compared with it.
    pub spreading: SpreadingSection,
    /// What is drawn.
    pub report: ReportSection,
    /// A deployment to simulate.
    pub simulate: Option<crate::science::simulate::Settings>,
}

/// Reads and resolves a study file.
///
/// # Errors
/// When the file cannot be read, is no TOML, has an unknown key or an impossible value, or names files that are not there.
pub fn read_study(path: &Path) -> Result<Study, StudyError> {
    let text =
        std::fs::read_to_string(path).map_err(|source| StudyError::Unreadable { path: path.to_owned(), source })?;
    let complaint = Complaint { path, text: &text };
    let raw: RawStudy = toml::from_str(&text).map_err(|error| complaint.parser(&error))?;
    let base = path.parent().unwrap_or(Path::new(""));
    raw.resolve(base, complaint)
}

impl RawStudy {
    fn resolve(self, base: &Path, complaint: Complaint<'_>) -> Result<Study, StudyError> {
        let mut wind: Vec<WindInput> = Vec::new();
        for raw in self.wind {
            let place = raw.span().start;
            let input = raw.into_inner().resolve(base, complaint, place)?;
            if wind.iter().any(|known| known.id == input.id) {
                return Err(complaint.at(place, format!("wind `{}` is there twice; ids must differ", input.id)));
            }
            wind.push(input);
        }
        let spectra = resolve_spectra(self.spectra, &wind, base, complaint)?;
        let mut levels = Vec::new();
        for raw in self.levels {
            let place = raw.span().start;
            levels.push(raw.into_inner().resolve(base, complaint, place)?);
        }
        let mut exclude = Vec::new();
        for raw in self.exclude {
            let place = raw.span().start;
            exclude.push(raw.into_inner().resolve(base, complaint, place)?);
        }
        let mut tables = self.study.tables.unwrap_or_else(|| vec![TableFormat::Parquet, TableFormat::Csv]);
        tables.dedup();
        if tables.is_empty() {
            return Err(complaint.lacking("`study.tables` is empty; expected \"parquet\", \"csv\" or both"));
        }
        Ok(Study {
            path: complaint.path.to_owned(),
            name: self.study.name,
            output: base.join(self.study.output.as_deref().unwrap_or("out")),
            tables,
            sites: SitesInput::resolve(self.site, self.sites, base, complaint)?,
            wind,
            spectra,
            levels,
            exclude,
            matching: self.matching.resolve(complaint)?,
            relation: self.relation.resolve(complaint)?,
            spreading: self.spreading.resolve(complaint)?,
            report: self.report.resolve(complaint)?,
            simulate: match self.simulate {
                None => None,
                Some(settings) => {
                    let place = settings.span().start;
                    let settings = settings.into_inner();
                    settings.check().map_err(|problem| complaint.at(place, problem))?;
                    Some(settings)
                }
            },
        })
    }
}

fn resolve_spectra(
    raw: Vec<Spanned<RawSpectra>>,
    wind: &[WindInput],
    base: &Path,
    complaint: Complaint<'_>,
) -> Result<Vec<SpectraInput>, StudyError> {
    let mut spectra: Vec<SpectraInput> = Vec::new();
    for raw in raw {
        let place = raw.span().start;
        let input = raw.into_inner().resolve(base, complaint, place)?;
        if spectra.iter().any(|known| known.id == input.id) {
            return Err(complaint.at(place, format!("spectra `{}` are there twice; ids must differ", input.id)));
        }
        if let Some(name) = &input.wind
            && !wind.iter().any(|known| known.id.0 == *name)
        {
            let ids: Vec<&str> = wind.iter().map(|known| known.id.0.as_str()).collect();
            let problem = format!(
                "spectra `{}`: there is no wind `{name}` (`spectra.wind`); the winds are {}",
                input.id,
                if ids.is_empty() { "none".to_owned() } else { ids.join(", ") }
            );
            return Err(complaint.at(place, problem));
        }
        spectra.push(input);
    }
    Ok(spectra)
}

impl RawReport {
    fn resolve(self, complaint: Complaint<'_>) -> Result<ReportSection, StudyError> {
        let edges = match self.wind_class_edges_m_s {
            None => WIND_CLASS_EDGES_M_S.to_vec(),
            Some(edges) => {
                let place = edges.span().start;
                let edges: Vec<f64> = edges.into_inner().into_iter().map(|edge| edge.0).collect();
                if edges.is_empty() || edges.windows(2).any(|pair| pair[0] >= pair[1]) {
                    return Err(complaint.at(place, "`report.wind_class_edges_m_s` must increase"));
                }
                edges
            }
        };
        Ok(ReportSection { bands_hz: self.bands_hz.unwrap_or_default(), wind_class_edges_m_s: edges })
    }
}
