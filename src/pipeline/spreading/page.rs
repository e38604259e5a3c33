//! The section of the page on spreading.

use super::figures::SpreadFigures;
use crate::model::{NotIdentified, SensorSpreading};
use crate::pipeline::reporting::block;
use crate::report::{Block, Column, Section, Table, number, spreading_text};

/// What the comparison can and cannot say, for the page.
const METHOD: &str = "Waves of one frequency that run against each other press on the deep water at twice the frequency. The radiated level is taken from the model's spectrum at half the band's frequency, integrated over the band's own edges. The site's offset is fixed where published laws of spreading agree (f above 4 fp of the wind sea, outside the laid-on tail) and carried over to the classes under test. Intervals join a block bootstrap over time, twice the stated uncertainty of E, and the spread of the laws. What is compared is E squared times the overlap; it is the overlap alone only as far as E is known.";

/// The section of all sensors.
pub(in crate::pipeline) fn spreading_section(all: &[SensorSpreading], figures: SpreadFigures) -> Section {
    let mut blocks: Vec<Block> = figures.testability.into_iter().map(block).collect();
    let words: Vec<String> =
        spreading_text(all).lines().filter(|line| !line.trim().is_empty()).map(|line| line.trim().to_owned()).collect();
    blocks.push(Block::Text("In words:".to_owned()));
    blocks.push(Block::Points(words));
    for (sensor, placed) in all.iter().zip(figures.of_sensors) {
        blocks.extend(placed.into_iter().map(block));
        blocks.push(Block::Table(table(sensor)));
    }
    blocks.push(Block::Method {
        title: "How spreading was compared with sound".to_owned(),
        text: vec![METHOD.to_owned()],
    });
    Section::new("Directional spreading against sound", blocks)
}

fn table(sensor: &SensorSpreading) -> Table {
    let mut rows = Vec::new();
    for comparison in &sensor.comparisons {
        for class in comparison.classes.iter().filter(|class| class.class.all_winds()) {
            let difference = class.difference.map_or_else(
                || "–".to_owned(),
                |d| {
                    format!(
                        "{} ({} to {})",
                        number::fixed(d.difference_db, 1),
                        number::fixed(d.low_db, 1),
                        number::fixed(d.high_db, 1)
                    )
                },
            );
            rows.push(vec![
                comparison.band.label(),
                comparison.model.clone(),
                class.class.words(),
                number::count(class.used),
                difference,
                number::fixed(class.law_range_db, 1),
                class.verdict.reason().map_or_else(
                    || class.verdict.name().replace('_', " "),
                    |why: NotIdentified| format!("not identified: {}", why.name().replace('_', " ")),
                ),
            ]);
        }
    }
    Table {
        caption: format!("Spreading at {}, sensor {}", sensor.site, sensor.sensor),
        columns: vec![
            Column::row_name("band"),
            Column::text("spectra"),
            Column::text("class of f / fp"),
            Column::number("windows", "used"),
            Column::number("sound above model", "dB"),
            Column::number("laws differ by", "dB"),
            Column::text("verdict"),
        ],
        rows,
        note: format!("All winds; classes by wind are in the table of the output folder. {}.", sensor.density_words()),
    }
}
