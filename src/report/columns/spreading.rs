//! Tables of the spreading comparison.

use crate::model::{BandComparison, ClassComparison, ColumnData, NotIdentified, SensorSpreading, Table};

type Row<'a> = (&'a SensorSpreading, &'a BandComparison, &'a ClassComparison);

/// One row per site, sensor, model, band and class of f / fp and wind.
pub fn spreading_table(all: &[SensorSpreading]) -> Table {
    let mut rows: Vec<Row<'_>> = Vec::new();
    for sensor in all {
        for band in &sensor.comparisons {
            rows.extend(band.classes.iter().map(|class| (sensor, band, class)));
        }
    }
    let text = |pick: &dyn Fn(&Row<'_>) -> String| {
        let texts: Vec<String> = rows.iter().map(pick).collect();
        ColumnData::from_texts(texts.iter().map(String::as_str))
    };
    let number = |pick: &dyn Fn(&Row<'_>) -> f64| ColumnData::Number(rows.iter().map(pick).collect());
    let count =
        |pick: &dyn Fn(&Row<'_>) -> usize| ColumnData::Integer(rows.iter().map(|row| pick(row) as i64).collect());
    // Endless classes have no upper end.
    let finite = |value: f64| if value.is_finite() { value } else { f64::NAN };
    let mut table = Table::default();
    table.push("site", "", "id of the site", text(&|r| r.0.site.clone()));
    table.push("sensor", "", "id of the sensor", text(&|r| r.0.sensor.clone()));
    table.push("sea_source", "", "id of the spectra input", text(&|r| r.1.model.clone()));
    table.push("band_centre_hz", "Hz", "mid-band frequency of the sound", number(&|r| r.1.band.centre_hz));
    table.push(
        "wave_frequency_hz",
        "Hz",
        "half of it: the waves that radiate there",
        number(&|r| 0.5 * r.1.band.centre_hz),
    );
    table.push("f_over_fp_low", "1", "lower end of the class of f / fp", number(&|r| r.2.class.x_low));
    table.push(
        "f_over_fp_high",
        "1",
        "upper end of the class of f / fp; none for the last",
        number(&|r| finite(r.2.class.x_high)),
    );
    table.push("wind_low_m_s", "m s-1", "lower end of the class of wind", number(&|r| r.2.class.wind_low_m_s));
    table.push(
        "wind_high_m_s",
        "m s-1",
        "upper end of the class of wind; none for the last",
        number(&|r| finite(r.2.class.wind_high_m_s)),
    );
    table.push("windows", "1", "windows in the class", count(&|r| r.2.windows));
    table.push("windows_used", "1", "windows that could be compared", count(&|r| r.2.used));
    table.push("episodes", "1", "separate episodes that the used windows come from", count(&|r| r.2.episodes));
    table.push(
        "measured_db",
        "dB re 1 uPa2",
        "median measured band level of the used windows",
        number(&|r| r.2.measured_db),
    );
    table.push(
        "radiated_db",
        "dB re 1 uPa2",
        "median radiated band level of the used windows, without the site offset",
        number(&|r| r.2.radiated_db),
    );
    table.push(
        "model_overlap_db",
        "dB",
        "median overlap of the model, re isotropic",
        number(&|r| r.2.model_overlap_db),
    );
    table.push(
        "implied_overlap_db",
        "dB",
        "overlap that the sound implies, re isotropic, taking the model's density as right",
        number(&|r| r.2.implied_overlap_db().unwrap_or(f64::NAN)),
    );
    table.push("median_f_over_fp", "1", "median f / fp of the used windows", number(&|r| r.2.median_x));
    table.push(
        "law_range_db",
        "dB",
        "difference between published laws of spreading there",
        number(&|r| r.2.law_range_db),
    );
    table.push("floor_db", "dB re 1 uPa2", "floor that levels were held against", number(&|r| r.1.floor_db));
    table.push(
        "floor_known",
        "",
        "whether that floor was fitted; else the quietest hundredth of the record stands in for it",
        ColumnData::Truth(rows.iter().map(|r| r.1.floor_known).collect()),
    );
    table.push(
        "site_offset_db",
        "dB",
        "measured minus radiated in the reference class (f above 4 fp), with the middle of the laws",
        number(&|r| r.1.reference.map_or(f64::NAN, |reference| reference.offset_db)),
    );
    table.push(
        "difference_db",
        "dB",
        "measured minus radiated less the site offset: above 0 the model has too little opposing energy",
        number(&|r| r.2.difference.map_or(f64::NAN, |d| d.difference_db)),
    );
    table.push(
        "difference_low_db",
        "dB",
        "lower end of its 95 % interval",
        number(&|r| r.2.difference.map_or(f64::NAN, |d| d.low_db)),
    );
    table.push(
        "difference_high_db",
        "dB",
        "upper end of its 95 % interval",
        number(&|r| r.2.difference.map_or(f64::NAN, |d| d.high_db)),
    );
    table.push("verdict", "", "what it says of the model's spreading", text(&|r| r.2.verdict.name().to_owned()));
    table.push(
        "reason",
        "",
        "why it is not identified",
        text(&|r| r.2.verdict.reason().map_or("", NotIdentified::name).to_owned()),
    );
    table.push("words", "", "the verdict in words", text(&|r| r.2.words(&r.0.density_words())));
    table
}

/// One row per site, sensor, model, band and month: in how many windows sound could judge.
pub fn testability_table(all: &[SensorSpreading]) -> Table {
    let rows: Vec<(&SensorSpreading, &str, &crate::model::Testability)> = all
        .iter()
        .flat_map(|sensor| sensor.testability.iter().map(move |(model, month)| (sensor, model.as_str(), month)))
        .collect();
    let texts = |all: Vec<String>| ColumnData::from_texts(all.iter().map(String::as_str));
    let mut table = Table::default();
    table.push("site", "", "id of the site", texts(rows.iter().map(|r| r.0.site.clone()).collect()));
    table.push("sensor", "", "id of the sensor", texts(rows.iter().map(|r| r.0.sensor.clone()).collect()));
    table.push("sea_source", "", "id of the spectra input", texts(rows.iter().map(|r| r.1.to_owned()).collect()));
    table.push(
        "month",
        "",
        "year and month",
        texts(rows.iter().map(|r| format!("{:04}-{:02}", r.2.month.0, r.2.month.1)).collect()),
    );
    table.push(
        "band_centre_hz",
        "Hz",
        "mid-band frequency of the sound",
        ColumnData::Number(rows.iter().map(|r| r.2.band.centre_hz).collect()),
    );
    table.push(
        "windows",
        "1",
        "windows with a level",
        ColumnData::Integer(rows.iter().map(|r| r.2.windows as i64).collect()),
    );
    table.push(
        "windows_testable",
        "1",
        "windows in which sound could judge spreading",
        ColumnData::Integer(rows.iter().map(|r| r.2.testable as i64).collect()),
    );
    table.push("share_testable", "1", "their share", ColumnData::Number(rows.iter().map(|r| r.2.share()).collect()));
    table.push(
        "main_reason",
        "",
        "what kept most of the others out",
        texts(
            rows.iter().map(|r| r.2.reasons.first().map_or(String::new(), |(why, _)| why.name().to_owned())).collect(),
        ),
    );
    table
}
