//! Conditions: one row per source, site and window.

use super::sampled::repeated;
use crate::model::{ColumnData, Conditions, Missing, SeaConditions, Table, WindowWind};
use crate::units::Window;

/// The wind of one source over a sensor's windows, and the sea where there are spectra.
///
/// # Panics
/// When the windows are not those that the conditions were made for: a defect in the caller.
pub fn conditions_table(
    conditions: &Conditions,
    sea: Option<&SeaConditions>,
    sensor: &str,
    windows: &[Window],
) -> Table {
    assert_eq!(windows.len(), conditions.wind.len(), "conditions of other windows");
    let rows = windows.len();
    let mut table = Table::default();
    table.push("source", "", "id of the wind input", repeated(&conditions.source.0, rows));
    table.push("site", "", "id of the site", repeated(&conditions.site, rows));
    table.push("sensor", "", "id of the sensor whose windows these are", repeated(sensor, rows));
    push_windows(&mut table, windows.iter().copied());
    let number = |pick: fn(&WindowWind) -> f64| {
        ColumnData::Number(conditions.wind.iter().map(|wind| wind.as_ref().map_or(f64::NAN, pick)).collect())
    };
    table.push(
        "eastward_wind_mean_m_s",
        "m s-1",
        "mean over the window of the component towards the east, linear between model steps",
        number(|w| w.eastward_mean_m_s),
    );
    table.push(
        "northward_wind_mean_m_s",
        "m s-1",
        "mean over the window of the component towards the north, linear between model steps",
        number(|w| w.northward_mean_m_s),
    );
    table.push(
        "wind_speed_mean_m_s",
        "m s-1",
        "mean over the window of the speed of the interpolated components (exact integral)",
        number(|w| w.speed_mean_m_s),
    );
    table.push(
        "wind_speed_of_mean_m_s",
        "m s-1",
        "speed of the mean components of the window",
        number(|w| w.speed_of_mean_m_s),
    );
    table.push(
        "scalar_wind_speed_mean_m_s",
        "m s-1",
        "mean over the window of the speed interpolated in space as a scalar, linear between model steps",
        number(|w| w.scalar_speed_mean_m_s),
    );
    table.push(
        "wind_from_direction_deg",
        "degree",
        "direction that the mean wind of the window comes from, clockwise from true north; none for a calm",
        number(WindowWind::from_direction_deg),
    );
    table.push(
        "step_bridged_s",
        "s",
        "longest time between two model steps that the window mean bridges",
        number(|w| w.step_bridged_s),
    );
    table.push(
        "nearest_node_km",
        "km",
        "distance along the sphere from the site to the nearest grid node used",
        ColumnData::Number(vec![conditions.nearest_node_km; rows]),
    );
    let names: Vec<String> = conditions.flags.iter().map(|flags| flags.names()).collect();
    table.push(
        "flags",
        "",
        "remarks on the wind, names joined by a space",
        ColumnData::from_texts(names.iter().map(String::as_str)),
    );
    table.push(
        "reason",
        "",
        "why there is no wind for the window",
        ColumnData::from_texts(conditions.missing.iter().map(|why| why.map_or("", Missing::name))),
    );
    if let Some(sea) = sea {
        super::sea::push_conditions(&mut table, sea);
    }
    table
}

/// Start and end of windows.
pub(super) fn push_windows(table: &mut Table, windows: impl Iterator<Item = Window> + Clone) {
    table.push(
        "window_start_utc",
        "UTC",
        "first instant of the window",
        ColumnData::Time(windows.clone().map(|w| w.start.0).collect()),
    );
    table.push(
        "window_end_utc",
        "UTC",
        "first instant after the window",
        ColumnData::Time(windows.map(|w| w.end.0).collect()),
    );
}
