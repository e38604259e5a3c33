//! `sample waves`: gridded integral parameters. The file holds what numpy worked out by hand in `make_waves.py`.

use super::support::fixture;
use underwind::pipeline::{LookUp, look_up_waves};

fn ask(quantity: &str, settings: &[&str]) -> Result<underwind::pipeline::Answer, underwind::Error> {
    look_up_waves(&LookUp {
        files: vec![fixture("waves.nc")],
        latitude_deg: Some(45.25),
        longitude_deg: Some(-31.5),
        time: Some("2031-01-10T01:30:00Z".to_owned()),
        quantity: Some(quantity.to_owned()),
        settings: settings.iter().map(|text| (*text).to_owned()).collect(),
        ..LookUp::default()
    })
}

// Closed forms: fields that are linear in latitude, longitude and time; directions 350 and 10 at equal heights give 0, not 180.
#[test]
fn parameters_are_interpolated_and_directions_on_the_circle() {
    let value = |quantity: &str| ask(quantity, &[]).unwrap().value.unwrap();
    assert!((value("sea_surface_wave_significant_height") - 2.5).abs() < 1e-6);
    assert!((value("sea_surface_wave_period_at_variance_spectral_density_maximum") - 9.25).abs() < 1e-6);
    let from = value("sea_surface_wave_from_direction");
    assert!(from.min(360.0 - from) < 1e-6, "{from}");
    let wrong = ask("sea_surface_wave_directional_spread", &[]).unwrap_err();
    assert!(wrong.to_string().contains("no variable is recognised as the directional spread"), "{wrong}");
    let wrong = ask("sea_surface_wave_directional_spread", &["variable=swh"]).unwrap_err();
    assert!(wrong.to_string().contains("it has units `m`; expected degree"), "{wrong}");
}
