//! The spreading comparison in words for the terminal.

use crate::model::{SensorSpreading, SpreadVerdict};
use std::collections::BTreeMap;

/// Sensor by sensor and model by model: where and when sound could judge, and what it says, each band in words.
pub fn spreading_text(all: &[SensorSpreading]) -> String {
    let mut out = String::new();
    for sensor in all {
        let mut models: Vec<&str> = Vec::new();
        for comparison in &sensor.comparisons {
            if !models.contains(&comparison.model.as_str()) {
                models.push(&comparison.model);
            }
        }
        for model in models {
            out.push_str(&format!("site {}, sensor {}, spectra {model}\n", sensor.site, sensor.sensor));
            of_model(sensor, model, &mut out);
        }
        for pair in &sensor.pairs {
            let Some(nearer) = pair.nearer() else { continue };
            if pair.class.all_winds() {
                out.push_str(&format!(
                    "  {}, {}: the sound is nearer to {nearer} than to {}\n",
                    pair.band.label(),
                    pair.class.words(),
                    if nearer == pair.models[0] { &pair.models[1] } else { &pair.models[0] }
                ));
            }
        }
    }
    out
}

fn of_model(sensor: &SensorSpreading, model: &str, out: &mut String) {
    let months = sensor.testability.iter().filter(|(of, _)| of == model);
    let (mut testable, mut windows) = (0, 0);
    for (_, month) in months {
        testable += month.testable;
        windows += month.windows;
    }
    let share = 100.0 * testable as f64 / windows.max(1) as f64;
    out.push_str(&format!("  sound could judge spreading in {share:.0} % of the band-hours\n"));
    let mut silent: BTreeMap<&str, (usize, &str)> = BTreeMap::new();
    for comparison in sensor.comparisons.iter().filter(|comparison| comparison.model == model) {
        for class in comparison.classes.iter().filter(|class| class.class.all_winds()) {
            match class.verdict {
                SpreadVerdict::NotIdentified(why) => {
                    silent.entry(why.name()).or_insert((0, why.sentence())).0 += 1;
                }
                _ => out.push_str(&format!(
                    "  {:>8}: {}\n",
                    comparison.band.label(),
                    class.words(&sensor.density_words())
                )),
            }
        }
    }
    for (count, sentence) in silent.values() {
        out.push_str(&format!("  not identified in {count} classes: {sentence}\n"));
    }
}
