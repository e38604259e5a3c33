//! The relation as a short table for the terminal.

use crate::model::{DeploymentDifference, Fitted, FittedBand, FittedSensor, Resolved, WindErrorEstimate};

/// One line a band, grouped by source, site and sensor: floor, slope, onset, what the data say; then what was found over the
/// bands together.
pub fn relation_text(fitted: &Fitted) -> String {
    let mut out = String::new();
    let same = |a: &FittedBand, b: &FittedBand| (&a.source, &a.site, &a.sensor) == (&b.source, &b.site, &b.sensor);
    for (index, bands) in fitted.bands.chunk_by(same).enumerate() {
        if index > 0 {
            out.push('\n');
        }
        let first = &bands[0];
        let reference = first.kind.map_or(String::new(), |kind| format!("; levels in {}", kind.unit()));
        // A table of pairs may name none of them.
        let named = [("site", &first.site), ("sensor", &first.sensor), ("wind", &first.source.0)]
            .iter()
            .filter(|(_, name)| !name.is_empty())
            .map(|(what, name)| format!("{what} {name}"))
            .collect::<Vec<_>>();
        let named = if named.is_empty() { "all pairs".to_owned() } else { named.join(", ") };
        out.push_str(&format!("{named}{reference}\n"));
        out.push_str(&format!(
            "{:>9}  {:>22}  {:>22}  {:>6}  {}\n",
            "band", "floor (dB)", "slope (dB/decade)", "pairs", "onset of saturation"
        ));
        for row in bands {
            let relation = &row.relation;
            out.push_str(&format!(
                "{:>9}  {:>22}  {:>22}  {:>6}  {}\n",
                row.band_label(),
                cell(relation.floor_db),
                cell(relation.slope_db_per_decade),
                relation.diagnostics.samples,
                relation.verdict_text()
            ));
        }
        for sentence in findings(bands, fitted.sensor_of(first)) {
            out.push_str(&format!("  {sentence}\n"));
        }
    }
    out
}

/// What was found over the bands of one sensor, beside the relations: one sentence each.
pub fn findings(bands: &[FittedBand], sensor: Option<&FittedSensor>) -> Vec<String> {
    let mut sentences = Vec::new();
    if let Some(onset) = sensor.and_then(|sensor| sensor.common_onset.as_ref()) {
        let equal = if onset.p_equal < 0.05 { "differ between them" } else { "do not differ resolvably" };
        sentences.push(format!(
            "common onset of {} bands: {} m/s; the onsets {equal} (Wald test, p {})",
            onset.bands.len(),
            cell(onset.onset_m_s),
            p_text(onset.p_equal)
        ));
    }
    sentences.extend(lag_sentence(bands));
    let drifting: Vec<String> = bands
        .iter()
        .filter_map(|band| {
            let drift = band.checks.drift_db_per_year?;
            let (low, high) = drift.interval()?;
            (low > 0.0 || high < 0.0).then(|| format!("{} {} dB a year", band.band_label(), cell(drift)))
        })
        .collect();
    if !drifting.is_empty() {
        sentences.push(format!(
            "residuals drift in {} of {} bands: {}",
            drifting.len(),
            bands.len(),
            drifting.join(", ")
        ));
    }
    sentences.extend(segment_sentence(bands));
    if let Some(screen) = sensor.and_then(|sensor| sensor.screen) {
        sentences.push(format!(
            "screen: {} short events in {} windows left out, {} windows raised for longer kept; largest shifts without the screen: {}",
            screen.events,
            screen.windows,
            screen.kept_windows,
            screen_shifts(bands)
        ));
    }
    sentences.extend(wind_error_sentence(bands));
    sentences
}

/// How segments (deployments, months) differ, where the fit gives them parameters of their own.
fn segment_sentence(bands: &[FittedBand]) -> Option<String> {
    let differences: Vec<DeploymentDifference> =
        bands.iter().filter_map(|band| band.relation.deployment_difference).collect();
    let kinds: Vec<String> = DeploymentDifference::ALL
        .iter()
        .map(|kind| (kind, differences.iter().filter(|other| *other == kind).count()))
        .filter(|(_, count)| *count > 0)
        .map(|(kind, count)| format!("{} in {count}", kind.name()))
        .collect();
    let all = bands.len();
    (!kinds.is_empty()).then(|| {
        format!(
            "segments of the record have parameters of their own in {} of {all} bands: {} (table segments)",
            differences.len(),
            kinds.join(", ")
        )
    })
}

/// What an error of the wind of the stated size would have done, over all bands; the table has each.
fn wind_error_sentence(bands: &[FittedBand]) -> Option<String> {
    let stated = bands.iter().find_map(|band| band.checks.wind_error.get(2))?.wind_error_sd_m_s;
    let range = |pick: fn(&WindErrorEstimate) -> f64| {
        let shifts = bands.iter().filter_map(|band| {
            let [plain, _, stated, _] = band.checks.wind_error.as_slice() else { return None };
            Some(pick(stated) - pick(plain)).filter(|shift| shift.is_finite())
        });
        let (low, high) = shifts.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), s| (low.min(s), high.max(s)));
        format!("{low:+.1} to {high:+.1}")
    };
    Some(format!(
        "for a wind error of {stated} m/s the estimates would move: floor by {} dB, slope by {} dB/decade, knee by {} m/s (table wind_error)",
        range(|e| e.floor_db.first().copied().unwrap_or(f64::NAN)),
        range(|e| e.slope_db_per_decade),
        range(|e| e.onset_m_s)
    ))
}

/// One lag in all bands points to a clock; a lag in some does not.
fn lag_sentence(bands: &[FittedBand]) -> Option<String> {
    let lags: Vec<(&FittedBand, f64)> = bands.iter().filter_map(|band| Some((band, band.checks.lag?.lag_h))).collect();
    let shifted: Vec<&(&FittedBand, f64)> = lags.iter().filter(|(_, lag)| lag.abs() > 1e-9).collect();
    let (_, first) = shifted.first()?;
    let one_lag = shifted.iter().all(|(_, lag)| (lag - first).abs() < 1e-9);
    if one_lag && 2 * shifted.len() > lags.len() && shifted.len() > 1 {
        let (hours, sense) = (first.abs(), if *first > 0.0 { "after" } else { "before" });
        return Some(format!(
            "the level comes {hours:.2} h {sense} the wind in {} of {} bands: one lag in most bands points to a clock or to the stamp of the windows",
            shifted.len(),
            lags.len()
        ));
    }
    let parts: Vec<String> = shifted.iter().map(|(band, lag)| format!("{} {lag:+.2} h", band.band_label())).collect();
    Some(format!("another lag predicts better in {} of {} bands: {}", shifted.len(), lags.len(), parts.join(", ")))
}

fn screen_shifts(bands: &[FittedBand]) -> String {
    let largest = |pick: fn(&crate::model::Relation) -> Resolved| {
        let shifts = bands.iter().filter_map(|band| {
            Some(pick(band.checks.unscreened.as_ref()?).estimate()? - pick(&band.relation).estimate()?)
        });
        shifts
            .max_by(|a, b| a.abs().total_cmp(&b.abs()))
            .map_or_else(|| "none".to_owned(), |shift| format!("{shift:+.1}"))
    };
    format!(
        "floor {} dB, slope {} dB/decade, onset {} m/s",
        largest(|relation| relation.floor_db),
        largest(|relation| relation.slope_db_per_decade),
        largest(|relation| relation.onset_m_s)
    )
}

/// A p value as text: never "0".
pub(crate) fn p_text(p: f64) -> String {
    if p < 0.001 { "< 0.001".to_owned() } else { format!("= {p:.3}") }
}

fn cell(value: Resolved) -> String {
    match value {
        Resolved::Value { estimate, low: Some(low), high: Some(high) } => {
            format!("{estimate:.1} ({low:.1} to {high:.1})")
        }
        Resolved::Value { estimate, .. } => format!("{estimate:.1}"),
        Resolved::AtLeast(bound) => format!("at least {bound:.1}"),
        Resolved::AtMost(bound) => format!("at most {bound:.1}"),
        Resolved::NotResolved(_) => "not resolved".to_owned(),
    }
}
