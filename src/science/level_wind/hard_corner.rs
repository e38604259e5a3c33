//! Whether the corner between floor and wind part is hard: the higher of the two counts, as in the hinge of Hudson 1966,
//! where powers do not add (levels cut from below by an instrument or by processing, quantiles of a window). It competes with
//! the sum of powers and is taken only where it clearly predicts better; the two are not interchangeable (confused, they move
//! the floor by about one decibel).

use super::corner::CornerTable;
use super::cross_validation::Folds;
use super::fits::{Band, Fit, Starts};
use super::law::{BIN_WIDTH, Corner, Law, Parameters};
use super::need::LEAST_BLOCKS;
use super::options::{Options, ScatterModel};
use super::point::PointFit;
use super::robust::{Settled, huber, residual_scale_db, settle};
use super::start;

/// A fit with a hard corner.
pub(crate) struct Hard {
    pub(crate) band: Band,
    pub(crate) at: Parameters,
    pub(crate) settled: Settled,
}

/// The fit with a hard corner where it was asked for, or where it predicts held-out blocks clearly better.
pub(crate) fn prefer(soft: &PointFit, options: &Options) -> Option<Hard> {
    /// Gains over the sum of powers with a knee, a quadratic and a threshold law from which the hard corner is taken, in
    /// standard errors. (Chosen on simulations: of 60 records of 8760 hours, 55 hard corners are found and none of 300 soft
    /// ones is taken for hard.)
    const LEAST_GAINS: [f64; 3] = [1.5, 0.5, 0.5];
    if options.scatter == ScatterModel::FixedPowerSum {
        return None;
    }
    let scale_db = residual_scale_db(&soft.band, Law::Knee, Corner::Floor, &soft.at);
    let mut hard = first(soft, scale_db);
    if options.scatter == ScatterModel::Estimated && loss(&hard.band, &hard.at) >= loss(&soft.band, &soft.at) {
        return None;
    }
    for _ in 0..2 {
        hard.round_to_class(residual_scale_db(&hard.band, Law::Knee, Corner::Floor, &hard.at));
        hard.settled = settle(&mut hard.band, &mut hard.at, options.loss);
    }
    if options.scatter == ScatterModel::HardCorner {
        return Some(hard);
    }
    let block_h = 2.0 * soft.block_h;
    let folds = Folds::new(&soft.band, block_h);
    if folds.blocks() < LEAST_BLOCKS {
        return None;
    }
    let predict =
        |band: &Band, law: Law, fit: &Fit| Folds::new(band, block_h).predictions(band, law, Corner::Floor, fit);
    let fit = Fit { at: hard.at.clone(), sum_squares: 0.0 };
    let of_hard = predict(&hard.band, Law::Knee, &fit);
    let scale_db = residual_scale_db(&hard.band, Law::Knee, Corner::Floor, &hard.at);
    // A curve with a soft corner may look like a knee with a hard one: it must be worse as well.
    let gains = [Law::Knee, Law::Quadratic, Law::Threshold].map(|law| {
        let fit = match law {
            Law::Knee => Fit { at: soft.at.clone(), sum_squares: 0.0 },
            _ => soft.band.fit(law, Corner::Floor, &start_of(law, &soft.at), Starts::AndLine),
        };
        let of_soft = predict(&soft.band, law, &fit);
        folds.gain_of_corner((&soft.band, law, &of_soft), (&hard.band, Law::Knee, &of_hard), scale_db)
    });
    let enough = gains.iter().zip(LEAST_GAINS).all(|(gain, least)| *gain > least);
    enough.then_some(hard)
}

/// Where the search for a curved law begins.
fn start_of(law: Law, knee: &Parameters) -> Parameters {
    match law {
        Law::Threshold => Parameters { slope: 20.0, bend: 1.0, ..knee.clone() },
        _ => Parameters { bend: 0.0, ..knee.clone() },
    }
}

/// The hinge found by exhaustive search, improved once: enough to see whether it is worth more.
fn first(soft: &PointFit, scale_db: f64) -> Hard {
    let mut band = soft.band.clone();
    band.rows.weight.fill(1.0);
    let hinge = start::hinge(&band.record, &band.level_db);
    let mut at = hinge.repeated(band.rows.deployments());
    let Parameters { slope, bend, .. } = at;
    if band.rows.deployments() > 1 {
        at = Parameters { slope, bend, ..soft.at.clone() };
    }
    let mut hard = Hard { band, at, settled: Settled::No };
    hard.round_to_class(scale_db);
    hard.at = hard.band.fit(Law::Knee, Corner::Floor, &hard.at, Starts::Given).at;
    hard
}

impl Hard {
    /// The corner as a mean over a class of winds sees it, at the present slope.
    fn round_to_class(&mut self, scale_db: f64) {
        let rounding_db = 0.5 * BIN_WIDTH * self.at.slope;
        self.band.hard_corner_rounding_db = Some(rounding_db);
        self.band.table = CornerTable::hard(scale_db, rounding_db);
    }
}

/// Sum of Huber's losses of the levels about a fit, in units of one scale for all fits of a band.
fn loss(band: &Band, at: &Parameters) -> f64 {
    const SCALE_DB: f64 = 1.0;
    let fitted = band.fitted(Law::Knee, Corner::Floor, at);
    band.record.level_db.iter().zip(&fitted).map(|(level, fit)| huber((level - fit) / SCALE_DB)).sum()
}
