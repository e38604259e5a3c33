//! Figures of the choices: for each sensor all bands at once, and each band by itself.

use crate::model::{Moved, Refit};
use crate::numerics::quantile::median;
use crate::pipeline::reporting::words::{estimate, file_part, reference};
use crate::report::{Estimate, Figure, IntervalColumn, IntervalRow, IntervalRows, interval_rows};

/// The figures with their file names.
pub(super) fn of_choices(refits: &[Refit]) -> Vec<(String, Figure)> {
    let mut figures = Vec::new();
    for sensor in refits.chunk_by(Refit::of_same_sensor) {
        let base = &sensor[0].base;
        let stem = format!("{}_{}_{}", file_part(&base.source.0), file_part(&base.site), file_part(&base.sensor));
        let title = format!("Site {}, sensor {}: what the choices move", base.site, base.sensor);
        figures.push((format!("{stem}_sensitivity"), interval_rows(&over_bands(&title, sensor))));
        let mut bands: Vec<u64> = Vec::new();
        for refit in sensor {
            let band = refit.base.band.map_or(0, |band| band.centre_hz.to_bits());
            if !bands.contains(&band) {
                bands.push(band);
                let of_band: Vec<&Refit> = sensor.iter().filter(|other| other.base.band == refit.base.band).collect();
                let label = refit.base.band_label();
                let name = format!("{stem}_{}_sensitivity", file_part(&label));
                figures.push((name, interval_rows(&of_one_band(&format!("{title}, {label}"), &of_band))));
            }
        }
    }
    figures
}

fn column_label(quantity: Moved, level: &str) -> String {
    match quantity {
        Moved::Floor => format!("Floor ({level})"),
        Moved::Slope => "Slope (dB per decade)".to_owned(),
        Moved::Onset => "Onset (m/s)".to_owned(),
    }
}

/// Shifts over all bands: the median with the range.
fn over_bands(title: &str, refits: &[Refit]) -> IntervalRows {
    let columns = Moved::ALL.map(|quantity| {
        let halves: Vec<f64> = refits
            .iter()
            .filter_map(|refit| quantity.of(&refit.base).interval())
            .map(|(low, high)| (high - low) / 2.0)
            .collect();
        let half = median(&halves);
        let base = if half.is_finite() { Estimate::value(0.0, -half, half) } else { Estimate::NotResolved };
        let label = match quantity {
            Moved::Floor => "Shift of the floor (dB)",
            Moved::Slope => "Shift of the slope (dB per decade)",
            Moved::Onset => "Shift of the onset (m/s)",
        };
        IntervalColumn { label: label.to_owned(), base }
    });
    let rows = refits.chunk_by(Refit::of_same_choice).map(|refits| {
        let values = Moved::ALL.map(|quantity| {
            let shifts: Vec<f64> = refits.iter().filter_map(|refit| refit.shift(quantity)).collect();
            let (low, high) =
                shifts.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), s| (low.min(*s), high.max(*s)));
            Estimate::value(median(&shifts), low, high)
        });
        IntervalRow {
            group: refits[0].choice.about.to_owned(),
            label: refits[0].choice.taken.clone(),
            chosen: false,
            values: values.to_vec(),
        }
    });
    IntervalRows {
        title: title.to_owned(),
        notes: vec!["One choice differs from the study's at a time.".to_owned()],
        mark_name: "median shift and range over the bands".to_owned(),
        base_name: "no shift, and half the width of the 95 % interval to each side (median band)".to_owned(),
        columns: columns.to_vec(),
        rows: rows.collect(),
    }
}

/// The results of one band under each choice.
fn of_one_band(title: &str, refits: &[&Refit]) -> IntervalRows {
    let base = &refits[0].base;
    let level = base.kind.map_or("dB", reference);
    let columns = Moved::ALL
        .map(|quantity| IntervalColumn { label: column_label(quantity, level), base: estimate(quantity.of(base)) });
    let mut rows = vec![IntervalRow {
        group: "study".to_owned(),
        label: "as in the study file".to_owned(),
        chosen: true,
        values: Moved::ALL.map(|quantity| estimate(quantity.of(base))).to_vec(),
    }];
    rows.extend(refits.iter().map(|refit| IntervalRow {
        group: refit.choice.about.to_owned(),
        label: refit.choice.taken.clone(),
        chosen: false,
        values: Moved::ALL.map(|quantity| estimate(quantity.of(&refit.other))).to_vec(),
    }));
    IntervalRows {
        title: title.to_owned(),
        notes: vec!["One choice differs from the study's at a time.".to_owned()],
        mark_name: "value with 95 % interval".to_owned(),
        base_name: "result of the study with its 95 % interval".to_owned(),
        columns: columns.to_vec(),
        rows,
    }
}
