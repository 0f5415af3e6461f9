//! What is asked of settled states by a reference, by trying everything: all states of the reference, every order of its
//! gates, every completion of an unknown value.

use std::collections::BTreeSet;

use stillgate::circuit::{Circuit, NetId};
use stillgate::engine::End;
use stillgate::findings::{Kind, Question, Reason};
use stillgate::logic::{Bits, Value};
use stillgate::statics::Change;

use super::{Answer, Slow};
use crate::support::explorer::{Delays, Explorer};
use crate::support::recorder::RecordedWindow;
use crate::support::world::stable_states;

/// What may follow, as far as it is known.
#[derive(Default)]
struct Follows {
    known: BTreeSet<Vec<bool>>,
    all_known: bool,
}

impl Slow<'_> {
    pub(super) fn reference(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        // the moment that names the window speaks for all of that instant
        if window.moment != moment {
            return;
        }
        let answer = if window.end != End::Settled {
            Answer::Not(self.why(window))
        } else if window.state.contains(&Value::X) {
            Answer::Not(Reason::Unresolved)
        } else {
            self.against_reference(window)
        };
        if matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::NotInReference, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    fn against_reference(&self, window: &RecordedWindow) -> Answer {
        let judged = |broken| Answer::Judged { broken, slack: None };
        let (reached, inputs) = (self.compared(&window.state), self.inputs(&window.state));
        let rests: BTreeSet<Vec<bool>> = self.stable(&inputs).iter().map(|state| self.shown(state)).collect();
        if !rests.contains(&reached) {
            return judged(true);
        }
        if !window.began_at_rest || self.scenario.begin_window() == Some(window.moment) {
            return judged(false);
        }
        if window.opening.state.contains(&Value::X) {
            return Answer::Not(Reason::Unresolved);
        }
        let follows = self.follows(window);
        match (follows.known.contains(&reached), follows.all_known) {
            (true, _) => judged(false),
            (false, true) => judged(true),
            (false, false) => Answer::Not(Reason::GaveUp),
        }
    }

    /// Everything that may follow from any stable state of the reference that looks like the state before.
    fn follows(&self, window: &RecordedWindow) -> Follows {
        let before = &window.opening.state;
        let (old, new) = (self.inputs(before), self.inputs(&window.state));
        let starts = self.stable(&old).into_iter().filter(|state| self.shown(state) == self.compared(before));
        let circuit = &self.scenario.reference.as_ref().expect("a reference").circuit;
        let (restless, apart) = self.how(window);
        let mut follows = Follows { all_known: true, ..Follows::default() };
        for start in starts {
            let set: Vec<(NetId, bool)> = circuit
                .inputs()
                .filter(|net| old[net.index()] != new[net.index()])
                .map(|net| (net, new[net.index()]))
                .collect();
            if set.is_empty() && restless.is_empty() {
                follows.known.insert(self.shown(&start));
            } else if restless.is_empty() {
                let explored = Explorer::new(circuit, Delays::Gates).explore(&start, &Change { set, apart });
                follows.known.extend(explored.stable.iter().map(|state| self.shown(state)));
            } else {
                match ternary(circuit, &start, &new, &restless) {
                    Some(state) => _ = follows.known.insert(self.shown(&state)),
                    None => follows.all_known = false,
                }
            }
        }
        follows
    }

    /// The inputs that move to and fro, and else whether they change one after the other.
    fn how(&self, window: &RecordedWindow) -> (BTreeSet<NetId>, bool) {
        let steps: Vec<_> = window.opening.moments.iter().filter_map(|moment| self.step_of(*moment)).collect();
        let skew = steps.iter().any(|step| step.skew.is_some_and(|skew| skew.min != skew.max));
        let all: Vec<NetId> = steps.iter().flat_map(|step| &step.set).map(|(net, _)| *net).collect();
        let different: BTreeSet<NetId> = all.iter().copied().collect();
        let bounces = steps.iter().any(|step| step.bounce.as_ref().is_some_and(|bounce| bounce.pulses.1 > 0));
        match bounces || (skew && different.len() < all.len()) {
            true => (different, true),
            false => (BTreeSet::new(), skew),
        }
    }

    fn inputs(&self, state: &[Value]) -> Vec<bool> {
        let inputs = self.scenario.circuit.inputs();
        inputs.map(|net| state[net.index()].known().expect("inputs are known")).collect()
    }

    /// The compared nets of the circuit.
    fn compared(&self, state: &[Value]) -> Vec<bool> {
        let reference = self.scenario.reference.as_ref().expect("a reference");
        reference.compare.iter().map(|(net, _)| state[net.index()].known().expect("known")).collect()
    }

    /// The compared nets of the reference.
    fn shown(&self, state: &[bool]) -> Vec<bool> {
        let reference = self.scenario.reference.as_ref().expect("a reference");
        reference.compare.iter().map(|(_, net)| state[net.0.index()]).collect()
    }

    fn stable(&self, inputs: &[bool]) -> Vec<Vec<bool>> {
        let circuit = &self.scenario.reference.as_ref().expect("a reference").circuit;
        let values = |state: Bits| circuit.nets().map(|net| state.get(net.index())).collect();
        stable_states(circuit, inputs).into_iter().map(values).collect()
    }
}

/// Ternary simulation (Eichelberger 1965) by its definition, gates in the order of their nets: first every value only
/// loses what is known of it, then it takes what its gate gives. The state, if all of it is known.
fn ternary(circuit: &Circuit, start: &[bool], new: &[bool], restless: &BTreeSet<NetId>) -> Option<Vec<bool>> {
    let mut state: Vec<Option<bool>> = start.iter().map(|bit| Some(*bit)).collect();
    for net in circuit.inputs() {
        if start[net.index()] != new[net.index()] || restless.contains(&net) {
            state[net.index()] = None;
        }
    }
    for recedes in [false, true] {
        if recedes {
            new.iter().enumerate().for_each(|(input, bit)| state[input] = Some(*bit));
        }
        loop {
            let before = state.clone();
            for gate in circuit.gates() {
                let net = circuit.net_of(gate).index();
                let given = completed(circuit, gate, &state);
                state[net] = if recedes || state[net] == given { given } else { None };
            }
            if state == before {
                break;
            }
        }
    }
    state.into_iter().collect()
}

/// What a gate gives, if every completion of the unknown values gives it.
fn completed(circuit: &Circuit, gate: stillgate::circuit::GateId, state: &[Option<bool>]) -> Option<bool> {
    let pins = circuit.pins(gate);
    let unknown: Vec<NetId> = pins.iter().copied().filter(|net| state[net.index()].is_none()).collect();
    let mut given = BTreeSet::new();
    for number in 0..1u32 << unknown.len() {
        let value = |net: &NetId| {
            let place = unknown.iter().position(|it| it == net);
            state[net.index()].unwrap_or_else(|| number >> place.expect("unknown") & 1 == 1)
        };
        given.insert(circuit.function(gate).value(&pins.iter().map(value).collect::<Vec<_>>()));
    }
    if given.len() == 1 { given.pop_first() } else { None }
}
