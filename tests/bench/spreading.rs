//! `cargo bench --bench spreading -- [RUNS]`: the long simulation study of the spreading comparison. Deployments of a year with a
//! random law, band, wind climate, site offset of up to 6 dB, density error of 1 dB and a floor that crosses the band.
//! `cargo bench --bench spreading -- figures FOLDER` draws every figure of the comparison; `-- speed` times
//! the reductions of a year of spectra.

#![expect(clippy::unwrap_used, clippy::print_stdout, reason = "a program for developers")]

#[path = "../integration/spreading/deployments.rs"]
mod deployments;
#[path = "spreading_figures.rs"]
mod figures;

use deployments::{Model, Obstacle, tally};
use std::time::Instant;
use underwind::model::{Band, DirectionalSpectrum, NotRadiated, SpectrumAxes};
use underwind::science::simulate::{SeaSettings, model_spectrum, sea_steps};
use underwind::science::waves::{
    BandSettings, MomentTables, Moments, Opposing, OpposingOptions, RadiatedBands, Radiator, SeaSurvey, StepOverlap,
    Surveyor, Water, WindOver, blend_nodes, pair_overlap, step_overlap,
};

/// A year of 3-hourly spectra at 20 sites, four nodes each: moments, overlap of every step and pair, levels of ten bands.
fn speed() {
    let frequency_hz = (0..30).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
    let directions = (0..36).map(|i| f64::from(i) * std::f64::consts::TAU / 36.0).collect();
    let axes = SpectrumAxes::new(frequency_hz, None, directions).unwrap();
    let spectra: Vec<Vec<f32>> = (0..8)
        .map(|node| (0..axes.cells()).map(|cell| 1e-3 + ((cell * 37 + node * 91) % 101) as f32).collect())
        .collect();
    let tables = MomentTables::new(&axes, &Water::default());
    let opposing = Opposing::new(&axes);
    let bands: Vec<Band> = (0..10)
        .map(|n| 0.3 * 10f64.powf(f64::from(n) / 10.0))
        .map(|f| Band::from_edges(f * 0.891, f * 1.122).unwrap())
        .collect();
    let mut radiated = RadiatedBands::new(&axes, &Radiator::default(), &bands, BandSettings::default());
    let (mut blended, mut before) = (vec![0.0; axes.cells()], vec![0.0; axes.cells()]);
    let (mut moments, mut step) = (Moments::zeros(30), StepOverlap::with_frequencies(30));
    let (mut pairs, mut levels) = (vec![0.0; 30], vec![Err(NotRadiated::NoSpectrum); 10]);
    let mut parts = [0.0; 4];
    let mut sum = 0.0;
    for site in 0..20 {
        for at in 0..2920_usize {
            let nodes: [(&[f32], f64); 4] = std::array::from_fn(|n| (spectra[(site + at + n) % 8].as_slice(), 0.25));
            let clock = Instant::now();
            blend_nodes(&nodes, &mut blended);
            parts[0] += clock.elapsed().as_secs_f64();
            let clock = Instant::now();
            let wind = WindOver { speed_m_s: 9.0, from_deg: 200.0 };
            tables.moments(DirectionalSpectrum::new(&axes, &blended).unwrap(), Some(wind), &mut moments);
            parts[1] += clock.elapsed().as_secs_f64();
            let clock = Instant::now();
            step_overlap(&opposing, &nodes, &blended, &mut step);
            pair_overlap(&opposing, &before, &blended, &mut pairs);
            parts[2] += clock.elapsed().as_secs_f64();
            let clock = Instant::now();
            radiated.levels(&step.total, None, &mut levels);
            parts[3] += clock.elapsed().as_secs_f64();
            sum += moments.density[3] + pairs[3] + levels[3].map_or(0.0, |l| l.band_level_db);
            std::mem::swap(&mut before, &mut blended);
        }
    }
    println!(
        "20 sites x 2920 steps x 4 nodes, 30 x 36: blend {:.2} s, moments {:.2} s, overlaps {:.2} s, levels of ten bands {:.2} s ({sum:.3e})",
        parts[0], parts[1], parts[2], parts[3]
    );
}

/// A look at stored spectra: single seas, and a swell under them.
fn survey_speed() {
    let frequency_hz = (0..36).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
    let directions = (0..36).map(|i| f64::from(i) * std::f64::consts::TAU / 36.0).collect();
    let axes = SpectrumAxes::new(frequency_hz, None, directions).unwrap();
    for swell_hs_m in [0.0, 1.0] {
        let settings = SeaSettings { swell_hs_m, ..SeaSettings::default() };
        let hours = 400;
        let (east, north): (Vec<f64>, Vec<f64>) =
            (0..hours).map(|h| (f64::from(h) / 9.0).sin_cos()).map(|(s, c)| (8.0 * s, 8.0 * c)).unzip();
        let steps = sea_steps(&east, &north, 1.0, &settings, &Radiator::default());
        let spectra: Vec<Vec<f64>> = steps
            .iter()
            .map(|step| {
                let mut density = vec![0.0; axes.cells()];
                model_spectrum(step, &settings, &axes, &mut density);
                density
            })
            .collect();
        let surveyor = Surveyor::new(&axes, &Water::default(), OpposingOptions::default());
        let (mut survey, mut moments) = (SeaSurvey::new(&axes), Moments::zeros(36));
        let clock = Instant::now();
        for (step, density) in spectra.iter().enumerate() {
            let wind = WindOver { speed_m_s: 8.0, from_deg: steps[step].to_rad.to_degrees() + 180.0 };
            let spectrum = DirectionalSpectrum::new(&axes, density).unwrap();
            surveyor.look(step, spectrum, Some(wind), &mut moments, &mut survey);
        }
        let each_us = 1e6 * clock.elapsed().as_secs_f64() / f64::from(hours);
        println!("swell of {swell_hs_m} m: {each_us:.1} us a spectrum, {} events", survey.events.len());
    }
}

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| argument != "--bench").collect();
    if let [word, folder] = &arguments[..]
        && word == "figures"
    {
        figures::draw(std::path::Path::new(folder));
        return;
    }
    if arguments.first().is_some_and(|word| word == "speed") {
        speed();
        survey_speed();
        return;
    }
    let runs: u64 = arguments.iter().find_map(|argument| argument.parse().ok()).unwrap_or(200);
    println!("{runs} deployments a line, hourly for a year; classes over all winds");
    let cases = [
        (Model::Narrow, Obstacle::None, 1.5),
        (Model::Right, Obstacle::None, 1.5),
        (Model::Wide, Obstacle::None, 1.5),
        (Model::Narrow, Obstacle::None, 2.0),
        (Model::Right, Obstacle::None, 2.0),
        (Model::Wide, Obstacle::None, 2.0),
        // What cannot be identified: tail only, floor, no reference, and where laws agree.
        (Model::Narrow, Obstacle::Tail, 1.5),
        (Model::Narrow, Obstacle::Floor, 1.5),
        (Model::Narrow, Obstacle::NoReference, 1.5),
        (Model::Narrow, Obstacle::None, 3.0),
        (Model::Narrow, Obstacle::None, 4.0),
    ];
    for (at, (model, obstacle, low)) in cases.into_iter().enumerate() {
        let first = 1_000_000 * at as u64;
        let t = tally(first..first + runs, model, obstacle, 8760, low);
        println!(
            "model {model:?}, obstacle {obstacle:?}, from {low} fp: too narrow {}, agrees {}, too wide {}, not identified {}; \
             covered {} of {} ({:.1} %), mean half-width {:.1} dB; {} of {} with a true difference of 1.5 half-widths told",
            t.narrow,
            t.agrees,
            t.wide,
            t.not_identified,
            t.covered,
            t.judged,
            100.0 * t.covered as f64 / t.judged.max(1) as f64,
            t.half_width_db,
            t.told,
            t.far
        );
    }
}
