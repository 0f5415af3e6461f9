//! The greatest number of changes of a net, against trying every order in which wires may deliver (brute force), and
//! against ternary simulation.

use std::collections::HashSet;

use stillgate::circuit::{Circuit, Expr, Function, GateSpec, NetId};
use stillgate::logic::{Bits, State, Value};
use stillgate::statics::ternary;
use stillgate::statics::transients::{Counting, MAX_CHANGES, Open, Transients, Verdict, Word};

use super::networks::Draw;

/// A loop-free network of small gates of every kind; each reads inputs and gates before it.
fn loop_free(draw: &mut Draw, inputs: usize, gates: usize) -> Circuit {
    let specs = (0..gates)
        .map(|gate| {
            let (function, pins) = match draw.below(11) {
                10 => (Function::Expr(Expr::parse("a & b | !a & c").unwrap()), 3),
                listed => match Function::LISTED[listed].clone() {
                    f @ (Function::Buf | Function::Not) => (f, 1),
                    f @ (Function::Mux | Function::Majority) => (f, 3),
                    f => (f, 2 + draw.below(2)),
                },
            };
            let mut pin = |_| {
                // mostly what was built last, so that differences add up
                let nets = inputs + gate;
                NetId(if draw.below(2) == 0 { nets - 1 - draw.below(nets.min(2)) } else { draw.below(nets) } as u32)
            };
            GateSpec { name: format!("g{gate}"), function, pins: (0..pins).map(&mut pin).collect() }
        })
        .collect();
    let names: Vec<String> = (0..inputs).map(|i| format!("i{i}")).collect();
    Circuit::new(&names, specs, vec![]).unwrap()
}

/// The values of all nets of a loop-free network, gates in order.
fn rest(circuit: &Circuit, inputs: &[bool]) -> Vec<bool> {
    let mut values = inputs.to_vec();
    for gate in circuit.gates() {
        let pins: Vec<bool> = circuit.pins(gate).iter().map(|net| values[net.index()]).collect();
        values.push(circuit.function(gate).value(&pins));
    }
    values
}

/// The most changes of each net, by trying everything. Each gate has a wire of its own from each net that it reads. A
/// wire delivers the changes of its net one by one, after any time; the gate acts at once on what its wires have
/// delivered. `None` if there are too many states.
fn most_changes(circuit: &Circuit, start: &[bool], moving: &[NetId], most_states: usize) -> Option<Vec<u32>> {
    let wires: Vec<(NetId, usize)> = circuit
        .gates()
        .flat_map(|gate| {
            let mut nets = circuit.pins(gate).to_vec();
            nets.sort();
            nets.dedup();
            nets.into_iter().map(move |net| (net, gate.index()))
        })
        .collect();
    let nets = circuit.net_count();
    // changes of each net, then changes delivered by each wire
    let mut first = vec![0u8; nets + wires.len()];
    for net in moving {
        first[net.index()] = 1;
    }
    let mut most = vec![0u32; nets];
    let mut seen = HashSet::from([first.clone()]);
    let mut open = vec![first];
    while let Some(state) = open.pop() {
        for (net, most) in most.iter_mut().enumerate() {
            *most = (*most).max(state[net].into());
        }
        for (w, (net, gate)) in wires.iter().enumerate() {
            if state[nets + w] == state[net.index()] {
                continue;
            }
            let mut next = state.clone();
            next[nets + w] += 1;
            let gate_id = circuit.gates().nth(*gate).unwrap();
            let pins: Vec<bool> = circuit
                .pins(gate_id)
                .iter()
                .map(|pin| {
                    let wire = wires.iter().position(|wire| wire == &(*pin, *gate)).unwrap();
                    start[pin.index()] ^ (next[nets + wire] % 2 == 1)
                })
                .collect();
            let own = circuit.net_of(gate_id).index();
            if circuit.function(gate_id).value(&pins) != start[own] ^ (next[own] % 2 == 1) {
                next[own] += 1;
            }
            if seen.insert(next.clone()) {
                open.push(next);
            }
        }
        if seen.len() > most_states {
            return None;
        }
    }
    Some(most)
}

#[test]
fn the_greatest_number_of_changes_against_every_order_of_deliveries() {
    let mut draw = Draw(0x0dd_ba11);
    let (mut compared, mut longest, mut hazards) = (0, 0, [0; 3]);
    for case in 0..400 {
        let (inputs, gates) = (1 + draw.below(3), 2 + draw.below(4));
        let circuit = loop_free(&mut draw, inputs, gates);
        let start = rest(&circuit, &(0..inputs).map(|_| draw.below(2) == 1).collect::<Vec<_>>());
        let moving: Vec<NetId> = circuit.inputs().filter(|net| net.0 == 0 || draw.below(2) == 0).collect();
        let Some(most) = most_changes(&circuit, &start, &moving, 20_000) else { continue };
        compared += 1;
        let open = Open::of(&circuit);
        let mut transients = Transients::new(&open);
        let state = Bits::of(start.iter().copied());
        transients.change(&state, &moving, u64::MAX).unwrap();
        for net in circuit.nets() {
            let word = transients.wanted(&state, net);
            // more than four are counted as three or four
            let all = most[net.index()];
            let counted = if all <= MAX_CHANGES { all } else { MAX_CHANGES - all % 2 };
            assert_eq!(
                (word.start, word.changes, word.exact),
                (start[net.index()], counted, true),
                "case {case}: {net:?} when {moving:?} move from {start:?}: {:?}",
                circuit.gates().map(|g| (circuit.function(g), circuit.pins(g))).collect::<Vec<_>>()
            );
            longest = longest.max(all);
            if let Verdict::Hazard(shape) = word.verdict() {
                hazards[shape as usize] += 1;
            }
        }
    }
    assert!(compared > 300 && longest >= 5, "{compared} cases, {longest} changes");
    assert!(hazards.iter().all(|times| *times > 20), "every shape is met: {hazards:?}");
}

/// The network with its feedback nets as further inputs; what is wanted of a feedback net has its old number.
pub fn cut(circuit: &Circuit) -> (Circuit, impl Fn(NetId) -> NetId + use<>) {
    let feedback = circuit.feedback().to_vec();
    let (inputs, cuts) = (circuit.input_count(), feedback.len());
    let names: Vec<String> = (0..inputs + cuts).map(|i| format!("s{i}")).collect();
    let shifted = move |net: NetId| NetId(if net.index() < inputs { net.0 } else { net.0 + cuts as u32 });
    let specs = circuit
        .gates()
        .map(|gate| GateSpec {
            name: format!("g{}", gate.0),
            function: circuit.function(gate).clone(),
            pins: circuit
                .pins(gate)
                .iter()
                .map(|net| match feedback.iter().position(|cut| cut == net) {
                    Some(at) => NetId((inputs + at) as u32),
                    None => shifted(*net),
                })
                .collect(),
        })
        .collect();
    (Circuit::new(&names, specs, vec![]).unwrap(), shifted)
}

/// Static hazards by ternary simulation: Eichelberger, IBM J. Res. Dev. 9 (1965) 90-99 [PAGE
/// https://courses.e-ce.uth.gr/CE664/handouts-html/L7-Hazards_files/slide0012.htm]: the same value before and after, and X
/// while the changing inputs are X. And what moves at all is X.
#[test]
fn a_net_moves_where_ternary_simulation_of_the_open_network_gives_x() {
    let mut draw = Draw(0xe1c4e1be);
    let (mut with_loops, mut moved, mut statics) = (0, 0, 0);
    for case in 0..4000 {
        let (inputs, gates) = (1 + draw.below(4), 3 + draw.below(10));
        let circuit = draw.network(inputs, gates, gates);
        let (network, shifted) = cut(&circuit);
        assert!(network.feedback().is_empty());
        // any values of the sources will do: the logic between them is at rest
        let mut full = Bits::of((0..network.net_count()).map(|_| draw.below(2) == 1));
        for gate in network.evaluation_order() {
            let value = network.wants(*gate, |net| full.get(net.index()));
            full.set(network.net_of(*gate).index(), value);
        }
        let mut state = Bits::zeros(circuit.net_count());
        for net in circuit.nets() {
            state.set(net.index(), full.get(shifted(net).index()));
        }
        let moving: Vec<NetId> = circuit.inputs().filter(|net| net.0 == 0 || draw.below(3) == 0).collect();
        let mut spread = State::known(full.clone());
        moving.iter().for_each(|net| spread.set(net.index(), Value::X));
        ternary::spread(&network, &mut spread);

        // a feedback net shows what is wanted of it; it only starts from its own value in a stable state
        let stable = circuit
            .feedback()
            .iter()
            .enumerate()
            .all(|(at, net)| full.get(inputs + at) == full.get(shifted(*net).index()));
        if !stable {
            continue;
        }
        with_loops += usize::from(!circuit.feedback().is_empty());
        let open = Open::of(&circuit);
        let mut transients = Transients::new(&open);
        transients.change(&state, &moving, u64::MAX).unwrap();
        let mut after = full.clone();
        moving.iter().for_each(|net| after.flip(net.index()));
        for gate in network.evaluation_order() {
            let value = network.wants(*gate, |net| after.get(net.index()));
            after.set(network.net_of(*gate).index(), value);
        }
        for net in circuit.nets() {
            let word = transients.wanted(&state, net);
            let there = shifted(net).index();
            let context = || format!("case {case}, {net:?}: {word:?}");
            assert_eq!((word.start, word.end()), (full.get(there), after.get(there)), "{}", context());
            assert_eq!(word.changes > 0, spread.get(there) == Value::X, "{}", context());
            let is_static = full.get(there) == after.get(there) && spread.get(there) == Value::X;
            let says = matches!(word.verdict(), Verdict::Hazard(shape) if shape != stillgate::logic::Shape::Dynamic);
            assert_eq!(says, is_static, "{}", context());
            moved += usize::from(word.changes > 0);
            statics += usize::from(is_static);
        }
    }
    assert!(with_loops > 100 && moved > 3000 && statics > 500, "{with_loops} {moved} {statics}");
}

/// The closed forms of AND, OR and XOR (Brzozowski and Ésik 2003) against expressions, which go by the lattice.
#[test]
fn closed_forms_are_longest_alternations() {
    let mut draw = Draw(0xc105ed);
    for (function, text) in [
        (Function::And, "a & b & c"),
        (Function::Nand, "!(a & b & c)"),
        (Function::Or, "a | b | c"),
        (Function::Nor, "!(a | b | c)"),
        (Function::Xor, "a ^ b ^ c"),
        (Function::Xnor, "!(a ^ b ^ c)"),
        (Function::Buf, "a"),
        (Function::Not, "!a"),
    ] {
        let expr = Expr::parse(text).unwrap();
        let pins: Vec<NetId> = (0..expr.nets().len() as u32).map(NetId).collect();
        let gates = vec![
            GateSpec { name: "closed".into(), function: function.clone(), pins: pins.clone() },
            GateSpec { name: "lattice".into(), function: Function::Expr(expr), pins },
        ];
        let circuit = Circuit::new(&["a", "b", "c"], gates, vec![]).unwrap();
        for _ in 0..500 {
            let words: Vec<Word> = (0..3)
                .map(|_| Word { start: draw.below(2) == 1, changes: draw.below(5) as u32, exact: true })
                .collect();
            let [closed, lattice] = [0, 1].map(|gate| {
                let gate = circuit.gates().nth(gate).unwrap();
                stillgate::statics::transients::word_of(
                    &circuit,
                    gate,
                    |net| words[net.index()],
                    &mut Counting::default(),
                )
            });
            assert_eq!(closed, lattice, "{text} of {words:?}");
        }
    }
}

#[test]
fn what_is_not_counted_to_the_end_says_so_and_still_shows_static_hazards() {
    let word = |changes| Word { start: false, changes, exact: true };
    let of = |function: Function, pins: usize, words: &dyn Fn(usize) -> Word| {
        let names: Vec<String> = (0..pins).map(|i| format!("i{i}")).collect();
        let gate = GateSpec { name: "g".into(), function, pins: (0..pins as u32).map(NetId).collect() };
        let circuit = Circuit::new(&names, vec![gate], vec![]).unwrap();
        let gate = circuit.gates().next().unwrap();
        stillgate::statics::transients::word_of(&circuit, gate, |net| words(net.index()), &mut Counting::default())
    };
    // seven nets of five positions each are more than are looked at: a part of each word shows enough
    let long = of(Function::Majority, 7, &|_| word(3));
    assert_eq!((long.changes, long.exact), (3, true));
    // so many that only the ends are looked at: 10 of 21 nets fall, 11 rise
    let wide = of(Function::Majority, 21, &|net| Word::one_change(net < 10));
    assert_eq!((wide.start, wide.changes, wide.exact, wide.verdict()), (false, 1, false, Verdict::Unknown));
    // 11 at 1 before, 11 after: it may leave 1 for a moment
    let kept = of(Function::Majority, 22 - 1, &|net| match net {
        0..10 => Word::one_change(true),
        10..20 => Word::one_change(false),
        _ => Word::constant(true),
    });
    assert_eq!(kept.verdict(), Verdict::Hazard(stillgate::logic::Shape::Static1));
    // no matter what they do, the 11 others hold it
    let held = of(Function::Majority, 21, &|net| if net < 11 { Word::constant(true) } else { word(3) });
    assert_eq!(held, Word::constant(true));
    // counting ends, by parity
    for (nets, changes) in [(3, 3), (4, 4), (5, 3), (6, 4)] {
        let xor = of(Function::Xor, nets, &|_| word(3));
        assert_eq!((xor.changes, xor.exact), (changes, true));
    }
}
