//! Pairs that lie between two edges of one run: pulses, partial states, distances, swallowed pulses.

use crate::circuit::NetId;
use crate::engine::{Link, Lost, Site};
use crate::findings::asked::Pattern;
use crate::findings::causes::Causes;
use crate::findings::paths::RacePair;
use crate::findings::words::{Fact, Measure, Subject};
use crate::logic::Value;
use crate::scenario::{Alternative, EdgeSpec};
use crate::time::{Span, Time};

/// The two edges of a pulse.
pub(super) fn pulse(run: &Causes<'_>, net: NetId, (from, to): (Time, Time)) -> Option<RacePair> {
    let all = run.changes(net, &(0..run.trace.batches));
    let at = |i: usize| run.time(Link::Change(all[i]));
    // at one instant there may be several: the last begins it, the first after that ends it
    let first = (0..all.len()).rfind(|i| at(*i) <= from && (*i + 1..all.len()).any(|j| at(j) == to))?;
    let second = (first + 1..all.len()).find(|i| at(*i) == to).filter(|_| at(first) == from)?;
    let path = |i: usize| run.path(Link::Change(all[i]));
    Some(RacePair::of_a_pulse(path(first), path(second)))
}

/// Too many transitions: the edges of the narrowest pulse. Too few: the pulse that the net's gate swallowed, or else the only
/// one that any gate before it did.
pub(super) fn count(run: &Causes<'_>, pattern: &Pattern, subject: &Subject) -> Option<RacePair> {
    let Pattern::Count(wanted) = pattern else { return None };
    let net = wanted.net;
    let (_, batches) = run.window_of(subject.moment?, &[net])?;
    let changes = run.changes(net, &batches);
    if changes.len() as u64 > u64::from(wanted.most) {
        let width = |pair: &[u32]| run.time(Link::Change(pair[1])).since(run.time(Link::Change(pair[0])));
        let narrowest = changes.windows(2).min_by_key(|pair| width(pair))?;
        return Some(RacePair::of_a_pulse(run.path(Link::Change(narrowest[0])), run.path(Link::Change(narrowest[1]))));
    }
    let pulses: Vec<&Lost> = run.lost(&batches).iter().filter(|lost| lost.event.since < lost.event.at).collect();
    let own = pulses.iter().filter(|lost| is_at(run, lost, net)).max_by_key(|lost| share(lost));
    let cone = run.circuit.cone(&[net]);
    let before = |lost: &&&Lost| matches!(lost.event.site, Site::Gate(gate) if cone.contains(run.circuit.net_of(gate)));
    let mut before = pulses.iter().filter(before);
    let only = before.next().filter(|_| before.next().is_none());
    own.or(only).map(|lost| swallow(run, lost))
}

/// A partial state that shows from one instant to another: what made it true, and what ended it. Where it lasts: what made
/// it true, and what came before it of its other nets.
pub(super) fn never(run: &Causes<'_>, pattern: &Pattern, (since, until): (Time, Time)) -> Option<RacePair> {
    let Pattern::State(state) = pattern else { return None };
    let came = |at: Time| last(run, state, |net, bit| run.change_at(net, at, Some(Value::from(bit))));
    let came = came(since)?;
    let came_net = run.net(came);
    let batch = run.batch(came);
    let left = |net: NetId, bit: bool| {
        let change = run.change_at(net, until, None)?;
        (run.batch(change) > batch && run.value(change) != Some(Value::from(bit))).then_some(change)
    };
    // of several that end it at once rather another net than the one that began it
    let others = || state.iter().filter(|it| Some(it.0) != came_net);
    let ended = others().find_map(|(net, bit)| left(*net, *bit));
    let ended = ended.or_else(|| state.iter().find_map(|(net, bit)| left(*net, *bit)));
    let before = || {
        let changes = others().filter_map(|(net, _)| run.changes(*net, &(0..batch + 1)).last());
        changes.max_by_key(|i| run.batch(Link::Change(**i))).map(|i| Link::Change(*i))
    };
    let second = ended.or_else(before)?;
    let (first, second) = (run.path(came), run.path(second));
    Some(match ended.is_none() {
        true => RacePair::compared(second, first),
        false => RacePair::compared(first, second),
    })
}

/// The change that came last, of one for each net.
fn last(run: &Causes<'_>, state: &Alternative, change: impl Fn(NetId, bool) -> Option<Link>) -> Option<Link> {
    let changes = state.iter().filter_map(|(net, bit)| change(*net, *bit));
    changes.reduce(|best, it| if run.batch(it) > run.batch(best) { it } else { best })
}

/// From edge and to edge. Where the second never came: the event that was cancelled, if there was one.
pub(super) fn timing(run: &Causes<'_>, pattern: &Pattern, fact: &Fact) -> Option<RacePair> {
    let Pattern::Edges(from, to) = pattern else { return None };
    let (start, end) = fact.place?;
    let first = edge(run, from, start)?;
    let second = match edge(run, to, end).filter(|_| fact.measure != Some(Measure::ENDLESS)) {
        Some(second) if second != first => run.path(second),
        _ => {
            let edge = |value: Value| value.known().is_some_and(|value| to.edge.is(value));
            let mut lost = run.lost(&(run.batch(first)..run.trace.batches)).iter();
            run.path_to_lost(lost.find(|lost| is_at(run, lost, to.net) && edge(lost.event.new))?)
        }
    };
    Some(RacePair::compared(run.path(first), second))
}

fn edge(run: &Causes<'_>, spec: &EdgeSpec, at: Time) -> Option<Link> {
    let bits = [false, true].into_iter().filter(|bit| spec.edge.is(*bit));
    let edges = bits.filter_map(|bit| run.change_at(spec.net, at, Some(Value::from(bit))));
    edges.max_by_key(|link| run.batch(*link))
}

/// The late path.
pub(super) fn settle(run: &Causes<'_>, net: NetId, (_, last): (Time, Time)) -> Option<RacePair> {
    run.change_at(net, last, None).map(|late| RacePair::single(run.path(late)))
}

/// Of the pulses that a gate swallowed in the window of a moment the one nearest to passing: what scheduled the event, and
/// what cancelled it.
pub(super) fn swallowed(run: &Causes<'_>, net: NetId, moment: u32) -> Option<RacePair> {
    let (_, batches) = run.window(moment)?;
    let pulses = run.lost(&batches).iter().filter(|lost| is_at(run, lost, net) && lost.event.since < lost.event.at);
    // of equally near ones the first
    let nearest = pulses.reduce(|best, it| if share(it) > share(best) { it } else { best })?;
    Some(swallow(run, nearest))
}

fn swallow(run: &Causes<'_>, lost: &Lost) -> RacePair {
    let meet = match lost.event.site {
        Site::Gate(gate) => Some(run.circuit.net_of(gate)),
        Site::Wire(_) => None,
    };
    RacePair { first: run.path_to_lost(lost), second: Some(run.path(run.ended_by(lost))), meet }
}

fn is_at(run: &Causes<'_>, lost: &Lost, net: NetId) -> bool {
    matches!(lost.event.site, Site::Gate(gate) if run.circuit.net_of(gate) == net)
}

/// How near an event came to happening.
fn share(lost: &Lost) -> Measure {
    let age = |to: Time| -> Span { to.since(lost.event.since) };
    Measure::share(age(lost.event.at), age(lost.event.due))
}
