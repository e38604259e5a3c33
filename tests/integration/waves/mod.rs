//! Waves and the sound of opposing waves: against reference numbers, and what must not change them.

mod invariance;
mod reference_rows;
mod veering;
