//! Delay ranges, what a gate does with short pulses, and the maps from a random number to a delay.
//! No random generator lives here.

mod involution;
mod quantile;
mod scaled;
mod together;

use serde::{Deserialize, Serialize};

pub use involution::{involution, is_causal, recovered};
pub use quantile::Marginal;
pub use together::{Billionths, Group, Together};

use crate::circuit::GateId;
use crate::time::Span;

/// `min ≤ typ ≤ max`, each below 2^62 fs.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub struct DelayRange {
    /// Shortest.
    pub min: Span,
    /// What the typical run takes.
    pub typ: Span,
    /// Longest.
    pub max: Span,
}

impl DelayRange {
    /// Always the same.
    pub const fn exact(span: Span) -> DelayRange {
        DelayRange { min: span, typ: span, max: span }
    }

    /// From `min` to `max`, typically in the middle (rounded down).
    pub const fn between(min: Span, max: Span) -> DelayRange {
        DelayRange { min, typ: Span::from_fs(min.fs() + (max.fs() - min.fs()) / 2), max }
    }

    /// Are all three the same?
    pub fn is_exact(self) -> bool {
        self.min == self.max
    }
}

/// What a gate does with pulses that are short against its delay; IEEE 1076 words.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Filter {
    /// A pulse shorter than the delay is swallowed.
    #[default]
    Inertial,
    /// Every pulse passes.
    Transport,
    /// Pulses not longer than this are swallowed.
    Reject(Span),
    /// Short pulses shrink from stage to stage; the time constant. See [`involution`].
    Involution(Span),
}

/// The ranges of one circuit. Edges are indexed by the new value: `[fall, rise]`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct DelayModel {
    /// For each gate, the ranges of `[fall, rise]`.
    pub gate: Vec<[DelayRange; 2]>,
    /// For each gate: do both edges take one draw (one `delay` entry)?
    pub gate_one_draw: Vec<bool>,
    /// For each wire, the ranges of `[fall, rise]`.
    pub wire: Vec<[DelayRange; 2]>,
    /// For each wire: do both edges take one draw?
    pub wire_one_draw: Vec<bool>,
    /// For each gate, what it does with short pulses.
    pub filter: Vec<Filter>,
    /// Gates whose delays belong together; no gate is in two groups.
    pub groups: Vec<Group>,
    /// Gates with a minimum that was assumed from typical, in gate order.
    pub assumed_min: Vec<GateId>,
    /// Gates that were given no delay and have one time unit, in gate order.
    pub no_delay: Vec<GateId>,
}

/// Concrete delays of one case, indexed by the new value: `[fall, rise]`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Delays {
    /// Of each gate.
    pub gate: Vec<[Span; 2]>,
    /// Of each wire.
    pub wire: Vec<[Span; 2]>,
}
