//! `sample`.

use super::Ending;
use super::args::{SampleArgs, SampleKind, Spatial};
use super::one_line;
use super::terminal::print;
use crate::model::{CoastRule, SpatialRule};
use crate::pipeline::{Answer, LookUp, look_up_levels, look_up_sites, look_up_spectrum, look_up_waves, look_up_wind};
use std::process::ExitCode;

pub(super) fn sample(args: &SampleArgs) -> Result<(), Ending> {
    let mut settings = args.settings.clone();
    if let Some(height_m) = args.height_m {
        settings.push(format!("height_m={height_m}"));
    }
    if let Some(member) = args.member {
        settings.push(format!("member={member}"));
    }
    let question = LookUp {
        files: args.files.clone(),
        latitude_deg: args.latitude,
        longitude_deg: args.longitude,
        time: args.time.clone(),
        quantity: args.quantity.clone(),
        site: args.site.clone(),
        frequency_hz: args.frequency_hz,
        direction_deg: args.direction_deg,
        spatial: match args.spatial {
            Spatial::Bilinear => SpatialRule::Bilinear(CoastRule::Missing),
            Spatial::Renormalise => SpatialRule::Bilinear(CoastRule::Renormalise),
            Spatial::Nearest => SpatialRule::Nearest { max_distance_km: 50.0 },
        },
        settings,
    };
    let looked = match args.kind {
        SampleKind::Wind => look_up_wind(&question),
        SampleKind::Waves => look_up_waves(&question),
        SampleKind::Spectrum => look_up_spectrum(&question),
        SampleKind::Levels => look_up_levels(&question),
        SampleKind::Sites => look_up_sites(&question),
    };
    match looked {
        Ok(answer) => print(&if args.json { json(&answer) } else { text(&answer) }).map_err(Ending::Exit),
        // Machines read the refusal where they read the answers; people on standard error.
        Err(error) if args.json => {
            let refused = Answer::refused(args.quantity.as_deref().unwrap_or(""), one_line(&error));
            print(&json(&refused)).map_err(Ending::Exit)?;
            Err(Ending::Exit(ExitCode::from(error.exit_status())))
        }
        Err(error) => Err(Ending::Error(error)),
    }
}

fn json(answer: &Answer) -> String {
    let mut text = serde_json::to_string(answer).expect("plain data is JSON");
    text.push('\n');
    text
}

fn text(answer: &Answer) -> String {
    let mut text = match answer.value {
        Some(value) => format!("{} = {value} {}\n", answer.quantity, answer.unit),
        None => format!("{}: no value\n", answer.quantity),
    };
    if let Some(message) = &answer.message {
        text.push_str(&format!("  {}: {message}\n", answer.status));
    }
    if let Some(inputs) = answer.inputs.as_object() {
        for (name, value) in inputs {
            text.push_str(&format!("  {name}: {}\n", value.as_str().map_or_else(|| value.to_string(), str::to_owned)));
        }
    }
    text
}
