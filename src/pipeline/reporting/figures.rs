//! The figures of a study, filled from its results.

use super::words::{estimate, file_part, level_label, onset, reference};
use super::{Pairing, Placed, ReportInput, segments_of};
use crate::model::{BandLevels, FittedBand, Missing, SensorRecord, Track};
use crate::numerics::quantile::quantiles;
use crate::report::{
    AgainstFrequency, Coverage, CoverageKind, CoverageRow, CoverageSpan, CurvePoint, Estimate, FrequencyPanel,
    FrequencyPoint, FrequencySeries, LevelAgainstWind, MapNodes, MapSite, ONSET_LABEL, ResidualClass, ResidualFamily,
    Residuals, SLOPE_LABEL, ShadedPeriod, SiteMap, SpectraByWindClass, TimeLine, TimePanel, TimeSeries,
    WindClassSpectrum, WindDistribution, WindSample, against_frequency, coverage, level_against_wind,
    level_against_wind_grid, residuals, site_map, spectra_by_wind_class, time_series, wind_distribution,
};
use crate::science::level_wind::{residual_classes, residuals as residuals_of};
use crate::units::{ComingFrom, Compass, Instant};

/// Bands drawn in the time series when the study names none: the lowest, the middle, the highest.
const TIME_SERIES_BANDS: usize = 3;

/// Figures of the study as a whole: map and coverage.
pub(super) fn of_study(input: &ReportInput<'_>) -> Vec<Placed> {
    vec![
        Placed {
            name: "map".into(),
            caption: "Sites, and the grid nodes whose wind was used. Longitudes are scaled by the cosine of the middle latitude.".into(),
            figure: site_map(&map(input)),
        },
        Placed {
            name: "coverage".into(),
            caption: "When there are levels, and whether they go into the fit. A day counts where any band does.".into(),
            figure: coverage(&coverage_input(input)),
        },
    ]
}

/// Figures of one sensor with the wind of one source.
pub(super) fn of_pairing(input: &ReportInput<'_>, pairing: &Pairing<'_>) -> Vec<Placed> {
    let record = pairing.record;
    let stem = format!(
        "{}_{}_{}",
        file_part(&pairing.conditions.source.0),
        file_part(&record.site),
        file_part(&record.sensor)
    );
    let title = format!("Site {}, sensor {}", record.site, record.sensor);
    let wind = format!("Wind: {}.", pairing.conditions.source);
    let bands: Vec<LevelAgainstWind> =
        record.bands.iter().enumerate().map(|(index, band)| level_wind_input(pairing, index, band, &title)).collect();
    let mut placed = vec![
        Placed {
            name: format!("{stem}_bands"),
            caption: format!(
                "Level against wind speed, all bands. Shade: number of windows; dots with bars: median and quartiles by class of wind; line: fitted curve with its 95 % interval. {wind}"
            ),
            figure: level_against_wind_grid(&title, std::slice::from_ref(&wind), &bands),
        },
        Placed {
            name: format!("{stem}_spectrum"),
            caption: "Onset, slope and floor against frequency with their 95 % intervals. Bounds are drawn as bounds; what is not resolved is left out.".into(),
            figure: against_frequency(&frequency_input(pairing, &title)),
        },
        Placed {
            name: format!("{stem}_classes"),
            caption: "Levels by class of wind: median, and the range from the 10 % to the 90 % quantile.".into(),
            figure: spectra_by_wind_class(&classes_input(input, pairing, &title)),
        },
        Placed {
            name: format!("{stem}_time"),
            caption: "Wind speed and the levels of chosen bands over time (UTC). Gaps are left open.".into(),
            figure: time_series(&time_input(input, pairing, &title)),
        },
        Placed {
            name: format!("{stem}_wind"),
            caption: "Wind speeds of the windows that have a level.".into(),
            figure: wind_distribution(&WindDistribution {
                title: format!("{title}: wind"),
                notes: vec![wind.clone()],
                samples: vec![WindSample {
                    name: pairing.conditions.source.0.clone(),
                    wind_m_s: pairing.wind_m_s.clone(),
                }],
                marks: Vec::new(),
            }),
        },
    ];
    for (index, band) in bands.iter().enumerate() {
        let centre = file_part(&record.bands[index].band.label());
        placed.push(Placed {
            name: format!("{stem}_{centre}"),
            caption: format!(
                "Level against wind speed, {}. Shade: number of windows; dots with bars: median and quartiles by class of wind; line: fitted curve with its 95 % interval.",
                band.short_title
            ),
            figure: level_against_wind(band),
        });
        placed.push(Placed {
            name: format!("{stem}_{centre}_residuals"),
            caption: format!("Level minus fitted level over time, {}, and its mean by hour, month and wind direction with 95 % intervals. Classes that stand out do so after correction for the number of classes (Holm).", band.short_title),
            figure: residuals(&residual_input(input, pairing, index, &title)),
        });
    }
    placed
}

fn level_wind_input(pairing: &Pairing<'_>, index: usize, band: &BandLevels, title: &str) -> LevelAgainstWind {
    let label = band.band.label();
    let mut figure = LevelAgainstWind {
        title: format!("{title}, {label}"),
        short_title: label,
        level_label: level_label(pairing.record.kind).into(),
        wind_label: String::new(),
        wind_m_s: pairing.wind_m_s.clone(),
        level_db: pairing.levels_db[index].clone(),
        curve: Vec::new(),
        floor_db: Estimate::NotResolved,
        floor_name: String::new(),
        onset_m_s: Estimate::NotResolved,
        onset_name: String::new(),
        notes: Vec::new(),
        short_note: String::new(),
    };
    if let Some(fitted) = pairing.fitted.get(index) {
        let relation = &fitted.relation;
        figure.curve = relation
            .curve_band
            .iter()
            .map(|point| CurvePoint {
                wind_m_s: point.wind_speed_m_s,
                level_db: point.level_db,
                low_db: point.low_db.unwrap_or(f64::NAN),
                high_db: point.high_db.unwrap_or(f64::NAN),
            })
            .collect();
        figure.floor_db = estimate(relation.floor_db);
        figure.onset_m_s = onset(relation.onset_m_s, relation.verdict);
        let slope = estimate(relation.slope_db_per_decade).text("dB per decade", 1);
        let mut verdict = relation.verdict_text();
        figure.short_note.clone_from(&verdict);
        if let Some(first) = verdict.get_mut(0..1) {
            first.make_ascii_uppercase();
        }
        figure.notes = vec![
            format!("{verdict}."),
            format!("Slope {slope}; {} pairs; wind {}.", relation.diagnostics.samples, fitted.source),
        ];
    }
    figure
}

fn frequency_input(pairing: &Pairing<'_>, title: &str) -> AgainstFrequency {
    let series = |pick: &dyn Fn(&FittedBand) -> Estimate, joined: bool| {
        let points = pairing
            .fitted
            .iter()
            .filter_map(|fitted| Some(FrequencyPoint { frequency_hz: fitted.band?.centre_hz, estimate: pick(fitted) }))
            .collect();
        vec![FrequencySeries { name: pairing.conditions.source.0.clone(), points, joined }]
    };
    let greatest = pairing.wind_m_s.iter().copied().filter(|w| w.is_finite()).fold(f64::NAN, f64::max);
    let references = if greatest.is_finite() { vec![(greatest, "highest wind".to_owned())] } else { Vec::new() };
    AgainstFrequency {
        title: title.to_owned(),
        notes: Vec::new(),
        panels: vec![
            FrequencyPanel {
                label: ONSET_LABEL.into(),
                series: series(&|f| onset(f.relation.onset_m_s, f.relation.verdict), false),
                references,
            },
            FrequencyPanel {
                label: SLOPE_LABEL.into(),
                series: series(&|f| estimate(f.relation.slope_db_per_decade), false),
                references: Vec::new(),
            },
            FrequencyPanel {
                label: format!("Floor ({})", reference(pairing.record.kind)),
                series: series(&|f| estimate(f.relation.floor_db), true),
                references: Vec::new(),
            },
        ],
    }
}

/// Name, edges in words, and the windows of each class of wind.
pub(super) fn wind_classes(input: &ReportInput<'_>, wind_m_s: &[f64]) -> Vec<(String, String, Vec<usize>)> {
    let edges = &input.study.report.wind_class_edges_m_s;
    let names: Vec<String> = if edges.len() == 2 {
        ["calm", "moderate", "strong"].map(str::to_owned).to_vec()
    } else {
        (1..=edges.len() + 1).map(|k| format!("class {k}")).collect()
    };
    names
        .into_iter()
        .enumerate()
        .map(|(class, name)| {
            let low = if class == 0 { 0.0 } else { edges[class - 1] };
            let high = edges.get(class).copied().unwrap_or(f64::INFINITY);
            let words = match (class, edges.get(class)) {
                (0, Some(high)) => format!("below {high} m/s"),
                (_, Some(high)) => format!("{low} to {high} m/s"),
                (_, None) => format!("{low} m/s and above"),
            };
            let windows = (0..wind_m_s.len()).filter(|k| wind_m_s[*k] >= low && wind_m_s[*k] < high).collect();
            (name, words, windows)
        })
        .collect()
}

fn classes_input(input: &ReportInput<'_>, pairing: &Pairing<'_>, title: &str) -> SpectraByWindClass {
    let classes = wind_classes(input, &pairing.wind_m_s)
        .into_iter()
        .map(|(name, edges, windows)| {
            let mut class = WindClassSpectrum {
                name,
                edges,
                count: windows.len(),
                frequency_hz: Vec::new(),
                p10_db: Vec::new(),
                p50_db: Vec::new(),
                p90_db: Vec::new(),
            };
            for (band, levels) in pairing.record.bands.iter().zip(&pairing.levels_db) {
                let [low, middle, high] = percentiles(levels, &windows);
                class.frequency_hz.push(band.band.centre_hz);
                class.p10_db.push(low);
                class.p50_db.push(middle);
                class.p90_db.push(high);
            }
            class
        })
        .collect();
    SpectraByWindClass {
        title: format!("{title}: levels by class of wind"),
        notes: Vec::new(),
        level_label: level_label(pairing.record.kind).into(),
        classes,
    }
}

/// 10 %, 50 % and 90 % quantile of the levels of some windows, dB; NaN where there are none.
pub(super) fn percentiles(levels_db: &[f64], windows: &[usize]) -> [f64; 3] {
    let here: Vec<f64> = windows.iter().map(|k| levels_db[*k]).filter(|level| level.is_finite()).collect();
    quantiles(&here, [0.1, 0.5, 0.9])
}

fn time_input(input: &ReportInput<'_>, pairing: &Pairing<'_>, title: &str) -> TimeSeries {
    let record = pairing.record;
    let time_ms: Vec<i64> = record.windows.iter().map(|window| window.centre().0).collect();
    let mut steps: Vec<i64> = time_ms.windows(2).map(|pair| pair[1] - pair[0]).collect();
    steps.sort_unstable();
    let gap_ms = steps.get(steps.len() / 2).map_or(0, |step| step * 5 / 2);
    let line = |name: String, value: &[f64]| TimeLine { name, time_ms: time_ms.clone(), value: value.to_vec(), gap_ms };
    let chosen = chosen_bands(input, pairing);
    TimeSeries {
        title: format!("{title}: wind and levels"),
        notes: Vec::new(),
        panels: vec![
            TimePanel {
                label: "Wind speed (m/s)".into(),
                lines: vec![line(pairing.conditions.source.0.clone(), &pairing.wind_m_s)],
            },
            TimePanel {
                label: level_label(record.kind).into(),
                lines: chosen
                    .into_iter()
                    .map(|index| line(record.bands[index].band.label(), &record.bands[index].level_db))
                    .collect(),
            },
        ],
        shaded: left_out(input, pairing),
    }
}

fn chosen_bands(input: &ReportInput<'_>, pairing: &Pairing<'_>) -> Vec<usize> {
    let bands = &pairing.record.bands;
    let wanted = &input.study.report.bands_hz;
    if wanted.is_empty() {
        let mut chosen: Vec<usize> = if bands.len() <= TIME_SERIES_BANDS {
            (0..bands.len()).collect()
        } else {
            vec![0, bands.len() / 2, bands.len() - 1]
        };
        chosen.dedup();
        return chosen;
    }
    bands
        .iter()
        .enumerate()
        .filter(|(_, band)| wanted.iter().any(|hz| band.band.low_hz <= *hz && *hz < band.band.high_hz))
        .map(|(index, _)| index)
        .collect()
}

/// Periods that do not go into the fit, each with its reason.
fn left_out(input: &ReportInput<'_>, pairing: &Pairing<'_>) -> Vec<ShadedPeriod> {
    let record = pairing.record;
    let mut shaded = periods(record, "outside the sensor's deployments", |k| record.deployment[k].is_none());
    let mut reasons: Vec<&String> = Vec::new();
    for (number, (reason, _)) in input.matched.counts.excluded.iter().enumerate() {
        if reasons.contains(&reason) {
            continue;
        }
        reasons.push(reason);
        shaded.extend(periods(record, reason, |k| {
            (0..record.bands.len()).any(|band| pairing.conditions.exclusion.rule(k, band) == Some(number))
        }));
    }
    shaded.extend(periods(record, "short events, screened out", |k| {
        record.bands.iter().any(|band| band.reason[k] == Some(Missing::ShortEvent))
    }));
    shaded
}

/// Runs of windows of which something holds.
fn periods(record: &SensorRecord, reason: &str, holds: impl Fn(usize) -> bool) -> Vec<ShadedPeriod> {
    let mut shaded: Vec<ShadedPeriod> = Vec::new();
    for (_, window) in record.windows.iter().enumerate().filter(|(k, _)| holds(*k)) {
        match shaded.last_mut() {
            Some(last) if last.end_ms == window.start.0 => last.end_ms = window.end.0,
            _ => {
                shaded.push(ShadedPeriod { start_ms: window.start.0, end_ms: window.end.0, reason: reason.to_owned() });
            }
        }
    }
    shaded
}

fn residual_input(input: &ReportInput<'_>, pairing: &Pairing<'_>, index: usize, title: &str) -> Residuals {
    let times_ms: Vec<i64> = pairing.record.windows.iter().map(|window| window.centre().0).collect();
    let mut figure = Residuals {
        title: format!("{title}, {}: residuals", pairing.record.bands[index].band.label()),
        notes: Vec::new(),
        time_ms: Vec::new(),
        residual_db: Vec::new(),
        families: Vec::new(),
    };
    let Some(fitted) = pairing.fitted.get(index) else { return figure };
    let segments = segments_of(input.study, pairing.record);
    let labels = segments.as_ref().map(|segments| segments.labels.as_slice());
    let of_window = residuals_of(&pairing.wind_m_s, &pairing.levels_db[index], labels, &fitted.relation);
    if let Some(block_h) = fitted.relation.diagnostics.resampled_block_length_h {
        let seed = input.study.relation.options.seed;
        figure.families = residual_families(pairing, &times_ms, &of_window, block_h, seed);
    }
    for (time, residual) in times_ms.iter().zip(of_window) {
        if residual.is_finite() {
            figure.time_ms.push(*time);
            figure.residual_db.push(residual);
        }
    }
    figure
}

/// Mean residuals by hour of day, month, and direction of the wind: what the wind speed alone does not explain.
fn residual_families(
    pairing: &Pairing<'_>,
    times_ms: &[i64],
    residual_db: &[f64],
    block_h: f64,
    seed: u64,
) -> Vec<ResidualFamily> {
    const MONTHS: [&str; 12] = ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];
    const SECTORS: [&str; 8] = ["N", "NE", "E", "SE", "S", "SW", "W", "NW"];
    let calendar = |pick: &dyn Fn(i32, u32, f64) -> u32| -> Vec<Option<u32>> {
        let at = |time: &i64| Instant(*time).year_month_hour().map(|(year, month, hour)| pick(year, month, hour));
        times_ms.iter().map(at).collect()
    };
    let hours = calendar(&|_, _, hour| hour as u32);
    let months = calendar(&|_, month, _| month - 1);
    let sectors: Vec<Option<u32>> = pairing
        .conditions
        .wind
        .iter()
        .map(|wind| {
            let wind = wind.as_ref()?;
            let from = Compass::<ComingFrom>::of_wind(wind.eastward_mean_m_s, wind.northward_mean_m_s)?;
            // Eight sectors of 45 degrees, each about its name.
            Some(((from.degrees() + 22.5) / 45.0) as u32 % 8)
        })
        .collect();
    let family = |label: &str, classes: &[Option<u32>], name: &dyn Fn(u32) -> String| ResidualFamily {
        label: label.to_owned(),
        classes: residual_classes(times_ms, residual_db, classes, block_h, seed)
            .into_iter()
            .map(|class| ResidualClass {
                label: name(class.class),
                count: class.samples,
                residual_db: Estimate::value(class.mean_db, class.low_db, class.high_db),
                stands_out: class.p_holm < 0.05,
            })
            .collect(),
    };
    vec![
        family("Hour of day (UTC)", &hours, &|hour| format!("{hour:02}")),
        family("Month", &months, &|month| MONTHS[month as usize % 12].to_owned()),
        family("Wind from", &sectors, &|sector| SECTORS[sector as usize % 8].to_owned()),
    ]
}

fn map(input: &ReportInput<'_>) -> SiteMap {
    let sites = input
        .sites
        .iter()
        .filter_map(|site| {
            let nominal = site.track.nominal()?;
            let track = match &site.track {
                Track::Fixed(_) => Vec::new(),
                Track::Moving(positions) => {
                    positions.iter().map(|(_, p)| (p.latitude_deg(), p.longitude_deg())).collect()
                }
            };
            Some(MapSite {
                id: site.id.clone(),
                latitude_deg: nominal.latitude_deg(),
                longitude_deg: nominal.longitude_deg(),
                track,
            })
        })
        .collect();
    let nodes = input
        .study
        .wind
        .iter()
        .map(|wind| {
            let of_source = input.matched.series.iter().filter(|series| series.source == wind.id);
            let mut used_deg = Vec::new();
            let mut unused_deg = Vec::new();
            for node in of_source.flat_map(|series| &series.nodes) {
                let place = (node.latitude_deg, node.longitude_deg);
                if node.weight > 0.0 { used_deg.push(place) } else { unused_deg.push(place) }
            }
            MapNodes { name: wind.id.0.clone(), used_deg, unused_deg }
        })
        .filter(|nodes| !nodes.used_deg.is_empty())
        .collect();
    SiteMap { title: format!("{}: sites and grid nodes", input.study.name), notes: Vec::new(), sites, nodes }
}

fn coverage_input(input: &ReportInput<'_>) -> Coverage {
    let rows = input
        .matched
        .records
        .iter()
        .zip(&input.matched.conditions)
        .map(|(record, sources)| {
            let spans = record
                .windows
                .iter()
                .enumerate()
                .filter(|(k, _)| record.bands.iter().any(|band| band.level_db[*k].is_finite()))
                .map(|(k, window)| {
                    let wind = sources.iter().any(|conditions| conditions.missing[k].is_none());
                    let kind = match (record.deployment[k], wind) {
                        (None, _) => CoverageKind::Excluded,
                        (Some(_), true) => CoverageKind::Used,
                        (Some(_), false) => CoverageKind::Unmatched,
                    };
                    CoverageSpan { start_ms: window.start.0, end_ms: window.end.0, kind }
                })
                .collect();
            CoverageRow { name: format!("{} {}", record.site, record.sensor), spans }
        })
        .collect();
    Coverage { title: format!("{}: coverage", input.study.name), notes: Vec::new(), rows }
}
