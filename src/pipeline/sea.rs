//! Directional spectra brought to the sensors' windows.

use super::inputs::{Inputs, OpenSpectra};
use super::progress::Progress;
use super::spectra_sampling::{SpectraRules, sample_spectra, wind_over};
use crate::Error;
use crate::config::Study;
use crate::model::{
    Band, BandSea, Conditions, Sampled, SeaConditions, SeaRows, SeaSummary, SensorRecord, SourceId, SpectraSeries,
    WindSeries,
};
use crate::science::waves::{RadiatedBands, ReduceOptions, Reducer, WindOver, WindowSea, band_seas, sea_over_windows};
use crate::units::Window;
use std::ops::Range;

/// The sea of all spectra inputs at all sites.
#[derive(Debug, Default)]
pub struct Sea {
    /// By input (in the study's order) and site.
    pub series: Vec<SpectraSeries>,
    /// For each record, the sea of each input over its windows.
    pub conditions: Vec<Vec<SeaConditions>>,
}

/// The wind input that tells wind sea from swell for a spectra input: the one that it names, else the first.
fn wind_of(study: &Study, spectra: &OpenSpectra) -> Option<SourceId> {
    match &spectra.input.wind {
        Some(name) => Some(SourceId(name.clone())),
        None => study.wind.first().map(|wind| wind.id.clone()),
    }
}

/// Samples all spectra inputs at the sites and brings them to the windows of the records.
///
/// # Errors
/// When a file cannot be read.
pub(super) fn bring_sea(
    study: &Study,
    inputs: &Inputs,
    records: &[SensorRecord],
    winds: &[WindSeries],
    conditions: &[Vec<Conditions>],
    whole: Option<Window>,
    progress: &dyn Progress,
) -> Result<Sea, Error> {
    let mut sea = Sea { series: Vec::new(), conditions: vec![Vec::new(); records.len()] };
    for spectra in &inputs.spectra {
        let wind = wind_of(study, spectra);
        let of_site: Vec<Option<&WindSeries>> = inputs
            .sites
            .iter()
            .map(|site| winds.iter().find(|series| Some(&series.source) == wind.as_ref() && series.site == site.id))
            .collect();
        let rules = rules(study, spectra.input.tail_start_hz);
        let series = sample_spectra(&spectra.source, &inputs.sites, &of_site, whole, &rules, progress)?;
        for (k, record) in records.iter().enumerate() {
            let Some(here) = series.iter().find(|series| series.site == record.site) else { continue };
            let over = conditions[k].iter().find(|conditions| Some(&conditions.source) == wind.as_ref());
            let seas = seas(study, here, record, over, 0..record.windows.len());
            sea.conditions[k].push(summary(here, wind.as_ref(), &seas));
        }
        sea.series.extend(series);
    }
    Ok(sea)
}

fn rules(study: &Study, tail_start_hz: Option<f64>) -> SpectraRules {
    SpectraRules {
        water: study.spreading.radiator.water,
        reduce: ReduceOptions { tail_start_hz, ..ReduceOptions::default() },
        spatial: study.matching.spatial,
    }
}

/// The sea over a run of a record's windows.
fn seas(
    study: &Study,
    series: &SpectraSeries,
    record: &SensorRecord,
    wind: Option<&Conditions>,
    windows: Range<usize>,
) -> Vec<Sampled<WindowSea>> {
    let rules = rules(study, None);
    let reducer = Reducer::new(&series.axes, &rules.water, rules.reduce);
    let first = windows.start;
    sea_over_windows(series, &reducer, &record.windows[windows], |k| -> Option<WindOver> {
        wind_over(wind?.wind[first + k].as_ref()?)
    })
}

fn summary(series: &SpectraSeries, wind: Option<&SourceId>, seas: &[Sampled<WindowSea>]) -> SeaConditions {
    SeaConditions {
        source: series.source.clone(),
        wind: wind.cloned(),
        sea: seas
            .iter()
            .map(|sea| {
                let state = &sea.value()?.state;
                Some(SeaSummary {
                    hs_m: state.hs_m,
                    peak_hz: state.peak_hz,
                    tm01_s: state.tm01_s,
                    mean_from_deg: state.mean_from_deg,
                    spread_deg: state.spread_deg,
                    wind_sea: state.wind_sea,
                    swell_hs_m: state.swell_hs_m,
                    tail_start_hz: state.tail_start_hz.unwrap_or(f64::NAN),
                })
            })
            .collect(),
        flags: seas.iter().map(Sampled::flags).collect(),
        missing: seas.iter().map(Sampled::missing).collect(),
        nearest_km: series.nearest_km.iter().copied().fold(f64::NAN, f64::min),
    }
}

impl Sea {
    /// The sea at half of the frequency of each band of a record for a run of windows, by one input (`input`: its place in
    /// the study).
    pub(super) fn rows<'a>(
        &'a self,
        study: &Study,
        record: &SensorRecord,
        number: usize,
        input: usize,
        conditions: &[Conditions],
        windows: Range<usize>,
    ) -> Option<SeaRows<'a>> {
        let of_record = self.conditions.get(number)?.get(input)?;
        let series =
            self.series.iter().find(|series| series.source == of_record.source && series.site == record.site)?;
        let wind = conditions.iter().find(|conditions| Some(&conditions.source) == of_record.wind.as_ref());
        let bands: Vec<Band> = record.bands.iter().map(|band| band.band).collect();
        let settings = study.spreading.band_settings(record.depth_m);
        // Beyond the waves that gravity rules the formula says nothing.
        let reach = bands.iter().take_while(|band| band.centre_hz <= study.spreading.highest_hz).count();
        let mut radiating = RadiatedBands::new(&series.axes, &study.spreading.radiator, &bands[..reach], settings);
        let mut rows = Vec::with_capacity(windows.len() * bands.len());
        let mut room = Vec::new();
        for sea in seas(study, series, record, wind, windows) {
            match sea.value() {
                Some(sea) => band_seas(sea, &series.axes, &bands, &mut radiating, &mut room, &mut rows),
                None => rows.resize(rows.len() + bands.len(), BandSea::NONE),
            }
        }
        Some(SeaRows { conditions: of_record, bands: rows })
    }
}
