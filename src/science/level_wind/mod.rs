//! Level against wind speed: quiet floor, slope, saturation onset, each with an honest interval or an honest "not resolved".
//!
//! The mean level of a band is `F + h(W(U) - F)`: a floor F, a wind part W that rises with the logarithm of the wind speed U
//! up to an onset, and a corner h whose shape follows from how floor and wind part fluctuate (or is hard). [`fit_site`] fits all bands of
//! a site, [`fit_band`] one.

mod ascent;
mod bands;
mod bootstrap;
mod corner;
mod cross_validation;
mod dependence;
mod diagnostics;
mod draws;
mod fit;
mod fits;
mod hard_corner;
mod lag;
mod law;
mod need;
mod normal;
mod options;
mod outcome;
mod point;
mod record;
mod residuals;
mod resolve;
mod robust;
mod scatter;
mod screen;
mod solve;
mod start;
mod summary;
mod verdict;
mod wind_error;

pub use bands::common_onset;
pub use fit::{SiteRecord, fit_band, fit_site};
pub use lag::{LagLoss, LagSearch, search_lag};
pub use options::{KeepReplicates, Loss, Options, ScatterModel, Segments};
pub use residuals::{ResidualClass, drift_db_per_year, residual_classes, residuals};
pub use screen::{ScreenOptions, ScreenedEvents, screen_short_events};
pub use wind_error::correct_for_wind_error;
