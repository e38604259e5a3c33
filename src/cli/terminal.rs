//! What the shell sees: results on standard output, remarks and progress on standard error.

use crate::pipeline::Progress;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::{self, IsTerminal, Write};
use std::process::ExitCode;
use std::sync::Mutex;

/// Where remarks go, and how many of them.
#[derive(Debug)]
pub(crate) struct Terminal {
    quiet: bool,
    colour: bool,
    bar: Mutex<Option<ProgressBar>>,
}

impl Terminal {
    pub(crate) fn new(quiet: bool) -> Self {
        let plain = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty())
            || std::env::var_os("TERM").is_some_and(|term| term == "dumb");
        Self { quiet, colour: !plain && io::stderr().is_terminal(), bar: Mutex::new(None) }
    }

    /// A remark on standard error; nothing when quiet.
    pub(crate) fn remark(&self, text: &str) {
        if !self.quiet {
            self.write_error(text);
        }
    }

    /// A warning on standard error; nothing when quiet.
    pub(crate) fn warn(&self, text: &str) {
        if !self.quiet {
            let head = if self.colour { "\u{1b}[33mwarning:\u{1b}[0m" } else { "warning:" };
            self.write_error(&format!("{head} {text}"));
        }
    }

    /// An error on standard error, always.
    pub(crate) fn error(&self, text: &str) {
        let head = if self.colour { "\u{1b}[31merror:\u{1b}[0m" } else { "error:" };
        self.write_error(&format!("{head} {text}"));
    }

    fn write_error(&self, text: &str) {
        let write = || {
            // Nothing sensible can be done when standard error is closed.
            let _ = writeln!(io::stderr().lock(), "{text}");
        };
        match self.bar.lock().ok().as_deref() {
            Some(Some(bar)) => bar.suspend(write),
            _ => write(),
        }
    }
}

/// Writes results to standard output. A closed pipe ends the program quietly, as common practice has it.
pub(crate) fn print(text: &str) -> Result<(), ExitCode> {
    let mut out = io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Ok(()) => Ok(()),
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Err(ExitCode::SUCCESS),
        Err(_) => Err(ExitCode::from(crate::error::status::OUTPUT)),
    }
}

impl Progress for Terminal {
    fn start(&self, total: u64, what: &str) {
        // Drawn only on a terminal; indicatif hides it elsewhere, and so do we, to be sure.
        if self.quiet || !io::stderr().is_terminal() {
            return;
        }
        // A total of 0 is one that is not known.
        let (length, look) = if total == 0 {
            (None, "{msg:28} {human_pos} {elapsed}")
        } else {
            (Some(total), "{msg:28} {wide_bar} {pos}/{len} {eta}")
        };
        let bar = ProgressBar::with_draw_target(length, ProgressDrawTarget::stderr());
        if let Ok(style) = ProgressStyle::with_template(look) {
            bar.set_style(style.progress_chars("=> "));
        }
        bar.set_message(what.to_owned());
        if let Ok(mut current) = self.bar.lock() {
            *current = Some(bar);
        }
    }

    fn advance(&self, by: u64) {
        if let Ok(current) = self.bar.lock()
            && let Some(bar) = current.as_ref()
        {
            bar.inc(by);
        }
    }

    fn finish(&self) {
        if let Ok(mut current) = self.bar.lock()
            && let Some(bar) = current.take()
        {
            bar.finish_and_clear();
        }
    }
}
