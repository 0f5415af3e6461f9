//! Random networks of every gate function: against trying everything, and against a general-purpose decision diagram
//! library that shares no code with ours (biodivine-lib-bdd).

use std::collections::BTreeSet;

use biodivine_lib_bdd::{Bdd, BddVariableSet};
use num_bigint::BigUint;
use stillgate::circuit::{Circuit, Function, NetId};
use stillgate::control::Control;
use stillgate::statics::{NoRest, StateSet, rest};

use super::networks::{Draw, letters, stable_by_trying, values};

#[test]
fn random_networks_against_trying_everything() {
    let mut draw = Draw(0x5eed_0000_0000_0001);
    let mut with_states = 0;
    for case in 0..400 {
        let (inputs, gates) = (draw.below(4), 8 + draw.below(7));
        let circuit = draw.network(inputs, gates, gates);
        let want = stable_by_trying(&circuit);
        with_states += usize::from(!want.is_empty());
        let set = StateSet::of(&circuit, &Control::default()).unwrap();
        assert_eq!(set.count(), want.len().into(), "case {case}");
        let found: Vec<Vec<bool>> = set
            .by_inputs(1 << 10, 1 << 16)
            .flat_map(|vector| vector.states.iter().map(|state| values(&circuit, state)).collect::<Vec<_>>())
            .collect();
        assert_eq!(found, want, "case {case}");
        check_rows(&set, &want, case);

        let nets: Vec<NetId> = circuit.nets().filter(|_| draw.below(3) == 0).collect();
        let shown = set.project(&nets).unwrap();
        let expected: BTreeSet<Vec<bool>> =
            want.iter().map(|state| nets.iter().map(|net| state[net.index()]).collect()).collect();
        assert_eq!(shown.count(), expected.len().into(), "case {case} on {nets:?}");
        assert!(expected.iter().all(|values| shown.contains(values)), "case {case} on {nets:?}");
    }
    assert!(with_states > 200, "most cases have states to compare, not {with_states}");
}

fn check_rows(set: &StateSet, want: &[Vec<bool>], case: usize) {
    let rows = set.rows(1 << 16);
    assert!(!rows.truncated);
    for state in want {
        let fits = |row: &&Vec<Option<bool>>| {
            row.iter().zip(set.variables()).all(|(value, net)| value.is_none_or(|bit| bit == state[net.index()]))
        };
        assert_eq!(rows.rows.iter().filter(fits).count(), 1, "case {case}: {}", letters(state));
    }
    let size: usize = rows.rows.iter().map(|row| 1usize << row.iter().filter(|v| v.is_none()).count()).sum();
    assert_eq!(size, want.len(), "case {case}");
    if rows.rows.len() > 1 {
        let some = set.rows(rows.rows.len() - 1);
        assert!(some.truncated && some.rows.len() == rows.rows.len() - 1, "case {case}");
        assert!(some.rows.iter().all(|row| rows.rows.contains(row)), "case {case}: a part of the same rows");
    }
}

#[test]
fn the_start_state_against_trying_everything() {
    let mut draw = Draw(0x5eed_0000_0000_0002);
    let mut met = [0usize; 4];
    for case in 0..3000 {
        let (inputs, gates) = (draw.below(4), 2 + draw.below(7));
        let circuit = draw.network(inputs, gates, gates);
        let all = stable_by_trying(&circuit);
        let vector: Vec<bool> = (0..inputs).map(|_| draw.below(2) == 1).collect();
        let agree = |named: &[(NetId, bool)]| -> Vec<&Vec<bool>> {
            let named_fit = |state: &&Vec<bool>| named.iter().all(|(net, bit)| state[net.index()] == *bit);
            all.iter().filter(|state| state[..inputs] == vector).filter(named_fit).collect()
        };
        let names = draw.below(4);
        let named: Vec<(NetId, bool)> =
            (0..names).map(|_| (NetId(draw.below(circuit.net_count()) as u32), draw.below(2) == 1)).collect();
        let want = agree(&named);
        match rest(&circuit, &vector, &named, &Control::default()) {
            Ok(state) => {
                met[0] += 1;
                assert_eq!(want, [&values(&circuit, &state)], "case {case}");
            }
            Err(NoRest::None) => {
                met[1] += 1;
                assert!(agree(&[]).is_empty(), "case {case}");
            }
            Err(NoRest::Contradiction { net }) => {
                met[2] += 1;
                let culprit = (0..named.len()).find(|k| agree(&named[..k + 1]).is_empty()).unwrap();
                assert_eq!(net, named[culprit].0, "case {case}");
                assert!(!agree(&[]).is_empty(), "case {case}");
            }
            Err(NoRest::Several { candidates, total, open }) => {
                met[3] += 1;
                assert!(want.len() > 1, "case {case}");
                assert_eq!(total, want.len().into(), "case {case}");
                assert_eq!(candidates.len(), want.len().min(16), "case {case}");
                let listed: Vec<Vec<bool>> = candidates.iter().map(|state| values(&circuit, state)).collect();
                assert!(listed.is_sorted() && listed.iter().all(|state| want.contains(&state)), "case {case}");
                let differ = |net: &NetId| want.iter().any(|state| state[net.index()] != want[0][net.index()]);
                assert_eq!(open, circuit.nets().filter(differ).collect::<Vec<_>>(), "case {case}");
            }
            Err(NoRest::GaveUp(why)) => panic!("case {case}: {why}"),
        }
    }
    assert!(met.iter().all(|times| *times > 100), "every answer is met often: {met:?}");
}

/// The number of stable states by the other library: one relation over inputs and feedback nets, functions by definition.
pub fn count_elsewhere(circuit: &Circuit) -> BigUint {
    let variables: Vec<NetId> = circuit.inputs().chain(circuit.feedback().iter().copied()).collect();
    let space = BddVariableSet::new_anonymous(variables.len() as u16);
    let mut of: Vec<Option<Bdd>> = vec![None; circuit.net_count()];
    for (net, variable) in variables.iter().zip(space.variables()) {
        of[net.index()] = Some(space.mk_var(variable));
    }
    let mut relation = space.mk_true();
    let mut feedback = Vec::new();
    for gate in circuit.evaluation_order() {
        let net = circuit.net_of(*gate);
        if of[net.index()].is_some() {
            feedback.push(*gate);
            continue;
        }
        of[net.index()] = Some(function(&space, circuit, *gate, &of));
    }
    for gate in feedback {
        let next = function(&space, circuit, gate, &of);
        let own = of[circuit.net_of(gate).index()].as_ref().unwrap();
        relation = relation.and(&own.iff(&next));
    }
    relation.exact_cardinality().to_string().parse().unwrap()
}

fn function(space: &BddVariableSet, circuit: &Circuit, gate: stillgate::circuit::GateId, of: &[Option<Bdd>]) -> Bdd {
    let pins: Vec<&Bdd> = circuit.pins(gate).iter().map(|net| of[net.index()].as_ref().unwrap()).collect();
    let all = || pins.iter().fold(space.mk_true(), |so_far, pin| so_far.and(pin));
    let any = || pins.iter().fold(space.mk_false(), |so_far, pin| so_far.or(pin));
    let parity = || pins.iter().fold(space.mk_false(), |so_far, pin| so_far.xor(pin));
    match circuit.function(gate) {
        Function::Buf => pins[0].clone(),
        Function::Not => pins[0].not(),
        Function::And => all(),
        Function::Nand => all().not(),
        Function::Or => any(),
        Function::Nor => any().not(),
        Function::Xor => parity(),
        Function::Xnor => parity().not(),
        Function::Mux => Bdd::if_then_else(pins[0], pins[2], pins[1]),
        Function::Majority => {
            // at least k of the pins seen so far are 1
            let mut at_least = vec![space.mk_false(); pins.len() + 1];
            at_least[0] = space.mk_true();
            for pin in &pins {
                for k in (1..at_least.len()).rev() {
                    at_least[k] = at_least[k].or(&at_least[k - 1].and(pin));
                }
            }
            at_least[pins.len() / 2 + 1].clone()
        }
        // the one expression that the random networks use: (a & !b | c) ^ (b & d)
        Function::Expr(_) => {
            let [a, b, c, d] = pins[..] else { panic!("four nets") };
            a.and(&b.not()).or(c).xor(&b.and(d))
        }
    }
}

#[test]
fn larger_random_networks_against_another_library() {
    let mut draw = Draw(0x5eed_0000_0000_0003);
    let (mut sizes, mut nonzero) = (BTreeSet::new(), 0);
    let mut cases = 0;
    while cases < 60 {
        let (inputs, gates) = (8 + draw.below(10), 30 + draw.below(50));
        let circuit = draw.network(inputs, gates, 6);
        let variables = circuit.input_count() + circuit.feedback().len();
        if !(20..=40).contains(&variables) {
            continue;
        }
        cases += 1;
        sizes.insert(variables);
        let set = StateSet::of(&circuit, &Control::default()).unwrap();
        let want = count_elsewhere(&circuit);
        nonzero += usize::from(want != BigUint::ZERO);
        assert_eq!(set.count(), want, "{inputs} inputs, {gates} gates, {variables} variables");
    }
    assert!(sizes.len() > 10 && nonzero > 20, "sizes {sizes:?}, {nonzero} with states");
}

#[test]
fn both_ways_to_an_or_of_eight_agree() {
    // the counting form of wide gates against a tree of small ones (common practice, no source)
    use super::networks::circuit;
    let names = ["a", "b", "c", "d", "e", "f", "g", "h"];
    let wide = circuit(&names, &[("y", Function::Or, &names)]);
    let set = StateSet::of(&wide, &Control::default()).unwrap();
    let shown = set.project(&[NetId(0), NetId(8)]).unwrap();
    assert_eq!(shown.count(), 3u8.into(), "a = 1 makes y = 1");
    assert!(!shown.contains(&[true, false]));
}
