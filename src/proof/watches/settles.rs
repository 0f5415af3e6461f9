//! How long it takes to settle: of whole windows, and of one net.

use std::cell::RefCell;
use std::collections::BTreeMap;

use crate::proof::plant::Plant;
use crate::proof::watch::{Arrival, Block, Fate, SAME, Watch};
use crate::proof::zone::{Matrix, below, limit};

/// How long windows take to settle: the time since the last input change of a step. Only for plants in which every window
/// comes to rest.
///
/// A hit is a number of steps taken; [`Settles::figures`] has the least and greatest time of each.
#[derive(Debug, Default)]
pub struct Settles {
    /// For each number of steps taken the least and greatest time to rest, in ticks, each with whether it is reached.
    pub figures: RefCell<BTreeMap<u32, [(i64, bool); 2]>>,
}

impl Settles {
    /// A window is open, and its time runs.
    const RUNS: u32 = 1;
    /// Only edges of clocks opened it: it counts from them, whatever inputs a step before them still changes.
    const EDGE: u32 = 2;
}

impl Watch for Settles {
    fn clocks(&self, state: u32) -> u8 {
        u8::from(state & Self::RUNS != 0)
    }

    fn start(&self, plant: &Plant, _values: &[u64]) -> u32 {
        u32::from(plant.power_up)
    }

    fn block(&self, state: u32, block: &Block<'_>, _hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        match block.opens.is_empty() {
            false if block.step.is_none() => (Self::RUNS | Self::EDGE, [Fate::Begin; 2]),
            false => (Self::RUNS, [Fate::Begin; 2]),
            true if block.late && state & Self::EDGE == 0 => (state, [Fate::Begin; 2]),
            true => (state, SAME),
        }
    }

    fn arrive(&self, state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        if arrival.rest && state & Self::RUNS != 0 {
            let (least, most) = (arrival.zone.at(0, arrival.row), arrival.zone.at(arrival.row, 0));
            let (least, most) = (limit(least), limit(most));
            let mut figures = self.figures.borrow_mut();
            let [first, last] = figures.entry(arrival.window).or_insert([(-least.0, least.1), most]);
            if (-least.0, !least.1) < (first.0, !first.1) {
                *first = (-least.0, least.1);
            }
            *last = (*last).max(most);
            hit(arrival.window);
        }
    }
}

/// A transition of a net later than a bound, from the last input change of the step that touches it. A hit is the number
/// of steps taken when that step had come; 0 for the power-up window.
#[derive(Clone, Debug)]
pub struct Late {
    /// The net, by its number in the plant, which should be its cone.
    pub net: u32,
    /// The bound by number of steps taken, in ticks; `None` where nothing is asked.
    pub bounds: Vec<Option<i64>>,
}

impl Late {
    /// Within the bound, or nothing asked.
    const ASKED: u32 = 1;
    /// Beyond the bound for sure.
    const PAST: u32 = 2;
    /// Only edges of clocks opened the window: it counts from them.
    const EDGE: u32 = 4;

    fn window(state: u32) -> u32 {
        state >> 3
    }

    fn bound(&self, state: u32) -> Option<i64> {
        self.bounds.get(Self::window(state) as usize).copied().flatten()
    }

    fn begin(&self, window: u32) -> u32 {
        let state = window << 3;
        if self.bound(state).is_some() { state | Self::ASKED } else { state }
    }
}

impl Watch for Late {
    fn measures(&self) -> bool {
        false
    }

    fn clocks(&self, state: u32) -> u8 {
        u8::from(state & Self::ASKED != 0)
    }

    fn start(&self, plant: &Plant, _values: &[u64]) -> u32 {
        if plant.power_up { self.begin(0) } else { 0 }
    }

    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        if let (Some(first), true) = (block.opens.first(), block.touches()) {
            // of steps of one instant the first that is asked names the window
            let asked = block.opens.iter().find(|window| self.begin(**window) & Self::ASKED != 0);
            let edge = if block.step.is_none() { Self::EDGE } else { 0 };
            return (self.begin(*asked.unwrap_or(first)) | edge, [Fate::Begin; 2]);
        }
        let own = state & Self::EDGE == 0;
        if block.late && own && state & (Self::ASKED | Self::PAST) != 0 {
            return ((state & !Self::PAST) | Self::ASKED, [Fate::Begin; 2]);
        }
        // the time counts from the last input change
        if block.change(self.net).is_some() && !(own && block.moving) {
            let late = match self.bound(state) {
                Some(bound) if state & Self::ASKED != 0 => block.zone.may_pass(block.row, bound),
                _ => state & Self::PAST != 0,
            };
            if late {
                hit(Self::window(state));
            }
        }
        (state, SAME)
    }

    fn elapsed(&self, state: u32, zone: &mut Matrix, row: usize, _hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        match self.bound(state) {
            Some(bound) if state & Self::ASKED != 0 && zone.at(0, row) <= below(-bound) => {
                ((state & !Self::ASKED) | Self::PAST, true)
            }
            _ => (state, true),
        }
    }
}
