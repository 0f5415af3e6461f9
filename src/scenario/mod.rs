//! What is asked, in the program's own terms: circuit, delays, stimulus, rules, plan.
//!
//! A [`Scenario`] is made by a [`Builder`], which checks everything that can be checked without running anything and
//! hands back every fault at once, each with the [`Mark`]s of the calls it came from.

mod builder;
mod condition;
mod fault;
mod padding;
mod plot;
mod rules;
mod stimulus;

use std::sync::Arc;

use serde::{Deserialize, Serialize};

pub use builder::*;
pub use condition::*;
pub use fault::*;
pub use padding::*;
pub use plot::*;
pub use rules::*;
pub use stimulus::*;

use crate::circuit::{Circuit, NetId};
use crate::delay::{DelayModel, Marginal};
use crate::time::{Span, Unit};

/// The caller's key to the place where something was said; handed in with a builder call, handed back in a fault.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Mark(pub u32);

/// Everything that is asked of one circuit. Parts are shared, so a variant is a cheap clone.
#[derive(Clone, Debug)]
pub struct Scenario {
    /// Title for pictures and texts; the file stem where none was given.
    pub title: String,
    /// The unit of bare numbers in the file, and of all output.
    pub unit: Unit,
    /// The network.
    pub circuit: Arc<Circuit>,
    /// Delay ranges and filters.
    pub delays: Arc<DelayModel>,
    /// Steps and clocks.
    pub stimulus: Arc<Stimulus>,
    /// What must hold.
    pub rules: Arc<Rules>,
    /// The nets that the user looks at, in file order.
    pub outputs: Vec<NetId>,
    /// Outputs and nets under `glitch_free`, in net order.
    pub watched: Vec<NetId>,
    /// Where a run begins.
    pub begin: Begin,
    /// A second network that says what is wanted.
    pub reference: Option<Arc<Reference>>,
    /// Limits of one window.
    pub limits: Limits,
    /// The sweep.
    pub plan: Plan,
    /// Where delay may be added to cure what is refuted, in order; `None`: not said, see [`Scenario::paddable`].
    pub padding: Option<Vec<Padded>>,
    /// What pictures of waves show, where the file says so.
    pub plot: Plot,
    /// Conditions of temperature and supply, in the order of the file; each is swept as a case of its own.
    pub conditions: Vec<Condition>,
    /// What the user should know of the scenario as it was understood, in the order of the file.
    pub notes: Vec<String>,
    /// What was read and checked but is not analysed yet, in the order of the file; each is a whole sentence. While there
    /// is any, no verdict is better than undecided.
    pub not_analysed: Vec<String>,
}

/// Where a run begins.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Begin {
    /// In a stable state; the named nets choose among several.
    AtRest {
        /// Nets of `[initial]` and their values.
        named: Vec<(NetId, bool)>,
    },
    /// Every gate output is a random bit.
    Random,
    /// Every gate output is X.
    Unknown,
}

/// Limits of one window of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Limits {
    /// Most transitions of nets, inputs counted.
    pub transitions: u64,
    /// Longest time from the window's start.
    pub time: Option<Span>,
}

impl Default for Limits {
    fn default() -> Limits {
        Limits { transitions: 100_000, time: None }
    }
}

/// The sweep: how many draws of what.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Plan {
    /// Number of samples, at least 1.
    pub samples: u64,
    /// Seed of all draws.
    pub seed: u64,
    /// Samples a board, at least 1.
    pub tries: u64,
    /// How delays spread over their ranges.
    pub draw: Marginal,
    /// How often the delay of a gate is drawn.
    pub vary: Vary,
    /// Runs that a directed search may take for each question; 0: none.
    pub search: u64,
}

/// How often the delay of a gate is drawn.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Vary {
    /// Once a board: part differs from part.
    #[default]
    PerPart,
    /// Anew for each event that a gate schedules: jitter. What a group has in common, wires and clock periods stay those of
    /// the board.
    PerEvent,
}

impl Vary {
    /// All of them, in the order of the documentation.
    pub const ALL: [Vary; 2] = [Vary::PerPart, Vary::PerEvent];

    /// The name in a scenario.
    pub const fn name(self) -> &'static str {
        match self {
            Vary::PerPart => "per-part",
            Vary::PerEvent => "per-event",
        }
    }
}

impl Plan {
    /// Least number of runs that a directed search of one question needs to try its starts and look at what it finds.
    pub const LEAST_SEARCH: u64 = 50;
}

impl Default for Plan {
    fn default() -> Plan {
        Plan { samples: 10_000, seed: 1, tries: 1, draw: Marginal::Uniform, vary: Vary::PerPart, search: 1_000 }
    }
}

/// The reference network. Its nets are its own: a [`RefNet`] cannot be taken for a net of the circuit.
#[derive(Clone, Debug)]
pub struct Reference {
    /// The network; same inputs, in the same order.
    pub circuit: Circuit,
    /// Nets compared: of the circuit and of the reference, each once.
    pub compare: Vec<(NetId, RefNet)>,
}

/// A net of the reference network.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct RefNet(pub NetId);

impl Scenario {
    /// Why a net is watched, for people: `output`, `glitch_free`, or both.
    pub fn why_watched(&self, net: NetId) -> &'static str {
        match (self.outputs.contains(&net), self.rules.glitch_free.iter().any(|g| g.net == net)) {
            (true, true) => "output, glitch_free",
            (true, false) => "output",
            (false, _) => "glitch_free",
        }
    }

    /// The moment of the power-up window, for a run that does not begin at rest.
    pub fn begin_window(&self) -> Option<u32> {
        (!matches!(self.begin, Begin::AtRest { .. })).then_some(0)
    }
}
