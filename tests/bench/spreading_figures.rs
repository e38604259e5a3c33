//! Draws every figure of the spreading comparison from a simulated deployment, to be looked at.

use super::deployments::{Deployment, Model, Obstacle, deployment};
use std::f64::consts::TAU;
use std::path::Path;
use underwind::model::{DirectionalSpectrum, SpectrumAxes};
use underwind::report::{
    AgainstPeak, Estimate, Figure, LobePath, LobePoint, MAP_HALF_SEPARATIONS_DEG, MAP_WIDTHS_DEG, OVERLAP_LABEL,
    OverlapMap, PeakCurve, PeakSeries, PolarSpectrum, RadiatedClass, RadiatedSpectra, TestabilityCell, TestabilityMap,
    TestabilitySite, against_peak, overlap_map, polar_spectrum, radiated_spectra, testability_map,
};
use underwind::science::simulate::{SeaSettings, model_spectrum, sea_steps};
use underwind::science::spreading::{LawTable, SpreadOptions, testability};
use underwind::science::waves::{
    Distribution, Radiator, ReduceOptions, Reducer, SpreadingLaw, TwoLobes, Water, WindOver, fit_two_lobes,
};

fn axes() -> SpectrumAxes {
    let frequency_hz = (0..36).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
    SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
}

fn curves(value: impl Fn(SpreadingLaw, f64) -> f64) -> Vec<PeakCurve> {
    let points = |law: SpreadingLaw| -> Vec<(f64, f64)> {
        let all = (0..120).map(|i| 0.7 * 1.03_f64.powi(i));
        all.filter(|x| *x < law.reaches_to()).map(|x| (x, value(law, x))).collect()
    };
    SpreadingLaw::ALL.iter().map(|law| PeakCurve { name: law.name().to_owned(), points: points(*law) }).collect()
}

fn overlap_figures(d: &Deployment) -> [Figure; 2] {
    let comparison = d.compare(&LawTable::new(1.0), &SpreadOptions::default());
    let implied = comparison.classes.iter().filter(|c| c.class.all_winds()).filter_map(|c| {
        let difference = c.difference?;
        let at = |extra: f64| c.model_overlap_db + extra;
        let (value, low, high) = (at(difference.difference_db), at(difference.low_db), at(difference.high_db));
        let estimate = if c.verdict.reason().is_none() {
            Estimate::value(value, low, high)
        } else {
            Estimate::Unresolved { value, low, high }
        };
        Some((c.median_x, estimate))
    });
    let model = comparison.classes.iter().filter(|c| c.class.all_winds() && c.used > 0);
    let model: Vec<_> = model.map(|c| (c.median_x, Estimate::point(c.model_overlap_db))).collect();
    let words: Vec<String> = comparison
        .classes
        .iter()
        .map(|c| c.words("E taken as known to 1 dB"))
        .filter(|w| w.starts_with("model"))
        .collect();
    let windows: Vec<(f64, f64)> = d.f_over_fp.iter().copied().zip(d.overlap_db.iter().copied()).collect();
    let base = AgainstPeak {
        title: "Overlap of opposing waves in the model".to_owned(),
        notes: vec![format!("reef, H1, {}; hourly windows", d.band.label())],
        label: OVERLAP_LABEL.to_owned(),
        windows_name: "model, by window".to_owned(),
        windows,
        curves: curves(|law, x| law.at(x, 1.0).overlap_db()),
        series: Vec::new(),
        open_name: "not identified".to_owned(),
        judged: Some((1.5, 2.6)),
        range: Some((-50.0, 6.0)),
    };
    let implied = AgainstPeak {
        title: "Overlap: model against sound".to_owned(),
        notes: words,
        windows: Vec::new(),
        series: vec![
            PeakSeries { name: "implied by the sound, 95 % interval".to_owned(), points: implied.collect() },
            PeakSeries { name: "model, median".to_owned(), points: model },
        ],
        ..base.clone()
    };
    [against_peak(&base), against_peak(&implied)]
}

fn lobe_figures() -> [Figure; 2] {
    let (axes, radiator) = (axes(), Radiator::default());
    let settings = SeaSettings { law: SpreadingLaw::DonelanBanner, ..SeaSettings::default() };
    let step = sea_steps(&[9.0; 20], &[4.0; 20], 1.0, &settings, &radiator)[19];
    let mut density = vec![0.0; axes.cells()];
    model_spectrum(&step, &settings, &axes, &mut density);
    let spectrum = DirectionalSpectrum::new(&axes, &density).unwrap();
    let fits: Vec<(f64, TwoLobes)> = (0..axes.frequencies())
        .filter_map(|k| Some((axes.frequency_hz[k] / step.spectrum.peak_hz, fit_two_lobes(&axes, spectrum.row(k))?)))
        .filter(|(x, _)| *x > 0.8 && *x < 8.0)
        .collect();
    let ewans = |x: f64| match SpreadingLaw::Ewans1998.at(x, 1.0) {
        Distribution::TwoLobe { half_separation_rad, width_rad } => {
            (half_separation_rad.to_degrees(), width_rad.to_degrees())
        }
        _ => (f64::NAN, f64::NAN),
    };
    let separation = AgainstPeak {
        title: "Two lobes: angle of each from the middle".to_owned(),
        notes: vec!["One spectrum; open where the fitted lobes merge into one maximum".to_owned()],
        label: "Half of the angle between the lobes (degrees)".to_owned(),
        windows_name: String::new(),
        windows: Vec::new(),
        curves: vec![PeakCurve {
            name: "Ewans 1998".to_owned(),
            points: (0..80).map(|i| 1.0 + 6.0 * f64::from(i) / 79.0).map(|x| (x, ewans(x).0)).collect(),
        }],
        series: vec![PeakSeries {
            name: "model".to_owned(),
            points: fits
                .iter()
                .map(|(x, fit)| {
                    let value = fit.half_separation_rad.to_degrees();
                    let (low, high) = (f64::NAN, f64::NAN);
                    (
                        *x,
                        if fit.two_maxima() {
                            Estimate::point(value)
                        } else {
                            Estimate::Unresolved { value, low, high }
                        },
                    )
                })
                .collect(),
        }],
        open_name: "the lobes merge into one maximum".to_owned(),
        judged: None,
        range: Some((0.0, 95.0)),
    };
    let (columns, rows) = (60, 40);
    let between =
        |(low, high): (f64, f64), i: usize, count: usize| low + (high - low) * (i as f64 + 0.5) / count as f64;
    let map = OverlapMap {
        title: "Overlap of two equal lobes".to_owned(),
        notes: Vec::new(),
        overlap_db: (0..columns)
            .map(|i| {
                let half = between(MAP_HALF_SEPARATIONS_DEG, i, columns).to_radians();
                (0..rows)
                    .map(|j| {
                        let width_rad = between(MAP_WIDTHS_DEG, j, rows).to_radians();
                        Distribution::TwoLobe { half_separation_rad: half, width_rad }.overlap_db()
                    })
                    .collect()
            })
            .collect(),
        paths: vec![
            LobePath {
                name: "model".to_owned(),
                points: fits
                    .iter()
                    .map(|(x, fit)| LobePoint {
                        x: *x,
                        half_separation_deg: fit.half_separation_rad.to_degrees(),
                        width_deg: fit.width_rad.to_degrees(),
                    })
                    .collect(),
            },
            LobePath {
                name: "Ewans 1998".to_owned(),
                points: (2..14)
                    .map(|i| 0.5 * f64::from(i))
                    .map(|x| LobePoint { x, half_separation_deg: ewans(x).0, width_deg: ewans(x).1 })
                    .collect(),
            },
        ],
    };
    [against_peak(&separation), overlap_map(&map)]
}

fn polar_figure() -> Figure {
    let (axes, radiator) = (axes(), Radiator::default());
    let settings = SeaSettings {
        law: SpreadingLaw::Ewans1998,
        swell_hs_m: 1.2,
        swell_peak_hz: 0.08,
        swell_from_deg: 20.0,
        ..SeaSettings::default()
    };
    let step = sea_steps(&[7.0; 20], &[5.0; 20], 1.0, &settings, &radiator)[19];
    let mut density = vec![0.0; axes.cells()];
    model_spectrum(&step, &settings, &axes, &mut density);
    let wind = WindOver { speed_m_s: 8.6, from_deg: 234.5 };
    let reducer = Reducer::new(&axes, &Water::default(), ReduceOptions::default());
    let state = reducer.sea_state(DirectionalSpectrum::new(&axes, &density).unwrap(), Some(wind)).unwrap();
    polar_spectrum(&PolarSpectrum {
        title: "Wave spectrum at reef".to_owned(),
        notes: vec![format!("2031-01-09 06:00 UTC, significant height {:.1} m", state.hs_m)],
        axes,
        density_m2_hz_rad: density,
        wind: Some((wind.speed_m_s, wind.from_deg)),
        wind_sea_peak_hz: state.wind_sea.map(|sea| sea.peak_hz),
        highest_hz: 0.8,
    })
}

fn testability_figure(d: &Deployment) -> Figure {
    let month_of = |ms: i64| (2031, 1 + (ms / (31 * 86_400_000)) as u32);
    let found = testability(&d.windows(), &d.model("m"), &LawTable::new(1.0), &SpreadOptions::default(), month_of);
    let row = |shift: usize| -> Vec<TestabilityCell> {
        found
            .iter()
            .map(|m| TestabilityCell {
                share: m.share() / (1.0 + shift as f64),
                reason: m.reasons.first().map_or(String::new(), |(why, _)| why.name().replace('_', " ")),
            })
            .collect()
    };
    testability_map(&TestabilityMap {
        title: "In how many hours could sound judge the model's spreading?".to_owned(),
        notes: vec!["Share of hours; below it what kept most of the others out".to_owned()],
        sites: vec![TestabilitySite {
            name: "reef, H1".to_owned(),
            bands_hz: vec![0.794, 1.0, 1.26],
            months: found.iter().map(|m| format!("{}-{:02}", m.month.0, m.month.1)).collect(),
            cells: (0..3).map(row).collect(),
        }],
    })
}

fn spectra_figure() -> Figure {
    let class = |i: i32, name: &str| RadiatedClass {
        name: name.to_owned(),
        count: 1000 - 200 * i as usize,
        measured_db: (0..14)
            .map(|k| {
                let radiated =
                    112.0 - 6.5 * f64::from(k) - 8.0 * f64::from((3 - i).max(0)) / (1.0 + 0.4 * f64::from(k));
                10.0 * (10f64.powf(radiated / 10.0) + 10f64.powf(6.2)).log10()
            })
            .collect(),
        radiated_db: (0..14)
            .map(|k| 111.0 - 6.5 * f64::from(k) - 10.0 * f64::from((3 - i).max(0)) / (1.0 + 0.4 * f64::from(k)))
            .collect(),
        tail_from: 10 - 2 * i as usize,
    };
    radiated_spectra(&RadiatedSpectra {
        title: "Measured and radiated spectra by wind".to_owned(),
        notes: vec!["reef, H1".to_owned()],
        level_label: "Spectral density level (dB re 1 µPa² Hz⁻¹)".to_owned(),
        frequency_hz: (0..14).map(|k| 0.5 * 10f64.powf(f64::from(k) / 10.0)).collect(),
        classes: ["below 5 m/s", "5 to 8 m/s", "8 to 12 m/s", "above 12 m/s"]
            .iter()
            .enumerate()
            .map(|(i, name)| class(i as i32, name))
            .collect(),
    })
}

/// Writes all of them as PNG into a folder.
pub(crate) fn draw(folder: &Path) {
    std::fs::create_dir_all(folder).unwrap();
    let d = deployment(21, Model::Narrow, Obstacle::None, 8760);
    let [overlap, implied] = overlap_figures(&d);
    let [lobes, map] = lobe_figures();
    for (name, figure) in [
        ("overlap", overlap),
        ("implied", implied),
        ("lobes", lobes),
        ("overlap_map", map),
        ("polar", polar_figure()),
        ("testability", testability_figure(&d)),
        ("spectra", spectra_figure()),
    ] {
        std::fs::write(folder.join(format!("{name}.png")), figure.png(1.5).unwrap()).unwrap();
    }
}
