//! Networks of hundreds of gates: counts and projections against closed forms, another library, and each other.

use num_bigint::BigUint;
use stillgate::circuit::{Circuit, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::statics::{GaveUp, StateSet};

use elsewhere::Elsewhere;
use networks::{Draw, Wiring, address_bits, array, dividers, random};

#[path = "../../benches/elsewhere.rs"]
mod elsewhere;
#[path = "../../benches/networks.rs"]
mod networks;

/// Seeds of random networks of 300 gates, 24 inputs and 28 to 33 feedback nets; 22 has no stable state.
const SEEDS: [u64; 5] = [0, 14, 22, 24, 35];

fn near(seed: u64) -> Circuit {
    random(Wiring::Within(20), 24, 300, 200, seed)
}

fn shown(set: &StateSet, nets: &[NetId]) -> BigUint {
    set.project(nets).unwrap().count()
}

fn unread(circuit: &Circuit) -> Vec<NetId> {
    let gates = circuit.gates().map(|gate| circuit.net_of(gate));
    gates.filter(|net| circuit.readers(*net).is_empty()).take(8).collect()
}

#[test]
fn random_networks_of_300_gates_against_another_library() {
    for seed in SEEDS {
        let circuit = near(seed);
        assert!((28..=33).contains(&circuit.feedback().len()), "seed {seed}: {} nets", circuit.feedback().len());
        let set = StateSet::of(&circuit, &Control::default()).unwrap();
        let other = Elsewhere::of(&circuit);
        assert_eq!(set.count(), other.count(), "seed {seed}");
        assert_eq!(shown(&set, circuit.feedback()), other.taken(circuit.feedback()), "seed {seed}");
        assert_eq!(shown(&set, &unread(&circuit)), other.shown(&unread(&circuit)).into(), "seed {seed}");
    }
}

/// The same network with inputs and gates in another order.
fn shuffled(circuit: &Circuit, draw: &mut Draw) -> Circuit {
    let mut shuffle = |mut nets: Vec<NetId>| {
        (1..nets.len()).rev().for_each(|at| nets.swap(at, draw.below(at + 1)));
        nets
    };
    let inputs = shuffle(circuit.inputs().collect());
    let gates = shuffle(circuit.gates().map(|gate| circuit.net_of(gate)).collect());
    let place = |net: NetId| inputs.iter().chain(&gates).position(|other| *other == net).unwrap();
    let specs = gates.iter().map(|net| {
        let gate = circuit.driver(*net).unwrap();
        let pins = circuit.pins(gate).iter().map(|pin| NetId(place(*pin) as u32)).collect();
        GateSpec { name: circuit.name(*net).into(), function: circuit.function(gate).clone(), pins }
    });
    let names: Vec<&str> = inputs.iter().map(|net| circuit.name(*net)).collect();
    Circuit::new(&names, specs.collect(), Vec::new()).unwrap()
}

#[test]
fn counts_do_not_depend_on_the_order_of_the_file() {
    // another order of the gates gives other feedback nets and another order of the diagram
    let mut draw = Draw::new(7);
    for circuit in [near(0), near(24), near(35), dividers(16), array(4)] {
        let set = StateSet::of(&circuit, &Control::default()).unwrap();
        let same = shuffled(&circuit, &mut draw);
        let other = StateSet::of(&same, &Control::default()).unwrap();
        assert_eq!(set.count(), other.count());
        let outputs = unread(&circuit);
        let there: Vec<NetId> = outputs.iter().map(|net| same.net(circuit.name(*net)).unwrap()).collect();
        assert_eq!(shown(&set, &outputs), shown(&other, &there));
        assert_eq!(set.vector_counts(), other.vector_counts());
    }
}

#[test]
fn arrays_of_latches_hold_any_content() {
    // common practice, no source: with w = 0 every latch holds 0 or 1, with w = 1 the addressed one holds d; lines
    // beyond the side address nothing
    for side in [2usize, 3, 5, 16] {
        let circuit = array(side);
        let (latches, addresses) = (side * side, 1usize << (2 * address_bits(side)));
        let set = StateSet::of(&circuit, &Control::default()).unwrap();
        let content = BigUint::from(1u8) << latches;
        assert_eq!(set.count(), &content * (4 * addresses - latches), "side {side}");
        let net = |name: String| circuit.net(&name).unwrap();
        let all: Vec<NetId> = (0..latches).map(|at| net(format!("q{}.{}", at / side, at % side))).collect();
        assert_eq!(shown(&set, &all), content, "side {side}");
        let seen: Vec<NetId> = circuit.inputs().chain([net("out".into())]).collect();
        assert_eq!(shown(&set, &seen), (4 * addresses + 2 * latches).into(), "side {side}");
        let counts = set.vector_counts().unwrap();
        assert_eq!((counts.none, counts.one), (0u8.into(), 0u8.into()), "side {side}");
    }
}

#[test]
fn a_chain_of_256_dividers_is_listed_up_to_its_limits() {
    // clock and outputs are free and fix the rest [computed]
    let circuit = dividers(256);
    let set = StateSet::of(&circuit, &Control::default()).unwrap();
    assert_eq!(set.count(), BigUint::from(1u8) << 257);
    let rows = set.rows(100);
    assert!(rows.truncated && rows.rows.len() == 100);
    for clock in [false, true] {
        let (states, truncated) = set.at(&[clock], 20);
        assert!(truncated && states.len() == 20);
        assert!(states.iter().all(|state| state.get(0) == clock));
    }
    let variables = set.state_variables(1 << 10).unwrap();
    assert_eq!((variables.nets.len(), variables.exact), (256, true));
}

#[test]
fn scattered_wiring_ends_at_the_budget_and_says_so() {
    let circuit = random(Wiring::Scattered, 24, 300, 500, 2);
    let control = Control { nodes: 50_000, ..Control::default() };
    assert_eq!(StateSet::of(&circuit, &control).err(), Some(GaveUp::Budget { nodes: 50_000 }));
}
