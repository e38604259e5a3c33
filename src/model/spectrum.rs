//! Directional wave spectra: their axes, and the density at one place and instant.
//!
//! One convention inside the program: frequency ascending in Hz, direction going to, radians clockwise from true north,
//! ascending in [0, 2 pi); density one-sided in frequency, m2/Hz/rad. Readers turn everything else into this.

use std::f64::consts::TAU;

/// Directions nearer to each other than this are the same column stored twice (0 and 360 degrees), rad.
const SAME_DIRECTION_RAD: f64 = 1e-4;
/// Relative error of a step up to which directions count as equally spaced.
const EQUAL_STEP: f64 = 1e-3;
/// A gap this many times the median step leaves a sector without directions.
const SECTOR_GAP: f64 = 1.5;

/// Why axes cannot carry a spectrum.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SpectrumError {
    /// Frequencies that are too few, not positive or not ascending.
    #[error("frequency {index} is {found_hz} Hz; expected at least two positive frequencies in ascending order")]
    Frequency {
        /// Position on the axis.
        index: usize,
        /// As given.
        found_hz: f64,
    },
    /// Edges that do not enclose their centres one by one.
    #[error(
        "{found} frequency edges do not enclose {centres} frequencies; expected one more, each between two centres"
    )]
    Edges {
        /// Edges given.
        found: usize,
        /// Frequencies given.
        centres: usize,
    },
    /// Directions that are too few, outside the circle or not ascending.
    #[error(
        "direction {index} is {found_rad} rad; expected at least two distinct directions in ascending order in 0 to 2 pi"
    )]
    Direction {
        /// Position on the axis.
        index: usize,
        /// As given.
        found_rad: f64,
    },
}

/// Axes of directional spectra.
#[derive(Debug, Clone, PartialEq)]
pub struct SpectrumAxes {
    /// Centres, Hz, ascending.
    pub frequency_hz: Vec<f64>,
    /// Edges of the bins, Hz; one more than centres.
    pub frequency_edges_hz: Vec<f64>,
    /// Weights of an integral over frequency, Hz: widths of the bins where the source states edges, else the trapezoid
    /// rule on the centres.
    pub frequency_weight_hz: Vec<f64>,
    /// Directions of travel (going to), rad clockwise from true north, ascending in [0, 2 pi), each once.
    pub direction_to_rad: Vec<f64>,
    /// Widths of the direction bins, rad: half the way to each neighbour.
    pub direction_width_rad: Vec<f64>,
    /// Whether the directions go all the way round. A sector has no opposing pairs that could be trusted.
    pub full_circle: bool,
    /// Whether the directions are equally spaced round the whole circle.
    pub even_steps: bool,
}

impl SpectrumAxes {
    /// Axes from centres, edges (where the source states them) and directions of travel. See [`circle_order`] for
    /// directions in any order.
    ///
    /// # Errors
    /// When the frequencies or directions are too few, out of range or out of order, or edges do not fit the centres.
    pub fn new(
        frequency_hz: Vec<f64>,
        frequency_edges_hz: Option<Vec<f64>>,
        direction_to_rad: Vec<f64>,
    ) -> Result<Self, SpectrumError> {
        check_frequencies(&frequency_hz)?;
        check_directions(&direction_to_rad)?;
        let frequency_weight_hz;
        let edges_hz = if let Some(edges) = frequency_edges_hz {
            check_edges(&frequency_hz, &edges)?;
            frequency_weight_hz = edges.windows(2).map(|pair| pair[1] - pair[0]).collect();
            edges
        } else {
            frequency_weight_hz = trapezoid_weights(&frequency_hz);
            geometric_edges(&frequency_hz)
        };
        let (direction_width_rad, full_circle) = direction_widths(&direction_to_rad);
        let step = TAU / direction_to_rad.len() as f64;
        let even_steps = full_circle
            && direction_to_rad.windows(2).all(|pair| (pair[1] - pair[0] - step).abs() <= EQUAL_STEP * step);
        // The widths of equal steps are the exact step: float32 axes carry their rounding into every product otherwise.
        let direction_width_rad = if even_steps { vec![step; direction_to_rad.len()] } else { direction_width_rad };
        Ok(Self {
            frequency_hz,
            frequency_edges_hz: edges_hz,
            frequency_weight_hz,
            direction_to_rad,
            direction_width_rad,
            full_circle,
            even_steps,
        })
    }

    /// Number of frequencies.
    pub fn frequencies(&self) -> usize {
        self.frequency_hz.len()
    }

    /// Number of directions.
    pub fn directions(&self) -> usize {
        self.direction_to_rad.len()
    }

    /// Number of densities in one spectrum.
    pub fn cells(&self) -> usize {
        self.frequencies() * self.directions()
    }
}

/// Order of directions (rad, any turn) on the circle, the second of a column stored twice left out: positions in the
/// input, sorted by direction in [0, 2 pi).
pub fn circle_order(direction_rad: &[f64]) -> Vec<usize> {
    let turned = |index: usize| {
        let on_circle = direction_rad[index].rem_euclid(TAU);
        // A whole turn comes out as almost 2 pi after rounding.
        if TAU - on_circle < SAME_DIRECTION_RAD { 0.0 } else { on_circle }
    };
    let mut order: Vec<usize> = (0..direction_rad.len()).collect();
    order.sort_by(|a, b| turned(*a).total_cmp(&turned(*b)).then(a.cmp(b)));
    order.dedup_by(|later, earlier| turned(*later) - turned(*earlier) < SAME_DIRECTION_RAD);
    order
}

fn check_frequencies(frequency_hz: &[f64]) -> Result<(), SpectrumError> {
    let wrong = |index: usize| SpectrumError::Frequency {
        index,
        found_hz: frequency_hz.get(index).copied().unwrap_or(f64::NAN),
    };
    if frequency_hz.len() < 2 {
        return Err(wrong(0));
    }
    let mut below = 0.0;
    for (index, &frequency) in frequency_hz.iter().enumerate() {
        if !(frequency > below && frequency.is_finite()) {
            return Err(wrong(index));
        }
        below = frequency;
    }
    Ok(())
}

fn check_directions(direction_rad: &[f64]) -> Result<(), SpectrumError> {
    let wrong = |index: usize| SpectrumError::Direction {
        index,
        found_rad: direction_rad.get(index).copied().unwrap_or(f64::NAN),
    };
    if direction_rad.len() < 2 {
        return Err(wrong(0));
    }
    let mut below = -SAME_DIRECTION_RAD;
    for (index, &direction) in direction_rad.iter().enumerate() {
        if !(0.0..TAU).contains(&direction) || direction - below < SAME_DIRECTION_RAD {
            return Err(wrong(index));
        }
        below = direction;
    }
    Ok(())
}

fn check_edges(centres: &[f64], edges: &[f64]) -> Result<(), SpectrumError> {
    let fits = edges.len() == centres.len() + 1
        && centres.iter().zip(edges.windows(2)).all(|(centre, pair)| {
            // The first and last bin of some models are half bins: their centre is an edge.
            pair[0] <= *centre && *centre <= pair[1] && pair[0] < pair[1] && pair[0] >= 0.0
        });
    if fits { Ok(()) } else { Err(SpectrumError::Edges { found: edges.len(), centres: centres.len() }) }
}

fn trapezoid_weights(centres: &[f64]) -> Vec<f64> {
    let last = centres.len() - 1;
    (0..=last).map(|k| 0.5 * (centres[(k + 1).min(last)] - centres[k.saturating_sub(1)])).collect()
}

/// Edges midway between centres in the logarithm; the outer ones mirrored.
fn geometric_edges(centres: &[f64]) -> Vec<f64> {
    let last = centres.len() - 1;
    let mut edges = vec![centres[0] * (centres[0] / centres[1]).sqrt()];
    edges.extend(centres.windows(2).map(|pair| (pair[0] * pair[1]).sqrt()));
    edges.push(centres[last] * (centres[last] / centres[last - 1]).sqrt());
    edges
}

/// Widths of the bins and whether they close the circle.
fn direction_widths(direction_rad: &[f64]) -> (Vec<f64>, bool) {
    let count = direction_rad.len();
    // gap[i] lies between i and the next direction round the circle.
    let gap: Vec<f64> = (0..count)
        .map(|i| {
            if i + 1 < count {
                direction_rad[i + 1] - direction_rad[i]
            } else {
                TAU + direction_rad[0] - direction_rad[i]
            }
        })
        .collect();
    let mut sorted = gap.clone();
    sorted.sort_by(f64::total_cmp);
    let usual = sorted[(count - 1) / 2];
    let widest = (0..count).fold(0, |best, i| if gap[i] > gap[best] { i } else { best });
    let full_circle = count >= 3 && gap[widest] <= SECTOR_GAP * usual.max(sorted[count / 2]);
    let half = |i: usize, other: usize| {
        let open = !full_circle && i == widest;
        0.5 * if open { gap[other] } else { gap[i] }
    };
    let widths = (0..count)
        .map(|i| {
            let before = (i + count - 1) % count;
            half(before, i) + half(i, before)
        })
        .collect();
    (widths, full_circle)
}

/// The density at one place and instant, m2/Hz/rad, laid out frequency by frequency, each with all its directions. A
/// missing density is NaN; zero is a value.
#[derive(Debug, Clone, Copy)]
pub struct DirectionalSpectrum<'a> {
    /// Its axes.
    pub axes: &'a SpectrumAxes,
    /// Densities, `axes.cells()` of them.
    pub density_m2_hz_rad: &'a [f64],
}

impl<'a> DirectionalSpectrum<'a> {
    /// A view of densities on axes; `None` when their number does not fit.
    pub fn new(axes: &'a SpectrumAxes, density_m2_hz_rad: &'a [f64]) -> Option<Self> {
        (density_m2_hz_rad.len() == axes.cells()).then_some(Self { axes, density_m2_hz_rad })
    }

    /// All directions of one frequency.
    pub fn row(&self, frequency: usize) -> &'a [f64] {
        let directions = self.axes.directions();
        &self.density_m2_hz_rad[frequency * directions..(frequency + 1) * directions]
    }

    /// Whether every density is known and none is negative.
    pub fn is_complete(&self) -> bool {
        self.density_m2_hz_rad.iter().all(|density| *density >= 0.0 && density.is_finite())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn circle(count: usize, start: f64) -> Vec<f64> {
        (0..count).map(|i| start + i as f64 * TAU / count as f64).collect()
    }

    #[test]
    fn weights_are_those_of_the_trapezoid_or_of_stated_edges() {
        // Trapezoid rule: integral of f over [1, 4] is 7.5, exact for a straight line.
        let axes = SpectrumAxes::new(vec![1.0, 2.0, 4.0], None, circle(4, 0.0)).unwrap();
        let integral: f64 = axes.frequency_hz.iter().zip(&axes.frequency_weight_hz).map(|(f, w)| f * w).sum();
        assert!((integral - 7.5).abs() < 1e-12);
        assert!((axes.frequency_edges_hz[1] - 2f64.sqrt()).abs() < 1e-12);
        let stated = SpectrumAxes::new(vec![1.0, 2.0], Some(vec![1.0, 1.5, 2.0]), circle(4, 0.0)).unwrap();
        assert_eq!(stated.frequency_weight_hz, [0.5, 0.5]);
    }

    #[test]
    fn directions_close_the_circle_or_are_a_sector() {
        for (count, start) in [(24, 0.0), (36, 0.05), (25, 0.1)] {
            let axes = SpectrumAxes::new(vec![0.1, 0.2], None, circle(count, start)).unwrap();
            assert!(axes.full_circle && axes.even_steps);
            assert!((axes.direction_width_rad.iter().sum::<f64>() - TAU).abs() < 1e-12);
        }
        let mut sector = circle(36, 0.0);
        sector.truncate(19);
        let axes = SpectrumAxes::new(vec![0.1, 0.2], None, sector).unwrap();
        assert!(!axes.full_circle && !axes.even_steps);
        assert!((axes.direction_width_rad.iter().sum::<f64>() - 19.0 * TAU / 36.0).abs() < 1e-12);
    }

    #[test]
    fn any_order_and_a_column_stored_twice_are_put_right() {
        let degrees = [90.0, 45.0, 0.0, 315.0, 270.0, 225.0, 180.0, 135.0, 360.0];
        let radians: Vec<f64> = degrees.iter().map(|d: &f64| d.to_radians()).collect();
        let order = circle_order(&radians);
        assert_eq!(order, [2, 1, 0, 7, 6, 5, 4, 3]);
    }

    #[test]
    fn impossible_axes_are_refused_with_what_was_found() {
        let wrong = SpectrumAxes::new(vec![0.2, 0.1], None, circle(4, 0.0)).unwrap_err();
        assert!(wrong.to_string().starts_with("frequency 1 is 0.1 Hz"), "{wrong}");
        let wrong = SpectrumAxes::new(vec![0.1, 0.2], Some(vec![0.1, 0.2]), circle(4, 0.0)).unwrap_err();
        assert!(wrong.to_string().starts_with("2 frequency edges"), "{wrong}");
        let wrong = SpectrumAxes::new(vec![0.1, 0.2], None, vec![0.0, 7.0]).unwrap_err();
        assert!(wrong.to_string().starts_with("direction 1 is 7 rad"), "{wrong}");
    }
}
