//! What one file's columns mean, with all that the study adds: settled once, before rows are read.

use super::band_text::{BandText, parse_band_text};
use super::columns::{Roles, Seen};
use super::convert::Conversion;
use super::error::{Asked, LevelError};
use super::options::{Layout, LevelOptions};
use super::registry::Registry;
use super::unit_text::StatedUnit;
use crate::io::time_text::{DateOrder, TimeRules, TimeUnit, zone_minutes};
use crate::model::{Band, BandError, LevelKind, LevelScale, PressureReference, Stamp};
use crate::units::Hertz;
use std::path::Path;

/// Where windows come from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum WindowRule {
    /// A stamp column and one length for all rows.
    Stamped { column: usize, stamp: Stamp, length_ms: i64 },
    /// Two columns.
    Both { start: usize, end: usize },
}

/// Where the site of a row comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum SiteRule {
    Column(usize),
    Constant(u32),
}

/// Where bands and levels come from.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum ValueRule {
    /// One level column; the band by a text or number column, by two edge columns, or one for all.
    Long { level: usize, band: BandRule },
    /// Level columns, each with its band.
    Wide(Vec<(usize, u32)>),
}

/// Where the band of a long row comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum BandRule {
    Column(usize),
    Edges(usize, usize),
    Constant(u32),
}

/// All that reading a file's rows needs.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Plan {
    pub(super) layout: Layout,
    pub(super) window: WindowRule,
    pub(super) site: SiteRule,
    pub(super) value: ValueRule,
    pub(super) qc: Option<usize>,
    pub(super) reference: PressureReference,
    pub(super) kind: LevelKind,
    pub(super) scale: LevelScale,
    pub(super) conversion: Conversion,
    pub(super) notes: Vec<String>,
    pub(super) warnings: Vec<String>,
}

/// Why a text is no band: an error of the band, or the scheme is not stated.
pub(super) enum NoBand {
    Unreadable,
    Scheme,
    Wrong(BandError),
}

/// The band of a text under the study's rules.
pub(super) fn band_of_text(text: &str, options: &LevelOptions) -> Result<Band, NoBand> {
    let explicit = options.band_edges.iter().find(|edges| edges.name.trim().eq_ignore_ascii_case(text.trim()));
    if let Some(edges) = explicit {
        return Band::from_edges(edges.low_hz, edges.high_hz).map_err(NoBand::Wrong);
    }
    let parsed = parse_band_text(text, options.band_prefix.as_deref()).ok_or(NoBand::Unreadable)?;
    band_of(parsed, options)
}

/// The band of a centre or of edges under the study's rules.
pub(super) fn band_of(text: BandText, options: &LevelOptions) -> Result<Band, NoBand> {
    match text {
        BandText::Edges { low_hz, high_hz } => Band::from_edges(low_hz, high_hz).map_err(NoBand::Wrong),
        BandText::Centre { hz, .. } => {
            let centre = Hertz::new(hz).map_err(|_| NoBand::Unreadable)?;
            options.bands.ok_or(NoBand::Scheme)?.band(centre).map_err(NoBand::Wrong)
        }
    }
}

/// The rules for times that a study states.
pub(super) fn time_rules(options: &LevelOptions) -> Result<TimeRules, LevelError> {
    let wrong = |key, found: &str, expected: &str| LevelError::Setting {
        key,
        found: format!("\"{found}\""),
        expected: expected.to_owned(),
    };
    let zone = options.time_zone.as_deref().map(|text| {
        zone_minutes(text).ok_or_else(|| {
            wrong("levels.time_zone", text, "\"UTC\" or a fixed offset such as \"+02:00\" (named zones are understood only where Parquet times carry them)")
        })
    });
    let unit = options
        .time_unit
        .as_deref()
        .map(|text| TimeUnit::from_name(text).ok_or_else(|| wrong("levels.time_unit", text, TimeUnit::NAMES)));
    let order = options
        .date_order
        .as_deref()
        .map(|text| DateOrder::from_name(text).ok_or_else(|| wrong("levels.date_order", text, "\"dmy\" or \"mdy\"")));
    Ok(TimeRules { zone_minutes: zone.transpose()?, unit: unit.transpose()?, order: order.transpose()? })
}

/// What a file says besides its rows.
pub(super) struct Stated<'a> {
    /// Columns and their header.
    pub(super) seen: Seen<'a>,
    /// The units row, one text a column; empty where there is none.
    pub(super) units: &'a [String],
    /// Comment lines above the header.
    pub(super) preamble: &'a [String],
    /// The first band texts of a long table, for the advice about schemes.
    pub(super) first_bands: Vec<String>,
}

impl Stated<'_> {
    /// Settles everything, or asks for all that is missing at once.
    pub(super) fn plan(
        &self,
        roles: &Roles,
        options: &LevelOptions,
        registry: &mut Registry,
    ) -> Result<Plan, LevelError> {
        let path = self.seen.path;
        let (mut asks, mut notes, mut warnings) = (Vec::new(), Vec::new(), Vec::new());
        let layout = if roles.level.is_some() { Layout::Long } else { Layout::Wide };
        let window = window_rule(roles, options, path, self, &mut asks, &mut notes)?;
        let site = match (roles.site, &options.site) {
            (Some(column), None) => Some(SiteRule::Column(column)),
            (_, Some(name)) => Some(SiteRule::Constant(registry.site(name))),
            (None, None) => {
                asks.push(ask(
                    "the site of the rows",
                    "levels.site",
                    "a column name, or `levels.site_id` to a site's id",
                ));
                None
            }
        };
        let value = self.values(roles, options, registry, &mut asks, &mut notes)?;
        let unit = self.unit(roles, options, &mut asks, &mut notes, &mut warnings);
        if roles.qc.is_some() && options.qc_keep.is_empty() {
            asks.push(ask("which quality values keep a row", "levels.qc_keep", "a list such as [\"1\", \"good\"]"));
        }
        if roles.qc.is_none() {
            let like_qc = roles
                .unused
                .iter()
                .find(|name| ["qc", "flag", "quality"].iter().any(|word| name.to_lowercase().contains(word)));
            if let Some(name) = like_qc {
                warnings.push(format!("column `{name}` looks like a quality flag and is not used; set `levels.qc` and `levels.qc_keep` to use it"));
            }
        }
        if let (Some(column), Some(site), None) = (roles.site, &options.site, &options.columns.site) {
            let name = &self.seen.names[column];
            warnings.push(format!("column `{name}` names sites, but `levels.site_id` puts all rows at `{site}`"));
        }
        if !roles.unused.is_empty() {
            notes.push(format!("columns not used: {}", super::columns::listed(&roles.unused)));
        }
        let (Some(window), Some(site), Some(value), Some((reference, kind, scale)), true) =
            (window, site, value, unit, asks.is_empty())
        else {
            return Err(LevelError::Ask { path: path.to_owned(), asks });
        };
        let conversion = Conversion::new(options, reference, scale);
        Ok(Plan { layout, window, site, value, qc: roles.qc, reference, kind, scale, conversion, notes, warnings })
    }

    fn values(
        &self,
        roles: &Roles,
        options: &LevelOptions,
        registry: &mut Registry,
        asks: &mut Vec<Asked>,
        notes: &mut Vec<String>,
    ) -> Result<Option<ValueRule>, LevelError> {
        if let Some(level) = roles.level {
            let band = match (roles.band, roles.band_low, roles.band_high) {
                (_, Some(low), Some(high)) => BandRule::Edges(low, high),
                (Some(column), ..) => {
                    let needs_scheme = |text: &String| matches!(band_of_text(text, options), Err(NoBand::Scheme));
                    if self.first_bands.iter().any(needs_scheme) {
                        asks.push(ask_scheme(&self.first_bands));
                    }
                    let name = &self.seen.names[column];
                    if !name.to_lowercase().contains("hz") && self.first_bands.iter().any(|text| bare(text)) {
                        notes.push(format!("column `{name}` names no unit; its numbers are taken as Hz"));
                    }
                    BandRule::Column(column)
                }
                _ => {
                    let edges = options.band_edges.first().expect("a long table without band column has one band");
                    let band = Band::from_edges(edges.low_hz, edges.high_hz).map_err(|source| LevelError::Band {
                        path: self.seen.path.to_owned(),
                        place: "`levels.band_edges`".to_owned(),
                        source,
                    })?;
                    BandRule::Constant(registry.band(edges.name.as_bytes(), band))
                }
            };
            return Ok(Some(ValueRule::Long { level, band }));
        }
        let mut columns: Vec<(usize, u32)> = Vec::new();
        for (index, text) in &roles.wide {
            let name = &self.seen.names[*index];
            let wrong = |source| LevelError::Band {
                path: self.seen.path.to_owned(),
                place: format!("column `{name}`"),
                source,
            };
            let band = match band_of(*text, options) {
                Ok(band) => registry.band(name.as_bytes(), band),
                Err(NoBand::Wrong(source)) => return Err(wrong(source)),
                Err(NoBand::Unreadable) => return Err(wrong(BandError::Edges { low_hz: 0.0, high_hz: 0.0 })),
                Err(NoBand::Scheme) => {
                    let names: Vec<String> =
                        roles.wide.iter().map(|(index, _)| self.seen.names[*index].clone()).collect();
                    asks.push(ask_scheme(&names));
                    return Ok(None);
                }
            };
            if let Some((first, _)) = columns.iter().find(|(_, known)| *known == band) {
                let label = registry.names.bands[band as usize].label();
                return Err(self.seen.twice(format!("the band {label}"), *first, *index));
            }
            columns.push((*index, band));
        }
        if roles.wide.iter().any(|(_, text)| matches!(text, BandText::Centre { unit_stated: false, .. })) {
            notes.push("band columns without a unit are taken as Hz".to_owned());
        }
        Ok(Some(ValueRule::Wide(columns)))
    }

    /// Reference, kind and scale: what the study states, else what header, units row or comments state.
    fn unit(
        &self,
        roles: &Roles,
        options: &LevelOptions,
        asks: &mut Vec<Asked>,
        notes: &mut Vec<String>,
        warnings: &mut Vec<String>,
    ) -> Option<(PressureReference, LevelKind, LevelScale)> {
        let columns: Vec<usize> = roles.level.into_iter().chain(roles.wide.iter().map(|(index, _)| *index)).collect();
        let mut in_file = StatedUnit::default();
        for index in columns {
            let texts = [self.units.get(index), self.seen.names.get(index)];
            for text in texts.into_iter().flatten() {
                in_file = in_file.or(super::unit_text::stated_unit(text));
            }
        }
        let from_columns = in_file;
        for line in self.preamble.iter().filter(|line| line.to_lowercase().contains("re ")) {
            in_file = in_file.or(super::unit_text::stated_unit(line));
        }
        if in_file != StatedUnit::default() && (in_file.reference.is_some() || in_file.kind.is_some()) {
            let place = if from_columns.reference == in_file.reference { "the header" } else { "the comments" };
            let kind = in_file.kind.map_or("levels of unstated kind", LevelKind::unit);
            notes.push(format!(
                "{place} states {kind}{}",
                in_file.reference.map_or_else(String::new, |r| format!(", reference {}", reference_name(r)))
            ));
        }
        if let (Some(file), Some(study)) = (in_file.reference, options.reference)
            && file != study
        {
            warnings.push(format!(
                "the file states the reference {}, `levels.reference` states {}; the setting is used",
                reference_name(file),
                reference_name(study)
            ));
        }
        if let (Some(file), Some(study)) = (in_file.kind, options.kind)
            && file != study
        {
            warnings.push(format!(
                "the file states {}, `levels.kind` states {}; the setting is used",
                file.unit(),
                study.unit()
            ));
        }
        let reference = options.reference.or(in_file.reference);
        let kind = options.kind.or(in_file.kind);
        let scale = options.scale.or(in_file.scale).unwrap_or_default();
        if reference.is_none() {
            asks.push(ask("the reference of the levels", "levels.reference", "\"1 uPa\", \"1 Pa\" or \"20 uPa\""));
        }
        if kind.is_none() {
            asks.push(ask(
                "whether levels are of bands or densities",
                "levels.kind",
                "\"band_level\" or \"spectral_density_level\"",
            ));
        }
        if let Some(reference) = reference
            && reference != PressureReference::Micropascal
        {
            notes.push(format!(
                "{:+.4} dB are added to refer levels to 1 uPa instead of {}",
                reference.to_micropascal_db(),
                reference_name(reference)
            ));
        }
        match scale {
            LevelScale::Decibel => {}
            LevelScale::MeanSquare => notes.push("linear values: 10 log10 of the mean square".to_owned()),
            LevelScale::RootMeanSquare => notes.push("linear values: 20 log10 of the root mean square".to_owned()),
        }
        Some((reference?, kind?, scale))
    }
}

/// The reference as a study file writes it.
pub(super) fn reference_name(reference: PressureReference) -> &'static str {
    match reference {
        PressureReference::Micropascal => "1 uPa",
        PressureReference::Pascal => "1 Pa",
        PressureReference::TwentyMicropascals => "20 uPa",
    }
}

fn bare(text: &str) -> bool {
    matches!(parse_band_text(text, None), Some(BandText::Centre { unit_stated: false, .. }))
}

fn ask(what: &str, key: &'static str, expected: &str) -> Asked {
    Asked { what: what.to_owned(), key, expected: expected.to_owned() }
}

/// Asks for the scheme of bands, with the spacing of the first centres as a hint.
fn ask_scheme(texts: &[String]) -> Asked {
    let mut centres: Vec<f64> = texts
        .iter()
        .filter_map(|text| match parse_band_text(text, None) {
            Some(BandText::Centre { hz, .. }) if hz > 0.0 => Some(hz),
            _ => None,
        })
        .collect();
    centres.sort_by(f64::total_cmp);
    centres.dedup_by(|a, b| (*a / *b - 1.0).abs() < 1e-3);
    let steps: Vec<f64> = centres.windows(2).map(|pair| 10.0 * libm::log10(pair[1] / pair[0])).collect();
    let all_near = |tenths: f64| !steps.is_empty() && steps.iter().all(|step| (step - tenths).abs() < 0.3);
    let hint = if all_near(1.0) {
        ": the centres are a tenth of a decade apart"
    } else if all_near(3.0) {
        ": the centres are an octave apart"
    } else {
        ""
    };
    Asked {
        what: format!("the width of the bands{hint}"),
        key: "levels.bands",
        expected: "\"decidecade\" or \"octave\" (or give `levels.band_edges`)".to_owned(),
    }
}

fn window_rule(
    roles: &Roles,
    options: &LevelOptions,
    path: &Path,
    stated: &Stated<'_>,
    asks: &mut Vec<Asked>,
    notes: &mut Vec<String>,
) -> Result<Option<WindowRule>, LevelError> {
    let length_ms = match options.window_s {
        Some(window_s) if !(window_s.is_finite() && (0.0..=3.2e7).contains(&window_s)) => {
            return Err(LevelError::Setting {
                key: "levels.window_s",
                found: format!("{window_s}"),
                expected: "seconds from 0 to a year".to_owned(),
            });
        }
        Some(window_s) => Some((window_s * 1000.0).round() as i64),
        None => None,
    };
    let (column, implied) = match (roles.start, roles.end, roles.time) {
        (Some(start), Some(end), _) => {
            if length_ms.is_some() {
                notes.push("windows are taken from their two columns; `levels.window_s` is not used".to_owned());
            }
            return Ok(Some(WindowRule::Both { start, end }));
        }
        (Some(start), None, _) => (start, Some(Stamp::Start)),
        (None, Some(end), None) => (end, Some(Stamp::End)),
        (None, _, Some(time)) => (time, None),
        (None, None, None) => {
            return Err(LevelError::NoRole {
                path: path.to_owned(),
                role: "the time",
                found: super::columns::listed(stated.seen.names),
                key: "levels.time",
            });
        }
    };
    if length_ms.is_none() {
        asks.push(ask("the length of a row's window", "levels.window_s", "seconds (0 for an instant)"));
    }
    let stamp = implied.or(options.stamp).or_else(|| (length_ms == Some(0)).then_some(Stamp::Start));
    if stamp.is_none() {
        asks.push(ask("which instant of its window a time is", "levels.stamp", "\"start\", \"centre\" or \"end\""));
    }
    Ok(length_ms.zip(stamp).map(|(length_ms, stamp)| WindowRule::Stamped { column, stamp, length_ms }))
}
