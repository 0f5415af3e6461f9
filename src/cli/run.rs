//! `stillgate run`: one case.

use std::path::Path;
use std::process::ExitCode;
use std::sync::atomic::Ordering;

use super::args::Running;
use super::common::{
    Failure, Meter, called, control, finish, folder, load, options, overrides, page, program, say, say_aside,
    with_draws, write,
};
use crate::circuit::NetId;
use crate::delay::Marginal;
use crate::findings::Asked;
use crate::instance::{Instance, PERTURBATIONS, Which};
use crate::output::bundle::WriteError;
use crate::output::dump::{LongDump, Tick, coarsen};
use crate::output::instance::write_instance;
use crate::output::stream::Stream;
use crate::output::waves::Overflow;
use crate::output::{bundle, json, text};
use crate::reader;
use crate::review;
use crate::scenario::{Condition, Scenario, nearest};

pub fn run(arguments: &Running) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let mut scenario = with_draws(load(input)?, &arguments.draws);
    if let Some(name) = &arguments.condition {
        scenario = under(name, &scenario)?;
    }
    let which = which("--delays", &arguments.delays, &scenario)?;
    let against = arguments.against.as_deref().map(|case| self::which("--against", case, &scenario)).transpose()?;
    let nets = nets(&arguments.nets, &scenario)?;
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "run");
    let program = program(&scenario, &control)?;
    let asked = Asked::of(&scenario);
    // a run that is too long to be kept writes its transitions as they come
    let table = folder.join(format!("changes-{}.csv", bundle::safe(&which.words())));
    let give_up = || control.cancel.store(true, Ordering::Relaxed);
    let overflow = Overflow::new(&scenario, review::MOST_KEPT as usize, || Stream::open(&table), &give_up);
    let (place, words) = (folder.join(format!("waves-{}.vcd", bundle::safe(&which.words()))), which.words());
    let dump = LongDump::new(&scenario, &words, review::MOST_KEPT as usize, || Stream::open(&place), &give_up);
    let heard = ((overflow, dump), Meter::new(bar.as_ref()));
    let (report, ((overflow, dump), _)) = review::run_heard(&scenario, &program, &asked, which, &control, heard);
    finish(bar);
    let too_wide = report.as_ref().is_some_and(|report| bundle::table_fits(&scenario, report).is_err());
    let unwritten = |source| WriteError::File { file: table.clone(), source };
    let changes = overflow.finish(too_wide).map_err(unwritten)?;
    let cut = report.as_ref().is_some_and(|report| report.trace.cut.is_some());
    let unwritten = |source| WriteError::File { file: place.clone(), source };
    let dump = dump.finish(cut).map_err(unwritten)?;
    let report = report.ok_or(Failure::Interrupted)?;
    let other = against.map(|case| review::run_one(&scenario, &program, &asked, case, &control));
    let other = match other {
        Some(None) => return Err(Failure::Interrupted),
        Some(other) => other,
        None => None,
    };
    let dump = match dump {
        Some((stream, tick)) if tick > Tick::FINEST => {
            Some(stream.again(|from, to| coarsen(from, tick, to)).map_err(unwritten)?)
        }
        other => other.map(|(stream, _)| stream),
    };
    let document = json::run(&scenario, &asked, &report);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        say(&text::run(
            &scenario,
            &asked,
            &report,
            &page(called(input).as_deref(), &options(&overrides(&arguments.draws))),
        ))?;
    }
    let mut bundle = bundle::of_run(&scenario, &asked, &report, other.as_ref(), nets);
    let case = bundle::safe(&report.which.words());
    bundle.add(&format!("run-{case}.json"), document);
    bundle.add(&format!("case-{case}.toml"), write_instance(&report.instance, &scenario));
    let quiet = input.quiet || input.json;
    write(&bundle, &folder, quiet)?;
    // the other table of an earlier run would be taken for one of this run
    let wide = folder.join(format!("waves-{case}.csv"));
    bundle::remove(if changes.is_some() { &wide } else { &table });
    if let Some((stream, rows)) = changes {
        stream.keep()?;
        if !quiet {
            say_aside(&format!("{}: all transitions, {rows}\n", table.display()));
        }
    }
    if let Some(stream) = dump {
        stream.keep()?;
        if !quiet {
            say_aside(&format!("{}: all transitions\n", place.display()));
        }
    }
    let broken = report.facts.iter().any(|fact| fact.breaks_rule);
    let undecided = !report.not_judged.is_empty() || report.judged == 0;
    Ok(ExitCode::from(u8::from(arguments.strict && (broken || undecided))))
}

/// The nets that `--nets` names; `None` for all.
fn nets(names: &[String], scenario: &Scenario) -> Result<Option<Vec<NetId>>, Failure> {
    let circuit = &scenario.circuit;
    let net = |name: &String| {
        circuit.net(name.trim()).ok_or_else(|| {
            let like = nearest(name, circuit.nets().map(|net| circuit.name(net)));
            let remedy = like.map_or_else(String::new, |like| format!("; did you mean `{like}`?"));
            Failure::Bad(format!("`--nets`: there is no net `{name}`{remedy}"))
        })
    };
    let nets = names.iter().map(net).collect::<Result<Vec<NetId>, Failure>>()?;
    Ok((!nets.is_empty()).then_some(nets))
}

/// The scenario under the condition that `--condition` names.
fn under(name: &str, scenario: &Scenario) -> Result<Scenario, Failure> {
    let names = || scenario.conditions.iter().map(|it| it.name.as_str());
    match scenario.conditions.iter().find(|it| it.name == name) {
        Some(condition) => Ok(scenario.under(condition)),
        None if name == Condition::NOMINAL => Ok(scenario.clone()),
        None => {
            let remedy = match (nearest(name, names()), scenario.conditions.is_empty()) {
                (Some(like), _) => format!("; did you mean `{like}`?"),
                (None, true) => "; it has none".to_string(),
                (None, false) => format!("; it has {}", names().collect::<Vec<_>>().join(", ")),
            };
            Err(Failure::Bad(format!("`--condition`: the scenario has no condition `{name}`{remedy}")))
        }
    }
}

/// The case that `--delays` or `--against` names.
fn which(option: &str, text: &str, scenario: &Scenario) -> Result<Which, Failure> {
    match text {
        "typ" => return Ok(Which::Typ),
        "min" => return Ok(Which::Min),
        "max" => return Ok(Which::Max),
        _ => {}
    }
    if let Some((case, number)) = text.rsplit_once('~')
        && (matches!(case, "typ" | "min" | "max") || case.starts_with("sample:"))
    {
        return perturbed(option, text, which(option, case, scenario)?, number, scenario);
    }
    if let Some(number) = text.strip_prefix("sample:") {
        let number = number.parse::<u64>().ok().filter(|number| *number < 1 << 62);
        let number = number.ok_or_else(|| {
            Failure::Bad(format!("`{option} {text}` names no sample; write for example `{option} sample:12`"))
        })?;
        let samples = scenario.plan.samples;
        if scenario.plan.draw == Marginal::Hypercube && number >= samples {
            let message = format!("`{option} {text}`: a hypercube of {samples} draws ends with sample:{}", samples - 1);
            return Err(Failure::Bad(message));
        }
        return Ok(Which::Sample(number));
    }
    let path = Path::new(text);
    if !path.exists() {
        let message = format!(
            "`{option} {text}`: there is no such file; write typ, min, max, sample:N, one of them with ~P, or a file"
        );
        return Err(Failure::Bad(message));
    }
    Ok(Which::Given(Box::new(reader::load_instance(path, scenario)?)))
}

/// A case with every time moved by single femtoseconds.
fn perturbed(option: &str, text: &str, case: Which, number: &str, scenario: &Scenario) -> Result<Which, Failure> {
    let number = number.parse::<u8>().ok().filter(|number| (1..=PERTURBATIONS).contains(number));
    let number = number.ok_or_else(|| {
        let message =
            format!("perturbations are numbered from 1 to {PERTURBATIONS}, as in `{option} {}~1`", case.key());
        Failure::Bad(format!("`{option} {text}`: {message}"))
    })?;
    match Instance::of(scenario, &case).perturbed(scenario, number) {
        Ok(_) => Ok(Which::Perturbed(Box::new(case), number)),
        Err(why) => Err(Failure::Bad(format!("`{option} {text}`: its times cannot be moved: {why}"))),
    }
}
