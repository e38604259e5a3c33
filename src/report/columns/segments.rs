//! Floors and wind parts of segments (deployments, months), where they have their own.

use crate::model::{ColumnData, DeploymentFit, Fitted, FittedBand, Resolved, Table};

/// A quantity of a segment.
type Pick = fn(&DeploymentFit) -> Resolved;

/// One row per band and segment.
pub fn segments_table(fitted: &Fitted) -> Table {
    let mut rows: Vec<(&FittedBand, &DeploymentFit, &str)> = Vec::new();
    for band in &fitted.bands {
        let names = fitted.sensor_of(band).map_or(&[] as &[String], |sensor| &sensor.segments);
        rows.extend(band.relation.deployments.iter().map(|own| {
            let name = names.get(own.deployment as usize).map_or("", String::as_str);
            (band, own, name)
        }));
    }
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&FittedBand, &str) -> String| {
        let texts: Vec<String> = rows.iter().map(|(band, _, name)| pick(band, name)).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number = |pick: &dyn Fn(&FittedBand, &DeploymentFit) -> Option<f64>| {
        ColumnData::Number(rows.iter().map(|(band, own, _)| pick(band, own).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the wind input", text(&|band, _| band.source.0.clone()));
    table.push("site", "", "id of the site", text(&|band, _| band.site.clone()));
    table.push("sensor", "", "id of the sensor", text(&|band, _| band.sensor.clone()));
    table.push(
        "band_centre_hz",
        "Hz",
        "mid-band frequency of the sound",
        number(&|band, _| band.band.map(|band| band.centre_hz)),
    );
    table.push("segment", "", "deployment or month", text(&|_, name| name.to_owned()));
    table.push(
        "pairs",
        "1",
        "pairs of wind and level used in it",
        ColumnData::Integer(rows.iter().map(|(_, own, _)| own.samples as i64).collect()),
    );
    table.push("median_wind_m_s", "m s-1", "median wind speed of these pairs", number(&|_, o| Some(o.median_wind_m_s)));
    let quantities: [([&'static str; 3], &'static str, Pick); 2] = [
        (["floor_db", "floor_low_db", "floor_high_db"], "floor of the segment", |own| own.floor_db),
        (
            ["wind_component_at_10_m_s_db", "wind_component_low_db", "wind_component_high_db"],
            "wind part alone at 10 m/s in the segment",
            |own| own.wind_component_at_10_m_s_db,
        ),
    ];
    for (names, meaning, pick) in quantities {
        table.push(names[0], "dB", meaning, number(&|_, own| pick(own).estimate()));
        table.push(
            names[1],
            "dB",
            "lower end of its 95 % interval",
            number(&|_, own| pick(own).interval().map(|ends| ends.0)),
        );
        table.push(
            names[2],
            "dB",
            "upper end of its 95 % interval",
            number(&|_, own| pick(own).interval().map(|ends| ends.1)),
        );
    }
    table.push(
        "difference",
        "",
        "how the segments of the band differ",
        text(&|band, _| band.relation.deployment_difference.map_or("", |d| d.name()).to_owned()),
    );
    table.push(
        "p_no_difference",
        "1",
        "p value of the block test of equal segments",
        number(&|band, _| band.relation.diagnostics.p_deployments),
    );
    table
}
