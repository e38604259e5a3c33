//! Simulated deployments with known spreading: a year of wind, a sea that follows it, a model of that sea whose spreading is
//! too narrow, right or too wide, and levels measured over an unknown bottom and an audible floor. Shared with the bench.

use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use std::f64::consts::{PI, TAU};
use underwind::model::{Band, BandComparison, BandScheme, NotRadiated, Radiated, RadiationFlag, SpectrumAxes};
use underwind::science::spreading::{BandFloor, BandWindows, LawTable, ModelWindows, SpreadOptions, compare};
use underwind::science::waves::{BandSettings, RadiatedBands, Radiator, SpreadingLaw, Water, WindSeaSpectrum};
use underwind::units::Hertz;

/// How the model's spreading differs from the sea's.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Model {
    Narrow,
    Right,
    Wide,
}

/// What keeps a deployment from being judged, if anything.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Obstacle {
    None,
    /// The model's tail begins at 2.5 times the mean frequency: no reference outside it.
    Tail,
    /// The floor covers the class under test.
    Floor,
    /// Winds so light that f / fp never comes above 4.
    NoReference,
}

/// One deployment as drawn.
#[derive(Debug, Clone)]
pub(crate) struct Deployment {
    pub(crate) band: Band,
    pub(crate) times_ms: Vec<i64>,
    pub(crate) level_db: Vec<f64>,
    pub(crate) wind_m_s: Vec<f64>,
    pub(crate) floor_db: f64,
    pub(crate) radiated: Vec<Radiated>,
    pub(crate) f_over_fp: Vec<f64>,
    pub(crate) overlap_db: Vec<f64>,
    /// Band level that the sea's overlap radiates over that of the model's, for the same density, window by window, dB.
    pub(crate) true_difference_db: Vec<f64>,
}

struct Draw(ChaCha8Rng);

impl Draw {
    fn uniform(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.0.random::<f64>()
    }

    fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.0.random::<f64>()).ln()).sqrt();
        radius * (TAU * self.0.random::<f64>()).cos()
    }

    /// Standard normal series of first order; memory in steps.
    fn series(&mut self, count: usize, memory: f64) -> Vec<f64> {
        let kept = (-1.0 / memory).exp();
        let mut value = self.normal();
        (0..count)
            .map(|_| {
                value = kept * value + (1.0 - kept * kept).sqrt() * self.normal();
                value
            })
            .collect()
    }
}

/// Overlap against f / fp in a table (dB re isotropic): the closed forms are slow.
struct Course(Vec<f64>);

impl Course {
    const LOW: f64 = 0.2;
    const HIGH: f64 = 30.0;
    const POINTS: usize = 400;

    fn new(law: SpreadingLaw, narrowing: f64) -> Self {
        let ratio = (Self::HIGH / Self::LOW).powf(1.0 / (Self::POINTS - 1) as f64);
        let at = |i: usize| {
            let x = Self::LOW * ratio.powi(i as i32);
            // Not narrower than what bins of 10 degrees could hold.
            law.at(x.min(7.0), 1.0).narrowed(narrowing).overlap_db().max(-120.0)
        };
        Self((0..Self::POINTS).map(at).collect())
    }

    fn db(&self, x: f64) -> f64 {
        let position = (x / Self::LOW).ln() / (Self::HIGH / Self::LOW).ln() * (Self::POINTS - 1) as f64;
        let position = position.clamp(0.0, (Self::POINTS - 1) as f64 - 1e-9);
        let below = position as usize;
        let share = position - below as f64;
        self.0[below] * (1.0 - share) + self.0[below + 1] * share
    }
}

/// 0 in the classes under test, 1 in the reference.
fn far_above_peak(x: f64) -> f64 {
    1.0 / (1.0 + (-(x - 3.5) / 0.15).exp())
}

fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted[sorted.len() / 2]
}

/// Band level that a sea radiates, by a fine sum over the band, dB re 1 uPa^2.
fn fine_level_db(radiator: &Radiator, band: Band, spectrum: &WindSeaSpectrum, course: &Course, extra_db: f64) -> f64 {
    let parts = 12;
    let width_hz = band.width_hz() / f64::from(parts);
    let power: f64 = (0..parts)
        .map(|i| {
            let sound_hz = band.low_hz + (f64::from(i) + 0.5) * width_hz;
            let e = spectrum.density_m2_hz(0.5 * sound_hz);
            let overlap_db = course.db(0.5 * sound_hz / spectrum.peak_hz) + extra_db;
            radiator.density_pa2_hz(sound_hz, e * e * 10f64.powf(0.1 * overlap_db) / TAU) * width_hz
        })
        .sum();
    10.0 * (1e12 * power).log10()
}

/// Standard uncertainty of the model's density between the classes under test and the reference, dB.
const DENSITY_SD_DB: f64 = 1.0;
/// Standard deviation of the sea's overlap about the model's in the reference class, dB: published laws differ there by 3 dB
/// (taken as half of a 95 % interval).
const REFERENCE_LAW_SD_DB: f64 = 1.5;

/// Draws a deployment of `hours` hourly windows.
pub(crate) fn deployment(seed: u64, model: Model, obstacle: Obstacle, hours: usize) -> Deployment {
    let mut draw = Draw(ChaCha8Rng::seed_from_u64(seed));
    let water = Water::default();
    let radiator = Radiator::default();
    let law = SpreadingLaw::ALL[draw.uniform(0.0, 4.0) as usize];
    let narrowing = match model {
        Model::Narrow => draw.uniform(2.5, 4.0),
        Model::Right => 1.0,
        Model::Wide => draw.uniform(0.25, 0.4),
    };
    let (sea, modelled) = (Course::new(law, 1.0), Course::new(law, narrowing));
    let nominal_hz = [0.8, 1.0, 1.25, 1.6][draw.uniform(0.0, 4.0) as usize];
    let band = BandScheme::Decidecade.band(Hertz::new(nominal_hz).unwrap()).unwrap();
    let wave_hz = 0.5 * band.centre_hz;

    // Weibull winds of shape 2 with a memory of a day and a half; the sea follows with a lag of three hours.
    let usual = 7.5 * (1.0 / nominal_hz).powf(0.8);
    let mean = match obstacle {
        Obstacle::NoReference => 0.33 * usual,
        _ => draw.uniform(0.9, 1.25) * usual,
    };
    let gaussian = draw.series(hours, 36.0);
    let wind_m_s: Vec<f64> = gaussian
        .iter()
        .map(|z| {
            let share = 0.5 * libm::erfc(z / 2f64.sqrt());
            (mean * 2.0 / PI.sqrt() * (-share.max(1e-12).ln()).sqrt()).max(0.5)
        })
        .collect();
    let mut follow = wind_m_s[0];
    let sea_wind: Vec<f64> = wind_m_s
        .iter()
        .map(|wind| {
            follow += (wind - follow) / 3.0;
            follow.max(1.0)
        })
        .collect();

    let offset_db = draw.uniform(-6.0, 6.0);
    let density_error = [draw.normal(), draw.normal()].map(|z| z * DENSITY_SD_DB / 2f64.sqrt());
    let density_noise = draw.series(hours, 24.0);
    let reference_law_db = REFERENCE_LAW_SD_DB * draw.normal();
    let (white, slow) = (draw.series(hours, 0.1), draw.series(hours, 8.0));

    let frequency_hz: Vec<f64> = (0..36).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
    let axes = SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap();
    let mut bands = RadiatedBands::new(&axes, &radiator, &[band], BandSettings::default());
    let mut out = [Err(NotRadiated::NoSpectrum)];
    let mut source = vec![0.0; 36];
    let (mut radiated, mut f_over_fp, mut overlap_db) = (Vec::new(), Vec::new(), Vec::new());
    let (mut true_level, mut true_difference_db) = (Vec::new(), Vec::new());
    for hour in 0..hours {
        let spectrum = WindSeaSpectrum::fully_developed(sea_wind[hour], &water);
        let x = wave_hz / spectrum.peak_hz;
        let far = far_above_peak(x);
        let error_db = density_error[0] * (1.0 - far) + density_error[1] * far + 0.7 * density_noise[hour];
        for (value, f) in source.iter_mut().zip(&axes.frequency_hz) {
            let e = spectrum.density_m2_hz(*f) * 10f64.powf(0.1 * error_db);
            *value = e * e * 10f64.powf(0.1 * modelled.db(f / spectrum.peak_hz)) / TAU;
        }
        let tail_start_hz = (obstacle == Obstacle::Tail).then_some(2.5 * 1.1665 * spectrum.peak_hz);
        bands.levels(&source, tail_start_hz, &mut out);
        radiated.push(out[0]);
        f_over_fp.push(x);
        overlap_db.push(modelled.db(x));
        let level = |course: &Course, extra_db: f64| fine_level_db(&radiator, band, &spectrum, course, extra_db);
        true_level.push(level(&sea, reference_law_db * far) + offset_db);
        true_difference_db.push(level(&sea, 0.0) - level(&modelled, 0.0));
    }
    let in_class: Vec<f64> =
        (0..hours).filter(|h| (1.5..2.0).contains(&f_over_fp[*h])).map(|h| true_level[h]).collect();
    let middle = if in_class.is_empty() { median(&true_level) } else { median(&in_class) };
    let floor_db = match obstacle {
        Obstacle::Floor => middle + draw.uniform(3.0, 12.0),
        // Crosses the band: audible in the lightest winds of the class.
        _ => middle - draw.uniform(8.0, 20.0),
    };
    let level_db = (0..hours)
        .map(|h| {
            let power = 10f64.powf(0.1 * true_level[h]) + 10f64.powf(0.1 * (floor_db + 0.7 * slow[(h + 7) % hours]));
            10.0 * power.log10() + 1.2 * white[h] + 0.8 * slow[h]
        })
        .collect();
    Deployment {
        band,
        times_ms: (0..hours as i64).map(|h| h * 3_600_000).collect(),
        level_db,
        wind_m_s,
        floor_db: floor_db + 0.5 * draw.normal(),
        radiated,
        f_over_fp,
        overlap_db,
        true_difference_db,
    }
}

impl Deployment {
    pub(crate) fn windows(&self) -> BandWindows<'_> {
        BandWindows {
            band: self.band,
            times_ms: &self.times_ms,
            level_db: &self.level_db,
            wind_speed_m_s: &self.wind_m_s,
            floor: BandFloor { fitted_db: Some(self.floor_db), instrument_db: None },
        }
    }

    pub(crate) fn model<'a>(&'a self, name: &'a str) -> ModelWindows<'a> {
        ModelWindows { model: name, radiated: &self.radiated, f_over_fp: &self.f_over_fp, overlap_db: &self.overlap_db }
    }

    pub(crate) fn compare(&self, laws: &LawTable, options: &SpreadOptions) -> BandComparison {
        compare(&self.windows(), &[self.model("model")], laws, options).0.remove(0)
    }

    /// Median of the true difference in a class of f / fp, over the windows that can be used, dB.
    pub(crate) fn truth_db(&self, low: f64, high: f64) -> f64 {
        let inside: Vec<f64> = (0..self.times_ms.len())
            .filter(|h| (low..high).contains(&self.f_over_fp[*h]))
            .filter(|h| self.radiated[*h].is_ok_and(|level| !level.has(RadiationFlag::Tail)))
            .map(|h| self.true_difference_db[h])
            .collect();
        median(&inside)
    }
}

/// What many deployments came to.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Tally {
    pub(crate) runs: usize,
    pub(crate) judged: usize,
    pub(crate) covered: usize,
    pub(crate) narrow: usize,
    pub(crate) wide: usize,
    pub(crate) agrees: usize,
    pub(crate) not_identified: usize,
    pub(crate) half_width_db: f64,
    /// Deployments whose true difference is more than one and a half half-widths, and of these the verdicts with its sign.
    pub(crate) far: usize,
    pub(crate) told: usize,
}

/// Runs deployments seed by seed and judges the class of f / fp from `low` on, over all winds.
pub(crate) fn tally(seeds: std::ops::Range<u64>, model: Model, obstacle: Obstacle, hours: usize, low: f64) -> Tally {
    use underwind::model::SpreadVerdict;
    let (laws, options) = (LawTable::new(1.0), SpreadOptions::default());
    let mut tally = Tally::default();
    for seed in seeds {
        let deployment = deployment(seed, model, obstacle, hours);
        let comparison = deployment.compare(&laws, &options);
        let class = comparison.classes.iter().find(|c| c.class.all_winds() && c.class.x_low >= low).unwrap();
        tally.runs += 1;
        match class.verdict {
            SpreadVerdict::TooNarrow => tally.narrow += 1,
            SpreadVerdict::TooWide => tally.wide += 1,
            SpreadVerdict::Agrees => tally.agrees += 1,
            SpreadVerdict::NotIdentified(_) => tally.not_identified += 1,
        }
        if let (Some(difference), None) = (class.difference, class.verdict.reason()) {
            tally.judged += 1;
            tally.half_width_db += difference.half_width_db();
            let truth = deployment.truth_db(low, class.class.x_high);
            if truth.abs() > 1.5 * difference.half_width_db() {
                let verdict = if truth > 0.0 { SpreadVerdict::TooNarrow } else { SpreadVerdict::TooWide };
                tally.far += 1;
                tally.told += usize::from(class.verdict == verdict);
            }
            tally.covered += usize::from(truth >= difference.low_db && truth <= difference.high_db);
        }
    }
    tally.half_width_db /= tally.judged.max(1) as f64;
    tally
}
