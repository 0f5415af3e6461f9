//! A static order of the variables: inputs and feedback nets, each close to what it is read with.
//!
//! Loop components come one after the other, each after those that it reads, so that a chain of blocks becomes a chain
//! in the diagram. Inside a component the order is depth-first from its feedback nets, through the gates between.

use crate::circuit::{Circuit, GateId, NetId};

/// Inputs and feedback nets in the order of the diagram, topmost first. Only nets that `open` admits are entered; the
/// others are constants.
pub(super) fn variable_order(circuit: &Circuit, open: impl Fn(NetId) -> bool) -> Vec<NetId> {
    let mut walk = Walk {
        circuit,
        open,
        is_feedback: vec![false; circuit.net_count()],
        members: vec![Vec::new(); circuit.gate_count()],
        placed: vec![false; circuit.net_count()],
        order: Vec::new(),
    };
    for net in circuit.feedback() {
        walk.is_feedback[net.index()] = true;
    }
    for gate in circuit.gates().filter(|gate| circuit.in_loop(circuit.net_of(*gate))) {
        walk.members[circuit.component(gate) as usize].push(gate);
    }
    walk.components();
    for gate in circuit.gates() {
        walk.place(circuit.net_of(gate));
    }
    for input in circuit.inputs() {
        walk.place(input);
    }
    walk.order
}

struct Walk<'a, Open> {
    circuit: &'a Circuit,
    open: Open,
    is_feedback: Vec<bool>,
    /// the gates of each loop component, in gate order
    members: Vec<Vec<GateId>>,
    placed: Vec<bool>,
    order: Vec<NetId>,
}

enum Visit {
    Enter(NetId),
    Place(usize),
}

impl<Open: Fn(NetId) -> bool> Walk<'_, Open> {
    /// Places the loop components, those that a component reads before it.
    fn components(&mut self) {
        let circuit = self.circuit;
        let mut seen = vec![false; circuit.net_count()];
        let mut begun = vec![false; circuit.gate_count()];
        let mut visits = Vec::new();
        for root in circuit.feedback() {
            visits.push(Visit::Enter(*root));
            while let Some(visit) = visits.pop() {
                let net = match visit {
                    Visit::Enter(net) => net,
                    Visit::Place(component) => {
                        for at in 0..self.members[component].len() {
                            let net = circuit.net_of(self.members[component][at]);
                            if self.is_feedback[net.index()] {
                                self.place(net);
                            }
                        }
                        continue;
                    }
                };
                if std::mem::replace(&mut seen[net.index()], true) || !(self.open)(net) {
                    continue;
                }
                let Some(gate) = circuit.driver(net) else { continue };
                if !circuit.in_loop(net) {
                    visits.extend(circuit.sources(gate).iter().rev().map(|source| Visit::Enter(source.0)));
                    continue;
                }
                let component = circuit.component(gate) as usize;
                if std::mem::replace(&mut begun[component], true) {
                    continue;
                }
                visits.push(Visit::Place(component));
                for member in self.members[component].iter().rev() {
                    visits.extend(circuit.sources(*member).iter().rev().map(|source| Visit::Enter(source.0)));
                }
            }
        }
    }

    /// Places a net, if it is a variable, and all variables of its cone, depth first.
    fn place(&mut self, root: NetId) {
        let mut nets = vec![root];
        while let Some(net) = nets.pop() {
            if !(self.open)(net) || std::mem::replace(&mut self.placed[net.index()], true) {
                continue;
            }
            let driver = self.circuit.driver(net);
            if driver.is_none() || self.is_feedback[net.index()] {
                self.order.push(net);
            }
            if let Some(gate) = driver {
                nets.extend(self.circuit.sources(gate).iter().rev().map(|source| source.0));
            }
        }
    }
}
