//! `stillgate check`

use std::process::ExitCode;

use super::args::Checking;
use super::common::{Failure, called, load, page, say};
use crate::output::{json, text};

pub fn run(arguments: &Checking) -> Result<ExitCode, Failure> {
    let scenario = load(&arguments.input)?.scenario;
    if arguments.input.json {
        say(&json::check(&scenario))?;
    } else if !arguments.input.quiet {
        say(&text::check(&scenario, &page(called(&arguments.input).as_deref(), "")))?;
    }
    Ok(ExitCode::SUCCESS)
}
