//! Checks beside the relation, as a user gets them: `fit --matchups`, tables, words.

use super::simulator::{Scatter, Truth, record};
use crate::support::{rows, underwind};
use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::path::Path;

/// Writes pairs of several bands: same wind, levels from a function of band, row and level.
fn pairs(path: &Path, bands: u32, samples: usize, lag: usize, change: impl Fn(u32, usize, f64) -> f64) {
    let mut text = String::from("time_h,band_centre_hz,wind_speed_m_s,level_db\n");
    let wind = record(Truth::default(), samples, 61).wind_m_s;
    for band in 0..bands {
        // The wind is drawn first, so one seed gives one wind; another seed gives scatter of its own.
        let own = record(Truth { scatter: Scatter::Total { memory_h: 8.0 }, ..Truth::default() }, samples, 61);
        let other = record(Truth::default(), samples, 900 + u64::from(band));
        for (row, wind) in wind.iter().enumerate().skip(lag) {
            let off = other.level_db[row] - super::simulator::mean_level_db(&Truth::default(), other.wind_m_s[row]);
            let mean = super::simulator::mean_level_db(&Truth::default(), own.wind_m_s[row - lag]);
            let level = change(band, row, mean + off);
            writeln!(text, "{row},{},{wind:.4},{level:.3}", 100 * (band + 1)).unwrap();
        }
    }
    std::fs::write(path, text).unwrap();
}

fn number(row: &BTreeMap<String, String>, name: &str) -> f64 {
    row[name].parse().unwrap_or(f64::NAN)
}

#[test]
fn one_lag_in_all_bands_points_to_a_clock() {
    let folder = tempfile::tempdir().unwrap();
    pairs(&folder.path().join("pairs.csv"), 4, 3000, 2, |_, _, level| level);
    let run =
        underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--replicates", "100", "-o", "out"]).succeeds();
    let found = rows(&folder.path().join("out/relation.csv"));
    assert!(found.iter().all(|row| (number(row, "lag_h") - 2.0).abs() < 1e-9), "{found:?}");
    assert!(found.iter().all(|row| number(row, "lag_gain_standard_errors") > 2.0));
    assert!(run.stdout.contains("the level comes 2.00 h after the wind in 4 of 4 bands"), "{}", run.stdout);
    assert!(run.stdout.contains("points to a clock"), "{}", run.stdout);
}

#[test]
fn short_events_are_screened_counted_and_shown_both_ways() {
    let folder = tempfile::tempdir().unwrap();
    // Twenty events of two hours, 15 dB up in all bands, and one of nine hours, which is longer than a ship takes and stays.
    let event = |row: usize| (row % 150 < 2 && (150..150 * 21).contains(&row)) || (3300..3309).contains(&row);
    pairs(&folder.path().join("pairs.csv"), 5, 4000, 0, |_, row, level| if event(row) { level + 15.0 } else { level });
    let arguments = ["fit", "--matchups", "pairs.csv", "--replicates", "100", "--screen", "-o", "out"];
    let run = underwind(folder.path(), &arguments).succeeds();
    let together = &rows(&folder.path().join("out/bands_together.csv"))[0];
    let events = number(together, "short_events");
    assert!((18.0..=24.0).contains(&events), "{together:?}");
    // The nine hours are not among them.
    assert!((36.0..=46.0).contains(&number(together, "windows_left_out")), "{together:?}");
    for row in rows(&folder.path().join("out/relation.csv")) {
        assert!((number(&row, "pairs") + number(together, "windows_left_out") - 4000.0).abs() < 0.5, "{row:?}");
        assert!((number(&row, "floor_db") - 60.0).abs() < 1.0, "{row:?}");
        assert!(number(&row, "unscreened_floor_db").is_finite(), "{row:?}");
    }
    assert!(run.stdout.contains("short events in"), "{}", run.stdout);
    // Off by default: nothing is left out.
    underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--replicates", "0", "-o", "plain"]).succeeds();
    let plain = rows(&folder.path().join("plain/relation.csv"));
    assert!(
        plain.iter().all(|row| (number(row, "pairs") - 4000.0).abs() < 0.5 && row["unscreened_floor_db"].is_empty())
    );
}

#[test]
fn a_stated_wind_error_gives_estimates_beside_the_plain_ones() {
    let folder = tempfile::tempdir().unwrap();
    pairs(&folder.path().join("pairs.csv"), 1, 3000, 0, |_, _, level| level);
    let arguments = ["fit", "--matchups", "pairs.csv", "--replicates", "100", "--wind-error-sd", "1.2", "-o", "out"];
    let run = underwind(folder.path(), &arguments).succeeds();
    assert!(run.stdout.contains("for a wind error of 1.2 m/s the estimates would move"), "{}", run.stdout);
    let table = rows(&folder.path().join("out/wind_error.csv"));
    let sizes: Vec<f64> = table.iter().map(|row| number(row, "wind_error_sd_m_s")).collect();
    for (found, expected) in sizes.iter().zip([0.0, 0.9, 1.2, 1.5]) {
        assert!((found - expected).abs() < 1e-9, "{sizes:?}");
    }
    // An error of the wind fills the calm classes with windier hours: the floor without it is lower, and lower for more.
    let floors: Vec<f64> = table.iter().map(|row| number(row, "floor_db")).collect();
    assert!(floors.windows(2).all(|pair| pair[1] < pair[0]), "{floors:?}");
    underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--wind-error-sd", "100"]).fails(2, &["0 to 75 m/s"]);
}

#[test]
fn bands_are_judged_together() {
    let folder = tempfile::tempdir().unwrap();
    pairs(&folder.path().join("pairs.csv"), 4, 9000, 0, |_, _, level| level);
    let run =
        underwind(folder.path(), &["fit", "--matchups", "pairs.csv", "--replicates", "200", "-o", "out"]).succeeds();
    let together = &rows(&folder.path().join("out/bands_together.csv"))[0];
    // All bands saturate at 12 m/s.
    assert!(number(together, "bands_with_onset") >= 2.0, "{together:?}");
    let (low, high) = (number(together, "common_onset_low_m_s"), number(together, "common_onset_high_m_s"));
    assert!(low < 12.0 && 12.0 < high && high - low < 1.5, "{together:?}");
    assert!(number(together, "p_equal_onsets") > 0.01, "{together:?}");
    assert!(run.stdout.contains("common onset of"), "{}", run.stdout);
    let relations = rows(&folder.path().join("out/relation.csv"));
    let p: Vec<f64> = relations.iter().map(|row| number(row, "p_onset")).collect();
    // Benjamini and Yekutieli (2001): p times m (1 + 1/2 + ... + 1/m) over the rank, made monotone from above.
    let harmonic: f64 = (1..=4).map(|k| 1.0 / f64::from(k)).sum();
    let mut order: Vec<usize> = (0..4).collect();
    order.sort_by(|a, b| p[*b].total_cmp(&p[*a]));
    let mut least = 1.0_f64;
    for (from_above, index) in order.into_iter().enumerate() {
        least = least.min(p[index] * 4.0 * harmonic / (4 - from_above) as f64);
        let found = number(&relations[index], "p_onset_false_discovery");
        assert!((found - least).abs() < 1e-12, "{found} for {least}");
    }
}

/// The check case with a gain step of 4 dB between two deployments (see `expected.json`).
#[test]
fn a_gain_step_between_deployments_is_named_and_an_offset_takes_it() {
    let folder = tempfile::tempdir().unwrap();
    let table = crate::support::project().join("tests/fixtures/estimator/c18_gain_step.csv");
    let fit = |more: &[&str], output: &str| {
        let arguments =
            [&["fit", "--matchups", table.to_str().unwrap(), "--replicates", "200", "-o", output], more].concat();
        underwind(folder.path(), &arguments).succeeds().stdout
    };
    let told = fit(&[], "tested");
    assert!(told.contains("gain step in 1"), "{told}");
    let difference = |output: &str, column: &str| {
        let segments = rows(&folder.path().join(output).join("segments.csv"));
        assert_eq!(segments.len(), 2, "{segments:?}");
        number(&segments[1], column) - number(&segments[0], column)
    };
    assert!((difference("tested", "floor_db").abs() - 4.0).abs() < 1.5, "{}", difference("tested", "floor_db"));
    fit(&["--offset-by", "deployment"], "offset");
    // One offset moves both by the same amount.
    let [floor, wind] = ["floor_db", "wind_component_at_10_m_s_db"].map(|column| difference("offset", column));
    assert!((floor - wind).abs() < 1e-6 && (floor.abs() - 4.0).abs() < 0.6, "{floor} {wind}");
    fit(&["--floor-by", "deployment"], "floor");
    assert!(difference("floor", "wind_component_at_10_m_s_db").abs() < 1e-9);
    let slope =
        |output: &str| number(&rows(&folder.path().join(output).join("relation.csv"))[0], "slope_db_per_decade");
    // The case's truth is 30 dB per decade.
    assert!((slope("offset") - 30.0).abs() < 3.0, "{}", slope("offset"));
}

#[test]
fn months_may_have_floors_of_their_own() {
    let folder = tempfile::tempdir().unwrap();
    // Eight months of 730 h; the floor of the later ones is 3 dB higher.
    let truth = Truth::default();
    let simulated = record(truth, 5840, 77);
    let power = |level_db: f64| 10f64.powf(level_db / 10.0);
    let mut text = String::from("time_h,wind_speed_m_s,level_db\n");
    for (row, (wind, level)) in simulated.wind_m_s.iter().zip(&simulated.level_db).enumerate() {
        let mean = super::simulator::mean_level_db(&truth, *wind);
        let lift = 10.0 * (power(mean) + power(63.0) - power(60.0)).log10() - mean;
        writeln!(text, "{row},{wind:.4},{:.3}", level + if row >= 2920 { lift } else { 0.0 }).unwrap();
    }
    std::fs::write(folder.path().join("pairs.csv"), text).unwrap();
    let arguments = ["fit", "--matchups", "pairs.csv", "--replicates", "200", "--floor-by", "month", "-o", "out"];
    underwind(folder.path(), &arguments).succeeds();
    let segments = rows(&folder.path().join("out/segments.csv"));
    assert_eq!(segments.len(), 9, "{segments:?}");
    assert_eq!(segments[0]["segment"], "1970-01");
    let months: Vec<_> = segments.iter().filter(|row| number(row, "pairs") > 500.0).collect();
    assert_eq!(months.len(), 8, "{segments:?}");
    // The floor rises in the night from 2 to 3 May: the fifth month counts with the later ones.
    let truth_of = |k: usize| if k < 4 { 60.0 } else { 63.0 };
    let held = (0..8)
        .filter(|k| (number(months[*k], "floor_low_db")..=number(months[*k], "floor_high_db")).contains(&truth_of(*k)))
        .count();
    assert!(
        held >= 7,
        "{held}: {:?}",
        months
            .iter()
            .map(|m| (&m["segment"], &m["floor_db"], &m["floor_low_db"], &m["floor_high_db"]))
            .collect::<Vec<_>>()
    );
    let mean = |range: std::ops::Range<usize>| {
        range.clone().map(|k| number(months[k], "floor_db")).sum::<f64>() / range.len() as f64
    };
    let rise = mean(4..8) - mean(0..4);
    assert!((rise - 3.0).abs() < 1.5, "{rise}");
}

#[test]
fn replicates_are_written_on_request() {
    let folder = tempfile::tempdir().unwrap();
    pairs(&folder.path().join("pairs.csv"), 2, 2500, 0, |_, _, level| level);
    let arguments = ["fit", "--matchups", "pairs.csv", "--replicates", "100", "--keep-replicates", "-o", "out"];
    underwind(folder.path(), &arguments).succeeds();
    let kept = rows(&folder.path().join("out/replicates.csv"));
    assert_eq!(kept.len(), 200);
    let slopes: Vec<f64> = kept[..100].iter().map(|row| number(row, "slope_db_per_decade")).collect();
    let relation = &rows(&folder.path().join("out/relation.csv"))[0];
    // The printed interval is that of the replicates, widened for the number of blocks.
    let (low, high) = (number(relation, "slope_low_db_per_decade"), number(relation, "slope_high_db_per_decade"));
    let inside = slopes.iter().filter(|slope| (low..=high).contains(slope)).count();
    assert!((93..=100).contains(&inside), "{inside}");
}
