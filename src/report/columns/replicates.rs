//! Bootstrap replicates, for whoever wants to carry the uncertainty on.

use crate::model::{ColumnData, FittedBand, Table};

/// One row per band and replicate; the same number is the same draw in all bands of a sensor.
pub fn replicates_table(bands: &[FittedBand]) -> Table {
    let rows: Vec<(&FittedBand, usize)> = bands
        .iter()
        .filter_map(|band| Some((band, band.relation.replicates.as_ref()?.slope_db_per_decade.len())))
        .flat_map(|(band, count)| (0..count).map(move |number| (band, number)))
        .collect();
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&FittedBand) -> &str| {
        let texts: Vec<&str> = rows.iter().map(|(band, _)| pick(band)).collect();
        ColumnData::from_texts(texts)
    };
    let kept = |pick: fn(&crate::model::Replicates) -> &[f64]| {
        let value = |band: &FittedBand, number: usize| {
            band.relation.replicates.as_ref().and_then(|kept| pick(kept).get(number).copied())
        };
        ColumnData::Number(rows.iter().map(|(band, number)| value(band, *number).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the wind input", text(&|band| &band.source.0));
    table.push("site", "", "id of the site", text(&|band| &band.site));
    table.push("sensor", "", "id of the sensor", text(&|band| &band.sensor));
    table.push(
        "band_centre_hz",
        "Hz",
        "mid-band frequency of the sound",
        ColumnData::Number(rows.iter().map(|(band, _)| band.band.map_or(f64::NAN, |band| band.centre_hz)).collect()),
    );
    table.push(
        "replicate",
        "1",
        "number of the draw of blocks, shared by the bands of a sensor",
        ColumnData::Integer(rows.iter().map(|(_, number)| *number as i64).collect()),
    );
    table.push("floor_db", "dB", "floor, of the first segment where they differ", kept(|kept| &kept.floor_db));
    table.push(
        "wind_component_at_10_m_s_db",
        "dB",
        "wind part alone at 10 m/s",
        kept(|kept| &kept.wind_component_at_10_m_s_db),
    );
    table.push("slope_db_per_decade", "dB", "slope of the fit with floor and knee", kept(|k| &k.slope_db_per_decade));
    table.push("knee_log10", "1", "knee as log10 of wind speed over 10 m/s", kept(|kept| &kept.onset_log10));
    table
}
