//! A relation with what it belongs to.

use crate::model::{Band, LevelKind, Relation, SourceId};
use serde::Serialize;

/// The relation of one band at one sensor to the wind of one source.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FittedBand {
    /// The wind input.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
    /// The band; `None` for a table of pairs that names none.
    pub band: Option<Band>,
    /// What the levels describe; `None` for a table of pairs, which does not say it.
    pub kind: Option<LevelKind>,
    /// The relation.
    pub relation: Relation,
}

impl FittedBand {
    /// Label of the band with its unit; "all" without one.
    pub fn band_label(&self) -> String {
        self.band.map_or_else(|| "all".to_owned(), Band::label)
    }
}
