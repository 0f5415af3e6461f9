//! `stillgate states`

use std::process::ExitCode;

use super::args::Looking;
use super::common::{Failure, control, finish, folder, load, say, style, write};
use crate::output::bundle::File;
use crate::output::{json, tables, text};
use crate::review;

pub fn run(arguments: &Looking) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let scenario = load(input)?.scenario;
    let (control, bar) = control(true, "states");
    let report = review::states(&scenario.circuit, &control);
    finish(bar);
    if control.cancelled() {
        return Err(Failure::Interrupted);
    }
    let document = json::states(&scenario, &report);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        say(&text::states(&scenario, &report, &style()))?;
    }
    let files = [File::new("states.csv", tables::states(&scenario, &report)), File::new("states.json", document)];
    write(&files, &folder(input, &arguments.folder), input.quiet || input.json)?;
    Ok(ExitCode::SUCCESS)
}
