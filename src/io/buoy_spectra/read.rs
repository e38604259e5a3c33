//! Reads the texts: `YY MM DD hh mm [separation frequency] value (frequency) value (frequency) ...`, UTC, in any order of
//! time. Codes 999 are missing.

use super::error::BuoyError;
use crate::model::MomentSeries;
use crate::units::Instant;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// From here on a direction or a moment is the code for a missing one.
const MISSING_FROM: f64 = 999.0;
/// Frequencies of two lines are the same within this, Hz: archives print three decimals.
const SAME_HZ: f64 = 6e-4;

/// What a text holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Kind {
    Density,
    MeanDirection,
    PrincipalDirection,
    R1,
    R2,
}

const KINDS: [(Kind, &str); 5] = [
    (Kind::Density, "spec_1"),
    (Kind::MeanDirection, "alpha1_1"),
    (Kind::PrincipalDirection, "alpha2_1"),
    (Kind::R1, "r1_1"),
    (Kind::R2, "r2_1"),
];

type Lines = BTreeMap<Instant, Vec<(f64, f64)>>;

/// Whether a file looks like one of these texts.
pub fn is_buoy_text(path: &Path) -> bool {
    let mut head = [0_u8; 256];
    let read = std::fs::File::open(path).and_then(|mut file| std::io::Read::read(&mut file, &mut head)).unwrap_or(0);
    kind_of(&String::from_utf8_lossy(&head[..read])).is_some()
}

fn kind_of(text: &str) -> Option<Kind> {
    let first = text.lines().next()?;
    if !first.starts_with('#') {
        return None;
    }
    KINDS.iter().find(|(_, word)| first.split_whitespace().any(|part| part == *word)).map(|(kind, _)| *kind)
}

/// Reads the texts of one buoy: one of density, and as many of directions and moments as there are.
///
/// # Errors
/// When a file cannot be read, a line does not fit, or the density is missing.
pub fn read_buoy_spectra(files: &[PathBuf]) -> Result<MomentSeries, BuoyError> {
    let mut kinds: BTreeMap<Kind, Lines> = BTreeMap::new();
    for path in files {
        let bytes = std::fs::read(path).map_err(|source| BuoyError::Unreadable { path: path.clone(), source })?;
        let text = String::from_utf8_lossy(&bytes);
        let kind = kind_of(&text).ok_or_else(|| BuoyError::Header { path: path.clone() })?;
        let lines = kinds.entry(kind).or_default();
        for (number, line) in text.lines().enumerate().filter(|(_, line)| !line.starts_with('#')) {
            if line.trim().is_empty() {
                continue;
            }
            let wrong = |problem: String| BuoyError::Line { path: path.clone(), line: number + 1, problem };
            let (time, values) = parse(line, kind).map_err(wrong)?;
            if let Some(known) = lines.insert(time, values.clone())
                && known != values
            {
                return Err(wrong(format!("{time} is there twice with different numbers")));
            }
        }
    }
    let Some(density) = kinds.remove(&Kind::Density) else {
        return Err(BuoyError::Files {
            problem: "none of the files holds the density (spec_1 in its first line); expected it beside directions and moments".to_owned(),
        });
    };
    assemble(&density, &kinds)
}

/// A line's time and its values with their frequencies.
fn parse(line: &str, kind: Kind) -> Result<(Instant, Vec<(f64, f64)>), String> {
    let fields: Vec<&str> = line.split_whitespace().collect();
    if fields.len() < 7 {
        return Err(format!(
            "it has {} fields; expected a date, a time and values with their frequencies",
            fields.len()
        ));
    }
    let whole = |k: usize, low: u32, high: u32, what: &str| {
        let value: u32 = fields[k].parse().map_err(|_| format!("the {what} is `{}`", fields[k]))?;
        if (low..=high).contains(&value) { Ok(value) } else { Err(format!("the {what} is {value}")) }
    };
    let year = whole(0, 0, 9999, "year")?;
    let year = if year < 100 { if year < 60 { 2000 + year } else { 1900 + year } } else { year };
    let (month, day) = (whole(1, 1, 12, "month")?, whole(2, 1, 31, "day")?);
    let (hour, minute) = (whole(3, 0, 23, "hour")?, whole(4, 0, 59, "minute")?);
    let text = format!("{year:04}-{month:02}-{day:02}T{hour:02}:{minute:02}:00Z");
    let time = Instant::parse(&text).map_err(|_| format!("{text} is no time"))?;
    let mut rest = &fields[5..];
    // Before the pairs there may be the frequency that parts wind sea from swell.
    if rest.len() % 2 == 1 {
        rest = &rest[1..];
    }
    let mut values = Vec::with_capacity(rest.len() / 2);
    for pair in rest.chunks_exact(2) {
        let value: f64 = pair[0].parse().map_err(|_| format!("`{}` is no number", pair[0]))?;
        let frequency = pair[1].trim_matches(['(', ')']);
        let frequency: f64 = frequency.parse().map_err(|_| format!("`{}` is no frequency in brackets", pair[1]))?;
        let known = check(kind, value)?;
        values.push((frequency, known));
    }
    if values.windows(2).any(|pair| pair[1].0 <= pair[0].0) {
        return Err("its frequencies do not rise".to_owned());
    }
    Ok((time, values))
}

/// A value within its limits; NaN where it is the code for a missing one.
fn check(kind: Kind, value: f64) -> Result<f64, String> {
    let (high, what) = match kind {
        Kind::Density => (MISSING_FROM, "a density of 0 or more, m2/Hz"),
        Kind::MeanDirection | Kind::PrincipalDirection => (360.0, "a direction of 0 to 360 degrees"),
        Kind::R1 | Kind::R2 => (1.0, "a moment of 0 to 1 (in hundredths? divide by 100)"),
    };
    if value >= MISSING_FROM {
        return Ok(f64::NAN);
    }
    if (0.0..=high).contains(&value) { Ok(value) } else { Err(format!("{value} is not {what}")) }
}

fn assemble(density: &Lines, others: &BTreeMap<Kind, Lines>) -> Result<MomentSeries, BuoyError> {
    let frequency_hz: Vec<f64> =
        density.values().next().map(|values| values.iter().map(|(f, _)| *f).collect()).unwrap_or_default();
    let mut series = MomentSeries { frequency_hz: frequency_hz.clone(), ..MomentSeries::default() };
    if frequency_hz.len() < 2 {
        return Err(BuoyError::Files { problem: "the density has no line with at least two frequencies".to_owned() });
    }
    let mut without = 0;
    let mut changed = 0;
    for (time, values) in density {
        let same = values.len() == frequency_hz.len()
            && values.iter().zip(&frequency_hz).all(|((a, _), b)| (a - b).abs() < SAME_HZ);
        if !same {
            changed += 1;
            continue;
        }
        series.steps.push(*time);
        series.density_m2_hz.extend(values.iter().map(|(_, value)| *value));
        let mut lacks = false;
        for (kind, column) in [
            (Kind::MeanDirection, &mut series.mean_from_deg),
            (Kind::PrincipalDirection, &mut series.principal_from_deg),
            (Kind::R1, &mut series.r1),
            (Kind::R2, &mut series.r2),
        ] {
            let here = others.get(&kind).and_then(|lines| lines.get(time));
            lacks |= here.is_none() && others.contains_key(&kind);
            column.extend(frequency_hz.iter().map(|f| {
                here.and_then(|values| values.iter().find(|(g, _)| (f - g).abs() < SAME_HZ))
                    .map_or(f64::NAN, |(_, value)| *value)
            }));
        }
        without += usize::from(lacks);
    }
    if without > 0 {
        series.notes.push(format!("{without} of {} spectra have no directions", series.steps.len()));
    }
    if changed > 0 {
        series.notes.push(format!("{changed} spectra have other frequencies than the first and are left out"));
    }
    Ok(series)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_has_a_time_and_pairs_with_or_without_a_separation() {
        let (time, values) = parse("2022 04 28 02 50 0.250 0.5 (0.033) 999.0 (0.038)", Kind::Density).unwrap();
        assert_eq!(time.iso(), "2022-04-28T02:50:00Z");
        assert_eq!(values[0], (0.033, 0.5));
        assert!(values[1].1.is_nan());
        let (_, values) = parse("22 04 28 02 50 104.0 (0.033) 999.0 (0.038)", Kind::MeanDirection).unwrap();
        assert_eq!(values[0], (0.033, 104.0));
        for (line, part) in [
            ("2022 13 28 02 50 1 (0.1) 1 (0.2)", "the month is 13"),
            ("2022 04 28 02 50 x (0.1) 1 (0.2)", "`x` is no number"),
            ("2022 04 28 02 50 1 (0.2) 1 (0.1)", "do not rise"),
            ("2022 04 28", "expected a date"),
        ] {
            assert!(parse(line, Kind::Density).unwrap_err().contains(part), "{line}");
        }
        assert!(parse("2022 04 28 02 50 34 (0.1) 55 (0.2)", Kind::R1).unwrap_err().contains("hundredths"));
    }
}
