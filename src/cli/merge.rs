//! `stillgate merge`: the parts of a sweep put together.

use std::path::Path;
use std::process::ExitCode;

use super::args::Merging;
use super::common::{Failure, folder_of, options, program};
use super::sweep::{Results, say_part};
use crate::control::Control;
use crate::findings::Asked;
use crate::output::bundle;
use crate::reader::{read_part, scenario_of};
use crate::review::Sweeper;
use crate::scenario::Scenario;
use crate::sweep::Parts;

pub fn run(arguments: &Merging) -> Result<ExitCode, Failure> {
    let mut parts = Parts::default();
    let mut known: Option<(Scenario, Asked)> = None;
    for path in &arguments.parts {
        let file = path.display().to_string();
        let read = read_part(path).and_then(|part| match &known {
            Some(_) => Ok(part),
            None => {
                known = Some(scenario_of(&part, &file)?);
                Ok(part)
            }
        });
        match (read, &known) {
            (Ok(part), Some((scenario, asked))) => parts.add(&file, part, scenario, asked),
            (Ok(_), None) => {}
            (Err(refusal), _) => parts.refuse(refusal),
        }
        if parts.first().is_none() {
            // what was refused says nothing of the others
            known = None;
        }
    }
    let whole = arguments.save.is_none() && !arguments.allow_gaps;
    let part = parts.finish(whole).map_err(Failure::Parts)?;
    let (scenario, asked) = known.unwrap_or_else(|| unreachable!("a part that was taken has a scenario"));
    if let Some(path) = &arguments.save {
        bundle::replace(path, &part.to_bytes())?;
        say_part(&part, path, arguments.json, arguments.quiet)?;
        return Ok(ExitCode::SUCCESS);
    }
    let control = Control::default();
    let program = program(&scenario, &control)?;
    let report = Sweeper::new(&scenario, &program, &asked, 1)?.conclude(&part.cases, None, &control)?;
    let folder = folder_of(part.called.as_deref().map(Path::new), &arguments.folder)?;
    let results = Results {
        scenario: &scenario,
        asked: &asked,
        report: &report,
        called: part.called.as_deref(),
        options: &options(&part.overrides),
        json: arguments.json,
        quiet: arguments.quiet,
        strict: arguments.strict,
    };
    results.give(&folder)
}
