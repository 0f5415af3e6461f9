//! Partial states: whether they show, and for how long.

use crate::proof::key::bit;
use crate::proof::plant::Plant;
use crate::proof::watch::{Arrival, Block, Fate, SAME, Watch};
use crate::proof::zone::{Matrix, at_most};

/// Do the nets (by their number in the plant) have these values?
fn matches(pattern: &[(u32, bool)], values: &[u64]) -> bool {
    pattern.iter().all(|(net, value)| bit(values, *net as usize) == *value)
}

/// A partial state that shows, for no matter how short a time.
#[derive(Clone, Debug)]
pub struct Shows {
    /// Nets by their number in the plant, and values.
    pub pattern: Vec<(u32, bool)>,
}

impl Watch for Shows {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, _state: u32) -> u8 {
        0
    }

    fn start(&self, _plant: &Plant, _values: &[u64]) -> u32 {
        0
    }

    fn block(&self, state: u32, _block: &Block<'_>, _hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        (state, SAME)
    }

    fn arrive(&self, _state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        if matches(&self.pattern, arrival.values) {
            hit(arrival.window);
        }
    }
}

/// A partial state that shows for longer than a bound. A hit is the number of steps taken when it is exceeded.
#[derive(Clone, Debug)]
pub struct ShowsLonger {
    /// Nets by their number in the plant, and values.
    pub pattern: Vec<(u32, bool)>,
    /// The bound, in ticks, above 0.
    pub longer: i64,
}

impl Watch for ShowsLonger {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        u8::from(state & 1 == 1)
    }

    fn start(&self, _plant: &Plant, values: &[u64]) -> u32 {
        u32::from(matches(&self.pattern, values))
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let steps = block.opens.first().copied().unwrap_or(state >> 1);
        // a wait for rest is not seen passing
        if state & 1 == 1 && block.zone.may_pass(block.row, self.longer) {
            hit(state >> 1);
        }
        let shows = matches(&self.pattern, block.after);
        let fates = if state & 1 == 1 { SAME } else { [Fate::Begin; 2] };
        (steps << 1 | u32::from(shows), fates)
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        if state & 1 == 0 {
            return (state, true);
        }
        if zone.may_pass(row, self.longer) {
            hit(state >> 1);
        }
        // once it has been seen, longer is no more
        (state, zone.bound(row, 0, at_most(self.longer)))
    }
}
