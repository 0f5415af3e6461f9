//! One run: waves, windows, what was found.

use serde::Serialize;

use super::parts::{Departed, Exact, Level, Lines, Measured, Object, OneLine, state};
use super::races::Race;
use crate::engine::{Change, End, Trace};
use crate::findings::Asked;
use crate::instance::Firings;
use crate::output::words;
use crate::review::RunReport;
use crate::scenario::Scenario;
use crate::time::Time;

/// Most transitions that `waves` lists.
const MOST_TRANSITIONS: usize = 1 << 17;
/// Most windows, findings and questions that were not judged that are listed, each.
const MOST_LISTED: usize = 10_000;
/// Most values of nets that windows list.
const MOST_VALUES: usize = 1 << 20;

#[derive(Serialize)]
pub(super) struct Run<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    format: Option<u32>,
    delays: String,
    firings: Option<&'static str>,
    events: u64,
    transitions: u64,
    waves: Object<&'a str, OneLine<Vec<(Exact, Level)>>>,
    /// the last instant whose transitions are listed; null if all are
    waves_until: Option<Exact>,
    waves_truncated: bool,
    windows: Vec<Window<'a>>,
    windows_truncated: bool,
    facts: Lines<Found<'a>>,
    facts_truncated: bool,
    judged: u64,
    not_judged: Lines<Unjudged<'a>>,
    not_judged_truncated: bool,
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
        let (listed, until) = beginning(trace);
        let mut waves: Vec<_> = circuit
            .nets()
            .map(|net| {
                let first = (Exact::time(Time::ZERO, unit), Level(trace.start.get(net.index())));
                (circuit.name(net), OneLine(vec![first]))
            })
            .collect();
        for change in listed {
            waves[change.net.index()].1.0.push((Exact::time(change.at, unit), Level(change.new)));
        }
        let most_windows = MOST_LISTED.min(MOST_VALUES / circuit.net_count().max(1)).max(1);
        let later = trace.cut.map_or((0, 0), |cut| (cut.transitions, cut.windows));
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
        let races = run.races(scenario, asked);
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
                race: races.pair(fact, None).map(|pair| Race::of(scenario, &pair)),
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
            transitions: trace.changes.len() as u64 + later.0,
            waves: Object(waves),
            waves_until: until.map(|until| Exact::time(until, unit)),
            waves_truncated: until.is_some(),
            windows: trace.windows.iter().take(most_windows).map(window).collect(),
            windows_truncated: trace.windows.len() > most_windows || later.1 > 0,
            facts: Lines(run.facts.iter().take(MOST_LISTED).map(fact).collect()),
            facts_truncated: run.facts.len() > MOST_LISTED,
            judged: run.judged,
            not_judged: Lines(run.not_judged.iter().take(MOST_LISTED).filter_map(unjudged).collect()),
            not_judged_truncated: run.not_judged.len() > MOST_LISTED,
            never_came: words::step(scenario, trace.never_came),
        }
    }
}

/// The first transitions of a run, whole instants of them; and the last of these instants, if there are later ones.
fn beginning(trace: &Trace) -> (&[Change], Option<Time>) {
    let whole = trace.changes.get(MOST_TRANSITIONS).map(|first| trace.changes.partition_point(|it| it.at < first.at));
    let listed = &trace.changes[..whole.unwrap_or(trace.changes.len())];
    let last = || listed.last().map_or(Time::ZERO, |change| change.at);
    (listed, whole.map(|_| last()).or(trace.cut.map(|cut| cut.after)))
}

/// The document of `run`. `stop` of a window is where it ended, `end` how.
pub fn run(scenario: &Scenario, asked: &Asked, report: &RunReport) -> String {
    super::document(&Run::of(scenario, asked, report, Some(super::FORMAT)))
}
