//! Changes of inputs.

use crate::circuit::{Circuit, NetId};
use crate::logic::Bits;

/// A change of inputs, at rest: what a step does.
#[derive(Clone, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Change {
    /// The inputs and their new values, in net order, each once. One that has this value already changes nothing.
    pub set: Vec<(NetId, bool)>,
    /// May the inputs change one after the other, in any order and at any time (skew)? Else they change at one instant.
    pub apart: bool,
}

impl Change {
    /// The change of one input away from its value in `state`.
    pub fn of_one(state: &Bits, input: NetId) -> Change {
        Change { set: vec![(input, !state.get(input.index()))], apart: false }
    }

    /// What leads from the inputs of one state to those of another, all at one instant.
    pub fn between(circuit: &Circuit, from: &Bits, to: &Bits) -> Change {
        let differs = |net: &NetId| from.get(net.index()) != to.get(net.index());
        Change { set: circuit.inputs().filter(differs).map(|net| (net, to.get(net.index()))).collect(), apart: false }
    }

    /// The inputs that really change from `state`, with their new values, in net order.
    pub fn moving<'a>(&'a self, state: &'a Bits) -> impl Iterator<Item = (NetId, bool)> + 'a {
        self.set.iter().copied().filter(|(net, bit)| state.get(net.index()) != *bit)
    }

    /// The one input that changes from `state`, if it is one alone.
    pub fn single(&self, state: &Bits) -> Option<NetId> {
        let mut moving = self.moving(state);
        let first = moving.next()?.0;
        moving.next().is_none().then_some(first)
    }
}
