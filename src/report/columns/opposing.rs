//! The list of opposing seas.

use crate::model::{ColumnData, OpposingSeas, Table};

/// Two opposing systems at one site and stored step, with the sound's answer.
#[derive(Debug, Clone, Copy)]
pub struct OpposingRow<'a> {
    /// The spectra input.
    pub model: &'a str,
    /// Site.
    pub site: &'a str,
    /// Stored step, ms since 1970.
    pub time_ms: i64,
    /// Position of the node, degrees north and east.
    pub node_deg: (f64, f64),
    /// The two systems.
    pub seas: OpposingSeas,
    /// Measured level in the band at twice the frequency minus its median over the record, dB; NaN where none was measured.
    pub sound_above_median_db: f64,
    /// Radiated level there minus its median, dB.
    pub radiated_above_median_db: f64,
}

/// One row per site and stored step with two opposing systems.
pub fn opposing_table(rows: &[OpposingRow<'_>]) -> Table {
    let mut table = Table::default();
    let text = |of: &dyn Fn(&OpposingRow<'_>) -> String| {
        let texts: Vec<String> = rows.iter().map(of).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number = |of: &dyn Fn(&OpposingRow<'_>) -> f64| ColumnData::Number(rows.iter().map(of).collect());
    let kind = |row: &OpposingRow<'_>, at: usize| match row.seas.systems[at].wind_sea {
        Some(true) => "wind_sea".to_owned(),
        Some(false) => "swell".to_owned(),
        None => String::new(),
    };
    table.push("model", "", "id of the spectra input", text(&|row| row.model.to_owned()));
    table.push("site", "", "id of the site", text(&|row| row.site.to_owned()));
    table.push("time_utc", "UTC", "stored step", ColumnData::Time(rows.iter().map(|row| row.time_ms).collect()));
    table.push("node_latitude_deg", "degrees_north", "latitude of the node", number(&|row| row.node_deg.0));
    table.push("node_longitude_deg", "degrees_east", "longitude of the node", number(&|row| row.node_deg.1));
    table.push(
        "frequency_hz",
        "Hz",
        "wave frequency of the strongest joint overlap; the sound has twice this",
        number(&|row| row.seas.frequency_hz),
    );
    table.push(
        "joint_share",
        "1",
        "share of the overlap there that pairs the two systems",
        number(&|row| row.seas.joint_share),
    );
    table.push(
        "first_kind",
        "",
        "the higher system: wind_sea or swell; missing without wind",
        text(&|row| kind(row, 0)),
    );
    table.push(
        "first_peak_hz",
        "Hz",
        "peak frequency of the higher system",
        number(&|row| row.seas.systems[0].peak_hz),
    );
    table.push("first_from_deg", "degree", "mean direction it comes from", number(&|row| row.seas.systems[0].from_deg));
    table.push("first_hs_m", "m", "its significant height", number(&|row| row.seas.systems[0].hs_m));
    table.push("second_kind", "", "the lower system: wind_sea or swell", text(&|row| kind(row, 1)));
    table.push(
        "second_peak_hz",
        "Hz",
        "peak frequency of the lower system",
        number(&|row| row.seas.systems[1].peak_hz),
    );
    table.push(
        "second_from_deg",
        "degree",
        "mean direction it comes from",
        number(&|row| row.seas.systems[1].from_deg),
    );
    table.push("second_hs_m", "m", "its significant height", number(&|row| row.seas.systems[1].hs_m));
    table.push(
        "sound_above_median_db",
        "dB",
        "measured level at twice the frequency minus its median over the record",
        number(&|row| row.sound_above_median_db),
    );
    table.push(
        "radiated_above_median_db",
        "dB",
        "radiated level there minus its median",
        number(&|row| row.radiated_above_median_db),
    );
    table
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::WaveSystem;

    #[test]
    fn both_systems_have_their_columns() {
        let system = WaveSystem { peak_hz: 0.1, from_deg: 90.0, hs_m: 1.0, wind_sea: Some(false) };
        let seas = OpposingSeas { systems: [system; 2], frequency_hz: 0.12, joint_overlap: 1.0, joint_share: 0.9 };
        let row = OpposingRow {
            model: "m",
            site: "a",
            time_ms: 0,
            node_deg: (44.0, -31.0),
            seas,
            sound_above_median_db: f64::NAN,
            radiated_above_median_db: 5.0,
        };
        let table = opposing_table(&[row]);
        assert_eq!(table.rows(), 1);
        let kind = table.columns.iter().find(|c| c.name == "second_kind").unwrap();
        assert_eq!(kind.data, ColumnData::from_texts(["swell"]));
    }
}
