//! Ternary simulation (Eichelberger 1965), multiple-winner analysis (Brzozowski and Seger 1987) and Unger's test on
//! worked examples. All values are \[computed\] by an independent throw-away program, unless a test says otherwise.

use std::collections::BTreeSet;

use stillgate::circuit::{Circuit, Expr, Function};
use stillgate::control::Control;
use stillgate::logic::{Bits, State};
use stillgate::statics::{Change, Outcome, Race, StateSet, bound, outcome};

use super::networks::{c17, circuit, letters, owned, six_nand_flip_flop, values};
use crate::support::explorer::{Delays, Explored, Explorer, least_upper_bound};

fn bits(text: &str) -> Vec<bool> {
    text.chars().filter(|c| *c != ' ').map(|c| c == '1').collect()
}

/// The change from a state "inputs gates" to new inputs.
fn change(circuit: &Circuit, from: &str, to: &str) -> (Vec<bool>, Change) {
    let from = bits(from);
    let set = circuit.inputs().zip(bits(to)).filter(|(net, bit)| from[net.index()] != *bit).collect();
    (from, Change { set, apart: false })
}

/// The gates of a state, X's included.
fn gates(circuit: &Circuit, state: &State) -> String {
    (circuit.input_count()..circuit.net_count()).map(|net| state.get(net).letter()).collect()
}

/// Results of procedures A and B: the gates as X spreads, and as it recedes.
fn ternary(circuit: &Circuit, from: &str, to: &str) -> [String; 2] {
    let (from, change) = change(circuit, from, to);
    let (spread, settled) = bound(circuit, &Bits::of(from.into_iter()), &change);
    [gates(circuit, &spread), gates(circuit, &settled)]
}

/// Stable states by their gates, lasting cycles and race, by the program; the explorer of the tests must say the same.
fn winners(circuit: &Circuit, from: &str, to: &str) -> (Vec<String>, u64, Race) {
    let explored = explored(circuit, from, to);
    let (from, change) = change(circuit, from, to);
    let shown = |state: &[bool]| letters(&state[circuit.input_count()..]);
    let visited: Vec<String> = explored.stable.iter().map(|state| shown(state)).collect();
    let from = Bits::of(from.into_iter());
    let Outcome::Exact { states, cycles, race } = outcome(circuit, &from, &change, &Control::default()).unwrap() else {
        panic!("a small circuit is done exactly");
    };
    let states: Vec<String> = states.iter().map(|state| shown(&values(circuit, state))).collect();
    assert_eq!((&states, cycles, race), (&visited, explored.cycles.len() as u64, explored.race));
    (states, cycles, race)
}

fn explored(circuit: &Circuit, from: &str, to: &str) -> Explored {
    let (from, change) = change(circuit, from, to);
    Explorer::new(circuit, Delays::Gates).explore(&from, &change)
}

/// The gates of some states.
fn shown(circuit: &Circuit, states: &[Vec<bool>]) -> BTreeSet<String> {
    states.iter().map(|state| letters(&state[circuit.input_count()..])).collect()
}

fn one(state: &str) -> (Vec<String>, u64, Race) {
    (vec![state.to_string()], 0, Race::None)
}

fn set(states: &[&str]) -> BTreeSet<String> {
    states.iter().map(ToString::to_string).collect()
}

fn expr(name: &str, text: &str) -> (String, Function, Vec<String>) {
    let expr = Expr::parse(text).unwrap();
    let nets = expr.nets().iter().map(ToString::to_string).collect();
    (name.to_string(), Function::Expr(expr), nets)
}

#[test]
fn a_to_d_nor_latch() {
    let latch = circuit(&["s", "r"], &[("q", Function::Nor, &["r", "qb"]), ("qb", Function::Nor, &["s", "q"])]);
    assert_eq!(ternary(&latch, "11 00", "00"), ["XX", "XX"]);
    assert_eq!(winners(&latch, "11 00", "00"), (vec!["01".into(), "10".into()], 1, Race::Critical));
    let both = explored(&latch, "11 00", "00");
    assert_eq!(both.reached.len(), 4);
    assert_eq!(shown(&latch, &both.cycles[0]), set(&["00", "11"]));
    assert_eq!(ternary(&latch, "00 01", "10"), ["XX", "10"]);
    assert_eq!(winners(&latch, "00 01", "10"), one("10"));
    assert_eq!(ternary(&latch, "01 01", "10")[1], "10", "both change");
    assert_eq!(winners(&latch, "01 01", "10"), one("10"));
    assert_eq!(ternary(&latch, "10 10", "00"), ["10", "10"]);
    assert_eq!(winners(&latch, "10 10", "00"), one("10"));
}

#[test]
fn e_and_f_c_element() {
    let one_gate = circuit(&["a", "b"], &[("c", Function::Majority, &["a", "b", "c"])]);
    assert_eq!(ternary(&one_gate, "00 0", "10"), ["0", "0"]);
    assert_eq!(ternary(&one_gate, "00 0", "11"), ["X", "1"]);
    assert_eq!(ternary(&one_gate, "11 1", "01"), ["1", "1"]);
    let of_ands = circuit(
        &["a", "b"],
        &[
            ("p", Function::And, &["a", "b"]),
            ("q", Function::And, &["a", "c"]),
            ("r", Function::And, &["b", "c"]),
            ("c", Function::Or, &["p", "q", "r"]),
        ],
    );
    assert_eq!(ternary(&of_ands, "00 0000", "11"), ["XXXX", "1111"]);
    assert_eq!(ternary(&of_ands, "11 1111", "01"), ["XX11", "0011"], "c is never X");
    assert_eq!(winners(&of_ands, "00 0000", "11"), (vec!["1111".into()], 0, Race::NonCritical));
    assert_eq!(winners(&of_ands, "11 1111", "01"), one("0011"));
}

#[test]
fn g_gated_ring() {
    let ring = circuit(
        &["en"],
        &[("n0", Function::Nand, &["en", "n2"]), ("n1", Function::Not, &["n0"]), ("n2", Function::Not, &["n1"])],
    );
    assert_eq!(ternary(&ring, "0 101", "1"), ["XXX", "XXX"]);
    assert_eq!(winners(&ring, "0 101", "1"), (vec![], 1, Race::None), "it oscillates and never rests");
    let oscillates = explored(&ring, "0 101", "1");
    assert_eq!(shown(&ring, &oscillates.cycles[0]), set(&["101", "100", "110", "010", "011", "001"]));
}

#[test]
fn h_selector_with_and_without_the_consensus_term() {
    let selector = |consensus: bool| {
        let mut gates: Vec<(&str, Function, &[&str])> =
            vec![("an", Function::Not, &["a"]), ("p", Function::And, &["a", "b"]), ("q", Function::And, &["an", "c"])];
        if consensus {
            gates.push(("r", Function::And, &["b", "c"]));
        }
        gates.push(("f", Function::Or, if consensus { &["p", "q", "r"] } else { &["p", "q"] }));
        circuit(&["a", "b", "c"], &gates)
    };
    assert_eq!(ternary(&selector(false), "111 0101", "011"), ["XXXX", "1011"], "a static hazard: f is X on the way");
    assert_eq!(ternary(&selector(true), "111 01011", "011"), ["XXX11", "10111"], "f stays at 1");
    assert_eq!(winners(&selector(false), "111 0101", "011"), one("1011"));
    assert_eq!(winners(&selector(true), "111 01011", "011"), one("10111"));
}

#[test]
fn i_hazard_of_a_latch_loses_its_bit() {
    let latch = |consensus: bool| {
        let mut gates: Vec<(&str, Function, &[&str])> =
            vec![("gn", Function::Not, &["g"]), ("p", Function::And, &["g", "d"]), ("q", Function::And, &["gn", "f"])];
        if consensus {
            gates.push(("r", Function::And, &["d", "f"]));
        }
        gates.push(("f", Function::Or, if consensus { &["p", "q", "r"] } else { &["p", "q"] }));
        circuit(&["g", "d"], &gates)
    };
    let (bare, cured) = (latch(false), latch(true));
    assert_eq!(ternary(&bare, "11 0101", "01")[1], "10XX");
    assert_eq!(winners(&bare, "11 0101", "01"), (vec!["1000".into(), "1011".into()], 1, Race::Critical));
    assert_eq!(shown(&bare, &explored(&bare, "11 0101", "01").cycles[0]), set(&["1001", "1010"]));
    assert_eq!(ternary(&cured, "11 01011", "01"), ["XXX11", "10111"]);
    assert_eq!(winners(&cured, "11 01011", "01"), one("10111"));
}

#[test]
fn j_a_cycle_that_cannot_last() {
    let circuit = owned(&["x"], &[expr("y1", "x & !y1 & !y2"), expr("y2", "x | y2")]);
    assert_eq!(
        winners(&circuit, "0 00", "1"),
        one("01"),
        "y2 is excited throughout the cycle 00, 10, and so must fire"
    );
    assert_eq!(ternary(&circuit, "0 00", "1")[1], "01");
    let all = explored(&circuit, "0 00", "1");
    assert!(shown(&circuit, &all.reached).is_superset(&set(&["00", "10"])));
}

#[test]
fn k_ternary_simulation_counts_delays_of_wires() {
    let circuit = owned(&["x"], &[expr("y1", "!x"), expr("y2", "!x & !y1 | y2")]);
    assert_eq!(winners(&circuit, "0 10", "1"), one("00"));
    assert_eq!(ternary(&circuit, "0 10", "1")[1], "0X");
    let (from, change) = change(&circuit, "0 10", "1");
    let wired = Explorer::new(&circuit, Delays::GatesAndWires).explore(&from, &change);
    assert_eq!(gates(&circuit, &least_upper_bound(&wired.outcome).unwrap()), "0X");
}

#[test]
fn l_six_nand_flip_flop() {
    let flip_flop = owned(&["c", "d"], &six_nand_flip_flop("", "c", "d"));
    assert_eq!(ternary(&flip_flop, "00 011110", "10"), ["01X1XX", "010101"]);
    assert_eq!(ternary(&flip_flop, "01 111001", "11"), ["1X10XX", "101010"]);
    assert_eq!(winners(&flip_flop, "00 011110", "10"), one("010101"));
    assert_eq!(winners(&flip_flop, "01 111001", "11"), one("101010"));
    // clock and data at once, the data rising: everything may happen
    for from in ["00 011101", "00 011110"] {
        assert_eq!(ternary(&flip_flop, from, "11")[1], "XXXXXX");
        assert_eq!(winners(&flip_flop, from, "11"), (vec!["010101".into(), "101010".into()], 1, Race::Critical));
        assert_eq!(explored(&flip_flop, from, "11").reached.len(), 64);
    }
}

#[test]
fn m_static_hazards_of_c17() {
    // netlist in several public files; 4 single changes, all of output 22 and all static-1, and 424 of 976 cases
    let circuit = c17();
    let set = StateSet::of(&circuit, &Control::default()).unwrap();
    let states: Vec<Bits> = set.by_inputs(32, 1).map(|vector| vector.states[0].clone()).collect();
    let outputs = ["n22", "n23"].map(|name| circuit.net(name).unwrap());
    let (mut hazards, mut cases, mut unknown) = (Vec::new(), 0, 0);
    for from in &states {
        for to in states.iter().filter(|to| *to != from) {
            let change = Change::between(&circuit, from, to);
            let (spread, settled) = bound(&circuit, from, &change);
            assert_eq!(settled, State::known(to.clone()), "without loops X recedes everywhere");
            for net in outputs.iter().filter(|net| from.get(net.index()) == to.get(net.index())) {
                cases += 1;
                if spread.get(net.index()).known().is_none() {
                    unknown += 1;
                    if let Some(input) = change.single(from) {
                        let inputs = &values(&circuit, from)[..5];
                        hazards.push((circuit.name(input).to_string(), letters(inputs), from.get(net.index()), *net));
                    }
                }
            }
        }
    }
    assert_eq!((cases, unknown), (976, 424));
    let hazard = |inputs: &str| ("n3".to_string(), inputs.to_string(), true, outputs[0]);
    assert_eq!(hazards, ["11010", "11011", "11110", "11111"].map(hazard), "(1, 2, 3, 6, 7) before input 3 changes");
}

#[test]
fn analytically_stable_states() {
    // every vector of inputs and gates whose gates say what they drive
    let latch = circuit(&["s", "r"], &[("q", Function::Nor, &["r", "qb"]), ("qb", Function::Nor, &["s", "q"])]);
    let flip_flop = owned(&["c", "d"], &six_nand_flip_flop("", "c", "d"));
    let stable = |circuit: &Circuit| -> Vec<String> {
        Explorer::new(circuit, Delays::Gates).stable_states().iter().map(|state| letters(state)).collect()
    };
    let sorted = |mut states: Vec<String>| {
        states.sort();
        states
    };
    assert_eq!(sorted(stable(&latch)), ["0001", "0010", "0101", "1010", "1100"]);
    let all = ["00011101", "00011110", "01111001", "01111010", "10010101", "10101110", "11010101", "11101010"];
    assert_eq!(sorted(stable(&flip_flop)), all);
    for (circuit, states) in [(&latch, &stable(&latch)), (&flip_flop, &stable(&flip_flop))] {
        let set = StateSet::of(circuit, &Control::default()).unwrap();
        let by_inputs = set.by_inputs(4, 4);
        let found: Vec<String> =
            by_inputs.flat_map(|vector| vector.states).map(|state| letters(&values(circuit, &state))).collect();
        assert_eq!(found, sorted(states.clone()));
    }
}

/// The divide-by-two table, rows 1 to 4 with the codes y1 y2 = 00, 01, 11, 10: a rising x leads from row 1 to 2 and from
/// 3 to 4, a falling one from 2 to 3 and from 4 to 1. Y1 = x'y2 + x y1 + y1 y2, Y2 = x y1' + x'y2 + y1'y2.
const AROUND: [(&str, &str); 4] = [("0 00", "01"), ("1 01", "11"), ("0 11", "10"), ("1 10", "00")];

#[test]
fn four_essential_hazards_of_the_divide_by_two_table() {
    // Unger 1959 (from memory): one change of an input against three; the table is such that they differ everywhere
    let table = owned(&["x"], &[expr("y1", "!x & y2 | x & y1 | y1 & y2"), expr("y2", "x & !y1 | !x & y2 | !y1 & y2")]);
    let next = |from: &str| {
        let x = if from.starts_with('0') { "1" } else { "0" };
        let (states, cycles, race) = winners(&table, from, x);
        assert_eq!((states.len(), cycles, race), (1, 0, Race::None), "from {from}");
        format!("{x} {}", states[0])
    };
    let mut essential = 0;
    for (from, expected) in AROUND {
        let once = next(from);
        assert_eq!(&once[2..], expected);
        let thrice = next(&next(&once));
        essential += usize::from(once != thrice);
    }
    assert_eq!(essential, 4);
}

#[test]
fn in_gates_the_essential_hazard_is_a_critical_race() {
    // the same table built of gates, each with its delay: x may win against its own inverse by any time. Which rows are
    // reached is [computed] by visiting every state; from row 1 the wrong one is row 4, as with a slow inverter
    let gates = circuit(
        &["x"],
        &[
            ("xn", Function::Not, &["x"]),
            ("y1n", Function::Not, &["y1"]),
            ("a1", Function::And, &["xn", "y2"]),
            ("a2", Function::And, &["x", "y1"]),
            ("a3", Function::And, &["y1", "y2"]),
            ("y1", Function::Or, &["a1", "a2", "a3"]),
            ("b1", Function::And, &["x", "y1n"]),
            ("b2", Function::And, &["xn", "y2"]),
            ("b3", Function::And, &["y1n", "y2"]),
            ("y2", Function::Or, &["b1", "b2", "b3"]),
        ],
    );
    let (y1, y2) = (gates.net("y1").unwrap(), gates.net("y2").unwrap());
    let row = |state: &Bits| letters(&[state.get(y1.index()), state.get(y2.index())]);
    let set = StateSet::of(&gates, &Control::default()).unwrap();
    let mut found = Vec::new();
    for state in set.by_inputs(2, 4).flat_map(|vector| vector.states) {
        let from = letters(&values(&gates, &state));
        let (states, cycles, _) = winners(&gates, &from, if state.get(0) { "0" } else { "1" });
        let rows: Vec<String> =
            states.iter().map(|state| row(&Bits::of(bits(&format!("0{state}")).into_iter()))).collect();
        found.push(format!("x = {}, {}: {} {cycles}", &from[..1], row(&state), rows.join(" ")));
    }
    found.sort();
    let expected = ["x = 0, 00: 10 01 1", "x = 0, 11: 10 01 1", "x = 1, 01: 11 00 1", "x = 1, 10: 00 0"];
    assert_eq!(found, expected, "rows reached and lasting cycles");
}
