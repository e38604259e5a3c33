//! Every row of `tests/fixtures/physics/wave_values.csv`; the sources stand in its `source` column.

use std::f64::consts::{PI, TAU};
use underwind::model::{BandScheme, NotRadiated, SpectrumAxes};
use underwind::science::waves::{
    BandSettings, Distribution, Opposing, RadiatedBands, Radiator, SpreadingLaw, Water, WindSeaSpectrum,
    bottom_gain_db, finite_depth_factor, wrapped_normal_per_rad,
};
use underwind::units::Hertz;

/// Without tension: the rows about gravity waves.
fn gravity_water(depth_m: Option<f64>) -> Water {
    Water { tension_n_m: 0.0, depth_m, ..Water::default() }
}

/// Fresh water at about 20 C (surface tension from memory).
fn clean_water() -> Water {
    Water { tension_n_m: 0.0728, density_kg_m3: 998.2, ..Water::default() }
}

fn cosine(s: f64) -> Distribution {
    Distribution::CosinePower { s }
}

fn two_lobe(half_separation_deg: f64, width_deg: f64) -> Distribution {
    Distribution::TwoLobe { half_separation_rad: half_separation_deg.to_radians(), width_rad: width_deg.to_radians() }
}

/// A sea of 10 m/s, its radiated density at a sound frequency with this overlap, Pa^2/Hz.
fn radiated_pa2_hz(sound_hz: f64, overlap: f64) -> f64 {
    let water = gravity_water(None);
    let e = WindSeaSpectrum::fully_developed(10.0, &water).density_m2_hz(0.5 * sound_hz);
    Radiator { water, bottom_gain_db: 0.0 }.density_pa2_hz(sound_hz, e * e * overlap)
}

fn level_db(density_pa2_hz: f64) -> f64 {
    10.0 * density_pa2_hz.log10() + 120.0
}

/// A numerical integral over frequency from 0.2 to 30 peak frequencies.
fn variance(sea: &WindSeaSpectrum) -> f64 {
    let steps = 200_000;
    let (low, high) = ((0.2 * sea.peak_hz).ln(), (30.0 * sea.peak_hz).ln());
    let step = (high - low) / f64::from(steps);
    (0..steps)
        .map(|i| {
            let f = (low + (f64::from(i) + 0.5) * step).exp();
            sea.density_m2_hz(f) * f * step
        })
        .sum()
}

fn even_axes(count: usize) -> SpectrumAxes {
    SpectrumAxes::new(vec![0.1, 0.2], None, (0..count).map(|i| i as f64 * TAU / count as f64).collect()).unwrap()
}

fn dispersion(quantity: &str) -> Option<f64> {
    let at = |depth| gravity_water(depth);
    let example = Water { gravity_m_s2: 9.81, ..gravity_water(None) };
    Some(match quantity {
        "wavenumber deep" => at(None).wavenumber_rad_m(0.5),
        "wavelength deep" => TAU / at(None).wavenumber_rad_m(0.5),
        "phase speed deep" => at(None).phase_speed_m_s(0.5),
        "group speed deep" => at(None).group_speed_m_s(0.5),
        "wavenumber depth 10 m" => at(Some(10.0)).wavenumber_rad_m(0.1),
        "wavenumber depth 50 m" => at(Some(50.0)).wavenumber_rad_m(0.1),
        "wavenumber depth 1 m" => at(Some(1.0)).wavenumber_rad_m(0.5),
        "group speed depth 10 m" => at(Some(10.0)).group_speed_m_s(0.1),
        "phase speed minimum sea" => Water::default().slowest_wave().0,
        "wavelength at phase speed minimum sea" => Water::default().slowest_wave().1,
        "frequency at phase speed minimum sea" => Water::default().slowest_wave().2,
        "gravity-capillary transition frequency" => clean_water().slowest_wave().2,
        "gravity-capillary transition wavelength" => clean_water().slowest_wave().1,
        "double frequency of transition" => 2.0 * clean_water().slowest_wave().2,
        "wavenumber DNV example Tz=10 s" => example.wavenumber_rad_m(0.628_32 / TAU),
        _ => return None,
    })
}

fn wind_sea(quantity: &str) -> Option<f64> {
    let water = gravity_water(None);
    let g = water.gravity_m_s2;
    let sea = WindSeaSpectrum::fully_developed(10.0, &water);
    let wind = 10.0 * underwind::science::waves::WIND_19_5_OVER_10_M;
    let example = WindSeaSpectrum::of_height_and_period(12.0, 10.0, &Water { gravity_m_s2: 9.81, ..water });
    let peaked = WindSeaSpectrum { gamma: 3.3, ..sea };
    Some(match quantity {
        "PM peak frequency coefficient" => sea.peak_hz * TAU * wind / g,
        "PM Hs coefficient" => 4.0 * sea.m0_without_enhancement_m2().sqrt() * g / (wind * wind),
        "PM fp for Tz" => example.peak_hz,
        "PM spectral density" => example.density_m2_hz(0.079_577),
        "PM Phillips alpha" => example.alpha,
        "PM E(f) tail" => sea.density_m2_hz(1.0),
        "U19.5/U10 ratio log law" => underwind::science::waves::WIND_19_5_OVER_10_M,
        "Phillips saturation B(k) = alpha/2" => {
            // A pure f^-5 tail: the enhancement term is 1 far above the peak.
            let tail = WindSeaSpectrum { peak_hz: 1e-6, ..sea };
            water.saturation_of_wavenumber(1.0, tail.density_m2_hz(1.0))
        }
        "JONSWAP m0 ratio to PM" => variance(&peaked) / sea.m0_without_enhancement_m2(),
        "JONSWAP Goda normaliser beta_J" => {
            // E = beta Hs^2 fp^4 f^-5 exp(...) gamma^...: beta = alpha g^2 (2 pi)^-4 / (16 m0 fp^4).
            sea.alpha * g * g * TAU.powi(-4) / (16.0 * variance(&peaked) * sea.peak_hz.powi(4))
        }
        _ => return None,
    })
}

fn distribution(quantity: &str) -> Option<f64> {
    let spread_deg = |law: Distribution| law.spread_rad().to_degrees();
    let beta = |law: Distribution| if let Distribution::SechSquared { beta } = law { beta } else { f64::NAN };
    let half_separation_deg = |x: f64| match SpreadingLaw::Ewans1998.at(x, 1.0) {
        Distribution::TwoLobe { half_separation_rad, .. } => half_separation_rad.to_degrees(),
        _ => f64::NAN,
    };
    Some(match quantity {
        "cos2s normaliser s=1" => cosine(1.0).per_rad(0.0),
        "cos2s normaliser s=2" => cosine(2.0).per_rad(0.0),
        "cos2s normaliser s=10" => cosine(10.0).per_rad(0.0),
        "cos2s Kuik spread s=1" => spread_deg(cosine(1.0)),
        "cos2s Kuik spread s=2" => spread_deg(cosine(2.0)),
        "cos2s Kuik spread s=10" => spread_deg(cosine(10.0)),
        "Kuik spread isotropic" => spread_deg(Distribution::Isotropic),
        "cos2s r2 s=2" => cosine(2.0).harmonics().1,
        "wrapped normal Kuik spread" => spread_deg(Distribution::WrappedNormal { width_rad: 30f64.to_radians() }),
        "two-lobe a1" => two_lobe(70.0, 25.0).harmonics().0,
        "two-lobe a2" => two_lobe(70.0, 25.0).harmonics().1,
        // The two branches meet at 0.95 fp.
        "Donelan beta below peak" => beta(SpreadingLaw::DonelanBanner.at(0.95 - 1e-9, 1.0)),
        "Donelan beta above peak" => beta(SpreadingLaw::DonelanBanner.at(0.95 + 1e-9, 1.0)),
        "Banner beta" => beta(SpreadingLaw::DonelanBanner.at(3.0, 1.0)),
        "Ewans lobe separation (full)" => 2.0 * half_separation_deg(35f64.sqrt()),
        "Ewans lobe half-separation at 4 fp" => half_separation_deg(4.0),
        "sech2 normaliser" => Distribution::SechSquared { beta: 1.5 }.per_rad(0.0),
        _ => return None,
    })
}

fn overlap(quantity: &str) -> Option<f64> {
    let axes = even_axes(72);
    let row: Vec<f64> = axes.direction_to_rad.iter().map(|to| two_lobe(70.0, 25.0).per_rad(to - 0.7)).collect();
    Some(match quantity {
        "overlap I_2pi isotropic" => Distribution::Isotropic.overlap_2pi_per_rad(),
        "overlap I_pi isotropic" => 0.5 * Distribution::Isotropic.overlap_2pi_per_rad(),
        "overlap I_2pi cos2s s=1" => cosine(1.0).overlap_2pi_per_rad(),
        "overlap I_2pi cos2s s=2" => cosine(2.0).overlap_2pi_per_rad(),
        "overlap I_2pi cos2s s=4" => cosine(4.0).overlap_2pi_per_rad(),
        "overlap I_2pi cos2s s=10" => cosine(10.0).overlap_2pi_per_rad(),
        "overlap I_2pi two-lobe delta=0 sigma=30" => two_lobe(0.0, 30.0).overlap_2pi_per_rad(),
        "overlap I_2pi two-lobe delta=60 sigma=25" => two_lobe(60.0, 25.0).overlap_2pi_per_rad(),
        "overlap I_2pi two-lobe delta=70 sigma=25" => two_lobe(70.0, 25.0).overlap_2pi_per_rad(),
        "overlap I_2pi two-lobe delta=90 sigma=20" => two_lobe(90.0, 20.0).overlap_2pi_per_rad(),
        "overlap Fourier identity" => Opposing::new(&axes).by_fourier(&row, &row),
        "overlap sech2" => Distribution::SechSquared { beta: 1.2 }.overlap_2pi_per_rad(),
        "overlap two opposite bins maximum" => {
            let axes = even_axes(36);
            let mut row = vec![0.0; 36];
            (row[0], row[18]) = (0.5 * 36.0 / TAU, 0.5 * 36.0 / TAU);
            Opposing::new(&axes).own(&row)
        }
        "degree-density error in overlap" => {
            let row_per_deg: Vec<f64> = row.iter().map(|d| d.to_radians()).collect();
            let per_deg = 2.0 * 5.0 * (0..36).map(|i| row_per_deg[i] * row_per_deg[i + 36]).sum::<f64>();
            10.0 * (Opposing::new(&axes).own(&row) / per_deg).log10()
        }
        _ => return None,
    })
}

fn radiation(quantity: &str) -> Option<f64> {
    let water = gravity_water(None);
    let isotropic = 1.0 / TAU;
    let sea = WindSeaSpectrum::fully_developed(10.0, &water);
    Some(match quantity {
        "surface pressure spectrum F0 iso" => {
            let e = sea.density_m2_hz(1.0);
            Radiator { water, bottom_gain_db: 0.0 }.surface_pressure(1.0, e * e * isotropic)
        }
        "radiated PSD iso" => radiated_pa2_hz(2.0, isotropic),
        "radiated level iso" => level_db(radiated_pa2_hz(2.0, isotropic)),
        "radiated level cos2s s=2" => level_db(radiated_pa2_hz(2.0, cosine(2.0).overlap_2pi_per_rad())),
        "radiated level iso fs=1" => level_db(radiated_pa2_hz(1.0, isotropic)),
        "angular-frequency form" => {
            // P(Omega) = pi rho^2 g^2 Omega^3 Phi^2 I_pi / c^2 with Phi = E / 2 pi; per hertz 2 pi times as much.
            let phi = sea.density_m2_hz(1.0) / TAU;
            let omega: f64 = TAU * 2.0;
            let form = PI * (1025.0 * water.gravity_m_s2).powi(2) * omega.powi(3) * phi * phi * 0.5 * isotropic
                / 1500f64.powi(2);
            let ours = radiated_pa2_hz(2.0, isotropic);
            assert!((TAU * form / ours - 1.0).abs() < 1e-12);
            TAU * form
        }
        "spectral slope of radiated PSD, f^-5 sea" => {
            let radiator = Radiator { water, bottom_gain_db: 0.0 };
            let at = |sound_hz: f64| radiator.density_level_db(sound_hz, (0.5 * sound_hz).powi(-10));
            at(10.0) - at(1.0)
        }
        "capillary correction to F0" => {
            let (with, without) = (Radiator::default(), Radiator { water, bottom_gain_db: 0.0 });
            with.surface_pressure(5.0, 1.0) / without.surface_pressure(5.0, 1.0)
        }
        "bottom gain" => bottom_gain_db(0.5),
        "finite depth factor kD=1" => finite_depth_factor(1.0),
        "finite depth factor deep limit" => finite_depth_factor(30.0),
        "linear interpolation bias of E^2, f^-5, ratio 1.1" => linear_bias_db(),
        _ => return None,
    })
}

/// A narrow band midway between two frequencies of ratio 1.1: E interpolated linearly against what the bands do.
fn linear_bias_db() -> f64 {
    let directions = (0..36).map(|i| f64::from(i) * TAU / 36.0).collect();
    let frequency_hz: Vec<f64> = (0..4).map(|k| 0.5 * 1.1_f64.powi(k)).collect();
    let axes = SpectrumAxes::new(frequency_hz.clone(), None, directions).unwrap();
    let (low, high) = (frequency_hz[1], frequency_hz[2]);
    let middle = (low * high).sqrt();
    let e = |f: f64| f.powi(-5);
    let share = (middle - low) / (high - low);
    let linear = (1.0 - share) * e(low) + share * e(high);
    let band = underwind::model::Band::from_edges(2.0 * middle * 0.999_999, 2.0 * middle * 1.000_001).unwrap();
    let radiator = Radiator { water: gravity_water(None), bottom_gain_db: 0.0 };
    let source: Vec<f64> = frequency_hz.iter().map(|f| e(*f).powi(2)).collect();
    let mut out = [Err(NotRadiated::NoSpectrum)];
    RadiatedBands::new(&axes, &radiator, &[band], BandSettings::default()).levels(&source, None, &mut out);
    let ours = out[0].unwrap().band_level_db - band.width_db();
    radiator.density_level_db(2.0 * middle, linear * linear) - ours
}

#[test]
fn every_row_comes_out() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/fixtures/physics/wave_values.csv");
    let mut reader = csv::Reader::from_path(path).unwrap();
    let mut checked = 0;
    for row in reader.records() {
        let row = row.unwrap();
        let (quantity, source) = (&row[0], &row[5]);
        let (expected, tolerance): (f64, f64) = (row[2].parse().unwrap(), row[4].parse().unwrap());
        let found = [dispersion, wind_sea, distribution, overlap, radiation].into_iter().find_map(|of| of(quantity));
        let found = found.unwrap_or_else(|| panic!("no check for `{quantity}`"));
        // The file prints ten digits.
        let tolerance = tolerance.max(1e-9 * expected.abs());
        assert!((found - expected).abs() <= tolerance, "{quantity}: {found}, expected {expected} ({source})");
        checked += 1;
    }
    assert_eq!(checked, 68, "rows of the fixture");
}

// Physics reference: expected overlap against x = f / fp of the published laws, dB re isotropic (its table, to its digits).
#[test]
fn the_laws_agree_with_the_table_of_expected_overlaps() {
    for (law, x, expected_db, tolerance_db) in [
        (SpreadingLaw::Mitsuyasu1975, 1.0, -61.0, 0.6),
        (SpreadingLaw::Mitsuyasu1975, 2.0, -7.9, 0.06),
        (SpreadingLaw::Mitsuyasu1975, 4.0, -0.6, 0.06),
        (SpreadingLaw::Mitsuyasu1975, 8.0, -0.03, 0.006),
        (SpreadingLaw::DonelanBanner, 2.0, -6.7, 0.06),
        (SpreadingLaw::DonelanBanner, 4.0, -1.9, 0.06),
        (SpreadingLaw::DonelanBanner, 8.0, -1.0, 0.06),
        (SpreadingLaw::Ewans1998, 1.0, -101.0, 0.6),
        (SpreadingLaw::Ewans1998, 2.0, -17.3, 0.06),
        (SpreadingLaw::Ewans1998, 3.0, -6.6, 0.06),
        (SpreadingLaw::Ewans1998, 4.0, -2.3, 0.06),
        (SpreadingLaw::Ewans1998, 6.0, 0.9, 0.06),
        (SpreadingLaw::Ewans1998, 8.0, 1.8, 0.06),
    ] {
        let found = law.at(x, 1.0).overlap_db();
        assert!((found - expected_db).abs() < tolerance_db, "{law:?} at {x}: {found}");
    }
}

#[test]
fn every_distribution_integrates_to_one_and_its_overlap_is_the_integral() {
    let laws = [
        Distribution::Isotropic,
        cosine(0.7),
        cosine(6.0),
        Distribution::SechSquared { beta: 0.7 },
        Distribution::WrappedNormal { width_rad: 0.5 },
        two_lobe(75.0, 20.0),
    ];
    let (count, step) = (20_000, TAU / 20_000.0);
    for law in laws {
        let angle = |i: i32| (f64::from(i) + 0.5) * step - PI;
        let total: f64 = (0..count).map(|i| law.per_rad(angle(i)) * step).sum();
        assert!((total - 1.0).abs() < 1e-7, "{law:?}: {total}");
        let overlap: f64 = (0..count).map(|i| law.per_rad(angle(i)) * law.per_rad(angle(i) + PI) * step).sum();
        assert!((law.overlap_2pi_per_rad() / overlap - 1.0).abs() < 1e-5, "{law:?}");
    }
    // A wrapped normal has no seam.
    assert!((wrapped_normal_per_rad(PI, 0.8) - wrapped_normal_per_rad(-PI, 0.8)).abs() < 1e-15);
}

#[test]
fn decidecades_of_sound_are_decidecades_of_waves() {
    // The band's own edges halved: what the source is integrated over.
    let band = BandScheme::Decidecade.band(Hertz::new(2.0).unwrap()).unwrap();
    let half = BandScheme::Decidecade.band(Hertz::new(1.0).unwrap()).unwrap();
    assert!((band.high_hz / band.low_hz - half.high_hz / half.low_hz).abs() < 1e-12);
}
