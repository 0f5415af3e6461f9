//! `stillgate limit`: how fast may it go.

use std::process::ExitCode;

use super::args::Limiting;
use super::common::{
    Failure, INTERRUPTED, called, control, finish, folder, load, options, overrides, page, say, with_draws, write,
};
use crate::findings::Asked;
use crate::limit::{self, Parameter, Search};
use crate::output::bundle::Bundle;
use crate::output::instance::write_instance;
use crate::output::{json, limit_charts, limit_map, limit_tables, text};
use crate::scenario::Scenario;
use crate::time::Span;

/// The file of the case just beyond the limit.
const CASE: &str = "beyond-limit.toml";
/// Values each way of a map, if nothing is said.
const MAP_POINTS: u32 = 17;
/// Values each way of a map, at most.
const MOST_MAP_POINTS: u32 = 201;

pub fn run(arguments: &Limiting) -> Result<ExitCode, Failure> {
    let scenario = with_draws(load(&arguments.input)?, &arguments.draws);
    let within = arguments.to_within.as_deref().map(|text| span(text, "--to-within", &scenario)).transpose()?;
    let first = search(&arguments.of, (&arguments.from, &arguments.to), ("--from", "--to"), &scenario)?;
    if arguments.and.is_empty() {
        let points = arguments.points.unwrap_or(Search::POINTS);
        return one(arguments, &scenario, &Search { within, points, ..first });
    }
    let points = arguments.points.unwrap_or(MAP_POINTS);
    if points > MOST_MAP_POINTS {
        return Err(Failure::Bad(format!("`--points {points}`: a map has at most {MOST_MAP_POINTS} values each way")));
    }
    let ends = (&arguments.and_from, &arguments.and_to);
    let second = search(&arguments.and, ends, ("--and-from", "--and-to"), &scenario)?;
    two(arguments, &scenario, &Search { points, ..first }, &Search { points, ..second })
}

fn one(arguments: &Limiting, scenario: &Scenario, search: &Search) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "limit");
    let report = limit::limit(scenario, search, threads(arguments), &control)?;
    finish(bar);
    let asked = Asked::of(scenario);
    let mut bundle = Bundle::default();
    bundle.add("limit.svg", limit_charts::limit(scenario, &report));
    bundle.add("limit.csv", limit_tables::limit(scenario, &asked, &report));
    let document = json::limit(scenario, &asked, &report);
    let case = report.beyond.as_ref().and_then(|beyond| beyond.case.as_ref());
    if let Some((_, instance)) = case {
        bundle.add(CASE, write_instance(instance, scenario));
    }
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        let options = options(&overrides(&arguments.draws));
        let file = folder.join(CASE).display().to_string();
        let called = called(input);
        let page = page(called.as_deref(), &options);
        say(&text::limit(scenario, &asked, &report, case.map(|_| file.as_str()), &page))?;
    }
    bundle.add("limit.json", document);
    write(&bundle, &folder, input.quiet || input.json)?;
    Ok(code(report.interrupted, arguments.strict && !report.easy_end_passes()))
}

fn two(arguments: &Limiting, scenario: &Scenario, across: &Search, up: &Search) -> Result<ExitCode, Failure> {
    let input = &arguments.input;
    let folder = folder(input, &arguments.folder)?;
    let (control, bar) = control(input.quiet, "limit");
    let report = limit::map(scenario, across, up, threads(arguments), &control)?;
    finish(bar);
    let asked = Asked::of(scenario);
    let mut bundle = Bundle::default();
    bundle.add("limit-map.svg", limit_map::svg(scenario, &report));
    bundle.add("limit-map.csv", limit_tables::limit_map(scenario, &asked, &report));
    let document = json::limit_map(scenario, &asked, &report);
    if input.json {
        say(&document)?;
    } else if !input.quiet {
        let called = called(input);
        say(&text::limit_map(
            scenario,
            &asked,
            &report,
            &page(called.as_deref(), &options(&overrides(&arguments.draws))),
        ))?;
    }
    bundle.add("limit-map.json", document);
    write(&bundle, &folder, input.quiet || input.json)?;
    let passing = report.count(limit::Outcome::Passes) > 0;
    Ok(code(report.interrupted(), arguments.strict && !passing))
}

fn code(interrupted: bool, bad: bool) -> ExitCode {
    ExitCode::from(if interrupted { INTERRUPTED } else { u8::from(bad) })
}

fn threads(arguments: &Limiting) -> usize {
    arguments.threads.map_or(0, usize::from)
}

/// What to vary, and how far.
fn search(
    words: &[String],
    ends: (&Option<String>, &Option<String>),
    options: (&str, &str),
    scenario: &Scenario,
) -> Result<Search, Failure> {
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let parameter = Parameter::named(&words, scenario)?;
    let end = |text: &Option<String>, option| text.as_deref().map(|it| signed(it, option, scenario)).transpose();
    Ok(Search { from: end(ends.0, options.0)?, to: end(ends.1, options.1)?, ..Search::of(parameter) })
}

/// A time that may be below zero, in fs.
fn signed(text: &str, option: &str, scenario: &Scenario) -> Result<i64, Failure> {
    let (negative, size) = match text.trim().strip_prefix('-') {
        Some(size) if !size.trim_start().starts_with('-') => (true, size),
        _ => (false, text),
    };
    let size = span(size, option, scenario)? as i64;
    Ok(if negative { -size } else { size })
}

/// A time, in fs; below 2^62.
fn span(text: &str, option: &str, scenario: &Scenario) -> Result<u64, Failure> {
    Span::parse(text, scenario.unit).map(Span::fs).map_err(|error| Failure::Bad(format!("`{option} {text}`: {error}")))
}
