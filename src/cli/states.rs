//! `stillgate states`

use std::process::ExitCode;

use super::args::Looking;
use super::common::{Failure, called, control, finish, folder, load, page, say, write};
use crate::output::{bundle, json, text};
use crate::review;

pub fn run(arguments: &Looking) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let scenario = load(input)?.scenario;
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "states");
    let report = review::states(&scenario, &control)?;
    finish(bar);
    if control.cancelled() {
        return Err(Failure::Interrupted);
    }
    let document = json::states(&scenario, &report, arguments.most_values);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        say(&text::states(&scenario, &report, &page(called(input).as_deref(), "")))?;
    }
    let mut bundle = bundle::of_states(&scenario, &report);
    bundle.add("states.json", document);
    write(&bundle, &folder, input.quiet || input.json)?;
    Ok(ExitCode::SUCCESS)
}
