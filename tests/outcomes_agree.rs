//! What may follow a change of inputs, against a slow explorer that visits every state; and ternary simulation as the
//! bound that theory says it is.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Circuit, NetId};
use stillgate::control::Control;
use stillgate::logic::{Bits, Value};
use stillgate::statics::{Change, GaveUp, Outcome, Race, bound, outcome};

use crate::support::explorer::{Delays, Explorer, agrees, least_upper_bound, letters, values};
use crate::support::small_nets::{SmallNet, every_network};

/// One change from one stable state.
#[derive(Clone, Debug)]
struct Case {
    from: Vec<bool>,
    change: Change,
}

/// How often what was met, so that a test cannot pass by meeting nothing.
#[derive(Debug, Default)]
struct Met {
    none: u32,
    non_critical: u32,
    critical: u32,
    cycles: u32,
    several_cycles: u32,
}

/// From every stable state every change of some inputs, all at once and, if there are several, one by one.
fn cases(circuit: &Circuit, explorer: &Explorer) -> Vec<Case> {
    let mut cases = Vec::new();
    let inputs = circuit.input_count();
    for from in explorer.stable_states() {
        for chosen in 1u32..1 << inputs {
            let set: Vec<(NetId, bool)> = (0..inputs)
                .filter(|input| chosen >> input & 1 == 1)
                .map(|input| (NetId(input as u32), !from[input]))
                .collect();
            for apart in [false, true] {
                if !apart || set.len() > 1 || from[0] {
                    cases.push(Case { from: from.clone(), change: Change { set: set.clone(), apart } });
                }
            }
        }
    }
    cases
}

/// What is wrong with the answer for one case, in words.
fn compare(circuit: &Circuit, explorer: &Explorer, case: &Case, met: &mut Met) -> Result<(), String> {
    let explored = explorer.explore(&case.from, &case.change);
    match explored.race {
        Race::None => met.none += 1,
        Race::NonCritical => met.non_critical += 1,
        Race::Critical => met.critical += 1,
    }
    met.cycles += u32::from(!explored.cycles.is_empty());
    met.several_cycles += u32::from(explored.cycles.len() > 1);
    let from = Bits::of(case.from.iter().copied());
    let list = |states: &[Vec<bool>]| states.iter().map(|state| letters(state)).collect::<Vec<_>>().join(" ");
    let want = format!("{} | {} cycles | {:?}", list(&explored.stable), explored.cycles.len(), explored.race);
    let got = match outcome(circuit, &from, &case.change, &Control::default()).unwrap() {
        Outcome::Exact { states, cycles, race } => {
            let states: Vec<Vec<bool>> = states.iter().map(|state| values(circuit, state)).collect();
            format!("{} | {cycles} cycles | {race:?}", list(&states))
        }
        Outcome::Bound(_) => "only a bound".to_string(),
    };
    let (spread, settled) = bound(circuit, &from, &case.change);
    let error = if want != got {
        format!("explored {want}, but outcome says {got}")
    } else if let Some(state) = explored.reached.iter().find(|state| !agrees(state, &spread)) {
        format!("{} is reached, outside the spread X", letters(state))
    } else if let Some(state) = explored.outcome.iter().find(|state| !agrees(state, &settled)) {
        format!("{} may follow, outside the ternary bound", letters(state))
    } else {
        return Ok(());
    };
    let set: Vec<String> = case.change.set.iter().map(|(net, bit)| format!("i{} = {}", net.0, *bit as u8)).collect();
    let apart = if case.change.apart { ", apart" } else { "" };
    Err(format!("  from {}, {}{apart}:\n  {error}", letters(&case.from), set.join(", ")))
}

fn first_error(net: &SmallNet, met: &mut Met) -> Option<String> {
    let circuit = net.circuit();
    let explorer = Explorer::new(&circuit, Delays::Gates);
    let error = cases(&circuit, &explorer).iter().find_map(|case| compare(&circuit, &explorer, case, met).err());
    error.map(|error| format!("{net}{error}"))
}

/// Compares all cases of a network; panics with the smallest network that fails alike.
fn check(net: &SmallNet, name: &str, met: &mut Met) {
    let Some(mut error) = first_error(net, met) else { return };
    let mut net = net.clone();
    let mut unheard = Met::default();
    while let Some((smaller, its)) =
        net.smaller().into_iter().find_map(|net| first_error(&net, &mut unheard).map(|error| (net, error)))
    {
        (net, error) = (smaller, its);
    }
    panic!("{name}, shrunk:\n{error}");
}

#[test]
fn every_network_of_up_to_three_gates_and_one_input() {
    let mut met = Met::default();
    let (mut networks, mut wrong, mut first) = (0, 0, None);
    for gates in 1..=3 {
        every_network(1, gates, &mut |net| {
            networks += 1;
            if let Some(error) = first_error(net, &mut met) {
                wrong += 1;
                first.get_or_insert(error);
            }
        });
    }
    assert_eq!(networks, 18 + 36 * 36 + 60 * 60 * 60, "each wiring once");
    assert!(wrong == 0, "{wrong} of {networks} networks; the first of the smallest:\n{}", first.unwrap_or_default());
    let all = [met.none, met.non_critical, met.critical, met.cycles];
    assert!(all.iter().all(|count| *count > 1000), "{met:?}");
}

#[test]
fn random_networks() {
    let mut met = Met::default();
    for number in 0..2500u64 {
        let mut rng = ChaCha8Rng::seed_from_u64(11);
        rng.set_stream(number);
        let inputs = rng.random_range(1..=3);
        let net = if rng.random_bool(0.5) {
            let gates = rng.random_range(4..=7);
            SmallNet::random(&mut rng, inputs, gates)
        } else {
            let gates = rng.random_range(4..=7);
            SmallNet::random_of_two(&mut rng, inputs, gates)
        };
        check(&net, &format!("seed 11, stream {number}"), &mut met);
    }
    let all = [met.none, met.non_critical, met.critical, met.cycles, met.several_cycles];
    assert!(all.iter().all(|count| *count > 50), "{met:?}");
}

/// Parts that do not read each other, and parts that read only those before them, also by way of loop-free logic: what
/// may be analysed part by part must come out as if it were not.
#[test]
fn networks_of_several_parts() {
    let mut met = Met::default();
    for number in 0..2500u64 {
        let mut rng = ChaCha8Rng::seed_from_u64(12);
        rng.set_stream(number);
        let inputs = rng.random_range(1..=2);
        let mut net = SmallNet { inputs, gates: Vec::new() };
        let beside = rng.random_bool(0.4);
        while net.gates.len() < 5 {
            let gates = rng.random_range(1..=3);
            let own = rng.random_range(1..=2);
            let part = SmallNet::random_of_two(&mut rng, own, gates);
            let seen = if beside { inputs } else { inputs + net.gates.len() };
            let sources: Vec<usize> = (0..own).map(|_| rng.random_range(0..seen)).collect();
            net.append(&part, &sources);
        }
        check(&net, &format!("seed 12, stream {number}"), &mut met);
    }
    let all = [met.none, met.non_critical, met.critical, met.cycles, met.several_cycles];
    assert!(all.iter().all(|count| *count > 50), "{met:?}");
}

/// Loops beside loops: the ways out multiply, and so do the cycles in which they may stay.
#[test]
fn loops_beside_and_behind_loops() {
    use stillgate::circuit::Function::{And, Buf, Nand, Nor, Not, Or, Xor};
    // a latch set free from both sides, a gated ring of three, a ring of one, a latch that only remembers
    let latch = SmallNet { inputs: 1, gates: vec![(Nor, vec![0, 2]), (Nor, vec![0, 1])] };
    let ring = SmallNet { inputs: 1, gates: vec![(Nand, vec![0, 3]), (Not, vec![1]), (Not, vec![2])] };
    let single = SmallNet { inputs: 1, gates: vec![(Nand, vec![0, 1])] };
    let hold = SmallNet { inputs: 1, gates: vec![(Or, vec![0, 2]), (Buf, vec![1])] };
    let parts = [latch, ring, single, hold];
    let mut met = Met::default();
    for a in &parts {
        for b in &parts {
            let mut beside = SmallNet { inputs: 1, gates: Vec::new() };
            beside.append(a, &[0]);
            beside.append(b, &[0]);
            check(&beside, "beside", &mut met);
            for glue in [And, Xor] {
                let mut behind = SmallNet { inputs: 1, gates: Vec::new() };
                behind.append(a, &[0]);
                let last = behind.gates.len();
                behind.append(&SmallNet { inputs: 2, gates: vec![(glue, vec![0, 1])] }, &[0, last]);
                behind.append(b, &[last + 1]);
                check(&behind, "behind", &mut met);
            }
        }
    }
    assert!(met.critical > 20 && met.cycles > 20 && met.several_cycles > 0, "{met:?}");
}

/// With a delay in every wire, too, ternary simulation is exact: B is the least upper bound of the outcome, A that of all
/// states on the way (Brzozowski and Seger 1987, IEEE Trans. Comput. C-36, 1318-1327: page; A: from memory).
#[test]
fn ternary_simulation_is_exact_with_a_delay_in_every_wire() {
    let mut wider = 0;
    let mut number = 0;
    let mut compare = |net: &SmallNet, name: &str| {
        let circuit = net.circuit();
        let wired = Explorer::new(&circuit, Delays::GatesAndWires);
        let plain = Explorer::new(&circuit, Delays::Gates);
        for case in cases(&circuit, &plain) {
            number += 1;
            let from = Bits::of(case.from.iter().copied());
            let (spread, settled) = bound(&circuit, &from, &case.change);
            let explored = wired.explore(&case.from, &case.change);
            let context = || format!("{name}\n{net}  from {}, {:?}", letters(&case.from), case.change);
            assert_eq!(least_upper_bound(&explored.outcome).as_ref(), Some(&settled), "B of {}", context());
            // an input that has changed is at its new value in A's states that matter, and at X in A itself
            let mut reached = explored.reached;
            reached.push(case.from.clone());
            assert_eq!(least_upper_bound(&reached).as_ref(), Some(&spread), "A of {}", context());
            let without = plain.explore(&case.from, &case.change);
            wider += u32::from(least_upper_bound(&without.outcome).as_ref() != Some(&settled));
        }
    };
    for gates in 1..=2 {
        every_network(1, gates, &mut |net| compare(net, "all small ones"));
    }
    for stream in 0..600u64 {
        let mut rng = ChaCha8Rng::seed_from_u64(13);
        rng.set_stream(stream);
        let (inputs, gates) = (rng.random_range(1..=2), rng.random_range(2..=3));
        let net = match rng.random_bool(0.5) {
            true => SmallNet::random_of_two(&mut rng, inputs, gates),
            false => SmallNet::random(&mut rng, inputs, gates),
        };
        let pins: usize = net.gates.iter().map(|gate| gate.1.len()).sum();
        if pins <= 7 {
            compare(&net, &format!("seed 13, stream {stream}"));
        }
    }
    assert!(number > 2000 && wider > 5, "{wider} of {number} wider than with gate delays alone");
}

#[test]
fn a_change_that_changes_nothing_leads_nowhere_else() {
    let mut met = Met::default();
    every_network(1, 2, &mut |net| {
        let circuit = net.circuit();
        for from in Explorer::new(&circuit, Delays::Gates).stable_states() {
            for set in [vec![], vec![(NetId(0), from[0])]] {
                for apart in [false, true] {
                    let state = Bits::of(from.iter().copied());
                    let change = Change { set: set.clone(), apart };
                    let stays = Outcome::Exact { states: vec![state.clone()], cycles: 0, race: Race::None };
                    assert_eq!(outcome(&circuit, &state, &change, &Control::default()).unwrap(), stays, "{net}");
                    met.none += 1;
                }
            }
        }
    });
    assert!(met.none > 1000);
}

#[test]
fn whoever_cancels_hears_so_and_gets_no_answer() {
    let net = SmallNet::random_of_two(&mut ChaCha8Rng::seed_from_u64(14), 1, 3);
    let control = Control::default();
    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    let state = Bits::zeros(4);
    let change = Change::of_one(&state, NetId(0));
    assert_eq!(outcome(&net.circuit(), &state, &change, &control), Err(GaveUp::Cancelled));
}

/// Many loops at once: too many states to visit them all together, so the answer is either exact by parts or a bound that
/// holds; never something narrower. Latches of two NORs let go at once from both sides: each ends either way, or stays in
/// its cycle (common practice, no source).
#[test]
fn what_is_too_large_stays_a_bound() {
    use stillgate::circuit::Function::Nor;
    let latch = SmallNet { inputs: 1, gates: vec![(Nor, vec![0, 2]), (Nor, vec![0, 1])] };
    for latches in [1usize, 2, 3, 40] {
        let mut net = SmallNet { inputs: 1, gates: Vec::new() };
        (0..latches).for_each(|_| net.append(&latch, &[0]));
        let circuit = net.circuit();
        let mut from = Bits::zeros(circuit.net_count());
        from.set(0, true);
        let change = Change::of_one(&from, NetId(0));
        match outcome(&circuit, &from, &change, &Control::default()).unwrap() {
            Outcome::Exact { states, cycles, race } => {
                assert!(latches <= 20, "2^40 states fit into no list");
                assert_eq!(states.len(), 1 << latches);
                assert_eq!(cycles, 3u64.pow(latches as u32) - (1 << latches), "some latch stays in its cycle");
                assert_eq!(race, Race::Critical);
            }
            Outcome::Bound(state) => {
                assert!(latches > 3, "{latches} latches are few");
                let known: Vec<Value> = circuit.nets().map(|net| state.get(net.index())).collect();
                assert!(known[0] == Value::Zero && known[1..].iter().all(|value| *value == Value::X), "{known:?}");
            }
        }
    }
}
/// A loop that comes to rest in single steps, and a gate behind it that then never does: the race is that of the loop.
#[test]
fn one_loop_settles_and_the_one_behind_it_never_does() {
    use stillgate::circuit::Function::{Buf, Nor, Xnor};
    let mut met = Met::default();
    let short = vec![(Xnor, vec![1, 2, 3]), (Nor, vec![0, 3]), (Nor, vec![0, 2])];
    let long = vec![(Xnor, vec![1, 2, 4]), (Nor, vec![0, 3]), (Buf, vec![4]), (Nor, vec![0, 2])];
    for gates in [short, long] {
        check(&SmallNet { inputs: 1, gates }, "by hand", &mut met);
    }
    assert!(met.none > 0 && met.cycles > 0);
}
