//! Brings levels and radiated levels of every sensor to the comparison.

use crate::config::Study;
use crate::model::{
    BandSea, Conditions, FittedBand, LevelKind, Radiated, Resolved, SensorRecord, SensorSpreading, SourceId,
};
use crate::pipeline::fitting::wind_speed_m_s;
use crate::pipeline::matching::Matched;
use crate::pipeline::progress::Progress;
use crate::science::spreading::{BandFloor, BandWindows, LawTable, ModelWindows, compare, testability};
use crate::units::Instant;
use std::f64::consts::TAU;

/// Inverse wave age U10 / cp for which the published laws are taken: a fully grown sea.
const INVERSE_WAVE_AGE: f64 = 1.0;

/// One band of one model, window by window.
struct OfBand {
    radiated: Vec<Radiated>,
    f_over_fp: Vec<f64>,
    overlap_db: Vec<f64>,
}

/// Compares every sensor whose site has spectra; `fitted` gives the floors, where there are fits.
pub(in crate::pipeline) fn compare_spreading(
    study: &Study,
    matched: &Matched,
    fitted: &[FittedBand],
    progress: &dyn Progress,
) -> Vec<SensorSpreading> {
    let laws = LawTable::new(INVERSE_WAVE_AGE);
    progress.start(matched.records.len() as u64, "comparing spreading");
    let mut all = Vec::new();
    for (number, record) in matched.records.iter().enumerate() {
        if !matched.sea.conditions[number].is_empty() {
            all.push(of_sensor(study, matched, fitted, number, record, &laws));
        }
        progress.advance(1);
    }
    progress.finish();
    all
}

fn of_sensor(
    study: &Study,
    matched: &Matched,
    fitted: &[FittedBand],
    number: usize,
    record: &SensorRecord,
    laws: &LawTable,
) -> SensorSpreading {
    let conditions = &matched.conditions[number];
    let seas = &matched.sea.conditions[number];
    let bands: Vec<usize> =
        (0..record.bands.len()).filter(|k| study.spreading.compares(record.bands[*k].band.centre_hz)).collect();
    let models: Vec<(String, Vec<OfBand>)> = (0..seas.len())
        .map(|input| {
            let windows = 0..record.windows.len();
            let rows = matched.sea.rows(study, record, number, input, conditions, windows);
            let of_bands = bands.iter().map(|band| of_band(rows.as_ref().map_or(&[], |r| &r.bands), record, *band));
            (seas[input].source.0.clone(), of_bands.collect())
        })
        .collect();
    // The wind that tells wind sea from swell of the first model, for the classes of wind.
    let wind_id = seas.iter().find_map(|sea| sea.wind.as_ref());
    let wind = conditions.iter().find(|conditions| Some(&conditions.source) == wind_id);
    let times_ms: Vec<i64> = record.windows.iter().map(|window| window.start.0).collect();
    let speeds: Vec<f64> = (0..times_ms.len())
        .map(|k| wind_speed_m_s(wind.and_then(|wind| wind.wind[k].as_ref()), study.matching.wind_speed))
        .collect();
    let mut spreading = SensorSpreading::new(record, study.spreading.options.density_sd_db);
    for (place, band) in bands.iter().enumerate() {
        let levels = band_levels_db(record, *band, wind);
        let windows = BandWindows {
            band: record.bands[*band].band,
            times_ms: &times_ms,
            level_db: &levels,
            wind_speed_m_s: &speeds,
            floor: floor(record, *band, wind_id, fitted),
        };
        let of_models: Vec<ModelWindows<'_>> = models
            .iter()
            .map(|(model, bands)| ModelWindows {
                model,
                radiated: &bands[place].radiated,
                f_over_fp: &bands[place].f_over_fp,
                overlap_db: &bands[place].overlap_db,
            })
            .collect();
        let (comparisons, pairs) = compare(&windows, &of_models, laws, &study.spreading.options);
        spreading.comparisons.extend(comparisons);
        spreading.pairs.extend(pairs);
        for model in &of_models {
            let months = testability(&windows, model, laws, &study.spreading.options, month_of);
            spreading.testability.extend(months.into_iter().map(|month| (model.model.to_owned(), month)));
        }
    }
    spreading
}

fn month_of(ms: i64) -> (i32, u32) {
    Instant(ms).year_month_hour().map_or((1970, 1), |(year, month, _)| (year, month))
}

fn of_band(rows: &[BandSea], record: &SensorRecord, band: usize) -> OfBand {
    let of = rows.iter().skip(band).step_by(record.bands.len());
    let mut out = OfBand { radiated: Vec::new(), f_over_fp: Vec::new(), overlap_db: Vec::new() };
    for sea in of {
        out.radiated.push(sea.radiated);
        out.f_over_fp.push(sea.f_over_fp);
        out.overlap_db.push(10.0 * libm::log10(TAU * sea.overlap_2pi_per_rad));
    }
    out
}

/// Levels of a band as band levels; NaN where the row is not used.
fn band_levels_db(record: &SensorRecord, band: usize, wind: Option<&Conditions>) -> Vec<f64> {
    let levels = &record.bands[band];
    let shift = record.kind.to_other_db(LevelKind::BandLevel, levels.band);
    let used = |k: usize| wind.is_none_or(|wind| wind.pair_reason(record, band, k).is_none());
    (0..record.windows.len()).map(|k| if used(k) { levels.level_db[k] + shift } else { f64::NAN }).collect()
}

/// The floor that the fit of level against wind found, as a band level.
fn floor(record: &SensorRecord, band: usize, wind: Option<&SourceId>, fitted: &[FittedBand]) -> BandFloor {
    let of_band = record.bands[band].band;
    let found = fitted.iter().find(|f| {
        Some(&f.source) == wind && f.site == record.site && f.sensor == record.sensor && f.band == Some(of_band)
    });
    let shift = record.kind.to_other_db(LevelKind::BandLevel, of_band);
    let fitted_db = found.and_then(|f| match f.relation.floor_db {
        Resolved::Value { estimate, .. } => Some(estimate + shift),
        Resolved::AtMost(bound) => Some(bound + shift),
        Resolved::AtLeast(_) | Resolved::NotResolved(_) => None,
    });
    BandFloor { fitted_db, instrument_db: None }
}
