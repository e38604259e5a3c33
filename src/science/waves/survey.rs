//! A look at every stored spectrum of a place, in order of time: opposing seas, the shape of the directions by f / fp, and the
//! few spectra that are worth a picture. Stored spectra only, never blends.

use super::moments::{MomentTables, Moments, WindOver};
use super::opposing::Opposing;
use super::opposing_seas::{OpposingOptions, opposing_seas};
use super::reduce::peak;
use super::two_lobe::{TwoLobes, fit_two_lobes};
use super::water::Water;
use crate::model::{DirectionalSpectrum, OpposingSeas, SpectrumAxes};
use std::f64::consts::TAU;

/// First and last end of the classes of f / fp in which shapes are gathered.
const X_ENDS: (f64, f64) = (0.8, 7.0);
/// Classes of f / fp, equal steps of the logarithm.
const X_CLASSES: usize = 14;
/// Fewest spectra that make a shape.
const LEAST_SPECTRA: usize = 20;
/// A frequency counts for the wind sea's shape where this share of its density is driven by the wind.
const DRIVEN_SHARE: f64 = 0.5;

/// What the surveyor needs to know, made once for a source.
#[derive(Debug, Clone)]
pub struct Surveyor<'a> {
    axes: &'a SpectrumAxes,
    tables: MomentTables,
    opposing: Opposing,
    options: OpposingOptions,
    along: Vec<(f64, f64)>,
}

/// A spectrum worth a picture.
#[derive(Debug, Clone, PartialEq)]
pub struct ChosenSpectrum {
    /// Step it was stored at.
    pub step: usize,
    /// Densities, m2/Hz/rad.
    pub density_m2_hz_rad: Vec<f64>,
    /// Wind over it.
    pub wind: Option<WindOver>,
    /// Peak of its wind sea, Hz.
    pub wind_sea_peak_hz: Option<f64>,
    /// By what it was chosen (m4/Hz2/rad of joint overlap, or m2 of wind sea): the largest counts.
    rank: f64,
}

/// The mean shape of the wind sea's directions in a class of f / fp, with two lobes fitted to it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LobeShape {
    /// Middle of the class, f / fp.
    pub x: f64,
    /// Spectra that the shape is the mean of.
    pub spectra: usize,
    /// The lobes.
    pub lobes: TwoLobes,
}

/// What was seen at one place.
#[derive(Debug, Clone, PartialEq)]
pub struct SeaSurvey {
    /// Step and what opposed each other there, in order of time.
    pub events: Vec<(usize, OpposingSeas)>,
    /// The spectrum with the strongest opposing seas.
    pub strongest: Option<ChosenSpectrum>,
    /// The spectrum with the highest wind sea.
    pub highest: Option<ChosenSpectrum>,
    /// Sums of distributions about their mean direction, class by class (1/rad).
    shapes: Vec<f64>,
    counts: [usize; X_CLASSES],
}

impl SeaSurvey {
    /// Nothing seen yet.
    pub fn new(axes: &SpectrumAxes) -> Self {
        Self {
            events: Vec::new(),
            strongest: None,
            highest: None,
            shapes: vec![0.0; X_CLASSES * axes.directions()],
            counts: [0; X_CLASSES],
        }
    }

    /// Adds what was seen later at the same place.
    pub fn join(&mut self, later: Self) {
        self.events.extend(later.events);
        keep_larger(&mut self.strongest, later.strongest);
        keep_larger(&mut self.highest, later.highest);
        self.shapes.iter_mut().zip(later.shapes).for_each(|(sum, value)| *sum += value);
        self.counts.iter_mut().zip(later.counts).for_each(|(sum, value)| *sum += value);
    }

    /// Two lobes fitted to the mean shape of each class of f / fp with enough spectra.
    pub fn lobes(&self, axes: &SpectrumAxes) -> Vec<LobeShape> {
        let directions = axes.directions();
        let ratio = libm::log(X_ENDS.1 / X_ENDS.0) / X_CLASSES as f64;
        (0..X_CLASSES)
            .filter(|class| self.counts[*class] >= LEAST_SPECTRA)
            .filter_map(|class| {
                let lobes = fit_two_lobes(axes, &self.shapes[class * directions..(class + 1) * directions])?;
                let x = X_ENDS.0 * libm::exp((class as f64 + 0.5) * ratio);
                Some(LobeShape { x, spectra: self.counts[class], lobes })
            })
            .collect()
    }
}

fn keep_larger(kept: &mut Option<ChosenSpectrum>, other: Option<ChosenSpectrum>) {
    // The earlier one of two equals stays, so that the order of joining decides nothing else.
    if let Some(other) = other
        && kept.as_ref().is_none_or(|kept| other.rank > kept.rank)
    {
        *kept = Some(other);
    }
}

impl<'a> Surveyor<'a> {
    /// For spectra on these axes in this water.
    pub fn new(axes: &'a SpectrumAxes, water: &Water, options: OpposingOptions) -> Self {
        Self {
            axes,
            tables: MomentTables::new(axes, water),
            opposing: Opposing::new(axes),
            options,
            along: axes.direction_to_rad.iter().map(|to| (libm::cos(*to), libm::sin(*to))).collect(),
        }
    }

    /// Looks at a stored spectrum. `moments` is room for the axes' frequencies.
    pub fn look(
        &self,
        step: usize,
        spectrum: DirectionalSpectrum<'_>,
        wind: Option<WindOver>,
        moments: &mut Moments,
        survey: &mut SeaSurvey,
    ) {
        if !spectrum.is_complete() {
            return;
        }
        self.tables.moments(spectrum, wind, moments);
        let driven = wind.map(|wind| self.driven(wind));
        let judge =
            driven.as_ref().map(|fastest| move |k: usize, i: usize| fastest[i] > self.tables.phase_speed_m_s()[k]);
        let judge = judge.as_ref().map(|judge| judge as &dyn Fn(usize, usize) -> bool);
        let wind_peak_hz = wind.and_then(|_| peak(&self.axes.frequency_hz, &moments.wind_density)).map(|(bin, _)| bin);
        let choose = |rank: f64| {
            Some(ChosenSpectrum {
                step,
                density_m2_hz_rad: spectrum.density_m2_hz_rad.to_vec(),
                wind,
                wind_sea_peak_hz: wind_peak_hz,
                rank,
            })
        };
        if let Some(seas) = opposing_seas(spectrum, &self.opposing, judge, &self.options) {
            survey.events.push((step, seas));
            if survey.strongest.as_ref().is_none_or(|kept| seas.joint_overlap > kept.rank) {
                survey.strongest = choose(seas.joint_overlap);
            }
        }
        if let Some(peak_hz) = wind_peak_hz {
            self.add_shapes(spectrum, moments, peak_hz, survey);
            let m0: f64 = moments
                .wind_density
                .iter()
                .zip(&self.axes.frequency_weight_hz)
                .map(|(density, width)| density * width)
                .sum();
            if survey.highest.as_ref().is_none_or(|kept| m0 > kept.rank) {
                survey.highest = choose(m0);
            }
        }
    }

    /// For each direction the fastest wave that the wind drives there, m/s.
    fn driven(&self, wind: WindOver) -> Vec<f64> {
        let (sine, cosine) = libm::sincos((wind.from_deg + 180.0).to_radians());
        self.along.iter().map(|(north, east)| 1.2 * wind.speed_m_s * (north * cosine + east * sine)).collect()
    }

    /// Adds the distribution of each frequency that the wind drives, turned so that its mean direction is the first one.
    fn add_shapes(&self, spectrum: DirectionalSpectrum<'_>, moments: &Moments, peak_hz: f64, survey: &mut SeaSurvey) {
        let directions = self.axes.directions();
        if !self.axes.even_steps {
            return;
        }
        let step_rad = TAU / directions as f64;
        for (k, frequency) in self.axes.frequency_hz.iter().enumerate() {
            let x = frequency / peak_hz;
            let density = moments.density[k];
            let class = libm::log(x / X_ENDS.0) / libm::log(X_ENDS.1 / X_ENDS.0) * X_CLASSES as f64;
            let counts = class >= 0.0 && class < X_CLASSES as f64 && density > 0.0;
            if !counts || moments.wind_density[k] < DRIVEN_SHARE * density {
                continue;
            }
            let class = class as usize;
            let mean = libm::atan2(moments.b1[k], moments.a1[k]);
            // Between two columns by linear shares, so that turning adds little width.
            let turn = ((mean - self.axes.direction_to_rad[0]) / step_rad).rem_euclid(directions as f64);
            let (whole, part) = (turn.floor() as usize, turn - turn.floor());
            let row = spectrum.row(k);
            let sums = &mut survey.shapes[class * directions..(class + 1) * directions];
            for (i, sum) in sums.iter_mut().enumerate() {
                let (a, b) = (row[(i + whole) % directions], row[(i + whole + 1) % directions]);
                *sum += ((1.0 - part) * a + part * b) / density;
            }
            survey.counts[class] += 1;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::{Distribution, SpreadingLaw};
    use super::super::wind_sea::WindSeaSpectrum;
    use super::*;

    fn axes() -> SpectrumAxes {
        let frequency_hz = (0..36).map(|k| 0.04 * libm::pow(1.1, f64::from(k))).collect();
        SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
    }

    fn survey(axes: &SpectrumAxes, steps: std::ops::Range<usize>) -> SeaSurvey {
        let surveyor = Surveyor::new(axes, &Water::default(), OpposingOptions::default());
        let mut survey = SeaSurvey::new(axes);
        let mut moments = Moments::zeros(axes.frequencies());
        for step in steps {
            let speed_m_s = 6.0 + (step % 9) as f64;
            let to = 0.37 * step as f64;
            // A little younger than full development, so that the peak is driven.
            let sea = WindSeaSpectrum::fully_developed(0.85 * speed_m_s, &Water::default());
            let density: Vec<f64> = axes
                .frequency_hz
                .iter()
                .flat_map(|f| {
                    let law = SpreadingLaw::Ewans1998.at((f / sea.peak_hz).max(0.8), 1.0);
                    axes.direction_to_rad
                        .iter()
                        .map(|d| sea.density_m2_hz(*f) * law.per_rad(d - to))
                        .collect::<Vec<_>>()
                })
                .collect();
            let wind = WindOver { speed_m_s, from_deg: to.to_degrees() + 180.0 };
            let spectrum = DirectionalSpectrum::new(axes, &density).unwrap();
            surveyor.look(step, spectrum, Some(wind), &mut moments, &mut survey);
        }
        survey
    }

    /// The published law that made the seas comes back from their mean shapes, wherever they ran.
    #[test]
    fn lobes_of_many_turned_seas_are_those_of_their_law() {
        let axes = axes();
        let found = survey(&axes, 0..60).lobes(&axes);
        assert!(found.len() > 6, "{found:?}");
        for shape in found.iter().filter(|shape| shape.x > 2.0 && shape.x < 6.0) {
            let Distribution::TwoLobe { half_separation_rad, .. } = SpreadingLaw::Ewans1998.at(shape.x, 1.0) else {
                panic!("two lobes");
            };
            let difference = (shape.lobes.half_separation_rad - half_separation_rad).to_degrees();
            assert!(difference.abs() < 4.0, "{shape:?}: {difference}");
            assert!(shape.spectra >= LEAST_SPECTRA);
        }
    }

    #[test]
    fn joining_parts_is_looking_at_all() {
        let axes = axes();
        let whole = survey(&axes, 0..60);
        let mut joined = survey(&axes, 0..25);
        joined.join(survey(&axes, 25..60));
        assert_eq!(whole.counts, joined.counts);
        assert!(whole.shapes.iter().zip(&joined.shapes).all(|(a, b)| (a - b).abs() <= 1e-12 * a.abs()));
        assert_eq!(whole.events, joined.events);
        assert!(whole.events.is_empty(), "a single sea");
        let (a, b) = (whole.highest.unwrap(), joined.highest.unwrap());
        assert!(a == b && a.wind.unwrap().speed_m_s > 13.0);
    }
}
