//! `stillgate review`: the main job.

use std::process::ExitCode;

use super::args::Sweeping;
use super::common::{
    Failure, INTERRUPTED, called, code, control, finish, folder, load, options, overrides, page, program, say,
    with_draws, write,
};
use crate::output::{bundle, json, text};
use crate::review;

pub fn run(arguments: &Sweeping) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let scenario = with_draws(load(input)?, &arguments.draws);
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "review");
    let program = program(&scenario, &control)?;
    let review = review::review(&scenario, &program, arguments.threads.map_or(0, usize::from), &control)?;
    finish(bar);
    if control.cancelled() && review.sweep.samples == 0 {
        return Err(Failure::Interrupted);
    }
    if input.json {
        say(&json::review(&scenario, &review))?;
    } else if !input.quiet {
        say(&text::review(
            &scenario,
            &review,
            &page(called(input).as_deref(), &options(&overrides(&arguments.draws))),
        ))?;
    }
    let bundle = bundle::of_review(&scenario, &review);
    bundle::clear_pictures(&folder, &bundle);
    write(&bundle, &folder, input.quiet || input.json)?;
    if control.cancelled() {
        return Ok(ExitCode::from(INTERRUPTED));
    }
    Ok(code(review.verdict.call, arguments.strict))
}
