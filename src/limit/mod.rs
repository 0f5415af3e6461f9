//! How fast may it go: the shortest spacing of steps, the narrowest pulse, the shortest clock period, the longest skew, the
//! shortest setup and hold for which all rules pass over the draws.
//!
//! A value *passes* if in no draw a rule is broken, every question that was judged at the easy end of the range was judged
//! as often, every window settled, and no X remained at rest that was not there at the easy end; all of this under every
//! condition of the scenario. What a limit says is said of so many draws; it is no proof, unless all draws are alike.
//!
//! The scenario with another value is built from its own steps and clocks, and the checks of the
//! [`Builder`](crate::scenario::Builder) decide which values are possible.

mod parameter;
mod places;
mod report;
mod search;
mod trial;
mod variant;

pub use parameter::{Easy, Parameter, Side};
pub use report::{Beyond, Boundary, Breach, Cause, LimitReport, MapReport, Outcome, Point, Range, Stretch};
pub use search::{limit, map};
pub use variant::Legal;

use crate::delay::Filter;
use crate::scenario::Scenario;

/// What is searched for, and how far.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Search {
    /// What is varied.
    pub parameter: Parameter,
    /// Least value, fs; `None`: chosen from the scenario.
    pub from: Option<i64>,
    /// Greatest value, fs; `None`: chosen from the scenario.
    pub to: Option<i64>,
    /// How close the two values at a boundary must be, fs; `None`: 1 fs if all draws are alike, else a thousandth of the
    /// range, rounded down to 1, 2 or 5 times a power of ten.
    pub within: Option<u64>,
    /// Values of the first scan, at least 2.
    pub points: u32,
}

impl Search {
    /// Values of the first scan, if nothing is said.
    pub const POINTS: u32 = 33;

    /// A search with everything chosen from the scenario.
    pub const fn of(parameter: Parameter) -> Search {
        Search { parameter, from: None, to: None, within: None, points: Search::POINTS }
    }
}

/// Why a search came to no end.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum LimitError {
    /// What was asked cannot be done.
    #[error("{0}")]
    Bad(String),
    /// The program contradicts itself.
    #[error("{0}")]
    Contradiction(String),
    /// The control cancelled it before anything could be said.
    #[error("interrupted")]
    Cancelled,
}

/// What gates do with short pulses, for the figure depends on it: `inertial gates`, `5 inertial gates, 1 transport gate`.
pub fn model(scenario: &Scenario) -> String {
    let kind = |filter: &Filter| match filter {
        Filter::Inertial => "inertial",
        Filter::Transport => "transport",
        Filter::Reject(_) => "reject",
        Filter::Involution(_) => "involution",
    };
    let filters = &scenario.delays.filter;
    let counts = ["inertial", "transport", "reject", "involution"]
        .map(|word| (word, filters.iter().filter(|filter| kind(filter) == word).count()));
    let present: Vec<_> = counts.into_iter().filter(|it| it.1 > 0).collect();
    let mut text = match present[..] {
        [(word, _)] => format!("{word} gates"),
        _ => {
            let each = present.iter().map(|(word, n)| format!("{n} {word} gate{}", if *n == 1 { "" } else { "s" }));
            each.collect::<Vec<_>>().join(", ")
        }
    };
    if scenario.circuit.wire_count() > 0 {
        text += ", wires with delay (transport)";
    }
    text
}
