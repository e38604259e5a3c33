//! What choices do to the result, as a short table for the terminal.

use crate::model::{Moved, Refit};

/// One line a choice, grouped by site and sensor: the shift of the band that the choice moves most against its interval.
pub fn sensitivity_text(refits: &[Refit]) -> String {
    let mut out = String::new();
    let mut groups: Vec<(&str, &str, Vec<&Refit>)> = Vec::new();
    for refit in refits {
        let here = (refit.base.site.as_str(), refit.base.sensor.as_str());
        match groups.iter_mut().find(|group| (group.0, group.1) == here) {
            Some(group) => group.2.push(refit),
            None => groups.push((here.0, here.1, vec![refit])),
        }
    }
    for (index, (site, sensor, refits)) in groups.into_iter().enumerate() {
        if index > 0 {
            out.push('\n');
        }
        out.push_str(&format!(
            "site {site}, sensor {sensor}: the largest shift over bands (in brackets: over half the study's 95 % interval)\n"
        ));
        out.push_str(&format!(
            "{:<50} {:>16} {:>16} {:>16} {:>9}\n",
            "choice", "floor (dB)", "slope (dB/dec.)", "onset (m/s)", "verdicts"
        ));
        for (about, taken, refits) in by_choice(&refits) {
            let [floor, slope, onset] = Moved::ALL.map(|quantity| largest(&refits, quantity));
            let changed = refits.iter().filter(|refit| refit.verdict_changes()).count();
            let verdicts = if changed == 0 { "same".to_owned() } else { format!("{changed} of {}", refits.len()) };
            out.push_str(&format!(
                "{:<50} {floor:>16} {slope:>16} {onset:>16} {verdicts:>9}\n",
                format!("{about}: {taken}")
            ));
        }
    }
    out
}

/// The refits of each choice, in order of their first.
pub(crate) fn by_choice<'a>(refits: &[&'a Refit]) -> Vec<(&'a str, &'a str, Vec<&'a Refit>)> {
    let mut groups: Vec<(&str, &str, Vec<&Refit>)> = Vec::new();
    for refit in refits {
        let here = (refit.choice.about, refit.choice.taken.as_str());
        match groups.iter_mut().find(|group| (group.0, group.1) == here) {
            Some(group) => group.2.push(refit),
            None => groups.push((here.0, here.1, vec![refit])),
        }
    }
    groups
}

fn largest(refits: &[&Refit], quantity: Moved) -> String {
    let shifts = refits.iter().filter_map(|refit| {
        Some((refit.shift(quantity)?, refit.shift_in_half_intervals(quantity).map_or(f64::NAN, f64::abs)))
    });
    match shifts.max_by(|a, b| a.1.total_cmp(&b.1)) {
        None => "-".to_owned(),
        Some((shift, relative)) if relative.is_finite() => format!("{shift:+.2} ({relative:.1})"),
        Some((shift, _)) => format!("{shift:+.2}"),
    }
}
