//! Causal paths, and the two that race. Words shared by sweep and proof.

use crate::circuit::{NetId, WireId};
use crate::logic::Value;
use crate::time::{Span, Time};

/// One delay of a path: a gate that answers, or a wire that carries.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Leg {
    /// The gate's net; of a wire the net that it carries.
    pub net: NetId,
    /// The wire, if it is one.
    pub wire: Option<WireId>,
    /// The value that it takes.
    pub new: Value,
    /// How long it took.
    pub delay: Span,
    /// When it came.
    pub at: Time,
    /// False for an event that was cancelled before it came; `at` is when it would have come.
    pub came: bool,
}

/// What led to one change: an input (or the start), then one leg after the other.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Path {
    /// The change that it begins with: of an input; of a gate where the path is a loop once round, or was cut. `None`: the
    /// state at power-up.
    pub from: Option<(NetId, Value)>,
    /// The moment that made that change, if it was one: the latest that sets this input.
    pub moment: Option<u32>,
    /// When it begins.
    pub at: Time,
    /// Its legs, in order.
    pub legs: Vec<Leg>,
    /// Legs before these that are left out, since the path is longer than [`Path::MOST`]; it then begins with a gate.
    pub left_out: u32,
}

impl Path {
    /// Most legs that a path keeps: its last ones.
    pub const MOST: usize = 1000;

    /// The sum of its delays.
    pub fn total(&self) -> Span {
        self.legs.iter().fold(Span::ZERO, |sum, leg| sum + leg.delay)
    }

    /// When its last leg comes.
    pub fn end(&self) -> Time {
        self.at + self.total()
    }

    /// The net that it ends at.
    pub fn last(&self) -> Option<NetId> {
        self.legs.last().map(|leg| leg.net).or(self.from.map(|from| from.0))
    }
}

/// The two paths that race to one gate or rule, what they have in common left out of neither.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RacePair {
    /// Path A: that of the change that came first, or won; where there is one path only, that one.
    pub first: Path,
    /// Path B: that of the other. `None`: one path against a bound, or a loop once round.
    pub second: Option<Path>,
    /// The net where they meet: its gate decides. `None` where it is a rule that compares them.
    pub meet: Option<NetId>,
}

impl RacePair {
    /// One path, raced by nothing but a bound.
    pub(super) fn single(first: Path) -> RacePair {
        RacePair { first, second: None, meet: None }
    }

    /// Two paths that a rule compares.
    pub(super) fn compared(first: Path, second: Path) -> RacePair {
        RacePair { first, second: Some(second), meet: None }
    }

    /// Two paths that end at the edges of one pulse: they meet at the gate from which on both go the same way.
    pub(super) fn of_a_pulse(first: Path, second: Path) -> RacePair {
        let way = |path: &Path| {
            let start = path.from.map(|(net, _)| (net, None));
            start.into_iter().chain(path.legs.iter().map(|leg| (leg.net, leg.wire))).collect::<Vec<_>>()
        };
        let (a, b) = (way(&first), way(&second));
        let common = a.iter().rev().zip(b.iter().rev()).take_while(|(a, b)| a == b);
        let meet = common.map(|(it, _)| it).filter(|it| it.1.is_none()).last().map(|it| it.0);
        RacePair { first, second: Some(second), meet }
    }
}
