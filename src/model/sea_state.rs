//! What a directional spectrum says about the sea: the reductions that tables, figures and comparisons use.

/// Reductions at every frequency of a spectrum; all vectors follow its frequency axis, missing numbers are NaN.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct FrequencyStates {
    /// Variance density E(f), m2/Hz.
    pub density_m2_hz: Vec<f64>,
    /// Mean direction that the waves come from, degrees clockwise from true north.
    pub mean_from_deg: Vec<f64>,
    /// Directional spread from the first moments (Kuik et al. 1988), degrees.
    pub spread_deg: Vec<f64>,
    /// Overlap of opposing waves over 0 to 2 pi from pairs of opposite bins, 1/rad. Missing where there is no energy,
    /// where the directions are a sector, or where no pair of opposite bins exists (an odd number, uneven steps).
    pub overlap_2pi_bins_per_rad: Vec<f64>,
    /// The same from the Fourier sum over all harmonics that the directions resolve, 1/rad.
    pub overlap_2pi_fourier_per_rad: Vec<f64>,
    /// Share of the pairs of opposite bins in which at least one is zero: above 0 the overlap is a lower bound only.
    pub zero_pair_share: Vec<f64>,
}

/// The part of a sea that the wind drives.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WindSea {
    /// Significant height of the wind-sea part, m.
    pub hs_m: f64,
    /// Peak frequency of the wind sea (parabola through the largest bin and its neighbours), Hz.
    pub peak_hz: f64,
    /// Mean direction the wind sea comes from, degrees.
    pub mean_from_deg: f64,
    /// Phase speed at the peak over the wind speed.
    pub wave_age: f64,
}

/// Reductions of one directional spectrum; missing numbers are NaN.
#[derive(Debug, Clone, PartialEq)]
pub struct SeaState {
    /// Variance of the elevation, m2.
    pub m0_m2: f64,
    /// Significant height, 4 sqrt(m0), m.
    pub hs_m: f64,
    /// Mean period m0/m1, s.
    pub tm01_s: f64,
    /// Mean period sqrt(m0/m2), s.
    pub tm02_s: f64,
    /// Energy period m-1/m0, s.
    pub tm10_s: f64,
    /// Frequency of the largest bin of E(f), Hz.
    pub peak_bin_hz: f64,
    /// Peak frequency: vertex of the parabola through the largest bin and its neighbours, Hz.
    pub peak_hz: f64,
    /// Mean direction that the waves come from, from the first moments of the whole spectrum, degrees.
    pub mean_from_deg: f64,
    /// Directional spread from the first moments of the whole spectrum (Kuik et al. 1988), degrees.
    pub spread_deg: f64,
    /// The wind sea; `None` where there is no wind or no wind sea.
    pub wind_sea: Option<WindSea>,
    /// Significant height of what is not wind sea, m; NaN where there is no wind.
    pub swell_hs_m: f64,
    /// Lowest frequency from which on the density follows one power law with frozen directions: a tail that was laid on
    /// and not computed, Hz. `None` where none is found.
    pub tail_start_hz: Option<f64>,
    /// Frequency by frequency.
    pub by_frequency: FrequencyStates,
}

/// One system of waves in a spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WaveSystem {
    /// Frequency of its highest bin, Hz.
    pub peak_hz: f64,
    /// Mean direction it comes from, degrees.
    pub from_deg: f64,
    /// Significant height, m.
    pub hs_m: f64,
    /// Whether it is wind sea; `None` without wind.
    pub wind_sea: Option<bool>,
}

/// Two systems against each other at one stored step and node.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OpposingSeas {
    /// The two, the higher first.
    pub systems: [WaveSystem; 2],
    /// Frequency at which their joint overlap is strongest, Hz; the sound has twice this frequency.
    pub frequency_hz: f64,
    /// E^2 times overlap of the two systems there, m4/Hz2/rad.
    pub joint_overlap: f64,
    /// Share of it in the whole overlap at that frequency.
    pub joint_share: f64,
}

/// Overlap of opposing waves in a spectrum that was blended from stored ones (nodes and steps) with linear weights. Each is
/// the integral of E(t) E(t + pi) over 0 to 2 pi at one frequency, m4/Hz2/rad, so that parts add.
///
/// Blending two seas that run in different directions puts both into one spectrum and so invents opposing waves. The
/// quadratic form over all pairs of stored spectra, each pair with the product of its weights, tells how much.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct OverlapParts {
    /// Pairs of a stored spectrum with itself: the square of its weight times its overlap.
    pub diagonal: f64,
    /// Pairs of different stored spectra: the product of their weights times their joint overlap.
    pub cross: f64,
    /// What the stored spectra have on their own: weight times overlap, summed. It equals the total when all are the same.
    pub own: f64,
}

impl OverlapParts {
    /// The overlap of the blended spectrum.
    pub fn total(self) -> f64 {
        self.diagonal + self.cross
    }

    /// Share of the overlap that exists in no stored spectrum and comes from blending alone, 0 to 1:
    /// (total - own) / total where that is positive. The bare ratio of cross to total is no use here: it is 3/4 for four
    /// equal neighbours with one and the same sea. NaN where there is no overlap.
    pub fn cross_share(self) -> f64 {
        let total = self.total();
        if total > 0.0 { ((total - self.own) / total).clamp(0.0, 1.0) } else { f64::NAN }
    }

    /// The sum of two, each with its weight (a mean over time).
    #[must_use]
    pub fn plus(self, weight: f64, other: Self) -> Self {
        Self {
            diagonal: self.diagonal + weight * other.diagonal,
            cross: self.cross + weight * other.cross,
            own: self.own + weight * other.own,
        }
    }
}

/// Rows whose overlap owes more than this share to blending are flagged and stay out of verdicts.
pub const CROSS_SHARE_LIMIT: f64 = 0.5;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn equal_neighbours_have_no_share_of_their_own_making() {
        // Four equal spectra of overlap 2 with weights 1/4: diagonal 4 x 2/16, cross 12 x 2/16, own 2.
        let parts = OverlapParts { diagonal: 0.5, cross: 1.5, own: 2.0 };
        assert!((parts.total() - 2.0).abs() < 1e-15 && parts.cross_share().abs() < 1e-15);
        // Two single seas that oppose each other: all of it is invented.
        let parts = OverlapParts { diagonal: 0.0, cross: 0.7, own: 0.0 };
        assert!((parts.cross_share() - 1.0).abs() < 1e-15 && parts.cross_share() > CROSS_SHARE_LIMIT);
        assert!(OverlapParts::default().cross_share().is_nan());
    }
}
