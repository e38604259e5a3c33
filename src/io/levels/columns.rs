//! Which column is what.

use super::band_text::{BandText, parse_band_text};
use super::error::LevelError;
use super::options::{Layout, LevelOptions};
use super::unit_text::stated_unit;
use crate::io::delimited::plain_name;
use std::path::Path;

/// The columns of a table by their role, as indices.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Roles {
    pub(super) time: Option<usize>,
    pub(super) start: Option<usize>,
    pub(super) end: Option<usize>,
    pub(super) site: Option<usize>,
    pub(super) band: Option<usize>,
    pub(super) band_low: Option<usize>,
    pub(super) band_high: Option<usize>,
    pub(super) level: Option<usize>,
    pub(super) qc: Option<usize>,
    /// Band columns of a wide table, by index, with what their names say.
    pub(super) wide: Vec<(usize, BandText)>,
    /// Columns that nothing was made of.
    pub(super) unused: Vec<String>,
}

/// What is known of a table before its columns are given roles.
pub(super) struct Seen<'a> {
    pub(super) path: &'a Path,
    pub(super) names: &'a [String],
    /// Columns whose first values all look like times.
    pub(super) times: &'a [usize],
    /// Line of the header; 0 for Parquet.
    pub(super) header_line: u64,
    /// Columns whose first values hold at least one number.
    pub(super) numbers: &'a [usize],
}

const TIME: &[&str] = &[
    "time",
    "time_utc",
    "utc",
    "utc_time",
    "datetime",
    "date_time",
    "datetime_utc",
    "date_time_utc",
    "timestamp",
    "timestamp_utc",
    "time_stamp",
    "iso_time",
    "isotime",
    "date_utc",
    "date",
];
const START: &[&str] =
    &["window_start", "window_start_utc", "start", "start_time", "start_utc", "start_time_utc", "time_start", "begin"];
const END: &[&str] = &["window_end", "window_end_utc", "end", "end_time", "end_utc", "end_time_utc", "time_end"];
const SITE: &[&str] =
    &["site", "site_id", "site_name", "station", "station_id", "station_name", "mooring", "location", "platform_id"];
const BAND: &[&str] = &[
    "band",
    "band_hz",
    "band_centre_hz",
    "band_center_hz",
    "band_centre",
    "band_center",
    "centre_hz",
    "center_hz",
    "centre_frequency_hz",
    "center_frequency_hz",
    "frequency",
    "frequency_hz",
    "freq",
    "freq_hz",
    "f_hz",
    "fc_hz",
    "sound_frequency",
];
const BAND_LOW: &[&str] =
    &["band_low_hz", "band_lower_hz", "low_hz", "lower_hz", "f_low_hz", "lower_edge_hz", "band_low_edge_hz"];
const BAND_HIGH: &[&str] =
    &["band_high_hz", "band_upper_hz", "high_hz", "upper_hz", "f_high_hz", "upper_edge_hz", "band_high_edge_hz"];
const LEVEL: &[&str] = &[
    "level",
    "level_db",
    "band_level",
    "band_level_db",
    "spl",
    "spl_db",
    "psd",
    "psd_db",
    "spectral_density_level_db",
];

/// The columns for a message.
pub(super) fn listed(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(12).map(|name| format!("`{name}`")).collect();
    let more = if names.len() > 12 { format!(" and {} more", names.len() - 12) } else { String::new() };
    format!("{}{more}", shown.join(", "))
}

impl Seen<'_> {
    /// The one column of a role: the named one, else the one that is recognised.
    fn role(
        &self,
        named: Option<&String>,
        known: &[&str],
        role: &'static str,
        key: &'static str,
    ) -> Result<Option<usize>, LevelError> {
        if let Some(wanted) = named {
            return self.named(wanted, key).map(Some);
        }
        let mut found: Vec<(usize, usize)> = self
            .names
            .iter()
            .enumerate()
            .filter_map(|(index, name)| {
                let plain = plain_name(name);
                known.iter().position(|candidate| *candidate == plain).map(|rank| (rank, index))
            })
            .collect();
        found.sort_unstable();
        match found.as_slice() {
            [] => Ok(None),
            [(_, only)] => Ok(Some(*only)),
            [(_, first), (_, second), ..] => Err(LevelError::Ambiguous {
                path: self.path.to_owned(),
                first: self.names[*first].clone(),
                second: self.names[*second].clone(),
                role,
                key,
            }),
        }
    }

    fn named(&self, wanted: &str, key: &'static str) -> Result<usize, LevelError> {
        let same = |name: &String| name.trim().eq_ignore_ascii_case(wanted.trim());
        let mut hits = self.names.iter().enumerate().filter(|(_, name)| same(name)).map(|(index, _)| index);
        let first = hits.next().ok_or_else(|| LevelError::NoColumn {
            path: self.path.to_owned(),
            wanted: wanted.to_owned(),
            key,
            found: listed(self.names),
        })?;
        match hits.next() {
            None => Ok(first),
            Some(second) => Err(self.twice(format!("column `{wanted}`"), first, second)),
        }
    }

    /// The error of something that occurs in two columns.
    pub(super) fn twice(&self, what: String, first: usize, second: usize) -> LevelError {
        let (first, second) = (first + 1, second + 1);
        LevelError::Duplicate { path: self.path.to_owned(), what, first, second, line: self.header_line }
    }

    /// A level column by its name's unit ("Level (dB re 1 uPa)"), where it is no band.
    fn level_by_unit(&self) -> Option<usize> {
        let mut hits = self.names.iter().enumerate().filter(|(_, name)| {
            let plain = plain_name(name);
            let words = ["level", "spl", "psd"].iter().any(|word| plain.starts_with(word));
            (words || stated_unit(name).reference.is_some()) && parse_band_text(name, None).is_none()
        });
        let first = hits.next();
        if hits.next().is_some() { None } else { first.map(|(index, _)| index) }
    }

    /// Gives every column its role.
    pub(super) fn roles(&self, options: &LevelOptions) -> Result<Roles, LevelError> {
        let columns = &options.columns;
        let mut roles = Roles {
            start: self.role(columns.window_start.as_ref(), START, "the start of the window", "levels.window_start")?,
            end: self.role(columns.window_end.as_ref(), END, "the end of the window", "levels.window_end")?,
            site: self.role(columns.site.as_ref(), SITE, "the site", "levels.site")?,
            qc: columns.qc.as_ref().map(|wanted| self.named(wanted, "levels.qc")).transpose()?,
            ..Roles::default()
        };
        // A date beside a time is refused here: either alone would put all rows of a day at one instant.
        roles.time = self.role(columns.time.as_ref(), TIME, "the time", "levels.time")?;
        if roles.time.is_none() && roles.start.is_none() && roles.end.is_none() {
            roles.time = self.single_time(&roles);
        }
        let layout = self.layout(options, &mut roles)?;
        if layout == Layout::Wide {
            roles.band = None;
            roles.band_low = None;
            roles.band_high = None;
            roles.level = None;
            self.wide(options, &mut roles)?;
        }
        let used = [
            roles.time,
            roles.start,
            roles.end,
            roles.site,
            roles.band,
            roles.band_low,
            roles.band_high,
            roles.level,
            roles.qc,
        ];
        roles.unused = self
            .names
            .iter()
            .enumerate()
            .filter(|(index, name)| {
                !name.is_empty() && !used.contains(&Some(*index)) && !roles.wide.iter().any(|(wide, _)| wide == index)
            })
            .map(|(_, name)| name.clone())
            .collect();
        Ok(roles)
    }

    fn single_time(&self, roles: &Roles) -> Option<usize> {
        let mut free =
            self.times.iter().copied().filter(|index| Some(*index) != roles.start && Some(*index) != roles.end);
        let first = free.next();
        if free.next().is_some() { None } else { first }
    }

    /// Long where there is a level column (and fills in the roles of a long table), else wide.
    fn layout(&self, options: &LevelOptions, roles: &mut Roles) -> Result<Layout, LevelError> {
        let columns = &options.columns;
        if options.layout == Some(Layout::Wide) {
            return Ok(Layout::Wide);
        }
        let level = match self.role(columns.level.as_ref(), LEVEL, "the level", "levels.level") {
            // Several level-like names and no statement: only a wide table has them, as "spl 63 Hz" has.
            Err(LevelError::Ambiguous { .. }) if options.layout.is_none() && columns.band.is_none() => None,
            other => other?,
        };
        let level = level.or_else(|| self.level_by_unit());
        let stated = options.layout.is_some() || columns.band.is_some() || columns.level.is_some();
        if let Some(level) = level {
            roles.level = Some(level);
            roles.band = self.role(columns.band.as_ref(), BAND, "the band", "levels.band")?;
            roles.band_low = self.role(None, BAND_LOW, "the lower band edge", "levels.band")?;
            roles.band_high = self.role(None, BAND_HIGH, "the upper band edge", "levels.band")?;
            let one_band = options.band_edges.len() == 1;
            let edges = roles.band_low.is_some() && roles.band_high.is_some();
            if roles.band.is_some() || edges || one_band {
                return Ok(Layout::Long);
            }
            if stated || self.band_columns(options).is_empty() {
                return Err(self.no_role("the band", "levels.band"));
            }
        } else if stated {
            return Err(self.no_role("the level", "levels.level"));
        }
        Ok(Layout::Wide)
    }

    fn no_role(&self, role: &'static str, key: &'static str) -> LevelError {
        LevelError::NoRole { path: self.path.to_owned(), role, found: listed(self.names), key }
    }

    /// Columns whose names are bands and whose values are numbers.
    fn band_columns(&self, options: &LevelOptions) -> Vec<(usize, BandText)> {
        self.names
            .iter()
            .enumerate()
            .filter(|(index, _)| self.numbers.contains(index))
            .filter_map(|(index, name)| {
                let explicit =
                    options.band_edges.iter().find(|edges| edges.name.trim().eq_ignore_ascii_case(name.trim()));
                match explicit {
                    Some(edges) => Some((index, BandText::Edges { low_hz: edges.low_hz, high_hz: edges.high_hz })),
                    None => parse_band_text(name, options.band_prefix.as_deref()).map(|text| (index, text)),
                }
            })
            .collect()
    }

    fn wide(&self, options: &LevelOptions, roles: &mut Roles) -> Result<(), LevelError> {
        let taken = [roles.time, roles.start, roles.end, roles.site, roles.qc];
        let mut wide = self.band_columns(options);
        wide.retain(|(index, _)| !taken.contains(&Some(*index)));
        for (at, (first, _)) in wide.iter().enumerate() {
            if let Some((second, _)) =
                wide[at + 1..].iter().find(|(second, _)| self.names[*second] == self.names[*first])
            {
                return Err(self.twice(format!("column `{}`", self.names[*first]), *first, *second));
            }
        }
        if wide.is_empty() {
            return Err(self.no_role("a level (long table) or as a band such as `63 Hz` (wide table)", "levels.level"));
        }
        for edges in options.band_edges.iter().filter(|edges| !edges.name.is_empty()) {
            self.named(&edges.name, "levels.band_edges")?;
        }
        roles.wide = wide;
        Ok(())
    }
}
