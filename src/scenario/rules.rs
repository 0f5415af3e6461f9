//! What must hold, as written.

use serde::{Deserialize, Serialize};

use crate::circuit::NetId;
use crate::scenario::Mark;
use crate::time::Span;

/// A partial state: nets with the values they must have, in net order, each net once, not empty.
pub type Alternative = Vec<(NetId, bool)>;

/// All rules of a scenario. A rule that is not written has its default.
#[derive(Clone, Debug, Default)]
pub struct Rules {
    /// Partial states that must never show.
    pub never: Vec<Never>,
    /// Partial states in which the circuit must never rest.
    pub never_at_rest: Vec<NeverAtRest>,
    /// Order and distance of edges.
    pub timing: Vec<Timing>,
    /// Shortest highs and lows.
    pub min_pulse: Vec<MinPulse>,
    /// Nets that must not glitch. Default: the outputs.
    pub glitch_free: Vec<GlitchFree>,
    /// Was `glitch_free` written in the file?
    pub glitch_free_written: bool,
    /// Bound on the settling time of every watched net after every step.
    pub settle_within: Option<Span>,
    /// May outcomes of one step differ?
    pub critical_race: Permission,
    /// Was `critical_race` written in the file?
    pub critical_race_written: bool,
    /// May, must, or must not windows oscillate?
    pub oscillation: Oscillation,
    /// Was `oscillation` written in the file?
    pub oscillation_written: bool,
    /// Where a swallowed pulse breaks a rule.
    pub swallowed: Swallowed,
    /// May a step come before rest?
    pub before_rest: Before,
    /// Does the user accept what was not judged?
    pub accept_not_judged: bool,
}

/// A partial state that must never show, after any batch of events, for longer than a bound.
#[derive(Clone, Debug)]
pub struct Never {
    /// The user's name for it.
    pub name: Option<String>,
    /// The partial state.
    pub state: Alternative,
    /// 0: not even for no time; above: strictly longer breaks the rule.
    pub longer_than: Span,
    /// Where it was written.
    pub mark: Mark,
}

/// A partial state in which the circuit must never rest.
#[derive(Clone, Debug)]
pub struct NeverAtRest {
    /// The user's name for it.
    pub name: Option<String>,
    /// The partial state.
    pub state: Alternative,
    /// Where it was written.
    pub mark: Mark,
}

/// Distance from one kind of edge to another, over the whole run.
#[derive(Clone, Debug)]
pub struct Timing {
    /// The user's name for it.
    pub name: Option<String>,
    /// The earlier edge.
    pub from: EdgeSpec,
    /// The later edge.
    pub to: EdgeSpec,
    /// Least time from the latest `from` edge to each `to` edge.
    pub min: Option<Span>,
    /// Greatest time from each `from` edge to the next `to` edge.
    pub max: Option<Span>,
    /// Where it was written.
    pub mark: Mark,
}

/// Edges of one net.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct EdgeSpec {
    /// The net.
    pub net: NetId,
    /// Which of its edges.
    pub edge: EdgeKind,
}

/// Rise, fall, or both.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum EdgeKind {
    /// To 1.
    Rise,
    /// To 0.
    Fall,
    /// To 1 or to 0.
    Any,
}

impl EdgeKind {
    /// The word in a scenario.
    pub const fn name(self) -> &'static str {
        match self {
            EdgeKind::Rise => "rise",
            EdgeKind::Fall => "fall",
            EdgeKind::Any => "any",
        }
    }

    /// The kind of this name.
    pub fn from_name(name: &str) -> Option<EdgeKind> {
        [EdgeKind::Rise, EdgeKind::Fall, EdgeKind::Any].into_iter().find(|kind| kind.name() == name)
    }

    /// Is a change to this known value such an edge?
    pub const fn is(self, new: bool) -> bool {
        matches!((self, new), (EdgeKind::Any, _) | (EdgeKind::Rise, true) | (EdgeKind::Fall, false))
    }
}

/// Shortest high and low of one net between two transitions.
#[derive(Clone, Debug)]
pub struct MinPulse {
    /// The net.
    pub net: NetId,
    /// Shortest high.
    pub high: Option<Span>,
    /// Shortest low.
    pub low: Option<Span>,
    /// Where it was written.
    pub mark: Mark,
}

/// A net that must not glitch.
#[derive(Clone, Debug)]
pub struct GlitchFree {
    /// The net.
    pub net: NetId,
    /// Pulses shorter than this are tolerated; 0 tolerates none.
    pub shorter_than: Span,
    /// Where it was written.
    pub mark: Mark,
}

/// `allowed` or `forbidden`, forbidden by default.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Permission {
    /// Breaks a rule.
    #[default]
    Forbidden,
    /// Breaks nothing.
    Allowed,
}

/// `allowed` or `forbidden`, allowed by default.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Before {
    /// Breaks nothing.
    #[default]
    Allowed,
    /// Breaks a rule.
    Forbidden,
}

/// What is said of oscillation.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Oscillation {
    /// Breaks a rule.
    #[default]
    Forbidden,
    /// Breaks nothing.
    Allowed,
    /// Its absence breaks a rule: every sample must oscillate in at least one window (or in this step's).
    Required,
}

/// Where a swallowed pulse breaks a rule.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Swallowed {
    /// Nowhere; they are listed.
    #[default]
    Listed,
    /// At every gate.
    Forbidden,
    /// At these nets, in net order.
    At(Vec<NetId>),
}

/// Where nets must rest after a step: in one of several partial states.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Expectation {
    /// One or more.
    pub alternatives: Vec<Alternative>,
    /// Where it was written.
    pub mark: Mark,
}

/// How often a net must move in the window of a step.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct EdgeCount {
    /// The net.
    pub net: NetId,
    /// Fewest transitions.
    pub least: u32,
    /// Most transitions.
    pub most: u32,
}
