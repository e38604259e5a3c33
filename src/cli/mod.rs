//! The command line: the only code that knows what was typed and what is printed.

mod args;
mod check;
mod fit;
mod run;
mod sample;
mod terminal;

use crate::Error;
use args::{Cli, Command};
use clap::Parser;
use std::process::ExitCode;
use terminal::Terminal;

/// How a command ends early: an error to print, or an exit code already settled.
enum Ending {
    Error(Error),
    Exit(ExitCode),
}

impl<E: Into<Error>> From<E> for Ending {
    fn from(error: E) -> Self {
        Self::Error(error.into())
    }
}

/// Runs the program; returns its exit status.
pub fn main() -> ExitCode {
    let cli = Cli::parse();
    if let Command::Probe { file } = &cli.command {
        crate::io::netcdf::probe(file);
        return ExitCode::SUCCESS;
    }
    if let Ok(program) = std::env::current_exe() {
        crate::io::netcdf::probe_with(program);
    }
    let terminal = Terminal::new(cli.global.quiet);
    if let Some(threads) = cli.global.threads {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(usize::from(threads)).build_global();
        if let Err(error) = pool {
            terminal.error(&format!("cannot start {threads} threads: {error}"));
            return ExitCode::from(crate::error::status::COMMAND_LINE);
        }
    }
    let ended = match &cli.command {
        Command::Check(args) => check::check(args, &terminal),
        Command::Sample(args) => sample::sample(args),
        Command::Match(args) => run::match_study(args, &terminal),
        Command::Fit(args) => fit::fit(args, &terminal),
        Command::Spread(args) => run::spread(args, &terminal),
        Command::Report(args) => run::report(args, &terminal),
        Command::Run(args) => run::run(args, &terminal),
        Command::Simulate(args) => run::simulate(args, &terminal),
        Command::Probe { .. } => Ok(()),
    };
    match ended {
        Ok(()) => ExitCode::SUCCESS,
        Err(Ending::Exit(code)) => code,
        Err(Ending::Error(error)) => {
            terminal.error(&one_line(&error));
            ExitCode::from(error.exit_status())
        }
    }
}

/// An error and its causes, each once, on one line.
fn one_line(error: &dyn std::error::Error) -> String {
    let mut text = error.to_string();
    let mut cause = error.source();
    while let Some(inner) = cause {
        let words = inner.to_string();
        if !text.contains(&words) {
            text.push_str(": ");
            text.push_str(&words);
        }
        cause = inner.source();
    }
    text.lines().map(str::trim).collect::<Vec<_>>().join(" ")
}
