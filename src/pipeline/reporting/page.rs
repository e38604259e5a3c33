//! The page, filled from the results.

use super::figures::{percentiles, wind_classes};
use super::methods::Methods;
use super::words::{estimate, reference};
use super::{Pairing, Placed, ReportInput, SpreadFigures};
use crate::model::{FittedBand, Missing, RelationWarning, Verdict, WindErrorEstimate};
use crate::pipeline::provenance::PROGRAM;
use crate::pipeline::spreading::spreading_section;
use crate::report::{Block, Column, Document, Section, Table, findings, number, p_text};

/// Said on every page: what the numbers are not.
const CAUTION: &str = "These results describe levels at the sensors and their relation to modelled wind. They are no assessment of impact on animals or people and no aid to navigation: for such decisions the applicable rules and standards, and qualified people, come first.";

/// The page of a study.
pub(super) fn document(
    input: &ReportInput<'_>,
    pairings: &[Pairing<'_>],
    methods: &Methods,
    whole: Vec<Placed>,
    per_pairing: Vec<Vec<Placed>>,
    spread: SpreadFigures,
) -> Document {
    let mut sections = vec![inputs_section(input, whole)];
    for (pairing, figures) in pairings.iter().zip(per_pairing) {
        sections.push(pairing_section(input, pairing, figures));
    }
    if !input.spreading.is_empty() {
        sections.push(spreading_section(input.spreading, spread));
    }
    sections.push(methods_section(methods));
    sections.push(provenance_section(input));
    Document {
        title: input.study.name.clone(),
        subtitle: subtitle(input),
        summary: summary(input),
        warnings: vec![CAUTION.to_owned()],
        sections,
        footer: format!("Written by {PROGRAM}."),
    }
}

fn subtitle(input: &ReportInput<'_>) -> String {
    let sites: Vec<&str> = input.sites.iter().map(|site| site.id.as_str()).collect();
    let span = input.matched.span().map_or_else(String::new, |span| {
        format!("; {} to {}", crate::report::iso_date(span.start.0), crate::report::iso_date(span.end.0))
    });
    format!("Level against wind speed; sites {}{span}", sites.join(", "))
}

fn summary(input: &ReportInput<'_>) -> Vec<String> {
    let counts = &input.matched.counts;
    let unused: u64 = counts.not_used.values().sum();
    let count =
        |verdicts: &[Verdict]| input.fitted.bands.iter().filter(|f| verdicts.contains(&f.relation.verdict)).count();
    let total = input.fitted.bands.len();
    let mut sentences = vec![format!(
        "{} pairs of wind and level are used, {} are not.",
        number::count(counts.used as usize),
        number::count(unused as usize)
    )];
    let named = count(&[Verdict::Saturation, Verdict::FallsAfterOnset]);
    let decreasing = count(&[Verdict::SlopeDecreases, Verdict::SlopeBreak]);
    let open = count(&[Verdict::NoOnset, Verdict::AboveOnly, Verdict::BelowOnly]);
    let flat = count(&[Verdict::NoSlope, Verdict::NotFitted]);
    let point = count(&[Verdict::PointOnly]);
    if point > 0 {
        sentences.push(format!(
            "{point} of {total} relations are estimates without intervals (replicates = 0): no onset is claimed."
        ));
    }
    if point < total {
        sentences.push(format!(
            "Of {total} relations, {named} have an onset with an interval, {decreasing} a slope that decreases without an onset that can be named, {open} only a bound for the onset, and {flat} no resolvable rise with wind."
        ));
    }
    sentences
}

fn inputs_section(input: &ReportInput<'_>, whole: Vec<Placed>) -> Section {
    let mut blocks: Vec<Block> = whole.into_iter().map(block).collect();
    let table = Table {
        caption: "Pairs of wind and level, by use".into(),
        columns: vec![Column::row_name("reason"), Column::number("pairs", ""), Column::text("meaning")],
        rows: std::iter::once(vec!["used".to_owned(), input.matched.counts.used.to_string(), String::new()])
            .chain(input.matched.counts.not_used.iter().map(|(why, n)| {
                let meaning = Missing::ALL.iter().find(|missing| missing.name() == *why).map_or("", |m| m.sentence());
                vec![(*why).to_owned(), n.to_string(), meaning.to_owned()]
            }))
            .collect(),
        note: String::new(),
    };
    blocks.push(Block::Table(table));
    if !input.matched.counts.excluded.is_empty() {
        blocks.push(Block::Table(Table {
            caption: "Pairs left out by the study's rules".into(),
            columns: vec![Column::row_name("reason"), Column::number("pairs", "")],
            rows: input.matched.counts.excluded.iter().map(|(why, n)| vec![why.clone(), n.to_string()]).collect(),
            note: "The first rule that applies counts. The column excluded_by of the matchups names it for each pair."
                .into(),
        }));
    }
    if !input.matched.counts.rows_not_used.is_empty() {
        let points = input.matched.counts.rows_not_used.iter().map(|(why, n)| format!("{why}: {n}")).collect();
        blocks.push(Block::Text("Rows of the level tables that reach no pair:".into()));
        blocks.push(Block::Points(points));
    }
    if !input.matched.remarks.is_empty() {
        blocks.push(Block::Text("Remarks of the run:".into()));
        blocks.push(Block::Points(input.matched.remarks.clone()));
    }
    Section::new("Sites, coverage and what was used", blocks)
}

pub(in crate::pipeline) fn block(placed: Placed) -> Block {
    Block::Figure { figure: placed.figure, caption: placed.caption, file: Some(format!("figures/{}.svg", placed.name)) }
}

fn pairing_section(input: &ReportInput<'_>, pairing: &Pairing<'_>, figures: Vec<Placed>) -> Section {
    let record = pairing.record;
    let title = format!("Site {}, sensor {}, wind {}", record.site, record.sensor, pairing.conditions.source);
    let mut section = Section::new(&title, vec![Block::Table(relation_table(pairing))]);
    let warnings = warnings(pairing.fitted);
    if !warnings.is_empty() {
        section.blocks.push(Block::Text("Remarks on the relations:".into()));
        section.blocks.push(Block::Points(warnings));
    }
    let findings = findings(pairing.fitted, pairing.sensor);
    if !findings.is_empty() {
        section.blocks.push(Block::Text("Over the bands together:".into()));
        section.blocks.push(Block::Points(findings));
    }
    if pairing.fitted.iter().any(|fitted| fitted.relation.diagnostics.replicates > 0) {
        section.blocks.push(Block::Table(checks_table(pairing)));
    }
    if pairing.fitted.iter().any(|fitted| !fitted.checks.wind_error.is_empty()) {
        section.blocks.push(Block::Table(wind_error_table(pairing)));
    }
    let mut details = Section::new("Band by band", Vec::new());
    // The first figures show the sensor as a whole; the others one band each.
    let mut figures = figures.into_iter();
    let whole = figures.len() - 2 * record.bands.len();
    for placed in figures.by_ref().take(whole) {
        let classes = placed.name.ends_with("_classes");
        section.blocks.push(block(placed));
        if classes {
            section.blocks.push(Block::Table(class_table(input, pairing)));
        }
    }
    details.blocks.extend(figures.map(block));
    section.sections.push(details);
    section
}

fn relation_table(pairing: &Pairing<'_>) -> Table {
    let rows = pairing
        .fitted
        .iter()
        .map(|fitted| {
            let relation = &fitted.relation;
            vec![
                unbroken(&fitted.band_label()),
                estimate(relation.floor_db).text("", 1),
                estimate(relation.level_at_10_m_s_db).text("", 1),
                estimate(relation.slope_db_per_decade).text("", 1),
                estimate(relation.mean_square_pressure_exponent).text("", 2),
                relation.verdict_text(),
                relation.diagnostics.residual_scale_db.map_or_else(|| "–".to_owned(), |scale| number::fixed(scale, 1)),
                number::count(relation.diagnostics.samples),
            ]
        })
        .collect();
    let level = reference(pairing.record.kind);
    Table {
        caption: "Relation of level to wind speed, with 95 % intervals".into(),
        columns: vec![
            Column::row_name("band"),
            Column::number("floor", level),
            Column::number("level at 10 m/s", level),
            Column::number("slope", "dB per decade"),
            Column::number("exponent", "of mean-square pressure"),
            Column::text("onset of saturation"),
            Column::number("residual", "dB"),
            Column::number("pairs", ""),
        ],
        rows,
        note: "Floor: level reached in calm, without passing ships where the scatter model resolves them. Slope: rise of the wind part per factor ten in wind speed below the onset. Intervals are statistical; they do not include the calibration of the sensor.".into(),
    }
}

/// Tests and checks beside the relations.
fn checks_table(pairing: &Pairing<'_>) -> Table {
    let p = |p: Option<f64>| p.map_or_else(|| "–".to_owned(), |p| p_text(p).trim_start_matches("= ").to_owned());
    let fixed = |value: Option<f64>, decimals| value.map_or_else(|| "–".to_owned(), |v| number::fixed(v, decimals));
    let rows = pairing
        .fitted
        .iter()
        .map(|fitted| {
            let (diagnostics, checks) = (&fitted.relation.diagnostics, &fitted.checks);
            vec![
                unbroken(&fitted.band_label()),
                diagnostics.effective_samples.map_or_else(|| "–".to_owned(), |n| number::count(n.round() as usize)),
                fixed(diagnostics.block_length_h, 0),
                p(diagnostics.p_slope),
                p(diagnostics.p_floor),
                p(diagnostics.p_onset),
                p(checks.p_onset_false_discovery),
                checks.drift_db_per_year.map_or_else(|| "–".to_owned(), |drift| estimate(drift).text("", 1)),
                fixed(checks.lag.map(|lag| lag.lag_h), 1),
                fixed(diagnostics.residual_scale_ratio, 2),
            ]
        })
        .collect();
    Table {
        caption: "Tests and checks".into(),
        columns: vec![
            Column::row_name("band"),
            Column::number("effective pairs", ""),
            Column::number("block", "h"),
            Column::number("p, no rise", ""),
            Column::number("p, no floor", ""),
            Column::number("p, no onset", ""),
            Column::number("over bands", "false discovery"),
            Column::number("drift", "dB per year"),
            Column::number("lag", "h"),
            Column::number("scale ratio", "strong to weak wind"),
        ],
        rows,
        note: "Over bands: p of no onset, corrected for the number of bands (Benjamini and Yekutieli). Drift: trend of the residuals. Lag: by which the level follows the wind; 0 unless another lag predicts held-out blocks of time better by two standard errors. Scale ratio: residual scale in the upper third of the winds over that in the lower third.".into(),
    }
}

/// Plain estimates beside those for an error of the wind.
fn wind_error_table(pairing: &Pairing<'_>) -> Table {
    let sizes = pairing.fitted.iter().find(|fitted| !fitted.checks.wind_error.is_empty());
    let sizes = sizes.map_or(&[] as &[WindErrorEstimate], |fitted| &fitted.checks.wind_error);
    let mut columns = vec![Column::row_name("band")];
    for (name, unit) in [("floor", "dB"), ("slope", "dB per decade"), ("knee", "m/s")] {
        columns.extend(sizes.iter().map(|size| {
            let error = number::fixed(size.wind_error_sd_m_s, 2);
            Column::number(
                &if size.wind_error_sd_m_s > 0.0 { format!("{name}, {error} m/s") } else { name.to_owned() },
                unit,
            )
        }));
    }
    let rows = pairing.fitted.iter().map(|fitted| {
        let each = &fitted.checks.wind_error;
        let mut row = vec![unbroken(&fitted.band_label())];
        row.extend(each.iter().map(|e| number::fixed(e.floor_db.first().copied().unwrap_or(f64::NAN), 1)));
        row.extend(each.iter().map(|e| number::fixed(e.slope_db_per_decade, 1)));
        row.extend(each.iter().map(|e| number::fixed(e.onset_m_s, 1)));
        row
    });
    Table {
        caption: "Estimates as if the wind speed had a random error".into(),
        columns,
        rows: rows.collect(),
        note: "Fit with floor and knee, whatever the verdict: plain, and for an error of 0.75, 1 and 1.25 times the stated standard deviation. The size of the error cannot be found from these pairs.".into(),
    }
}

/// A number and its unit that stay on one line.
fn unbroken(text: &str) -> String {
    text.replace(' ', "\u{a0}")
}

fn warnings(fitted: &[FittedBand]) -> Vec<String> {
    RelationWarning::ALL
        .iter()
        .filter_map(|warning| {
            let bands: Vec<String> =
                fitted.iter().filter(|f| f.relation.warnings.contains(warning)).map(FittedBand::band_label).collect();
            (!bands.is_empty()).then(|| format!("{}: {}.", bands.join(", "), warning.sentence()))
        })
        .collect()
}

fn class_table(input: &ReportInput<'_>, pairing: &Pairing<'_>) -> Table {
    let classes = wind_classes(input, &pairing.wind_m_s);
    let mut columns = vec![Column::row_name("band")];
    for (name, edges, windows) in &classes {
        columns.push(Column::number(&format!("{name}: 10 %"), edges));
        columns.push(Column::number("50 %", edges));
        columns.push(Column::number("90 %", &format!("{} windows", windows.len())));
        columns.push(Column::number("N", "levels"));
    }
    let rows = pairing
        .record
        .bands
        .iter()
        .zip(&pairing.levels_db)
        .map(|(band, levels)| {
            let mut row = vec![unbroken(&band.band.label())];
            for (_, _, windows) in &classes {
                row.extend(percentiles(levels, windows).map(|level| number::fixed(level, 1)));
                row.push(number::count(windows.iter().filter(|k| levels[**k].is_finite()).count()));
            }
            row
        })
        .collect();
    Table {
        caption: format!("Levels by class of wind ({}): quantiles", reference(pairing.record.kind)),
        columns,
        rows,
        note: String::new(),
    }
}

fn methods_section(methods: &Methods) -> Section {
    let mut blocks: Vec<Block> = methods
        .sections
        .iter()
        .map(|(title, text)| Block::Method { title: (*title).to_owned(), text: text.clone() })
        .collect();
    blocks.push(Block::Text(
        "References. Check them against the originals before printing; methods.md holds this text for editing.".into(),
    ));
    blocks.push(Block::Points(methods.references.iter().map(|reference| (*reference).to_owned()).collect()));
    Section::new("How each number was made", blocks)
}

fn provenance_section(input: &ReportInput<'_>) -> Section {
    let rows = input
        .inputs
        .iter()
        .map(|record| vec![record.file.clone(), record.bytes.to_string(), record.sha256.clone()])
        .collect();
    let table = Table {
        caption: "Input files".into(),
        columns: vec![Column::row_name("file"), Column::number("size", "bytes"), Column::text("SHA-256")],
        rows,
        note: "The resolved study and all counts are in provenance.json.".into(),
    };
    Section::new("Where the numbers come from", vec![Block::Table(table)])
}
