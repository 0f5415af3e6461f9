//! The command line: one thin file a command. A command reads, runs, renders, and gives an exit code.

mod args;
mod check;
mod common;
mod limit;
mod manual;
mod merge;
mod prove;
mod review;
mod run;
mod states;
mod sweep;

use std::process::ExitCode;

use clap::{CommandFactory, FromArgMatches};

use args::{Arguments, Command};

/// Runs the program with the arguments it was called with.
pub fn main() -> ExitCode {
    let command = Arguments::command().term_width(common::terminal_width());
    let arguments = command.try_get_matches().and_then(|found| Arguments::from_arg_matches(&found));
    let arguments = match arguments {
        Ok(arguments) => arguments,
        Err(error) => {
            // help and version go to standard output and are no failure
            let code = if error.use_stderr() { 2 } else { 0 };
            let _ = error.print();
            return ExitCode::from(code);
        }
    };
    let done = match arguments.command {
        Command::Review(it) => review::run(&it),
        Command::Run(it) => run::run(&it),
        Command::Sweep(it) => sweep::run(&it),
        Command::Merge(it) => merge::run(&it),
        Command::Limit(it) => limit::run(&it),
        Command::States(it) => states::run(&it),
        Command::Prove(it) => prove::run(&it),
        Command::Check(it) => check::run(&it),
        Command::Completions { shell } => manual::completions(shell),
        Command::Manual { command } => manual::manual(command.as_deref()),
    };
    match done {
        Ok(code) => code,
        Err(failure) => {
            common::complain(&failure);
            ExitCode::from(failure.code())
        }
    }
}
