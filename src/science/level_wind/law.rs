//! The laws of the wind part and its derivatives.
//!
//! With x = log10(U / 10 m/s) the wind part is, in dB: line `A + S x`; knee `A + S min(x, x_s)`, with a slope of its own
//! above the onset `+ S2 (x - x_s)+`; quadratic `A + S x + Q x^2`; threshold power `A + S log10((U - U0) / (10 - U0))`.
//! The level is `F + h(W - F)`, h from [`super::corner`]. The knee with one break is the hinge of Hudson 1966.

/// Wind speed to which x refers, m/s.
pub(crate) const REFERENCE_WIND_M_S: f64 = 10.0;
/// Winds are grouped in this many classes of equal width in x.
pub(crate) const BINS: usize = 96;
/// log10(0.5 / 10): lower edge of the first class.
pub(crate) const BIN_LOW: f64 = -1.301_029_995_663_981_3;
/// log10(40 / 10): upper edge of the last class.
pub(crate) const BIN_HIGH: f64 = 0.602_059_991_327_962_4;
/// Width of a class in x.
pub(crate) const BIN_WIDTH: f64 = (BIN_HIGH - BIN_LOW) / BINS as f64;
/// Width that stands for a single wind speed.
pub(crate) const POINT_WIDTH: f64 = 1e-9;
/// Largest slope, dB per decade.
pub(crate) const GREATEST_SLOPE: f64 = 150.0;
/// Bounds of the curvature Q of the quadratic law, dB per squared decade.
pub(crate) const CURVATURE_BOUNDS: (f64, f64) = (-200.0, 60.0);

/// Law of the wind part. What "bend" means depends on it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Law {
    /// Straight; the bend is not used.
    Line,
    /// Constant above the onset; the bend is the onset in x.
    Knee,
    /// As the knee, with a slope of its own above the onset.
    FreeKnee,
    /// The bend is Q.
    Quadratic,
    /// The bend is U0, m/s.
    Threshold,
}

/// Whether the curve has a floor.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Corner {
    /// A floor and the soft corner h.
    Floor,
    /// The wind part alone.
    Bare,
}

/// Parameters of the mean curve. Floors and wind parts have one entry per deployment.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Parameters {
    /// F, dB.
    pub(crate) floor_db: Vec<f64>,
    /// A, dB at 10 m/s.
    pub(crate) wind_db: Vec<f64>,
    /// S, dB per decade.
    pub(crate) slope: f64,
    /// Onset in x, Q, or U0: see [`Law`].
    pub(crate) bend: f64,
    /// S2, dB per decade.
    pub(crate) post_slope: f64,
}

impl Parameters {
    /// Copies without allocating where the sizes match.
    pub(crate) fn copy_from(&mut self, other: &Self) {
        self.floor_db.clone_from(&other.floor_db);
        self.wind_db.clone_from(&other.wind_db);
        self.slope = other.slope;
        self.bend = other.bend;
        self.post_slope = other.post_slope;
    }

    /// The same with another bend.
    pub(crate) fn with_bend(&self, bend: f64) -> Self {
        Self { bend, ..self.clone() }
    }

    /// Largest absolute difference of any parameter.
    pub(crate) fn distance(&self, other: &Self) -> f64 {
        let pairs = self.floor_db.iter().zip(&other.floor_db).chain(self.wind_db.iter().zip(&other.wind_db));
        let shape = [(self.slope, other.slope), (self.bend, other.bend), (self.post_slope, other.post_slope)];
        pairs.map(|(a, b)| (a - b).abs()).chain(shape.map(|(a, b)| (a - b).abs())).fold(0.0, f64::max)
    }

    /// One deployment's parameters repeated for `count` deployments.
    pub(crate) fn repeated(&self, count: usize) -> Self {
        Self { floor_db: vec![self.floor_db[0]; count], wind_db: vec![self.wind_db[0]; count], ..self.clone() }
    }
}

/// The wind part without A, and its derivatives with respect to slope, bend and slope above the onset.
#[derive(Debug, Clone, Copy)]
pub(crate) struct WindTerm {
    pub(crate) value: f64,
    pub(crate) by_slope: f64,
    pub(crate) by_bend: f64,
    pub(crate) by_post_slope: f64,
}

/// x of a wind speed.
pub(crate) fn x_of(wind_m_s: f64) -> f64 {
    libm::log10(wind_m_s / REFERENCE_WIND_M_S)
}

/// Wind speed of an x, m/s.
pub(crate) fn wind_of(x: f64) -> f64 {
    REFERENCE_WIND_M_S * libm::exp10(x)
}

/// Wind part without A at x. In a class of width `width` the knee takes the mean of `min(x', x_s)` over the class,
/// `x_s - (x_s - a)^2 / (2 width)` with a the lower edge, so that the curve is differentiable in the onset.
#[inline(always)]
#[expect(clippy::inline_always, reason = "the innermost loop: a known law must leave no branch")]
pub(crate) fn wind_term(law: Law, slope: f64, bend: f64, post_slope: f64, x: f64, width: f64) -> WindTerm {
    match law {
        Law::Line => WindTerm { value: slope * x, by_slope: x, by_bend: 0.0, by_post_slope: 0.0 },
        Law::Quadratic => WindTerm { value: slope * x + bend * x * x, by_slope: x, by_bend: x * x, by_post_slope: 0.0 },
        Law::Threshold => threshold_term(slope, bend, x),
        Law::Knee | Law::FreeKnee => {
            let lower = x - 0.5 * width;
            let (mean, weight) = if bend <= lower {
                (bend, 1.0)
            } else if bend < x + 0.5 * width {
                let inside = bend - lower;
                (bend - inside * inside / (2.0 * width), 1.0 - inside / width)
            } else {
                (x, 0.0)
            };
            let above = x - mean;
            let post = if law == Law::FreeKnee { post_slope } else { 0.0 };
            WindTerm {
                value: slope * mean + post * above,
                by_slope: mean,
                by_bend: (slope - post) * weight,
                by_post_slope: above,
            }
        }
    }
}

#[inline(never)]
fn threshold_term(slope: f64, threshold_m_s: f64, x: f64) -> WindTerm {
    /// Winds closer to the threshold than this, m/s, count as this far above it: the logarithm must stay finite.
    const LEAST_EXCESS_M_S: f64 = 1e-3;
    let excess = wind_of(x) - threshold_m_s;
    let reference = REFERENCE_WIND_M_S - threshold_m_s;
    let logarithm = libm::log10(excess.max(LEAST_EXCESS_M_S) / reference);
    let by_bend = if excess < LEAST_EXCESS_M_S {
        0.0
    } else {
        slope / std::f64::consts::LN_10 * (1.0 / reference - 1.0 / excess)
    };
    WindTerm { value: slope * logarithm, by_slope: logarithm, by_bend, by_post_slope: 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn class_edges_are_half_and_forty_metres_per_second() {
        assert!((BIN_LOW - x_of(0.5)).abs() < 1e-15 && (BIN_HIGH - x_of(40.0)).abs() < 1e-15);
    }

    #[test]
    fn derivatives_are_derivatives() {
        let step = 1e-6;
        for (law, bend) in
            [(Law::Line, 0.0), (Law::Knee, 0.1), (Law::FreeKnee, 0.1), (Law::Quadratic, -20.0), (Law::Threshold, 3.0)]
        {
            for x in [-0.4, 0.092, 0.1, 0.107, 0.3] {
                let at = |slope: f64, bend: f64, post: f64| wind_term(law, slope, bend, post, x, BIN_WIDTH).value;
                let term = wind_term(law, 30.0, bend, -5.0, x, BIN_WIDTH);
                let numeric = [
                    (at(30.0 + step, bend, -5.0) - at(30.0 - step, bend, -5.0)) / (2.0 * step),
                    (at(30.0, bend + step, -5.0) - at(30.0, bend - step, -5.0)) / (2.0 * step),
                    (at(30.0, bend, -5.0 + step) - at(30.0, bend, -5.0 - step)) / (2.0 * step),
                ];
                let post = if law == Law::FreeKnee { term.by_post_slope } else { 0.0 };
                for (numeric, exact) in numeric.iter().zip([term.by_slope, term.by_bend, post]) {
                    assert!((numeric - exact).abs() < 2e-3, "{law:?} at {x}: {numeric} {exact}");
                }
            }
        }
    }
}
