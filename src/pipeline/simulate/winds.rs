//! The wind of a simulated deployment, invented or from the study's inputs.

use crate::Error;
use crate::config::{Study, StudyError, WindOrigin};
use crate::io::wind_table::read_wind_table;
use crate::model::{Site, Track, WindSeries};
use crate::pipeline::inputs::{OpenWind, open_inputs};
use crate::pipeline::progress::Progress;
use crate::pipeline::sampling::sample_wind;
use crate::science::simulate::{Settings, SiteWind, WindField, Windows};
use crate::units::Instant;

/// The wind at the sites, and the windows that it allows.
pub(super) struct Winds {
    /// The field, where it is invented.
    pub(super) field: Option<WindField>,
    /// At the sites, in their order.
    pub(super) at_sites: Vec<SiteWind>,
    /// The windows of the levels.
    pub(super) windows: Windows,
}

impl Winds {
    /// Invents a field.
    pub(super) fn invented(settings: &Settings, seed: u64, sites: &[Site]) -> Result<Self, String> {
        let tracks: Vec<&Track> = sites.iter().map(|site| &site.track).collect();
        let field = WindField::invent(settings, seed, &tracks)?;
        let at_sites = tracks.iter().map(|track| field.along(track)).collect();
        let length_ms = settings.window_ms();
        let count = (settings.invented_length_ms() / length_ms) as usize;
        Ok(Self { at_sites, windows: Windows { start: field.start, length_ms, count }, field: Some(field) })
    }

    /// Samples the study's own wind: for each site the first input that serves it.
    pub(super) fn of_study(
        study: &Study,
        settings: &Settings,
        sites: &[Site],
        progress: &dyn Progress,
    ) -> Result<Self, Error> {
        if study.wind.is_empty() {
            return Err(Error::Lacking { study: study.path.clone(), section: "[[wind]]" });
        }
        let inputs = open_inputs(&Study { levels: Vec::new(), ..study.clone() })?;
        let mut found: Vec<Option<SiteWind>> = vec![None; sites.len()];
        for wind in &inputs.wind {
            for series in series_of(study, wind, sites, progress)? {
                let place = sites.iter().position(|site| site.id == series.site);
                if let Some(slot) = place.map(|place| &mut found[place]).filter(|slot| slot.is_none()) {
                    *slot = Some(site_wind(series));
                }
            }
        }
        let nothing =
            SiteWind { steps: Vec::new(), eastward_m_s: Vec::new(), northward_m_s: Vec::new(), max_gap_ms: 0 };
        let at_sites: Vec<SiteWind> = found.into_iter().map(|wind| wind.unwrap_or_else(|| nothing.clone())).collect();
        let windows = windows_within(settings, &at_sites).ok_or_else(|| StudyError::Lacking {
            path: study.path.clone(),
            problem: "the study's wind holds no window of `simulate.window_s` after `simulate.start`".to_owned(),
        })?;
        Ok(Self { field: None, at_sites, windows })
    }
}

/// The windows within the steps of the winds, and within the time of the settings where they state it.
fn windows_within(settings: &Settings, winds: &[SiteWind]) -> Option<Windows> {
    let first = winds.iter().filter_map(|wind| wind.steps.first()).min()?;
    let last = winds.iter().filter_map(|wind| wind.steps.last()).max()?;
    let length_ms = settings.window_ms();
    // Windows begin at whole multiples of their length, as an analyst's do.
    let start = settings.stated_start().unwrap_or(Instant((first.0 + length_ms - 1).div_euclid(length_ms) * length_ms));
    let asked_ms = settings.days.map_or(i64::MAX, |days| (days * 86_400_000.0) as i64);
    let count = (last.0 - start.0).min(asked_ms) / length_ms;
    (count > 0).then_some(Windows { start, length_ms, count: count as usize })
}

fn series_of(
    study: &Study,
    wind: &OpenWind,
    sites: &[Site],
    progress: &dyn Progress,
) -> Result<Vec<WindSeries>, Error> {
    match (&wind.grid, &wind.input.origin) {
        (Some(source), _) => Ok(sample_wind(source, sites, None, &study.matching.spatial, progress)?),
        (None, WindOrigin::Table { files, options, site, max_gap_ms }) => {
            let read = read_wind_table(files, options)?;
            let here = sites.iter().filter(|known| site.as_ref().is_none_or(|id| *id == known.id));
            Ok(here.map(|site| read.series(&wind.input.id, &site.id, *max_gap_ms)).collect())
        }
        (None, WindOrigin::Grid { .. }) => Ok(Vec::new()),
    }
}

/// A source that has only a speed counts as wind from one direction: its speed is then linear between steps.
fn site_wind(series: WindSeries) -> SiteWind {
    let (eastward_m_s, northward_m_s) = if series.has_components() {
        (series.eastward_m_s, series.northward_m_s)
    } else {
        let calm = vec![0.0; series.steps.len()];
        (series.scalar_speed_m_s, calm)
    };
    // A step without a value is no step; the gap rule then decides whether it is bridged, as for matchups.
    let mut kept = SiteWind {
        steps: Vec::new(),
        eastward_m_s: Vec::new(),
        northward_m_s: Vec::new(),
        max_gap_ms: series.max_gap_ms,
    };
    for ((step, eastward), northward) in series.steps.iter().zip(&eastward_m_s).zip(&northward_m_s) {
        if eastward.is_finite() && northward.is_finite() {
            kept.steps.push(*step);
            kept.eastward_m_s.push(*eastward);
            kept.northward_m_s.push(*northward);
        }
    }
    kept
}
