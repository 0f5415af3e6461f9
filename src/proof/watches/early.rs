//! Steps that come before rest.

use crate::proof::plant::Plant;
use crate::proof::watch::{Block, Fate, SAME, Watch};

/// A step comes while something pends in the plant. A hit is the number of steps taken once it has come.
#[derive(Clone, Copy, Debug, Default)]
pub struct BeforeRest;

impl Watch for BeforeRest {
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
        if let (Some(step), false) = (block.step, block.rested) {
            (step..step + block.steps).for_each(|step| hit(step as u32 + 1));
        }
        (state, SAME)
    }
}
