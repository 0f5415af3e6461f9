//! Computing with X: what is certain although some nets are unknown.
//!
//! These are the two halves of ternary simulation (Eichelberger 1965): X spreads ([`spread`]) and X recedes
//! ([`settle`]). A gate with X's gives 0 or 1 exactly when every completion of them gives it. Both are monotone, so the
//! order of evaluation does not matter and every net changes at most once: they take time linear in the circuit.

use crate::circuit::{Circuit, GateId};
use crate::logic::{State, Value};

/// Gives nets at X the value of their gate wherever that is certain, until nothing more follows. Inputs and nets whose
/// value is known stay, whether their gate agrees or not.
///
/// What comes out holds in every stable state that agrees with the known nets of the start.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::logic::{State, Value};
/// // a latch of two NORs: inputs r = 0 and s = 1, gates q and qn
/// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
/// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
/// let mut state = State::zeros(4);
/// for (net, value) in [Value::Zero, Value::One, Value::X, Value::X].into_iter().enumerate() {
///     state.set(net, value);
/// }
/// stillgate::statics::ternary::settle(&latch, &mut state);
/// assert_eq!((state.get(2), state.get(3)), (Value::One, Value::Zero));
/// ```
///
/// Panics if the state has fewer nets than the circuit.
pub fn settle(circuit: &Circuit, state: &mut State) {
    propagate(circuit, state, Direction::Recede);
}

/// Turns known gate outputs to X wherever their gate, with the present X's, may give another value, until nothing more
/// follows. From a stable state with the changing inputs at X: all that may move.
///
/// Panics if the state has fewer nets than the circuit.
pub fn spread(circuit: &Circuit, state: &mut State) {
    propagate(circuit, state, Direction::Spread);
}

/// What the gate gives in this state. Panics if the state has fewer nets than the circuit.
pub fn wanted(circuit: &Circuit, state: &State, gate: GateId) -> Value {
    let (ones, unknown) = sums(circuit, state, gate);
    circuit.compiled(gate).value_with_unknown(ones, unknown)
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Direction {
    Recede,
    Spread,
}

fn propagate(circuit: &Circuit, state: &mut State, direction: Direction) {
    let mut sums: Vec<(u64, u64)> = circuit.gates().map(|gate| sums(circuit, state, gate)).collect();
    // gates to look at, the last one first
    let mut work: Vec<GateId> = circuit.evaluation_order().iter().rev().copied().collect();
    let mut waits = vec![true; circuit.gate_count()];
    while let Some(gate) = work.pop() {
        waits[gate.index()] = false;
        let net = circuit.net_of(gate);
        let now = state.get(net.index());
        if (now == Value::X) != (direction == Direction::Recede) {
            continue;
        }
        let (ones, unknown) = sums[gate.index()];
        let given = circuit.compiled(gate).value_with_unknown(ones, unknown);
        if given == now {
            continue;
        }
        let new = if direction == Direction::Recede { given } else { Value::X };
        state.set(net.index(), new);
        for reader in circuit.readers(net) {
            let (ones, unknown) = &mut sums[reader.gate.index()];
            for (value, sign) in [(now, false), (new, true)] {
                let sum = match value {
                    Value::Zero => continue,
                    Value::One => &mut *ones,
                    Value::X => &mut *unknown,
                };
                *sum = if sign { *sum + reader.weight } else { *sum - reader.weight };
            }
            if !std::mem::replace(&mut waits[reader.gate.index()], true) {
                work.push(reader.gate);
            }
        }
    }
}

/// The gate's input sum of the nets at 1, and of those at X.
fn sums(circuit: &Circuit, state: &State, gate: GateId) -> (u64, u64) {
    let (mut ones, mut unknown) = (0, 0);
    for (net, weight) in circuit.sources(gate) {
        match state.get(net.index()) {
            Value::Zero => {}
            Value::One => ones += weight,
            Value::X => unknown += weight,
        }
    }
    (ones, unknown)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{Function, GateSpec, NetId};

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

    fn state(letters: &str) -> State {
        let mut state = State::zeros(letters.len());
        for (net, letter) in letters.chars().enumerate() {
            let value = match letter {
                '0' => Value::Zero,
                '1' => Value::One,
                _ => Value::X,
            };
            state.set(net, value);
        }
        state
    }

    fn letters(state: &State, nets: usize) -> String {
        (0..nets).map(|net| state.get(net).letter()).collect()
    }

    /// X spreads from the start with the changing inputs at X, then recedes with the new inputs.
    fn both(circuit: &Circuit, start: &str, new_inputs: &str) -> (String, String) {
        let (nets, inputs) = (circuit.net_count(), circuit.input_count());
        let mut now = state(start);
        for (net, letter) in new_inputs.chars().enumerate() {
            if now.get(net).letter() != letter {
                now.set(net, Value::X);
            }
        }
        spread(circuit, &mut now);
        let spread_out = letters(&now, nets)[inputs..].to_string();
        for (net, value) in (0..inputs).map(|net| (net, state(new_inputs).get(net))) {
            now.set(net, value);
        }
        settle(circuit, &mut now);
        (spread_out, letters(&now, nets)[inputs..].to_string())
    }

    #[test]
    fn a_nor_latch_spreads_and_settles() {
        // Brzozowski and Seger 1987, procedures A and B; the values are [computed] by an independent program
        let latch = circuit(&["s", "r"], &[("q", Function::Nor, &[1, 3]), ("qn", Function::Nor, &[0, 2])]);
        assert_eq!(both(&latch, "1100", "00"), ("XX".into(), "XX".into()), "both released");
        assert_eq!(both(&latch, "0001", "10"), ("XX".into(), "10".into()), "set");
        assert_eq!(both(&latch, "0110", "10").1, "10", "from reset to set");
        assert_eq!(both(&latch, "1010", "00"), ("10".into(), "10".into()), "set ends");
    }

    #[test]
    fn a_c_element_and_a_multiplexer() {
        // [computed] by an independent program
        let c = circuit(&["a", "b"], &[("c", Function::Majority, &[0, 1, 2])]);
        assert_eq!(both(&c, "000", "10"), ("0".into(), "0".into()));
        assert_eq!(both(&c, "000", "11"), ("X".into(), "1".into()));
        assert_eq!(both(&c, "111", "01"), ("1".into(), "1".into()));
        let mux = circuit(
            &["a", "b", "c"],
            &[
                ("na", Function::Not, &[0]),
                ("p", Function::And, &[0, 1]),
                ("q", Function::And, &[3, 2]),
                ("f", Function::Or, &[4, 5]),
            ],
        );
        assert_eq!(both(&mux, "1110101", "011"), ("XXXX".into(), "1011".into()), "a static hazard shows as X");
    }

    #[test]
    fn settling_never_changes_what_is_known() {
        let latch = circuit(&["s", "r"], &[("q", Function::Nor, &[1, 3]), ("qn", Function::Nor, &[0, 2])]);
        // q is held at 1 although r = 1 says 0: qn follows what is held
        let mut held = state("011X");
        settle(&latch, &mut held);
        assert_eq!(letters(&held, 4), "0110");
        assert_eq!(wanted(&latch, &held, GateId(0)), Value::Zero);
    }

    #[test]
    fn a_long_chain_takes_one_pass() {
        let n = 100_000u32;
        let gates =
            (0..n).map(|g| GateSpec { name: format!("g{g}"), function: Function::Not, pins: vec![NetId(g)] }).collect();
        let chain = Circuit::new(&["in"], gates, vec![]).unwrap();
        let mut state = State::zeros(n as usize + 1);
        for net in 1..=n as usize {
            state.set(net, Value::X);
        }
        settle(&chain, &mut state);
        assert!(!state.has_unknown());
        assert_eq!(state.get(n as usize), Value::Zero, "an even number of inverters");
    }
}
