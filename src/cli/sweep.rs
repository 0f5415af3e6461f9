//! `stillgate sweep`

use std::process::ExitCode;

use super::args::Sweeping;
use super::common::{
    Failure, INTERRUPTED, called, code, control, finish, folder, load, options, page, program, say, with_draws, write,
};
use crate::findings::Asked;
use crate::output::{bundle, json, text};
use crate::review;

pub fn run(arguments: &Sweeping) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let scenario = with_draws(load(input)?, &arguments.draws);
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "sweep");
    let program = program(&scenario, &control)?;
    let asked = Asked::of(&scenario);
    let threads = arguments.threads.map_or(0, usize::from);
    let report = review::sweep(&scenario, &program, &asked, threads, &control)?;
    finish(bar);
    if control.cancelled() && report.samples == 0 {
        return Err(Failure::Interrupted);
    }
    let verdict = review::verdict(&scenario, &report);
    let document = json::sweep(&scenario, &asked, &report);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        say(&text::sweep(
            &scenario,
            &asked,
            &report,
            &verdict,
            &page(called(input).as_deref(), &options(&arguments.draws)),
        ))?;
    }
    let mut bundle = bundle::of_sweep(&scenario, &asked, &report);
    bundle.add("sweep.json", document);
    write(&bundle, &folder, input.quiet || input.json)?;
    if control.cancelled() {
        return Ok(ExitCode::from(INTERRUPTED));
    }
    Ok(code(verdict.call, arguments.strict))
}
