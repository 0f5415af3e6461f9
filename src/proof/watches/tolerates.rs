//! Glitches where those shorter than a bound are tolerated.

use crate::proof::key::bit;
use crate::proof::plant::Plant;
use crate::proof::watch::{Arrival, Block, Fate, SAME, Watch};
use crate::proof::zone::Matrix;

/// The transitions of a net in its own windows as [`Moves`](super::Moves) has them, and how wide the pulses between them may
/// be. A hit is a window that comes to rest with one pulse that may be as wide as the bound, with two that both may be, or with
/// more: which of many pulses are struck out depends on all their widths, and is left to runs. Numbers as of
/// [`Moves::moved`](super::Moves::moved), up to 4 transitions.
#[derive(Clone, Copy, Debug)]
pub struct Tolerates {
    /// The net, by its number in the plant.
    pub net: u32,
    /// Pulses below this are tolerated, in ticks.
    pub shorter: i64,
}

impl Tolerates {
    /// Transitions.
    const COUNT: u32 = 7;
    /// Is the present pulse surely as wide as the bound, so that its width no longer counts?
    const PAST: u32 = 1 << 3;
    /// A pulse that ended was too narrow for sure.
    const NARROW: u32 = 1 << 4;
    const BEFORE: u32 = 1 << 30;
    const JUDGED: u32 = 1 << 31;

    fn runs(state: u32) -> bool {
        state & Self::JUDGED != 0
            && (1..=2).contains(&(state & Self::COUNT))
            && state & (Self::PAST | Self::NARROW) == 0
    }
}

impl Watch for Tolerates {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        u8::from(Self::runs(state))
    }

    fn start(&self, plant: &Plant, values: &[u64]) -> u32 {
        let before = if bit(values, self.net as usize) { Self::BEFORE } else { 0 };
        if plant.power_up { before | Self::JUDGED } else { before }
    }

    fn block(&self, state: u32, block: &Block<'_>, _hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let (mut state, mut runs) = (state, Self::runs(state));
        if block.touches() {
            let before = if bit(block.before, self.net as usize) { Self::BEFORE } else { 0 };
            state = before | if block.rested { Self::JUDGED } else { 0 };
            runs = false;
        }
        if state & Self::JUDGED == 0 || block.change(self.net).is_none() {
            return (state, if runs { SAME } else { [Fate::Begin; 2] });
        }
        if runs && !block.zone.may_reach(block.row, self.shorter) {
            state |= Self::NARROW;
        }
        state &= !Self::PAST;
        if state & Self::COUNT < 4 {
            state += 1;
        }
        (state, [Fate::Begin; 2])
    }

    fn arrive(&self, state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        let count = state & Self::COUNT;
        let wide = count > 3 || count >= 2 && state & Self::NARROW == 0;
        if arrival.rest && state & Self::JUDGED != 0 && wide {
            hit(arrival.window << 8 | count << 1 | u32::from(state & Self::BEFORE != 0));
        }
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, _hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        // from then on how much wider it gets does not count
        let past = Self::runs(state) && zone.at(0, row) <= crate::proof::zone::at_most(-self.shorter);
        (if past { state | Self::PAST } else { state }, true)
    }
}
