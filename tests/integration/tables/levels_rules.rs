//! Missing codes, flags, windows, bands and what is asked for: hazards L3, L4, L5, L8.

use super::support::{fixtures, message, rows_of, scratch, stated};
use underwind::io::levels::{BandEdges, LevelOptions, open_levels};
use underwind::model::Missing::{self, MissingCode, NoLevel, NotFinite, QualityFlag};
use underwind::model::{BandScheme, LevelKind};

#[test]
fn holes_keep_their_reason_and_null_is_not_nan() {
    // Written by make_tables.py: 80, null, NaN, +inf, -999, 81.5 with a bad flag.
    let mut options = stated();
    options.site = Some("A".to_owned());
    options.missing_codes = vec!["-999".to_owned()];
    options.columns.qc = Some("QC".to_owned());
    options.qc_keep = vec!["1".to_owned(), "2".to_owned()];
    let (rows, mut table) = rows_of(&fixtures().join("holes.parquet"), &options).unwrap();
    let reasons: Vec<Option<Missing>> = rows.iter().map(|row| row.reason).collect();
    assert_eq!(reasons, [None, Some(NoLevel), Some(NotFinite), Some(NotFinite), Some(MissingCode), Some(QualityFlag)]);
    assert!(rows[1].level_db.is_nan() && rows[4].level_db.is_nan());
    assert!((rows[5].level_db - 81.5).abs() < 1e-12, "the flagged level stays readable");
    let survey = table.survey().unwrap();
    assert_eq!((survey.samples, survey.usable, survey.reasons[&NotFinite]), (6, 1, 2));
}

#[test]
fn text_holes_keep_their_reason() {
    let text = "time,band_hz,level_db,flag\n2031-03-01T00:00:00Z,63,,1\n2031-03-01T00:10:00Z,63,NaN,1\n2031-03-01T00:20:00Z,63,-inf,1\n\
                2031-03-01T00:30:00Z,63,-999.0,1\n2031-03-01T00:40:00Z,63,clip,1\n2031-03-01T00:50:00Z,63,broken,9\n2031-03-01T01:00:00Z,63,80,good\n";
    let file = scratch("levels.csv", text);
    let mut options = stated();
    options.site = Some("A".to_owned());
    options.missing_codes = vec!["-999".to_owned(), "clip".to_owned()];
    options.columns.qc = Some("flag".to_owned());
    options.qc_keep = vec!["1.0".to_owned(), "good".to_owned()];
    let (rows, _) = rows_of(&file.path, &options).unwrap();
    let reasons: Vec<Option<Missing>> = rows.iter().map(|row| row.reason).collect();
    assert_eq!(
        reasons,
        [
            Some(NoLevel),
            Some(NotFinite),
            Some(NotFinite),
            Some(MissingCode),
            Some(MissingCode),
            Some(QualityFlag),
            None
        ]
    );
}

#[test]
fn an_undeclared_code_is_refused_and_never_a_level() {
    let text = "time,band_hz,level_db\n2031-03-01T00:00:00Z,63,80\n2031-03-01T00:10:00Z,63,-999\n";
    let mut options = stated();
    options.site = Some("A".to_owned());
    assert_eq!(
        message(text, &options),
        "levels.csv: line 3, column `level_db`: `-999` would be -999 dB re 1 uPa; expected -100 to 300 dB (if it stands for a missing value, add it to `levels.missing_codes`; else check `levels.reference` and `levels.scale`)"
    );
    let text = text.replace("-999", "bad");
    assert_eq!(
        message(text, &options),
        "levels.csv: line 3, column `level_db`: `bad` is no level; expected a number, or a code in the setting (set `levels.missing_codes`)"
    );
}

#[test]
fn everything_that_is_not_stated_is_asked_for_at_once() {
    let text = "time,63 Hz,125 Hz\n2031-03-01T00:00:00Z,80,81\n";
    assert_eq!(
        message(text, &LevelOptions::default()),
        "levels.csv: not stated: the length of a row's window (set `levels.window_s` to seconds (0 for an instant)); \
         which instant of its window a time is (set `levels.stamp` to \"start\", \"centre\" or \"end\"); \
         the site of the rows (set `levels.site` to a column name, or `levels.site_id` to a site's id); \
         the width of the bands: the centres are an octave apart (set `levels.bands` to \"decidecade\" or \"octave\" (or give `levels.band_edges`)); \
         the reference of the levels (set `levels.reference` to \"1 uPa\", \"1 Pa\" or \"20 uPa\"); \
         whether levels are of bands or densities (set `levels.kind` to \"band_level\" or \"spectral_density_level\")"
    );
    // An instant needs no stamp.
    let options = LevelOptions { window_s: Some(0.0), ..LevelOptions::default() };
    let asked = message(text, &options);
    assert!(!asked.contains("levels.stamp") && !asked.contains("levels.window_s"), "{asked}");
}

#[test]
fn a_contradicted_header_gives_way_with_a_warning() {
    let file = scratch("levels.csv", "time,site,band_hz,level (dB re 1 uPa2/Hz)\n2031-03-01T00:00:00Z,A,63,80\n");
    let (rows, table) = rows_of(&file.path, &stated()).unwrap();
    assert_eq!(table.kind(), LevelKind::BandLevel);
    assert!((rows[0].level_db - 80.0).abs() < 1e-12);
    assert_eq!(
        table.describe().files[0].warnings,
        ["the file states dB re 1 uPa2/Hz, `levels.kind` states dB re 1 uPa2; the setting is used"]
    );
}

#[test]
fn a_density_in_the_header_needs_no_setting() {
    let file = scratch("levels.csv", "time,site,band_hz,psd_db_re_1upa2_per_hz\n2031-03-01T00:00:00Z,A,63,80\n");
    let options = LevelOptions { reference: None, kind: None, ..stated() };
    let (rows, table) = rows_of(&file.path, &options).unwrap();
    assert_eq!(table.kind(), LevelKind::SpectralDensityLevel);
    // 80 dB re 1 uPa2/Hz over the 63 Hz decidecade: + 10 log10(14.557...), IEC 61260-1 edges 63.0957 x 10^(+-1/20).
    let band = table.names().bands[0];
    let band_level_db = rows[0].level_db + LevelKind::SpectralDensityLevel.to_other_db(LevelKind::BandLevel, band);
    let width_hz = 63.095_734_448 * (1.122_018_454_3 - 0.891_250_938_1);
    assert!((band_level_db - (80.0 + 10.0 * f64::log10(width_hz))).abs() < 1e-6, "{band_level_db}");
}

#[test]
fn kinds_that_differ_between_files_are_refused() {
    let one = scratch("one.csv", "time,site,band_hz,level (dB re 1 uPa2)\n2031-03-01T00:00:00Z,A,63,80\n");
    let two = scratch("two.csv", "time,site,band_hz,level (dB re 1 uPa2/Hz)\n2031-03-01T00:00:00Z,A,63,80\n");
    let options = LevelOptions { reference: None, kind: None, ..stated() };
    let error = open_levels(&[one.path.clone(), two.path.clone()], &options).unwrap_err().to_string();
    let expected = format!(
        "{}: the kind of the levels is dB re 1 uPa2/Hz, but {} says dB re 1 uPa2; expected the same in all files of one level table",
        two.path.display(),
        one.path.display()
    );
    assert_eq!(error, expected);
}

#[test]
fn bands_off_the_scheme_and_twice_are_refused() {
    let options = LevelOptions { site: Some("A".to_owned()), ..stated() };
    assert_eq!(
        message("time,63 Hz,112 Hz\n2031-03-01T00:00:00Z,80,81\n", &options),
        "levels.csv: column `112 Hz`: 112 Hz is no decidecade centre; the nearest is 100.0000 Hz (give edges if the band is not of that kind)"
    );
    assert_eq!(
        message("time,63 Hz,63.1\n2031-03-01T00:00:00Z,80,81\n", &options),
        "levels.csv: the band 63.1 Hz occurs twice, in columns 2 and 3 (line 1); expected it once"
    );
    assert_eq!(
        message("time,63 Hz,63 Hz\n2031-03-01T00:00:00Z,80,81\n", &options),
        "levels.csv: column `63 Hz` occurs twice, in columns 2 and 3 (line 1); expected it once"
    );
    assert_eq!(
        message("time,band_hz,level_db\n2031-03-01T00:00:00Z,63,80\n2031-03-01T00:00:00Z,112,81\n", &options),
        "levels.csv: line 3, column `band_hz`: 112 Hz is no decidecade centre; the nearest is 100.0000 Hz (give edges if the band is not of that kind)"
    );
    assert_eq!(
        message("time,band_hz,level_db\n2031-03-01T00:00:00Z,63,80\n2031-03-01T00:00:00Z,deep,81\n", &options),
        "levels.csv: line 3, column `band_hz`: `deep` is no band; expected a frequency such as 63, 63 Hz or 1 kHz"
    );
}

#[test]
fn explicit_edges_serve_wide_long_and_single_band_tables() {
    let edges = |name: &str| BandEdges { name: name.to_owned(), low_hz: 20.0, high_hz: 24_000.0 };
    let options = LevelOptions { site: Some("A".to_owned()), bands: None, ..stated() };
    for (text, name) in [
        ("time,broad\n2031-03-01T00:00:00Z,110\n", "broad"),
        ("time,band,level\n2031-03-01T00:00:00Z,broad,110\n", "Broad"),
        ("time,level_db\n2031-03-01T00:00:00Z,110\n", ""),
        ("time,BB_0.02-24k\n2031-03-01T00:00:00Z,110\n", ""),
    ] {
        let mut options = options.clone();
        if !text.contains("BB") {
            options.band_edges = vec![edges(name)];
        }
        let file = scratch("levels.csv", text);
        let (rows, table) = rows_of(&file.path, &options).unwrap_or_else(|e| panic!("{text}: {e}"));
        assert_eq!(rows.len(), 1);
        let band = table.names().bands[0];
        assert!((band.low_hz - 20.0).abs() < 1e-9 && (band.high_hz - 24_000.0).abs() < 1e-6, "{band:?}");
    }
}

#[test]
fn octaves_have_octave_edges() {
    let options = LevelOptions { site: Some("A".to_owned()), bands: Some(BandScheme::Octave), ..stated() };
    let file = scratch("levels.csv", "time,OL_31.5,OL_63,OL_1k,OL_16k\n2031-03-01T00:00:00Z,80,81,82,83\n");
    let (_, table) = rows_of(&file.path, &options).unwrap();
    // IEC 61260-1: octave ratio 10^(3/10), exact centre 31.6228 Hz for the nominal 31.5 Hz.
    let centres: Vec<f64> = table.names().bands.iter().map(|band| band.centre_hz).collect();
    for (found, expected) in centres.iter().zip([31.622_776_6, 63.095_734_4, 1000.0, 15_848.931_9]) {
        assert!((found / expected - 1.0).abs() < 1e-8, "{found}");
    }
    let band = table.names().bands[0];
    assert!((band.high_hz / band.low_hz - 1.995_262_315).abs() < 1e-8);
}

#[test]
fn windows_follow_their_stamp_and_overlaps_are_counted() {
    let text = "time,site,band_hz,level_db\n2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:05:00Z,A,63,81\n2031-03-01T00:15:00Z,A,63,82\n";
    let file = scratch("levels.csv", text);
    let (_, mut table) = rows_of(&file.path, &stated()).unwrap();
    assert_eq!(table.survey().unwrap().overlapping, 1);
    assert_eq!(
        message(
            "window_start,window_end,site,band_hz,level_db\n2031-03-01T00:10:00Z,2031-03-01T00:00:00Z,A,63,80\n",
            &stated()
        ),
        "levels.csv: line 2: the window ends (2031-03-01T00:00:00Z) before it starts (2031-03-01T00:10:00Z); expected a start before the end"
    );
    let mut options = stated();
    options.window_s = Some(-5.0);
    assert_eq!(message(text, &options), "`levels.window_s` is -5; expected seconds from 0 to a year");
}

#[test]
fn a_quality_column_needs_its_rule_and_an_unused_one_is_told() {
    let text = "time,site,band_hz,level_db,qc_flag\n2031-03-01T00:00:00Z,A,63,80,1\n";
    let mut options = stated();
    let file = scratch("levels.csv", text);
    let (_, table) = rows_of(&file.path, &options).unwrap();
    assert_eq!(
        table.describe().files[0].warnings,
        ["column `qc_flag` looks like a quality flag and is not used; set `levels.qc` and `levels.qc_keep` to use it"]
    );
    options.columns.qc = Some("qc_flag".to_owned());
    assert_eq!(
        message(text, &options),
        "levels.csv: not stated: which quality values keep a row (set `levels.qc_keep` to a list such as [\"1\", \"good\"])"
    );
}

#[test]
fn zero_of_a_linear_value_is_silence_and_no_level() {
    let file = scratch(
        "levels.csv",
        "time,site,band_hz,level (uPa2)\n2031-03-01T00:00:00Z,A,63,0\n2031-03-01T00:10:00Z,A,63,100\n",
    );
    let options = LevelOptions { reference: None, kind: None, ..stated() };
    let (rows, _) = rows_of(&file.path, &options).unwrap();
    assert_eq!(rows[0].reason, Some(Missing::NotFinite));
    assert!((rows[1].level_db - 20.0).abs() < 1e-12);
}

#[test]
fn levels_re_20_micropascals_are_referred_to_one() {
    let file = scratch("levels.csv", "time,site,band_hz,level (dB re 20 uPa)\n2031-03-01T00:00:00Z,A,63,80\n");
    let options = LevelOptions { reference: None, kind: None, ..stated() };
    let (rows, _) = rows_of(&file.path, &options).unwrap();
    // 20 log10(20) = 26.0206 dB, closed form.
    assert!((rows[0].level_db - 106.020_599_913).abs() < 1e-9);
}

#[test]
fn one_look_up_finds_the_rows_around_an_instant() {
    let text = "time,site,band_hz,level_db\n2031-03-01T00:00:00Z,A,63,80\n2031-03-01T00:00:00Z,A,125,70\n2031-03-01T00:10:00Z,A,63,81\n\
                2031-03-01T00:10:00Z,B,63,82\n";
    let file = scratch("levels.csv", text);
    let mut table = open_levels(std::slice::from_ref(&file.path), &stated()).unwrap();
    let at = |text: &str| underwind::units::Instant::parse(text).unwrap();
    let lines = |rows: Vec<underwind::model::LevelRow>| rows.iter().map(|row| row.row).collect::<Vec<u64>>();
    let hz = |hz: f64| Some(underwind::units::Hertz::new(hz).unwrap());
    assert_eq!(lines(table.rows_at(at("2031-03-01T00:09:59Z"), None, None).unwrap()), [2, 3]);
    // Windows are half open: the next one begins at 00:10.
    assert_eq!(lines(table.rows_at(at("2031-03-01T00:10:00Z"), hz(60.0), None).unwrap()), [4, 5]);
    assert_eq!(lines(table.rows_at(at("2031-03-01T00:10:00Z"), hz(60.0), Some("B")).unwrap()), [5]);
    assert_eq!(lines(table.rows_at(at("2031-03-01T00:10:00Z"), hz(90.0), None).unwrap()), Vec::<u64>::new());
}
