//! The little arithmetic that drawing needs: quantiles, shades, thinning of long records.

/// A quantile of sorted values by linear interpolation between order statistics (Hyndman and Fan's type 7); NaN when empty.
pub(crate) fn quantile_sorted(sorted: &[f64], share: f64) -> f64 {
    let (Some(last), true) = (sorted.len().checked_sub(1), share.is_finite()) else {
        return f64::NAN;
    };
    let place = share.clamp(0.0, 1.0) * last as f64;
    let below = place.floor() as usize;
    let above = (below + 1).min(last);
    sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
}

/// The shade of a count on a logarithmic ramp of `shades` steps; none for zero.
pub(crate) fn shade_of(count: usize, most: usize, shades: usize) -> Option<usize> {
    if count == 0 || shades == 0 {
        return None;
    }
    if most < 2 {
        return Some(shades / 2);
    }
    let share = libm::log10(count as f64) / libm::log10(most as f64);
    Some(((share * shades as f64) as usize).min(shades - 1))
}

/// A run of a thinned record: per column its time, lowest, median and highest value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Thinned {
    pub ms: f64,
    pub low: f64,
    pub middle: f64,
    pub high: f64,
}

/// Splits a record in time order into runs without gaps (a value that is not finite, or a step longer than `gap_ms`),
/// and thins each to at most one entry per `column_ms`.
pub(crate) fn thin(time_ms: &[i64], values: &[f64], gap_ms: i64, column_ms: f64) -> Vec<Vec<Thinned>> {
    let mut runs: Vec<Vec<(i64, f64)>> = Vec::new();
    let mut last: Option<i64> = None;
    for (&ms, &value) in time_ms.iter().zip(values) {
        if !value.is_finite() {
            last = None;
            continue;
        }
        match (last, runs.last_mut()) {
            (Some(before), Some(run)) if ms.saturating_sub(before) <= gap_ms => run.push((ms, value)),
            _ => runs.push(vec![(ms, value)]),
        }
        last = Some(ms);
    }
    runs.iter().map(|run| thin_run(run, column_ms)).collect()
}

fn thin_run(run: &[(i64, f64)], column_ms: f64) -> Vec<Thinned> {
    let column = |ms: i64| if column_ms > 0.0 { (ms as f64 / column_ms).floor() } else { ms as f64 };
    run.chunk_by(|a, b| (column(a.0) - column(b.0)).abs() < 0.5)
        .map(|chunk| {
            let mut values: Vec<f64> = chunk.iter().map(|p| p.1).collect();
            values.sort_by(f64::total_cmp);
            let centre = f64::midpoint(chunk[0].0 as f64, chunk[chunk.len() - 1].0 as f64);
            Thinned {
                ms: centre,
                low: values[0],
                middle: quantile_sorted(&values, 0.5),
                high: values[values.len() - 1],
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Reference: numpy 2 `quantile` (its default, linear) of [1, 2, 4, 8]: 0.25 -> 1.75, 0.5 -> 3, 0.9 -> 6.8.
    #[test]
    fn quantiles_are_those_of_the_linear_rule() {
        let values = [1.0, 2.0, 4.0, 8.0];
        for (share, expected) in [(0.0, 1.0), (0.25, 1.75), (0.5, 3.0), (0.9, 6.8), (1.0, 8.0)] {
            assert!((quantile_sorted(&values, share) - expected).abs() < 1e-12);
        }
        assert!(quantile_sorted(&[], 0.5).is_nan());
    }

    #[test]
    fn shades_grow_with_the_count() {
        assert_eq!(shade_of(0, 100, 8), None);
        assert_eq!(shade_of(1, 100, 8), Some(0));
        assert_eq!(shade_of(100, 100, 8), Some(7));
        assert_eq!(shade_of(1, 1, 8), Some(4));
        let shades: Vec<_> = (1..=100).map(|n| shade_of(n, 100, 8)).collect();
        assert!(shades.windows(2).all(|p| p[0] <= p[1]));
    }

    #[test]
    fn thinning_keeps_gaps_and_extremes() {
        let hours: Vec<i64> = (0..10).chain(20..30).map(|h| h * 3_600_000).collect();
        let mut values: Vec<f64> = (0..20).map(f64::from).collect();
        values[15] = f64::NAN;
        let runs = thin(&hours, &values, 3_600_000, 5.0 * 3_600_000.0);
        assert_eq!(runs.iter().map(Vec::len).collect::<Vec<_>>(), [2, 1, 1]);
        assert_eq!(runs[0][0], Thinned { ms: 2.0 * 3_600_000.0, low: 0.0, middle: 2.0, high: 4.0 });
    }
}
