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
    let restless = Timeline::of(&scenario.stimulus).filter(|group| group.restless).map(|group| group.moment);
    let restless: FxHashSet<u32> = restless.collect();
    let mut found = Compared { states, beyond: Vec::new(), choices: Vec::new(), compared: 0, not_compared: 0 };
    let steps = table.steps.iter().enumerate().map(|(at, it)| (TransitionRef::Step(at as u32), it));
    let single = table.single.iter().enumerate().map(|(at, it)| (TransitionRef::Single(at as u32), it));
    for (name, transition) in steps.chain(single) {
        if control.cancelled() {
            return Err(FlowError::Cancelled);
        }
        let change = &transition.change;
        let coming = match (transition.moment.is_some_and(|moment| restless.contains(&moment)), change.apart) {
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
    // where it never comes to rest there is no end to compare
    if !exact || transition.to.states().is_empty() {
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
                let mut outcomes: Vec<Vec<bool>> = all.iter().map(|view| allowed.compared(view)).collect();
                outcomes.sort_unstable();
                found.choices.push(Choice { transition: name, outcomes });
            }
        }
    }
    match unknown {
        true => found.not_compared += 1,
        false => found.compared += 1,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::flow::{Flow, FlowState, flow};
    use crate::logic::Bits;
    use crate::reader;
    use crate::statics::{Change, Race};

    fn scenario(text: &str) -> Scenario {
        reader::read(text, "compared.toml").unwrap_or_else(|it| panic!("{}", it.render(false))).scenario
    }

    fn compare(text: &str) -> (Scenario, Flow, Compared) {
        let scenario = scenario(text);
        let flow = flow(&scenario, scenario.circuit.feedback(), &Control::default()).unwrap();
        let compared = flow.compared.clone().expect("there is a reference");
        (scenario, flow, compared)
    }

    /// Values of all nets of a state, and the change, of a transition of the table.
    fn told(flow: &Flow, transition: TransitionRef) -> (String, Vec<(u32, bool)>) {
        let it = match transition {
            TransitionRef::Step(at) => &flow.table.steps[at as usize],
            TransitionRef::Single(at) => &flow.table.single[at as usize],
        };
        let set = it.change.set.iter().map(|(net, bit)| (net.0, *bit)).collect();
        (letters(&flow.table.states[it.from as usize].values, 6), set)
    }

    fn letters(bits: &Bits, nets: usize) -> String {
        (0..nets).map(|net| if bits.get(net) { '1' } else { '0' }).collect()
    }

    /// A latch of two products without the term for the change between them, against an ideal one.
    const LATCH: &str = r#"
        outputs = ["kept"]
        [inputs]
        permit = 0
        key = 0
        [initial]
        kept = 0
        [gates]
        let_go = { not = ["key"] }
        taken = { and = ["key", "permit"] }
        held = { and = ["let_go", "kept"] }
        kept = { or = ["taken", "held"] }
        [[steps]]
        set = { permit = 1 }
        [[steps]]
        set = { key = 1 }
        [[steps]]
        set = { key = 0 }
        [reference]
        [reference.gates]
        kept = { expr = "key & permit | !key & kept" }
    "#;

    #[test]
    fn a_latch_without_its_consensus_term_goes_beyond_the_ideal_one() {
        let (_, flow, compared) = compare(LATCH);
        assert_eq!(compared.states, Contained::Proved, "it rests nowhere else");
        // only letting the key go, with the permit there, may lose it: nets are permit key let_go taken held kept
        let beyond: Vec<_> = compared.beyond.iter().map(|it| (told(&flow, it.transition), &it.allowed)).collect();
        let lost = (("110101".to_string(), vec![(1, false)]), &vec![vec![true]]);
        assert_eq!(beyond, [lost.clone(), lost], "as a step and as a single change");
        let reached = letters(&flow.table.states[compared.beyond[0].reached as usize].values, 6);
        assert_eq!(reached, "101000");
        assert_eq!(compared.choices, []);
        assert_eq!(compared.not_compared, 0);
        assert_eq!(compared.compared as usize, flow.table.steps.len() + flow.table.single.len());
    }

    #[test]
    fn the_cured_latch_stays_within() {
        let cured = LATCH.replace(r#"{ or = ["taken", "held"] }"#, r#"{ expr = "taken | held | permit & kept" }"#);
        let (_, _, compared) = compare(&cured);
        assert_eq!((compared.states, compared.beyond.len(), compared.not_compared), (Contained::Proved, 0, 0));
    }

    #[test]
    fn stable_states_that_the_reference_has_not_are_told_by_the_first() {
        let other = LATCH.replace("key & permit | !key & kept", "key & permit | !key & kept & permit");
        let (scenario, _, compared) = compare(&other);
        let net = |name: &str| scenario.circuit.net(name).unwrap();
        let first = vec![(net("permit"), false), (net("key"), false), (net("kept"), true)];
        assert_eq!(compared.states, Contained::Not(first));
    }

    #[test]
    fn a_choice_that_no_single_state_of_the_reference_offers() {
        // two gates race for p when a rises; the reference can do either, but which is settled beforehand
        let text = r#"
            outputs = ["p"]
            [inputs]
            a = 0
            [gates]
            na = { not = ["a"] }
            p = { nor = ["na", "q"] }
            q = { nor = ["na", "p"] }
            [[steps]]
            set = { a = 1 }
            [reference]
            [reference.gates]
            mode = { buf = ["mode"] }
            p = { and = ["a", "mode"] }
        "#;
        let (_, flow, compared) = compare(text);
        assert_eq!((compared.states, compared.beyond.len()), (Contained::Proved, 0));
        assert_eq!(compared.choices.len(), 2, "the step, and the same single change: {:?}", compared.choices);
        assert_eq!(compared.choices[0].transition, TransitionRef::Step(0));
        for choice in &compared.choices {
            assert_eq!(choice.outcomes, [[false], [true]]);
            assert_eq!(told(&flow, choice.transition).1, [(0, true)]);
        }
        // an arbiter as the reference has the same choice in one state
        let arbiter = text.replace(r#"mode = { buf = ["mode"] }"#, r#"mode = { expr = "a & !p" }"#);
        let arbiter = arbiter.replace(r#"p = { and = ["a", "mode"] }"#, r#"p = { expr = "a & !mode" }"#);
        assert_eq!(compare(&arbiter).2.choices, []);
    }

    #[test]
    fn what_never_rests_is_not_compared() {
        let ring = r#"
            [inputs]
            on = 0
            [gates]
            ring = { nand = ["on", "ring"] }
            [[steps]]
            set = { on = 1 }
            [reference]
            [reference.gates]
            ring = { not = ["on"] }
        "#;
        let (_, _, compared) = compare(ring);
        assert_eq!((compared.compared, compared.not_compared), (0, 2), "the step, and the same single change");
    }

    #[test]
    fn what_is_only_bounded_is_not_compared() {
        let scenario = scenario(LATCH);
        let allowed = Allowed::of(scenario.reference.clone().unwrap(), &Control::default());
        let state = |letters: &str| FlowState {
            values: Bits::of(letters.chars().map(|it| it == '1').collect::<Vec<_>>().into_iter()),
            reachable: true,
            explored: true,
        };
        let mut unknown = crate::logic::State::known(state("101000").values);
        unknown.set(5, crate::logic::Value::X);
        let transition = |to| Transition {
            moment: None,
            from: 0,
            change: Change { set: vec![(NetId(1), false)], apart: false },
            to,
            essential: None,
            sure: true,
        };
        let table = FlowTable {
            states: vec![state("110101"), state("101000"), state("101011")],
            single: vec![
                transition(Reached::Bound { state: unknown, states: vec![1, 2], truncated: false }),
                transition(Reached::Exact { states: vec![2], cycles: 0, race: Race::None }),
            ],
            ..FlowTable::default()
        };
        let found = compared(&scenario, &allowed, &table, &Control::default()).unwrap();
        assert_eq!((found.compared, found.not_compared, found.beyond.len()), (1, 1, 0));
        // a decision diagram of two nodes is not enough for the stable states
        let poor = Control { nodes: 2, ..Control::default() };
        assert_eq!(compared(&scenario, &allowed, &table, &poor).unwrap().states, Contained::GaveUp);
        let control = Control::default();
        control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        assert_eq!(compared(&scenario, &allowed, &table, &control), Err(FlowError::Cancelled));
    }
}
