//! The sea over a window, from a series of reduced spectra that runs linearly between steps.

use super::blend::{StepWeight, window_overlap, window_weights};
use super::moments::{Moments, WindOver};
use super::reduce::Reducer;
use crate::model::{FlagSet, Missing, OverlapParts, Sampled, SeaRow, SeaState, SpectraSeries};
use crate::units::Window;

/// Below this share of the largest density an overlap is rounding.
const LEAST_DENSITY_SHARE: f64 = 1e-8;

/// The sea over one window.
#[derive(Debug, Clone, PartialEq)]
pub struct WindowSea {
    /// Height, periods, directions, of the mean spectrum.
    pub state: SeaState,
    /// Moments of the mean spectrum.
    pub moments: Moments,
    /// Mean of E^2 times the overlap at every frequency, in its parts, m4/Hz2/rad.
    pub overlap: Vec<OverlapParts>,
    /// Largest share of pairs of opposite bins with a zero among the steps used.
    pub zero_pair_share: Vec<f64>,
    /// Positions of the steps used.
    pub steps: Vec<usize>,
}

impl WindowSea {
    /// Overlap over 0 to 2 pi at a frequency, 1/rad; NaN where there is too little energy.
    pub fn overlap_2pi_per_rad(&self, frequency: usize) -> f64 {
        let density = &self.state.by_frequency.density_m2_hz;
        let floor = LEAST_DENSITY_SHARE * density.iter().copied().fold(0.0, f64::max);
        if density[frequency] <= floor {
            return f64::NAN;
        }
        self.overlap[frequency].total() / (density[frequency] * density[frequency])
    }

    /// E^2 times the overlap at every frequency, m4/Hz2/rad: what radiates.
    pub fn source(&self) -> Vec<f64> {
        self.overlap.iter().map(|parts| parts.total()).collect()
    }

    /// Position of the frequency nearest in ratio; `None` outside the axis (half a bin beyond its ends).
    pub fn nearest_frequency(frequency_hz: &[f64], edges_hz: &[f64], wanted_hz: f64) -> Option<usize> {
        let inside = *edges_hz.first()? <= wanted_hz && wanted_hz <= *edges_hz.last()?;
        let ratio = |hz: f64| (libm::log(hz / wanted_hz)).abs();
        inside.then(|| {
            (0..frequency_hz.len())
                .fold(0, |best, k| if ratio(frequency_hz[k]) < ratio(frequency_hz[best]) { k } else { best })
        })
    }
}

/// The sea over a window (an instant when its ends are equal).
pub fn sea_over_window(
    series: &SpectraSeries,
    reducer: &Reducer<'_>,
    window: Window,
    wind: Option<WindOver>,
) -> Sampled<WindowSea> {
    let steps_ms: Vec<i64> = series.steps.iter().map(|step| step.0).collect();
    sea_over(series, &steps_ms, reducer, window, wind)
}

/// The same over many windows.
pub fn sea_over_windows(
    series: &SpectraSeries,
    reducer: &Reducer<'_>,
    windows: &[Window],
    wind: impl Fn(usize) -> Option<WindOver>,
) -> Vec<Sampled<WindowSea>> {
    let steps_ms: Vec<i64> = series.steps.iter().map(|step| step.0).collect();
    windows.iter().enumerate().map(|(k, window)| sea_over(series, &steps_ms, reducer, *window, wind(k))).collect()
}

fn sea_over(
    series: &SpectraSeries,
    steps_ms: &[i64],
    reducer: &Reducer<'_>,
    window: Window,
    wind: Option<WindOver>,
) -> Sampled<WindowSea> {
    let (start, end) = (window.start.0, window.end.0);
    let outside = steps_ms.first().is_none_or(|first| start < *first) || steps_ms.last().is_none_or(|last| end > *last);
    if outside {
        return Sampled::Missing(Missing::OutsideTime);
    }
    let Some(weights) = window_weights(steps_ms, start, end, series.max_gap_ms) else {
        return Sampled::Missing(Missing::TimeGap);
    };
    let weights: Vec<StepWeight> =
        weights.into_iter().filter(|weight| weight.linear > 0.0 || weight.square > 0.0).collect();
    let mut flags = FlagSet::default();
    for weight in &weights {
        if let Some(why) = series.missing[weight.step] {
            return Sampled::Missing(why);
        }
        flags = flags.union(series.flags[weight.step]);
    }
    let moments = mean_moments(series, &weights);
    let Some(mut state) = reducer.totals(&moments, wind) else {
        return Sampled::Missing(Missing::NoEnergy);
    };
    let tails = weights.iter().map(|weight| series.tail_start_hz[weight.step]);
    state.tail_start_hz = Some(tails.fold(f64::INFINITY, f64::min)).filter(|start| start.is_finite());
    let frequencies = series.axes.frequencies();
    let overlap = (0..frequencies).map(|k| overlap_at(series, &weights, k)).collect();
    let zero_pair_share = (0..frequencies)
        .map(|k| {
            let shares = weights.iter().map(|weight| f64::from(series.row(weight.step, SeaRow::ZeroPairs)[k]));
            shares.fold(f64::NAN, f64::max)
        })
        .collect();
    let steps = weights.iter().map(|weight| weight.step).collect();
    Sampled::with_flags(WindowSea { state, moments, overlap, zero_pair_share, steps }, flags)
}

fn mean_moments(series: &SpectraSeries, weights: &[StepWeight]) -> Moments {
    let mut moments = Moments::zeros(series.axes.frequencies());
    for weight in weights {
        let add = |sums: &mut [f64], row: SeaRow| {
            for (sum, value) in sums.iter_mut().zip(series.row(weight.step, row)) {
                *sum += weight.linear * f64::from(*value);
            }
        };
        add(&mut moments.density, SeaRow::Density);
        add(&mut moments.a1, SeaRow::A1);
        add(&mut moments.b1, SeaRow::B1);
        add(&mut moments.wind_density, SeaRow::WindDensity);
        add(&mut moments.wind_a1, SeaRow::WindA1);
        add(&mut moments.wind_b1, SeaRow::WindB1);
    }
    moments
}

fn overlap_at(series: &SpectraSeries, weights: &[StepWeight], k: usize) -> OverlapParts {
    let density = |step: usize| f64::from(series.row(step, SeaRow::Density)[k]);
    let scaled = |step: usize, row: SeaRow, scale: f64| {
        // Without energy there is no overlap, whatever the ratio would be; with some, a missing ratio is missing.
        if scale > 0.0 { scale * f64::from(series.row(step, row)[k]) } else { 0.0 }
    };
    window_overlap(
        weights,
        |step| {
            let scale = density(step) * density(step);
            [SeaRow::Total, SeaRow::Diagonal, SeaRow::Own].map(|row| scaled(step, row, scale))
        },
        |step| scaled(step, SeaRow::WithNext, density(step) * density(step + 1)),
    )
}
