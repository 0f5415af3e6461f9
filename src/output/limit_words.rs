//! What the search for a limit found, in words.

use crate::findings::Asked;
use crate::limit::{Breach, Cause, Easy, LimitReport, Outcome, Parameter};
use crate::output::text::about;
use crate::output::words;
use crate::scenario::Scenario;
use crate::time::Decimal;

/// A value of a parameter, exact, with its unit.
pub(super) fn value(scenario: &Scenario, fs: i64) -> String {
    format!("{} {}", Decimal::new(i128::from(fs), scenario.unit), scenario.unit)
}

/// A number of femtoseconds, exact, with its unit.
pub(super) fn length(scenario: &Scenario, fs: u64) -> String {
    format!("{} {}", Decimal::new(i128::from(fs), scenario.unit), scenario.unit)
}

/// What is best of a parameter: `shortest`, `longest`.
pub(super) const fn best(parameter: Parameter) -> &'static str {
    match parameter.easy() {
        Easy::Long => "shortest",
        Easy::Short => "longest",
    }
}

/// What kept a value from passing, without how often.
pub(super) fn cause(scenario: &Scenario, asked: &Asked, breach: &Breach) -> String {
    let what = match breach.cause {
        Cause::Broken { subject, others } => {
            let more = match others {
                0 => String::new(),
                n => format!(" (and {})", words::many(n as u64, "more finding")),
            };
            about(scenario, asked, &subject) + &more
        }
        Cause::NotJudged { question, reason } => {
            let why = reason.map_or("never put to the test", |reason| reason.words());
            format!("{} not judged: {why}", self::question(scenario, asked, question))
        }
        Cause::Unsettled { moment, hit } => {
            let step = words::step(scenario, Some(moment)).map(words::the_step).unwrap_or_default();
            let limit = hit.map_or_else(String::new, |hit| format!(" before the limit {}", hit.words()));
            format!("{step} did not settle{limit}")
        }
    };
    match breach.condition.and_then(|number| scenario.conditions.get(number)) {
        Some(condition) => format!("{what}, condition {}", condition.name),
        None => what,
    }
}

/// A question: rule, name or net or pattern, step.
pub(super) fn question(scenario: &Scenario, asked: &Asked, number: u32) -> String {
    let Some(question) = asked.questions.get(number as usize) else { return String::new() };
    let mut text = question.rule.word().to_string();
    match (&question.name, question.net, &question.pattern) {
        (Some(name), _, _) => text += &format!(" \"{name}\""),
        (None, Some(net), _) => text += &format!(" {}", words::net(scenario, net)),
        (None, None, Some(pattern)) => text += &format!(" {}", pattern.words(&scenario.circuit)),
        (None, None, None) => {}
    }
    if let Some(step) = words::step(scenario, question.moment) {
        text += &format!(" after {}", words::the_step(step));
    }
    text
}

/// Out of how many draws, and whether all are alike.
pub(super) fn draws(scenario: &Scenario, samples: u64, alike: bool) -> String {
    if alike {
        return "All draws are alike: 1 run a value".to_string();
    }
    let (draws, draw) = (words::many(samples, "draw"), scenario.plan.draw.name());
    format!("Monte Carlo, {draws} a value ({draw}, seed {}), the same at every value", scenario.plan.seed)
}

/// The answer in one sentence.
pub(super) fn sentence(scenario: &Scenario, report: &LimitReport) -> String {
    let parameter = report.range.parameter;
    let words = parameter.words(scenario);
    let (from, to) = (report.range.legal.from, report.range.legal.to);
    let stretch = format!("from {} to {}", value(scenario, from), value(scenario, to));
    let of = if report.alike { String::new() } else { format!(" in {}", words::many(report.samples, "draw")) };
    let best = best(parameter);
    if let Some(limit) = report.limit {
        let more = if report.is_monotone() { "" } else { "; not monotone, see the stretches" };
        let (passes, fails) = (value(scenario, limit.passes), value(scenario, limit.fails));
        let outcome = outcome_at(report, limit.fails);
        return format!("{words}: {best} that passes{of}: {passes}; at {fails} {outcome}{more}");
    }
    match report.everywhere() {
        Some(true) => format!("{words}: passes everywhere {stretch}{of}: no rule depends on it there"),
        Some(false) => format!("{words}: passes nowhere {stretch}: even at the easy end it {}", at_easy(report)),
        None => format!(
            "{words}: no limit: at the easy end, {}, it {}; other values pass",
            value(scenario, report.range.easy_end()),
            at_easy(report)
        ),
    }
}

fn outcome_at(report: &LimitReport, fs: i64) -> String {
    let point = report.points.iter().find(|point| point.value == fs);
    match point.map(|point| point.outcome) {
        Some(Outcome::NotJudged) => "a rule is not judged".to_string(),
        Some(Outcome::Unsettled) => "it does not settle before a limit".to_string(),
        _ => "a rule is broken".to_string(),
    }
}

fn at_easy(report: &LimitReport) -> &'static str {
    let easy = report.range.easy_end();
    match report.points.iter().find(|point| point.value == easy).map(|point| point.outcome) {
        Some(Outcome::NotJudged) => "leaves a rule not judged",
        Some(Outcome::Unsettled) => "does not settle before a limit",
        None => "was not tried",
        _ => "breaks a rule",
    }
}
