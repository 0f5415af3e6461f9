//! The implementation against the reference, without delays: its stable states, and the transitions of its flow table.

use std::collections::BTreeSet;

use rustc_hash::FxHashSet;

use super::reference::{Allowed, Answer, Coming, Passed, View};
use super::{
    Beyond, Choice, Compared, Contained, FlowError, FlowTable, Reached, StateNumber, Timeline, Transition,
    TransitionRef,
};
use crate::circuit::{Circuit, NetId};
use crate::control::Control;
use crate::scenario::Scenario;
use crate::statics::{GaveUp, StateSet};

/// Compares a circuit, with the flow table made of it, with the reference that `allowed` asks.
///
/// Errors: only [`FlowError::Cancelled`]; what a budget cuts is said in the result.
pub fn compared(
    scenario: &Scenario,
    allowed: &Allowed,
    table: &FlowTable,
    control: &Control,
) -> Result<Compared, FlowError> {
    let states = match contained(&scenario.circuit, allowed, control) {
        Ok(states) => states,
        Err(GaveUp::Budget { .. }) => Contained::GaveUp,
        Err(GaveUp::Cancelled) => return Err(FlowError::Cancelled),
    };
    let bounced = Timeline::of(&scenario.stimulus).filter(|group| group.bounced).map(|group| group.moment);
    let bounced: FxHashSet<u32> = bounced.collect();
    let mut found = Compared { states, beyond: Vec::new(), choices: Vec::new(), compared: 0, not_compared: 0 };
    let steps = table.steps.iter().enumerate().map(|(at, it)| (TransitionRef::Step(at as u32), it));
    let single = table.single.iter().enumerate().map(|(at, it)| (TransitionRef::Single(at as u32), it));
    for (name, transition) in steps.chain(single) {
        if control.cancelled() {
            return Err(FlowError::Cancelled);
        }
        let change = &transition.change;
        let coming = match (transition.moment.is_some_and(|moment| bounced.contains(&moment)), change.apart) {
            (true, _) => Coming::Restless(change.set.iter().map(|(net, _)| *net).collect()),
            (false, true) => Coming::Apart,
            (false, false) => Coming::Together,
        };
        follow(allowed, table, name, transition, &coming, &mut found);
    }
    Ok(found)
}

/// Is every stable state of the circuit, as far as inputs and compared nets show it, one of the reference?
fn contained(circuit: &Circuit, allowed: &Allowed, control: &Control) -> Result<Contained, GaveUp> {
    let reference = allowed.reference();
    let mut pairs: Vec<(NetId, NetId)> = circuit.inputs().map(|net| (net, net)).collect();
    for (ours, theirs) in &reference.compare {
        if !pairs.contains(&(*ours, theirs.0)) {
            pairs.push((*ours, theirs.0));
        }
    }
    let (ours, theirs): (Vec<NetId>, Vec<NetId>) = pairs.into_iter().unzip();
    let ours = StateSet::of(circuit, control)?.project(&ours)?;
    let theirs = StateSet::of(&reference.circuit, control)?.project(&theirs)?;
    Ok(match ours.beyond(&theirs, control)? {
        None => Contained::Proved,
        Some(values) => Contained::Not(ours.nets().iter().copied().zip(values).collect()),
    })
}

/// Compares one transition.
fn follow(
    allowed: &Allowed,
    table: &FlowTable,
    name: TransitionRef,
    transition: &Transition,
    coming: &Coming,
    found: &mut Compared,
) {
    let state = |number: StateNumber| &table.states[number as usize].values;
    let exact = matches!(transition.to, Reached::Exact { .. }) || transition.to.only().is_some();
    if !exact {
        found.not_compared += 1;
        return;
    }
    let before = allowed.view(state(transition.from));
    let (mut beyond, mut unknown) = (false, false);
    let mut views: BTreeSet<View> = BTreeSet::new();
    for reached in transition.to.states() {
        let after = allowed.view(state(*reached));
        let passed = Passed { before: Some(&before), coming, after: &after };
        match allowed.answer(&passed) {
            Answer::Allowed => {}
            Answer::GaveUp => unknown = true,
            Answer::NotAllowed => {
                beyond = true;
                let allowed = allowed.list(&passed).values;
                found.beyond.push(Beyond { transition: name, reached: *reached, allowed });
            }
        }
        views.insert(after);
    }
    if !beyond && !unknown && views.len() > 1 {
        let all: Vec<View> = views.into_iter().collect();
        match allowed.offers(&before, coming, &all) {
            Some(true) => {}
            None => unknown = true,
            Some(false) => {
                let outcomes = all.iter().map(|view| allowed.compared(view)).collect();
                found.choices.push(Choice { transition: name, outcomes });
            }
        }
    }
    match unknown {
        true => found.not_compared += 1,
        false => found.compared += 1,
    }
}
