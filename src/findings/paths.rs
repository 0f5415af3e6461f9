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
    /// The input's change that it begins with; `None`: the state at power-up.
    pub from: Option<(NetId, Value)>,
    /// The moment that made that change, if it was one.
    pub moment: Option<u32>,
    /// When it begins.
    pub at: Time,
    /// Its legs, in order.
    pub legs: Vec<Leg>,
}

impl Path {
    /// The sum of its delays.
    pub fn total(&self) -> Span {
        self.legs.iter().fold(Span::ZERO, |sum, leg| sum + leg.delay)
    }

    /// When its last leg comes.
    pub fn end(&self) -> Time {
        self.at + self.total()
    }
}

/// The two paths that race to one gate or rule, what they have in common left out of neither.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RacePair {
    /// Path A: that of the change that should have lost, or came first.
    pub first: Path,
    /// Path B: that of the other.
    pub second: Path,
    /// The net where they meet.
    pub meet: Option<NetId>,
}
