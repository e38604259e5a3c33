//! The relation table: one row per source, site, sensor and band.

use crate::model::{ColumnData, FittedBand, RelationWarning, Resolved, Table};

/// How one quantity stands in the table: estimate, ends of its interval or a bound, and its status in words.
struct QuantityColumns {
    names: [&'static str; 4],
    unit: &'static str,
    meaning: &'static str,
    pick: fn(&FittedBand) -> Resolved,
}

/// Names of the four columns of a quantity.
macro_rules! names {
    ($base:literal, $unit:literal) => {
        [
            concat!($base, $unit),
            concat!($base, "_low", $unit),
            concat!($base, "_high", $unit),
            concat!($base, "_status"),
        ]
    };
}

const QUANTITIES: [QuantityColumns; 7] = [
    QuantityColumns {
        names: names!("floor", "_db"),
        unit: "dB",
        meaning: "level of the floor, reached in calm",
        pick: |fitted| fitted.relation.floor_db,
    },
    QuantityColumns {
        names: names!("slope", "_db_per_decade"),
        unit: "dB",
        meaning: "rise of the wind part per factor ten in wind speed, below the onset",
        pick: |fitted| fitted.relation.slope_db_per_decade,
    },
    QuantityColumns {
        names: names!("mean_square_pressure_exponent", ""),
        unit: "1",
        meaning: "n in p^2 ~ U^n, a tenth of the slope",
        pick: |fitted| fitted.relation.mean_square_pressure_exponent,
    },
    QuantityColumns {
        names: names!("wind_component_at_10_m_s", "_db"),
        unit: "dB",
        meaning: "wind part alone at 10 m/s, along the law below the onset",
        pick: |fitted| fitted.relation.wind_component_at_10_m_s_db,
    },
    QuantityColumns {
        names: names!("level_at_10_m_s", "_db"),
        unit: "dB",
        meaning: "fitted level at 10 m/s, floor included",
        pick: |fitted| fitted.relation.level_at_10_m_s_db,
    },
    QuantityColumns {
        names: names!("onset", "_m_s"),
        unit: "m s-1",
        meaning: "wind speed above which the band stops responding",
        pick: |fitted| fitted.relation.onset_m_s,
    },
    QuantityColumns {
        names: names!("post_onset_slope", "_db_per_decade"),
        unit: "dB",
        meaning: "slope of the wind part above the onset",
        pick: |fitted| fitted.relation.post_onset_slope_db_per_decade,
    },
];

const ENDS: [&str; 3] = [
    "lower end of the 95 % interval of the column before, or its lower bound",
    "upper end of the 95 % interval, or the upper bound",
    "value, at_least, at_most, or the reason why there is no value",
];

/// The table of fitted relations.
pub fn relation_table(fitted: &[FittedBand]) -> Table {
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&FittedBand) -> String| {
        let texts: Vec<String> = fitted.iter().map(pick).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number = |pick: &dyn Fn(&FittedBand) -> Option<f64>| {
        ColumnData::Number(fitted.iter().map(|row| pick(row).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the wind input", text(&|row| row.source.0.clone()));
    table.push("site", "", "id of the site", text(&|row| row.site.clone()));
    table.push("sensor", "", "id of the sensor", text(&|row| row.sensor.clone()));
    table.push("band_centre_hz", "Hz", "mid-band frequency of the sound", number(&|row| row.band.map(|b| b.centre_hz)));
    table.push("band_low_hz", "Hz", "lower edge of the band", number(&|row| row.band.map(|b| b.low_hz)));
    table.push("band_high_hz", "Hz", "upper edge of the band", number(&|row| row.band.map(|b| b.high_hz)));
    table.push(
        "level_reference",
        "",
        "unit and reference of the levels",
        text(&|row| row.kind.map_or("not stated", crate::model::LevelKind::unit).to_owned()),
    );
    table.push(
        "law",
        "",
        "law from which floor and slope are reported",
        text(&|row| row.relation.law.name().to_owned()),
    );
    table.push("verdict", "", "what the data say about the onset", text(&|row| row.relation.verdict.name().to_owned()));
    table.push("verdict_text", "", "the verdict in words, with its numbers", text(&|row| row.relation.verdict_text()));
    for quantity in &QUANTITIES {
        let values: Vec<Resolved> = fitted.iter().map(quantity.pick).collect();
        let [name, low, high, status] = quantity.names;
        let column = |pick: fn(&Resolved) -> Option<f64>| {
            ColumnData::Number(values.iter().map(|value| pick(value).unwrap_or(f64::NAN)).collect())
        };
        table.push(name, quantity.unit, quantity.meaning, column(Resolved::estimate));
        table.push(low, quantity.unit, ENDS[0], column(lower));
        table.push(high, quantity.unit, ENDS[1], column(upper));
        table.push(status, "", ENDS[2], ColumnData::from_texts(values.iter().map(status_name)));
    }
    table.push(
        "residual_scale_db",
        "dB",
        "robust scale of the residuals",
        number(&|row| row.relation.diagnostics.residual_scale_db),
    );
    table.push(
        "pairs",
        "1",
        "pairs of wind and level used",
        ColumnData::Integer(fitted.iter().map(|row| row.relation.diagnostics.samples as i64).collect()),
    );
    table.push(
        "effective_pairs",
        "1",
        "number of independent pairs that carry the same information",
        number(&|row| row.relation.diagnostics.effective_samples),
    );
    table.push(
        "block_length_h",
        "h",
        "length of an independent block; intervals use twice this length",
        number(&|row| row.relation.diagnostics.block_length_h),
    );
    table.push("p_onset", "1", "p value of the test against no onset", number(&|row| row.relation.diagnostics.p_onset));
    table.push(
        "p_onset_false_discovery",
        "1",
        "the same, corrected for the number of bands of the sensor (Benjamini and Yekutieli)",
        number(&|row| row.checks.p_onset_false_discovery),
    );
    table.push(
        "segments_differ",
        "",
        "how deployments (or months) differ, where the fit gives them parameters of their own",
        text(&|row| row.relation.deployment_difference.map_or("", |d| d.name()).to_owned()),
    );
    table.push(
        "p_segments_equal",
        "1",
        "p value of the block test of equal deployments (or months)",
        number(&|row| row.relation.diagnostics.p_deployments),
    );
    table.push("p_slope", "1", "p value of the test against no rise", number(&|row| row.relation.diagnostics.p_slope));
    table.push("p_floor", "1", "p value of the test against no floor", number(&|row| row.relation.diagnostics.p_floor));
    table.push(
        "least_wind_m_s",
        "m s-1",
        "least wind speed used",
        number(&|row| row.relation.diagnostics.least_wind_m_s),
    );
    table.push(
        "greatest_wind_m_s",
        "m s-1",
        "greatest wind speed used",
        number(&|row| row.relation.diagnostics.greatest_wind_m_s),
    );
    push_checks(&mut table, fitted);
    table.push(
        "scatter",
        "",
        "scatter model",
        text(&|row| row.relation.scatter.map_or("", |s| s.family.name()).to_owned()),
    );
    table.push(
        "replicates",
        "1",
        "bootstrap replicates behind the intervals",
        ColumnData::Integer(fitted.iter().map(|row| row.relation.diagnostics.replicates as i64).collect()),
    );
    table.push(
        "warnings",
        "",
        "what the reader should know, names joined by a space",
        text(&|row| row.relation.warnings.iter().copied().map(RelationWarning::name).collect::<Vec<_>>().join(" ")),
    );
    table
}

fn push_checks(table: &mut Table, fitted: &[FittedBand]) {
    let number = |pick: &dyn Fn(&FittedBand) -> Option<f64>| {
        ColumnData::Number(fitted.iter().map(|row| pick(row).unwrap_or(f64::NAN)).collect())
    };
    table.push(
        "drift_db_per_year",
        "dB a-1",
        "linear trend of the residuals",
        number(&|row| row.checks.drift_db_per_year?.estimate()),
    );
    table.push(
        "drift_low_db_per_year",
        "dB a-1",
        "lower end of its 95 % interval",
        number(&|row| Some(row.checks.drift_db_per_year?.interval()?.0)),
    );
    table.push(
        "drift_high_db_per_year",
        "dB a-1",
        "upper end of its 95 % interval",
        number(&|row| Some(row.checks.drift_db_per_year?.interval()?.1)),
    );
    table.push(
        "lag_h",
        "h",
        "hours by which the level follows the wind; 0 unless another lag predicts held-out blocks better by two standard errors",
        number(&|row| Some(row.checks.lag?.lag_h)),
    );
    table.push(
        "lag_gain_standard_errors",
        "1",
        "gain of the best other lag over none, in standard errors of paired blocks",
        number(&|row| Some(row.checks.lag?.gain_in_standard_errors)),
    );
    table.push(
        "unscreened_floor_db",
        "dB",
        "floor with short events left in, where the screen is on",
        number(&|row| row.checks.unscreened.as_ref()?.floor_db.estimate()),
    );
    table.push(
        "unscreened_slope_db_per_decade",
        "dB",
        "slope with short events left in",
        number(&|row| row.checks.unscreened.as_ref()?.slope_db_per_decade.estimate()),
    );
    table.push(
        "unscreened_onset_m_s",
        "m s-1",
        "onset with short events left in",
        number(&|row| row.checks.unscreened.as_ref()?.onset_m_s.estimate()),
    );
}

fn lower(value: &Resolved) -> Option<f64> {
    match *value {
        Resolved::Value { low, .. } => low,
        Resolved::AtLeast(bound) => Some(bound),
        Resolved::AtMost(_) | Resolved::NotResolved(_) => None,
    }
}

fn upper(value: &Resolved) -> Option<f64> {
    match *value {
        Resolved::Value { high, .. } => high,
        Resolved::AtMost(bound) => Some(bound),
        Resolved::AtLeast(_) | Resolved::NotResolved(_) => None,
    }
}

fn status_name(value: &Resolved) -> &'static str {
    match value {
        Resolved::Value { .. } => "value",
        Resolved::AtLeast(_) => "at_least",
        Resolved::AtMost(_) => "at_most",
        Resolved::NotResolved(why) => why.name(),
    }
}
