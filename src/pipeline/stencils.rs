//! The stencil of a site at each step that is asked for.

use crate::model::{Missing, Stencil};

/// Stencils of a site that stays, or of one that moves.
pub(super) enum Stencils {
    /// One for all steps.
    Fixed(Result<Stencil, Missing>),
    /// One for each step.
    Moving(Vec<Result<Stencil, Missing>>),
}

impl Stencils {
    pub(super) fn at(&self, step: usize) -> &Result<Stencil, Missing> {
        match self {
            Self::Fixed(stencil) => stencil,
            Self::Moving(stencils) => &stencils[step],
        }
    }

    pub(super) fn all(&self) -> &[Result<Stencil, Missing>] {
        match self {
            Self::Fixed(stencil) => std::slice::from_ref(stencil),
            Self::Moving(stencils) => stencils,
        }
    }
}
