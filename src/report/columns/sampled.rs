//! The sampled series: wind at the sites at the native steps of the source.

use crate::model::{ColumnData, Missing, Table, WindSeries};

/// One row per source, site and native step.
pub fn sampled_table(series: &WindSeries) -> Table {
    let rows = series.steps.len();
    let mut table = Table::default();
    table.push("source", "", "id of the wind input", repeated(&series.source.0, rows));
    table.push("site", "", "id of the site", repeated(&series.site, rows));
    table.push(
        "time_utc",
        "UTC",
        "native step of the source",
        ColumnData::Time(series.steps.iter().map(|t| t.0).collect()),
    );
    table.push(
        "eastward_wind_m_s",
        "m s-1",
        "wind component towards the east, interpolated in space",
        ColumnData::Number(series.eastward_m_s.clone()),
    );
    table.push(
        "northward_wind_m_s",
        "m s-1",
        "wind component towards the north, interpolated in space",
        ColumnData::Number(series.northward_m_s.clone()),
    );
    table.push(
        "scalar_wind_speed_m_s",
        "m s-1",
        "wind speed interpolated in space as a scalar",
        ColumnData::Number(series.scalar_speed_m_s.clone()),
    );
    table.push(
        "flags",
        "",
        "remarks on the value, names joined by a space",
        ColumnData::from_texts(series.flags.iter().map(|f| f.names()).collect::<Vec<_>>().iter().map(String::as_str)),
    );
    table.push(
        "reason",
        "",
        "why there is no value",
        ColumnData::from_texts(series.missing.iter().map(|why| why.map_or("", Missing::name))),
    );
    table
}

/// A text column of one text.
pub(super) fn repeated(text: &str, rows: usize) -> ColumnData {
    ColumnData::Text { texts: vec![text.to_owned()], codes: vec![0; rows] }
}
