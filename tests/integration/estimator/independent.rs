//! Estimates and bootstrap standard errors against scipy on all samples (`tests/fixtures/estimator/independent.py`, with the
//! versions of its libraries in `independent.json`).

use serde_json::Value;
use std::path::PathBuf;
use underwind::science::level_wind::{KeepReplicates, Loss, Options, ScatterModel, fit_band};

fn read(name: &str) -> String {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/fixtures/estimator");
    std::fs::read_to_string(folder.join(name)).unwrap()
}

fn standard_deviation(values: &[f64]) -> f64 {
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    (values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / (values.len() as f64 - 1.0)).sqrt()
}

#[test]
fn estimates_and_standard_errors_agree_with_scipy() {
    let mut columns = vec![Vec::new(); 5];
    for line in read("independent.csv").lines().skip(1) {
        for (column, cell) in columns.iter_mut().zip(line.split(',')) {
            column.push(cell.parse::<f64>().unwrap());
        }
    }
    let times: Vec<i64> = columns[0].iter().map(|hour| (hour * 3.6e6) as i64).collect();
    let reference: Value = serde_json::from_str(&read("independent.json")).unwrap();
    let options = Options {
        loss: Loss::LeastSquares,
        scatter: ScatterModel::FixedPowerSum,
        replicates: 1000,
        keep_replicates: KeepReplicates::Yes,
        ..Options::default()
    };
    for (name, levels) in ["level_a", "level_b", "level_c"].iter().zip(&columns[2..]) {
        let relation = fit_band(&times, &columns[1], levels, None, &options);
        let wanted = &reference[name];
        let block_h = relation.diagnostics.resampled_block_length_h.unwrap();
        assert!((block_h / wanted["block_h"].as_f64().unwrap() - 1.0).abs() < 1e-6, "{name}: blocks of {block_h} h");
        let onset = (relation.diagnostics.fitted_onset_m_s.unwrap() / 10.0).log10();
        let replicates = relation.replicates.as_ref().unwrap();
        for (key, found, values) in [
            ("floor_db", relation.floor_db.estimate().unwrap(), &replicates.floor_db),
            (
                "wind_component_at_10_m_s_db",
                relation.wind_component_at_10_m_s_db.estimate().unwrap(),
                &replicates.wind_component_at_10_m_s_db,
            ),
            ("slope_db_per_decade", relation.slope_db_per_decade.estimate().unwrap(), &replicates.slope_db_per_decade),
            ("onset_log10", onset, &replicates.onset_log10),
        ] {
            let (estimate, error) =
                (wanted["estimate"][key].as_f64().unwrap(), wanted["standard_error"][key].as_f64().unwrap());
            // The fit works on classes of wind, the reference on all samples.
            assert!((found - estimate).abs() < 0.1 * error, "{name} {key}: {found}, scipy {estimate} +- {error}");
            let ratio = standard_deviation(values) / error;
            assert!((0.9..=1.1).contains(&ratio), "{name} {key}: standard error {ratio} times scipy's");
        }
    }
}
