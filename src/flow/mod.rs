//! The delay-free view of a scenario: its flow table. Which stable state may follow which, whatever the delays; what the
//! steps of the scenario exercise of it; what a practitioner reads off it (races, hazards, memory, dead ends); and how it
//! compares with the reference network.
//!
//! Everything is said of the circuit alone: a hazard is the ability to glitch, not a glitch that was seen.
//!
//! Outcomes come from the multiple-winner method where it holds: every gate is inertial, no wire has a delay of its own,
//! and the contacts of the step do not bounce. Elsewhere a pulse may arrive after its cause is over, so that the method is
//! no bound; there, and where it takes more than its budget, outcomes are bounded by ternary simulation, which is never
//! optimistic. Every step is taken to come at rest.

mod automaton;
mod classes;
mod compared;
mod coverage;
mod cures;
mod follow;
mod hazards;
mod lay_out;
mod outcomes;
mod reference;
mod table;
#[cfg(test)]
mod tests;
mod timeline;
mod tour;

pub use compared::compared;
pub use follow::{follow, outside, winners_are_valid};
pub use hazards::{Hazards, MAX_CHANGING, hazards};
pub use lay_out::lay_out;
pub use reference::{Allowed, Answer, Coming, List, Passed, View};
pub use timeline::{Group, Timeline};
pub use tour::{Tour, tour};

use crate::circuit::NetId;
use crate::control::Control;
use crate::logic::{Bits, Shape, State};
use crate::scenario::Scenario;
use crate::statics::{Change, Race};

/// A stable state of a flow table, by its number there.
pub type StateNumber = u32;

/// The flow table: stable states, and what may follow each change of inputs.
#[derive(Clone, Debug, Default)]
pub struct FlowTable {
    /// The stable states looked at. Those that can be reached from the start come first, in the order in which they were
    /// found; then the others, by input vector (where a limit cut these, what is found from them comes last).
    pub states: Vec<FlowState>,
    /// The states in which a run may begin: one at rest; after power-up all with these inputs.
    pub start: Vec<StateNumber>,
    /// Every step of the scenario in its typical order, from every stable state that it can meet.
    pub steps: Vec<Transition>,
    /// Every change of a single input from every state of which `explored` is true, by state, then by input.
    pub single: Vec<Transition>,
    /// A limit cut the states: there are stable states that are not in `states`, or not explored.
    pub states_truncated: bool,
    /// A limit cut the list of steps.
    pub steps_truncated: bool,
    /// Steps wait for something that this view does not know (`when`), or may come before rest; whole sentences.
    pub notes: Vec<String>,
}

/// One stable state of a flow table.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FlowState {
    /// Values of all nets.
    pub values: Bits,
    /// Can it be reached from the start by single-input changes and the steps of the scenario, each at rest?
    pub reachable: bool,
    /// Are its single-input changes in the table?
    pub explored: bool,
}

/// One change from one stable state.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Transition {
    /// The moment of the scenario that makes the change; `None` for a single-input change of the table.
    pub moment: Option<u32>,
    /// From which state.
    pub from: StateNumber,
    /// The change.
    pub change: Change,
    /// What may follow.
    pub to: Reached,
    /// Does Unger's test find an essential hazard: in the flow table in which only the feedback nets take time, does one
    /// change of the input lead to another state than three, each outcome unique? `None` where only a bound is known, the
    /// test takes more than its effort, or not just one input changes.
    pub essential: Option<bool>,
    /// For steps: is it sure that the step meets this state? Not after power-up, a race, an oscillation or a ternary bound,
    /// until a step leads to one state from all that may be (by ternary simulation, or because each outcome is unique).
    pub sure: bool,
}

/// What may follow a change, with the states of the flow table.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Reached {
    /// By the multiple-winner method.
    Exact {
        /// The stable states, ascending.
        states: Vec<StateNumber>,
        /// Number of lasting cycles.
        cycles: u64,
        /// Race.
        race: Race,
    },
    /// By ternary simulation.
    Bound {
        /// What it gives.
        state: State,
        /// The stable states that agree with it, ascending; a limit may have cut them.
        states: Vec<StateNumber>,
        /// A limit cut them.
        truncated: bool,
    },
}

impl Reached {
    /// The stable states that may follow.
    pub fn states(&self) -> &[StateNumber] {
        match self {
            Reached::Exact { states, .. } | Reached::Bound { states, .. } => states,
        }
    }

    /// The one state that surely follows, if there is just one.
    pub fn only(&self) -> Option<StateNumber> {
        match self {
            Reached::Exact { states, cycles: 0, .. } => match states[..] {
                [state] => Some(state),
                _ => None,
            },
            // known everywhere: it is the one stable state that agrees
            Reached::Bound { state, states, truncated: false } if !state.has_unknown() => states.first().copied(),
            _ => None,
        }
    }
}

/// Which single-input changes the steps exercise.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Coverage {
    /// Number of single-input changes from reachable states that are in the table.
    pub all: u64,
    /// Of these, made by some step that surely meets the state.
    pub exercised: u64,
    /// Made only if power-up, a race or an oscillation goes that way: state and input.
    pub perhaps: Vec<(StateNumber, NetId)>,
    /// Never made: state and input, by state, then by input.
    pub missing: Vec<(StateNumber, NetId)>,
    /// The table is cut, so that there are more changes than `all`.
    pub truncated: bool,
}

/// The circuit read as an automaton.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Automaton {
    /// How its outputs depend on its state.
    pub reading: Reading,
    /// States of the table that cannot be reached from the start, ascending.
    pub unreachable: Vec<StateNumber>,
    /// Groups of reachable states that single-input changes never leave and in which the state variables never change
    /// again, although they take other values elsewhere. Each ascending.
    pub dead_ends: Vec<Vec<StateNumber>>,
    /// Reachable states that behave alike: same inputs, same outputs now and after every sequence of single-input
    /// changes. Classes of two and more, each ascending.
    pub equal: Vec<Vec<StateNumber>>,
    /// A limit cut the table, so that there may be more of all this, and some of it may be wrong for the whole circuit.
    pub truncated: bool,
}

/// How outputs depend on the state, over the reachable stable states.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Reading {
    /// There are no state variables: at rest the outputs follow the inputs alone.
    #[default]
    Combinational,
    /// The outputs are a function of the state variables.
    Moore,
    /// They are not: these two states agree in the state variables and differ in an output.
    Mealy(StateNumber, StateNumber),
}

/// The ability to glitch: a net that may change more often than it must, while feedback nets hold their values.
///
/// There is one for each net, shape, cause and change: a step, or one input in one direction. Where the states need
/// different cures, there is one for each cure.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hazard {
    /// The net: watched, or a feedback net (what is wanted of it, before it moves).
    pub net: NetId,
    /// What could be seen, before any feedback net moves.
    pub shape: Shape,
    /// Function or logic.
    pub cause: Cause,
    /// Only if the expressions and multiplexers on the way are built of several gates, one for each operator; as one gate
    /// each, they do not show it.
    pub built: bool,
    /// The moment of the scenario; `None` for single-input changes.
    pub moment: Option<u32>,
    /// The first state, in the order of the table, that has it.
    pub from: StateNumber,
    /// The inputs that change, with their new values. A single-input change and its opposite are two hazards.
    pub change: Change,
    /// From how many states of the table (for a step: that it can meet) this change has it.
    pub states: u64,
    /// How to be rid of it from all these states, verified; only for static logic hazards, and only if it brings no new
    /// hazard of the net for any change of the table.
    pub cure: Option<Cure>,
}

/// Why a net may glitch.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Cause {
    /// The function itself takes both values on the way: no gate and no delay cures it.
    Function,
    /// The function does not; the gates that were chosen may.
    Logic,
}

impl Cause {
    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Cause::Function => "function",
            Cause::Logic => "logic",
        }
    }
}

/// A term that covers a static logic hazard.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cure {
    /// The literals, in net order: nets with the value at which the literal is true in a product (static-1), false in a
    /// sum (static-0).
    pub literals: Vec<(NetId, bool)>,
    /// The whole new function of the net's gate as an expression of a scenario, as in `p | q | b & c`.
    pub expression: String,
}

/// The implementation against the reference network, without delays.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Compared {
    /// Is every stable state of the circuit, as far as inputs and compared nets show it, one of the reference?
    pub states: Contained,
    /// Outcomes of transitions that the reference does not have. By transition, then by state reached.
    pub beyond: Vec<Beyond>,
    /// Transitions with several outcomes, on the compared nets, of which no single state of the reference offers all:
    /// steps first. Not those in `beyond`.
    pub choices: Vec<Choice>,
    /// Transitions that were compared.
    pub compared: u64,
    /// Transitions that could not be: a budget ran out, only a bound is known, or the circuit never comes to rest.
    pub not_compared: u64,
}

/// Is one state set, projected, within the other?
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Contained {
    /// Proved for all stable states.
    Proved,
    /// Not: these values of inputs and compared nets (nets of the circuit) are stable here, and not in the reference.
    Not(Vec<(NetId, bool)>),
    /// A budget ran out.
    GaveUp,
}

/// Which list of a flow table a transition is in, and its number there.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum TransitionRef {
    /// In [`FlowTable::steps`].
    Step(u32),
    /// In [`FlowTable::single`].
    Single(u32),
}

/// An outcome that the reference does not have.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Beyond {
    /// The transition.
    pub transition: TransitionRef,
    /// The state reached.
    pub reached: StateNumber,
    /// What the reference allows, on the compared nets in their order; empty if it has no such state before.
    pub allowed: Vec<Vec<bool>>,
}

/// A choice that the reference does not have.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Choice {
    /// The transition.
    pub transition: TransitionRef,
    /// The outcomes on the compared nets, in their order.
    pub outcomes: Vec<Vec<bool>>,
}

/// Everything that is known of a scenario without delays, beside its state set.
#[derive(Clone, Debug, Default)]
pub struct Flow {
    /// The flow table.
    pub table: FlowTable,
    /// What the steps exercise.
    pub coverage: Coverage,
    /// The circuit as an automaton.
    pub automaton: Automaton,
    /// Hazards: of the steps first, by moment, then of single-input changes; by net.
    pub hazards: Vec<Hazard>,
    /// A limit cut the search for hazards or for their cures: there may be more.
    pub hazards_truncated: bool,
    /// Nets and changes, once for each state, of which nothing is known: too many inputs change at once to tell function
    /// from logic, or too many changes to count.
    pub hazards_not_judged: u64,
    /// Against the reference, if there is one.
    pub compared: Option<Compared>,
}

/// Why there is no delay-free view.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum FlowError {
    /// Two methods contradict each other: a defect of the program.
    #[error("{0}")]
    Contradiction(String),
    /// The caller asked to stop.
    #[error("interrupted")]
    Cancelled,
}

/// The delay-free view of a scenario; `state_variables` are those of its
/// [`StateSet`](crate::statics::StateSet::state_variables), or other nets that determine the state (feedback nets).
///
/// ```
/// use stillgate::control::Control;
/// use stillgate::flow::flow;
///
/// let text = r#"
/// outputs = ["c"]
/// [inputs]
/// a = 0
/// b = 0
/// [gates]
/// c = { majority = ["a", "b", "c"] }
/// [[steps]]
/// set = { a = 1 }
/// [[steps]]
/// set = { b = 1 }
/// "#;
/// let scenario = stillgate::reader::read(text, "c-element.toml").unwrap().scenario;
/// let c = scenario.circuit.net("c").unwrap();
/// let flow = flow(&scenario, &[c], &Control::default()).unwrap();
/// // c follows where a and b agree, and holds where they do not
/// assert_eq!(flow.table.states.len(), 6);
/// assert_eq!((flow.coverage.exercised, flow.coverage.all), (2, 12));
/// ```
///
/// Errors: see [`FlowError`].
pub fn flow(scenario: &Scenario, state_variables: &[NetId], control: &Control) -> Result<Flow, FlowError> {
    let table = table::table(scenario, table::Limits::of(scenario), control)?;
    let coverage = Coverage::of(&table);
    let automaton = Automaton::of(scenario, &table, state_variables);
    let found = hazards(&scenario.circuit, &scenario.watched, &table, control)?;
    let (hazards, hazards_truncated, hazards_not_judged) = (found.list, found.truncated, found.not_judged);
    let compared = match &scenario.reference {
        Some(reference) => Some(compared(scenario, &Allowed::of(reference.clone(), control), &table, control)?),
        None => None,
    };
    Ok(Flow { table, coverage, automaton, hazards, hazards_truncated, hazards_not_judged, compared })
}
