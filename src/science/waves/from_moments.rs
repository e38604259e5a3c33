//! What the first directional moments of a buoy say of the overlap: a range over several shapes, never a value.
//!
//! Two distributions can share the mean direction and the first two harmonics and differ in overlap by tens of decibels. So
//! shapes of one, two and three parameters are matched to the harmonics, and the lowest and highest of their overlaps is the
//! range. It may stand beside a model's overlap, but judges nothing.

use super::spreading_law::Distribution;

/// Overlap of the shapes that fit the moments of one frequency, dB re isotropic.
#[derive(Debug, Clone, PartialEq)]
pub struct ShapeRange {
    /// Each shape with its overlap, dB re isotropic.
    pub shapes: Vec<(Distribution, f64)>,
}

impl ShapeRange {
    /// Lowest and highest overlap, dB re isotropic; `None` without a shape.
    pub fn ends_db(&self) -> Option<(f64, f64)> {
        let overlaps = self.shapes.iter().map(|(_, overlap)| *overlap);
        let (low, high) = overlaps.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), o| (a.min(o), b.max(o)));
        (low <= high).then_some((low, high))
    }
}

/// Shapes that have the first harmonic r1 (0 to 1), and where it is known the second harmonic about the mean direction,
/// `centred_r2` = `r2 cos(2 (theta_2 - theta_1))`.
pub fn shapes_of_moments(r1: f64, centred_r2: Option<f64>) -> ShapeRange {
    let mut shapes = Vec::new();
    if r1 > 0.0 && r1 < 1.0 {
        shapes.push(Distribution::CosinePower { s: r1 / (1.0 - r1) });
        shapes.push(Distribution::WrappedNormal { width_rad: (-2.0 * libm::log(r1)).sqrt() });
        shapes.extend(sech_squared(r1));
        shapes.extend(centred_r2.and_then(|r2| two_lobes(r1, r2)));
    } else if r1 == 0.0 {
        shapes.push(Distribution::Isotropic);
    }
    ShapeRange { shapes: shapes.into_iter().map(|shape| (shape, shape.overlap_db())).collect() }
}

/// By bisection: r1 grows with beta. The broadest shape (beta towards 0) is isotropic.
fn sech_squared(r1: f64) -> Option<Distribution> {
    let harmonic = |beta: f64| Distribution::SechSquared { beta }.harmonics().0;
    let (mut low, mut high) = (0.02, 40.0);
    if harmonic(low) > r1 || harmonic(high) < r1 {
        return None;
    }
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if harmonic(middle) < r1 {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some(Distribution::SechSquared { beta: 0.5 * (low + high) })
}

/// r1 = q cos(delta), r2 = q^4 cos(2 delta) with q = exp(-sigma^2 / 2): u = q^2 solves u^2 - 2 r1^2 u + r2 = 0.
fn two_lobes(r1: f64, r2: f64) -> Option<Distribution> {
    let square = r1 * r1;
    let root = square * square - r2;
    let u = square + root.max(0.0).sqrt();
    // Sharper than a wrapped normal (root below 0) or impossible (q above 1): two such lobes do not exist.
    if root < 0.0 || u >= 1.0 {
        return None;
    }
    let half_separation_rad = libm::acos((r1 / u.sqrt()).min(1.0));
    Some(Distribution::TwoLobe { half_separation_rad, width_rad: (-libm::log(u)).sqrt() })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_shape_has_the_moments_that_were_given() {
        for (r1, r2) in [(0.3, -0.5), (0.7, 0.2), (0.9, 0.6), (0.5, 0.0)] {
            let range = shapes_of_moments(r1, Some(r2));
            assert!(range.shapes.len() >= 3);
            for (shape, _) in &range.shapes {
                let (first, second) = shape.harmonics();
                assert!((first - r1).abs() < 1e-6, "{shape:?}: {first}");
                if matches!(shape, Distribution::TwoLobe { .. }) {
                    assert!((second - r2).abs() < 1e-9, "{shape:?}: {second}");
                }
            }
        }
    }

    // Physics reference: two lobes 70/25 have a1 = 0.3109638571, a2 = -0.5234640801 and the overlap 0.1704523931 (+0.30 dB).
    #[test]
    fn the_range_holds_the_shape_that_made_the_moments() {
        let range = shapes_of_moments(0.310_963_857_1, Some(-0.523_464_080_1));
        let (low, high) = range.ends_db().unwrap();
        assert!(low < 0.30 && high > 0.29 && high - low > 1.0, "{low} to {high}");
        let two_lobe = range.shapes.iter().find(|(shape, _)| matches!(shape, Distribution::TwoLobe { .. })).unwrap();
        assert!((two_lobe.1 - 0.298).abs() < 0.01, "{two_lobe:?}");
    }

    #[test]
    fn impossible_moments_have_no_shape() {
        assert_eq!(shapes_of_moments(1.0, None).ends_db(), None);
        assert_eq!(shapes_of_moments(f64::NAN, None).ends_db(), None);
        assert!(shapes_of_moments(0.0, None).ends_db().unwrap().0.abs() < 1e-12);
    }
}
