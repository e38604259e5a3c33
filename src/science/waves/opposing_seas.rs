//! Times when opposing waves come from two distinct systems: swell against wind sea, or swell against swell.
//!
//! Judged on stored spectra only (one node, one step): a blend of two times or places puts both seas of a turning wind into
//! one spectrum. The spectrum is parted into systems by walking uphill from every bin to its peak (each bin goes to its
//! highest neighbour); a frequency counts where the larger part of its overlap pairs bins of different systems.

use super::opposing::Opposing;
use super::reduce::from_direction_deg;
use crate::model::{DirectionalSpectrum, OpposingSeas, SpectrumAxes, WaveSystem};

/// What makes two seas distinct.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OpposingOptions {
    /// Smallest height of each system, m.
    pub least_hs_m: f64,
    /// Least angle between the mean directions of the two, degrees.
    pub least_angle_deg: f64,
    /// Least share of the overlap that pairs the two.
    pub least_share: f64,
    /// The dip between two peaks must fall below this share of the lower one, or they are one system.
    pub dip: f64,
}

impl Default for OpposingOptions {
    fn default() -> Self {
        Self { least_hs_m: 0.1, least_angle_deg: 90.0, least_share: 0.5, dip: 0.5 }
    }
}

/// Finds two opposing systems in a stored spectrum; `None` where the overlap comes from a single sea, or there is none.
/// `is_wind_sea(frequency, direction)` says of a bin whether the wind drives it; absent without wind.
pub fn opposing_seas(
    spectrum: DirectionalSpectrum<'_>,
    table: &Opposing,
    is_wind_sea: Option<&dyn Fn(usize, usize) -> bool>,
    options: &OpposingOptions,
) -> Option<OpposingSeas> {
    if !spectrum.is_complete() || !table.is_known() {
        return None;
    }
    let axes = spectrum.axes;
    if !may_hold_two(spectrum, options) {
        return None;
    }
    let system_of = systems(spectrum, options.dip);
    let count = system_of.iter().max()? + 1;
    let all: Vec<WaveSystem> = (0..count).map(|system| describe(spectrum, &system_of, system, is_wind_sea)).collect();
    let mut best: Option<OpposingSeas> = None;
    for first in 0..count {
        for second in first + 1..count {
            let (a, b) = (all[first], all[second]);
            let angle = ((a.from_deg - b.from_deg).rem_euclid(360.0) - 180.0).abs();
            let distinct = a.hs_m >= options.least_hs_m
                && b.hs_m >= options.least_hs_m
                && 180.0 - angle >= options.least_angle_deg;
            // One wind drives one sea, whatever its shape.
            let one_wind = a.wind_sea == Some(true) && b.wind_sea == Some(true);
            if !distinct || one_wind {
                continue;
            }
            let Some((k, joint, share)) = strongest(spectrum, table, &system_of, first, second, options) else {
                continue;
            };
            if best.is_none_or(|found| joint > found.joint_overlap) {
                let systems = if a.hs_m >= b.hs_m { [a, b] } else { [b, a] };
                best = Some(OpposingSeas {
                    systems,
                    frequency_hz: axes.frequency_hz[k],
                    joint_overlap: joint,
                    joint_share: share,
                });
            }
        }
    }
    best
}

/// Whether there are two summits that could belong to two systems; nearly all spectra are done with here. A system's density is
/// nowhere above its summit, so a summit below the least height over the whole axis cannot matter.
fn may_hold_two(spectrum: DirectionalSpectrum<'_>, options: &OpposingOptions) -> bool {
    const LEAST_APART_COSINE: f64 = 0.866;
    let axes = spectrum.axes;
    let room: f64 = axes.frequency_weight_hz.iter().sum::<f64>() * std::f64::consts::TAU;
    let least_m0 = (0.25 * options.least_hs_m) * (0.25 * options.least_hs_m);
    let density = spectrum.density_m2_hz_rad;
    let mut first: Option<f64> = None;
    for (k, row) in density.chunks_exact(axes.directions()).enumerate() {
        let count = row.len();
        for (i, value) in row.iter().enumerate() {
            let beside = row[(i + 1) % count].max(row[(i + count - 1) % count]);
            if *value * room < least_m0 || *value < beside {
                continue;
            }
            let cell = k * count + i;
            if neighbours(axes, cell).all(|other| density[other] <= *value) {
                let to = axes.direction_to_rad[i];
                match first {
                    None => first = Some(to),
                    Some(other) if libm::cos(to - other) < LEAST_APART_COSINE => return true,
                    Some(_) => {}
                }
            }
        }
    }
    false
}

/// Frequency with the strongest joint overlap of two systems, where that is most of the overlap and both have energy.
fn strongest(
    spectrum: DirectionalSpectrum<'_>,
    table: &Opposing,
    system_of: &[usize],
    first: usize,
    second: usize,
    options: &OpposingOptions,
) -> Option<(usize, f64, f64)> {
    let directions = spectrum.axes.directions();
    let mut best: Option<(usize, f64, f64)> = None;
    for k in 0..spectrum.axes.frequencies() {
        let row = spectrum.row(k);
        let labels = &system_of[k * directions..(k + 1) * directions];
        if !(labels.contains(&first) && labels.contains(&second)) {
            continue;
        }
        let joint = table.joint(row, labels, first, second);
        let total = table.own(row);
        let share = joint / total;
        if share >= options.least_share && best.is_none_or(|(_, strength, _)| joint > strength) {
            best = Some((k, joint, share));
        }
    }
    best
}

fn describe(
    spectrum: DirectionalSpectrum<'_>,
    system_of: &[usize],
    system: usize,
    is_wind_sea: Option<&dyn Fn(usize, usize) -> bool>,
) -> WaveSystem {
    let axes = spectrum.axes;
    let (mut m0, mut north, mut east, mut driven) = (0.0, 0.0, 0.0, 0.0);
    let (mut top, mut peak_hz) = (-1.0, f64::NAN);
    for (cell, label) in system_of.iter().enumerate() {
        if *label != system {
            continue;
        }
        let (k, i) = (cell / axes.directions(), cell % axes.directions());
        let density = spectrum.density_m2_hz_rad[cell];
        let energy = density * axes.frequency_weight_hz[k] * axes.direction_width_rad[i];
        m0 += energy;
        north += energy * libm::cos(axes.direction_to_rad[i]);
        east += energy * libm::sin(axes.direction_to_rad[i]);
        if is_wind_sea.is_some_and(|judge| judge(k, i)) {
            driven += energy;
        }
        if density > top {
            (top, peak_hz) = (density, axes.frequency_hz[k]);
        }
    }
    WaveSystem {
        peak_hz,
        from_deg: from_direction_deg(north, east),
        hs_m: 4.0 * m0.sqrt(),
        wind_sea: is_wind_sea.map(|_| driven > 0.5 * m0),
    }
}

/// No system yet.
const NONE: usize = usize::MAX;

/// The system of every bin, numbered from 0. Neighbouring peaks whose saddle is not below `dip` of the lower one are joined.
fn systems(spectrum: DirectionalSpectrum<'_>, dip: f64) -> Vec<usize> {
    let axes = spectrum.axes;
    let density = spectrum.density_m2_hz_rad;
    let cells = axes.cells();
    let mut order: Vec<usize> = (0..cells).collect();
    order.sort_by(|a, b| density[*b].total_cmp(&density[*a]).then(a.cmp(b)));
    let mut label = vec![NONE; cells];
    // Top of each system, and the system it was joined to.
    let mut top: Vec<f64> = Vec::new();
    let mut joined: Vec<usize> = Vec::new();
    let root = |joined: &[usize], mut system: usize| {
        while joined[system] != system {
            system = joined[system];
        }
        system
    };
    // From the highest bin down: a bin beside one system belongs to it; a bin beside two is their saddle.
    for cell in order {
        let mut beside: Vec<usize> =
            neighbours(axes, cell).filter(|n| label[*n] != NONE).map(|n| root(&joined, label[n])).collect();
        beside.sort_unstable();
        beside.dedup();
        let Some(highest) = beside.iter().copied().max_by(|a, b| top[*a].total_cmp(&top[*b]).then(b.cmp(a))) else {
            label[cell] = top.len();
            joined.push(top.len());
            top.push(density[cell]);
            continue;
        };
        for other in beside.into_iter().filter(|other| *other != highest) {
            if density[cell] >= dip * top[other] {
                joined[other] = highest;
            }
        }
        // The bin goes uphill: to the system of its highest neighbour.
        let uphill = neighbours(axes, cell)
            .filter(|n| label[*n] != NONE)
            .max_by(|a, b| density[*a].total_cmp(&density[*b]).then(b.cmp(a)))
            .map_or(highest, |n| root(&joined, label[n]));
        label[cell] = uphill;
    }
    let mut number = vec![NONE; top.len()];
    let mut next = 0;
    label
        .iter()
        .map(|system| {
            let system = root(&joined, *system);
            if number[system] == NONE {
                number[system] = next;
                next += 1;
            }
            number[system]
        })
        .collect()
}

/// The up to eight bins around one, round the circle in direction.
fn neighbours(axes: &SpectrumAxes, cell: usize) -> impl Iterator<Item = usize> {
    let directions = axes.directions();
    let frequencies = axes.frequencies();
    let (k, i) = (cell / directions, cell % directions);
    let from = k.saturating_sub(1);
    let to = (k + 1).min(frequencies - 1);
    (from..=to)
        .flat_map(move |row| {
            [(i + directions - 1) % directions, i, (i + 1) % directions]
                .into_iter()
                .map(move |column| row * directions + column)
        })
        .filter(move |other| *other != cell)
}

#[cfg(test)]
mod tests {
    use super::super::spreading_law::{Distribution, SpreadingLaw};
    use super::super::{Water, WindSeaSpectrum};
    use super::*;
    use std::f64::consts::{PI, TAU};

    fn axes() -> SpectrumAxes {
        let frequency_hz = (0..30).map(|k| 0.04 * 1.1_f64.powi(k)).collect();
        SpectrumAxes::new(frequency_hz, None, (0..36).map(|i| f64::from(i) * TAU / 36.0).collect()).unwrap()
    }

    /// A wind sea of a wind to `mean_to`, with a published law.
    fn wind_sea(axes: &SpectrumAxes, wind_m_s: f64, mean_to: f64, law: SpreadingLaw) -> Vec<f64> {
        let sea = WindSeaSpectrum::fully_developed(wind_m_s, &Water::default());
        let rows = axes.frequency_hz.iter().map(|f| {
            let spreading = law.at(f / sea.peak_hz, 1.0);
            axes.direction_to_rad
                .iter()
                .map(|to| sea.density_m2_hz(*f) * spreading.per_rad(to - mean_to))
                .collect::<Vec<_>>()
        });
        rows.flatten().collect()
    }

    fn swell(axes: &SpectrumAxes, peak_hz: f64, mean_to: f64, hs_m: f64) -> Vec<f64> {
        let shape = WindSeaSpectrum { alpha: 1.0, peak_hz, gamma: 3.3, gravity_m_s2: 9.80665 };
        let scale = hs_m * hs_m / 16.0 / (1.52 * shape.m0_without_enhancement_m2());
        let spreading = Distribution::CosinePower { s: 12.0 };
        let rows = axes.frequency_hz.iter().map(|f| {
            axes.direction_to_rad
                .iter()
                .map(|to| scale * shape.density_m2_hz(*f) * spreading.per_rad(to - mean_to))
                .collect::<Vec<_>>()
        });
        rows.flatten().collect()
    }

    fn find(axes: &SpectrumAxes, density: &[f64]) -> Option<OpposingSeas> {
        let spectrum = DirectionalSpectrum::new(axes, density).unwrap();
        opposing_seas(spectrum, &Opposing::new(axes), None, &OpposingOptions::default())
    }

    #[test]
    fn swell_against_wind_sea_is_found_with_both_systems() {
        let axes = axes();
        let sea: Vec<f64> = wind_sea(&axes, 8.0, 0.5, SpreadingLaw::DonelanBanner)
            .iter()
            .zip(swell(&axes, 0.1, 0.5 + PI, 1.5))
            .map(|(a, b)| a + b)
            .collect();
        let found = find(&axes, &sea).expect("two seas against each other");
        assert!(
            (found.systems[0].peak_hz - 0.1).abs() < 0.02 || (found.systems[1].peak_hz - 0.1).abs() < 0.02,
            "{found:?}"
        );
        let angle = (found.systems[0].from_deg - found.systems[1].from_deg).rem_euclid(360.0);
        assert!((angle - 180.0).abs() < 15.0, "{found:?}");
        assert!(found.joint_share > 0.5 && found.frequency_hz < 0.3, "{found:?}");
        let heights: Vec<f64> = found.systems.iter().map(|s| s.hs_m).collect();
        // Fully developed sea of 8 m/s: 0.2092 (1.0602 x 8)^2 / g = 1.53 m; the part beyond 0.64 Hz is left out.
        assert!(heights.iter().all(|h| (h - 1.5).abs() < 0.15), "{heights:?}");
    }

    #[test]
    fn swell_against_swell_is_found() {
        let axes = axes();
        let sea: Vec<f64> = swell(&axes, 0.08, 1.0, 1.0)
            .iter()
            .zip(swell(&axes, 0.09, 1.0 + 0.9 * PI, 0.7))
            .map(|(a, b)| a + b)
            .collect();
        let found = find(&axes, &sea).expect("two swells");
        assert!((found.systems[0].hs_m - 1.0).abs() < 0.05 && (found.systems[1].hs_m - 0.7).abs() < 0.05, "{found:?}");
    }

    /// A single sea has opposing energy of its own at high frequencies, in one lobe or two: it is never listed, wherever it
    /// veers to. Nor is a young sea with the old one of a turned wind, as long as they part by less than a right angle.
    #[test]
    fn a_veering_single_sea_never_appears() {
        let axes = axes();
        for law in SpreadingLaw::ALL {
            for turn in 0..24 {
                for wind_m_s in [4.0, 8.0, 14.0] {
                    let density = wind_sea(&axes, wind_m_s, f64::from(turn) * TAU / 24.0 + 0.03, law);
                    assert_eq!(find(&axes, &density), None, "{law:?} {wind_m_s} {turn}");
                }
            }
        }
    }

    #[test]
    fn nothing_is_said_of_an_empty_sea() {
        let axes = axes();
        assert_eq!(find(&axes, &vec![0.0; axes.cells()]), None);
        assert_eq!(find(&axes, &vec![f64::NAN; axes.cells()]), None);
    }
}
