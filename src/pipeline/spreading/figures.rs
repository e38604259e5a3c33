//! Figures of the spreading comparison.

use crate::config::Study;
use crate::model::{BandSea, LevelKind, RadiationFlag, SensorRecord, SensorSpreading, SpreadVerdict};
use crate::pipeline::matching::Matched;
use crate::pipeline::reporting::Placed;
use crate::pipeline::reporting::words::{file_part, level_label};
use crate::report::{
    AgainstPeak, Estimate, OVERLAP_LABEL, PeakCurve, PeakSeries, RadiatedClass, RadiatedSpectra, TestabilityCell,
    TestabilityMap, TestabilitySite, against_peak, radiated_spectra, testability_map,
};
use crate::science::waves::SpreadingLaw;
use std::f64::consts::TAU;

/// Windows that a cloud of overlaps shows at most: every n-th one is taken.
const MOST_WINDOWS: usize = 20_000;
/// Sensors on one map of testability.
const SITES_A_SHEET: usize = 4;

/// The figures, in the order of the page.
pub(in crate::pipeline) struct SpreadFigures {
    /// Where and when sound could judge, one a model.
    pub testability: Vec<Placed>,
    /// For each sensor: overlap, then spectra, one of each a model.
    pub of_sensors: Vec<Vec<Placed>>,
}

/// Draws the figures of all sensors.
pub(in crate::pipeline) fn spread_figures(study: &Study, matched: &Matched, all: &[SensorSpreading]) -> SpreadFigures {
    let models: Vec<&str> = study.spectra.iter().map(|input| input.id.0.as_str()).collect();
    // A sheet a few sites, so that a figure stays a page.
    let testability = models
        .iter()
        .flat_map(|model| {
            all.chunks(SITES_A_SHEET).enumerate().map(move |(sheet, some)| testability(model, sheet, some))
        })
        .collect();
    let of_sensors = all
        .iter()
        .map(|sensor| {
            let found = matched.records.iter().position(|r| r.site == sensor.site && r.sensor == sensor.sensor);
            let Some(number) = found else { return Vec::new() };
            let record = &matched.records[number];
            let mut figures = Vec::new();
            for (input, model) in models.iter().enumerate() {
                let windows = 0..record.windows.len();
                let conditions = &matched.conditions[number];
                let Some(rows) = matched.sea.rows(study, record, number, input, conditions, windows) else { continue };
                figures.push(overlap(study, record, sensor, model, &rows.bands));
                figures.push(spectra(study, matched, number, sensor, model, &rows.bands));
            }
            figures
        })
        .collect();
    SpreadFigures { testability, of_sensors }
}

fn testability(model: &str, sheet: usize, all: &[SensorSpreading]) -> Placed {
    let sites = all
        .iter()
        .map(|sensor| {
            let rows: Vec<_> = sensor.testability.iter().filter(|(of, _)| of == model).map(|(_, t)| t).collect();
            let mut bands_hz: Vec<f64> = rows.iter().map(|t| t.band.centre_hz).collect();
            bands_hz.dedup_by(|a, b| a.total_cmp(b).is_eq());
            let mut months: Vec<(i32, u32)> = rows.iter().map(|t| t.month).collect();
            months.sort_unstable();
            months.dedup();
            let cell = |band: f64, month: (i32, u32)| {
                let of = rows.iter().find(|t| t.band.centre_hz.total_cmp(&band).is_eq() && t.month == month);
                TestabilityCell {
                    share: of.map_or(f64::NAN, |t| t.share()),
                    reason: of
                        .and_then(|t| t.reasons.first())
                        .map_or(String::new(), |(why, _)| why.name().replace('_', " ")),
                }
            };
            TestabilitySite {
                name: format!("{}, sensor {}", sensor.site, sensor.sensor),
                cells: bands_hz.iter().map(|band| months.iter().map(|month| cell(*band, *month)).collect()).collect(),
                months: months.iter().map(|(year, month)| format!("{year:04}-{month:02}")).collect(),
                bands_hz,
            }
        })
        .collect();
    let figure = testability_map(&TestabilityMap {
        title: format!("Where and when sound could judge spreading: spectra {model}"),
        notes: vec!["Share of the hours of each month; below, what kept most others out.".to_owned()],
        sites,
    });
    Placed {
        name: format!("testability_{}_{}", file_part(model), sheet + 1),
        caption: format!(
            "Share of the hours in which sound could judge the spreading of {model}, by month and band of sound."
        ),
        figure,
    }
}

fn overlap(study: &Study, record: &SensorRecord, sensor: &SensorSpreading, model: &str, rows: &[BandSea]) -> Placed {
    let bands = record.bands.len().max(1);
    let compared = |k: usize| study.spreading.compares(record.bands[k % bands].band.centre_hz);
    let cloud: Vec<(f64, f64)> = rows
        .iter()
        .enumerate()
        .filter(|(k, sea)| compared(*k) && sea.f_over_fp.is_finite() && sea.overlap_2pi_per_rad > 0.0)
        .filter(|(_, sea)| sea.radiated.is_ok_and(|level| !level.has(RadiationFlag::Blended)))
        .map(|(_, sea)| (sea.f_over_fp, 10.0 * libm::log10(TAU * sea.overlap_2pi_per_rad)))
        .collect();
    let every = cloud.len().div_ceil(MOST_WINDOWS).max(1);
    let curves = SpreadingLaw::ALL
        .iter()
        .map(|law| PeakCurve {
            name: law.name().replace('_', " "),
            points: (0..=60)
                .map(|k| libm::pow(10.0, f64::from(k) / 60.0 * libm::log10(law.reaches_to())))
                .map(|x| (x, law.at(x, 1.0).overlap_db()))
                .collect(),
        })
        .collect();
    let points = sensor
        .comparisons
        .iter()
        .filter(|comparison| comparison.model == model)
        .flat_map(|comparison| &comparison.classes)
        .filter(|class| class.class.all_winds())
        .filter_map(|class| {
            let (implied, d) = (class.implied_overlap_db()?, class.difference?);
            let (low, high) = (implied + d.low_db - d.difference_db, implied + d.high_db - d.difference_db);
            let estimate = match class.verdict {
                SpreadVerdict::NotIdentified(_) => Estimate::Unresolved { value: implied, low, high },
                _ => Estimate::Value { value: implied, low, high },
            };
            Some((class.median_x, estimate))
        })
        .collect();
    let options = &study.spreading.options;
    let figure = against_peak(&AgainstPeak {
        title: format!("Overlap of opposing waves at {}: spectra {model}", record.site),
        notes: vec!["Shade: windows of the model, all compared bands. Marks: what the sound implies where the density is right, with 95 % intervals.".to_owned()],
        label: OVERLAP_LABEL.to_owned(),
        windows_name: format!("{model}, by window"),
        windows: cloud.into_iter().step_by(every).collect(),
        curves,
        series: vec![PeakSeries { name: "implied by sound".to_owned(), points }],
        open_name: "not identified".to_owned(),
        judged: Some((options.least_x, options.reference().x_low)),
        range: Some((-40.0, 10.0)),
    });
    Placed {
        name: format!("overlap_{}_{}_{}", file_part(&record.site), file_part(&record.sensor), file_part(model)),
        caption: format!(
            "Overlap of opposing waves against f / fp of the wind sea at {}, of the model {model}, of published laws, and as the sound implies it.",
            record.site
        ),
        figure,
    }
}

fn spectra(
    study: &Study,
    matched: &Matched,
    number: usize,
    sensor: &SensorSpreading,
    model: &str,
    rows: &[BandSea],
) -> Placed {
    let record = &matched.records[number];
    let bands: Vec<usize> =
        (0..record.bands.len()).filter(|k| study.spreading.compares(record.bands[*k].band.centre_hz)).collect();
    let offset = |band: usize| {
        let centre = record.bands[band].band;
        let of = sensor.comparisons.iter().find(|c| c.model == model && c.band == centre);
        of.and_then(|c| c.reference).map_or(0.0, |reference| reference.offset_db)
    };
    let seas = &matched.sea.conditions[number];
    let wind_id = seas.iter().find(|sea| sea.source.0 == model).and_then(|sea| sea.wind.as_ref());
    let wind = matched.conditions[number].iter().find(|conditions| Some(&conditions.source) == wind_id);
    let edges = &study.report.wind_class_edges_m_s;
    let classes = (0..=edges.len())
        .map(|k| {
            let (low, high) = (if k == 0 { 0.0 } else { edges[k - 1] }, edges.get(k).copied().unwrap_or(f64::INFINITY));
            let inside: Vec<usize> = (0..record.windows.len())
                .filter(|w| {
                    wind.and_then(|wind| wind.wind[*w].as_ref())
                        .is_some_and(|wind| (low..high).contains(&wind.speed_mean_m_s))
                })
                .collect();
            let median = |values: Vec<f64>| {
                let known: Vec<f64> = values.into_iter().filter(|value| value.is_finite()).collect();
                crate::numerics::quantile::median(&known)
            };
            let of_band = |band: usize| inside.iter().map(move |w| &rows[w * record.bands.len() + band]);
            let in_tail = |band: usize| {
                let tail = of_band(band)
                    .filter(|sea| {
                        sea.radiated.is_ok_and(|l| l.has(RadiationFlag::Tail) || l.has(RadiationFlag::Extended))
                    })
                    .count();
                2 * tail > inside.len()
            };
            RadiatedClass {
                name: if high.is_finite() { format!("{low} to {high} m/s") } else { format!("above {low} m/s") },
                count: inside.len(),
                measured_db: bands
                    .iter()
                    .map(|band| median(inside.iter().map(|w| record.bands[*band].level_db[*w]).collect()))
                    .collect(),
                radiated_db: bands
                    .iter()
                    .map(|band| {
                        median(of_band(*band).map(|sea| sea.radiated_db(record, *band)).collect()) + offset(*band)
                    })
                    .collect(),
                tail_from: bands.iter().position(|band| in_tail(*band)).unwrap_or(bands.len()),
            }
        })
        .collect();
    let figure = radiated_spectra(&RadiatedSpectra {
        title: format!("Measured and radiated levels at {}, sensor {}: spectra {model}", record.site, record.sensor),
        notes: vec!["Medians by class of wind; radiated with the site offset where one was found.".to_owned()],
        level_label: level_label(record.kind).to_owned(),
        frequency_hz: bands.iter().map(|band| record.bands[*band].band.centre_hz).collect(),
        classes,
    });
    let unit = if record.kind == LevelKind::BandLevel { "band levels" } else { "spectral density levels" };
    Placed {
        name: format!("radiated_{}_{}_{}", file_part(&record.site), file_part(&record.sensor), file_part(model)),
        caption: format!(
            "Measured {unit} at {} and what opposing waves of {model} radiate, by class of wind.",
            record.site
        ),
        figure,
    }
}
