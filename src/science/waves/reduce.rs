//! From a directional spectrum to what tables hold: height, periods, peak, direction, spread, wind sea, tail, overlap.

use super::moments::{MomentTables, Moments, WindOver};
use super::opposing::Opposing;
use super::tail::{TailTolerance, tail_start_hz};
use super::water::Water;
use crate::model::{DirectionalSpectrum, FrequencyStates, SeaState, SpectrumAxes, WindSea};

/// Below this share of the largest density a frequency holds too little for a distribution over directions: what is left
/// there is rounding of the source's numbers.
const LEAST_DENSITY_SHARE: f64 = 1e-8;

/// Settings of the reductions.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ReduceOptions {
    /// Start of the laid-on tail as the user states it, Hz; else it is looked for.
    pub tail_start_hz: Option<f64>,
    /// How constant a tail must be to be found.
    pub tail_tolerance: TailTolerance,
}

/// Reduces spectra on one set of axes.
#[derive(Debug, Clone)]
pub struct Reducer<'a> {
    axes: &'a SpectrumAxes,
    tables: MomentTables,
    opposing: Opposing,
    options: ReduceOptions,
}

impl<'a> Reducer<'a> {
    /// Tables for these axes in this water.
    pub fn new(axes: &'a SpectrumAxes, water: &Water, options: ReduceOptions) -> Self {
        Self { axes, tables: MomentTables::new(axes, water), opposing: Opposing::new(axes), options }
    }

    /// How directions oppose each other.
    pub fn opposing(&self) -> &Opposing {
        &self.opposing
    }

    /// The tables of moments.
    pub fn tables(&self) -> &MomentTables {
        &self.tables
    }

    /// Everything about one spectrum. `None` where it has a missing density or no energy at all.
    pub fn sea_state(&self, spectrum: DirectionalSpectrum<'_>, wind: Option<WindOver>) -> Option<SeaState> {
        if !spectrum.is_complete() {
            return None;
        }
        let mut moments = Moments::zeros(self.axes.frequencies());
        self.tables.moments(spectrum, wind, &mut moments);
        let mut state = self.from_moments(&moments, wind)?;
        state.tail_start_hz = self.tail_start_hz(spectrum, &moments.density);
        let floor = LEAST_DENSITY_SHARE * moments.density.iter().copied().fold(0.0, f64::max);
        for (k, density) in moments.density.iter().enumerate() {
            if *density <= floor {
                continue;
            }
            let row = spectrum.row(k);
            let scale = density * density;
            state.by_frequency.overlap_2pi_bins_per_rad[k] = self.opposing.by_bins(row, row) / scale;
            state.by_frequency.overlap_2pi_fourier_per_rad[k] = self.opposing.by_fourier(row, row) / scale;
            state.by_frequency.zero_pair_share[k] = self.opposing.zero_pair_share(row);
        }
        Some(state)
    }

    /// Start of the tail of one spectrum, Hz: as stated, else as found.
    pub fn tail_start_hz(&self, spectrum: DirectionalSpectrum<'_>, density_m2_hz: &[f64]) -> Option<f64> {
        self.options.tail_start_hz.or_else(|| tail_start_hz(spectrum, density_m2_hz, self.options.tail_tolerance))
    }

    /// What moments alone tell, such as blended ones; overlaps and tail are left missing. `None` without energy.
    pub fn from_moments(&self, moments: &Moments, wind: Option<WindOver>) -> Option<SeaState> {
        let mut state = self.totals(moments, wind)?;
        add_directions(moments, &mut state.by_frequency);
        Some(state)
    }

    /// The same without directions at every frequency, of which there is only the density. `None` without energy.
    pub fn totals(&self, moments: &Moments, wind: Option<WindOver>) -> Option<SeaState> {
        let frequency = &self.axes.frequency_hz;
        let integral = |values: &[f64], power: i32| -> f64 {
            let weighted = values.iter().zip(frequency).zip(&self.axes.frequency_weight_hz);
            weighted.map(|((value, f), weight)| value * weight * f.powi(power)).sum()
        };
        let m0 = integral(&moments.density, 0);
        if !(m0 > 0.0 && m0.is_finite()) {
            return None;
        }
        let (m1, m2, inverse) =
            (integral(&moments.density, 1), integral(&moments.density, 2), integral(&moments.density, -1));
        let (a1, b1) = (integral(&moments.a1, 0), integral(&moments.b1, 0));
        let (peak_bin_hz, peak_hz) = peak(frequency, &moments.density)?;
        Some(SeaState {
            m0_m2: m0,
            hs_m: 4.0 * m0.sqrt(),
            tm01_s: m0 / m1,
            tm02_s: (m0 / m2).sqrt(),
            tm10_s: inverse / m0,
            peak_bin_hz,
            peak_hz,
            mean_from_deg: from_direction_deg(a1, b1),
            spread_deg: spread_deg(a1, b1, m0),
            wind_sea: wind.and_then(|wind| self.wind_sea(moments, wind, &integral)),
            swell_hs_m: if wind.is_some() {
                4.0 * (m0 - integral(&moments.wind_density, 0)).max(0.0).sqrt()
            } else {
                f64::NAN
            },
            tail_start_hz: self.options.tail_start_hz,
            by_frequency: by_frequency(moments),
        })
    }

    fn wind_sea(&self, moments: &Moments, wind: WindOver, integral: &dyn Fn(&[f64], i32) -> f64) -> Option<WindSea> {
        let m0 = integral(&moments.wind_density, 0);
        if !(m0 > 0.0 && m0.is_finite()) {
            return None;
        }
        let (bin_hz, vertex_hz) = peak(&self.axes.frequency_hz, &moments.wind_density)?;
        let bin = self.axes.frequency_hz.iter().position(|f| *f >= bin_hz)?;
        // At its edge the wind sea is cut off by its definition: a parabola through the cut would move the peak.
        let beside = bin.saturating_sub(1)..(bin + 2).min(moments.density.len());
        let whole = beside.into_iter().all(|k| moments.wind_density[k] > 0.5 * moments.density[k]);
        let peak_hz = if whole { vertex_hz } else { bin_hz };
        // Deep-water scaling of the bin's own phase speed: exact where the water is deep, close elsewhere.
        let phase_speed_m_s = self.tables.phase_speed_m_s()[bin] * bin_hz / peak_hz;
        Some(WindSea {
            hs_m: 4.0 * m0.sqrt(),
            peak_hz,
            mean_from_deg: from_direction_deg(integral(&moments.wind_a1, 0), integral(&moments.wind_b1, 0)),
            wave_age: phase_speed_m_s / wind.speed_m_s,
        })
    }
}

fn by_frequency(moments: &Moments) -> FrequencyStates {
    let count = moments.density.len();
    let missing = || vec![f64::NAN; count];
    FrequencyStates {
        density_m2_hz: moments.density.clone(),
        mean_from_deg: missing(),
        spread_deg: missing(),
        overlap_2pi_bins_per_rad: missing(),
        overlap_2pi_fourier_per_rad: missing(),
        zero_pair_share: missing(),
    }
}

/// Mean direction and spread at every frequency with energy.
fn add_directions(moments: &Moments, states: &mut FrequencyStates) {
    for k in 0..moments.density.len() {
        if moments.density[k] > 0.0 {
            states.mean_from_deg[k] = from_direction_deg(moments.a1[k], moments.b1[k]);
            states.spread_deg[k] = spread_deg(moments.a1[k], moments.b1[k], moments.density[k]);
        }
    }
}

/// Direction that waves come from whose mean travel vector this is, degrees; NaN where it has no direction.
pub fn from_direction_deg(a1: f64, b1: f64) -> f64 {
    if a1 == 0.0 && b1 == 0.0 {
        return f64::NAN;
    }
    let turned = (libm::atan2(b1, a1).to_degrees() + 180.0).rem_euclid(360.0);
    if turned >= 360.0 { 0.0 } else { turned }
}

/// Directional spread, sqrt(2 (1 - r1)) (Kuik et al. 1988), degrees.
pub fn spread_deg(a1: f64, b1: f64, density: f64) -> f64 {
    let r1 = (libm::hypot(a1, b1) / density).min(1.0);
    (2.0 * (1.0 - r1)).sqrt().to_degrees()
}

/// The largest bin, and the vertex of the parabola through it and its two neighbours; the bin itself at an end of the axis.
/// `None` where there is no energy.
pub fn peak(frequency_hz: &[f64], density: &[f64]) -> Option<(f64, f64)> {
    let mut top = 0;
    for (k, value) in density.iter().enumerate() {
        if *value > density[top] {
            top = k;
        }
    }
    density.get(top).filter(|value| **value > 0.0)?;
    let bin = frequency_hz[top];
    if top == 0 || top + 1 == density.len() {
        return Some((bin, bin));
    }
    let (left, right) = (bin - frequency_hz[top - 1], frequency_hz[top + 1] - bin);
    let (fall_left, fall_right) = (density[top] - density[top - 1], density[top] - density[top + 1]);
    // Vertex on uneven steps; both falls are non-negative and one of them positive unless the top is flat.
    let bend = right * fall_left + left * fall_right;
    let shift = if bend > 0.0 { 0.5 * (right * right * fall_left - left * left * fall_right) / bend } else { 0.0 };
    Some((bin, bin + shift))
}
