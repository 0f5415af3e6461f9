//! Circuits of a million gates: no recursion, the right loops, blocks, cones and rest. Nothing here takes time that is more
//! than nearly linear, or these tests would not end.

use std::collections::{HashMap, HashSet};

use stillgate::circuit::{Circuit, Function, GateId, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::engine::{Finish, Observer, Program};
use stillgate::instance::{Instance, Which};
use stillgate::logic::Value;
use stillgate::scenario::{Builder, NewStep};
use stillgate::statics;
use stillgate::time::Time;

const MILLION: u32 = 1_000_000;

fn gate(name: String, function: Function, pins: &[u32]) -> GateSpec {
    GateSpec { name, function, pins: pins.iter().map(|pin| NetId(*pin)).collect() }
}

/// Is every gate behind those it reads, but for the nets that cut loops?
fn in_order(circuit: &Circuit) -> bool {
    let order = circuit.evaluation_order();
    let cut: HashSet<NetId> = circuit.feedback().iter().copied().collect();
    let mut done = vec![false; circuit.gate_count()];
    for gate in order {
        let ready = |net: &NetId| cut.contains(net) || circuit.driver(*net).is_none_or(|other| done[other.index()]);
        if done[gate.index()] || !circuit.pins(*gate).iter().all(ready) {
            return false;
        }
        done[gate.index()] = true;
    }
    order.len() == circuit.gate_count()
}

#[test]
fn a_chain_of_a_million_gates() {
    let gates = (0..MILLION).map(|g| gate(format!("g{g}"), Function::Not, &[g])).collect();
    let chain = Circuit::new(&["in"], gates, vec![]).unwrap();
    assert!(chain.feedback().is_empty());
    assert_eq!(chain.block_count(), 1);
    assert!(chain.evaluation_order().iter().map(|gate| gate.0).eq(0..MILLION));
    assert_eq!(chain.cone(&[NetId(MILLION)]).iter().count(), MILLION as usize + 1);
    assert_eq!(chain.cone(&[NetId(10)]).iter().count(), 11);
    let rest = statics::rest(&chain, &[true], &[], &Control::default()).unwrap();
    assert!(chain.nets().all(|net| rest.get(net.index()) == (net.0 % 2 == 0)));
}

#[test]
fn the_longest_loops() {
    // one ring of a million gates, told from its end
    let last = MILLION - 1;
    let gates = (0..MILLION).map(|g| gate(format!("g{g}"), Function::Buf, &[if g == last { 0 } else { g + 1 }]));
    let ring = Circuit::new::<&str>(&[], gates.collect(), vec![]).unwrap();
    assert_eq!(ring.feedback().len(), 1);
    assert_eq!((ring.block_count(), ring.component(GateId(0))), (1, ring.component(GateId(last))));
    assert!(ring.nets().all(|net| ring.in_loop(net)) && in_order(&ring));
    let named = [(NetId(77), true)];
    let rest = statics::rest(&ring, &[], &named, &Control::default()).unwrap();
    assert!(ring.nets().all(|net| rest.get(net.index())));

    // many small ones: pairs of cross-coupled gates, each a block
    let pairs = (0..MILLION / 2).flat_map(|pair| {
        let (q, qn) = (2 * pair + 1, 2 * pair + 2);
        [gate(format!("q{pair}"), Function::Nand, &[0, qn]), gate(format!("n{pair}"), Function::Nand, &[0, q])]
    });
    let latches = Circuit::new(&["set"], pairs.collect(), vec![]).unwrap();
    assert_eq!((latches.feedback().len(), latches.block_count()), (MILLION as usize / 2, MILLION as usize / 2));
    assert!(in_order(&latches));
    let rest = statics::rest(&latches, &[false], &[], &Control::default()).unwrap();
    assert!(latches.nets().skip(1).all(|net| rest.get(net.index())));
}

#[test]
fn a_net_that_a_million_loops_share() {
    // hub = or of all; each of the others reads the hub: every loop goes through the hub, and through nothing else
    let others: Vec<u32> = (1..MILLION).collect();
    let mut gates = vec![gate("hub".into(), Function::Or, &others)];
    gates.extend((1..MILLION).map(|g| gate(format!("g{g}"), Function::Buf, &[0])));
    let star = Circuit::new::<&str>(&[], gates, vec![]).unwrap();
    assert_eq!(star.feedback(), [NetId(0)]);
    assert!(in_order(&star));
    // with wires of their own from every net into the hub
    let wires: Vec<(NetId, GateId)> = others.iter().map(|net| (NetId(*net), GateId(0))).collect();
    let mut gates = vec![gate("hub".into(), Function::Or, &others)];
    gates.extend((1..MILLION).map(|g| gate(format!("g{g}"), Function::Buf, &[0])));
    let wired = Circuit::new::<&str>(&[], gates, wires.clone()).unwrap();
    assert!(wires.iter().zip(0..).all(|((net, _), wire)| wired.readers(*net)[0].wire.is_some_and(|it| it.0 == wire)));

    // a thousand gates that all read each other through the hub and one neighbour: the hub does not cut all of it
    let n = 100_000;
    let around = |g: u32| if g == n { 1 } else { g + 1 };
    let mut gates = vec![gate("hub".into(), Function::Or, &(1..=n).collect::<Vec<_>>())];
    gates.extend((1..=n).map(|g| gate(format!("g{g}"), Function::And, &[0, around(g)])));
    let wheel = Circuit::new::<&str>(&[], gates, vec![]).unwrap();
    assert_eq!(wheel.feedback().len(), 2, "the hub, and one gate of the rim");
    assert!(in_order(&wheel));
}

/// A network of many loops and blocks: seeded, no two alike.
fn tangle(gates: u32, inputs: u32, seed: u64) -> Circuit {
    let mut state = seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1;
    let mut below = |n: u32| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state % u64::from(n)) as u32
    };
    let names: Vec<String> = (0..inputs).map(|i| format!("i{i}")).collect();
    let specs = (0..gates).map(|g| {
        // within a stretch of 40 gates, or an input: many separate blocks
        let (first, pins) = (g / 40 * 40, 1 + below(3));
        let pins: Vec<u32> = (0..pins)
            .map(|_| if below(3) == 0 { below(inputs) } else { inputs + (first + below(40)).min(gates - 1) })
            .collect();
        let function = if pins.len() == 1 { Function::Buf } else { Function::Nand };
        gate(format!("g{g}"), function, &pins)
    });
    Circuit::new(&names, specs.collect(), vec![]).unwrap()
}

#[test]
fn loops_blocks_and_cones_of_a_big_tangle_are_those_of_a_simple_search() {
    let (gates, inputs) = (200_000u32, 64u32);
    let circuit = tangle(gates, inputs, 5);
    assert!(in_order(&circuit), "the feedback nets cut every loop");

    // blocks: union by rank-free merging, read off the pins
    let mut parent: Vec<u32> = (0..gates).collect();
    fn root(parent: &mut [u32], mut at: u32) -> u32 {
        while parent[at as usize] != at {
            parent[at as usize] = parent[parent[at as usize] as usize];
            at = parent[at as usize];
        }
        at
    }
    for g in circuit.gates() {
        for other in circuit.pins(g).iter().filter_map(|pin| circuit.driver(*pin)) {
            let (a, b) = (root(&mut parent, g.0), root(&mut parent, other.0));
            parent[a as usize] = b;
        }
    }
    let mut number: HashMap<u32, u32> = HashMap::new();
    for g in circuit.gates() {
        let next = number.len() as u32;
        let block = *number.entry(root(&mut parent, g.0)).or_insert(next);
        assert_eq!(circuit.block(g), block, "{g:?}");
    }
    assert_eq!(circuit.block_count(), number.len());
    assert!(number.len() > 1000, "{}", number.len());

    // reach of some gates by plain search along the pins; loops: who reaches itself and whom it reaches back
    let reach = |from: GateId| {
        let mut seen: HashSet<NetId> = HashSet::new();
        let mut open: Vec<NetId> = circuit.pins(from).to_vec();
        while let Some(net) = open.pop() {
            if seen.insert(net)
                && let Some(gate) = circuit.driver(net)
            {
                open.extend(circuit.pins(gate));
            }
        }
        seen
    };
    let mut looped = 0;
    for g in circuit.gates().step_by(97) {
        let (net, seen) = (circuit.net_of(g), reach(g));
        let mut cone = seen.clone();
        cone.insert(net);
        assert_eq!(circuit.cone(&[net]).iter().collect::<HashSet<_>>(), cone, "{g:?}");
        assert_eq!(circuit.in_loop(net), seen.contains(&net), "{g:?}");
        looped += u32::from(seen.contains(&net));
        for other in seen.iter().filter_map(|net| circuit.driver(*net)) {
            let back = other == g || reach(other).contains(&net);
            assert_eq!(circuit.component(g) == circuit.component(other), back, "{g:?} and {other:?}");
        }
    }
    assert!((200..2000).contains(&looped), "some are in loops and some not: {looped}");
}

/// Counts transitions and remembers when the run ended.
#[derive(Default)]
struct Count {
    changes: u64,
    end: Time,
}

impl Observer for Count {
    type Tag = ();

    fn change(&mut self, _: Time, _: NetId, _: Value, _: ()) {
        self.changes += 1;
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        self.end = finish.at;
    }
}

#[test]
fn a_scenario_of_a_million_gates_is_built_and_run() {
    // a tree of buffers, four gates for each: a step at the root reaches every gate once, level by level
    let mut b = Builder::new("tree");
    b.input("in", false);
    for g in 0..MILLION {
        let source = if g == 0 { "in".to_string() } else { format!("g{}", (g - 1) / 4) };
        b.gate(format!("g{g}"), Function::Buf, [source]).delay("1");
    }
    b.output("g0");
    b.limit_transitions(10_000_000u64);
    b.step(NewStep::at("5").set("in", true));
    let scenario = b.finish().unwrap();
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let instance = Instance::of(&scenario, &Which::Typ);
    let mut count = Count::default();
    assert!(program.machine().run(&instance, &Control::default(), &mut count));
    assert_eq!(count.changes, u64::from(MILLION) + 1, "each net once");
    // 1 + 4 + … + 4^9 is below a million, and with 4^10 it is above: eleven levels
    assert_eq!(count.end.from_start().decimal(scenario.unit).to_string(), "16");
}
