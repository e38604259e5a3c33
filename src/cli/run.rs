//! `match`, `report`, `run`, `simulate`.

use super::Ending;
use super::args::{RunArgs, SimulateArgs, StudyArgs};
use super::terminal::{Terminal, print};
use crate::config::{Study, read_study};
use crate::pipeline::{self, Outcome, Stage};
use crate::report::{relation_text, sensitivity_text, spreading_text};

/// The study that a command names, with its output folder from the command line where given.
fn study(args: &StudyArgs) -> Result<Study, Ending> {
    let mut study = read_study(&args.study)?;
    if let Some(output) = &args.output {
        study.output.clone_from(output);
    }
    Ok(study)
}

pub(super) fn match_study(args: &StudyArgs, terminal: &Terminal) -> Result<(), Ending> {
    let study = study(args)?;
    let outcome = pipeline::run(&study, Stage::Match, terminal)?;
    remarks(&outcome, terminal);
    print(&format!("{}{}", counts(&outcome), files(&study, &outcome))).map_err(Ending::Exit)
}

pub(super) fn report(args: &StudyArgs, terminal: &Terminal) -> Result<(), Ending> {
    let study = study(args)?;
    let outcome = pipeline::run(&study, Stage::Report, terminal)?;
    remarks(&outcome, terminal);
    print(&files(&study, &outcome)).map_err(Ending::Exit)
}

pub(super) fn run(args: &RunArgs, terminal: &Terminal) -> Result<(), Ending> {
    let study = study(&args.study)?;
    let outcome = pipeline::run(&study, Stage::Everything, terminal)?;
    remarks(&outcome, terminal);
    let text = if args.json {
        pipeline::relations_json(&outcome.fitted)
    } else {
        let spreading = spreading_text(&outcome.spreading);
        let spreading = if spreading.is_empty() { spreading } else { format!("{spreading}\n") };
        format!("{}\n{spreading}{}\n{}", relation_text(&outcome.fitted), counts(&outcome), files(&study, &outcome))
    };
    print(&text).map_err(Ending::Exit)
}

/// `spread`: floors from a fit without intervals, which the comparison does not need.
pub(super) fn spread(args: &RunArgs, terminal: &Terminal) -> Result<(), Ending> {
    let mut study = study(&args.study)?;
    study.relation.options.replicates = 0;
    let outcome = pipeline::run(&study, Stage::Spread, terminal)?;
    remarks(&outcome, terminal);
    let text = if args.json {
        pipeline::spreading_json(&outcome.spreading)
    } else {
        format!("{}\n{}", spreading_text(&outcome.spreading), files(&study, &outcome))
    };
    print(&text).map_err(Ending::Exit)
}

/// `fit` with a study file.
pub(super) fn fit_study(study: &Study, stage: Stage, json: bool, terminal: &Terminal) -> Result<(), Ending> {
    let outcome = pipeline::run(study, stage, terminal)?;
    remarks(&outcome, terminal);
    let text = if json {
        pipeline::relations_json(&outcome.fitted)
    } else {
        let mut text = relation_text(&outcome.fitted);
        if !outcome.refits.is_empty() {
            text.push_str(&format!("\n{}", sensitivity_text(&outcome.refits)));
        }
        format!("{text}\n{}", files(study, &outcome))
    };
    print(&text).map_err(Ending::Exit)
}

pub(super) fn simulate(args: &SimulateArgs, terminal: &Terminal) -> Result<(), Ending> {
    let study = read_study(&args.study)?;
    let written = pipeline::simulate_study(&study, &args.output, args.seed, terminal)?;
    let mut text = String::from("simulated deployment with known truth; none of it was measured\n");
    for path in written {
        text.push_str(&format!("  {}\n", path.display()));
    }
    print(&text).map_err(Ending::Exit)
}

fn remarks(outcome: &Outcome, terminal: &Terminal) {
    for remark in &outcome.remarks {
        terminal.warn(remark);
    }
}

fn counts(outcome: &Outcome) -> String {
    let counts = &outcome.counts;
    let mut text = format!("pairs of wind and level used: {}\n", counts.used);
    for (why, n) in &counts.not_used {
        text.push_str(&format!("  not used, {why}: {n}\n"));
    }
    for (why, n) in &counts.excluded {
        text.push_str(&format!("  left out by rule, {why}: {n}\n"));
    }
    for (why, n) in &counts.rows_not_used {
        text.push_str(&format!("level rows not used, {why}: {n}\n"));
    }
    text
}

fn files(study: &Study, outcome: &Outcome) -> String {
    let figures = outcome.written.iter().filter(|path| path.parent().is_some_and(|p| p.ends_with("figures"))).count();
    let mut text = format!("written to {}:", study.output.display());
    for path in &outcome.written {
        if !path.parent().is_some_and(|parent| parent.ends_with("figures")) {
            text.push_str(&format!(" {}", path.file_name().unwrap_or_default().to_string_lossy()));
        }
    }
    if figures > 0 {
        text.push_str(&format!(" and {figures} figure files in figures/"));
    }
    text.push('\n');
    text
}
