//! All small networks, against trying every value of every net (no source needed: the definition of a stable state).

use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::logic::{Bits, State, Value};
use stillgate::statics::{StateSet, is_stable};

use super::networks::{letters, stable_by_trying, values};

const ALL: [Function; 6] = [Function::And, Function::Or, Function::Nand, Function::Nor, Function::Xor, Function::Xnor];

/// Calls `check` with every network of `gates` two-input gates with these functions and any wiring. Both pins of a gate
/// may read one net; the order of pins does not matter.
fn every_network(inputs: u32, gates: u32, functions: &[Function], check: &mut impl FnMut(&Circuit)) {
    let nets = inputs + gates;
    let mut kinds = Vec::new();
    for function in functions {
        for a in 0..nets {
            kinds.extend((a..nets).map(|b| (function.clone(), vec![NetId(a), NetId(b)])));
        }
    }
    let names: Vec<String> = (0..inputs).map(|i| format!("i{i}")).collect();
    for mut choice in 0..kinds.len().pow(gates) {
        let specs = (0..gates)
            .map(|gate| {
                let (function, pins) = kinds[choice % kinds.len()].clone();
                choice /= kinds.len();
                GateSpec { name: format!("g{gate}"), function, pins }
            })
            .collect();
        check(&Circuit::new(&names, specs, vec![]).unwrap());
    }
}

/// Everything the state set says of the states themselves.
fn check_states(circuit: &Circuit) {
    let want = stable_by_trying(circuit);
    let set = StateSet::of(circuit, &Control::default()).unwrap();
    let context =
        || format!("{:?}", circuit.gates().map(|g| (circuit.function(g), circuit.pins(g))).collect::<Vec<_>>());
    assert_eq!(set.count(), want.len().into(), "{}", context());
    let mut found = Vec::new();
    let (mut none, mut one, mut several) = (0u8, 0u8, 0u8);
    for vector in set.by_inputs(1 << 8, 1 << 8) {
        match vector.states.len() {
            0 => none += 1,
            1 => one += 1,
            _ => several += 1,
        }
        found.extend(vector.states.iter().map(|state| values(circuit, state)));
    }
    assert_eq!(found, want, "{}", context());
    let counts = set.vector_counts().unwrap();
    assert_eq!([counts.none, counts.one, counts.several], [none.into(), one.into(), several.into()], "{}", context());
}

/// Rows, projections, state variables.
fn check_views(circuit: &Circuit) {
    let want = stable_by_trying(circuit);
    let all = || want.iter().map(|state| letters(state)).collect::<Vec<_>>().join(" ");
    let set = StateSet::of(circuit, &Control::default()).unwrap();
    let pick = |state: &[bool], nets: &[NetId]| nets.iter().map(|net| state[net.index()]).collect::<Vec<bool>>();

    for row in 0..1u64 << circuit.net_count() {
        let values: Vec<bool> = circuit.nets().map(|net| row >> net.0 & 1 == 1).collect();
        let mut state = State::known(Bits::of(values.iter().copied()));
        assert_eq!(is_stable(circuit, &state), want.contains(&values), "{} of {}", letters(&values), all());
        state.set(circuit.net_count() - 1, Value::X);
        assert!(!is_stable(circuit, &state), "X is never stable");
    }

    let rows = set.rows(1000);
    assert!(!rows.truncated);
    let variables = set.variables().to_vec();
    let fits = |row: &[Option<bool>], values: &[bool]| row.iter().zip(values).all(|(r, v)| r.is_none_or(|r| r == *v));
    for state in &want {
        let values = pick(state, &variables);
        let hits = rows.rows.iter().filter(|row| fits(row, &values)).count();
        assert_eq!(hits, 1, "{} is in {hits} rows; states {}", letters(state), all());
    }
    let size: usize = rows.rows.iter().map(|row| 1 << row.iter().filter(|v| v.is_none()).count()).sum();
    assert_eq!(size, want.len(), "the rows hold nothing else");

    for chosen in 0..1u32 << circuit.net_count() {
        let nets: Vec<NetId> = circuit.nets().filter(|net| chosen >> net.0 & 1 == 1).collect();
        let shown = set.project(&nets).unwrap();
        let expected: std::collections::BTreeSet<Vec<bool>> = want.iter().map(|state| pick(state, &nets)).collect();
        assert_eq!(shown.count(), expected.len().into(), "nets {nets:?} of {}", all());
        for row in 0..1u32 << nets.len() {
            let values: Vec<bool> = (0..nets.len()).map(|i| row >> i & 1 == 1).collect();
            let context = format!("{} on {nets:?} of {}", letters(&values), all());
            assert_eq!(shown.contains(&values), expected.contains(&values), "{context}");
            let hits = shown.rows(1000).rows.iter().filter(|row| fits(row, &values)).count();
            assert_eq!(hits, usize::from(expected.contains(&values)), "rows: {context}");
        }
    }

    let apart = |nets: &[NetId]| {
        want.iter().enumerate().all(|(at, a)| {
            want[at + 1..]
                .iter()
                .all(|b| a[..circuit.input_count()] != b[..circuit.input_count()] || pick(a, nets) != pick(b, nets))
        })
    };
    let gates: Vec<NetId> = circuit.gates().map(|gate| circuit.net_of(gate)).collect();
    let best = (0..1u32 << gates.len())
        .map(|choice| (0..gates.len()).filter(|i| choice >> i & 1 == 1).map(|i| gates[i]).collect::<Vec<_>>())
        .filter(|nets| apart(nets))
        .min_by_key(|nets| (nets.len(), nets.clone()))
        .unwrap();
    let exact = set.state_variables(1000).unwrap();
    assert_eq!((exact.nets, exact.exact), (best.clone(), true), "{}", all());
    // without looking at single states: still enough, and if it says exact, of the right size
    let thinned = set.state_variables(0).unwrap();
    assert!(apart(&thinned.nets), "{:?} do not tell {} apart", thinned.nets, all());
    assert!(thinned.nets.len() >= best.len());
    assert!(!thinned.exact || thinned.nets.len() == best.len(), "{:?}, not {best:?}: {}", thinned.nets, all());
}

#[test]
fn all_networks_of_one_and_two_gates() {
    let mut number = 0;
    for inputs in 0..=2 {
        for gates in 1..=2 {
            every_network(inputs, gates, &ALL, &mut |circuit| {
                check_states(circuit);
                number += 1;
            });
        }
    }
    assert_eq!(number, 6 + 18 * 18 + 18 + 36 * 36 + 36 + 60 * 60, "each wiring once");
}

#[test]
fn all_networks_of_three_gates() {
    for inputs in 0..=1 {
        every_network(inputs, 3, &ALL, &mut check_states);
    }
    // the other three are the complements
    every_network(2, 3, &[Function::Nand, Function::Nor, Function::Xor], &mut check_states);
}

#[test]
fn views_of_all_small_networks() {
    for gates in 1..=2 {
        every_network(1, gates, &ALL, &mut check_views);
    }
    every_network(0, 3, &[Function::Nand, Function::Nor, Function::Xor], &mut check_views);
    every_network(1, 3, &[Function::Nor], &mut check_views);
    every_network(2, 2, &[Function::And, Function::Nor, Function::Xor], &mut check_views);
}
