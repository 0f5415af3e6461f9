//! How often a net moves in its windows: glitches and counts of edges.

use crate::proof::key::bit;
use crate::proof::plant::Plant;
use crate::proof::watch::{Arrival, Block, Fate, SAME, Watch};

/// The transitions of a net in its own windows: from a step that touches it to the next that does. Judged are windows that
/// began and end with nothing pending in the plant, which should be the cone of the net.
///
/// The state: transitions up to `most` + 1, then a bit for the value before, a bit for "judged".
#[derive(Clone, Copy, Debug)]
pub struct Moves {
    /// The net, by its number in the plant.
    pub net: u32,
    /// Counts above this are told from each other no more.
    pub most: u32,
    /// The window that begins with its own step, whether it touches the net or not.
    pub from: Option<u32>,
}

/// Where a window came to rest: `hit` numbers of [`Moves`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Moved {
    /// Steps taken; 0 in the power-up window.
    pub steps: u32,
    /// The value before.
    pub before: bool,
    /// Transitions; `most` + 1 stands for all above `most`.
    pub count: u32,
}

impl Moves {
    const BEFORE: u32 = 1 << 30;
    const JUDGED: u32 = 1 << 31;

    /// What a hit says.
    pub fn moved(hit: u32) -> Moved {
        Moved { steps: hit >> 8, before: hit & 1 == 1, count: hit >> 1 & 0x7F }
    }
}

impl Watch for Moves {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, _state: u32) -> u8 {
        0
    }

    fn start(&self, plant: &Plant, values: &[u64]) -> u32 {
        // what happens before the first step is no window, but after a start that is not at rest
        let before = if bit(values, self.net as usize) { Self::BEFORE } else { 0 };
        if plant.power_up { before | Self::JUDGED } else { before }
    }

    fn block(&self, state: u32, block: &Block<'_>, _hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let mut state = state;
        if block.touches() || self.from.is_some_and(|window| block.opens.contains(&window)) {
            let before = if bit(block.before, self.net as usize) { Self::BEFORE } else { 0 };
            state = before | if block.rested { Self::JUDGED } else { 0 };
        }
        if state & Self::JUDGED != 0 && block.change(self.net).is_some() && state & 0xFFFF <= self.most {
            state += 1;
        }
        (state, SAME)
    }

    fn arrive(&self, state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        if arrival.rest && state & Self::JUDGED != 0 {
            let before = u32::from(state & Self::BEFORE != 0);
            hit(arrival.window << 8 | (state & 0x7F) << 1 | before);
        }
    }
}
