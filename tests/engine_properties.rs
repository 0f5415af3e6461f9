//! What holds for every circuit: units, names and machines do not matter, settled states are stable, causes are causes;
//! and when steps come, and where a run ends.

use std::sync::Arc;

use rand::seq::SliceRandom;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Circuit, Function, NetId};
use stillgate::control::Control;
use stillgate::delay::{DelayRange, Filter};
use stillgate::engine::{End, Hit, Program, Trace};
use stillgate::instance::{Instance, Which};
use stillgate::logic::{Bits, Value};
use stillgate::scenario::{Begin, Clock, Mark, Place, Scenario};
use stillgate::time::Span;

use crate::support::random_worlds::{Case, Filters, Kind, Lengths, PLAIN, Start, cases};
use crate::support::recorder::Record;
use crate::support::world::{World, exact, fs, run};

const MIXED: Kind =
    Kind { filters: Filters::Mixed, wires: 0.3, delays: Lengths::Short, clocks: true, gates: (2, 9), ..PLAIN };

/// From rest, from random bits, from X; inertial, transport and wires.
fn kinds() -> [Kind; 4] {
    let unknown = Kind { filters: Filters::Inertial, begin: Start::Unknown, ..MIXED };
    [PLAIN, MIXED, Kind { begin: Start::Random, ..MIXED }, unknown]
}

// ---- units, names, machines

fn stretched(end: End, k: u64) -> End {
    let stretch = |span: Span| fs(k * span.fs());
    match end {
        End::Oscillating { period, range } => {
            End::Oscillating { period: stretch(period), range: range.map(|(a, b)| (stretch(a), stretch(b))) }
        }
        end => end,
    }
}

#[test]
fn all_times_by_k_gives_all_events_by_k() {
    for kind in kinds() {
        for Case { name, scenario, rest, instance, .. } in cases(150, kind) {
            let plain = run(&scenario, &rest, &instance);
            for k in [3, 1000] {
                let times = |span: &mut Span| *span = fs(k * span.fs());
                let mut slower = instance.clone();
                slower.delays.gate.iter_mut().flatten().for_each(times);
                slower.delays.wire.iter_mut().flatten().for_each(times);
                slower.places.iter_mut().for_each(times);
                slower.skews.iter_mut().flatten().for_each(times);
                slower.bounces.iter_mut().flatten().flatten().for_each(times);
                for clock in &mut slower.clocks {
                    [&mut clock.first, &mut clock.period, &mut clock.high].into_iter().for_each(times);
                    clock.jitter.iter_mut().for_each(|jitter| *jitter *= k as i64);
                }
                let mut scenario = scenario.clone();
                scenario.limits.time.iter_mut().for_each(times);
                for step in &mut Arc::make_mut(&mut scenario.stimulus).steps {
                    if let Place::When { timeout: Some(timeout), .. } = &mut step.place {
                        times(timeout);
                    }
                }
                let slow = run(&scenario, &rest, &slower);
                let changes: Vec<_> = plain.changes.iter().map(|(at, net, new)| (k * at, *net, *new)).collect();
                assert_eq!(slow.changes, changes, "{name} by {k}");
                for (a, b) in plain.windows.iter().zip(&slow.windows) {
                    let figures = |w: &crate::support::recorder::RecordedWindow, k: u64| {
                        (w.moment, k * w.start, k * w.settle_from, k * w.stop, w.settling.map(|s| k * s))
                    };
                    assert_eq!(figures(a, k), figures(b, 1), "{name} by {k}");
                    // a mean is rounded down
                    let exact = !matches!(a.end, End::Oscillating { range: Some(_), .. });
                    assert!(!exact || stretched(a.end, k) == b.end, "{name} by {k}: {a:?} {b:?}");
                }
                assert_eq!((plain.windows.len(), plain.events), (slow.windows.len(), slow.events), "{name} by {k}");
            }
        }
    }
}

/// The same circuit with other names, its inputs and gates and wires in another order.
fn shuffled(case: &Case, rng: &mut ChaCha8Rng) -> (World, Bits, Instance, Vec<NetId>) {
    let rename = |name: &String| format!("other_{name}[0]");
    let order = |count: usize, rng: &mut ChaCha8Rng| {
        let mut order: Vec<usize> = (0..count).collect();
        order.shuffle(rng);
        order
    };
    let mut world = case.world.clone();
    let (inputs, gates, wires) = (world.inputs.len(), world.gates.len(), world.wires.len());
    let (by_input, by_gate, by_wire) = (order(inputs, rng), order(gates, rng), order(wires, rng));
    world.inputs = by_input.iter().map(|i| (rename(&case.world.inputs[*i].0), case.world.inputs[*i].1)).collect();
    world.gates = by_gate.iter().map(|g| case.world.gates[*g].clone()).collect();
    for gate in &mut world.gates {
        gate.name = rename(&gate.name);
        if let Function::Expr(expr) = &gate.function {
            let mut text = expr.text().to_string();
            let mut names: Vec<&str> = expr.nets().iter().map(|net| &**net).collect();
            names.sort_by_key(|name| std::cmp::Reverse(name.len()));
            for (n, name) in names.iter().enumerate() {
                text = text.replace(name, &format!("<{n}>"));
            }
            for (n, name) in names.iter().enumerate() {
                text = text.replace(&format!("<{n}>"), &rename(&name.to_string()));
            }
            gate.function = Function::Expr(stillgate::circuit::Expr::parse(&text).unwrap());
        }
        gate.pins.iter_mut().for_each(|pin| *pin = rename(pin));
    }
    world.wires = by_wire
        .iter()
        .map(|w| (rename(&case.world.wires[*w].0), rename(&case.world.wires[*w].1), case.world.wires[*w].2))
        .collect();
    world.set.iter_mut().flatten().for_each(|(net, _)| *net = rename(net));
    world.clocks.iter_mut().for_each(|(net, _)| *net = rename(net));

    let mut instance = case.instance.clone();
    instance.delays.gate = by_gate.iter().map(|g| case.instance.delays.gate[*g]).collect();
    instance.delays.wire = by_wire.iter().map(|w| case.instance.delays.wire[*w]).collect();
    if case.scenario.begin == Begin::Random {
        instance.start = Bits::of(by_gate.iter().map(|g| case.instance.start.get(*g)));
    }
    let old: Vec<usize> = by_input.iter().copied().chain(by_gate.iter().map(|g| inputs + g)).collect();
    for step in &mut world.steps {
        if let Place::When { pattern, .. } = &mut step.place {
            let new = |net: NetId| old.iter().position(|it| *it == net.index()).expect("every net has a place");
            pattern.iter_mut().for_each(|(net, _)| *net = NetId(new(*net) as u32));
        }
    }
    let rest = Bits::of(old.iter().map(|net| case.rest.get(*net)));
    (world, rest, instance, old.into_iter().map(|net| NetId(net as u32)).collect())
}

#[test]
fn names_and_order_of_nets_do_not_matter() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    for kind in kinds() {
        for case in cases(200, kind) {
            let plain = run(&case.scenario, &case.rest, &case.instance).in_order();
            let (world, rest, instance, old) = shuffled(&case, &mut rng);
            let mut other = run(&world.scenario(), &rest, &instance);
            let back = |state: &mut Vec<Value>| {
                let shuffled = state.clone();
                old.iter().zip(shuffled).for_each(|(net, value)| state[net.index()] = value);
            };
            back(&mut other.start);
            other.changes.iter_mut().for_each(|change| change.1 = old[change.1.index()]);
            let inputs = world.inputs.len();
            other.swallowed.iter_mut().for_each(|s| s.gate = old[inputs + s.gate].index() - inputs);
            for window in &mut other.windows {
                back(&mut window.state);
                back(&mut window.opening.state);
                let lists = [&mut window.pending, &mut window.opening.pending, &mut window.opening.inputs];
                lists.into_iter().flatten().for_each(|net| *net = old[net.index()]);
                window.moving.iter_mut().for_each(|moving| moving.0 = old[moving.0.index()]);
            }
            assert_eq!(other.in_order(), plain, "{}", case.name);
        }
    }
}

fn trace(scenario: &Scenario, rest: &Bits, instance: &Instance, machine: (bool, bool)) -> Trace {
    let mut trace = Trace::default();
    let program = Program::with_rest(scenario, rest);
    program.machine_with(machine.0, machine.1).run(instance, &Control::default(), &mut trace);
    trace
}

#[test]
fn a_replay_on_any_machine_gives_the_same_trace() {
    for kind in kinds() {
        for Case { name, scenario, rest, instance, .. } in cases(150, kind) {
            let first = trace(&scenario, &rest, &instance, (true, false));
            for machine in [(true, false), (true, true), (false, false), (false, true)] {
                let again = trace(&scenario, &rest, &instance, machine);
                // order within a batch and cause links included
                assert_eq!(again.changes, first.changes, "{name} {machine:?}");
                assert_eq!(again.windows, first.windows, "{name} {machine:?}");
                assert_eq!((&again.arrivals, &again.lost), (&first.arrivals, &first.lost), "{name} {machine:?}");
                assert_eq!((again.end, again.events, &again.start), (first.end, first.events, &first.start), "{name}");
            }
        }
    }
}

// ---- states and causes

fn is_stable(circuit: &Circuit, state: &[Value]) -> bool {
    circuit.gates().all(|gate| {
        let pins: Vec<bool> = circuit.pins(gate).iter().map(|net| state[net.index()] == Value::One).collect();
        Value::from(circuit.function(gate).value(&pins)) == state[circuit.net_of(gate).index()]
    })
}

#[test]
fn every_settled_state_without_x_is_stable() {
    let mut judged = 0;
    for kind in kinds() {
        for Case { name, scenario, rest, instance, .. } in cases(300, kind) {
            let record = run(&scenario, &rest, &instance);
            for window in record.windows.iter().filter(|w| w.end == End::Settled && !w.state.contains(&Value::X)) {
                assert!(is_stable(&scenario.circuit, &window.state), "{name}: {window:?}");
                judged += 1;
            }
        }
    }
    assert!(judged > 1000, "only {judged} settled states");
}

#[test]
fn a_cause_is_a_change_of_an_input_of_the_gate_one_delay_before() {
    let mut judged = 0;
    for kind in kinds() {
        for Case { name, scenario, rest, instance, .. } in cases(150, kind) {
            let circuit = &scenario.circuit;
            let trace = trace(&scenario, &rest, &instance, (true, false));
            for change in &trace.changes {
                let Some(gate) = circuit.driver(change.net) else {
                    assert_eq!(change.cause, None, "{name}: an input has no cause");
                    continue;
                };
                let choose = |delay: [Span; 2], new: Value| match new {
                    Value::X => delay[0].min(delay[1]).fs(),
                    known => delay[known as usize].fs(),
                };
                let scheduled = change.at.fs() - choose(instance.delays.gate[gate.index()], change.new);
                let Some(cause) = change.cause else {
                    // only what was wrong at a start that is not at rest has no cause
                    let wires: u64 = instance.delays.wire.iter().flatten().map(|span| span.fs()).max().unwrap_or(0);
                    assert!(!matches!(scenario.begin, Begin::AtRest { .. }) && scheduled <= wires, "{name} {change:?}");
                    continue;
                };
                let cause = trace.changes[cause as usize];
                assert!(circuit.pins(gate).contains(&cause.net), "{name}: {change:?} by {cause:?}");
                let wire = circuit.wires().iter().position(|wire| *wire == (cause.net, gate));
                let travel = wire.map_or(0, |wire| choose(instance.delays.wire[wire], cause.new));
                assert_eq!(cause.at.fs() + travel, scheduled, "{name}: {change:?} by {cause:?}");
                judged += 1;
            }
        }
    }
    assert!(judged > 5000, "only {judged} causes");
}

#[test]
fn transport_never_loses_an_edge_in_a_chain() {
    let mut rng = ChaCha8Rng::seed_from_u64(11);
    for _ in 0..100 {
        let mut world = World::new();
        world.input("n0", false);
        let stages: usize = rng.random_range(1..=20);
        let (mut travel, mut inverted) = (0, false);
        for stage in 1..=stages {
            let delay = rng.random_range(1..=1000);
            let invert: bool = rng.random();
            let function = if invert { Function::Not } else { Function::Buf };
            let (pin, name) = (format!("n{}", stage - 1), format!("n{stage}"));
            world.gate(&name, function, &[&pin], delay);
            if rng.random_bool(0.3) {
                let wire = rng.random_range(1..=1000);
                world.wire(&pin, &name, wire, wire);
                travel += wire;
            }
            travel += delay;
            inverted ^= invert;
        }
        world.filter(Filter::Transport);
        let mut edges = Vec::new();
        let mut at = 0;
        for n in 0..rng.random_range(1..=60u8) {
            edges.push((at, n % 2 == 0));
            world.at(at, &[("n0", n % 2 == 0)]);
            at += rng.random_range(1..=100);
        }
        let levels: Vec<bool> = world.gates.iter().map(|gate| gate.function == Function::Not).collect();
        let rest = Bits::of((0..stages + 1).map(|n| levels[..n].iter().filter(|invert| **invert).count() % 2 == 1));
        let scenario = world.scenario();
        let record = run(&scenario, &rest, &world.instance(&scenario));
        let last = edges.iter().map(|(at, bit)| (at + travel, Value::from(bit ^ inverted)));
        assert_eq!(record.of(NetId(stages as u32)), last.collect::<Vec<_>>());
        assert!(record.swallowed.is_empty());
    }
}

// ---- limits

#[test]
fn a_run_ends_below_two_to_the_63() {
    // a ring so slow that its third edge would come too late
    let slow = (1 << 62) - 1;
    let mut world = World::new();
    world.input("e", false).gate("q", Function::Nand, &["e", "q"], slow);
    let record = world.at(0, &[("e", true)]).run().record;
    let edges: Vec<u64> = record.of(NetId(1)).iter().map(|edge| edge.0).collect();
    assert_eq!(edges, [slow, 2 * slow]);
    assert_eq!(record.windows[0].end, End::Unsettled(Hit::Longest));
    // at rest the window has settled, and the step that would come too late does not come
    let mut world = World::new();
    world.input("e", false).gate("q", Function::Not, &["e"], 5);
    for n in 0..4 {
        world.after(1 << 61, &[("e", n % 2 == 0)]);
    }
    let record = world.run().record;
    assert_eq!(record.windows.len(), 3);
    assert!(record.windows.iter().all(|window| window.end == End::Settled), "{record:?}");
}

#[test]
fn a_clock_runs_up_to_the_longest_run() {
    // 40 periods of 2^60 fs do not fit into 2^64; eight rises lie below 2^63
    let mut world = World::new();
    world.input("clk", false).gate("q", Function::Not, &["clk"], 5);
    let (net, period) = (world.net("clk"), exact(1 << 60));
    let (first, high, jitter) = (exact(0), exact(1 << 59), fs(0));
    world.clocks.push(("clk".into(), Clock { net, first, period, high, jitter, count: 40, mark: Mark(0) }));
    let record = world.run().record;
    assert_eq!(record.of(NetId(1)).len(), 16);
    assert_eq!(record.windows.last().map(|w| (w.start, w.end)), Some(((1 << 63) - (1 << 59), End::Settled)));
}

#[test]
fn a_limit_of_transitions_ends_the_run_after_the_batch_that_reaches_it() {
    for limit in 1..20 {
        let mut world = World::new();
        world.input("e", false).gate("q", Function::Nand, &["e", "q"], 10);
        let record = world.limit(limit).at(0, &[("e", true)]).rest(0, &[("e", false)]).run().record;
        assert_eq!(record.windows.len(), 1, "later steps do not come");
        assert_eq!(record.windows[0].end, End::Unsettled(Hit::Transitions));
        assert_eq!(record.changes.len() as u64, limit, "the input's change counts");
    }
}

#[test]
fn a_limit_of_time_ends_the_run_at_that_time_events_of_that_instant_included() {
    for (limit, edges) in [(1, 0), (9, 0), (10, 1), (19, 1), (20, 2)] {
        let mut world = World::new();
        world.input("e", false).gate("q", Function::Nand, &["e", "q"], 10);
        world.limits.time = Some(fs(limit));
        let record = world.at(100, &[("e", true)]).run().record;
        assert_eq!(record.of(NetId(1)).len(), edges, "limit {limit}");
        assert_eq!((record.windows[0].end, record.windows[0].stop), (End::Unsettled(Hit::Time), 100 + limit));
        // it does not run while nothing is pending
        world.step(Place::After(exact(7)), &[("e", false)]).limits.time = Some(fs(18));
        let record = world.at(100_000, &[("e", false)]).run().record;
        assert_eq!(record.windows.last().unwrap().end, End::Settled);
    }
}

// ---- steps

/// Windows as (moment, start, settle_from, end).
fn windows(record: &Record) -> Vec<(u32, u64, u64, End)> {
    record.windows.iter().map(|w| (w.moment, w.start, w.settle_from, w.end)).collect()
}

#[test]
fn steps_and_edges_of_one_instant_share_a_window_named_by_the_step() {
    let mut world = World::new();
    for input in ["a", "b", "clk"] {
        world.input(input, false);
    }
    world.gate("q", Function::Xor, &["a", "b", "clk"], 5);
    world.at(10, &[("a", true)]).after(0, &[("b", true)]).after(10, &[("a", false)]);
    let net = world.net("clk");
    let clock =
        Clock { net, first: exact(20), period: exact(30), high: exact(10), jitter: fs(0), count: 1, mark: Mark(0) };
    world.clocks.push(("clk".into(), clock));
    let record = world.rest(0, &[("b", false)]).run().record;
    let settled = End::Settled;
    // a and b rise together, a falls with the clock's rise, then the clock's fall, then rest (the clock has ended)
    assert_eq!(
        windows(&record),
        [(0, 10, 10, settled), (2, 20, 20, settled), (5, 30, 30, settled), (3, 35, 35, settled)]
    );
    assert_eq!(record.windows[0].opening.moments, [0, 1]);
    assert_eq!(record.windows[1].opening.moments, [2, 4]);
    // two inputs at one instant leave the parity as it is
    assert_eq!(record.of(NetId(3)), [(35, Value::One), (40, Value::Zero)]);
}

#[test]
fn skew_counts_from_the_earliest_and_settling_from_the_last() {
    let mut world = World::new();
    world.input("a", false).input("b", false).gate("q", Function::And, &["a", "b"], 5);
    world.at(100, &[("a", true), ("b", true)]);
    world.steps[0].skew = Some(DelayRange::between(fs(0), fs(50)));
    world.after(50, &[("a", false)]);
    let scenario = world.scenario();
    let mut instance = Instance::of(&scenario, &Which::Typ);
    instance.skews[0] = vec![fs(37), fs(12)];
    let record = run(&scenario, &Bits::zeros(3), &instance);
    assert_eq!(record.changes[..2], [(100, NetId(1), Value::One), (125, NetId(0), Value::One)]);
    assert_eq!(windows(&record), [(0, 100, 125, End::Settled), (1, 150, 150, End::Settled)]);
    assert_eq!(record.windows[0].settling, Some(5));
    // the next step in between would find an input change pending: the window is cut though no gate is at work
    instance.skews[0] = vec![fs(0), fs(50)];
    let record = run(&scenario, &Bits::zeros(3), &instance);
    assert_eq!(record.windows[0].end, End::Cut);
    assert!(!record.windows[1].began_at_rest);
}

#[test]
fn with_skew_an_input_that_is_set_to_what_it_has_does_not_change() {
    // b is 0 and stays 0: settling counts from the change of a, and nothing is pending at 140
    let mut world = World::new();
    world.input("a", false).input("b", false).gate("q", Function::Or, &["a", "b"], 30);
    world.at(100, &[("a", true), ("b", false)]).after(50, &[("b", true)]);
    world.steps[0].skew = Some(DelayRange::between(fs(0), fs(50)));
    let scenario = world.scenario();
    let mut instance = Instance::of(&scenario, &Which::Typ);
    instance.skews[0] = vec![fs(0), fs(50)];
    let record = run(&scenario, &Bits::zeros(3), &instance);
    assert_eq!(windows(&record), [(0, 100, 100, End::Settled), (1, 150, 150, End::Settled)]);
    assert_eq!(record.windows[0].settling, Some(30));
    assert!(record.windows[1].began_at_rest);
}
