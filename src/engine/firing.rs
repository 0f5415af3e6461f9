//! How often each gate has asked for an event, and what delay that gives it, in runs whose firings differ.

use crate::circuit::GateId;
use crate::instance::{Drawn, Firings, Instance};
use crate::time::Span;

/// The delays of gates from firing to firing of one run.
pub(super) struct Firing {
    firings: Firings,
    plain: Vec<[Span; 2]>,
    /// For each gate, the number of its next firing.
    next: Vec<u64>,
}

impl Default for Firing {
    fn default() -> Firing {
        Firing { firings: Firings::Drawn(Drawn::default()), plain: Vec::new(), next: Vec::new() }
    }
}

impl Firing {
    /// Begins a run.
    pub fn reset(&mut self, instance: &Instance) {
        match (&mut self.firings, &instance.firings) {
            // without allocating, sample after sample
            (Firings::Drawn(old), Some(Firings::Drawn(new))) => {
                old.draw = new.draw;
                old.gates.clone_from(&new.gates);
            }
            (old, Some(new)) => *old = new.clone(),
            (old, None) => *old = Firings::Given(Default::default()),
        }
        self.plain.clone_from(&instance.delays.gate);
        self.next.clear();
        self.next.resize(self.plain.len(), 0);
    }

    /// A gate asks for an event: `[fall, rise]` in femtoseconds of this firing.
    pub fn ask(&mut self, gate: u32) -> [u64; 2] {
        let delays = self.ahead(gate);
        self.next[gate as usize] += 1;
        delays
    }

    /// `[fall, rise]` in femtoseconds of a gate's next firing.
    pub fn ahead(&self, gate: u32) -> [u64; 2] {
        let g = gate as usize;
        self.firings.delays(GateId(gate), self.next[g], self.plain[g]).map(Span::fs)
    }

    /// How many events a node has scheduled up to the last whose delay is its own. Wires keep their delay.
    pub fn own(&self, node: u32) -> u64 {
        self.next.get(node as usize).map_or(0, |next| (*next).min(self.firings.until(GateId(node))))
    }
}
