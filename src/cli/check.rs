//! `check`.

use super::Ending;
use super::args::CheckArgs;
use super::terminal::{Terminal, print};
use crate::config::read_study;
use crate::model::{Flag, Missing};
use crate::pipeline::check_study;

pub(super) fn check(args: &CheckArgs, terminal: &Terminal) -> Result<(), Ending> {
    if args.reasons {
        return print(&reasons()).map_err(Ending::Exit);
    }
    let Some(path) = &args.study else { return Ok(()) };
    let study = read_study(path)?;
    let report = check_study(&study, terminal)?;
    let text = if args.json {
        let mut text = serde_json::to_string_pretty(&report).expect("plain data is JSON");
        text.push('\n');
        text
    } else {
        report.text()
    };
    print(&text).map_err(Ending::Exit)
}

/// Every flag and reason with its sentence.
fn reasons() -> String {
    let mut text = String::from("flags: the value stands, but the reader should know this\n");
    for flag in Flag::ALL {
        text.push_str(&format!("  {:24} {}\n", flag.name(), flag.sentence()));
    }
    text.push_str("reasons: why there is no value, or why a row is not used\n");
    for why in Missing::ALL {
        text.push_str(&format!("  {:24} {}\n", why.name(), why.sentence()));
    }
    text
}
