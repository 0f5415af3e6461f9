//! Groups: the exploration does not know them, so a case that was found must fit them.

use super::plant::Plant;
use super::system::{System, Unknown};
use crate::instance::Instance;
use crate::scenario::Scenario;
use crate::time::Span;

/// A case with the delays of groups put such that a draw could give them. What the trace of the system does not use is
/// free; `None` if the delays that it does use exclude each other in some group.
pub(super) fn grouped(scenario: &Scenario, plant: &Plant, system: &System, mut instance: Instance) -> Option<Instance> {
    let delays = &scenario.delays;
    let mut used = vec![[false; 2]; delays.gate.len()];
    for unknown in &system.unknowns {
        if let Unknown::Gate(gate, rises) = *unknown {
            let gate = plant.gates[gate as usize].gate.index();
            match delays.gate_one_draw[gate] {
                true => used[gate] = [true; 2],
                false => used[gate][usize::from(rises)] = true,
            }
        }
    }
    for group in &delays.groups {
        let edges = || group.gates.iter().flat_map(|gate| [0, 1].map(|edge| (gate.index(), edge)));
        let given = |(gate, edge): (usize, usize)| used[gate][edge].then_some(instance.delays.gate[gate][edge]);
        let all: Vec<_> = edges().map(|(gate, edge)| (delays.gate[gate][edge], given((gate, edge)))).collect();
        let fitted: Vec<Span> = group.how.complete(scenario.plan.draw, &all)?;
        for ((gate, edge), span) in edges().zip(fitted) {
            instance.delays.gate[gate][edge] = span;
        }
    }
    Some(instance)
}
