//! The stable states that agree with what is known of a state.

use num_bigint::BigUint;

use super::GaveUp;
use super::rest::{Fit, fit};
use crate::circuit::{Circuit, NetId};
use crate::control::Control;
use crate::logic::{Bits, State};

/// The stable states that agree with a state wherever it is known, at most `limit` of them, and whether there are more.
///
/// In lexicographic order, net 0 first. If there are more, those that come first by their feedback nets are given. A
/// known gate is no assumption: that its function gives the value is checked.
///
/// What follows for certain is found by ternary propagation, in time linear in the circuit; only the loops that stay
/// open go into a decision diagram. Where nothing stays open there is none, and no budget matters.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::control::Control;
/// use stillgate::logic::{State, Value};
/// // a latch of two NORs: inputs r = s = 0, gates q and qn not known
/// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
/// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
/// let mut open = State::zeros(4);
/// open.set(2, Value::X);
/// open.set(3, Value::X);
/// let (states, more) = stillgate::statics::stable_states(&latch, &open, 10, &Control::default()).unwrap();
/// assert_eq!((states.len(), more), (2, false));
/// ```
///
/// Errors: the diagram outgrew the budget of `control`, or the caller asked to stop. Panics if an input is X or the state
/// has fewer nets than the circuit.
pub fn stable_states(
    circuit: &Circuit,
    known: &State,
    limit: usize,
    control: &Control,
) -> Result<(Vec<Bits>, bool), GaveUp> {
    if control.cancelled() {
        return Err(GaveUp::Cancelled);
    }
    let value = |net: NetId| known.get(net.index()).known();
    let inputs: Vec<bool> = circuit.inputs().map(|net| value(net).expect("inputs are known")).collect();
    let named: Vec<(NetId, bool)> =
        circuit.gates().map(|gate| circuit.net_of(gate)).filter_map(|net| Some((net, value(net)?))).collect();
    let (mut states, more) = match fit(circuit, &inputs, &named, control)? {
        Fit::None => (Vec::new(), false),
        Fit::One(state) => (vec![state], false),
        Fit::Several(open) => (open.states(circuit, limit), open.total > BigUint::from(limit)),
    };
    let more = more || states.len() > limit;
    states.truncate(limit);
    Ok((states, more))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{Function, GateSpec};
    use crate::logic::Value;

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

    /// The stable states that agree with a state written as in `01X`, and whether there are more.
    fn agree(circuit: &Circuit, known: &str, limit: usize) -> (Vec<String>, bool) {
        let mut state = State::zeros(known.len());
        for (net, letter) in known.chars().enumerate() {
            state.set(net, if letter == 'X' { Value::X } else { Value::from(letter == '1') });
        }
        let (states, more) = stable_states(circuit, &state, limit, &Control::default()).unwrap();
        let letters = |state: &Bits| (0..known.len()).map(|net| if state.get(net) { '1' } else { '0' }).collect();
        (states.iter().map(letters).collect(), more)
    }

    fn latch() -> Circuit {
        circuit(&["r", "s"], &[("q", Function::Nor, &[0, 3]), ("qn", Function::Nor, &[1, 2])])
    }

    #[test]
    fn what_is_known_narrows_the_choice_and_is_checked() {
        let latch = latch();
        let found = |known| agree(&latch, known, 10);
        assert_eq!(found("00XX"), (vec!["0001".into(), "0010".into()], false));
        assert_eq!(found("001X"), (vec!["0010".into()], false));
        assert_eq!(found("0010"), (vec!["0010".into()], false), "known everywhere");
        assert_eq!(found("0011"), (vec![], false), "known everywhere, and not stable");
        assert_eq!(found("10XX"), (vec!["1001".into()], false), "reset");
        assert_eq!(found("101X"), (vec![], false), "reset forbids q");
    }

    #[test]
    fn a_loop_that_never_rests_agrees_with_nothing() {
        let ring = circuit(&["on"], &[("ring", Function::Nand, &[0, 1])]);
        assert_eq!(agree(&ring, "1X", 10), (vec![], false));
        assert_eq!(agree(&ring, "0X", 10), (vec!["01".into()], false));
    }

    #[test]
    fn a_limit_that_cuts_is_told() {
        // three gates that hold themselves: eight states
        let keepers =
            circuit(&[], &[("a", Function::Buf, &[0]), ("b", Function::Buf, &[1]), ("c", Function::Buf, &[2])]);
        assert_eq!(agree(&keepers, "XXX", 8).0.len(), 8);
        assert!(!agree(&keepers, "XXX", 8).1);
        assert_eq!(agree(&keepers, "XXX", 3), (vec!["000".into(), "001".into(), "010".into()], true));
        assert_eq!(agree(&keepers, "X1X", 3).0, ["010", "011", "110"]);
        assert_eq!(agree(&keepers, "XXX", 0), (vec![], true));
        assert_eq!(agree(&keepers, "101", 0), (vec![], true));
    }

    #[test]
    fn a_hundred_thousand_known_gates_need_no_diagram() {
        let n = 100_000u32;
        let gates =
            (0..n).map(|g| GateSpec { name: format!("g{g}"), function: Function::Not, pins: vec![NetId(g)] }).collect();
        let chain = Circuit::new(&["in"], gates, vec![]).unwrap();
        let known = State::known(Bits::of((0..n as usize + 1).map(|net| net % 2 == 1)));
        let tiny = Control { nodes: 1, ..Control::default() };
        assert_eq!(stable_states(&chain, &known, 4, &tiny), Ok((vec![known.ones.clone()], false)));
    }

    #[test]
    fn a_caller_may_stop_it() {
        let control = Control::default();
        control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        let known = State::zeros(4);
        assert_eq!(stable_states(&latch(), &known, 4, &control), Err(GaveUp::Cancelled));
    }
}
