//! What the choices of an analysis do to its result.

use crate::model::{FittedBand, Resolved};

/// One choice: what is decided, and how it was decided this time.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Choice {
    /// What is decided, such as "wind over the window".
    pub about: &'static str,
    /// The decision, such as "speed of the mean components".
    pub taken: String,
}

/// A band fitted once more under another choice, beside the study's own result.
#[derive(Debug, Clone, PartialEq)]
pub struct Refit {
    /// The other choice.
    pub choice: Choice,
    /// The study's own result.
    pub base: FittedBand,
    /// The result under the other choice.
    pub other: FittedBand,
}

/// A quantity of the relation that choices can move.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Moved {
    /// Floor, dB.
    Floor,
    /// Slope, dB per decade.
    Slope,
    /// Onset, m/s.
    Onset,
}

impl Moved {
    /// All of them.
    pub const ALL: [Self; 3] = [Self::Floor, Self::Slope, Self::Onset];

    /// The quantity of a fitted band.
    pub fn of(self, fitted: &FittedBand) -> Resolved {
        match self {
            Self::Floor => fitted.relation.floor_db,
            Self::Slope => fitted.relation.slope_db_per_decade,
            Self::Onset => fitted.relation.onset_m_s,
        }
    }
}

impl Refit {
    /// Whether both belong to one sensor.
    pub fn of_same_sensor(&self, other: &Self) -> bool {
        (&self.base.site, &self.base.sensor) == (&other.base.site, &other.base.sensor)
    }

    /// Whether both are of one choice.
    pub fn of_same_choice(&self, other: &Self) -> bool {
        self.choice == other.choice
    }

    /// How far the choice moves a quantity, in the quantity's unit; `None` where either fit does not resolve it.
    pub fn shift(&self, quantity: Moved) -> Option<f64> {
        Some(quantity.of(&self.other).estimate()? - quantity.of(&self.base).estimate()?)
    }

    /// The shift over half the width of the study's 95 % interval: above 1, the choice matters more than the sample.
    pub fn shift_in_half_intervals(&self, quantity: Moved) -> Option<f64> {
        let (low, high) = quantity.of(&self.base).interval()?;
        let half = (high - low) / 2.0;
        (half > 0.0).then(|| self.shift(quantity).map(|shift| shift / half))?
    }

    /// Whether the data say something else about the onset.
    pub fn verdict_changes(&self) -> bool {
        self.base.relation.verdict != self.other.relation.verdict
    }
}
