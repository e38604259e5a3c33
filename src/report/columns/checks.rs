//! What was found beside the relations: over the bands of a sensor together, and for an error of the wind.

use crate::model::{ColumnData, Fitted, FittedBand, FittedSensor, Table, WindErrorEstimate};

/// One row per source, site and sensor.
pub fn bands_together_table(fitted: &Fitted) -> Table {
    let sensors = &fitted.sensors;
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&FittedSensor) -> &str| ColumnData::from_texts(sensors.iter().map(pick));
    let number = |pick: &dyn Fn(&FittedSensor) -> Option<f64>| {
        ColumnData::Number(sensors.iter().map(|row| pick(row).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the wind input", text(&|row| &row.source.0));
    table.push("site", "", "id of the site", text(&|row| &row.site));
    table.push("sensor", "", "id of the sensor", text(&|row| &row.sensor));
    table.push(
        "bands_with_onset",
        "1",
        "bands with a named onset, which the common onset is made of; missing with fewer than two",
        number(&|row| row.common_onset.as_ref().map(|onset| onset.bands.len() as f64)),
    );
    table.push(
        "common_onset_m_s",
        "m s-1",
        "one onset for all these bands, by inverse variance",
        number(&|row| row.common_onset.as_ref()?.onset_m_s.estimate()),
    );
    table.push(
        "common_onset_low_m_s",
        "m s-1",
        "lower end of its 95 % interval",
        number(&|row| Some(row.common_onset.as_ref()?.onset_m_s.interval()?.0)),
    );
    table.push(
        "common_onset_high_m_s",
        "m s-1",
        "upper end of its 95 % interval",
        number(&|row| Some(row.common_onset.as_ref()?.onset_m_s.interval()?.1)),
    );
    table.push(
        "wald_equal_onsets",
        "1",
        "Wald statistic of equal onsets, with the covariance of the bands from shared replicates",
        number(&|row| row.common_onset.as_ref().map(|onset| onset.wald)),
    );
    table.push(
        "wald_degrees",
        "1",
        "its degrees of freedom",
        number(&|row| row.common_onset.as_ref().map(|onset| onset.degrees as f64)),
    );
    table.push(
        "p_equal_onsets",
        "1",
        "p value of equal onsets (chi-squared)",
        number(&|row| row.common_onset.as_ref().map(|onset| onset.p_equal)),
    );
    table.push(
        "short_events",
        "1",
        "short events that the screen left out; missing where it is off",
        number(&|row| row.screen.map(|screen| screen.events as f64)),
    );
    table.push(
        "windows_left_out",
        "1",
        "windows in these events",
        number(&|row| row.screen.map(|screen| screen.windows as f64)),
    );
    table.push(
        "windows_raised_longer",
        "1",
        "windows raised in most bands for longer than a ship takes, which are kept",
        number(&|row| row.screen.map(|screen| screen.kept_windows as f64)),
    );
    table
}

/// One row per band and assumed size of the wind error.
pub fn wind_error_table(bands: &[FittedBand]) -> Table {
    let rows: Vec<(&FittedBand, &WindErrorEstimate)> =
        bands.iter().flat_map(|band| band.checks.wind_error.iter().map(move |estimate| (band, estimate))).collect();
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&FittedBand) -> &str| {
        let texts: Vec<&str> = rows.iter().map(|(band, _)| pick(band)).collect();
        ColumnData::from_texts(texts)
    };
    let number = |pick: &dyn Fn(&FittedBand, &WindErrorEstimate) -> Option<f64>| {
        ColumnData::Number(rows.iter().map(|(band, estimate)| pick(band, estimate).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the wind input", text(&|band| &band.source.0));
    table.push("site", "", "id of the site", text(&|band| &band.site));
    table.push("sensor", "", "id of the sensor", text(&|band| &band.sensor));
    table.push(
        "band_centre_hz",
        "Hz",
        "mid-band frequency of the sound",
        number(&|band, _| band.band.map(|band| band.centre_hz)),
    );
    table.push(
        "wind_error_sd_m_s",
        "m s-1",
        "assumed standard deviation of the random error of the wind speed; 0 for the plain fit with floor and knee",
        number(&|_, estimate| Some(estimate.wind_error_sd_m_s)),
    );
    table.push(
        "floor_db",
        "dB",
        "floor, of the first deployment where they differ",
        number(&|_, estimate| estimate.floor_db.first().copied()),
    );
    table.push(
        "wind_component_at_10_m_s_db",
        "dB",
        "wind part alone at 10 m/s",
        number(&|_, estimate| estimate.wind_component_at_10_m_s_db.first().copied()),
    );
    table.push("slope_db_per_decade", "dB", "slope below the knee", number(&|_, e| Some(e.slope_db_per_decade)));
    table.push(
        "knee_m_s",
        "m s-1",
        "best knee of the fit with floor and knee, whatever the verdict",
        number(&|_, estimate| Some(estimate.onset_m_s)),
    );
    table
}
