//! What an exploration looks for besides the states at rest: an observer with a small state of its own and up to two
//! clocks.

use super::plant::Plant;
use super::zone::Matrix;

/// Where a clock of a watch comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fate {
    /// It is the clock of this place before.
    Keep(u8),
    /// It begins at 0.
    Begin,
}

/// Both clocks stay what they are.
pub const SAME: [Fate; 2] = [Fate::Keep(0), Fate::Keep(1)];

/// A batch of events at one instant, or a part of one that can go first.
#[derive(Clone, Copy, Debug)]
pub struct Block<'a> {
    /// The plant.
    pub plant: &'a Plant,
    /// Values of the signals before, a bit a signal.
    pub before: &'a [u64],
    /// Values after.
    pub after: &'a [u64],
    /// The first step that is in it, by number.
    pub step: Option<usize>,
    /// How many steps come at that instant: they share a window.
    pub steps: usize,
    /// The windows of the steps and edges in it, first first; see [`Rest`](super::Rest).
    pub opens: &'a [u32],
    /// Did nothing pend in what is asked about before it?
    pub rested: bool,
    /// Do inputs that are asked about change in it, of a step that came before?
    pub late: bool,
    /// Are there inputs that are asked about and that the last step has still to change after it?
    pub moving: bool,
    /// Gates that were excited and no longer are, without having fired, with the rows of their clocks.
    pub disabled: &'a [(u32, usize)],
    /// The time since each clock began, as a zone at the instant of the block, before any clock begins anew.
    pub zone: &'a Matrix,
    /// The row of the watch's first clock; the second is the next.
    pub row: usize,
}

impl Block<'_> {
    /// Does this net change? To which value?
    pub fn change(&self, net: u32) -> Option<bool> {
        let (before, after) = (super::key::bit(self.before, net as usize), super::key::bit(self.after, net as usize));
        (before != after).then_some(after)
    }

    /// Do the steps in it change an input here, now or later?
    pub fn touches(&self) -> bool {
        if self.opens.len() > self.steps {
            // an edge of a clock changes what it drives
            return true;
        }
        let Some(step) = self.step else { return false };
        let steps = &self.plant.steps[step..step + self.steps];
        // a contact that bounces moves, whatever it leads to
        let bounces = steps.last().is_some_and(|step| step.bounce.is_some()) && self.moving;
        // the last one to set an input decides
        bounces || steps.iter().enumerate().any(|(at, step)| {
            step.set.iter().any(|(net, value)| {
                let again = steps[at + 1..].iter().any(|later| later.set.iter().any(|set| set.0 == *net));
                self.plant.core[*net as usize] && !again && super::key::bit(self.before, *net as usize) != *value
            })
        })
    }
}

/// A state that was arrived at.
#[derive(Clone, Copy, Debug)]
pub struct Arrival<'a> {
    /// The plant.
    pub plant: &'a Plant,
    /// Values of the signals, a bit a signal.
    pub values: &'a [u64],
    /// Does nothing pend in what is asked about?
    pub rest: bool,
    /// The window; see [`Rest`](super::Rest).
    pub window: u32,
    /// Has everything come from outside that can?
    pub ended: bool,
    /// The zone on arrival, cut to those cases in which time goes on before the next batch; whole if the watch says that it
    /// does not look at it.
    pub zone: &'a Matrix,
    /// The row of the watch's first clock.
    pub row: usize,
}

/// An observer of an exploration. A hit is something found, by a number of the watch's own choosing; the first way to each
/// is kept.
pub trait Watch {
    /// Clocks that run in this state.
    fn clocks(&self, state: u32) -> u8;

    /// The state at the start.
    fn start(&self, plant: &Plant, values: &[u64]) -> u32;

    /// A block of changes: the next state, and where the clocks that run in it come from.
    fn block(&self, state: u32, block: &Block<'_>, hit: &mut dyn FnMut(u32)) -> (u32, [Fate; 2]);

    /// Does [`Watch::arrive`] look at the zone? Without, it need not be worked out.
    fn measures(&self) -> bool {
        true
    }

    /// A state that lasts was arrived at.
    fn arrive(&self, _state: u32, _arrival: &Arrival<'_>, _hit: &mut dyn FnMut(u32)) {}

    /// Time has passed: the zone may be cut to what is still of interest, and the last clock may end if it is of none any
    /// more (the new state says so). False: nothing is left of interest.
    fn elapsed(&self, state: u32, _zone: &mut Matrix, _row: usize, _hit: &mut dyn FnMut(u32)) -> (u32, bool) {
        (state, true)
    }
}

/// Looks for nothing.
#[derive(Clone, Copy, Debug, Default)]
pub struct Nothing;

impl Watch for Nothing {
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
}
