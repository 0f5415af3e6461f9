//! Networks that only a method with the right growth gets through.

use num_bigint::BigUint;
use stillgate::circuit::{Circuit, Function, NetId};
use stillgate::control::Control;
use stillgate::logic::State;
use stillgate::statics::{GaveUp, NoRest, StateSet, is_stable, rest};

use super::networks::{divider_chain, owned, six_nand_flip_flop};
use super::random_networks::count_elsewhere;

type Gates = Vec<(String, Function, Vec<String>)>;

fn two(count: u32) -> BigUint {
    BigUint::from(1u8) << count
}

/// Many NOR latches with a common reset, and gates behind them that tie all of them together.
fn latch_bank(latches: usize) -> Circuit {
    let mut inputs: Vec<String> = (0..latches).map(|i| format!("s{i}")).collect();
    inputs.push("r".into());
    let mut gates = Gates::new();
    for i in 0..latches {
        gates.push((format!("q{i}"), Function::Nor, vec!["r".into(), format!("p{i}")]));
        gates.push((format!("p{i}"), Function::Nor, vec![format!("s{i}"), format!("q{i}")]));
        for k in 0..8 {
            let function = if k % 2 == 0 { Function::Xor } else { Function::And };
            let left = if k == 0 { format!("q{i}") } else { format!("x{i}_{}", k - 1) };
            let before = if i == 0 { "r".into() } else { format!("x{}_{k}", i - 1) };
            gates.push((format!("x{i}_{k}"), function, vec![left, before]));
        }
    }
    let names: Vec<&str> = inputs.iter().map(String::as_str).collect();
    owned(&names, &gates)
}

#[test]
fn a_hundred_thousand_gates_find_their_start() {
    // common practice, no source: r = 1 clears every latch; at r = s = 0 a latch holds what is named
    let latches = 10_000;
    let bank = latch_bank(latches);
    let net = |name: String| bank.net(&name).unwrap();
    let mut inputs = vec![false; bank.input_count()];
    let named: Vec<(NetId, bool)> = (0..latches).map(|i| (net(format!("q{i}")), i % 3 == 0)).collect();
    let held = rest(&bank, &inputs, &named, &Control::default()).unwrap();
    assert!(named.iter().all(|(net, bit)| held.get(net.index()) == *bit));
    assert!(is_stable(&bank, &State::known(held)));

    // a name less leaves a choice, a name that cannot be leaves none
    let (last, most) = named.split_last().unwrap();
    match rest(&bank, &inputs, most, &Control::default()) {
        Err(NoRest::Several { total, open, .. }) => {
            assert_eq!(total, 2u8.into());
            assert_eq!(open[..2], [last.0, net(format!("p{}", latches - 1))]);
        }
        other => panic!("{other:?}"),
    }
    let mut wrong = named.clone();
    wrong.insert(7_000, (net("p4000".into()), named[4_000].1));
    let culprit = Err(NoRest::Contradiction { net: net("p4000".into()) });
    assert_eq!(rest(&bank, &inputs, &wrong, &Control::default()), culprit);

    *inputs.last_mut().unwrap() = true;
    let cleared = rest(&bank, &inputs, &[], &Control::default()).unwrap();
    assert!(named.iter().all(|(net, _)| !cleared.get(net.index())));
    assert!(is_stable(&bank, &State::known(cleared)));
}

#[test]
fn ten_thousand_latches_have_an_exact_state_set() {
    // common practice, no source: at r = 0 each latch has 2 states when held and 1 when set; at r = 1 one state each
    // for s = 0 and s = 1
    let bank = latch_bank(10_000);
    let set = StateSet::of(&bank, &Control::default()).unwrap();
    assert_eq!(set.count(), BigUint::from(3u8).pow(10_000) + two(10_000));
    let counts = set.vector_counts().unwrap();
    assert_eq!((counts.none, counts.one), (BigUint::ZERO, two(10_000) + 1u8));
}

#[test]
fn a_thousand_dividers_start_where_they_are_told() {
    // the table of the six-NAND flip-flop: clock and output of a stage determine it [computed]
    let stages = 1_000;
    let chain = divider_chain(stages);
    let q = |s: usize| chain.net(&format!("s{s}q")).unwrap();
    let named: Vec<(NetId, bool)> = (0..stages).map(|s| (q(s), s % 5 < 2)).collect();
    let state = rest(&chain, &[true], &named, &Control::default()).unwrap();
    assert!(named.iter().all(|(net, bit)| state.get(net.index()) == *bit));
    assert!(is_stable(&chain, &State::known(state)));
    match rest(&chain, &[true], &named[..stages - 10], &Control::default()) {
        Err(NoRest::Several { total, candidates, .. }) => {
            assert_eq!((total, candidates.len()), (two(10), 16));
            assert!(candidates.into_iter().all(|state| is_stable(&chain, &State::known(state))));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn registers_of_flip_flops_rest_with_any_content() {
    // common practice, no source: between clock edges a synchronous register holds any word, for each value of the clock
    let n = 32;
    let mut counter = Gates::new();
    for i in 0..n {
        counter.extend(six_nand_flip_flop(&format!("f{i}"), "c", &format!("d{i}")));
        let carry = if i == 0 { "en".into() } else { format!("k{}", i - 1) };
        counter.push((format!("d{i}"), Function::Xor, vec![format!("f{i}q"), carry.clone()]));
        counter.push((format!("k{i}"), Function::And, vec![format!("f{i}q"), carry]));
    }
    let counter = owned(&["c", "en"], &counter);
    assert_eq!(StateSet::of(&counter, &Control::default()).unwrap().count(), two(34));

    // a shift register closed to a ring through an exclusive or: one long loop
    let mut ring = Gates::new();
    for i in 0..n {
        let data = if i == 0 { "back".into() } else { format!("f{}q", i - 1) };
        ring.extend(six_nand_flip_flop(&format!("f{i}"), "c", &data));
    }
    ring.push(("back".into(), Function::Xor, vec!["f31q".into(), "f29q".into(), "f16q".into()]));
    let ring = owned(&["c"], &ring);
    assert_eq!(StateSet::of(&ring, &Control::default()).unwrap().count(), two(33));
}

/// NORs on a closed grid, each reading its four neighbours: stable where the ones are a maximal independent set.
fn grid_of_nors(width: usize, height: usize) -> Circuit {
    let name = |x: usize, y: usize| format!("y{}_{}", x % width, y % height);
    let mut gates = Gates::new();
    for x in 0..width {
        for y in 0..height {
            let near = vec![name(x + 1, y), name(x + width - 1, y), name(x, y + 1), name(x, y + height - 1)];
            gates.push((name(x, y), Function::Nor, near));
        }
    }
    owned(&[], &gates)
}

#[test]
fn a_grid_of_nors_is_counted_in_either_order() {
    // another library (biodivine-lib-bdd) counts the same; the small budget is enough only for the better of our orders
    let grid = grid_of_nors(12, 4);
    let want = count_elsewhere(&grid);
    for nodes in [0, 20_000] {
        let control = Control { nodes, ..Control::default() };
        assert_eq!(StateSet::of(&grid, &control).unwrap().count(), want, "budget {nodes}");
    }
    let control = Control { nodes: 100, ..Control::default() };
    assert_eq!(StateSet::of(&grid, &control).err(), Some(GaveUp::Budget { nodes: 100 }));
}

#[test]
fn too_much_work_is_said_and_not_guessed() {
    // latches far apart compared pair by pair: the states are easy, the function behind them is exponential in our order
    let pairs = 24;
    let mut gates = Gates::new();
    for i in 0..2 * pairs {
        gates.push((format!("q{i}"), Function::Nor, vec!["r".into(), format!("p{i}")]));
        gates.push((format!("p{i}"), Function::Nor, vec!["s".into(), format!("q{i}")]));
    }
    let same = |i: usize| (format!("e{i}"), Function::Xnor, vec![format!("q{i}"), format!("q{}", i + pairs)]);
    gates.extend((0..pairs).map(same));
    gates.push(("all".into(), Function::And, (0..pairs).map(|i| format!("e{i}")).collect()));
    let circuit = owned(&["r", "s"], &gates);
    let control = Control { nodes: 100_000, ..Control::default() };
    match rest(&circuit, &[false, false], &[], &control) {
        Err(NoRest::Several { total, open, candidates }) => {
            assert_eq!((total, candidates.len()), (two(2 * pairs as u32), 16));
            assert!(circuit.feedback().iter().all(|net| open.contains(net)), "each latch is open: {open:?}");
        }
        other => panic!("{other:?}"),
    }
    let all = circuit.net("all").unwrap();
    let forced = rest(&circuit, &[false, false], &[(all, true)], &control);
    assert_eq!(forced, Err(NoRest::GaveUp(GaveUp::Budget { nodes: 100_000 })));
    let set = StateSet::of(&circuit, &control).unwrap();
    assert_eq!(set.project(&[all]).err(), Some(GaveUp::Budget { nodes: 100_000 }));

    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    let stopped = rest(&circuit, &[false, false], &[(all, true)], &control);
    assert_eq!(stopped, Err(NoRest::GaveUp(GaveUp::Cancelled)));
}
