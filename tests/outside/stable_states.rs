//! Stable states of well-known circuits.

use num_bigint::BigUint;
use stillgate::circuit::{Circuit, Function, NetId};
use stillgate::control::Control;
use stillgate::logic::State;
use stillgate::statics::{StateSet, VectorCounts, is_stable};

use super::networks::{c17, circuit, divider_chain, letters, owned, six_nand_flip_flop, values};

/// The stable states for every input vector: "inputs: states of the gates".
fn table(circuit: &Circuit) -> Vec<String> {
    let set = StateSet::of(circuit, &Control::default()).unwrap();
    let by_inputs = set.by_inputs(1 << 10, 1 << 10);
    assert!(!by_inputs.truncated());
    by_inputs
        .map(|vector| {
            assert!(!vector.truncated);
            let gates = |state| letters(&values(circuit, state)[circuit.input_count()..]);
            let states: Vec<String> = vector.states.iter().map(gates).collect();
            for state in &vector.states {
                assert!(is_stable(circuit, &State::known(state.clone())));
            }
            format!("{}: {}", letters(&vector.inputs), states.join(" "))
        })
        .collect()
}

fn count(circuit: &Circuit) -> BigUint {
    StateSet::of(circuit, &Control::default()).unwrap().count()
}

fn vectors(none: u32, one: u32, several: u32) -> VectorCounts {
    VectorCounts { none: none.into(), one: one.into(), several: several.into() }
}

#[test]
fn nor_and_nand_latch_have_the_textbook_tables() {
    // common practice, no source: columns of the latch's function table; fixed points [computed]
    let nor = circuit(&["s", "r"], &[("q", Function::Nor, &["r", "qb"]), ("qb", Function::Nor, &["s", "q"])]);
    assert_eq!(table(&nor), ["00: 01 10", "01: 01", "10: 10", "11: 00"]);
    let nand = circuit(&["sn", "rn"], &[("q", Function::Nand, &["sn", "qb"]), ("qb", Function::Nand, &["rn", "q"])]);
    assert_eq!(table(&nand), ["00: 11", "01: 10", "10: 01", "11: 01 10"]);
    for latch in [&nor, &nand] {
        let set = StateSet::of(latch, &Control::default()).unwrap();
        assert_eq!(set.count(), 5u8.into());
        assert_eq!(set.vector_counts().unwrap(), vectors(0, 3, 1));
        let variables = set.state_variables(1000).unwrap();
        assert_eq!((variables.nets, variables.exact), (vec![latch.net("q").unwrap()], true));
    }
}

#[test]
fn a_c_element_remembers_while_its_inputs_differ() {
    // common practice, no source: the C-element follows equal inputs and holds otherwise; y = ab + (a + b)y
    let expr = stillgate::circuit::Expr::parse("a & b | (a | b) & y").unwrap();
    for function in [Function::Expr(expr), Function::Majority] {
        let c = circuit(&["a", "b"], &[("y", function, &["a", "b", "y"])]);
        assert_eq!(table(&c), ["00: 0", "01: 0 1", "10: 0 1", "11: 1"]);
        let set = StateSet::of(&c, &Control::default()).unwrap();
        assert_eq!(set.feedback(), [NetId(2)]);
        assert_eq!(set.vector_counts().unwrap(), vectors(0, 2, 2));
        assert_eq!(set.state_variables(1000).unwrap().nets, [NetId(2)]);
    }
}

#[test]
fn the_six_nand_flip_flop_has_its_eight_states() {
    // the usual edge-triggered D flip-flop; fixed points (n1 n2 n3 n4 q qb) for (c, d) [computed]
    let flip_flop = owned(&["c", "d"], &six_nand_flip_flop("", "c", "d"));
    assert_eq!(table(&flip_flop), ["00: 011101 011110", "01: 111001 111010", "10: 010101 101110", "11: 010101 101010"]);
}

#[test]
fn a_ring_with_an_odd_number_of_inversions_never_rests() {
    // common practice, no source: the gated ring oscillator; enabled it has no stable state
    let ring = circuit(
        &["en"],
        &[("a", Function::Nand, &["en", "c"]), ("b", Function::Not, &["a"]), ("c", Function::Not, &["b"])],
    );
    assert_eq!(table(&ring), ["0: 101", "1: "]);
    let set = StateSet::of(&ring, &Control::default()).unwrap();
    assert_eq!(set.vector_counts().unwrap(), vectors(1, 1, 0));
    assert!(set.state_variables(1000).unwrap().nets.is_empty());
}

#[test]
fn c17_has_its_truth_table() {
    // ISCAS-85 c17 (Brglez and Fujiwara 1985, from memory), outputs 22 and 23 for (1, 2, 3, 6, 7) counting up [computed];
    // f22 = 1·3 + 2·(3·6)', f23 = (2 + 7)·(3·6)'
    let circuit = c17();
    let set = StateSet::of(&circuit, &Control::default()).unwrap();
    let output = |name: &str| -> String {
        let net = circuit.net(name).unwrap().index();
        let value = |vector: stillgate::statics::InputStates| {
            assert_eq!(vector.states.len(), 1, "a circuit without loops has one state an input vector");
            if vector.states[0].get(net) { '1' } else { '0' }
        };
        set.by_inputs(32, 2).map(value).collect()
    };
    assert_eq!(output("n22"), "00000000111111000000111111111111");
    assert_eq!(output("n23"), "01010100111111000101010011111100");
    assert_eq!(set.count(), 32u8.into());
    assert!(set.feedback().is_empty());
    // 18 ones each, by projection on the inputs and one output
    for name in ["n22", "n23"] {
        let mut nets: Vec<NetId> = circuit.inputs().collect();
        nets.push(circuit.net(name).unwrap());
        let shown = set.project(&nets).unwrap();
        let ones: u64 = shown.rows(1000).rows.iter().filter(|row| row[5] == Some(true)).map(|row| size(row)).sum();
        assert_eq!(ones, 18, "{name}");
        assert_eq!(shown.count(), 32u8.into());
    }
}

fn size(row: &[Option<bool>]) -> u64 {
    1 << row.iter().filter(|value| value.is_none()).count()
}

#[test]
fn a_nor_relation_holds_in_half_of_the_vectors() {
    // common practice, no source: y = nor(a, b) satisfies 4 of the 8 vectors of (a, b, y), so in a space of n variables
    // 4·2^(n-3); here n - 1 inputs, and y reads itself through nothing else
    for n in [3u32, 4, 10, 70] {
        let names: Vec<String> = (0..n - 1).map(|i| format!("i{i}")).collect();
        let inputs: Vec<&str> = names.iter().map(String::as_str).collect();
        let nor = circuit(&inputs, &[("y", Function::Nor, &["i0", "i1"])]);
        assert_eq!(count(&nor), BigUint::from(4u8) << (n - 3), "{n} variables");
    }
}

#[test]
fn independent_latches_multiply() {
    // common practice, no source: every latch has 2 states at hold and 5 in all; independent parts multiply
    let latches = 40;
    let mut gates = Vec::new();
    let mut inputs = Vec::new();
    for i in 0..latches {
        inputs.extend([format!("s{i}"), format!("r{i}")]);
        gates.push((format!("q{i}"), Function::Nor, vec![format!("r{i}"), format!("p{i}")]));
        gates.push((format!("p{i}"), Function::Nor, vec![format!("s{i}"), format!("q{i}")]));
    }
    let names: Vec<&str> = inputs.iter().map(String::as_str).collect();
    let bank = owned(&names, &gates);
    let set = StateSet::of(&bank, &Control::default()).unwrap();
    assert_eq!(set.count(), BigUint::from(5u8).pow(latches));
    let counts = set.vector_counts().unwrap();
    assert_eq!(counts.none, BigUint::ZERO);
    assert_eq!(counts.one, BigUint::from(3u8).pow(latches), "no latch holds");
    assert_eq!(counts.several, BigUint::from(4u8).pow(latches) - BigUint::from(3u8).pow(latches));
    let (states, truncated) = set.at(&vec![false; 2 * latches as usize], 10);
    assert_eq!((states.len(), truncated), (10, true));
    let q: Vec<NetId> = (0..latches).map(|i| bank.net(&format!("q{i}")).unwrap()).collect();
    let variables = set.state_variables(1000).unwrap();
    assert_eq!((&variables.nets, variables.exact), (&q, true));
    assert_eq!(set.project(&q).unwrap().count(), BigUint::from(2u8).pow(latches));
}

#[test]
fn latches_in_a_chain_keep_a_bit_each() {
    // common practice, no source: transparent latches one after the other; closed, each keeps its bit; open, all follow
    let mut gates = Vec::new();
    for i in 0..30u32 {
        let data = if i == 0 { "d".to_string() } else { format!("q{}", i - 1) };
        gates.push((format!("q{i}"), Function::Mux, vec!["g".to_string(), format!("q{i}"), data]));
    }
    let chain = owned(&["d", "g"], &gates);
    let set = StateSet::of(&chain, &Control::default()).unwrap();
    assert_eq!(set.count(), (BigUint::from(2u8).pow(30) + 1u8) * 2u8);
    assert_eq!(set.vector_counts().unwrap(), vectors(0, 2, 2));
    let variables = set.state_variables(1000).unwrap();
    assert_eq!((variables.nets.len(), variables.exact), (30, true));
}

#[test]
fn a_chain_of_dividers_keeps_a_bit_a_stage() {
    // a divider by two has two states for each value of its clock [computed, from the table of the flip-flop above]
    for stages in [1u32, 2, 3, 20, 64] {
        let chain = divider_chain(stages as usize);
        let set = StateSet::of(&chain, &Control::default()).unwrap();
        assert_eq!(set.count(), BigUint::from(2u8).pow(stages + 1), "{stages} stages");
        let variables = set.state_variables(100).unwrap();
        assert_eq!((variables.nets.len(), variables.exact), (stages as usize, true), "{stages} stages");
        let q: Vec<NetId> = (0..stages).map(|s| chain.net(&format!("s{s}q")).unwrap()).collect();
        assert_eq!(set.project(&q).unwrap().count(), BigUint::from(2u8).pow(stages), "{stages} stages");
    }
}

#[test]
fn twelve_nors_in_a_ring() {
    // [computed] by an independent program and by trying everything: each gate reads its two neighbours, 29 stable states
    // (maximal independent sets of a ring of 12: the Perrin number P(12) = 29, common practice)
    let name = |i: usize| format!("y{}", i % 12);
    let gates: Vec<_> = (0..12).map(|i| (name(i), Function::Nor, vec![name(i + 11), name(i + 1)])).collect();
    assert_eq!(count(&owned(&[], &gates)), 29u8.into());
}
