//! Pulses that a gate swallows.

use crate::proof::plant::Plant;
use crate::proof::watch::{Block, Fate, SAME, Watch};

/// A gate that is excited for a while and then no longer, without having fired. A hit is the number of steps taken.
#[derive(Clone, Copy, Debug)]
pub struct Swallows {
    /// The gate, by its number in the plant.
    pub gate: u32,
}

impl Watch for Swallows {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, _state: u32) -> u8 {
        0
    }

    fn start(&self, _plant: &Plant, _values: &[u64]) -> u32 {
        0
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let steps = block.opens.first().copied().unwrap_or(state);
        if block.disabled.iter().any(|(gate, row)| *gate == self.gate && block.zone.may_pass(*row, 0)) {
            // what a step cancels at its instant belongs to its window
            hit(steps);
        }
        (steps, SAME)
    }
}
