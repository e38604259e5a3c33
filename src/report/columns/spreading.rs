//! Tables of the spreading comparison: classes, testability, opposing seas.

use crate::model::{BandComparison, ClassComparison, ColumnData, NotIdentified, OpposingSeas, Table, Testability};

/// The comparison of one band at one sensor of one site.
#[derive(Debug, Clone, Copy)]
pub struct SpreadRow<'a> {
    /// Site.
    pub site: &'a str,
    /// Sensor.
    pub sensor: &'a str,
    /// What was found.
    pub comparison: &'a BandComparison,
}

/// One row per site, sensor, model, band and class. `density` says what bounds E in the words of the verdict.
pub fn spreading_table(rows: &[SpreadRow<'_>], density: &str) -> Table {
    let flat: Vec<(SpreadRow<'_>, &ClassComparison)> =
        rows.iter().flat_map(|row| row.comparison.classes.iter().map(|class| (*row, class))).collect();
    let mut table = Table::default();
    let text = |of: &dyn Fn(&(SpreadRow<'_>, &ClassComparison)) -> String| {
        let texts: Vec<String> = flat.iter().map(of).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number =
        |of: &dyn Fn(&(SpreadRow<'_>, &ClassComparison)) -> f64| ColumnData::Number(flat.iter().map(of).collect());
    let whole = |of: &dyn Fn(&ClassComparison) -> usize| {
        ColumnData::Integer(flat.iter().map(|(_, class)| of(class) as i64).collect())
    };
    // No end is no number.
    let finite = |value: f64| if value.is_finite() { value } else { f64::NAN };
    table.push("model", "", "id of the spectra input", text(&|(row, _)| row.comparison.model.clone()));
    table.push("site", "", "id of the site", text(&|(row, _)| row.site.to_owned()));
    table.push("sensor", "", "id of the sensor", text(&|(row, _)| row.sensor.to_owned()));
    table.push(
        "band_centre_hz",
        "Hz",
        "centre of the sound band; the waves have half of it",
        number(&|(row, _)| row.comparison.band.centre_hz),
    );
    table.push("band_low_hz", "Hz", "lower edge of the sound band", number(&|(row, _)| row.comparison.band.low_hz));
    table.push("band_high_hz", "Hz", "upper edge of the sound band", number(&|(row, _)| row.comparison.band.high_hz));
    table.push(
        "f_over_fp_low",
        "1",
        "lower end of the class of f / fp of the wind sea",
        number(&|(_, c)| c.class.x_low),
    );
    table.push(
        "f_over_fp_high",
        "1",
        "upper end of the class of f / fp; missing for the last",
        number(&|(_, c)| finite(c.class.x_high)),
    );
    table.push("wind_low_m_s", "m s-1", "lower end of the wind class", number(&|(_, c)| c.class.wind_low_m_s));
    table.push(
        "wind_high_m_s",
        "m s-1",
        "upper end of the wind class; missing for none",
        number(&|(_, c)| finite(c.class.wind_high_m_s)),
    );
    table.push(
        "verdict",
        "",
        "too_narrow, too_wide, agrees or not_identified",
        text(&|(_, c)| c.verdict.name().to_owned()),
    );
    table.push(
        "reason",
        "",
        "why it is not identified",
        text(&|(_, c)| c.verdict.reason().map_or("", NotIdentified::name).to_owned()),
    );
    table.push("words", "", "the verdict in words", text(&|(_, c)| c.words(density)));
    table.push(
        "difference_db",
        "dB",
        "measured minus radiated level, less the site offset; above 0 the model has too little opposing energy",
        number(&|(_, c)| c.difference.map_or(f64::NAN, |d| d.difference_db)),
    );
    table.push(
        "difference_low_db",
        "dB",
        "lower end of its 95 % interval",
        number(&|(_, c)| c.difference.map_or(f64::NAN, |d| d.low_db)),
    );
    table.push(
        "difference_high_db",
        "dB",
        "upper end of its 95 % interval",
        number(&|(_, c)| c.difference.map_or(f64::NAN, |d| d.high_db)),
    );
    table.push(
        "record_sd_db",
        "dB",
        "standard error from the record alone (block bootstrap)",
        number(&|(_, c)| c.difference.map_or(f64::NAN, |d| d.record_sd_db)),
    );
    table.push(
        "model_overlap_db",
        "dB",
        "median overlap of the model over the used windows, re isotropic",
        number(&|(_, c)| finite(c.model_overlap_db)),
    );
    table.push(
        "implied_overlap_db",
        "dB",
        "overlap that the sound implies with the model's density taken as right, re isotropic",
        number(&|(_, c)| c.implied_overlap_db().map_or(f64::NAN, finite)),
    );
    table.push(
        "law_range_db",
        "dB",
        "difference between published laws at the median f / fp",
        number(&|(_, c)| c.law_range_db),
    );
    table.push("median_f_over_fp", "1", "median f / fp of the used windows", number(&|(_, c)| c.median_x));
    table.push(
        "measured_median_db",
        "dB re 1 uPa2",
        "median measured band level of the used windows",
        number(&|(_, c)| c.measured_db),
    );
    table.push(
        "radiated_median_db",
        "dB re 1 uPa2",
        "median radiated band level of the used windows, without the site offset",
        number(&|(_, c)| c.radiated_db),
    );
    table.push(
        "site_offset_db",
        "dB",
        "site offset from the reference class",
        number(&|(row, _)| row.comparison.reference.map_or(f64::NAN, |r| r.offset_db)),
    );
    table.push("windows", "1", "windows in the class", whole(&|c| c.windows));
    table.push("used", "1", "of these, windows used", whole(&|c| c.used));
    table.push("episodes", "1", "separate blocks of time that the used windows come from", whole(&|c| c.episodes));
    table.push("unused", "", "windows not used, by reason", text(&|(_, c)| counts(&c.unused)));
    table
}

fn counts(reasons: &[(NotIdentified, usize)]) -> String {
    reasons.iter().map(|(why, count)| format!("{} {count}", why.name())).collect::<Vec<_>>().join(", ")
}

/// Testability of one band, model and sensor, month by month.
#[derive(Debug, Clone, Copy)]
pub struct TestabilityRow<'a> {
    /// The spectra input.
    pub model: &'a str,
    /// Site.
    pub site: &'a str,
    /// Sensor.
    pub sensor: &'a str,
    /// One month.
    pub month: &'a Testability,
}

/// One row per model, site, sensor, band and month.
pub fn testability_table(rows: &[TestabilityRow<'_>]) -> Table {
    let mut table = Table::default();
    let text = |of: &dyn Fn(&TestabilityRow<'_>) -> String| {
        let texts: Vec<String> = rows.iter().map(of).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number = |of: &dyn Fn(&TestabilityRow<'_>) -> f64| ColumnData::Number(rows.iter().map(of).collect());
    let whole = |of: &dyn Fn(&TestabilityRow<'_>) -> i64| ColumnData::Integer(rows.iter().map(of).collect());
    table.push("model", "", "id of the spectra input", text(&|row| row.model.to_owned()));
    table.push("site", "", "id of the site", text(&|row| row.site.to_owned()));
    table.push("sensor", "", "id of the sensor", text(&|row| row.sensor.to_owned()));
    table.push("band_centre_hz", "Hz", "centre of the sound band", number(&|row| row.month.band.centre_hz));
    table.push("year", "1", "year (UTC)", whole(&|row| i64::from(row.month.month.0)));
    table.push("month", "1", "month (UTC), 1 to 12", whole(&|row| i64::from(row.month.month.1)));
    table.push("windows", "1", "windows with a level", whole(&|row| row.month.windows as i64));
    table.push(
        "testable",
        "1",
        "of these, windows in which sound could judge the spreading",
        whole(&|row| row.month.testable as i64),
    );
    table.push("share", "1", "testable over windows", number(&|row| row.month.share()));
    table.push("reasons", "", "why not in the others", text(&|row| counts(&row.month.reasons)));
    table
}

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
    use crate::model::{Band, SpreadClass, SpreadDifference, SpreadVerdict, WaveSystem};

    fn class(verdict: SpreadVerdict) -> ClassComparison {
        let judged = verdict.reason().is_none();
        ClassComparison {
            class: SpreadClass { x_low: 4.0, x_high: f64::INFINITY, wind_low_m_s: 0.0, wind_high_m_s: f64::INFINITY },
            windows: 100,
            used: 90,
            episodes: 12,
            measured_db: 80.0,
            radiated_db: 75.0,
            model_overlap_db: -12.0,
            median_x: 5.0,
            law_range_db: 2.0,
            difference: judged.then_some(SpreadDifference {
                difference_db: 8.0,
                low_db: 3.0,
                high_db: 13.0,
                record_sd_db: 0.5,
            }),
            verdict,
            unused: vec![(NotIdentified::TailOnly, 10)],
        }
    }

    #[test]
    fn every_table_has_its_rows_and_says_what_is_missing() {
        let band = Band::from_edges(0.9, 1.1).unwrap();
        let comparison = BandComparison {
            model: "m".to_owned(),
            band,
            reference: None,
            classes: vec![class(SpreadVerdict::TooNarrow), class(SpreadVerdict::NotIdentified(NotIdentified::Floor))],
        };
        let table =
            spreading_table(&[SpreadRow { site: "a", sensor: "b", comparison: &comparison }], "E known to 1 dB");
        assert_eq!(table.rows(), 2);
        let column = |name: &str| table.columns.iter().find(|c| c.name == name).unwrap().data.clone();
        let ColumnData::Number(implied) = column("implied_overlap_db") else { panic!("numbers") };
        assert!((implied[0] + 4.0).abs() < 1e-12 && implied[1].is_nan());
        let ColumnData::Number(ends) = column("f_over_fp_high") else { panic!("numbers") };
        assert!(ends[0].is_nan(), "an open class has no upper end");
        let ColumnData::Text { texts, .. } = column("unused") else { panic!("text") };
        assert_eq!(texts, ["tail_only 10"]);

        let month = Testability { month: (2031, 2), band, windows: 0, testable: 0, reasons: Vec::new() };
        assert_eq!(
            testability_table(&[TestabilityRow { model: "m", site: "a", sensor: "b", month: &month }]).rows(),
            1
        );
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
        assert_eq!(opposing_table(&[row]).rows(), 1);
    }
}
