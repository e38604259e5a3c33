//! What was done, as a methods section for a paper, with the numbers of this run filled in.

use super::ReportInput;
use super::words::reference;
use crate::config::{Study, WindOrigin, WindowSpeed};
use crate::model::{FittedBand, LevelStatistic, ScatterFamily, Verdict};
use crate::pipeline::provenance::PROGRAM;
use crate::report::{iso_date, number};
use crate::science::level_wind::{Loss, ScatterModel};

/// The text: headings with paragraphs, then the works that it leans on.
pub(super) struct Methods {
    pub sections: Vec<(&'static str, Vec<String>)>,
    pub references: Vec<&'static str>,
}

const STANDARDS: [&str; 2] = [
    "IEC 61260-1:2014. Electroacoustics - Octave-band and fractional-octave-band filters - Part 1: Specifications.",
    "ISO 18405:2017. Underwater acoustics - Terminology.",
];
const TUKEY: &str = "Beaton, A. E. and Tukey, J. W. (1974). The fitting of power series, meaning polynomials, illustrated on band-spectroscopic data. Technometrics 16, 147-185.";
const HUBER: &str =
    "Huber, P. J. (1964). Robust estimation of a location parameter. Annals of Mathematical Statistics 35, 73-101.";
const BOOTSTRAP: [&str; 3] = [
    "Künsch, H. R. (1989). The jackknife and the bootstrap for general stationary observations. Annals of Statistics 17, 1217-1241.",
    "Politis, D. N. and White, H. (2004). Automatic block-length selection for the dependent bootstrap. Econometric Reviews 23, 53-70; correction with A. Patton (2009), 28, 372-375.",
    "Hansen, B. E. (1996). Inference when a nuisance parameter is not identified under the null hypothesis. Econometrica 64, 413-430.",
];
const HOLM: &str = "Holm, S. (1979). A simple sequentially rejective multiple test procedure. Scandinavian Journal of Statistics 6, 65-70.";

/// Writes the text for one run.
pub(super) fn methods(input: &ReportInput<'_>) -> Methods {
    let options = &input.study.relation.options;
    let mut sections = vec![
        ("Levels", vec![levels(input)]),
        ("Wind", wind(input.study)),
        ("Pairs of wind and level", vec![pairs(input)]),
        ("Relation", vec![law(&input.fitted.bands, input.study), estimation(options.loss)]),
    ];
    let mut references: Vec<&'static str> = STANDARDS.to_vec();
    match options.loss {
        Loss::Tukey => references.push(TUKEY),
        Loss::Huber => references.push(HUBER),
        Loss::LeastSquares => {}
    }
    if options.replicates == 0 {
        sections.push(("Uncertainty", vec!["No intervals were computed, and no onset is claimed.".to_owned()]));
    } else {
        sections.push(("Uncertainty", vec![intervals(input), onsets(&input.fitted.bands)]));
        references.extend(BOOTSTRAP);
        references.push(HOLM);
    }
    references.sort_unstable();
    Methods { sections, references }
}

impl Methods {
    /// The text as Markdown, to be edited into a paper.
    pub(super) fn markdown(&self, study: &Study) -> String {
        let mut text = format!(
            "# Methods: {}\n\nWritten by {PROGRAM} from what was done in this run, to be edited into a paper.\nCheck the references against the originals before printing.\n",
            study.name
        );
        for (heading, paragraphs) in &self.sections {
            text.push_str(&format!("\n## {heading}\n"));
            for paragraph in paragraphs {
                text.push_str(&format!("\n{paragraph}\n"));
            }
        }
        text.push_str("\n## References\n\n");
        for reference in &self.references {
            text.push_str(&format!("- {reference}\n"));
        }
        text
    }
}

fn levels(input: &ReportInput<'_>) -> String {
    let records = &input.matched.records;
    let sensors = records.len();
    let span = input
        .matched
        .span()
        .map_or_else(String::new, |span| format!(" between {} and {}", iso_date(span.start.0), iso_date(span.end.0)));
    let bands = || records.iter().flat_map(|record| &record.bands).map(|band| band.band);
    let lowest = bands().min_by(|a, b| a.centre_hz.total_cmp(&b.centre_hz));
    let highest = bands().max_by(|a, b| a.centre_hz.total_cmp(&b.centre_hz));
    let range = match (lowest, highest) {
        (Some(low), Some(high)) => format!(", in bands centred from {} to {}", low.label(), high.label()),
        _ => String::new(),
    };
    let kind = records.first().map_or("dB", |record| reference(record.kind));
    let matching = &input.study.matching;
    let statistic = match matching.statistic {
        LevelStatistic::Median => "the median of its samples",
        LevelStatistic::PowerMean => "the level of the mean power of its samples",
    };
    let window = match matching.window_s {
        Some(seconds) => {
            format!("Level samples were gathered into windows of {seconds} s; the level of a window is {statistic}.")
        }
        None => "Each level stands for its own window, as the table states it.".to_owned(),
    };
    let sensors = if sensors == 1 { "one sensor".to_owned() } else { format!("{sensors} sensors") };
    format!("Levels ({kind}) of {sensors}{span} were used{range} (IEC 61260-1, ISO 18405). {window}")
}

fn wind(study: &Study) -> Vec<String> {
    let sources: Vec<String> = study
        .wind
        .iter()
        .map(|wind| match &wind.origin {
            WindOrigin::Grid { files, .. } => format!("gridded 10 m wind `{}` ({})", wind.id, files_text(files.len())),
            WindOrigin::Table { files, .. } => format!("wind `{}` from tables ({})", wind.id, files_text(files.len())),
        })
        .collect();
    let speed = match study.matching.wind_speed {
        WindowSpeed::SpeedMean => "the mean over the window of the speed of the interpolated components",
        WindowSpeed::SpeedOfMean => "the speed of the mean components of the window",
        WindowSpeed::ScalarSpeedMean => "the mean over the window of the speed interpolated in space as a scalar",
    };
    vec![format!(
        "Wind came from {}. Components were interpolated in space at each model step ({}) and run linearly from step to step, never across a gap longer than the limit of the source. The mean over the half-open window [start, end) is the exact integral. The wind speed U of the relation is {speed}.",
        sources.join(" and "),
        study.matching.spatial_words()
    )]
}

fn files_text(count: usize) -> String {
    if count == 1 { "one file".to_owned() } else { format!("{count} files") }
}

fn pairs(input: &ReportInput<'_>) -> String {
    let counts = &input.matched.counts;
    let unused: u64 = counts.not_used.values().sum();
    let reasons: Vec<String> = counts
        .not_used
        .iter()
        .map(|(why, n)| format!("{}: {}", why.replace('_', " "), number::count(*n as usize)))
        .collect();
    let reasons = if reasons.is_empty() { String::new() } else { format!(" ({})", reasons.join("; ")) };
    format!(
        "{} pairs of wind and level were used; {} were not{reasons}.",
        number::count(counts.used as usize),
        number::count(unused as usize)
    )
}

fn law(fitted: &[FittedBand], study: &Study) -> String {
    let formula = "In each band the mean square pressure was described as the sum of a floor F and a wind part, L(U) = 10 log10(10^(F/10) + 10^(W(U)/10)), with W(U) = A + S log10(min(U, Us)/(10 m/s)): it rises by the slope S per factor ten in wind speed up to the onset Us and is constant above.";
    let family = |wanted: ScatterFamily| {
        fitted.iter().filter(|band| band.relation.scatter.is_some_and(|scatter| scatter.family == wanted)).count()
    };
    match study.relation.options.scatter {
        ScatterModel::FixedPowerSum => {
            format!("{formula} Floor and wind part add in power without scatter of their own.")
        }
        ScatterModel::HardCorner => {
            format!(
                "{formula} Instead of that sum the higher of floor and wind part was taken (hard corner), as asked for."
            )
        }
        ScatterModel::Estimated => {
            let counts: Vec<String> = ScatterFamily::ALL
                .iter()
                .map(|wanted| (wanted, family(*wanted)))
                .filter(|(_, count)| *count > 0)
                .map(|(wanted, count)| format!("{} in {count} of {} relations", wanted.name(), fitted.len()))
                .collect();
            format!(
                "{formula} The scatter of floor and wind part about their means, and passing ships added to the floor in power, bend the mean level near the crossover; a model of that scatter was fitted to the residuals, and the simplest one kept that the data do not reject; the higher of floor and wind part (hard corner) was taken instead of the sum only where it predicted held-out blocks of time clearly better ({}).",
                counts.join(", ")
            )
        }
    }
}

fn estimation(loss: Loss) -> String {
    let loss = match loss {
        Loss::Tukey => "Tukey's bisquare loss (tuning constant 4.685; Beaton and Tukey 1974)",
        Loss::Huber => "Huber's loss (tuning constant 1.345; Huber 1964)",
        Loss::LeastSquares => "least squares",
    };
    format!(
        "Parameters were estimated with {loss} on classes of the logarithm of wind speed; the onset was found by a profile over all onsets for which independent spells of weather lie below and above."
    )
}

/// Least, middle and greatest of some numbers, in words.
fn range(numbers: impl Iterator<Item = f64>, decimals: usize) -> String {
    let mut sorted: Vec<f64> = numbers.filter(|value| value.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    match (sorted.first(), sorted.last()) {
        (Some(low), Some(high)) => {
            let middle = sorted[sorted.len() / 2];
            let shown = |value: f64| number::fixed(value, decimals);
            if shown(*low) == shown(*high) {
                return shown(*low);
            }
            format!("{} to {}, median {}", shown(*low), shown(*high), shown(middle))
        }
        _ => "not known".to_owned(),
    }
}

fn intervals(input: &ReportInput<'_>) -> String {
    let options = &input.study.relation.options;
    let diagnostics = || input.fitted.bands.iter().map(|band| &band.relation.diagnostics);
    format!(
        "Intervals are 95 % intervals from {} replicates of a circular moving-block bootstrap over time (Künsch 1989; seed {}), with blocks of twice the automatic length of Politis and White (2004): {} h. The bands of a sensor share the same draws. Pairs are not independent: the effective number of pairs per band was {} (pairs used per band: {}). Intervals are statistical and do not contain the calibration of the sensors. Mean residuals by hour, month and wind direction were tested with the correction of Holm (1979).",
        options.replicates,
        options.seed,
        range(diagnostics().filter_map(|d| d.resampled_block_length_h), 0),
        range(diagnostics().filter_map(|d| d.effective_samples), 0),
        range(diagnostics().map(|d| d.samples as f64), 0),
    )
}

fn onsets(fitted: &[FittedBand]) -> String {
    let count = |wanted: Verdict| fitted.iter().filter(|band| band.relation.verdict == wanted).count();
    let outcomes: Vec<String> = Verdict::ALL
        .iter()
        .map(|verdict| (verdict, count(*verdict)))
        .filter(|(_, count)| *count > 0)
        .map(|(verdict, count)| format!("{}: {count}", verdict.name().replace('_', " ")))
        .collect();
    format!(
        "The word saturation was used only where a score test over all candidate onsets, with random signs for whole blocks (Hansen 1996), rejected a straight wind part at 5 %, the onset lay inside the tested winds with its interval, a knee predicted held-out blocks of time better than a quadratic and a threshold law, and the slope above the onset was compatible with zero. Elsewhere the onset is given as a bound or as not resolved. Outcomes over {} relations: {}.",
        fitted.len(),
        outcomes.join("; ")
    )
}
