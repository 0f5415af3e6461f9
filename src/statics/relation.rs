//! The relation ⋀ (yᵢ ≡ fᵢ) of a circuit over its inputs and feedback nets, some nets perhaps held at constants.

use super::GaveUp;
use super::diagram::{Diagram, Edge};
use super::functions::Functions;
use super::order::{depth_first, drawn_together, with_inputs};
use super::product::Product;
use crate::circuit::{Circuit, NetId, NetSet};
use crate::control::Control;
use crate::logic::{Bits, State, Value};

/// The part of the budget that the first order may use.
const FIRST_TRY: usize = 16;
/// Nodes that it may use in any case.
const LEAST_TRY: usize = 1 << 14;

/// Marks a net that is no variable.
const NO_LEVEL: u32 = u32::MAX;

/// The stable states of a circuit that agree with some known nets.
pub(super) struct Relation {
    pub product: Product,
    /// the variables, topmost first: inputs and feedback nets that are not known
    pub order: Vec<NetId>,
    level: Vec<u32>,
}

impl Relation {
    /// The stable states that agree with the nets known in `known`; of these, the ones in `held` are asked for and not
    /// known to follow from the others.
    pub fn of(circuit: &Circuit, known: &State, held: &[NetId], control: &Control) -> Result<Relation, GaveUp> {
        let open = |net: NetId| known.get(net.index()) == Value::X;
        let plain = depth_first(circuit, open);
        // mostly the plain order does with little; where it does not, the other is often far better
        let budget = Diagram::budget(control);
        let first_try = Control { nodes: (budget / FIRST_TRY).max(LEAST_TRY).min(budget), ..control.clone() };
        match Relation::in_order(circuit, known, held, &plain, &first_try) {
            Err(GaveUp::Budget { .. }) => {}
            done => return done,
        }
        let better = drawn_together(circuit, open, &plain).unwrap_or(plain);
        Relation::in_order(circuit, known, held, &better, control)
    }

    fn in_order(
        circuit: &Circuit,
        known: &State,
        held: &[NetId],
        feedback: &[NetId],
        control: &Control,
    ) -> Result<Relation, GaveUp> {
        let open = |net: NetId| known.get(net.index()) == Value::X;
        let order = with_inputs(circuit, open, feedback);
        let mut level = vec![NO_LEVEL; circuit.net_count()];
        for (at, net) in order.iter().enumerate() {
            level[net.index()] = at as u32;
        }
        let mut diagram = Diagram::new(control);
        let leaves = leaves(&mut diagram, known, &level)?;
        let mut functions = Functions::new(circuit, leaves);
        let bound: Vec<NetId> = feedback.iter().chain(held).copied().collect();
        let gates = bound.iter().filter_map(|net| circuit.driver(*net));
        let sources = gates.clone().flat_map(|gate| circuit.sources(gate)).map(|source| source.0);
        functions.prepare(&mut diagram, sources)?;
        let mut conjuncts = Vec::with_capacity(bound.len());
        for gate in gates {
            let next = functions.next(&mut diagram, gate)?;
            conjuncts.push(!diagram.xor(functions.of(circuit.net_of(gate)), next)?);
        }
        let product = Product::of(diagram, order.len(), &conjuncts, |_| false)?;
        Ok(Relation { product, order, level })
    }

    /// The level of a variable.
    pub fn level(&self, net: NetId) -> Option<u32> {
        Some(self.level[net.index()]).filter(|level| *level != NO_LEVEL)
    }

    /// The level of each net by number, `u32::MAX` where it is no variable.
    pub fn levels(&self) -> &[u32] {
        &self.level
    }
}

/// What functions are built on: constants for the known nets, variables for those with a level.
pub(super) fn leaves(diagram: &mut Diagram, known: &State, level: &[u32]) -> Result<Vec<Option<Edge>>, GaveUp> {
    let mut leaves = Vec::with_capacity(level.len());
    for (net, level) in level.iter().enumerate() {
        leaves.push(match known.get(net).known() {
            Some(bit) => Some(Edge::constant(bit)),
            None if *level != NO_LEVEL => Some(diagram.variable(*level)?),
            None => None,
        });
    }
    Ok(leaves)
}

/// Fills in the nets that are functions of inputs and feedback nets.
pub(super) fn complete(circuit: &Circuit, state: &mut Bits) {
    let mut is_feedback = NetSet::none(circuit.net_count());
    for net in circuit.feedback() {
        is_feedback.insert(*net);
    }
    for gate in circuit.evaluation_order() {
        let net = circuit.net_of(*gate);
        if !is_feedback.contains(net) {
            let value = circuit.wants(*gate, |source| state.get(source.index()));
            state.set(net.index(), value);
        }
    }
}

/// Compares states net by net, net 0 first.
pub(super) fn net_by_net(a: &Bits, b: &Bits) -> std::cmp::Ordering {
    let first_net_on_top = |words: &[u64]| words.iter().map(|word| word.reverse_bits()).collect::<Vec<_>>();
    first_net_on_top(a.words()).cmp(&first_net_on_top(b.words()))
}
