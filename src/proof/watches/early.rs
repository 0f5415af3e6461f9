//! Steps that come before rest.

use crate::proof::plant::Plant;
use crate::proof::watch::{Block, Fate, SAME, Watch};

/// A step or edge comes while something pends in the plant. A hit is its window.
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
        if !block.rested {
            block.opens.iter().for_each(|window| hit(*window));
        }
        (state, SAME)
    }
}
