//! Recurrence as the semantics writes it: a note after 64, 128, 256, … transitions, compared as a whole.

use std::collections::BTreeSet;

use stillgate::circuit::{Circuit, NetId};
use stillgate::logic::Value;

use super::slow_engine::Event;

/// A block: gates tied together by gates, the wires that lead to them, the inputs that they read.
pub struct Block {
    nets: Vec<NetId>,
    nodes: Vec<usize>,
    ends: Vec<usize>,
    inputs: Vec<NetId>,
    count: u64,
    next: u64,
    note: Option<Note>,
    /// Set once it has recurred, until an input that it reads changes.
    pub recurred: Option<Recurred>,
}

pub struct Recurred {
    pub at: u64,
    pub period: u64,
    pub range: Option<(u64, u64)>,
    /// Where it is exact: the nets that moved, with how often.
    pub moving: Vec<(NetId, u32)>,
}

struct Note {
    at: u64,
    values: Vec<Value>,
    remaining: BTreeSet<(usize, u64, Value)>,
    ages: Vec<Option<i128>>,
    own: Vec<u64>,
    passes: Vec<u64>,
    moved: Vec<NetId>,
}

impl Block {
    pub fn of(circuit: &Circuit, number: u32) -> Block {
        let gates: Vec<_> = circuit.gates().filter(|gate| circuit.block(*gate) == number).collect();
        let ends: Vec<usize> = (0..circuit.wire_count()).filter(|w| gates.contains(&circuit.wires()[*w].1)).collect();
        let mut nodes: Vec<usize> = gates.iter().map(|gate| gate.index()).collect();
        nodes.extend(ends.iter().map(|w| circuit.gate_count() + w));
        let read = |net: &NetId| gates.iter().any(|gate| circuit.pins(*gate).contains(net));
        Block {
            nets: gates.iter().map(|gate| circuit.net_of(*gate)).collect(),
            nodes,
            ends,
            inputs: circuit.inputs().filter(read).collect(),
            count: 0,
            next: 64,
            note: None,
            recurred: None,
        }
    }

    pub fn holds(&self, node: usize) -> bool {
        self.nodes.contains(&node)
    }

    /// `age`: of gates with a memory of their last change, while it matters. `own`: events with delays of their own that a
    /// gate has scheduled.
    #[allow(clippy::too_many_arguments)]
    pub fn after_batch(
        &mut self,
        at: u64,
        changed: &[NetId],
        arrived: &[usize],
        nets: &[Value],
        ends: &[Value],
        pending: &BTreeSet<Event>,
        age: impl Fn(usize) -> Option<i128>,
        own: impl Fn(usize) -> u64,
    ) {
        if self.inputs.iter().any(|input| changed.contains(input)) {
            (self.count, self.next, self.note, self.recurred) = (0, 64, None, None);
        }
        let moved = self.nets.iter().filter(|net| changed.contains(net)).count();
        if self.recurred.is_some() || moved == 0 && !self.ends.iter().any(|w| arrived.contains(w)) {
            return;
        }
        self.count += moved as u64;
        let values = || -> Vec<Value> {
            self.nets.iter().map(|net| nets[net.index()]).chain(self.ends.iter().map(|w| ends[*w])).collect()
        };
        let remaining = || -> BTreeSet<(usize, u64, Value)> {
            pending.iter().filter(|e| self.nodes.contains(&e.node)).map(|e| (e.node, e.at - at, e.value)).collect()
        };
        let ages = || -> Vec<Option<i128>> { self.nodes.iter().map(|node| age(*node)).collect() };
        let own = || -> Vec<u64> { self.nodes.iter().map(|node| own(*node)).collect() };
        if let Some(note) = &mut self.note {
            note.moved.extend(self.nets.iter().filter(|net| changed.contains(net)));
        }
        if let Some(note) = &mut self.note
            && note.values == values()
        {
            if note.remaining == remaining() && note.ages == ages() && note.own == own() {
                let often = |net: &NetId| (*net, note.moved.iter().filter(|other| *other == net).count() as u32);
                let moving = self.nets.iter().map(often).filter(|(_, count)| *count > 0).collect();
                self.recurred = Some(Recurred { at, period: at - note.at, range: None, moving });
                return;
            }
            note.passes.push(at);
            if note.passes.len() == 100 {
                let from = [&[note.at], &note.passes[..]].concat();
                let lengths = || from.windows(2).map(|pair| pair[1] - pair[0]);
                let range = (lengths().min().expect("100 of them"), lengths().max().expect("100 of them"));
                self.recurred =
                    Some(Recurred { at, period: (at - note.at) / 100, range: Some(range), moving: Vec::new() });
                return;
            }
        }
        if self.count >= self.next {
            while self.next <= self.count {
                self.next *= 2;
            }
            self.note = Some(Note {
                at,
                values: values(),
                remaining: remaining(),
                ages: ages(),
                own: own(),
                passes: Vec::new(),
                moved: Vec::new(),
            });
        }
    }
}
