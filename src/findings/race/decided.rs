//! Where a settled state was decided: a run compared with one that settles in another state.
//!
//! From a net that ends up different, the run in which it moves more often is followed back, cause by cause, to the first
//! change that the other run does not have: the gate of that change decided. In one run it answered; in the other its event
//! was cancelled, or its inputs came in another order.

use std::ops::Range;

use crate::circuit::{GateId, NetId};
use crate::engine::{Link, Lost, Site};
use crate::findings::causes::{Causes, Pin};
use crate::findings::paths::{Path, RacePair};
use crate::logic::Value;

/// One run, in the window that is looked at.
struct Side<'a> {
    run: &'a Causes<'a>,
    batches: Range<u32>,
}

/// A pair, and the batch in which it was decided in the failing run.
struct Found {
    pair: RacePair,
    batch: u32,
    in_loop: bool,
}

/// Where the state at the end of a window (of some nets, or the whole window) was decided.
pub(super) fn decided(
    failing: &Causes<'_>,
    other: Option<&Causes<'_>>,
    moment: u32,
    nets: Option<&[NetId]>,
) -> Option<RacePair> {
    let window = |run: &Causes<'_>| match nets {
        Some(nets) => run.window_of(moment, nets),
        None => run.window(moment),
    };
    let (at, batches) = window(failing)?;
    let here = Side { run: failing, batches };
    let there = other.and_then(|run| {
        let (other_at, batches) = window(run)?;
        let same = run.trace.windows[other_at].before == failing.trace.windows[at].before;
        same.then_some(Side { run, batches })
    });
    match there {
        Some(there) => compared(&here, &there),
        None => within(&here),
    }
}

/// By comparison with another run: of all nets that end up different the earliest decision, those of loops first.
fn compared(here: &Side<'_>, there: &Side<'_>) -> Option<RacePair> {
    let circuit = here.run.circuit;
    let differs = |net: &NetId| here.last_value(*net) != there.last_value(*net);
    let (loops, rest): (Vec<NetId>, Vec<NetId>) = circuit.nets().filter(differs).partition(|net| circuit.in_loop(*net));
    for nets in [loops, rest] {
        let mut found: Vec<Found> = Vec::new();
        for net in nets {
            let shared = here.shared(there, net);
            if let Some(extra) = here.change(net, shared) {
                found.extend(answered(here, there, here.root(there, extra)));
            }
            if let Some(missing) = there.change(net, shared) {
                found.extend(held(here, there, there.root(here, missing)));
            }
        }
        if let Some(first) = found.into_iter().min_by_key(|it| (it.batch, !it.in_loop)) {
            return Some(first.pair);
        }
    }
    None
}

/// With nothing to compare: if events were cancelled at one gate of a loop only, the first of those.
fn within(here: &Side<'_>) -> Option<RacePair> {
    let circuit = here.run.circuit;
    let of_a_loop = |lost: &&Lost| matches!(lost.event.site, Site::Gate(gate) if circuit.in_loop(circuit.net_of(gate)));
    let mut lost = here.run.lost(&here.batches).iter().filter(of_a_loop);
    let first = lost.next()?;
    if lost.any(|it| it.event.site != first.event.site) {
        return None;
    }
    let Site::Gate(gate) = first.event.site else { return None };
    Some(RacePair {
        first: here.run.path(here.run.ended_by(first)),
        second: Some(here.run.path_to_lost(first)),
        meet: Some(circuit.net_of(gate)),
    })
}

/// A gate answered here and not there: what made it answer won, and what held it or cancelled it there lost.
fn answered(here: &Side<'_>, there: &Side<'_>, root: u32) -> Option<Found> {
    let change = here.run.trace.changes[root as usize];
    let gate = here.run.circuit.driver(change.net)?;
    let nth = here.number(change.net, root)?;
    if let Some(lost) = there.lost(gate, nth, change.new) {
        let rival = there.run.ended_by(lost);
        let (second, meet) = here.told_of(there, rival, Link::Change(root))?;
        return Some(here.found(Link::Change(root), second, meet.unwrap_or(change.net)));
    }
    let (early, late) = inversion(here, there, gate, here.run.cause(root))?;
    let (won, lost) = (here.heard(early)?, there.heard(late)?);
    let (second, meet) = here.told_of(there, lost, won)?;
    Some(here.found(won, second, meet.unwrap_or(change.net)))
}

/// A gate answered there and was held or cancelled here: what did that won, and what would have made it answer lost.
fn held(here: &Side<'_>, there: &Side<'_>, root: u32) -> Option<Found> {
    let change = there.run.trace.changes[root as usize];
    let gate = there.run.circuit.driver(change.net)?;
    let nth = there.number(change.net, root)?;
    if let Some(lost) = here.lost(gate, nth, change.new) {
        let won = here.run.ended_by(lost);
        return Some(here.found(won, here.run.path_to_lost(lost), change.net));
    }
    let (early, late) = inversion(there, here, gate, there.run.cause(root))?;
    let (won, lost) = (here.heard(late)?, there.heard(early)?);
    let (second, meet) = here.told_of(there, lost, won)?;
    Some(here.found(won, second, meet.unwrap_or(change.net)))
}

/// The batch of what does not come.
const NEVER: u32 = u32::MAX;

/// Something that a gate hears: the nth change at one of its pins.
type Heard = (Pin, usize);

/// `cause` made a gate answer in `a`, and in `b` it did not: two changes at different pins, of which in `a` the first had
/// come by then and the second had not, while in `b` the second came no later than the first. With the second come early
/// the gate would not have answered.
fn inversion(a: &Side<'_>, b: &Side<'_>, gate: GateId, cause: Link) -> Option<(Heard, Heard)> {
    let run = a.run;
    let batch = run.batch(cause);
    if !a.batches.contains(&batch) {
        // it was on its way before the window began
        return None;
    }
    let count = |pin: Pin| run.heard(pin, &(a.batches.start..batch + 1)).len();
    let when = |it: Heard| b.heard(it).map_or(NEVER, |link| b.run.batch(link));
    let answer = run.function(gate, |pin| run.at_pin(pin, batch + 1))?;
    let cause_net = run.net(cause);
    let mut best: Option<(bool, u32, (Heard, Heard))> = None;
    for late in run.pins(gate) {
        let late: Heard = (late, count(late));
        let came = when(late);
        if came == NEVER {
            continue;
        }
        let value = b.heard(late).and_then(|link| b.run.value(link))?;
        let swapped = run.function(gate, |pin| if pin == late.0 { value } else { run.at_pin(pin, batch + 1) })?;
        if swapped == answer {
            continue;
        }
        for early in run.pins(gate).filter(|pin| *pin != late.0) {
            let Some(nth) = count(early).checked_sub(1) else { continue };
            let early: Heard = (early, nth);
            if came <= when(early) {
                let key = (Some(early.0.net) != cause_net, came);
                if best.as_ref().is_none_or(|best| key < (best.0, best.1)) {
                    best = Some((key.0, key.1, (early, late)));
                }
            }
        }
    }
    best.map(|it| it.2)
}

impl Side<'_> {
    fn last_value(&self, net: NetId) -> Value {
        self.run.at_pin(Pin { net, wire: None }, self.batches.end)
    }

    /// Changes of a net in the window that both runs have, from its beginning on.
    fn shared(&self, other: &Side<'_>, net: NetId) -> usize {
        let values = |side: &Side<'_>| -> Vec<Value> {
            let changes = side.run.changes(net, &side.batches);
            changes.iter().map(|i| side.run.trace.changes[*i as usize].new).collect()
        };
        values(self).iter().zip(&values(other)).take_while(|(a, b)| a == b).count()
    }

    /// The nth change of a net in the window.
    fn change(&self, net: NetId, nth: usize) -> Option<u32> {
        self.run.changes(net, &self.batches).get(nth).copied()
    }

    /// Which of its net's changes in the window this is; `None` before the window.
    fn number(&self, net: NetId, change: u32) -> Option<usize> {
        self.run.changes(net, &self.batches).iter().position(|it| *it == change)
    }

    fn heard(&self, (pin, nth): Heard) -> Option<Link> {
        self.run.heard(pin, &self.batches).get(nth).copied()
    }

    /// Going back from a change that `other` does not have, cause by cause: the last such change.
    fn root(&self, other: &Side<'_>, change: u32) -> u32 {
        let mut root = change;
        let mut link = Link::Change(change);
        while let Some(before) = self.run.before(link) {
            if let (Link::Change(i), Some(net)) = (before, self.run.net(before)) {
                match self.number(net, i) {
                    Some(nth) if nth >= self.shared(other, net) => root = i,
                    _ => break,
                }
            }
            link = before;
        }
        root
    }

    /// The first event of a gate that was cancelled when it would have been its nth change in the window.
    fn lost(&self, gate: GateId, nth: usize, new: Value) -> Option<&Lost> {
        let net = self.run.circuit.net_of(gate);
        let changes = self.run.changes(net, &self.batches);
        // it belongs after the change before it, and the net has none of that number by then
        let by_then = |batch: u32| changes.partition_point(|i| self.run.batch(Link::Change(*i)) <= batch);
        let mut all = self.run.lost(&self.batches).iter();
        all.find(|lost| lost.event.site == Site::Gate(gate) && lost.event.new == new && by_then(lost.batch) == nth)
    }

    /// What here corresponds to something that came in `other`, if it is too late for `won`: the same change, an event that
    /// was cancelled, or, if it was never on its way, the last on the way to it that is still to come. With it the net at
    /// whose gate its way ends, where that is not its end; `None` unless that gate hears of `won`, since something else
    /// must then have stopped it.
    fn told_of(&self, other: &Side<'_>, link: Link, won: Link) -> Option<(Path, Option<NetId>)> {
        let (mut link, mut meet) = (link, None);
        let circuit = self.run.circuit;
        let hears = |net: NetId| {
            let mut sources = circuit.driver(net).into_iter().flat_map(|gate| circuit.sources(gate));
            sources.any(|source| Some(source.0) == self.run.net(won))
        };
        loop {
            if let Some(ours) = self.counterpart(other, link) {
                let late = self.run.batch(ours) >= self.run.batch(won) && meet.is_none_or(hears);
                return late.then(|| (self.run.path(ours), meet));
            }
            if let Link::Change(i) = link {
                let change = other.run.trace.changes[i as usize];
                let nth = other.number(change.net, i)?;
                if let Some(lost) = self.lost(circuit.driver(change.net)?, nth, change.new) {
                    // on its way to something else it met what cancelled it
                    let meet = meet.map(|_| change.net);
                    let late = lost.event.due >= self.run.time(won) && meet.is_none_or(hears);
                    return late.then(|| (self.run.path_to_lost(lost), meet));
                }
                meet = Some(change.net);
            }
            link = other.run.before(link)?;
        }
    }

    /// The same change, or arrival of the same change, in this run.
    fn counterpart(&self, other: &Side<'_>, link: Link) -> Option<Link> {
        match link {
            Link::Start => Some(Link::Start),
            Link::Change(i) => {
                let change = other.run.trace.changes[i as usize];
                let nth = other.number(change.net, i)?;
                (nth < self.shared(other, change.net)).then(|| self.change(change.net, nth).map(Link::Change))?
            }
            Link::Arrival(i) => {
                let arrival = other.run.trace.arrivals[i as usize];
                let pin = Pin { net: other.run.net(link)?, wire: Some(arrival.wire) };
                let Some(Link::Change(ours)) = self.counterpart(other, Link::Change(arrival.cause?)) else {
                    return None;
                };
                let carries = |link: &Link| match link {
                    Link::Arrival(i) => self.run.trace.arrivals[*i as usize].cause == Some(ours),
                    _ => false,
                };
                self.run.heard(pin, &self.batches).into_iter().find(carries)
            }
        }
    }

    fn found(&self, won: Link, second: Path, meet: NetId) -> Found {
        let pair = RacePair { first: self.run.path(won), second: Some(second), meet: Some(meet) };
        Found { pair, batch: self.run.batch(won), in_loop: self.run.circuit.in_loop(meet) }
    }
}
