//! What may follow a change of inputs, whatever the delays.

use super::change::Change;
use super::explore::Effort;
use super::winners::winners;
use super::{GaveUp, ternary};
use crate::circuit::{Circuit, NetId};
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
/// for inputs that change in any order.
///
/// First the state with all that may move at X, then the result.
///
/// Panics if the state has fewer nets than the circuit.
pub fn bound(circuit: &Circuit, from: &Bits, change: &Change) -> (State, State) {
    ternary_of(circuit, from, change.moving(from), change)
}

/// As [`bound`], for inputs that may move back and forth before they stay, also those that end where they were: contact
/// bounce, or steps of one instant with skew that set an input twice.
pub fn bound_restless(circuit: &Circuit, from: &Bits, change: &Change) -> (State, State) {
    ternary_of(circuit, from, change.set.iter().copied(), change)
}

fn ternary_of(
    circuit: &Circuit,
    from: &Bits,
    moving: impl Iterator<Item = (NetId, bool)>,
    change: &Change,
) -> (State, State) {
    let mut spread = State::known(from.clone());
    for (net, _) in moving {
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
/// takes more than its budget (65,536 states or a million firings of one part that hangs together, 12 gates of one loop
/// excited together, or 1,024 outcomes), the ternary bound.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::control::Control;
/// use stillgate::logic::Bits;
/// use stillgate::statics::{Change, Outcome, Race, outcome};
/// // a latch of two NORs with both inputs at 1, which then fall together
/// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
/// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
/// let from = Bits::of([true, true, false, false].into_iter());
/// let change = Change { set: vec![(NetId(0), false), (NetId(1), false)], apart: false };
/// let Outcome::Exact { states, cycles, race } = outcome(&latch, &from, &change, &Control::default()).unwrap() else {
///     panic!("small enough");
/// };
/// assert_eq!((states.len(), cycles, race), (2, 1, Race::Critical)); // either bit, or q and qn toggle together
/// ```
///
/// Errors: only [`GaveUp::Cancelled`]. Panics if the state has fewer nets than the circuit.
pub fn outcome(circuit: &Circuit, from: &Bits, change: &Change, control: &Control) -> Result<Outcome, GaveUp> {
    let mut all = usize::MAX;
    Ok(outcome_within(circuit, from, change, Effort::DEFAULT, &mut all, control)?.0)
}

/// As [`outcome`], for many changes that share a budget, with the ternary bound beside it. What the exact method takes, in
/// evaluations of gates and firings, is taken from `left`; where that is not enough there is only the bound.
///
/// Errors: only [`GaveUp::Cancelled`]. Panics if the state has fewer nets than the circuit.
pub fn outcome_of_many(
    circuit: &Circuit,
    from: &Bits,
    change: &Change,
    left: &mut usize,
    control: &Control,
) -> Result<(Outcome, State), GaveUp> {
    outcome_within(circuit, from, change, Effort::DEFAULT, left, control)
}

/// As [`outcome_of_many`], with another effort.
fn outcome_within(
    circuit: &Circuit,
    from: &Bits,
    change: &Change,
    effort: Effort,
    left: &mut usize,
    control: &Control,
) -> Result<(Outcome, State), GaveUp> {
    if control.cancelled() {
        return Err(GaveUp::Cancelled);
    }
    let (spread, settled) = bound(circuit, from, change);
    let exact = winners(circuit, from, change, &spread, effort, left, control)?;
    Ok((exact.unwrap_or_else(|| Outcome::Bound(settled.clone())), settled))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{Function, GateSpec};

    fn circuit(inputs: &[&str], gates: &[(&str, Function, &[u32])]) -> Circuit {
        let gates = gates
            .iter()
            .map(|(name, function, pins)| GateSpec {
                name: name.to_string(),
                function: function.clone(),
                pins: pins.iter().map(|pin| NetId(*pin)).collect(),
            })
            .collect();
        Circuit::new(inputs, gates, vec![]).unwrap()
    }

    fn bits(letters: &str) -> Bits {
        Bits::of(letters.chars().map(|letter| letter == '1').collect::<Vec<_>>().into_iter())
    }

    fn change(set: &[(u32, u8)]) -> Change {
        Change { set: set.iter().map(|(net, bit)| (NetId(*net), *bit == 1)).collect(), apart: false }
    }

    fn exact(circuit: &Circuit, from: &str, change: &Change) -> (Vec<String>, u64, Race) {
        match outcome(circuit, &bits(from), change, &Control::default()).unwrap() {
            Outcome::Exact { states, cycles, race } => {
                let text = |state: &Bits| -> String {
                    circuit.nets().map(|n| if state.get(n.index()) { '1' } else { '0' }).collect()
                };
                (states.iter().map(text).collect(), cycles, race)
            }
            Outcome::Bound(_) => panic!("small enough to be exact"),
        }
    }

    #[test]
    fn inputs_apart_open_ways_that_one_instant_does_not_have() {
        // a latch of two NORs, set; both inputs come: at one instant and with skew both nets fall
        let latch = circuit(&["r", "s"], &[("q", Function::Nor, &[0, 3]), ("qn", Function::Nor, &[1, 2])]);
        let both = change(&[(0, 0), (1, 1)]);
        // from r = 1, s = 0 to r = 0, s = 1: with skew first both inputs may be 0, or both 1
        assert_eq!(exact(&latch, "1001", &both), (vec!["0110".into()], 0, Race::None));
        // an AND of two crossing inputs in front of a latch: only apart can it pulse and set the latch
        let pulse = circuit(&["a", "b"], &[("p", Function::And, &[0, 1]), ("q", Function::Or, &[2, 3])]);
        let cross = change(&[(0, 1), (1, 0)]);
        assert_eq!(exact(&pulse, "0100", &cross), (vec!["1000".into()], 0, Race::None));
        let apart = Change { apart: true, ..cross };
        assert_eq!(exact(&pulse, "0100", &apart), (vec!["1000".into(), "1001".into()], 0, Race::Critical));
    }

    #[test]
    fn concurrency_of_independent_parts_costs_nothing() {
        // 40 latches that are set together: each has two nets to move, 3^40 interleavings in all
        let mut gates = Vec::new();
        let names: Vec<String> = (0..80).map(|i| format!("g{i}")).collect();
        for latch in 0..40u32 {
            let (q, qn) = (1 + 2 * latch, 2 + 2 * latch);
            gates.push((names[2 * latch as usize].as_str(), Function::Or, vec![0, qn]));
            gates.push((names[2 * latch as usize + 1].as_str(), Function::Buf, vec![q]));
        }
        let gates: Vec<(&str, Function, &[u32])> =
            gates.iter().map(|(n, f, p)| (*n, f.clone(), p.as_slice())).collect();
        let many = circuit(&["set"], &gates);
        let (states, cycles, race) = exact(&many, &"0".repeat(81), &change(&[(0, 1)]));
        assert_eq!((states, cycles, race), (vec!["1".repeat(81)], 0, Race::None));
    }

    #[test]
    fn beyond_the_effort_the_bound_is_given() {
        let latch = circuit(&["r", "s"], &[("q", Function::Nor, &[0, 3]), ("qn", Function::Nor, &[1, 2])]);
        let release = change(&[(0, 0), (1, 0)]);
        let small = Effort { states: 3, ..Effort::DEFAULT };
        let control = Control::default();
        let bound = bound(&latch, &bits("1100"), &release).1;
        let mut left = 1000;
        let within = |effort, left: &mut usize| outcome_within(&latch, &bits("1100"), &release, effort, left, &control);
        assert_eq!(within(small, &mut left), Ok((Outcome::Bound(bound.clone()), bound.clone())));
        // a common budget goes down by what is used, and is left at nothing where it is not enough
        let before = left;
        assert!(matches!(within(Effort::DEFAULT, &mut left), Ok((Outcome::Exact { .. }, _))));
        let used = before - left;
        assert!((8..100).contains(&used), "four states of two gates each, and their firings: {used}");
        let mut few = used - 1;
        assert_eq!(within(Effort::DEFAULT, &mut few), Ok((Outcome::Bound(bound.clone()), bound)));
        control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        let stopped = within(small, &mut left);
        assert_eq!(stopped, Err(GaveUp::Cancelled));
    }
}
