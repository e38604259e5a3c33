//! Files of others: the reference set and real spectra, where they are there.

use super::support::ask;
use crate::support::shared;

const HEIGHT: &str = "sea_surface_wave_significant_height";
const MEAN_PERIOD: &str = "sea_surface_wave_mean_period_from_variance_spectral_density_first_frequency_moment";

fn rows(text: &str) -> Vec<std::collections::HashMap<String, String>> {
    let mut lines = text.lines();
    let names: Vec<String> = lines.next().unwrap().split(',').map(str::to_owned).collect();
    lines.map(|line| names.iter().cloned().zip(line.split(',').map(str::to_owned)).collect()).collect()
}

// Reference: scipy 1.17 and a hand-written loop with numpy 2.4 (bench/make_reference.py): trapezoid over frequency, bins of
// 10 degrees, zero-weight corners ignored.
#[test]
fn all_points_of_the_reference_set_agree() {
    let Some(folder) = shared("bench") else { return };
    let folder = folder.join("tiny_reference");
    let files = [folder.join("spectra.nc")];
    let text = std::fs::read_to_string(folder.join("reference_spectra.csv")).unwrap();
    let (mut points, mut missing, mut overlaps) = (0, 0, 0);
    // The axis is stored in single precision.
    let frequency: Vec<f64> = (0..36).map(|k| 0.035 * 1.1_f64.powi(k)).collect();
    for row in rows(&text) {
        let number = |name: &str| row[name].parse::<f64>().ok().filter(|value| value.is_finite());
        let place = Some((number("lat").unwrap(), number("lon").unwrap()));
        let get = |quantity: &str, hz: f64| ask(&files, place, &row["time"], quantity, hz).unwrap();
        points += 1;
        let Some(hs) = number("hs_m") else {
            let answer = get(HEIGHT, 0.1);
            assert_eq!((answer.status, answer.value), ("missing", None), "{row:?}");
            missing += 1;
            continue;
        };
        let value = |quantity: &str, hz: f64| get(quantity, hz).value.unwrap_or_else(|| panic!("{quantity} {row:?}"));
        assert!((value(HEIGHT, 0.1) - hs).abs() < 1e-5, "{row:?}");
        for (quantity, column, tolerance) in [
            ("sea_surface_wave_period_at_variance_spectral_density_maximum", "tp_s", 1e-5),
            ("sea_surface_wave_frequency_at_variance_spectral_density_maximum", "fp_hz", 1e-7),
            (MEAN_PERIOD, "tm01_s", 1e-5),
            ("sea_surface_wave_to_direction", "mean_dir_to_deg", 1e-3),
            ("sea_surface_wave_directional_spread", "spread_deg", 1e-3),
        ] {
            let (found, expected) = (value(quantity, 0.1), number(column).unwrap());
            assert!((found - expected).abs() < tolerance, "{column}: {found} for {expected}");
        }
        for (k, hz) in frequency.iter().enumerate() {
            match number(&format!("overlap_{k:02}")) {
                Some(expected) => {
                    let found = value("overlap_2pi", *hz);
                    assert!((found / expected - 1.0).abs() < 1e-4, "{k}: {found} for {expected}");
                    overlaps += 1;
                }
                // At most 1e-8 of the peak density: a distribution over directions means nothing.
                None => assert_eq!(get("overlap_2pi", *hz).status, "missing"),
            }
        }
    }
    // BENCH.md: 47 points, 10 of them missing.
    assert_eq!((points, missing), (47, 10));
    assert!(overlaps > 1000, "{overlaps}");
}

// DATA.md: facts of the wave model's own test spectrum, read with netCDF4 1.7.5.
#[test]
fn the_wave_models_own_test_spectrum_gives_its_facts() {
    let Some(folder) = shared("data") else { return };
    let files = [folder.join("ww3_tp1.11_a_spec.nc")];
    let time = "1968-06-01T09:00:00Z";
    let get = |quantity: &str, hz: f64| ask(&files, None, time, quantity, hz).unwrap();
    assert!((get(HEIGHT, 0.1).value.unwrap() - 0.996_865_213_9).abs() < 1e-6);
    assert!((get("sea_surface_wave_to_direction", 0.1).value.unwrap() - 270.0).abs() < 1e-3);
    assert_eq!(get("overlap_2pi", 0.103_749_7).value, Some(0.0));
    let radiated = get("radiated_level", 2.0 * 0.103_749_7);
    assert_eq!((radiated.status, radiated.value), ("missing", None));
    assert!(radiated.message.unwrap().contains("the radiated level is undefined, not zero"));
    for (hz, to, density) in
        [(0.103_749_7, 270.0, 1.192_051), (0.103_749_7, 285.0, 0.595_895_6), (0.103_749_7, 90.0, 0.0)]
    {
        let answer = underwind::pipeline::look_up_spectrum(&underwind::pipeline::LookUp {
            files: files.to_vec(),
            time: Some(time.to_owned()),
            quantity: Some("sea_surface_wave_directional_variance_spectral_density".to_owned()),
            frequency_hz: Some(hz),
            direction_deg: Some(to),
            ..underwind::pipeline::LookUp::default()
        });
        assert!((answer.unwrap().value.unwrap() - density).abs() < 1e-6, "{to}");
    }
}

// DATA.md: facts of a real buoy, worked out with numpy; height within 0.02 m of both ways of weighing uneven frequencies.
#[test]
fn a_buoys_texts_give_its_facts() {
    let Some(folder) = shared("data") else { return };
    let files: Vec<std::path::PathBuf> = ["data_spec", "swdir", "swdir2", "swr1", "swr2"]
        .iter()
        .map(|kind| folder.join(format!("ndbc_44013.{kind}")))
        .collect();
    for (time, hs, peak_hz, density, from) in [
        ("2022-04-28T02:50:00Z", 1.519, 0.088, 2.5, 104.0),
        ("2022-04-28T03:50:00Z", 1.676, 0.200, 2.14, 316.0),
        ("2022-05-08T12:50:00Z", 1.653, 0.170, 1.39, 76.0),
    ] {
        let get = |quantity: &str| ask(&files, None, time, quantity, peak_hz).unwrap();
        let value = |quantity: &str| get(quantity).value.unwrap();
        assert!((value(HEIGHT) - hs).abs() < 0.02, "{time}");
        let peak = value("sea_surface_wave_frequency_at_variance_spectral_density_maximum");
        assert!((peak - peak_hz).abs() < 1e-9, "{time}: {peak}");
        assert!((value("sea_surface_wave_variance_spectral_density") - density).abs() < 0.006, "{time}");
        assert!((value("sea_surface_wave_mean_from_direction") - from).abs() < 1e-6, "{time}");
        let overlap = get("overlap_2pi");
        assert_eq!((overlap.status, overlap.value), ("missing", None));
        assert!(overlap.message.unwrap().contains("1/rad over shapes with these moments"), "{time}");
    }
}
