//! `stillgate prove`: all delays in their ranges at once.

use std::process::ExitCode;
use std::time::Duration;

use super::args::Proving;
use super::common::{Failure, INTERRUPTED, called, control, finish, folder, load, page, program, say, write};
use crate::findings::Asked;
use crate::output::text::Page;
use crate::output::{bundle, json, text};
use crate::proof::{self, Call, Spend};

pub fn run(arguments: &Proving) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let scenario = load(input)?.scenario;
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "proof");
    let program = program(&scenario, &control)?;
    let asked = Asked::of(&scenario);
    let time = arguments.seconds.map(Duration::from_secs);
    let spend = Spend {
        zones: arguments.zones,
        total: None,
        bytes: arguments.memory << 20,
        time,
        margins: arguments.margin,
        padding: arguments.padding,
    };
    let proof = proof::prove(&scenario, &program, &asked, &spend, &control);
    finish(bar);
    let files = proof.witness_files();
    let document = json::prove(&scenario, &asked, &proof, &files);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        let (called, into) = (called(input), folder.display().to_string());
        let page = Page { folder: &into, ..page(called.as_deref(), "") };
        say(&text::prove(&scenario, &asked, &proof, &files, &page))?;
    }
    let mut bundle = bundle::Bundle::default();
    bundle.add("proof.json", document);
    bundle.add_witnesses(&scenario, &proof);
    write(&bundle, &folder, input.quiet || input.json)?;
    if control.cancelled() {
        return Ok(ExitCode::from(INTERRUPTED));
    }
    let good = proof.claims.iter().all(|claim| claim.call == Call::Proved);
    Ok(ExitCode::from(u8::from(arguments.strict && !good)))
}
