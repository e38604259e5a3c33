//! The relation as a short table for the terminal.

use crate::model::{FittedBand, Resolved};

/// One line a band, grouped by source, site and sensor: floor, slope, onset, what the data say.
pub fn relation_text(fitted: &[FittedBand]) -> String {
    let mut out = String::new();
    let mut group: Option<(&str, &str, &str)> = None;
    for row in fitted {
        let here = (row.source.0.as_str(), row.site.as_str(), row.sensor.as_str());
        if group != Some(here) {
            if group.is_some() {
                out.push('\n');
            }
            let reference = row.kind.map_or(String::new(), |kind| format!("; levels in {}", kind.unit()));
            out.push_str(&format!("site {}, sensor {}, wind {}{reference}\n", here.1, here.2, here.0));
            out.push_str(&format!(
                "{:>9}  {:>22}  {:>22}  {:>6}  {}\n",
                "band", "floor (dB)", "slope (dB/decade)", "pairs", "onset of saturation"
            ));
            group = Some(here);
        }
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
    out
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
