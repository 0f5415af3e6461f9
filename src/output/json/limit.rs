//! The search for a limit.

use serde::Serialize;

use super::parts::{Exact, Lines, OneLine};
use crate::findings::Asked;
use crate::limit::{Breach, Cause, LimitReport, MapReport, Point, Range, model};
use crate::output::limit_words;
use crate::output::words::{self, six};
use crate::scenario::Scenario;

#[derive(Serialize)]
struct Limit<'a> {
    format: u32,
    unit: &'static str,
    model: String,
    parameter: Varied<'a>,
    samples: u64,
    seed: u64,
    draw: &'static str,
    alike: bool,
    within: Exact,
    scan: Exact,
    limit: Option<OneLine<Edge>>,
    monotone: bool,
    easy_end_passes: bool,
    beyond: Option<Beyond<'a>>,
    stretches: Lines<Stretch>,
    boundaries: Lines<Edge>,
    boundaries_not_followed: usize,
    points: Lines<Value<'a>>,
    open: Lines<Open>,
    interrupted: bool,
}

#[derive(Serialize)]
struct Map<'a> {
    format: u32,
    unit: &'static str,
    model: String,
    across: Varied<'a>,
    up: Varied<'a>,
    samples: u64,
    seed: u64,
    draw: &'static str,
    alike: bool,
    rows: Vec<Row<'a>>,
    open: Lines<Open>,
    interrupted: bool,
}

#[derive(Serialize)]
struct Row<'a> {
    up: Exact,
    cells: Lines<Option<Value<'a>>>,
}

#[derive(Serialize)]
struct Varied<'a> {
    kind: &'static str,
    words: String,
    easy_end: Exact,
    from: Exact,
    to: Exact,
    asked_from: Exact,
    asked_to: Exact,
    given: bool,
    cut_below: Option<&'a str>,
    cut_above: Option<&'a str>,
}

#[derive(Serialize)]
struct Edge {
    passes: Exact,
    fails: Exact,
}

#[derive(Serialize)]
struct Stretch {
    from: Exact,
    to: Exact,
    passes: bool,
}

#[derive(Serialize)]
struct Open {
    question: String,
    judged: u64,
}

#[derive(Serialize)]
struct Beyond<'a> {
    value: Exact,
    outcome: &'static str,
    breach: Option<OneLine<Broke<'a>>>,
    sample: Option<u64>,
}

#[derive(Serialize)]
struct Value<'a> {
    value: Exact,
    outcome: &'static str,
    failing: u64,
    at_least: bool,
    not_judged: u64,
    of: u64,
    share: Option<f64>,
    interval: Option<[f64; 2]>,
    breach: Option<Broke<'a>>,
    refused: Option<&'a str>,
}

#[derive(Serialize)]
struct Broke<'a> {
    kind: &'static str,
    rule_name: Option<&'a str>,
    pattern: Option<String>,
    net: Option<&'a str>,
    step: Option<&'a str>,
    reason: Option<&'static str>,
    condition: Option<&'a str>,
    count: u64,
    more: usize,
}

/// The document of `limit` for one parameter.
pub fn limit(scenario: &Scenario, asked: &Asked, report: &LimitReport) -> String {
    let exact = |fs: i64| Exact::signed(i128::from(fs), scenario.unit);
    let length = |fs: u64| Exact::signed(i128::from(fs), scenario.unit);
    let edge = |it: &crate::limit::Boundary| Edge { passes: exact(it.passes), fails: exact(it.fails) };
    let stretch = |it: &crate::limit::Stretch| Stretch { from: exact(it.from), to: exact(it.to), passes: it.passes };
    super::document(&Limit {
        format: super::FORMAT,
        unit: scenario.unit.name(),
        model: model(scenario),
        parameter: varied(scenario, &report.range),
        samples: report.samples,
        seed: scenario.plan.seed,
        draw: scenario.plan.draw.name(),
        alike: report.alike,
        within: length(report.within),
        scan: length(report.scan),
        limit: report.limit.as_ref().map(|it| OneLine(edge(it))),
        monotone: report.is_monotone(),
        easy_end_passes: report.easy_end_passes(),
        beyond: report.beyond.as_ref().map(|beyond| Beyond {
            value: exact(beyond.point.value),
            outcome: beyond.point.outcome.words(),
            breach: beyond.point.breach.as_ref().map(|it| OneLine(broke(scenario, asked, it))),
            sample: beyond.case.as_ref().map(|case| case.0),
        }),
        stretches: Lines(report.stretches.iter().map(stretch).collect()),
        boundaries: Lines(report.boundaries.iter().map(edge).collect()),
        boundaries_not_followed: report.not_followed,
        points: Lines(report.points.iter().map(|point| tried(scenario, asked, point)).collect()),
        open: open(scenario, asked, &report.open),
        interrupted: report.interrupted,
    })
}

/// The document of `limit` for two parameters.
pub fn limit_map(scenario: &Scenario, asked: &Asked, report: &MapReport) -> String {
    let mut rows = Vec::with_capacity(report.cells.len());
    for (up, cells) in report.up.1.iter().zip(&report.cells) {
        let each = cells.iter().zip(&report.across.1).map(|(cell, across)| {
            let across = Exact::signed(i128::from(*across), scenario.unit);
            cell.as_ref().map(|point| Value { value: across, ..tried(scenario, asked, point) })
        });
        rows.push(Row { up: Exact::signed(i128::from(*up), scenario.unit), cells: Lines(each.collect()) });
    }
    super::document(&Map {
        format: super::FORMAT,
        unit: scenario.unit.name(),
        model: model(scenario),
        across: varied(scenario, &report.across.0),
        up: varied(scenario, &report.up.0),
        samples: report.samples,
        seed: scenario.plan.seed,
        draw: scenario.plan.draw.name(),
        alike: report.alike,
        rows,
        open: open(scenario, asked, &report.open),
        interrupted: report.interrupted(),
    })
}

fn varied<'a>(scenario: &Scenario, range: &'a Range) -> Varied<'a> {
    let exact = |fs: i64| Exact::signed(i128::from(fs), scenario.unit);
    Varied {
        kind: range.parameter.kind(),
        words: range.parameter.words(scenario),
        easy_end: exact(range.easy_end()),
        from: exact(range.legal.from),
        to: exact(range.legal.to),
        asked_from: exact(range.asked.0),
        asked_to: exact(range.asked.1),
        given: range.given,
        cut_below: range.legal.below.as_deref(),
        cut_above: range.legal.above.as_deref(),
    }
}

fn open(scenario: &Scenario, asked: &Asked, open: &[(u32, u64)]) -> Lines<Open> {
    let each = open.iter().map(|(question, judged)| Open {
        question: limit_words::question(scenario, asked, *question),
        judged: *judged,
    });
    Lines(each.collect())
}

fn tried<'a>(scenario: &'a Scenario, asked: &'a Asked, point: &'a Point) -> Value<'a> {
    let was_run = point.refused.is_none();
    Value {
        value: Exact::signed(i128::from(point.value), scenario.unit),
        outcome: point.outcome.words(),
        failing: point.failing,
        at_least: point.at_least,
        not_judged: point.not_judged,
        of: if was_run { point.of } else { 0 },
        share: was_run.then(|| six(point.share())),
        interval: point.interval.map(|(low, high)| [six(low), six(high)]),
        breach: point.breach.as_ref().map(|breach| broke(scenario, asked, breach)),
        refused: point.refused.as_deref(),
    }
}

fn broke<'a>(scenario: &'a Scenario, asked: &'a Asked, breach: &Breach) -> Broke<'a> {
    let condition = breach.condition.and_then(|it| scenario.conditions.get(it)).map(|it| it.name.as_str());
    let blank = Broke {
        kind: "unsettled",
        rule_name: None,
        pattern: None,
        net: None,
        step: None,
        reason: None,
        condition,
        count: breach.count,
        more: 0,
    };
    match breach.cause {
        Cause::Broken { subject, others } => {
            let named = words::subject(scenario, asked, &subject);
            Broke {
                kind: named.kind,
                rule_name: named.rule_name,
                pattern: named.pattern,
                net: named.net,
                step: named.step,
                more: others,
                ..blank
            }
        }
        Cause::NotJudged { question, reason } => {
            let Some(question) = asked.questions.get(question as usize) else { return blank };
            Broke {
                kind: question.rule.word(),
                rule_name: question.name.as_deref(),
                pattern: question.pattern.as_ref().map(|it| it.words(&scenario.circuit)),
                net: question.net.map(|net| words::net(scenario, net)),
                step: words::step(scenario, question.moment),
                reason: Some(reason.map_or("never put to the test", |it| it.words())),
                ..blank
            }
        }
        Cause::Unsettled { moment, hit } => {
            Broke { step: words::step(scenario, Some(moment)), reason: hit.map(|it| it.words()), ..blank }
        }
    }
}
