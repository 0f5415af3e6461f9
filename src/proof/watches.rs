//! Watches for single questions.

use super::key::bit;
use super::plant::Plant;
use super::watch::{Arrival, Block, Fate, SAME, Watch};
use super::zone::limit;

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
        if block.touches() {
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
            hit((arrival.steps as u32) << 8 | (state & 0x7F) << 1 | before);
        }
    }
}

/// A partial state that shows, for no matter how short a time.
#[derive(Clone, Debug)]
pub struct Shows {
    /// Nets by their number in the plant, and values.
    pub pattern: Vec<(u32, bool)>,
}

impl Watch for Shows {
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
        if self.pattern.iter().all(|(net, value)| bit(arrival.values, *net as usize) == *value) {
            hit(arrival.steps as u32);
        }
    }
}

/// How long windows take to settle: the time since the last input change of a step. Only for plants in which every window
/// comes to rest.
///
/// A hit is a number of steps taken; [`Settles::figures`] has the least and greatest time of each.
#[derive(Debug, Default)]
pub struct Settles {
    /// For each number of steps taken the least and greatest time to rest, in ticks, each with whether it is reached.
    pub figures: std::cell::RefCell<std::collections::BTreeMap<u32, [(i64, bool); 2]>>,
}

impl Watch for Settles {
    fn clocks(&self, state: u32) -> u8 {
        state as u8
    }

    fn start(&self, plant: &Plant, _values: &[u64]) -> u32 {
        u32::from(plant.power_up)
    }

    fn block(&self, state: u32, block: &Block<'_>, _hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]) {
        match block.step {
            Some(_) => (1, [Fate::Begin; 2]),
            None if block.late => (state, [Fate::Begin; 2]),
            None => (state, SAME),
        }
    }

    fn arrive(&self, state: u32, arrival: &Arrival<'_>, hit: &mut dyn FnMut(u32)) {
        if arrival.rest && state == 1 {
            let (least, most) = (arrival.zone.at(0, arrival.row), arrival.zone.at(arrival.row, 0));
            let (least, most) = (limit(least), limit(most));
            let mut figures = self.figures.borrow_mut();
            let [first, last] = figures.entry(arrival.steps as u32).or_insert([(-least.0, least.1), most]);
            if (-least.0, !least.1) < (first.0, !first.1) {
                *first = (-least.0, least.1);
            }
            *last = (*last).max(most);
            hit(arrival.steps as u32);
        }
    }
}
