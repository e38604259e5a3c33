//! What choices do to the result, as a short table for the terminal.

use crate::model::{Moved, Refit};

/// One line a choice, grouped by site and sensor (refits come in this order): the shift of the band that the choice moves most against its interval.
pub fn sensitivity_text(refits: &[Refit]) -> String {
    let mut out = String::new();
    for (index, refits) in refits.chunk_by(Refit::of_same_sensor).enumerate() {
        let (site, sensor) = (&refits[0].base.site, &refits[0].base.sensor);
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
        for refits in refits.chunk_by(Refit::of_same_choice) {
            let [floor, slope, onset] = Moved::ALL.map(|quantity| largest(refits, quantity));
            let changed = refits.iter().filter(|refit| refit.verdict_changes()).count();
            let verdicts = if changed == 0 { "same".to_owned() } else { format!("{changed} of {}", refits.len()) };
            out.push_str(&format!(
                "{:<50} {floor:>16} {slope:>16} {onset:>16} {verdicts:>9}\n",
                format!("{}: {}", refits[0].choice.about, refits[0].choice.taken)
            ));
        }
    }
    out
}

fn largest(refits: &[Refit], quantity: Moved) -> String {
    let shifts = refits.iter().filter_map(|refit| {
        Some((refit.shift(quantity)?, refit.shift_in_half_intervals(quantity).map_or(f64::NAN, f64::abs)))
    });
    match shifts.max_by(|a, b| a.1.total_cmp(&b.1)) {
        None => "-".to_owned(),
        Some((shift, relative)) if relative.is_finite() => format!("{shift:+.2} ({relative:.1})"),
        Some((shift, _)) => format!("{shift:+.2}"),
    }
}
