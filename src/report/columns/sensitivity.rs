//! What choices do to the result: one row per band and choice.

use crate::model::{ColumnData, Moved, Refit, Table};

/// Names of the columns of one quantity: study's value, value under the choice, shift, shift in half intervals.
struct Names {
    quantity: Moved,
    unit: &'static str,
    base: &'static str,
    other: &'static str,
    shift: &'static str,
    relative: &'static str,
}

const NAMES: [Names; 3] = [
    Names {
        quantity: Moved::Floor,
        unit: "dB",
        base: "study_floor_db",
        other: "floor_db",
        shift: "floor_shift_db",
        relative: "floor_shift_half_intervals",
    },
    Names {
        quantity: Moved::Slope,
        unit: "dB",
        base: "study_slope_db_per_decade",
        other: "slope_db_per_decade",
        shift: "slope_shift_db_per_decade",
        relative: "slope_shift_half_intervals",
    },
    Names {
        quantity: Moved::Onset,
        unit: "m s-1",
        base: "study_onset_m_s",
        other: "onset_m_s",
        shift: "onset_shift_m_s",
        relative: "onset_shift_half_intervals",
    },
];

/// The table of refits under other choices.
pub fn sensitivity_table(refits: &[Refit]) -> Table {
    let mut table = Table::default();
    let text = |pick: &dyn Fn(&Refit) -> &str| ColumnData::from_texts(refits.iter().map(pick));
    let number = |pick: &dyn Fn(&Refit) -> Option<f64>| {
        ColumnData::Number(refits.iter().map(|refit| pick(refit).unwrap_or(f64::NAN)).collect())
    };
    table.push("source", "", "id of the study's own wind input", text(&|refit| &refit.base.source.0));
    table.push("site", "", "id of the site", text(&|refit| &refit.base.site));
    table.push("sensor", "", "id of the sensor", text(&|refit| &refit.base.sensor));
    table.push(
        "band_centre_hz",
        "Hz",
        "mid-band frequency of the sound",
        number(&|refit| refit.base.band.map(|band| band.centre_hz)),
    );
    table.push("choice", "", "what is decided", text(&|refit| refit.choice.about));
    table.push("taken", "", "how it was decided this time", text(&|refit| &refit.choice.taken));
    for names in &NAMES {
        let quantity = names.quantity;
        table.push(
            names.base,
            names.unit,
            "the study's own result",
            number(&|refit| quantity.of(&refit.base).estimate()),
        );
        table.push(
            names.other,
            names.unit,
            "the result under the choice",
            number(&|refit| quantity.of(&refit.other).estimate()),
        );
        table.push(
            names.shift,
            names.unit,
            "result under the choice minus the study's own",
            number(&|refit| refit.shift(quantity)),
        );
        table.push(
            names.relative,
            "1",
            "the shift over half the width of the study's 95 % interval",
            number(&|refit| refit.shift_in_half_intervals(quantity)),
        );
    }
    table.push(
        "study_verdict",
        "",
        "what the data say about the onset, in the study",
        text(&|refit| refit.base.relation.verdict.name()),
    );
    table.push("verdict", "", "the same under the choice", text(&|refit| refit.other.relation.verdict.name()));
    table.push(
        "pairs",
        "1",
        "pairs of wind and level used under the choice",
        ColumnData::Integer(refits.iter().map(|refit| refit.other.relation.diagnostics.samples as i64).collect()),
    );
    table
}
