//! Speed of the delay-free view on networks of hundreds of gates: `cargo bench --bench statics`.
//!
//! Every benchmark asserts its answer. The answers come from a closed form that is derived beside it, or from another
//! library. First each network is measured once in a process of its own, with its peak memory; then the times follow.

#![allow(clippy::print_stdout)] // figures are for a person

mod elsewhere;
mod measure;
mod networks;

use divan::{Bencher, black_box};
use elsewhere::Elsewhere;
use measure::Network;
use num_bigint::BigUint;
use stillgate::circuit::{Circuit, NetId};
use stillgate::control::Control;
use stillgate::statics::StateSet;

/// What a state set may take, megabytes.
const MEMORY: f64 = 500.0;
/// Outputs of the random networks that are looked at: one by one in the other library.
const SHOWN: usize = 8;
/// Seeds of the random networks of 300 gates; they have 26 to 33 feedback nets. The numbers 20 and 22 have no stable
/// state at all.
const SEEDS: [u64; 10] = [0, 2, 6, 8, 14, 17, 20, 22, 24, 35];

fn main() {
    measure::answer_if_asked();
    println!("state set and count, processor time and peak memory of a process of its own");
    let random = SEEDS.map(|seed| Network::Near { gates: 300, seed });
    let chains = [Network::Dividers(64), Network::Dividers(256), Network::Array(16)];
    for network in chains.into_iter().chain(random) {
        let cost = measure::cost(network);
        let nodes = cost.nodes.expect("within the budget");
        let megabytes = cost.megabytes.map_or("memory not told".to_string(), |megabytes| format!("{megabytes:.1} MB"));
        let (time, digits) = (cost.seconds * 1e3, cost.digits);
        println!("  {network:?}: {digits} bits of count, {time:.2} ms, {nodes} nodes, {megabytes}");
        assert!(cost.megabytes.is_none_or(|megabytes| megabytes < MEMORY));
    }
    println!();
    divan::main();
}

fn two(power: usize) -> BigUint {
    BigUint::from(1u8) << power
}

fn states(circuit: &Circuit) -> StateSet<'_> {
    StateSet::of(circuit, &Control::default()).expect("within the budget")
}

fn nets(circuit: &Circuit, names: impl Iterator<Item = String>) -> Vec<NetId> {
    names.map(|name| circuit.net(&name).expect("it is in the network")).collect()
}

/// Asserts by trying everything what the answers for a chain rest on: for each value of its clock and of `q` a divider
/// has just one stable state, and in it `n2` is 0 just where both are 1.
fn a_divider_is_known_by_clock_and_output() {
    let one = networks::dividers(1);
    for (clock, q) in [(false, false), (false, true), (true, false), (true, true)] {
        let net = |name: &str| one.net(name).expect("a net of the divider").index();
        let stable: Vec<Vec<bool>> = (0..1u32 << one.net_count())
            .map(|row| (0..one.net_count()).map(|net| row >> net & 1 == 1).collect::<Vec<bool>>())
            .filter(|state| state[net("c")] == clock && state[net("s0.q")] == q)
            .filter(|state| {
                one.gates().all(|gate| {
                    let pins: Vec<bool> = one.pins(gate).iter().map(|net| state[net.index()]).collect();
                    one.function(gate).value(&pins) == state[one.net_of(gate).index()]
                })
            })
            .collect();
        assert_eq!(stable.len(), 1, "clock {clock}, q {q}");
        assert_eq!(stable[0][net("s0.n2")], !(clock && q));
    }
}

/// Words of so many digits that do not contain 101. A stage's `n2` is 0 where its clock and output are 1; two stages
/// that do so around a third make that do so, too, and nothing else is tied.
fn words_without_101(digits: usize) -> BigUint {
    // by the end of the word: 1, 10, anything else
    let (mut one, mut one_zero, mut other) = (BigUint::ZERO, BigUint::ZERO, two(0));
    for _ in 0..digits {
        (one, one_zero, other) = (&one + &other, one, one_zero + other);
    }
    one + one_zero + other
}

/// The first clock and every output are free, and they fix the rest.
#[divan::bench(args = [64, 256], sample_count = 10)]
fn count_of_dividers(bencher: Bencher<'_, '_>, stages: usize) {
    a_divider_is_known_by_clock_and_output();
    let circuit = networks::dividers(stages);
    bencher.bench_local(|| assert_eq!(states(black_box(&circuit)).count(), two(stages + 1)));
}

/// Clock and outputs, then the inner nets that tell where clock and output are both 1.
#[divan::bench(args = [64, 256], sample_count = 10)]
fn projections_of_dividers(bencher: Bencher<'_, '_>, stages: usize) {
    a_divider_is_known_by_clock_and_output();
    let circuit = networks::dividers(stages);
    let set = states(&circuit);
    let outputs = nets(&circuit, ["c".into()].into_iter().chain((0..stages).map(|k| format!("s{k}.q"))));
    let inner = nets(&circuit, (0..stages).map(|k| format!("s{k}.n2")));
    bencher.bench_local(|| {
        assert_eq!(set.project(&outputs).expect("within the budget").count(), two(stages + 1));
        assert_eq!(set.project(&inner).expect("within the budget").count(), words_without_101(stages));
    });
}

/// With `w` = 0 every latch holds 0 or 1; with `w` = 1 the addressed one holds `d`.
#[divan::bench(args = [16], sample_count = 10)]
fn count_of_an_array(bencher: Bencher<'_, '_>, side: usize) {
    let circuit = networks::array(side);
    let (latches, address) = (side * side, 2 * networks::address_bits(side));
    let want = two(latches) * (4usize * (1 << address) - latches);
    bencher.bench_local(|| assert_eq!(states(black_box(&circuit)).count(), want));
}

/// What all latches show; what inputs and `out` show; what inputs and the latches of the first row show.
#[divan::bench(args = [16], sample_count = 10)]
fn projections_of_an_array(bencher: Bencher<'_, '_>, side: usize) {
    let circuit = networks::array(side);
    let set = states(&circuit);
    let (latches, addresses) = (side * side, 1usize << (2 * networks::address_bits(side)));
    let all = nets(&circuit, (0..latches).map(|at| format!("q{}.{}", at / side, at % side)));
    let inputs = || circuit.inputs().collect::<Vec<_>>();
    let shown = [inputs(), nets(&circuit, ["out".to_string()].into_iter())].concat();
    let row = [inputs(), nets(&circuit, (0..side).map(|at| format!("q0.{at}")))].concat();
    bencher.bench_local(|| {
        let count = |nets: &[NetId]| set.project(nets).expect("within the budget").count();
        assert_eq!(count(&all), two(latches));
        // `out` is free only where an address is and nothing is written
        assert_eq!(count(&shown), BigUint::from(4 * addresses + 2 * latches));
        // one latch of the row is bound where it is written: for `side` of the addresses
        assert_eq!(count(&row), two(side) * (4 * addresses - side));
    });
}

fn random(seed: u64) -> Circuit {
    let circuit = Network::Near { gates: 300, seed }.circuit();
    let feedback = circuit.feedback().len();
    assert!((26..=33).contains(&feedback), "about 30 feedback nets, not {feedback}");
    circuit
}

#[divan::bench(args = SEEDS, sample_count = 5)]
fn count_of_random_300_gates(bencher: Bencher<'_, '_>, seed: u64) {
    let circuit = random(seed);
    let want = Elsewhere::of(&circuit).count();
    bencher.bench_local(|| assert_eq!(states(black_box(&circuit)).count(), want));
}

/// The feedback nets.
#[divan::bench(args = SEEDS, sample_count = 5)]
fn feedback_of_random_300_gates(bencher: Bencher<'_, '_>, seed: u64) {
    let circuit = random(seed);
    let set = states(&circuit);
    let want = Elsewhere::of(&circuit).taken(circuit.feedback());
    bencher.bench_local(|| {
        assert_eq!(set.project(circuit.feedback()).expect("within the budget").count(), want);
    });
}

/// Nets that no gate reads.
#[divan::bench(args = SEEDS, sample_count = 5)]
fn outputs_of_random_300_gates(bencher: Bencher<'_, '_>, seed: u64) {
    let circuit = random(seed);
    let set = states(&circuit);
    let gates = circuit.gates().map(|gate| circuit.net_of(gate));
    let outputs: Vec<NetId> = gates.filter(|net| circuit.readers(*net).is_empty()).take(SHOWN).collect();
    let want = Elsewhere::of(&circuit).shown(&outputs);
    bencher.bench_local(|| {
        assert_eq!(set.project(&outputs).expect("within the budget").count(), BigUint::from(want));
    });
}

/// What `stillgate states` asks for beside: rows, states by input vector, kinds of input vectors, state variables.
#[divan::bench(args = ["256 dividers", "array of 16x16"], sample_count = 5)]
fn listings(bencher: Bencher<'_, '_>, network: &str) {
    let network = if network == "256 dividers" { Network::Dividers(256) } else { Network::Array(16) };
    let circuit = network.circuit();
    let set = states(&circuit);
    bencher.bench_local(|| {
        let rows = set.rows(4096);
        let listed: usize = set.by_inputs(8, 64).map(|vector| vector.states.len()).sum();
        let counts = set.vector_counts().expect("within the budget");
        let variables = set.state_variables(1 << 16).expect("within the budget");
        // every input vector has states, and several: each divider, each latch keeps one bit
        assert_eq!((counts.none, counts.one), (BigUint::ZERO, BigUint::ZERO));
        assert_eq!((variables.nets.len(), variables.exact), (256, true));
        match network {
            Network::Dividers(_) => assert_eq!((rows.rows.len(), rows.truncated, listed), (4096, true, 2 * 64)),
            _ => assert_eq!((rows.truncated, listed), (false, 8 * 64)),
        }
    });
}
