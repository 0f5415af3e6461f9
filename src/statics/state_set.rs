//! All stable states of a circuit.

use num_bigint::BigUint;

use super::GaveUp;
use super::diagram::Diagram;
use super::multiplicity::Choices;
use super::product::Rows;
use super::relation::{Relation, complete, net_by_net};
use crate::circuit::{Circuit, NetId};
use crate::control::Control;
use crate::logic::{Bits, State, Value};

/// The state set: every stable state, for every input vector.
///
/// Kept as a decision diagram over inputs and feedback nets; every other net is a function of them. All numbers are
/// exact. Building it may give up; once built, counting and listing never do.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::control::Control;
/// use stillgate::statics::StateSet;
/// // a latch of two NORs: inputs r and s, gates q and qn
/// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
/// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
/// let states = StateSet::of(&latch, &Control::default()).unwrap();
/// assert_eq!(states.count(), 5u8.into()); // it remembers a bit while r = s = 0
/// let (hold, truncated) = states.at(&[false, false], 10);
/// assert_eq!((hold.len(), truncated), (2, false));
/// assert!(!hold[0].get(2) && hold[1].get(2));
/// ```
pub struct StateSet<'a> {
    pub(super) circuit: &'a Circuit,
    pub(super) relation: Relation,
    pub(super) control: Control,
    variables: Vec<NetId>,
}

/// How many input vectors have no stable state, just one, or several.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct VectorCounts {
    /// No stable state: the circuit must oscillate.
    pub none: BigUint,
    /// Just one.
    pub one: BigUint,
    /// Several: the circuit remembers.
    pub several: BigUint,
}

/// One input vector with its stable states.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct InputStates {
    /// The inputs, in net order.
    pub inputs: Vec<bool>,
    /// Its stable states, values of all nets: see [`StateSet::at`].
    pub states: Vec<Bits>,
    /// Does it have more states than the limit?
    pub truncated: bool,
}

impl<'a> StateSet<'a> {
    /// Finds all stable states of a circuit.
    ///
    /// Errors: the diagram outgrew the budget of `control`, or the caller asked to stop. The same budget and flag hold
    /// for the questions that need a diagram of their own.
    pub fn of(circuit: &'a Circuit, control: &Control) -> Result<StateSet<'a>, GaveUp> {
        let relation = Relation::of(circuit, &unknown(circuit), &[], control)?;
        let variables = circuit.inputs().chain(circuit.feedback().iter().copied()).collect();
        Ok(StateSet { circuit, relation, control: control.clone(), variables })
    }

    /// Number of stable states, over all input vectors. An input that nothing reads counts like any other: it doubles
    /// the number.
    pub fn count(&self) -> BigUint {
        let product = &self.relation.product;
        product.count(&product.unfixed())
    }

    /// Nodes of its decision diagram, the intermediate ones of the way there included: what the budget
    /// [`Control::nodes`] counts.
    pub fn nodes(&self) -> usize {
        self.relation.product.diagram.len()
    }

    /// The feedback nets, in net order; with the inputs they determine every net.
    pub fn feedback(&self) -> &[NetId] {
        self.circuit.feedback()
    }

    /// The inputs, then the feedback nets, each in net order: the columns of [`StateSet::rows`].
    pub fn variables(&self) -> &[NetId] {
        &self.variables
    }

    /// The whole set as disjoint ternary rows over [`StateSet::variables`], at most `limit` of them. A row with d free
    /// places stands for 2^d stable states.
    pub fn rows(&self, limit: usize) -> Rows {
        self.relation.product.rows(&self.levels(&self.variables), limit)
    }

    /// The stable states with these inputs, values of all nets, and whether there are more than `limit`.
    ///
    /// In lexicographic order, net 0 first. If there are more, those that come first by their feedback nets are given.
    ///
    /// Panics if `inputs` is not one value an input.
    pub fn at(&self, inputs: &[bool], limit: usize) -> (Vec<Bits>, bool) {
        assert_eq!(inputs.len(), self.circuit.input_count(), "one value an input");
        let product = &self.relation.product;
        let mut fixed = product.unfixed();
        for (net, bit) in self.circuit.inputs().zip(inputs) {
            fixed[self.level(net) as usize] = Some(*bit);
        }
        if !product.possible(&fixed) {
            return (Vec::new(), false);
        }
        let feedback = self.circuit.feedback();
        let asked = limit.saturating_add(1);
        let mut found = product.first(&fixed, &self.levels(feedback), asked);
        let truncated = found.len() == asked;
        found.truncate(limit);
        let mut states: Vec<Bits> = found
            .into_iter()
            .map(|values| {
                let mut state = Bits::zeros(self.circuit.net_count());
                for (net, bit) in self.circuit.inputs().zip(inputs).chain(feedback.iter().copied().zip(&values)) {
                    state.set(net.index(), *bit);
                }
                complete(self.circuit, &mut state);
                state
            })
            .collect();
        states.sort_by(net_by_net);
        (states, truncated)
    }

    /// The input vectors in counting order (the first input is the highest digit), each with its stable states: at most
    /// `vectors` of them, with at most `states` each.
    pub fn by_inputs(&self, vectors: usize, states: usize) -> ByInputs<'_> {
        let inputs = self.circuit.input_count();
        let all = if inputs < 64 { 1u64 << inputs } else { u64::MAX };
        let end = all.min(vectors as u64);
        ByInputs { set: self, next: 0, end, truncated: end < all, limit: states }
    }

    /// Number of input vectors without, with one, with several stable states.
    ///
    /// Errors: see [`StateSet::of`].
    pub fn vector_counts(&self) -> Result<VectorCounts, GaveUp> {
        let product = &self.relation.product;
        let is_input = |level: u32| self.circuit.is_input(self.relation.order[level as usize]);
        let (mut some, mut one) = (BigUint::from(1u8), BigUint::from(1u8));
        let unfixed = product.unfixed();
        for part in &product.parts {
            let mut diagram = Diagram::new(&self.control);
            let choices = Choices::of(&product.diagram, part.root, &part.levels);
            let found = choices.multiplicity(is_input, &mut diagram)?;
            let single = diagram.and(found.some, !found.several)?;
            let outer: Vec<u32> = part.levels.iter().copied().filter(|level| is_input(*level)).collect();
            some *= diagram.count(found.some, &outer, &unfixed);
            one *= diagram.count(single, &outer, &unfixed);
        }
        let all = BigUint::from(1u8) << self.circuit.input_count();
        Ok(VectorCounts { none: all - &some, several: some - &one, one })
    }

    /// The level of a variable: every input and feedback net is one.
    pub(super) fn level(&self, net: NetId) -> u32 {
        self.relation.level(net).expect("inputs and feedback nets are variables")
    }

    pub(super) fn levels(&self, nets: &[NetId]) -> Vec<u32> {
        nets.iter().map(|net| self.level(*net)).collect()
    }
}

/// A state in which no net is known.
pub(super) fn unknown(circuit: &Circuit) -> State {
    let mut state = State::zeros(circuit.net_count());
    for net in circuit.nets() {
        state.set(net.index(), Value::X);
    }
    state
}

/// The input vectors with their stable states, one after the other; see [`StateSet::by_inputs`].
pub struct ByInputs<'a> {
    set: &'a StateSet<'a>,
    next: u64,
    end: u64,
    truncated: bool,
    limit: usize,
}

impl ByInputs<'_> {
    /// Are there more input vectors than the limit?
    pub fn truncated(&self) -> bool {
        self.truncated
    }
}

impl Iterator for ByInputs<'_> {
    type Item = InputStates;

    fn next(&mut self) -> Option<InputStates> {
        if self.next == self.end {
            return None;
        }
        let digits = self.set.circuit.input_count();
        let inputs: Vec<bool> = (0..digits).rev().map(|digit| digit < 64 && self.next >> digit & 1 == 1).collect();
        self.next += 1;
        let (states, truncated) = self.set.at(&inputs, self.limit);
        Some(InputStates { inputs, states, truncated })
    }
}
