//! Distances of edges: too close, too far apart, and the width of pulses.

use crate::proof::plant::Plant;
use crate::proof::watch::{Arrival, Block, Fate, SAME, Watch};
use crate::proof::zone::{AT_MOST_ZERO, FREE, Matrix, at_most, limit};
use crate::scenario::EdgeKind;

/// Edges of one net of a plant.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Edge {
    /// The net, by its number in the plant.
    pub net: u32,
    /// Which of its edges.
    pub kind: EdgeKind,
}

impl Edge {
    fn is_in(self, block: &Block<'_>) -> bool {
        block.change(self.net).is_some_and(|new| self.kind.is(new))
    }
}

/// The window once a block has come.
fn steps(state: u32, block: &Block<'_>) -> u32 {
    block.opens.first().copied().unwrap_or(state >> 2)
}

/// Could clock `row` be below c?
fn may_be_below(zone: &Matrix, row: usize, c: i64) -> bool {
    -limit(zone.at(0, row)).0 < c
}

/// Two edges closer than a bound: from each `to` edge back to the latest `from` edge not after it. A hit is the number of
/// steps taken.
///
/// The state: bit 0, the time since `from` runs; bit 1, the time since `to` runs (only at its very instant); then steps.
#[derive(Clone, Copy, Debug)]
pub struct Apart {
    /// The earlier edge.
    pub from: Edge,
    /// The later edge.
    pub to: Edge,
    /// The least distance, in ticks, above 0.
    pub min: i64,
}

impl Watch for Apart {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        (state & 3).count_ones() as u8
    }

    fn start(&self, _plant: &Plant, _values: &[u64]) -> u32 {
        0
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let steps = steps(state, block);
        let (from, to) = (self.from.is_in(block), self.to.is_in(block));
        let same_net = self.from.net == self.to.net;
        let since_to = block.row + usize::from(state & 1 == 1);
        let runs = state & 1 == 1;
        let just = state & 2 != 0 && block.zone.at(0, since_to) == AT_MOST_ZERO;
        let close = to && runs && may_be_below(block.zone, block.row, self.min) || !same_net && from && (to || just);
        if close {
            hit(steps);
        }
        let next_from = runs || from;
        let next_to = !same_net && (to || just && !from);
        let mut fates = [Fate::Begin; 2];
        if runs && !from {
            fates[0] = Fate::Keep(0);
        }
        if next_to && !to {
            fates[usize::from(next_from)] = Fate::Keep(u8::from(runs));
        }
        (steps << 2 | u32::from(next_to) << 1 | u32::from(next_from), fates)
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, _hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        // the time since `to` ends with the next block
        match state & 3 {
            1 if !may_be_below(zone, row, self.min) => (state & !1, true),
            _ => (state, true),
        }
    }
}

/// An edge that is not answered in time: from each `from` edge to the next `to` edge. A hit is the number of steps taken.
///
/// Where both fall into one instant, the order in which the exploration takes them may leave the `from` edge unanswered:
/// then it finds more than there is.
#[derive(Clone, Copy, Debug)]
pub struct Answered {
    /// The edge that asks.
    pub from: Edge,
    /// The edge that answers.
    pub to: Edge,
    /// The greatest distance, in ticks.
    pub max: i64,
    /// Must an answer come before the run ends at rest?
    pub must: bool,
}

impl Watch for Answered {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        (state & 1) as u8
    }

    fn start(&self, _plant: &Plant, _values: &[u64]) -> u32 {
        0
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let steps = steps(state, block);
        let (from, to) = (self.from.is_in(block), self.to.is_in(block));
        let runs = state & 1 == 1;
        if runs && block.zone.may_pass(block.row, self.max) {
            hit(steps);
        }
        let same_net = self.from.net == self.to.net;
        let asks = from && (same_net || !to);
        let keeps = runs && !to;
        let fates = if keeps { SAME } else { [Fate::Begin; 2] };
        (steps << 2 | u32::from(keeps || asks), fates)
    }

    fn arrive(&self, state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        let over = arrival.rest && arrival.ended;
        if state & 1 == 1 && over && self.must {
            hit(state >> 2);
        }
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        if state & 1 == 0 {
            return (state, true);
        }
        // at the end of a run time goes on, but nobody looks
        if zone.at(row, 0) < FREE && zone.may_pass(row, self.max) {
            hit(state >> 2);
        }
        (state, zone.bound(row, 0, at_most(self.max)))
    }
}

/// A high or low of a net that is shorter than its bound, between two transitions. A hit is the number of steps taken when
/// it ends.
#[derive(Clone, Copy, Debug)]
pub struct Width {
    /// The net, by its number in the plant.
    pub net: u32,
    /// Shortest `[low, high]`, in ticks; 0 where none is asked.
    pub least: [i64; 2],
}

impl Watch for Width {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        (state & 1) as u8
    }

    fn start(&self, _plant: &Plant, _values: &[u64]) -> u32 {
        0
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        let steps = steps(state, block);
        let Some(new) = block.change(self.net) else { return (steps << 2 | state & 1, SAME) };
        let least = self.least[usize::from(!new)];
        if state & 1 == 1 && least > 0 && may_be_below(block.zone, block.row, least) {
            hit(steps);
        }
        (steps << 2 | 1, [Fate::Begin; 2])
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, _hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        let most = self.least[0].max(self.least[1]);
        // from then on no transition ends a short one
        let over = state & 1 == 1 && !may_be_below(zone, row, most);
        (if over { state & !1 } else { state }, true)
    }
}
