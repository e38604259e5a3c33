//! The sites and bands of a table, as lists that rows point into.

use crate::model::Band;
use std::collections::HashMap;

/// The sites and bands of a table. Rows carry indices into them; both lists grow while rows are read.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct LevelNames {
    /// Site names.
    pub sites: Vec<String>,
    /// Bands.
    pub bands: Vec<Band>,
}

/// The growing lists of sites and bands, found again by their text.
#[derive(Debug, Clone, Default)]
pub(super) struct Registry {
    pub(super) names: LevelNames,
    sites: HashMap<Vec<u8>, u32>,
    bands: HashMap<Vec<u8>, u32>,
}

impl Registry {
    /// The index of a site, new or not.
    pub(super) fn site(&mut self, name: &str) -> u32 {
        if let Some(index) = self.sites.get(name.as_bytes()) {
            return *index;
        }
        let index = self.names.sites.len() as u32;
        self.names.sites.push(name.to_owned());
        self.sites.insert(name.as_bytes().to_vec(), index);
        index
    }

    /// The index of a band whose text was met before.
    pub(super) fn known_band(&self, text: &[u8]) -> Option<u32> {
        self.bands.get(text).copied()
    }

    /// The index of a band, new or not; further texts for the same band share it.
    pub(super) fn band(&mut self, text: &[u8], band: Band) -> u32 {
        let same = self.names.bands.iter().position(|known| known.same_as(band));
        let index = same.unwrap_or(self.names.bands.len()) as u32;
        if same.is_none() {
            self.names.bands.push(band);
        }
        self.bands.insert(text.to_vec(), index);
        index
    }
}
