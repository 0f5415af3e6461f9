//! The inequality that decides: two sums of delays that must keep their order.

use crate::circuit::{GateId, NetId, WireId};
use crate::delay::DelayRange;
use crate::scenario::{Place, Scenario};
use crate::time::Span;

/// A delay or a time that a scenario gives a range.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Quantity {
    /// Delay of a gate, with the edges that count, `[fall, rise]`; both only if one draw gives both.
    Gate(GateId, [bool; 2]),
    /// Delay of a wire, with the edges that count.
    Wire(WireId, [bool; 2]),
    /// Place of a step: from the start or from the step before.
    Place(u32),
    /// How much later than the first of its step an input changes.
    Late(u32, NetId),
    /// How much later than its step an input toggles that bounces.
    Toggle {
        /// The step.
        step: u32,
        /// The input.
        net: NetId,
        /// Which toggle, from 0.
        number: u32,
        /// Is it the last?
        last: bool,
    },
    /// First edge of a clock (by its number in the scenario), from the start.
    First(u32),
    /// Period of a clock.
    Period(u32),
    /// Time high of a clock.
    High(u32),
    /// How much later than the earliest that jitter allows an edge of a clock comes.
    Jitter(u32, u32),
}

impl Quantity {
    /// Its range.
    pub fn range(self, scenario: &Scenario) -> DelayRange {
        let edge = |edges: [bool; 2]| usize::from(!edges[0]);
        match self {
            Quantity::Gate(gate, edges) => scenario.delays.gate[gate.index()][edge(edges)],
            Quantity::Wire(wire, edges) => scenario.delays.wire[wire.index()][edge(edges)],
            Quantity::Place(step) => match &scenario.stimulus.steps[step as usize].place {
                Place::At(range) | Place::After(range) | Place::When { wait: range, .. } => *range,
                Place::Rest(wait) => DelayRange::exact(*wait),
            },
            Quantity::First(clock) => scenario.stimulus.clocks[clock as usize].first,
            Quantity::Period(clock) => scenario.stimulus.clocks[clock as usize].period,
            Quantity::High(clock) => scenario.stimulus.clocks[clock as usize].high,
            Quantity::Jitter(clock, _) => {
                let jitter = scenario.stimulus.clocks[clock as usize].jitter;
                DelayRange { min: Span::ZERO, typ: jitter, max: jitter + jitter }
            }
            Quantity::Toggle { step, last, .. } => {
                let bounce = scenario.stimulus.steps[step as usize].bounce.as_ref();
                let lasting = bounce.map_or_else(DelayRange::default, |bounce| bounce.lasting);
                if last { lasting } else { DelayRange::between(Span::ZERO, lasting.max) }
            }
            Quantity::Late(step, _) => {
                let skew = scenario.stimulus.steps[step as usize].skew.unwrap_or_default();
                DelayRange { max: skew.max - skew.min, ..DelayRange::exact(Span::ZERO) }
            }
        }
    }

    /// Is it a delay of the circuit, and not a time of its surroundings?
    pub const fn is_delay(self) -> bool {
        matches!(self, Quantity::Gate(..) | Quantity::Wire(..))
    }
}

/// How two sums must stand to each other.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Relation {
    /// The first below the second.
    Below,
    /// The first not above the second.
    NotAbove,
    /// Not exactly equal.
    Apart,
}

impl Relation {
    /// The word used in files.
    pub const fn word(self) -> &'static str {
        match self {
            Relation::Below => "below",
            Relation::NotAbove => "not-above",
            Relation::Apart => "apart",
        }
    }
}

/// A sum of quantities, each a whole number of times, and a time.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Sum {
    /// Quantities with their factors, above 0.
    pub terms: Vec<(Quantity, u64)>,
    /// The time, in femtoseconds.
    pub constant: u128,
}

impl Sum {
    /// Least and greatest value over the ranges of a scenario, in femtoseconds.
    pub fn range(&self, scenario: &Scenario) -> [i128; 2] {
        self.terms.iter().fold([self.constant as i128; 2], |[least, most], (quantity, factor)| {
            let range = quantity.range(scenario);
            let times = i128::from(*factor);
            [least + times * i128::from(range.min.fs()), most + times * i128::from(range.max.fs())]
        })
    }
}

/// The inequality that decides a claim: where it is kept, what breaks the claim cannot happen on the way that was found.
/// Found from the exact linear program of that way (its dual prices, or its single conditions), and told only if runs on
/// both sides of it, next to it, differ.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Race {
    /// The sum that must come first.
    pub first: Sum,
    /// How they must stand.
    pub relation: Relation,
    /// The sum that must come later.
    pub second: Sum,
}

impl Race {
    /// How far the first sum can exceed the second over the ranges, in femtoseconds; what is below 0 is in hand.
    pub fn short(&self, scenario: &Scenario) -> i128 {
        self.first.range(scenario)[1] - self.second.range(scenario)[0]
    }
}
