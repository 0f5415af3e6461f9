//! The delay-free view: where may a circuit rest at all?
//!
//! A stable state gives every net a value such that every gate's output equals its function. [`StateSet`] holds all of
//! them, [`rest`] finds the one that fits given inputs, [`stable_states`] lists those that agree with what is known,
//! [`is_stable`] tests one, and [`ternary`] computes with X. [`transients`] counts how often a net may change.

mod agreeing;
pub mod built;
mod change;
mod conjunction;
mod diagram;
mod explore;
mod fewest;
mod functions;
mod fundamental;
mod inclusion;
mod multiplicity;
mod order;
mod outcome;
mod product;
mod projection;
mod relation;
mod rest;
mod state_set;
mod state_variables;
pub mod ternary;
pub mod transients;
mod walk;
mod winners;

pub use agreeing::stable_states;
pub use change::Change;
pub use fundamental::{Next, fundamental};
pub use outcome::{Outcome, Race, bound, bound_restless, outcome, outcome_of_many};
pub use product::Rows;
pub use projection::Projection;
pub use rest::{NoRest, rest};
pub use state_set::{ByInputs, InputStates, StateSet, VectorCounts};
pub use state_variables::StateVariables;

use crate::circuit::Circuit;
use crate::logic::State;

/// Why an exact analysis came to no end. Nothing is known then: neither yes nor no.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum GaveUp {
    /// The decision diagram outgrew its budget, [`crate::control::Control::nodes`].
    #[error("gave up: a decision diagram of {nodes} nodes is not enough")]
    Budget {
        /// The budget.
        nodes: usize,
    },
    /// The caller asked to stop.
    #[error("stopped on request")]
    Cancelled,
}

/// Is every net known and every gate's output its function? Takes time linear in the circuit, and no diagram.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::logic::{State, Value};
/// let gate = GateSpec { name: "out".into(), function: Function::Not, pins: vec![NetId(0)] };
/// let inverter = Circuit::new(&["in"], vec![gate], vec![]).unwrap();
/// let mut state = State::zeros(2);
/// assert!(!stillgate::statics::is_stable(&inverter, &state));
/// state.set(1, Value::One);
/// assert!(stillgate::statics::is_stable(&inverter, &state));
/// ```
///
/// Panics if the state has fewer nets than the circuit.
pub fn is_stable(circuit: &Circuit, state: &State) -> bool {
    let ones = &state.ones;
    !state.has_unknown()
        && circuit.gates().all(|gate| {
            let wanted = circuit.wants(gate, |net| ones.get(net.index()));
            wanted == ones.get(circuit.net_of(gate).index())
        })
}
