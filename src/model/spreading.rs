//! What the comparison of a model's directional spreading with measured sound says.

use super::outcome::causes;
use crate::model::Band;
use serde::{Deserialize, Serialize};

causes! {
    /// Why sound cannot judge the spreading in a class; the default.
    NotIdentified {
        NoLevel = "no_level": "no level was measured",
        NoSpectrum = "no_spectrum": "there is no complete wave spectrum, or it does not reach half of the band's frequency",
        NoOpposingEnergy = "no_opposing_energy": "the model holds no opposing waves there, so it radiates nothing that could be compared",
        LowerBound = "lower_bound": "the model's opposing energy holds zeros and is a lower bound only",
        NoWindSea = "no_wind_sea": "there is no wind sea",
        TailOnly = "tail_only": "tail only: the density there is a laid-on tail, so the sound tests the tail and not the model",
        Blended = "blended": "most of the opposing energy comes from blending different stored spectra",
        SensorTooShallow = "sensor_too_shallow": "the sensor or the water is too shallow for the sound's wavelength",
        BelowPeak = "below_peak": "near and below the wind-sea peak opposing energy is swell, reflection or noise of the model, which the laws of wind seas do not describe",
        LawsAgree = "laws_agree": "spreading laws agree here: the sound tests the density alone",
        Floor = "floor": "floor: the level is too near the quiet floor of the band",
        Instrument = "instrument": "instrument: the level is too near the self-noise of the instrument",
        NoReference = "no_reference": "no reference: too few windows above four times the peak and outside the tail to fix the site offset",
        FewWindows = "few_windows": "too few windows, or too few separate episodes of weather",
        TooUncertain = "too_uncertain": "the interval is wider than the difference between published laws",
    }
}

/// A class of f / fp of the wind sea (f half of the band's centre) and wind speed. Upper ends are not in the class.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SpreadClass {
    /// Lower end of f / fp.
    pub x_low: f64,
    /// Upper end of f / fp; infinite for the last class.
    pub x_high: f64,
    /// Lower end of the wind speed, m/s.
    pub wind_low_m_s: f64,
    /// Upper end of the wind speed, m/s; infinite for the last class.
    pub wind_high_m_s: f64,
}

impl SpreadClass {
    /// Whether it takes all winds.
    pub fn all_winds(&self) -> bool {
        self.wind_low_m_s <= 0.0 && self.wind_high_m_s.is_infinite()
    }

    /// Whether a window belongs to it.
    pub fn holds(&self, x: f64, wind_m_s: f64) -> bool {
        x >= self.x_low
            && x < self.x_high
            && (self.all_winds() || (wind_m_s >= self.wind_low_m_s && wind_m_s < self.wind_high_m_s))
    }

    /// In words: "between 1.5 and 3 fp, 5 to 10 m/s".
    pub fn words(&self) -> String {
        let x = if self.x_high.is_infinite() {
            format!("above {} fp", self.x_low)
        } else if self.x_low <= 0.0 {
            format!("below {} fp", self.x_high)
        } else {
            format!("between {} and {} fp", self.x_low, self.x_high)
        };
        if self.all_winds() {
            x
        } else if self.wind_high_m_s.is_infinite() {
            format!("{x}, wind above {} m/s", self.wind_low_m_s)
        } else {
            format!("{x}, wind {} to {} m/s", self.wind_low_m_s, self.wind_high_m_s)
        }
    }
}

/// What sound says about the spreading in a class.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum SpreadVerdict {
    /// The model has too little opposing energy: it spreads too narrowly.
    TooNarrow,
    /// The model has too much opposing energy: it spreads too widely.
    TooWide,
    /// No difference, within an interval that would have told published laws apart.
    Agrees,
    /// Sound cannot judge it.
    NotIdentified(NotIdentified),
}

impl SpreadVerdict {
    /// Stable name, as tables write it.
    pub fn name(self) -> &'static str {
        match self {
            Self::TooNarrow => "too_narrow",
            Self::TooWide => "too_wide",
            Self::Agrees => "agrees",
            Self::NotIdentified(_) => "not_identified",
        }
    }

    /// Why it is not identified, if it is not.
    pub fn reason(self) -> Option<NotIdentified> {
        match self {
            Self::NotIdentified(why) => Some(why),
            _ => None,
        }
    }
}

/// By how much the sound exceeds what the model radiates, after the site offset, with its 95 % interval, dB.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SpreadDifference {
    /// Measured minus radiated, less the site offset of the reference class: above 0 the model has too little opposing energy.
    pub difference_db: f64,
    /// Lower end.
    pub low_db: f64,
    /// Upper end.
    pub high_db: f64,
    /// The part of the standard error that comes from the record (block bootstrap), dB.
    pub record_sd_db: f64,
}

impl SpreadDifference {
    /// Half of the interval's width, dB.
    pub fn half_width_db(&self) -> f64 {
        0.5 * (self.high_db - self.low_db)
    }
}

/// The comparison in one class of one band.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ClassComparison {
    /// The class.
    pub class: SpreadClass,
    /// Windows in the class.
    pub windows: usize,
    /// Of these, windows that could be used.
    pub used: usize,
    /// Separate episodes (blocks of the bootstrap) that the used windows come from.
    pub episodes: usize,
    /// Median measured band level of the used windows, dB re 1 uPa^2; NaN without any.
    pub measured_db: f64,
    /// Median radiated band level of the used windows, dB re 1 uPa^2.
    pub radiated_db: f64,
    /// Median overlap of the model, dB re isotropic.
    pub model_overlap_db: f64,
    /// Median f / fp of the used windows.
    pub median_x: f64,
    /// Difference between the published laws at that f / fp, dB.
    pub law_range_db: f64,
    /// The difference with its interval, where there is a reference and enough windows.
    pub difference: Option<SpreadDifference>,
    /// What it says.
    pub verdict: SpreadVerdict,
    /// Windows that could not be used, by reason, most frequent first.
    pub unused: Vec<(NotIdentified, usize)>,
}

impl ClassComparison {
    /// The overlap that the sound implies, dB re isotropic, taking the model's density as right.
    pub fn implied_overlap_db(&self) -> Option<f64> {
        self.difference.map(|difference| self.model_overlap_db + difference.difference_db)
    }

    /// The verdict in words. `density` says what bounds E, such as "E taken as known to 1 dB".
    pub fn words(&self, density: &str) -> String {
        let place = self.class.words();
        let by = |difference: &SpreadDifference| {
            format!("{:.0} \u{b1} {:.0} dB", difference.difference_db.abs(), difference.half_width_db().max(0.5))
        };
        match (self.verdict, &self.difference) {
            (SpreadVerdict::TooNarrow, Some(d)) => {
                format!("model spreads too narrowly {place} by {} ({density})", by(d))
            }
            (SpreadVerdict::TooWide, Some(d)) => format!("model spreads too widely {place} by {} ({density})", by(d)),
            (SpreadVerdict::Agrees, Some(d)) => {
                format!(
                    "model agrees with the sound {place}, within {:.0} to {:.0} dB ({density})",
                    d.low_db, d.high_db
                )
            }
            (SpreadVerdict::NotIdentified(why), _) => format!("{place}: not identified: {}", why.sentence()),
            // A verdict other than "not identified" always has its difference.
            _ => format!("{place}: not identified"),
        }
    }
}

/// The site offset, from the reference class.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ReferenceOffset {
    /// Median in the reference class of the measured level minus what the model's density radiates with the middle of the
    /// published laws, dB: what bottom, calibration and the like add.
    pub offset_db: f64,
    /// Windows in the reference class that were used.
    pub windows: usize,
    /// Separate episodes they come from.
    pub episodes: usize,
}

/// One model's spreading against the sound in one band of one sensor.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BandComparison {
    /// The spectra input.
    pub model: String,
    /// The band.
    pub band: Band,
    /// The site offset; `None` where too few windows could fix it.
    pub reference: Option<ReferenceOffset>,
    /// The floor that levels were held against, dB re 1 uPa^2; NaN without levels.
    pub floor_db: f64,
    /// Whether that floor was fitted or stated; else it is a stand-in, the quietest hundredth of the record.
    pub floor_known: bool,
    /// Classes of f / fp over all winds, then each by wind.
    pub classes: Vec<ClassComparison>,
}

/// Sound below this frequency often comes from far away, Hz.
const LEAST_LOCAL_HZ: f64 = 1.0;

impl BandComparison {
    /// What a reader of the verdicts should know, one sentence each.
    pub fn remarks(&self) -> Vec<&'static str> {
        let mut remarks = Vec::new();
        if self.band.centre_hz < LEAST_LOCAL_HZ {
            remarks.push("sound below about 1 Hz often comes from distant seas and need not follow the waves overhead");
        }
        if !self.floor_known {
            remarks.push("no floor is known for this band; its quietest hundredth stands in for it");
        }
        remarks
    }
}

/// What bounds the density, for the words of a verdict. The sound tells E squared times overlap; the overlap alone only where
/// a buoy bounds E.
pub fn density_words(density_sd_db: f64, buoy: bool) -> String {
    if buoy {
        format!("a buoy bounds E to {density_sd_db} dB")
    } else {
        format!("E squared times overlap, with E taken as known to {density_sd_db} dB")
    }
}

/// Two models in the same class of the same band, on the same draws of the bootstrap.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PairedComparison {
    /// Names of the two.
    pub models: [String; 2],
    /// The band.
    pub band: Band,
    /// The class.
    pub class: SpreadClass,
    /// Distance of the first model from the sound minus that of the second, dB: below 0 the first is nearer.
    pub farther_db: f64,
    /// Its 95 % interval.
    pub interval_db: (f64, f64),
}

impl PairedComparison {
    /// Which model the sound is nearer to, where the interval tells.
    pub fn nearer(&self) -> Option<&str> {
        if self.interval_db.1 < 0.0 {
            Some(&self.models[0])
        } else if self.interval_db.0 > 0.0 {
            Some(&self.models[1])
        } else {
            None
        }
    }
}

/// In how many hours of a month sound could judge spreading in a band.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Testability {
    /// Year and month (1 to 12).
    pub month: (i32, u32),
    /// The band.
    pub band: Band,
    /// Windows with a level in the month.
    pub windows: usize,
    /// Of these, windows in which sound could judge.
    pub testable: usize,
    /// Why not in the others, most frequent first.
    pub reasons: Vec<(NotIdentified, usize)>,
}

impl Testability {
    /// Share of the windows in which sound could judge; NaN without windows.
    pub fn share(&self) -> f64 {
        self.testable as f64 / self.windows as f64
    }
}
