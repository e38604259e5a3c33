//! Parts of a record that may have a floor or an offset of their own.

use crate::config::SegmentBy;
use crate::units::Instant;

/// A label for each window, and what the labels stand for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(in crate::pipeline) struct SegmentLabels {
    /// One a window: an index into `names`.
    pub labels: Vec<u32>,
    /// Names of the segments.
    pub names: Vec<String>,
}

/// Labels by deployment, by calendar month (UTC), or by both; `None` where there is but one segment.
///
/// `deployment` holds an index into `names` a window; windows outside all deployments have no used level, so any label serves.
pub(in crate::pipeline) fn segment_labels(
    by: SegmentBy,
    times_ms: &[i64],
    deployment: Option<(&[Option<u32>], &[String])>,
) -> Option<SegmentLabels> {
    let name_of = |row: usize| -> Option<&str> {
        let (labels, names) = deployment?;
        names.get(labels[row]? as usize).map(String::as_str)
    };
    let month_of = |row: usize| match Instant(times_ms[row]).year_month_hour() {
        Some((year, month, _)) => format!("{year:04}-{month:02}"),
        None => String::new(),
    };
    let mut names: Vec<String> = match (by, deployment) {
        // Deployments keep their order, also those that no window lies in.
        (SegmentBy::Deployment, Some((_, names))) => names.to_vec(),
        (SegmentBy::Deployment, None) => return None,
        (SegmentBy::Month | SegmentBy::DeploymentAndMonth, _) => Vec::new(),
    };
    let mut known: std::collections::HashMap<String, u32> =
        names.iter().enumerate().map(|(k, name)| (name.clone(), k as u32)).collect();
    let labels = (0..times_ms.len())
        .map(|row| {
            let name = match by {
                SegmentBy::Deployment => name_of(row).unwrap_or_default().to_owned(),
                SegmentBy::Month => month_of(row),
                SegmentBy::DeploymentAndMonth => {
                    [name_of(row).unwrap_or_default(), &month_of(row)].join(" ").trim().to_owned()
                }
            };
            if name.is_empty() {
                return 0;
            }
            *known.entry(name.clone()).or_insert_with(|| {
                names.push(name);
                names.len() as u32 - 1
            })
        })
        .collect();
    (names.len() > 1).then_some(SegmentLabels { labels, names })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn months_and_deployments_are_told_apart() {
        let day = 86_400_000;
        // 2031-01-30 to 2031-02-02 (days since 1970 from the proleptic Gregorian calendar).
        let times: Vec<i64> = (0..4).map(|k| (22_309 + k) * day).collect();
        let names = ["first".to_owned(), "second".to_owned()];
        let deployment = [Some(0), Some(0), Some(1), None];
        let given = Some((&deployment[..], &names[..]));
        let by = |by| segment_labels(by, &times, given).unwrap();
        assert_eq!(by(SegmentBy::Deployment), SegmentLabels { labels: vec![0, 0, 1, 0], names: names.to_vec() });
        let months = by(SegmentBy::Month);
        assert_eq!(months.names, ["2031-01", "2031-02"]);
        assert_eq!(months.labels, [0, 0, 1, 1]);
        let both = by(SegmentBy::DeploymentAndMonth);
        assert_eq!(both.names, ["first 2031-01", "second 2031-02", "2031-02"]);
        assert_eq!(segment_labels(SegmentBy::Deployment, &times, None), None);
        assert_eq!(segment_labels(SegmentBy::Month, &times[..2], None), None);
    }
}
