//! `fit`.

use super::Ending;
use super::args::FitArgs;
use super::run::fit_study;
use super::terminal::{Terminal, print};
use crate::Error;
use crate::config::{FloorBy, OffsetBy, SegmentBy, TableFormat, check_replicates, read_study, segment_choice};
use crate::io::delimited::TextOptions;
use crate::io::table::{PairColumns, PairOptions, read_pairs};
use crate::io::time_text::TimeUnit;
use crate::pipeline::{self, Stage};
use crate::report::relation_text;
use crate::science::level_wind::{KeepReplicates, Loss, Options, Segments};

pub(super) fn fit(args: &FitArgs, terminal: &Terminal) -> Result<(), Ending> {
    if let Some(path) = &args.study {
        let mut study = read_study(path)?;
        set(args, &mut study.relation.options)?;
        if let Some((segments, by)) = segments(args)? {
            (study.relation.options.segments, study.relation.segment_by) = (segments, by);
        }
        study.relation.screen |= args.screen;
        if let Some(output) = &args.output {
            study.output.clone_from(output);
        }
        let stage = if args.sensitivity { Stage::Sensitivity } else { Stage::Fit };
        return fit_study(&study, stage, args.json, terminal);
    }
    let Some(table) = &args.matchups else { return Ok(()) };
    let mut options = Options::default();
    set(args, &mut options)?;
    let (chosen, segment_by) = segments(args)?.unwrap_or_default();
    options.segments = chosen;
    let columns = PairColumns {
        time: args.time_column.clone(),
        wind_speed: args.wind_column.clone(),
        level: args.level_column.clone(),
        site: args.site_column.clone(),
        band: args.band_column.clone(),
        deployment: args.deployment_column.clone(),
    };
    let time_unit = match &args.time_unit {
        None => None,
        Some(name) => Some(TimeUnit::from_name(name).ok_or_else(|| {
            let expected = "s, ms, us, ns, spreadsheet_days or day_number";
            Error::CommandLine(format!("--time-unit {name} is not known; expected {expected}"))
        })?),
    };
    let text = TextOptions {
        delimiter: args.delimiter.clone(),
        decimal_mark: args.decimal_mark.clone(),
        encoding: args.encoding.clone(),
        comment: None,
    };
    let pairs = read_pairs(table, &PairOptions { columns, time_unit, text })?;
    for note in &pairs.notes {
        terminal.remark(note);
    }
    let fitted = pipeline::fit_pairs(&pairs, &options, segment_by, args.screen);
    if let Some(folder) = &args.output {
        pipeline::make_folder(folder)?;
        pipeline::write_relations(&fitted, &[TableFormat::Parquet, TableFormat::Csv], folder)?;
    }
    let text = if args.json { pipeline::relations_json(&fitted) } else { relation_text(&fitted) };
    print(&text).map_err(Ending::Exit)
}

/// What segments have of their own; `None` where the command line does not say it.
fn segments(args: &FitArgs) -> Result<Option<(Segments, SegmentBy)>, Ending> {
    if args.offset_by.is_none() && args.floor_by.is_none() {
        return Ok(None);
    }
    let offset_by = args.offset_by.as_ref().map(|_| OffsetBy::Deployment);
    let floor_by = args.floor_by.as_deref().map(|by| if by == "month" { FloorBy::Month } else { FloorBy::Deployment });
    Ok(Some(segment_choice(offset_by, floor_by, false).map_err(Error::CommandLine)?))
}

/// The command line goes before the study file.
fn set(args: &FitArgs, options: &mut Options) -> Result<(), Ending> {
    if let Some(number) = args.replicates {
        options.replicates = check_replicates(number as usize).map_err(Error::CommandLine)?;
    }
    if args.keep_replicates {
        options.keep_replicates = KeepReplicates::Yes;
    }
    if let Some(seed) = args.seed {
        options.seed = seed;
    }
    if let Some(sd) = args.wind_error_sd {
        if !(0.0..=75.0).contains(&sd) {
            return Err(
                Error::CommandLine(format!("--wind-error-sd {sd} is not possible; expected 0 to 75 m/s")).into()
            );
        }
        options.wind_error_sd_m_s = Some(sd).filter(|sd| *sd > 0.0);
    }
    match args.loss.as_deref() {
        Some("tukey") => options.loss = Loss::Tukey,
        Some("huber") => options.loss = Loss::Huber,
        Some("least_squares") => options.loss = Loss::LeastSquares,
        _ => {}
    }
    Ok(())
}
