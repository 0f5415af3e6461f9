//! What may follow a change, with stable states by number: each asked for once, and checked.
//!
//! The multiple-winner method (general multiple winner, Brzozowski and Seger) holds for inertial gates, without wires
//! that have delays of their own, and for inputs that change once. In all other cases, and where it takes more than its
//! budget, the outcome is the bound of ternary simulation (Eichelberger 1965), which holds for any filter, for wires and
//! for contacts that bounce.

use rustc_hash::FxHashMap;

use super::follow::{contradiction, winners_are_valid};
use super::{FlowError, Reached, StateNumber};
use crate::circuit::{Circuit, NetId};
use crate::control::Control;
use crate::logic::{Bits, State, Value};
use crate::scenario::Scenario;
use crate::statics::{
    Change, GaveUp, Next, Outcome, bound, bound_restless, fundamental, outcome_of_many, stable_states, ternary,
};

/// Most nodes of the decision diagram that lists the stable states that agree with a bound.
const NODES: usize = 1 << 13;
/// Most that the multiple-winner method may take for one outcome, in evaluations of gates and firings.
const EFFORT_OF_ONE: usize = 1 << 20;

/// Stable states by number, and what may follow each change that was asked for.
pub(super) struct Outcomes<'a> {
    circuit: &'a Circuit,
    control: &'a Control,
    /// Does the multiple-winner method hold for this circuit?
    exact: bool,
    /// Most stable states listed for one bound.
    agreeing: usize,
    pub states: Vec<Bits>,
    numbers: FxHashMap<Bits, StateNumber>,
    asked: FxHashMap<Question, u32>,
    found: Vec<Found>,
    /// What follows the change of an input where only the feedback nets take time.
    nexts: FxHashMap<(Bits, NetId), Next>,
    /// Values of nets computed so far, about: a measure of the work done.
    pub work: usize,
    /// What is left for the multiple-winner method, in evaluations of gates and firings.
    effort: usize,
    /// Outcomes for which that was not enough.
    pub too_much: usize,
}

/// From which state, the inputs that move, and whether they bounce.
type Question = (StateNumber, Change, bool);

/// What follows, and what ternary simulation says of it.
struct Found {
    to: Reached,
    bound: State,
}

/// The number of an answer.
#[derive(Clone, Copy)]
pub(super) struct Answer(u32);

impl Found {
    fn rests(&self) -> bool {
        match &self.to {
            Reached::Exact { cycles, .. } => *cycles == 0,
            Reached::Bound { .. } => self.to.only().is_some(),
        }
    }
}

impl<'a> Outcomes<'a> {
    pub fn of(scenario: &'a Scenario, agreeing: usize, effort: usize, control: &'a Control) -> Outcomes<'a> {
        let circuit = &*scenario.circuit;
        Outcomes {
            circuit,
            control,
            exact: winners_are_valid(scenario),
            agreeing,
            states: Vec::new(),
            numbers: FxHashMap::default(),
            asked: FxHashMap::default(),
            found: Vec::new(),
            nexts: FxHashMap::default(),
            work: 0,
            effort,
            too_much: 0,
        }
    }

    /// The number of a stable state; a new one is added.
    pub fn number(&mut self, state: Bits) -> StateNumber {
        let next = self.states.len() as StateNumber;
        *self.numbers.entry(state).or_insert_with_key(|state| {
            self.states.push(state.clone());
            next
        })
    }

    /// Finds out what may follow a change.
    pub fn after(&mut self, from: StateNumber, change: &Change, restless: bool) -> Result<Answer, FlowError> {
        let asked = self.question(from, change, restless);
        if let Some(at) = self.asked.get(&asked) {
            return Ok(Answer(*at));
        }
        let found = self.find(from, &asked.1, restless)?;
        let at = self.found.len() as u32;
        self.found.push(found);
        self.asked.insert(asked, at);
        Ok(Answer(at))
    }

    /// What may follow.
    pub fn reached(&self, answer: Answer) -> &Reached {
        &self.found[answer.0 as usize].to
    }

    /// Does the circuit surely rest in one of the states that are listed?
    pub fn rests(&self, answer: Answer) -> bool {
        self.found[answer.0 as usize].rests()
    }

    /// What is known of the circuit afterwards.
    pub fn known(&self, answer: Answer) -> State {
        let found = &self.found[answer.0 as usize];
        match found.to.only() {
            Some(state) => State::known(self.states[state as usize].clone()),
            None => found.bound.clone(),
        }
    }

    /// Of a change only what moves counts; one input alone cannot come apart.
    fn question(&self, from: StateNumber, change: &Change, restless: bool) -> Question {
        let set: Vec<(NetId, bool)> = change.moving(&self.states[from as usize]).collect();
        let apart = change.apart && set.len() > 1;
        // contacts that have moved already may bounce all the same
        if restless {
            return (from, change.clone(), true);
        }
        (from, Change { set, apart }, false)
    }

    fn find(&mut self, from: StateNumber, change: &Change, restless: bool) -> Result<Found, FlowError> {
        let before = &self.states[from as usize];
        self.work += self.circuit.net_count();
        let (outcome, bound) = if restless || !self.exact {
            let bound = match restless {
                true => bound_restless(self.circuit, before, change).1,
                false => bound(self.circuit, before, change).1,
            };
            (Outcome::Bound(bound.clone()), bound)
        } else {
            let mut left = self.effort.min(EFFORT_OF_ONE);
            let given = left;
            let found = outcome_of_many(self.circuit, before, change, &mut left, self.control)
                .map_err(|_: GaveUp| FlowError::Cancelled)?;
            self.effort -= given - left;
            self.too_much += usize::from(matches!(found.0, Outcome::Bound(_)));
            found
        };
        if let Some(what) = contradiction(self.circuit, &outcome, &bound) {
            return Err(self.contradiction(from, change, &what));
        }
        let to = match outcome {
            Outcome::Exact { states, cycles, race } => {
                let mut states: Vec<StateNumber> = states.into_iter().map(|state| self.number(state)).collect();
                states.sort_unstable();
                Reached::Exact { states, cycles, race }
            }
            Outcome::Bound(state) => {
                let (states, truncated) = self.agreeing(&state)?;
                if states.is_empty() && !state.has_unknown() {
                    return Err(self.contradiction(
                        from,
                        change,
                        "ternary simulation ends in a state that is not stable",
                    ));
                }
                Reached::Bound { state, states, truncated }
            }
        };
        Ok(Found { to, bound })
    }

    /// The stable states that agree with a state whose inputs are known, ascending, and whether there may be more.
    pub fn agreeing(&mut self, known: &State) -> Result<(Vec<StateNumber>, bool), FlowError> {
        let nodes = if self.control.nodes == 0 { NODES } else { self.control.nodes.min(NODES) };
        let control = Control { nodes, ..self.control.clone() };
        match stable_states(self.circuit, known, self.agreeing, &control) {
            Ok((states, more)) => {
                self.work += (1 + states.len()) * self.circuit.net_count();
                let mut states: Vec<StateNumber> = states.into_iter().map(|state| self.number(state)).collect();
                states.sort_unstable();
                Ok((states, more))
            }
            Err(GaveUp::Budget { nodes }) => {
                self.work += nodes + self.circuit.net_count();
                Ok((Vec::new(), true))
            }
            Err(GaveUp::Cancelled) => Err(FlowError::Cancelled),
        }
    }

    /// What is known after a change from a state of which only part may be known: see [`crate::statics::bound`].
    pub fn spread(&mut self, known: &State, change: &Change, restless: bool) -> State {
        self.work += self.circuit.net_count();
        let mut state = known.clone();
        for (net, bit) in &change.set {
            if restless || state.get(net.index()).known() != Some(*bit) {
                state.set(net.index(), Value::X);
            }
        }
        ternary::spread(self.circuit, &mut state);
        for (net, bit) in &change.set {
            state.set(net.index(), (*bit).into());
        }
        ternary::settle(self.circuit, &mut state);
        state
    }

    /// Two methods contradict each other: a defect of the program.
    pub fn contradiction(&self, from: StateNumber, change: &Change, what: &str) -> FlowError {
        let list = |values: &mut dyn Iterator<Item = (NetId, bool)>| {
            let all: Vec<String> =
                values.map(|(net, bit)| format!("{} = {}", self.circuit.name(net), u8::from(bit))).collect();
            all.join(", ")
        };
        let state = &self.states[from as usize];
        let nets = self.circuit.inputs().chain(self.circuit.feedback().iter().copied());
        let before = list(&mut nets.map(|net| (net, state.get(net.index()))));
        let after = list(&mut change.set.iter().copied());
        FlowError::Contradiction(format!("from the stable state {{ {before} }}, after {{ {after} }}: {what}"))
    }

    /// Unger's test for an essential hazard (Unger 1959) in the flow table in which only the feedback nets take time: does
    /// one change of the input lead to another state than three, there, back and there again? Outcomes that are not unique
    /// have none. `None` where that takes more than its effort.
    pub fn essential(&mut self, from: StateNumber, input: NetId) -> Result<Option<bool>, FlowError> {
        let mut at = self.states[from as usize].clone();
        let mut first = None;
        for _ in 0..3 {
            at = match self.next(at, input)? {
                Next::One(state) => state,
                Next::Several => return Ok(Some(false)),
                Next::Unknown => return Ok(None),
            };
            first.get_or_insert_with(|| at.clone());
        }
        Ok(Some(first != Some(at)))
    }

    /// What follows the change of one input where only the feedback nets take time.
    fn next(&mut self, from: Bits, input: NetId) -> Result<Next, FlowError> {
        let asked = (from, input);
        if let Some(known) = self.nexts.get(&asked) {
            return Ok(known.clone());
        }
        let change = Change::of_one(&asked.0, input);
        let mut left = self.effort.min(EFFORT_OF_ONE);
        let given = left;
        let next = fundamental(self.circuit, &asked.0, &change, &mut left, self.control)
            .map_err(|_: GaveUp| FlowError::Cancelled)?;
        self.effort -= given - left;
        self.nexts.insert(asked, next.clone());
        Ok(next)
    }
}
