//! Outcomes as values: a number, a number with named flags, or a named reason why there is none.

use serde::{Deserialize, Serialize};

/// Declares an enum of named causes, each with its stable name and one sentence, so that none can lack either.
macro_rules! causes {
    ($(#[$outer:meta])* $name:ident { $($(#[$inner:meta])* $variant:ident = $text:literal : $sentence:literal,)+ }) => {
        $(#[$outer])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
        #[serde(rename_all = "snake_case")]
        pub enum $name { $($(#[$inner])* #[doc = $sentence] $variant,)+ }

        impl $name {
            /// All of them, in the order of the documentation.
            pub const ALL: &'static [Self] = &[$(Self::$variant,)+];

            /// Its stable name, as tables and JSON write it.
            pub fn name(self) -> &'static str {
                match self { $(Self::$variant => $text,)+ }
            }

            /// One sentence that explains it.
            pub fn sentence(self) -> &'static str {
                match self { $(Self::$variant => $sentence,)+ }
            }
        }

        impl std::fmt::Display for $name {
            fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                formatter.write_str(self.name())
            }
        }
    };
}
pub(crate) use causes;

causes! {
    /// A remark that a value carries: it stands, but the reader should know this.
    Flag {
        CoastRenormalised = "coast_renormalised": "some of the grid nodes around the site are land or missing; the weights of the others were scaled up to one",
        NearestNode = "nearest_node": "the value is that of the nearest grid node, not interpolated",
        BridgedMissingStep = "bridged_missing_step": "a missing model step was bridged in time, within the allowed gap",
        PreliminaryVersion = "preliminary_version": "part of the field is a preliminary version that the archive may still replace",
        AveragedField = "averaged_field": "the field is an average over a period (`cell_methods`), not a value at an instant",
        PoleRow = "pole_row": "the site lies between the last grid row and the pole, where one pole value serves all longitudes",

        NearestStation = "nearest_station": "the value is that of the nearest station, within the distance limit",
        StationPlaceUnknown = "station_place_unknown": "the file does not say where its only station is; it is taken to be at the site",
        FewSamples = "few_samples": "the window holds fewer level samples than expected",
    }
}

causes! {
    /// Why there is no value.
    Missing {
        OutsideGrid = "outside_grid": "the site lies outside the grid",
        OutsideTime = "outside_time": "the time lies before the first or after the last step of the field",
        TimeGap = "time_gap": "the field has a gap in time longer than the limit (`max_gap_h`)",
        LandOrMissing = "land_or_missing": "all grid nodes around the site, or one that the coast rule needs, are land or missing",
        BeyondDistance = "beyond_distance": "the nearest station or node is farther than the distance limit",
        NoPosition = "no_position": "the track gives no position at this time",
        NoLevel = "no_level": "there is no level in the window",
        NotFinite = "not_finite": "the level is not a finite number",
        MissingCode = "missing_code": "the level is one of the codes for a missing value",
        QualityFlag = "quality_flag": "the row's quality flag excludes it",
        DuplicateRow = "duplicate_row": "the same site, band and window came before; the first one counts",
        OutsideDeployment = "outside_deployment": "the time lies outside the sensor's deployment",
        UnknownSite = "unknown_site": "the table names a site that the study does not have",
        ShortEvent = "short_event": "the level is raised in most bands at once for a few hours, as by a passing ship; the screen (`relation.screen`) leaves it out",
        Excluded = "excluded": "an exclusion rule of the study applies",
        NoWind = "no_wind": "there is no wind for the window",
        NoValue = "no_value": "the wind table has no value at this step",
        IncompleteSpectrum = "incomplete_spectrum": "some densities of the spectrum are missing, and missing is not zero",
        NoEnergy = "no_energy": "the spectrum holds no energy: it has no period, no direction and no overlap",
        NoSpectrum = "no_spectrum": "there is no wave spectrum for this place and time",
        NoWindSea = "no_wind_sea": "the wind drives no part of this sea, or there is no wind for it",
        NoFrequency = "no_frequency": "the frequency lies outside the spectrum",
        NoOpposingEnergy = "no_opposing_energy": "the spectrum holds no energy in opposite directions at this frequency: the radiated level is undefined, not zero",
        SectorOfDirections = "sector_of_directions": "the directions of the spectrum are a sector: opposing waves cannot be judged",
        NoTail = "no_tail": "no laid-on tail is found in the spectrum",
        MomentsOnly = "moments_only": "the source gives directional moments alone, which do not tell the overlap of opposing waves",
    }
}

/// A value with its flags, or the reason why there is none.
#[derive(Debug, Clone, PartialEq)]
pub enum Sampled<T> {
    /// A value without remark.
    Ok(T),
    /// A value that carries remarks.
    Flagged(T, FlagSet),
    /// No value, and why.
    Missing(Missing),
}

impl<T> Sampled<T> {
    /// A value with flags; `Ok` when there are none.
    pub fn with_flags(value: T, flags: FlagSet) -> Self {
        if flags.is_empty() { Self::Ok(value) } else { Self::Flagged(value, flags) }
    }

    /// The value, if there is one.
    pub fn value(&self) -> Option<&T> {
        match self {
            Self::Ok(value) | Self::Flagged(value, _) => Some(value),
            Self::Missing(_) => None,
        }
    }

    /// The flags; empty where there are none.
    pub fn flags(&self) -> FlagSet {
        match self {
            Self::Flagged(_, flags) => *flags,
            Self::Ok(_) | Self::Missing(_) => FlagSet::default(),
        }
    }

    /// The reason, where there is no value.
    pub fn missing(&self) -> Option<Missing> {
        match self {
            Self::Missing(why) => Some(*why),
            Self::Ok(_) | Self::Flagged(..) => None,
        }
    }
}

/// A set of flags, small enough to keep beside every value.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Hash)]
pub struct FlagSet(u32);

impl FlagSet {
    /// The set of one flag.
    pub fn of(flag: Flag) -> Self {
        Self(1 << (flag as u32))
    }

    /// Whether there is no flag.
    pub fn is_empty(self) -> bool {
        self.0 == 0
    }

    /// Whether this flag is in it.
    pub fn has(self, flag: Flag) -> bool {
        self.0 & (1 << (flag as u32)) != 0
    }

    /// Both sets together.
    #[must_use]
    pub fn union(self, other: Self) -> Self {
        Self(self.0 | other.0)
    }

    /// Adds a flag.
    pub fn insert(&mut self, flag: Flag) {
        self.0 |= 1 << (flag as u32);
    }

    /// Its flags, in the order of the documentation.
    pub fn iter(self) -> impl Iterator<Item = Flag> {
        Flag::ALL.iter().copied().filter(move |flag| self.has(*flag))
    }

    /// The names, joined by a space; empty when there are none.
    pub fn names(self) -> String {
        self.iter().map(Flag::name).collect::<Vec<_>>().join(" ")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_are_unique_and_sentences_are_sentences() {
        let mut names: Vec<&str> =
            Flag::ALL.iter().map(|f| f.name()).chain(Missing::ALL.iter().map(|m| m.name())).collect();
        let count = names.len();
        names.sort_unstable();
        names.dedup();
        assert_eq!(names.len(), count);
        assert!(Missing::ALL.iter().all(|why| why.sentence().len() > 20));
    }

    #[test]
    fn a_set_of_flags_keeps_what_was_put_in() {
        let mut set = FlagSet::of(Flag::NearestNode);
        set.insert(Flag::AveragedField);
        assert_eq!(set.names(), "nearest_node averaged_field");
        assert_eq!(Sampled::with_flags(1.0, FlagSet::default()), Sampled::Ok(1.0));
    }
}
