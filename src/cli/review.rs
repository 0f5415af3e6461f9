//! `stillgate review`: the main job.

use std::process::ExitCode;

use super::args::Reviewing;
use super::common::{
    Failure, INTERRUPTED, called, code, control, finish, folder, load, options, overrides, page, program, say,
    with_draws, write,
};
use crate::output::text::Page;
use crate::output::{bundle, json, text};
use crate::review;

pub fn run(arguments: &Reviewing) -> Result<ExitCode, Failure> {
    let Reviewing { sweeping: arguments, search, proof_zones } = arguments;
    let input = &arguments.input;
    let mut scenario = with_draws(load(input)?, &arguments.draws);
    scenario.plan.search = search.unwrap_or(scenario.plan.search);
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "review");
    let program = program(&scenario, &control)?;
    let threads = arguments.threads.map_or(0, usize::from);
    let review = review::review_proving(&scenario, &program, *proof_zones, threads, &control)?;
    finish(bar);
    if control.cancelled() && review.sweep.samples == 0 {
        return Err(Failure::Interrupted);
    }
    let (called, options) = (called(input), options(&overrides(&arguments.draws)));
    let into = folder.display().to_string();
    let page = Page { folder: &into, ..page(called.as_deref(), &options) };
    if input.json {
        say(&json::review(&scenario, &review))?;
    } else if !input.quiet {
        say(&text::review(&scenario, &review, &page))?;
    }
    let bundle = bundle::of_review(&scenario, &review, &page);
    bundle::clear_pictures(&folder, &bundle);
    write(&bundle, &folder, input.quiet || input.json)?;
    if control.cancelled() {
        return Ok(ExitCode::from(INTERRUPTED));
    }
    Ok(code(review.verdict.call, arguments.strict))
}
