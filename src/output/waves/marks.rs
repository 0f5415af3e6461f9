//! What is marked on top of waves: steps, how windows end, and findings.

use crate::circuit::NetId;
use crate::engine::{End, Window};
use crate::findings::{Asked, Fact, Kind};
use crate::output::words;
use crate::review::{RunReport, departure_words};
use crate::scenario::{MomentKind, Scenario};
use crate::sweep::Worst;
use crate::time::{Span, Time};

/// A step or a clock edge.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Step {
    pub at: Time,
    pub label: String,
    /// What it sets: `call_upper 0→1`.
    pub sets: String,
    /// An edge of a clock: the clock's lane shows it well enough.
    pub is_tick: bool,
}

impl Step {
    /// The whole of it, for a tooltip or a key.
    pub fn words(&self, scenario: &Scenario) -> String {
        let at = self.at.from_start().decimal(scenario.unit);
        let sets = if self.sets.is_empty() { String::new() } else { format!(": {}", self.sets) };
        format!("{} at {at} {}{sets}", self.label, scenario.unit)
    }
}

/// How a window ended.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Ending {
    pub at: Time,
    /// Rest is marked with a triangle, everything else with a bar.
    pub is_rest: bool,
    pub label: String,
    pub title: String,
}

/// A finding with a place.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Spot {
    pub net: Option<NetId>,
    pub from: Time,
    pub to: Time,
    pub label: String,
    pub title: String,
    pub breaks_rule: bool,
}

/// The steps of a run, in order.
pub(super) fn steps(scenario: &Scenario, run: &RunReport) -> Vec<Step> {
    let windows = &run.trace.windows;
    let mut values: Vec<_> = (0..scenario.circuit.input_count()).map(|input| run.trace.start.get(input)).collect();
    let mut changes = run.trace.changes.iter().filter(|change| scenario.circuit.is_input(change.net)).peekable();
    let mut steps = Vec::with_capacity(windows.len());
    for (i, window) in windows.iter().enumerate() {
        let before = values.clone();
        let shared = windows.get(i + 1).is_some_and(|next| next.start == window.start);
        let own = scenario.stimulus.moments.get(window.moment as usize).map(|it| scenario.stimulus.inputs_of(it));
        let is_own = |net: NetId| !shared || own.as_ref().is_some_and(|own| own.contains(&net));
        while let Some(change) = changes.next_if(|it| it.at <= window.settle_from && is_own(it.net)) {
            values[change.net.index()] = change.new;
        }
        let moved = before.iter().zip(&values).enumerate().filter(|(_, (old, new))| old != new);
        let sets: Vec<String> = moved
            .map(|(input, (old, new))| format!("{} {old}→{new}", words::net(scenario, NetId(input as u32))))
            .collect();
        let kind = scenario.stimulus.moments.get(window.moment as usize).map(|moment| moment.kind);
        steps.push(Step {
            at: window.start,
            label: words::step(scenario, Some(window.moment)).unwrap_or_default().to_string(),
            sets: sets.join(", "),
            is_tick: matches!(kind, Some(MomentKind::Edge { .. })),
        });
    }
    steps
}

/// How the windows of a run ended, in order. A window that nothing moved in is at rest at once; after a clock edge that
/// is not worth a mark.
pub(super) fn endings(scenario: &Scenario, run: &RunReport) -> Vec<Ending> {
    let idle_tick = |window: &Window| {
        let kind = scenario.stimulus.moments.get(window.moment as usize).map(|moment| moment.kind);
        matches!(kind, Some(MomentKind::Edge { .. })) && window.settling == Some(Span::ZERO)
    };
    run.trace.windows.iter().filter(|window| !idle_tick(window)).map(|window| ending(scenario, window)).collect()
}

fn ending(scenario: &Scenario, window: &Window) -> Ending {
    let unit = scenario.unit;
    let step = words::step(scenario, Some(window.moment)).unwrap_or_default();
    let exact = |span: Span| format!("{} {unit}", span.decimal(unit));
    let (at, label, more) = match (window.end, window.settling) {
        (End::Settled, settling) => {
            let settling = settling.unwrap_or_default();
            (window.settle_from + settling, settling.rounded(), format!("settled after {}", exact(settling)))
        }
        (End::Oscillating { period, range }, _) => {
            let about = if range.is_some() { "about " } else { "" };
            let label = format!("oscillating, period {about}{}", period.rounded());
            (window.stop, label, format!("oscillating with a period of {about}{}", exact(period)))
        }
        (End::Unsettled(hit), _) => {
            let label = format!("unsettled: {}", hit.words());
            (window.stop, label.clone(), label)
        }
        (End::Cut, _) => {
            let length = window.stop.since(window.start);
            (window.stop, "cut".to_string(), format!("cut before rest, after {}", exact(length)))
        }
    };
    Ending { at, is_rest: window.end == End::Settled, label, title: format!("{step}: {more}") }
}

/// Findings that have a place, by begin.
pub(super) fn spots(scenario: &Scenario, asked: &Asked, run: &RunReport) -> Vec<Spot> {
    let mut spots: Vec<Spot> = run.facts.iter().filter_map(|fact| spot(scenario, asked, run, fact)).collect();
    spots.sort_by_key(|spot| (spot.from, spot.to));
    spots
}

/// Where a finding lies; what is said of a state at rest lies from its step to the last change before that rest.
fn place(run: &RunReport, fact: &Fact) -> Option<(Time, Time)> {
    let at_rest = matches!(fact.subject.kind, Kind::Expect | Kind::NotInReference | Kind::Edges | Kind::NeverAtRest);
    let window = run.trace.windows.iter().find(|window| Some(window.moment) == fact.subject.moment);
    let settled = window.filter(|_| at_rest).map(|it| (it.start, it.settle_from + it.settling.unwrap_or_default()));
    fact.place.or(settled)
}

fn spot(scenario: &Scenario, asked: &Asked, run: &RunReport, fact: &Fact) -> Option<Spot> {
    let (from, to) = place(run, fact)?;
    let named = words::subject(scenario, asked, &fact.subject);
    let word = match (fact.subject.kind, named.rule_name) {
        (Kind::Glitch, _) => named.shape.unwrap_or(named.kind).to_string(),
        (_, Some(name)) => name.to_string(),
        (Kind::Expect, None) => format!("expected {}", named.pattern.as_deref().unwrap_or_default()),
        (Kind::Edges, None) => format!("expected {} transitions", named.pattern.as_deref().unwrap_or_default()),
        (Kind::NotInReference, None) => match run.against(fact) {
            Some(against) => format!("reference: {}", departure_words(scenario, against, false).allowed),
            None => named.kind.to_string(),
        },
        (kind, None) => kind.word().to_string(),
    };
    let value = match words::worst_of(fact) {
        Some(Worst::Time(period)) if fact.subject.kind == Kind::Oscillation => {
            Some(format!("period {}", period.rounded()))
        }
        Some(Worst::Time(span)) => Some(span.rounded()),
        Some(Worst::Endless) => Some("for ever".to_string()),
        Some(Worst::Share(share)) => Some(format!("{} of the delay", words::percent(share))),
        None if fact.subject.kind == Kind::Glitch && to > from => Some(to.since(from).rounded()),
        None => None,
    };
    let label = value.map_or(word.clone(), |value| format!("{word}, {value}"));
    let mut title = vec![named.kind.to_string()];
    title.extend(named.shape.map(String::from));
    title.extend(named.rule_name.map(|name| format!("“{name}”")));
    title.extend(named.pattern);
    title.extend(named.net.map(|net| format!("net {net}")));
    title.extend(named.step.map(words::the_step));
    let unit = scenario.unit;
    let time = |at: Time| at.from_start().decimal(unit);
    title.push(format!("from {} to {} {unit}", time(from), time(to)));
    title.push(if fact.breaks_rule { "breaks a rule" } else { "breaks no rule" }.to_string());
    Some(Spot { net: fact.subject.net, from, to, label, title: title.join(", "), breaks_rule: fact.breaks_rule })
}
