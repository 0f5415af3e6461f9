//! The flow table of the textbook (Huffman 1954; Unger 1969): only the feedback nets take time, one after the other or
//! together; the logic between them follows at once. It is what Unger's test for essential hazards is about, while the
//! delays of the logic itself are what such a hazard is made of.

use std::cell::RefCell;

use super::GaveUp;
use super::change::Change;
use super::explore::{Effort, Network, explore, parts_of};
use super::outcome::bound;
use crate::circuit::{Circuit, GateId, NetId};
use crate::control::Control;
use crate::logic::{Bits, Value};

/// What follows a change where only the feedback nets take time.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Next {
    /// One stable state, values of all nets.
    One(Bits),
    /// More than one outcome, or a lasting cycle.
    Several,
    /// More than the effort.
    Unknown,
}

/// What follows a change of inputs from a stable state where only the feedback nets take time. The effort, in evaluations
/// of gates and firings, is taken from `left`.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::control::Control;
/// use stillgate::logic::Bits;
/// use stillgate::statics::{Change, Next, fundamental};
/// // p = a & !a may pulse and set the latch q, but not if the logic follows at once
/// let gate = |name: &str, function, pins: &[u32]| {
///     GateSpec { name: name.into(), function, pins: pins.iter().map(|net| NetId(*net)).collect() }
/// };
/// let gates = vec![
///     gate("n", Function::Not, &[0]), gate("p", Function::And, &[0, 1]), gate("q", Function::Or, &[2, 3]),
/// ];
/// let circuit = Circuit::new(&["a"], gates, vec![]).unwrap();
/// let from = Bits::of([false, true, false, false].into_iter());
/// let rise = Change { set: vec![(NetId(0), true)], apart: false };
/// let next = fundamental(&circuit, &from, &rise, &mut 1000, &Control::default()).unwrap();
/// assert_eq!(next, Next::One(Bits::of([true, false, false, false].into_iter())));
/// ```
///
/// Errors: only [`GaveUp::Cancelled`]. Panics if the state has fewer nets than the circuit.
pub fn fundamental(
    circuit: &Circuit,
    from: &Bits,
    change: &Change,
    left: &mut usize,
    control: &Control,
) -> Result<Next, GaveUp> {
    let Some(loops) = Loops::of(circuit, from, change, left) else { return Ok(Next::Unknown) };
    let nodes = loops.nodes.len();
    // a node costs as many evaluations as there are gates before it
    let each = 1 + loops.nodes.iter().map(|node| node.before.len()).sum::<usize>() / nodes.max(1);
    let mut state = loops.values.borrow().clone();
    for members in parts_of(&loops, nodes, &vec![true; nodes]) {
        let given = *left / each;
        let mut rest = given;
        let found = explore(&loops, &members, Effort::DEFAULT, &mut rest, control)?;
        *left -= (given - rest) * each;
        match found {
            None => return Ok(Next::Unknown),
            Some(found) => match (&found.stable[..], found.cycles) {
                ([one], 0) => members.iter().enumerate().for_each(|(place, node)| {
                    state.set(loops.nodes[*node as usize].net.index(), one.get(place));
                }),
                _ => return Ok(Next::Several),
            },
        }
    }
    for gate in &loops.logic {
        let value = circuit.wants(*gate, |net| state.get(net.index()));
        state.set(circuit.net_of(*gate).index(), value);
    }
    Ok(Next::One(state))
}

/// The feedback nets that may move, with the logic before them.
struct Loops<'a> {
    circuit: &'a Circuit,
    nodes: Vec<Node>,
    /// The other gates that may move, sources before readers.
    logic: Vec<GateId>,
    /// By node, its value before.
    start: Vec<bool>,
    /// The state before, with the new inputs; scratch for the nets that may move.
    values: RefCell<Bits>,
}

struct Node {
    net: NetId,
    gate: GateId,
    /// the nodes that it depends on
    reads: Vec<u32>,
    /// the logic between those and it, sources before readers
    before: Vec<GateId>,
}

impl<'a> Loops<'a> {
    /// `None`: that alone takes more than is left.
    fn of(circuit: &'a Circuit, from: &Bits, change: &Change, left: &mut usize) -> Option<Loops<'a>> {
        let spread = bound(circuit, from, change).0;
        let moves = |net: NetId| spread.get(net.index()) == Value::X && !circuit.is_input(net);
        let mut values = from.clone();
        change.set.iter().for_each(|(net, bit)| values.set(net.index(), *bit));
        let feedback: Vec<NetId> = circuit.feedback().iter().copied().filter(|net| moves(*net)).collect();
        let mut place = vec![u32::MAX; circuit.net_count()];
        feedback.iter().enumerate().for_each(|(at, net)| place[net.index()] = at as u32);
        let is_logic = |gate: &GateId| {
            let net = circuit.net_of(*gate);
            moves(net) && place[net.index()] == u32::MAX
        };
        let logic: Vec<GateId> = circuit.evaluation_order().iter().copied().filter(is_logic).collect();
        let mut rank = vec![u32::MAX; circuit.net_count()];
        logic.iter().enumerate().for_each(|(at, gate)| rank[circuit.net_of(*gate).index()] = at as u32);

        let mut nodes = Vec::with_capacity(feedback.len());
        let mut seen = vec![u32::MAX; circuit.net_count()];
        for (number, net) in feedback.iter().enumerate() {
            let gate = circuit.driver(*net).expect("feedback nets have gates");
            let (mut reads, mut before, mut open) = (Vec::new(), Vec::new(), vec![gate]);
            while let Some(gate) = open.pop() {
                for (source, _) in circuit.sources(gate) {
                    let at = source.index();
                    if !moves(*source) || std::mem::replace(&mut seen[at], number as u32) == number as u32 {
                        continue;
                    }
                    match place[at] {
                        u32::MAX => {
                            before.push(rank[at]);
                            open.push(circuit.driver(*source)?);
                        }
                        node => reads.push(node),
                    }
                }
            }
            *left = left.checked_sub(1 + before.len())?;
            before.sort_unstable();
            let before = before.into_iter().map(|rank| logic[rank as usize]).collect();
            nodes.push(Node { net: *net, gate, reads, before });
        }
        let start = feedback.iter().map(|net| from.get(net.index())).collect();
        Some(Loops { circuit, nodes, logic, start, values: RefCell::new(values) })
    }
}

impl Network for Loops<'_> {
    fn reads(&self, node: u32) -> &[u32] {
        &self.nodes[node as usize].reads
    }

    fn start(&self, node: u32) -> bool {
        self.start[node as usize]
    }

    fn component(&self, _: u32) -> Option<u32> {
        None
    }

    fn target(&self, node: u32, value: impl Fn(u32) -> bool) -> bool {
        let node = &self.nodes[node as usize];
        let values = &mut *self.values.borrow_mut();
        for read in &node.reads {
            values.set(self.nodes[*read as usize].net.index(), value(*read));
        }
        for gate in &node.before {
            let wanted = self.circuit.wants(*gate, |net| values.get(net.index()));
            values.set(self.circuit.net_of(*gate).index(), wanted);
        }
        self.circuit.wants(node.gate, |net| values.get(net.index()))
    }
}
