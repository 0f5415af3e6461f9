//! Building the flow table: the steps of the scenario first, then single-input changes, then what cannot be reached.

use std::collections::BTreeSet;

use num_bigint::BigUint;

use super::outcomes::Outcomes;
use super::timeline::{Group, Timeline, notes};
use super::{FlowError, FlowState, FlowTable, Reached, StateNumber, Transition};
use crate::circuit::Circuit;
use crate::control::Control;
use crate::logic::{State, Value};
use crate::scenario::{Begin, Scenario, Walk as Steps};
use crate::statics::{Change, GaveUp, NoRest, StateSet, rest, ternary};

/// Where the table is cut. Steps may take up half of everything.
#[derive(Clone, Copy, Debug)]
pub(super) struct Limits {
    /// Most transitions, steps and single-input changes together.
    pub transitions: usize,
    /// Most values of nets that are computed, about.
    pub values: usize,
    /// What the multiple-winner method may take in all, in evaluations of gates and firings.
    pub effort: usize,
    /// Most stable states listed for one ternary bound, and for one input vector.
    pub agreeing: usize,
    /// Most input vectors looked at for states that cannot be reached.
    pub vectors: u64,
    /// Most nodes of the decision diagram that finds states that cannot be reached.
    pub nodes: usize,
}

impl Default for Limits {
    fn default() -> Limits {
        Limits { transitions: 1 << 13, values: 1 << 22, effort: 1 << 24, agreeing: 64, vectors: 1024, nodes: 1 << 18 }
    }
}

impl Limits {
    /// The limits for a scenario: a walk over every change was laid out over a whole table, so its steps take room beside
    /// that table.
    pub fn of(scenario: &Scenario) -> Limits {
        let limits = Limits::default();
        match scenario.stimulus.walk {
            Steps::LaidOut => Limits { transitions: 4 * limits.transitions, values: 4 * limits.values, ..limits },
            Steps::Written | Steps::ToLayOut { .. } => limits,
        }
    }
}

/// The flow table of a scenario; what a limit cuts is said in it.
pub(super) fn table(scenario: &Scenario, limits: Limits, control: &Control) -> Result<FlowTable, FlowError> {
    let nets = scenario.circuit.net_count().max(1);
    let mut limits = limits;
    // in large circuits a list of states is as much work as many transitions
    limits.agreeing = limits.agreeing.min((limits.values / 64 / nets).max(2));
    let mut making = Making {
        scenario,
        circuit: &scenario.circuit,
        control,
        limits,
        outcomes: Outcomes::of(scenario, limits.agreeing, limits.effort, control),
        table: FlowTable { notes: notes(scenario), ..FlowTable::default() },
        explored: 0,
    };
    let walk = making.start()?;
    making.steps(walk)?;
    let mut complete = making.explore()?;
    let reachable = making.outcomes.states.len();
    if complete {
        complete = making.others()?;
        complete &= making.explore()?;
    }
    making.finish(reachable, complete)
}

struct Making<'a> {
    scenario: &'a Scenario,
    circuit: &'a Circuit,
    control: &'a Control,
    limits: Limits,
    outcomes: Outcomes<'a>,
    table: FlowTable,
    /// The states up to this number have their single-input changes in the table.
    explored: usize,
}

/// Where a run may be between two steps.
struct Walk {
    /// The stable states in which it may rest, ascending.
    at: Vec<StateNumber>,
    /// Does it surely rest in one of these?
    rests: bool,
    /// What is sure of it: known everywhere if there is just one way.
    known: State,
}

impl Walk {
    fn is_sure(&self) -> bool {
        !self.known.has_unknown()
    }
}

impl Making<'_> {
    /// The states in which a run may begin.
    fn start(&mut self) -> Result<Walk, FlowError> {
        let initial = &self.scenario.stimulus.initial;
        let mut known = State::zeros(self.circuit.net_count());
        for net in self.circuit.nets() {
            known.set(net.index(), initial.get(net.index()).map_or(Value::X, |bit| Value::from(*bit)));
        }
        ternary::settle(self.circuit, &mut known);
        let mut walk = Walk { at: Vec::new(), rests: false, known };
        match &self.scenario.begin {
            Begin::AtRest { named } => match rest(self.circuit, initial, named, self.control) {
                Ok(state) => {
                    walk.known = State::known(state.clone());
                    walk.at = vec![self.outcomes.number(state)];
                    walk.rests = true;
                }
                Err(NoRest::GaveUp(GaveUp::Cancelled)) => return Err(FlowError::Cancelled),
                Err(reason) => {
                    let note = format!("this view has no state to start from: {reason}");
                    self.table.notes.push(note);
                    self.table.states_truncated |= matches!(reason, NoRest::GaveUp(_));
                }
            },
            Begin::Random | Begin::Unknown => {
                let truncated;
                (walk.at, truncated) = self.outcomes.agreeing(&walk.known)?;
                self.table.states_truncated |= truncated;
                self.table.steps_truncated |= truncated;
            }
        }
        self.table.start = walk.at.clone();
        Ok(walk)
    }

    /// The steps in their typical order, from every state in which they can find the circuit.
    fn steps(&mut self, mut walk: Walk) -> Result<(), FlowError> {
        let most = Limits { transitions: self.limits.transitions / 2, values: self.limits.values / 2, ..self.limits };
        let mut lost = false;
        // a step that meets no state takes its time, too
        let mut taken = 0;
        for group in Timeline::of(&self.scenario.stimulus) {
            if self.control.cancelled() {
                return Err(FlowError::Cancelled);
            }
            taken += walk.at.len().max(1);
            if taken > most.transitions || self.outcomes.work >= most.values {
                self.table.steps_truncated = true;
                break;
            }
            if walk.at.is_empty() && !lost {
                lost = true;
                let label = &self.scenario.stimulus.moments[group.moment as usize].label;
                self.table.notes.push(format!(
                    "no stable state is known that \"{label}\" could meet: it and later steps are left out until one leads to \
                     a known state"
                ));
            }
            walk = self.step(walk, &group)?;
        }
        Ok(())
    }

    fn step(&mut self, walk: Walk, group: &Group) -> Result<Walk, FlowError> {
        let mut next = BTreeSet::new();
        let mut rests = walk.rests;
        let mut known = None;
        for from in &walk.at {
            let answer = self.outcomes.after(*from, &group.change, group.restless)?;
            let to = self.outcomes.reached(answer).clone();
            rests &= self.outcomes.rests(answer);
            if walk.is_sure() {
                known = Some(self.outcomes.known(answer));
            }
            self.table.steps_truncated |= matches!(to, Reached::Bound { truncated: true, .. });
            next.extend(to.states().iter().copied());
            self.table.steps.push(Transition {
                moment: Some(group.moment),
                from: *from,
                change: group.change.clone(),
                to,
                essential: None,
                sure: walk.is_sure(),
            });
        }
        let mut known = known.unwrap_or_else(|| self.outcomes.spread(&walk.known, &group.change, group.restless));
        let mut at: Vec<StateNumber> = next.into_iter().collect();
        if !known.has_unknown() {
            let state = self.outcomes.number(known.ones.clone());
            if at.iter().any(|other| *other != state) {
                let what = "ternary simulation from all that may be leads to another state";
                return Err(self.outcomes.contradiction(walk.at[0], &group.change, what));
            }
            at = vec![state];
            rests = true;
        } else if rests && let [state] = at[..] {
            known = State::known(self.outcomes.states[state as usize].clone());
        }
        Ok(Walk { at, rests, known })
    }

    /// Single-input changes of all states by number, those included that are found on the way. Did the limits leave room?
    fn explore(&mut self) -> Result<bool, FlowError> {
        let inputs = self.circuit.input_count();
        while self.explored < self.outcomes.states.len() {
            if self.control.cancelled() {
                return Err(FlowError::Cancelled);
            }
            let taken = self.table.steps.len() + self.table.single.len();
            let work = self.outcomes.work + inputs * self.circuit.net_count();
            if taken + inputs > self.limits.transitions || work > self.limits.values {
                return Ok(false);
            }
            let from = self.explored as StateNumber;
            for input in self.circuit.inputs() {
                let change = Change::of_one(&self.outcomes.states[self.explored], input);
                let to = self.outcomes.after(from, &change, false)?;
                let to = self.outcomes.reached(to).clone();
                self.table.states_truncated |= matches!(to, Reached::Bound { truncated: true, .. });
                self.table.single.push(Transition { moment: None, from, change, to, essential: None, sure: true });
            }
            self.explored += 1;
        }
        Ok(true)
    }

    /// Adds the stable states that were not found so far, by input vector. Are they all?
    fn others(&mut self) -> Result<bool, FlowError> {
        let nodes = if self.control.nodes == 0 { self.limits.nodes } else { self.control.nodes.min(self.limits.nodes) };
        let control = Control { nodes, ..self.control.clone() };
        let set = match StateSet::of(self.circuit, &control) {
            Ok(set) => set,
            Err(GaveUp::Budget { .. }) => return Ok(false),
            Err(GaveUp::Cancelled) => return Err(FlowError::Cancelled),
        };
        let count = set.count();
        let found = |outcomes: &Outcomes<'_>| BigUint::from(outcomes.states.len());
        if found(&self.outcomes) > count {
            return Err(FlowError::Contradiction(format!(
                "the flow table has {} stable states, the state set has {count}",
                self.outcomes.states.len()
            )));
        }
        let vectors = usize::try_from(self.limits.vectors).unwrap_or(usize::MAX);
        for vector in set.by_inputs(vectors, self.limits.agreeing) {
            let taken = self.table.steps.len() + self.outcomes.states.len() * self.circuit.input_count();
            if found(&self.outcomes) == count
                || taken > self.limits.transitions
                || self.outcomes.work > self.limits.values
            {
                break;
            }
            self.outcomes.work += (1 + vector.states.len()) * self.circuit.net_count();
            for state in vector.states {
                self.outcomes.number(state);
            }
        }
        Ok(found(&self.outcomes) == count)
    }

    fn finish(mut self, reachable: usize, complete: bool) -> Result<FlowTable, FlowError> {
        for transition in self.table.steps.iter_mut().chain(&mut self.table.single) {
            let before = &self.outcomes.states[transition.from as usize];
            if let (Reached::Exact { .. }, Some(input)) = (&transition.to, transition.change.single(before)) {
                if self.control.cancelled() {
                    return Err(FlowError::Cancelled);
                }
                transition.essential = self.outcomes.essential(transition.from, input)?;
            }
        }
        self.table.states_truncated |= !complete;
        if self.outcomes.too_much > 0 {
            let count = self.outcomes.too_much;
            let outcomes = if count == 1 { "1 outcome takes".into() } else { format!("{count} outcomes take") };
            self.table.notes.push(format!(
                "{outcomes} more than the budget of the multiple-winner method; ternary simulation bounds what may follow"
            ));
        }
        let explored = self.explored;
        let states = std::mem::take(&mut self.outcomes.states);
        self.table.states = states
            .into_iter()
            .enumerate()
            .map(|(number, values)| FlowState { values, reachable: number < reachable, explored: number < explored })
            .collect();
        Ok(self.table)
    }
}
