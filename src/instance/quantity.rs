//! What of a case may vary: every delay, step place and clock figure that has a range, by name.

use super::Instance;
use crate::delay::DelayRange;
use crate::scenario::{Place, Scenario};
use crate::time::Span;

/// A quantity that is not exact: what it is, its range, its place in the stream that it is drawn from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Quantity {
    /// What it is.
    pub target: Target,
    /// Its range; of an edge moved by jitter: how much later than the earliest, so the middle is no jitter.
    pub range: DelayRange,
    /// Its place in the stream of the board or the sample, counted in u64s; see [`super::Sampler`].
    pub place: u64,
}

/// One quantity of a case.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Target {
    /// Delay of one edge of a gate.
    Gate {
        /// The gate.
        gate: u32,
        /// 0 fall, 1 rise.
        edge: u8,
    },
    /// Delay of both edges of a gate, of one draw.
    GateBoth(u32),
    /// Delay of one edge of a wire.
    Wire {
        /// The wire.
        wire: u32,
        /// 0 fall, 1 rise.
        edge: u8,
    },
    /// Delay of both edges of a wire, of one draw.
    WireBoth(u32),
    /// Period of a clock.
    Period(u32),
    /// Time high of a clock.
    High(u32),
    /// Place of a step: from the start, from the step before, or the wait.
    Place(u32),
    /// How much later than its step one input changes.
    Skew {
        /// The step.
        step: u32,
        /// The number of the input in the step's `set`.
        entry: u32,
    },
    /// First edge of a clock.
    First(u32),
    /// By how much jitter moves an edge of a clock, counted from the earliest.
    Jitter {
        /// The clock.
        clock: u32,
        /// The edge, from 0.
        edge: u32,
    },
}

/// All quantities of a scenario that are not exact, in the order of their places.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Quantities {
    /// What a board draws: delays of gates and wires, clock periods.
    /// Where firings are drawn anew ([`Vary::PerEvent`](crate::scenario::Vary)) no sample draws the delays of gates here: they
    /// are those of a case without [`Firings`](super::Firings).
    pub board: Vec<Quantity>,
    /// What a sample draws: step places, skew, clock phases, jitter.
    pub sample: Vec<Quantity>,
    /// Where in the stream of a sample the start bits of gates are.
    pub(super) start_place: u64,
}

impl Quantities {
    /// The quantities of a scenario.
    pub fn of(scenario: &Scenario) -> Quantities {
        let (gates, wires) = (scenario.circuit.gate_count() as u64, scenario.circuit.wire_count() as u64);
        let stimulus = &scenario.stimulus;
        let mut board_plan = Vec::new();
        let mut add = |place: u64, range: DelayRange, target: Target| {
            if !range.is_exact() {
                board_plan.push(Quantity { place, range, target });
            }
        };
        for (g, edges) in scenario.delays.gate.iter().enumerate() {
            let (place, gate) = (2 * g as u64, g as u32);
            if scenario.delays.gate_one_draw[g] {
                add(place, edges[0], Target::GateBoth(gate));
            } else {
                add(place, edges[0], Target::Gate { gate, edge: 0 });
                add(place + 1, edges[1], Target::Gate { gate, edge: 1 });
            }
        }
        for (w, edges) in scenario.delays.wire.iter().enumerate() {
            let (place, wire) = (2 * (gates + w as u64), w as u32);
            if scenario.delays.wire_one_draw[w] {
                add(place, edges[0], Target::WireBoth(wire));
            } else {
                add(place, edges[0], Target::Wire { wire, edge: 0 });
                add(place + 1, edges[1], Target::Wire { wire, edge: 1 });
            }
        }
        for (c, clock) in stimulus.clocks.iter().enumerate() {
            let place = 2 * (gates + wires + c as u64);
            add(place, clock.period, Target::Period(c as u32));
            add(place + 1, clock.high, Target::High(c as u32));
        }

        let mut sample_plan = Vec::new();
        let mut add = |place: u64, range: DelayRange, target: Target| {
            if !range.is_exact() {
                sample_plan.push(Quantity { place, range, target });
            }
        };
        let mut place = 0u64;
        for (s, step) in stimulus.steps.iter().enumerate() {
            if let Place::At(range) | Place::After(range) | Place::When { wait: range, .. } = &step.place {
                add(place, *range, Target::Place(s as u32));
            }
            place += 1;
            for entry in 0..step.set.len() {
                if let Some(skew) = step.skew {
                    add(place, skew, Target::Skew { step: s as u32, entry: entry as u32 });
                }
                place += 1;
            }
        }
        for (c, clock) in stimulus.clocks.iter().enumerate() {
            add(place, clock.first, Target::First(c as u32));
            place += 1;
            let range = DelayRange::between(Span::ZERO, clock.jitter + clock.jitter);
            for edge in 0..2 * clock.count {
                add(place, range, Target::Jitter { clock: c as u32, edge });
                place += 1;
            }
        }
        Quantities { board: board_plan, sample: sample_plan, start_place: place }
    }

    /// All of them, those of the board first.
    pub fn iter(&self) -> impl Iterator<Item = &Quantity> {
        self.board.iter().chain(&self.sample)
    }
}

impl Instance {
    /// The value of a quantity in this case; of both edges that of the fall. Jitter counts from the earliest, which is
    /// `jitter` of the clock before: the range of its [`Quantity`] has no jitter in the middle.
    pub fn get(&self, quantity: &Quantity) -> Span {
        match quantity.target {
            Target::Gate { gate, edge } => self.delays.gate[gate as usize][edge as usize],
            Target::GateBoth(gate) => self.delays.gate[gate as usize][0],
            Target::Wire { wire, edge } => self.delays.wire[wire as usize][edge as usize],
            Target::WireBoth(wire) => self.delays.wire[wire as usize][0],
            Target::Period(clock) => self.clocks[clock as usize].period,
            Target::High(clock) => self.clocks[clock as usize].high,
            Target::Place(step) => self.places[step as usize],
            Target::Skew { step, entry } => self.skews[step as usize][entry as usize],
            Target::First(clock) => self.clocks[clock as usize].first,
            Target::Jitter { clock, edge } => {
                let middle = quantity.range.max.fs() / 2;
                Span::from_fs(middle.saturating_add_signed(self.clocks[clock as usize].jitter[edge as usize]))
            }
        }
    }

    /// Gives a quantity a value.
    pub fn set(&mut self, quantity: &Quantity, span: Span) {
        match quantity.target {
            Target::Gate { gate, edge } => self.delays.gate[gate as usize][edge as usize] = span,
            Target::GateBoth(gate) => self.delays.gate[gate as usize] = [span, span],
            Target::Wire { wire, edge } => self.delays.wire[wire as usize][edge as usize] = span,
            Target::WireBoth(wire) => self.delays.wire[wire as usize] = [span, span],
            Target::Period(clock) => self.clocks[clock as usize].period = span,
            Target::High(clock) => self.clocks[clock as usize].high = span,
            Target::Place(step) => self.places[step as usize] = span,
            Target::Skew { step, entry } => self.skews[step as usize][entry as usize] = span,
            Target::First(clock) => self.clocks[clock as usize].first = span,
            Target::Jitter { clock, edge } => {
                let middle = quantity.range.max.fs() / 2;
                self.clocks[clock as usize].jitter[edge as usize] = span.fs() as i64 - middle as i64;
            }
        }
    }
}
