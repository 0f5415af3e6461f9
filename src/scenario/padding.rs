//! Where delay may be added to cure what is refuted.

use serde::{Deserialize, Serialize};

use super::Scenario;
use crate::circuit::{GateId, WireId};

/// A place where delay can be added: to both edges alike.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub enum Padded {
    /// A gate.
    Gate(GateId),
    /// A wire that has a delay of its own.
    Wire(WireId),
}

impl Scenario {
    /// Where delay may be added: what `[padding]` allows; without it every gate whose net is not watched, and every wire.
    pub fn paddable(&self) -> Vec<Padded> {
        if let Some(allowed) = &self.padding {
            return allowed.clone();
        }
        let gates = self.circuit.gates().filter(|gate| !self.watched.contains(&self.circuit.net_of(*gate)));
        let wires = (0..self.circuit.wire_count() as u32).map(|wire| Padded::Wire(WireId(wire)));
        gates.map(Padded::Gate).chain(wires).collect()
    }
}
