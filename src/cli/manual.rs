//! `stillgate completions` and `stillgate manual`: made of the definitions of commands and options.

use std::process::ExitCode;

use clap::CommandFactory;
use clap_complete::{Generator, Shell};
use clap_mangen::Man;

use super::args::Arguments;
use super::common::{Failure, say};
use crate::scenario::nearest;

/// The script for a shell.
pub fn completions(shell: Shell) -> Result<ExitCode, Failure> {
    let mut command = Arguments::command();
    command.set_bin_name("stillgate");
    command.build();
    let mut bytes = Vec::new();
    shell.try_generate(&command, &mut bytes).map_err(unwritten)?;
    say(&String::from_utf8_lossy(&bytes))?;
    Ok(ExitCode::SUCCESS)
}

/// The page of the program or of one command, in roff.
pub fn manual(name: Option<&str>) -> Result<ExitCode, Failure> {
    let mut command = Arguments::command();
    command.build();
    let page = match name {
        None => command,
        Some(name) => {
            let known = command.get_subcommands().find(|it| it.get_name() == name).cloned();
            known.ok_or_else(|| {
                let help = match nearest(name, command.get_subcommands().map(clap::Command::get_name)) {
                    Some(likely) => format!("did you mean `{likely}`?"),
                    None => "`stillgate --help` lists the commands".to_string(),
                };
                Failure::Bad(format!("there is no command `{name}`; {help}"))
            })?
        }
    };
    let mut bytes = Vec::new();
    Man::new(page).render(&mut bytes).map_err(unwritten)?;
    say(&String::from_utf8_lossy(&bytes))?;
    Ok(ExitCode::SUCCESS)
}

fn unwritten(error: std::io::Error) -> Failure {
    Failure::Bad(format!("the text cannot be made: {error}"))
}
