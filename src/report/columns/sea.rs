//! Columns of the sea in the tables of conditions and matchups.

use super::sampled::repeated;
use crate::model::{BandSea, ColumnData, LevelKind, Missing, SeaConditions, SeaRows, SeaSummary, SensorRecord, Table};

/// The sea over each window, after the columns of the wind.
pub(super) fn push_conditions(table: &mut Table, sea: &SeaConditions) {
    let rows = sea.sea.len();
    let number = |pick: &dyn Fn(&SeaSummary) -> f64| {
        ColumnData::Number(sea.sea.iter().map(|sea| sea.as_ref().map_or(f64::NAN, pick)).collect())
    };
    let of_wind_sea = |pick: fn(&crate::model::WindSea) -> f64| {
        number(&move |sea: &SeaSummary| sea.wind_sea.as_ref().map_or(f64::NAN, pick))
    };
    table.push("sea_source", "", "id of the spectra input", repeated(&sea.source.0, rows));
    table.push("wave_height_m", "m", "significant wave height, 4 sqrt(m0)", number(&|s| s.hs_m));
    table.push(
        "peak_frequency_hz",
        "Hz",
        "peak of the frequency spectrum (parabola through the largest bin and its neighbours)",
        number(&|s| s.peak_hz),
    );
    table.push("mean_period_m01_s", "s", "mean period m0/m1", number(&|s| s.tm01_s));
    table.push(
        "wave_from_direction_deg",
        "degree",
        "mean direction that waves come from, clockwise from true north",
        number(&|s| s.mean_from_deg),
    );
    table.push(
        "directional_spread_deg",
        "degree",
        "directional spread from the first moments of the whole spectrum",
        number(&|s| s.spread_deg),
    );
    table.push(
        "wind_sea_height_m",
        "m",
        "significant height of the waves that the wind drives (1.2 U cos > phase speed)",
        of_wind_sea(|w| w.hs_m),
    );
    table.push("wind_sea_peak_hz", "Hz", "peak frequency of the wind sea", of_wind_sea(|w| w.peak_hz));
    table.push(
        "wind_sea_from_direction_deg",
        "degree",
        "mean direction that the wind sea comes from",
        of_wind_sea(|w| w.mean_from_deg),
    );
    table.push("wave_age", "1", "phase speed at the wind-sea peak over the wind speed", of_wind_sea(|w| w.wave_age));
    table.push("swell_height_m", "m", "significant height of what is not wind sea", number(&|s| s.swell_hs_m));
    table.push(
        "tail_start_hz",
        "Hz",
        "wave frequency from which on the spectrum is a laid-on tail; none where it is not found",
        number(&|s| s.tail_start_hz),
    );
    let names: Vec<String> = sea.flags.iter().map(|flags| flags.names()).collect();
    table.push(
        "sea_flags",
        "",
        "remarks on the sea, names joined by a space",
        ColumnData::from_texts(names.iter().map(String::as_str)),
    );
    table.push(
        "sea_reason",
        "",
        "why there is no sea for the window",
        ColumnData::from_texts(sea.missing.iter().map(|why| why.map_or("", Missing::name))),
    );
}

/// The sea at half of each band's frequency, after the other columns.
pub(super) fn push_matchups(table: &mut Table, record: &SensorRecord, rows: &SeaRows<'_>) {
    let number = |pick: fn(&BandSea) -> f64| ColumnData::Number(rows.bands.iter().map(pick).collect());
    table.push("sea_source", "", "id of the spectra input", repeated(&rows.conditions.source.0, rows.bands.len()));
    table.push(
        "f_over_fp",
        "1",
        "wave frequency f, half the band's centre, over the peak frequency of the wind sea; none without wind sea",
        number(|b| b.f_over_fp),
    );
    table.push("elevation_density_m2_hz", "m2 Hz-1", "elevation density E(f) at f", number(|b| b.density_m2_hz));
    table.push(
        "overlap_2pi_per_rad",
        "rad-1",
        "overlap of opposing waves at f: integral over the whole circle of D(t) D(t + pi); isotropic 1/(2 pi)",
        number(|b| b.overlap_2pi_per_rad),
    );
    table.push(
        "cross_share",
        "1",
        "share of the overlap that exists in no stored spectrum and comes from blending nodes and steps",
        number(|b| b.cross_share),
    );
    let (name, meaning) = match record.kind {
        LevelKind::BandLevel => {
            ("radiated_band_level_db", "band level that the opposing waves radiate, over the band's own edges")
        }
        LevelKind::SpectralDensityLevel => (
            "radiated_spectral_density_level_db",
            "mean spectral density level that the opposing waves radiate, over the band's own edges",
        ),
    };
    let bands = record.bands.len().max(1);
    let levels = rows.bands.iter().enumerate().map(|(k, sea)| sea.radiated_db(record, k % bands)).collect();
    table.push(name, record.kind.unit(), meaning, ColumnData::Number(levels));
    table.push(
        "tail_sensitivity_db",
        "dB",
        "by how much the radiated level would rise if the tail fell with f^-4 and not f^-5; 0 outside the tail",
        number(|b| b.radiated.map_or(f64::NAN, |level| level.tail_sensitivity_db)),
    );
    let mut texts: Vec<String> = Vec::new();
    let flags: Vec<u32> = rows
        .bands
        .iter()
        .map(|sea| {
            let names: Vec<&str> = match &sea.radiated {
                Ok(level) => level.flags().map(crate::model::RadiationFlag::name).collect(),
                Err(why) => vec![why.name()],
            };
            if names.is_empty() {
                return u32::MAX;
            }
            let text = names.join(" ");
            let known = texts.iter().position(|known| *known == text);
            known.unwrap_or_else(|| {
                texts.push(text);
                texts.len() - 1
            }) as u32
        })
        .collect();
    table.push(
        "radiated_remarks",
        "",
        "remarks on the radiated level (`tail`: it tests the tail's assumption), or why there is none",
        ColumnData::Text { texts, codes: flags },
    );
}
