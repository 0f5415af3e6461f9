//! One run: waves, windows, what was found.

use serde::Serialize;

use super::parts::{Departed, Exact, Level, Lines, Measured, Object, OneLine, state};
use super::races::Race;
use crate::engine::End;
use crate::findings::Asked;
use crate::instance::Firings;
use crate::output::words;
use crate::review::RunReport;
use crate::scenario::Scenario;
use crate::time::Time;

#[derive(Serialize)]
pub(super) struct Run<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    format: Option<u32>,
    delays: String,
    firings: Option<&'static str>,
    events: u64,
    waves: Object<&'a str, OneLine<Vec<(Exact, Level)>>>,
    windows: Vec<Window<'a>>,
    facts: Lines<Found<'a>>,
    judged: u64,
    not_judged: Lines<Unjudged<'a>>,
    never_came: Option<&'a str>,
}

#[derive(Serialize)]
struct Window<'a> {
    step: Option<&'a str>,
    start: Exact,
    stop: Exact,
    end: &'static str,
    settling_time: Option<Exact>,
    state: Option<OneLine<Object<&'a str, Level>>>,
    period: Option<Exact>,
    period_range: Option<OneLine<(Exact, Exact)>>,
    moving: OneLine<Object<&'a str, u32>>,
    limit: Option<&'static str>,
    began_at_rest: bool,
}

#[derive(Serialize)]
struct Unjudged<'a> {
    rule: &'static str,
    name: Option<&'a str>,
    net: Option<&'a str>,
    step: Option<&'a str>,
    reason: &'static str,
}

#[derive(Serialize)]
struct Found<'a> {
    kind: &'static str,
    shape: Option<&'static str>,
    rule: bool,
    rule_name: Option<&'a str>,
    pattern: Option<String>,
    net: Option<&'a str>,
    step: Option<&'a str>,
    worst: Option<Measured>,
    place: Option<(Exact, Exact)>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reference: Option<Departed<'a>>,
    race: Option<Race<'a>>,
}

impl<'a> Run<'a> {
    pub fn of(scenario: &'a Scenario, asked: &'a Asked, run: &'a RunReport, format: Option<u32>) -> Run<'a> {
        let (circuit, unit, trace) = (&*scenario.circuit, scenario.unit, &run.trace);
        let waves = circuit.nets().zip(trace.by_net(circuit.net_count())).map(|(net, changes)| {
            let first = (Time::ZERO, trace.start.get(net.index()));
            let entries = std::iter::once(first).chain(changes);
            let wave = entries.map(|(at, value)| (Exact::time(at, unit), Level(value))).collect();
            (circuit.name(net), OneLine(wave))
        });
        let window = |window: &'a crate::engine::Window| {
            let (period, range) = match window.end {
                End::Oscillating { period, range } => (Some(period), range),
                _ => (None, None),
            };
            let span = |span| Exact::span(span, unit);
            Window {
                step: words::step(scenario, Some(window.moment)),
                start: Exact::time(window.start, unit),
                stop: Exact::time(window.stop, unit),
                end: window.end.word(),
                settling_time: window.settling.map(span),
                state: (window.end == End::Settled).then(|| state(circuit, &window.state)),
                period: period.map(span),
                period_range: range.map(|(least, greatest)| OneLine((span(least), span(greatest)))),
                moving: OneLine(Object(window.moving.iter().map(|(net, n)| (circuit.name(*net), *n)).collect())),
                limit: match window.end {
                    End::Unsettled(hit) => Some(hit.words()),
                    _ => None,
                },
                began_at_rest: window.began_at_rest,
            }
        };
        let fact = |fact: &'a crate::findings::Fact| {
            let named = words::subject(scenario, asked, &fact.subject);
            Found {
                kind: named.kind,
                shape: named.shape,
                rule: fact.breaks_rule,
                rule_name: named.rule_name,
                pattern: named.pattern,
                net: named.net,
                step: named.step,
                worst: words::worst_of(fact).map(|worst| Measured::of(worst, unit)),
                place: fact.place.map(|(from, to)| (Exact::time(from, unit), Exact::time(to, unit))),
                reference: run.against(fact).map(|it| Departed::of(scenario, it)),
                race: run.race(scenario, asked, fact).map(|pair| Race::of(scenario, &pair)),
            }
        };
        let unjudged = |(number, reason): &(u32, crate::findings::Reason)| {
            let question = asked.questions.get(*number as usize)?;
            Some(Unjudged {
                rule: question.rule.word(),
                name: question.name.as_deref(),
                net: question.net.map(|net| circuit.name(net)),
                step: words::step(scenario, question.moment),
                reason: reason.words(),
            })
        };
        Run {
            format,
            delays: run.which.key(),
            firings: run.instance.firings.as_ref().map(|firings| match firings {
                Firings::Drawn(_) => "drawn",
                Firings::Given(_) => "given",
            }),
            events: trace.events,
            waves: Object(waves.collect()),
            windows: trace.windows.iter().map(window).collect(),
            facts: Lines(run.facts.iter().map(fact).collect()),
            judged: run.judged,
            not_judged: Lines(run.not_judged.iter().filter_map(unjudged).collect()),
            never_came: words::step(scenario, trace.never_came),
        }
    }
}

/// The document of `run`. `stop` of a window is where it ended, `end` how.
pub fn run(scenario: &Scenario, asked: &Asked, report: &RunReport) -> String {
    super::document(&Run::of(scenario, asked, report, Some(super::FORMAT)))
}
