//! Which two paths race: what led to what is what the semantics says, every leg is a delay of the case, and the pair is the
//! one that a person would name.

use std::collections::BTreeMap;

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Circuit, Function, GateId, NetId};
use stillgate::control::Control;
use stillgate::delay::Filter;
use stillgate::engine::{End, Link, Program, Site, Trace};
use stillgate::findings::{Answers, Asked, Fact, Judge, Kind, Path, RacePair, Subject, race_pair};
use stillgate::instance::{Instance, Which};
use stillgate::logic::{State, Value};
use stillgate::review;
use stillgate::scenario::{Begin, Scenario};
use stillgate::time::{Span, Time};

use crate::engine_agrees::print;
use crate::support::random_rules::add_rules;
use crate::support::random_worlds::{Case, Filters, Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::slow_engine;
use crate::support::world::{World, fs, stable_states};

/// Worlds with everything: filters, wires, X, clocks, bounces, awaited patterns.
fn worlds() -> [Worlds; 6] {
    let mixed = Worlds { filters: Filters::All, wires: 0.3, delays: Lengths::Short, hands: 0.2, ..PLAIN };
    [
        Worlds { hands: 0.2, ..PLAIN },
        mixed,
        Worlds { wires: 0.4, clocks: true, ..PLAIN },
        Worlds { begin: Start::Random, clocks: true, rings: true, ..mixed },
        Worlds { begin: Start::Unknown, filters: Filters::Inertial, ..mixed },
        Worlds { delays: Lengths::Wide, hazards: true, hands: 0.0, ..mixed },
    ]
}

fn trace(program: &Program, instance: &Instance) -> Trace {
    let mut trace = Trace::default();
    assert!(program.machine().run(instance, &Control::default(), &mut trace));
    trace
}

// ---- what led to what

/// The net or wire of a link, and its batch.
fn batch_of(trace: &Trace, link: Link) -> usize {
    match link {
        Link::Start => 0,
        Link::Change(i) => trace.changes[i as usize].batch as usize,
        Link::Arrival(i) => trace.arrivals[i as usize].batch as usize,
    }
}

/// Is this a change that the gate heard of in that batch, by what the slow engine says?
fn heard_by(circuit: &Circuit, links: &slow_engine::Links, trace: &Trace, gate: GateId, link: Link) -> bool {
    let (nets, wires) = &links.heard[batch_of(trace, link)];
    match link {
        Link::Start => true,
        Link::Change(i) => {
            let net = trace.changes[i as usize].net;
            nets.contains(&net) && circuit.pins(gate).contains(&net) && !circuit.wires().contains(&(net, gate))
        }
        Link::Arrival(i) => {
            let wire = trace.arrivals[i as usize].wire.0 as usize;
            wires.contains(&wire) && circuit.wires()[wire].1 == gate
        }
    }
}

#[test]
fn what_scheduled_and_what_cancelled_an_event_is_what_the_slow_engine_says() {
    let (mut came, mut lost, mut arrived) = (0, 0, 0);
    for kind in worlds() {
        for Case { name, scenario, rest, instance, .. } in cases(300, kind) {
            let circuit = &*scenario.circuit;
            let start = matches!(scenario.begin, Begin::AtRest { .. }).then_some(&rest);
            let (_, links) = slow_engine::run_with_links(&scenario, start, &instance);
            let trace = trace(&Program::with_rest(&scenario, &rest), &instance);
            let case = || format!("{name}\n{}", print(&scenario, &rest, &instance));
            let gates = circuit.gate_count();

            let mut fast: Vec<_> = Vec::new();
            for change in &trace.changes {
                let Some(gate) = circuit.driver(change.net) else {
                    assert_eq!((change.cause, change.through), (None, None), "{}", case());
                    continue;
                };
                let link = change.through.map_or(change.cause.map_or(Link::Start, Link::Change), Link::Arrival);
                assert!(heard_by(circuit, &links, &trace, gate, link), "{change:?} by {link:?}\n{}", case());
                let by = batch_of(&trace, link);
                fast.push((change.batch as usize, gate.index(), change.at.fs(), change.new, by));
                came += 1;
            }
            for arrival in &trace.arrivals {
                let cause = trace.changes[arrival.cause.expect("a wire carries a change") as usize];
                assert_eq!((cause.net, cause.new), (circuit.wires()[arrival.wire.0 as usize].0, arrival.new));
                let node = gates + arrival.wire.0 as usize;
                fast.push((arrival.batch as usize, node, arrival.at.fs(), arrival.new, cause.batch as usize));
                arrived += 1;
            }
            let mut slow: Vec<_> = links
                .came
                .iter()
                .map(|(event, batch)| (*batch, event.node, event.at, event.value, event.batch))
                .collect();
            fast.sort_unstable_by_key(|it| (it.0, it.1));
            slow.sort_unstable_by_key(|it| (it.0, it.1));
            assert_eq!(fast, slow, "{}", case());

            let mut fast = Vec::new();
            for gone in &trace.lost {
                let event = &gone.event;
                let (node, causes) = match event.site {
                    Site::Gate(gate) => {
                        assert!(heard_by(circuit, &links, &trace, gate, event.cause), "{gone:?}\n{}", case());
                        assert!(heard_by(circuit, &links, &trace, gate, event.by), "{gone:?}\n{}", case());
                        (gate.index(), batch_of(&trace, event.cause))
                    }
                    Site::Wire(wire) => (gates + wire.0 as usize, batch_of(&trace, event.cause)),
                };
                assert_eq!(batch_of(&trace, event.by), gone.batch as usize, "{gone:?}\n{}", case());
                fast.push((gone.batch as usize, node, event.since.fs(), event.due.fs(), event.new as u8, causes));
                lost += 1;
            }
            let gone = |(event, batch): &(slow_engine::Event, usize)| {
                (*batch, event.node, event.since, event.at, event.value as u8, event.batch)
            };
            let mut slow: Vec<_> = links.lost.iter().map(gone).collect();
            fast.sort_unstable();
            slow.sort_unstable();
            assert_eq!(fast, slow, "{}", case());
        }
    }
    assert!(came > 10_000 && lost > 1000 && arrived > 2000, "{came} {lost} {arrived}");
}

// ---- every leg

/// What this path says must have been so in this run.
fn check_path(scenario: &Scenario, instance: &Instance, trace: &Trace, path: &Path, loops: bool) {
    let circuit = &*scenario.circuit;
    let mut at = path.at;
    let mut from = path.from.map(|it| it.0);
    match path.from {
        None => assert!(at == Time::ZERO && !matches!(scenario.begin, Begin::AtRest { .. })),
        Some((net, new)) => {
            assert!(trace.changes.iter().any(|it| (it.at, it.net, it.new) == (at, net, new)), "{net:?} {at:?}");
            assert_eq!(circuit.is_input(net), !loops && path.left_out == 0, "{net:?}");
        }
    }
    if let Some(moment) = path.moment {
        let moment = &scenario.stimulus.moments[moment as usize];
        assert!(scenario.stimulus.inputs_of(moment).contains(&from.unwrap()), "{from:?}");
    } else {
        assert!(loops || path.left_out > 0 || path.from.is_none(), "an input's change has its moment: {from:?}");
    }
    let mut over: Option<GateId> = None;
    for (i, leg) in path.legs.iter().enumerate() {
        at = at + leg.delay;
        assert_eq!(leg.at, at, "times add up: {path:?}");
        let choose = |delay: [Span; 2]| match leg.new {
            Value::X => delay[0].min(delay[1]),
            known => delay[known as usize],
        };
        match leg.wire {
            Some(wire) => {
                let (net, gate) = circuit.wires()[wire.0 as usize];
                assert_eq!((Some(net), leg.net), (from, net), "a wire carries the net before: {path:?}");
                assert_eq!(leg.delay, choose(instance.delays.wire[wire.0 as usize]), "{path:?}");
                assert!(trace.arrivals.iter().any(|it| (it.at, it.wire, it.new) == (at, wire, leg.new)));
                over = Some(gate);
            }
            None => {
                let gate = circuit.driver(leg.net).expect("a leg is a gate or a wire");
                if let Some(from) = from {
                    assert!(circuit.pins(gate).contains(&from), "connected: {path:?}");
                    assert_eq!(over.is_some(), circuit.wires().contains(&(from, gate)), "over its wire: {path:?}");
                    assert!(over.is_none_or(|over| over == gate), "{path:?}");
                }
                if !matches!(scenario.delays.filter[gate.index()], Filter::Involution(_)) {
                    assert_eq!(leg.delay, choose(instance.delays.gate[gate.index()]), "{path:?}");
                }
                over = None;
                match leg.came {
                    true => {
                        assert!(trace.changes.iter().any(|it| (it.at, it.net, it.new) == (at, leg.net, leg.new)));
                        assert!(at <= trace.end);
                    }
                    false => {
                        assert_eq!(i + 1, path.legs.len(), "what was cancelled leads to nothing: {path:?}");
                        let gone = |it: &stillgate::engine::Lost| {
                            (it.event.due, it.event.site, it.event.new) == (at, Site::Gate(gate), leg.new)
                        };
                        assert!(trace.lost.iter().any(gone), "{path:?}");
                    }
                }
            }
        }
        from = Some(leg.net);
    }
    assert_eq!(path.end(), at);
}

fn came(path: &Path) -> bool {
    path.legs.last().is_none_or(|leg| leg.came)
}

/// What this pair says must be so, by its kind.
fn check_pair(scenario: &Scenario, instance: &Instance, trace: &Trace, fact: &Fact, pair: &RacePair) {
    let kind = fact.subject.kind;
    let paths = || std::iter::once(&pair.first).chain(&pair.second);
    for path in paths() {
        check_path(scenario, instance, trace, path, kind == Kind::Oscillation);
    }
    assert_ne!(Some(&pair.first), pair.second.as_ref(), "two paths are two: {fact:?}");
    let circuit = &*scenario.circuit;
    let ends_at = |path: &Path, net: NetId| {
        let reads = |gate: GateId| path.last().is_some_and(|last| circuit.pins(gate).contains(&last));
        path.last() == Some(net) || circuit.driver(net).is_some_and(reads)
    };
    match kind {
        Kind::Glitch | Kind::MinPulse => {
            let (from, to) = fact.place.unwrap();
            let second = pair.second.as_ref().unwrap();
            assert_eq!((pair.first.end(), second.end()), (from, to));
            assert_eq!((pair.first.last(), second.last()), (fact.subject.net, fact.subject.net));
            let on =
                |path: &Path, net| path.from.is_some_and(|it| it.0 == net) || path.legs.iter().any(|it| it.net == net);
            assert!(pair.meet.is_some_and(|net| paths().all(|path| on(path, net))), "{pair:?}");
        }
        Kind::Timing => {
            let (from, to) = fact.place.unwrap();
            let second = pair.second.as_ref().unwrap();
            assert_eq!(pair.first.end(), from);
            assert!(second.end() == to || !came(second), "{fact:?} {pair:?}");
        }
        Kind::SettleWithin => assert_eq!(pair.first.end(), fact.place.unwrap().1),
        Kind::Never => {
            let since = fact.place.unwrap().0;
            let second = pair.second.as_ref().unwrap();
            assert!(pair.first.end() == since || second.end() == since, "{fact:?} {pair:?}");
            assert!(pair.first.end() <= second.end());
        }
        Kind::Swallowed => {
            let second = pair.second.as_ref().unwrap();
            assert!(!came(&pair.first) && came(second) && second.end() <= pair.first.end());
            assert_eq!((pair.first.last(), pair.meet), (fact.subject.net, fact.subject.net));
            assert!(ends_at(second, pair.meet.unwrap()), "{pair:?}");
        }
        Kind::Oscillation => {
            let (net, new) = pair.first.from.unwrap();
            let last = pair.first.legs.last().unwrap();
            assert_eq!((last.net, last.new, &pair.second), (net, new, &None), "once round: {pair:?}");
        }
        Kind::Expect | Kind::NeverAtRest | Kind::NotInReference | Kind::CriticalRace => {
            let (second, meet) = (pair.second.as_ref().unwrap(), pair.meet.unwrap());
            assert!(came(&pair.first) && pair.first.end() <= second.end(), "the first won: {pair:?}");
            assert!(ends_at(&pair.first, meet) && ends_at(second, meet), "they meet: {pair:?}");
        }
        Kind::NonCriticalRace => {
            assert!(pair.first.end() <= pair.second.as_ref().unwrap().end());
            assert!(paths().all(|path| path.last().is_some_and(|net| circuit.in_loop(net))));
        }
        Kind::Edges => {}
        kind => panic!("{kind:?} has no pair"),
    }
}

/// Windows of two runs that begin alike and settle in different states.
fn races(a: &Trace, b: &Trace) -> Vec<Fact> {
    let fact = |kind: Kind, moment: u32| Fact {
        subject: Subject { kind, shape: None, question: None, net: None, moment: Some(moment) },
        breaks_rule: false,
        measure: None,
        place: None,
    };
    let alike = a.windows.iter().zip(&b.windows).filter(|(a, b)| a.moment == b.moment && a.before == b.before);
    let settled = alike.filter(|(a, b)| a.end == End::Settled && b.end == End::Settled && a.began_at_rest);
    settled
        .map(|(a, b)| fact(if a.state == b.state { Kind::NonCriticalRace } else { Kind::CriticalRace }, a.moment))
        .collect()
}

#[test]
fn pairs_of_random_findings_are_connected_and_add_up() {
    let mut met: BTreeMap<&str, (usize, usize)> = BTreeMap::new();
    for (number, kind) in worlds().into_iter().enumerate() {
        for (case, Case { mut scenario, rest, instance, name, .. }) in cases(500, kind).enumerate() {
            let mut rng = ChaCha8Rng::seed_from_u64(29);
            rng.set_stream((number * 1000 + case) as u64);
            add_rules(&mut scenario, &mut rng, kind.delays);
            let asked = Asked::of(&scenario);
            let program = Program::with_rest(&scenario, &rest);
            let mut observers = (Trace::default(), Judge::new(&scenario, &asked, Answers::default()));
            program.machine().run(&instance, &Control::default(), &mut observers);
            let (failing, facts) = (observers.0, observers.1.sink.facts);
            // the same delays a little later or earlier, as other draws would have them
            let others: Vec<Trace> = (0..8)
                .map(|draw| {
                    let mut moved = instance.clone();
                    for (i, delay) in moved.delays.gate.iter_mut().flatten().enumerate() {
                        let share = (7 * i as u64 * i as u64 + 5 * case as u64 + 3 * draw * (i as u64 + 1)) % 13;
                        *delay = fs((delay.fs() * (5 + share)).div_ceil(10));
                    }
                    trace(&program, &moved)
                })
                .collect();
            let mut asked_for: Vec<(Fact, &Trace)> = facts.into_iter().map(|fact| (fact, &others[0])).collect();
            for (draw, other) in others.iter().enumerate() {
                let races = races(&failing, other).into_iter();
                let races = races.filter(|it| draw == 0 || it.subject.kind == Kind::CriticalRace);
                asked_for.extend(races.map(|fact| (fact, other)));
            }
            for (fact, other) in asked_for {
                for other in [Some(other), None] {
                    let pair = race_pair(&scenario, &asked, &fact, &failing, other);
                    let met = met.entry(fact.subject.kind.word()).or_default();
                    met.0 += 1;
                    met.1 += usize::from(pair.is_some());
                    let Some(pair) = pair else { continue };
                    let checked = std::panic::catch_unwind(|| check_pair(&scenario, &instance, &failing, &fact, &pair));
                    if checked.is_err() {
                        panic!("{name} {fact:?}\n{pair:#?}\n{}", print(&scenario, &rest, &instance));
                    }
                }
            }
        }
    }
    // all edges have a path, so these always have a pair
    for word in ["glitch", "min-pulse", "settle-within", "swallowed"] {
        let (asked, told) = met[word];
        assert!(asked > 100 && asked == told, "{word}: {met:?}");
    }
    for word in ["never", "timing", "edges", "oscillation", "critical-race", "expect", "never-at-rest"] {
        assert!(met[word].1 > 30, "{word}: {met:?}");
    }
    for word in ["before-rest", "never-came", "unsettled"] {
        assert!(met.get(word).is_none_or(|it| it.1 == 0), "{word}: {met:?}");
    }
}

/// Of the changes of one instant that a gate hears of, the path goes by one without which the gate would not have changed.
#[test]
fn a_path_goes_by_a_change_that_mattered() {
    let mut judged = 0;
    for Case { name, scenario, rest, instance, .. } in
        cases(1500, Worlds { begin: Start::Random, gates: (2, 12), ..PLAIN })
    {
        let circuit = &*scenario.circuit;
        let trace = trace(&Program::with_rest(&scenario, &rest), &instance);
        let mut values: Vec<Vec<bool>> = Vec::new();
        let first: Vec<bool> = circuit.nets().map(|net| trace.start.get(net.index()) == Value::One).collect();
        let mut now = first.clone();
        let mut changes = trace.changes.iter().peekable();
        for batch in 0..trace.batches {
            while let Some(change) = changes.next_if(|it| it.batch == batch) {
                now[change.net.index()] = change.new == Value::One;
            }
            values.push(now.clone());
        }
        for change in trace.changes.iter().filter(|it| it.cause.is_some()).take(100) {
            let path = path_to(&scenario, &trace, change.net, change.at);
            let cause = path.legs.iter().rev().nth(1).map(|leg| leg.net).or(path.from.map(|it| it.0)).unwrap();
            let gate = circuit.driver(change.net).unwrap();
            let batch = trace.changes[change.cause.unwrap() as usize].batch as usize;
            let (before, after) = (if batch == 0 { &first } else { &values[batch - 1] }, &values[batch]);
            let undone = |undo: NetId| {
                circuit.wants(gate, |net| if net == undo { before[net.index()] } else { after[net.index()] })
            };
            let matters = |net: NetId| undone(net) != circuit.wants(gate, |net| after[net.index()]);
            let heard: Vec<NetId> = circuit
                .sources(gate)
                .iter()
                .map(|it| it.0)
                .filter(|net| before[net.index()] != after[net.index()])
                .collect();
            if heard.len() > 1 && heard.iter().any(|net| matters(*net)) {
                assert!(matters(cause), "{name}: {change:?} by {cause:?} of {heard:?}");
                judged += 1;
            }
        }
    }
    assert!(judged > 500, "{judged}");
}

/// The path to a net's change at an instant.
fn path_to(scenario: &Scenario, trace: &Trace, net: NetId, at: Time) -> Path {
    let subject = Subject { kind: Kind::SettleWithin, shape: None, question: None, net: Some(net), moment: None };
    let fact = Fact { subject, breaks_rule: false, measure: None, place: Some((Time::ZERO, at)) };
    race_pair(scenario, &Asked::default(), &fact, trace, None).unwrap().first
}

// ---- small cases by hand

/// A path as a list: `a↑ 3`, wires as `(a) 2`.
fn told(scenario: &Scenario, path: &Path) -> Vec<String> {
    let legs = path.legs.iter().map(|leg| {
        let (name, delay) = (scenario.circuit.name(leg.net), leg.delay.fs());
        let edge = ["↓", "↑", "X"][leg.new as usize];
        let lost = if leg.came { "" } else { " lost" };
        if leg.wire.is_some() { format!("({name}) {delay}{lost}") } else { format!("{name}{edge} {delay}{lost}") }
    });
    legs.collect()
}

fn typical(world: &World) -> (Scenario, Trace) {
    let scenario = world.scenario();
    let rest = stable_states(&scenario.circuit, &scenario.stimulus.initial);
    let rest = rest.into_iter().find(|state| match &scenario.begin {
        Begin::AtRest { named } => named.iter().all(|(net, bit)| state.get(net.index()) == *bit),
        _ => true,
    });
    let trace = trace(&Program::with_rest(&scenario, &rest.unwrap_or_default()), &world.instance(&scenario));
    (scenario, trace)
}

#[test]
fn a_path_goes_over_wires_and_by_the_last_of_what_it_needs() {
    // a rises at 10; b follows 5 later; the wire to q takes 2, and q, an AND of a (late by 20) and b, takes 3
    let mut world = World::new();
    world.input("a", false).gate("b", Function::Buf, &["a"], 5).gate("q", Function::And, &["a", "b"], 3);
    world.wire("b", "q", 2, 2).at(10, &[("a", true)]);
    let (scenario, trace) = typical(&world);
    let path = path_to(&scenario, &trace, world.net("q"), Time::from_fs(20));
    assert_eq!(told(&scenario, &path), ["b↑ 5", "(b) 2", "q↑ 3"]);
    assert_eq!((path.from, path.moment, path.at.fs()), (Some((world.net("a"), Value::One)), Some(0), 10));
}

#[test]
fn once_round_a_ring_is_its_period() {
    // an inverter and two buffers: each edge goes round once, so up and down together take 2 · (3 + 4 + 5)
    let mut world = World::new();
    world.input("go", false);
    world.gate("a", Function::Nand, &["go", "c"], 3).gate("b", Function::Buf, &["a"], 4);
    world.gate("c", Function::Buf, &["b"], 5).at(10, &[("go", true)]);
    let (scenario, trace) = typical(&world);
    assert_eq!(trace.windows[0].end, End::Oscillating { period: fs(24), range: None });
    let subject = Subject { kind: Kind::Oscillation, shape: None, question: None, net: None, moment: Some(0) };
    let fact = Fact { subject, breaks_rule: true, measure: None, place: None };
    let pair = race_pair(&scenario, &Asked::of(&scenario), &fact, &trace, None).unwrap();
    let mut legs = told(&scenario, &pair.first);
    legs.sort();
    assert_eq!(legs, ["a↑ 3", "a↓ 3", "b↑ 4", "b↓ 4", "c↑ 5", "c↓ 5"]);
    assert_eq!((pair.first.total(), pair.second), (fs(24), None));
}

#[test]
fn a_long_chain_keeps_its_last_legs_and_says_so() {
    let mut world = World::new();
    world.input("n0", false);
    for i in 1..=1500 {
        world.gate(&format!("n{i}"), Function::Buf, &[&format!("n{}", i - 1)], 2);
    }
    world.at(10, &[("n0", true)]);
    let scenario = world.scenario();
    let rest = stillgate::logic::Bits::zeros(scenario.circuit.net_count());
    let trace = trace(&Program::with_rest(&scenario, &rest), &world.instance(&scenario));
    let path = path_to(&scenario, &trace, world.net("n1500"), Time::from_fs(3010));
    assert_eq!((path.legs.len(), path.left_out, path.moment), (Path::MOST, 500, None));
    assert_eq!((path.from, path.at.fs(), path.end().fs()), (Some((world.net("n500"), Value::One)), 1010, 3010));
}

// ---- the demonstrations, worked out by hand

/// The review of a demonstration with this many draws, and the first pair of this kind about this net and step.
fn demonstration(name: &str, draws: u64, kind: Kind, net: Option<&str>, step: &str) -> (Scenario, RacePair) {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
    let mut scenario = stillgate::reader::load(&path).unwrap().scenario;
    scenario.plan.samples = draws;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
    let net = net.map(|net| scenario.circuit.net(net).unwrap());
    let at = |moment: Option<u32>| moment.map(|it| scenario.stimulus.moments[it as usize].label.as_str());
    let about = |it: &Subject| it.kind == kind && it.net == net && (step.is_empty() || at(it.moment) == Some(step));
    let index = review.sweep.findings.iter().position(|it| about(&it.subject)).expect("it is found");
    let finding = &review.sweep.findings[index];
    let pair = review.why[index].as_ref().expect("it was looked for").race.clone().expect("a pair");
    // the figures are those of the case that is named
    let instance = Instance::of(&scenario, &Which::Sample(finding.worst_sample.or(finding.sample).unwrap()));
    let run = review::run_one(
        &scenario,
        &program,
        &review.asked,
        Which::Given(Box::new(instance.clone())),
        &Control::default(),
    );
    for path in std::iter::once(&pair.first).chain(&pair.second) {
        check_path(&scenario, &instance, &run.as_ref().unwrap().trace, path, false);
    }
    (scenario, pair)
}

/// Nets and edges of both paths, and where they meet.
fn names(scenario: &Scenario, pair: &RacePair) -> (String, String, String) {
    let path = |path: &Path| {
        let from = path.from.map_or("power-up", |it| scenario.circuit.name(it.0));
        let legs = path.legs.iter().map(|leg| {
            format!(
                " {}{}{}",
                scenario.circuit.name(leg.net),
                ["↓", "↑", "X"][leg.new as usize],
                if leg.came { "" } else { " lost" }
            )
        });
        std::iter::once(from.to_string()).chain(legs).collect::<String>()
    };
    let meet = pair.meet.map_or(String::new(), |net| scenario.circuit.name(net).to_string());
    (path(&pair.first), pair.second.as_ref().map(path).unwrap_or_default(), meet)
}

/// green = nand(hold_upper, hold_lower). The upper side lets go: hold_upper rises; until the latch has answered with
/// hold_lower's fall both are 1, so green falls. It rises again once hold_lower has fallen. The lamp sees the first edge
/// directly and the second through the latch.
#[test]
fn the_interlock_lamp_goes_out_since_the_latch_answers_later() {
    let (scenario, pair) = demonstration("interlock", 500, Kind::Glitch, Some("green"), "upper lets go");
    let (a, b, meet) = names(&scenario, &pair);
    assert_eq!((&*a, &*b), ("call_upper hold_upper↑ green↓", "call_upper hold_upper↑ hold_lower↓ green↑"));
    assert_eq!(meet, "green");
}

/// level = or(from_upper, from_lower). choose_upper falls: from_upper goes at once, from_lower comes only through the
/// inverter choose_lower. The classic static-1 hazard of a selector.
#[test]
fn the_selector_lets_go_before_the_inverter_has_turned() {
    let (scenario, pair) = demonstration("selector", 300, Kind::Glitch, Some("level"), "to the lower gauge");
    let (a, b, meet) = names(&scenario, &pair);
    assert_eq!((&*a, &*b), ("choose_upper from_upper↓ level↓", "choose_upper choose_lower↑ from_lower↑ level↑"));
    assert_eq!(meet, "level");
    assert!(pair.first.total() < pair.second.unwrap().total());
}

/// Both buttons: both coils pick up before either auxiliary contact has opened the other's circuit. A main contact closes
/// (coil, contact) while the other opens only after coil, auxiliary contact, the other coil and its contact.
#[test]
fn the_contactors_are_both_closed_until_an_auxiliary_contact_has_opened_one() {
    let (scenario, pair) = demonstration("contactors", 1000, Kind::Never, None, "both buttons");
    let (a, b, meet) = names(&scenario, &pair);
    let closes = ["button_up coil_up↑ main_up↑", "button_down coil_down↑ main_down↑"];
    let opens =
        ["button_down coil_down↑ aux_down↑ coil_up↓ main_up↓", "button_up coil_up↑ aux_up↑ coil_down↓ main_down↓"];
    assert!(closes.contains(&&*a) && opens.contains(&&*b), "{a} / {b}");
    assert_eq!(meet, "", "the rule compares them");
    assert!(pair.first.end() < pair.second.unwrap().end());
}

/// The tick of the shore is chosen near the end of its high time: pulse rises by the selector (inverter, gate) and falls by
/// the tick itself, or it is cut off by the selector after it rose by the tick. The gate that both come to is from_shore or
/// from_lock.
#[test]
fn the_runt_of_the_clock_switch_lies_between_the_selector_and_the_tick() {
    let (scenario, pair) = demonstration("clock-switch", 1000, Kind::MinPulse, Some("pulse"), "");
    let (a, b, meet) = names(&scenario, &pair);
    assert!(meet == "from_shore" || meet == "from_lock", "{a} / {b} at {meet}");
    let starts = [a.split(' ').next().unwrap(), b.split(' ').next().unwrap()];
    let tick = meet.trim_start_matches("from_");
    assert!(starts.contains(&"choose_lock") && starts.contains(&tick), "{a} / {b} at {meet}");
    assert!(a.ends_with(&format!("{meet}↑ pulse↑")) && b.ends_with(&format!("{meet}↓ pulse↓")), "{a} / {b}");
}

/// up_a = and(float_not, full). float rises: full rises through on_a. If the inverter float_not has not fallen by then, up_a
/// sees the old float with the new full and sets fill. Unger's essential hazard: the input's inverter against the feedback.
#[test]
fn the_sequencer_takes_the_new_state_for_the_old_float() {
    for kind in [Kind::Expect, Kind::CriticalRace] {
        let (scenario, pair) = demonstration("sequencer", 500, kind, None, "float rises");
        let (a, b, meet) = names(&scenario, &pair);
        assert_eq!((&*a, &*b, &*meet), ("float on_a↑ full↑", "float float_not↓", "up_a"), "{kind:?}");
        assert!(pair.first.total() < pair.second.unwrap().total(), "{kind:?}");
    }
}

/// The first latch is open while push_not is 1. push gives the second latch its turn: paddle moves through give_set or
/// give_reset; if push_not has not fallen by then, take_set or take_reset lets the new paddle into the first latch as well.
#[test]
fn the_stepper_steps_twice_since_the_first_latch_is_still_open() {
    let (scenario, pair) = demonstration("stepper", 2000, Kind::Expect, None, "push");
    let (a, b, meet) = names(&scenario, &pair);
    assert_eq!((&*a, &*b, &*meet), ("push give_set↓ paddle↑", "push push_not↓", "take_reset"));
    let (scenario, pair) = demonstration("stepper", 2000, Kind::Expect, None, "push again");
    let (a, b, meet) = names(&scenario, &pair);
    assert_eq!((&*a, &*b, &*meet), ("push give_reset↓ paddle_not↑", "push push_not↓", "take_set"));
}

/// kept = or(taken, held), held = and(let_go, kept). The key is let go: taken falls at once and takes kept with it, unless
/// held has risen through the inverter let_go by then. What loses is held: its event is cancelled when kept falls, or let_go
/// comes after that.
#[test]
fn the_permit_is_forgotten_since_it_is_not_held_in_time() {
    let (scenario, pair) = demonstration("permit", 500, Kind::NotInReference, None, "key let go");
    let (a, b, meet) = names(&scenario, &pair);
    assert_eq!(a, "key taken↓ kept↓");
    assert!(b == "key let_go↑ held↑ lost" || b == "key let_go↑", "{b}");
    assert_eq!(meet, "held");
    assert!(pair.first.total() <= pair.second.unwrap().total());
}

/// State is not part of what is told; two runs that begin a window differently are not compared.
#[test]
fn runs_that_begin_differently_are_not_compared() {
    // two latches in a row; the second window begins in another state in the other run
    let mut world = World::new();
    world.input("s", false).input("r", false);
    world.gate("q", Function::Nor, &["r", "p"], 3).gate("p", Function::Nor, &["s", "q"], 3);
    world.initially(&[("q", false)]);
    world.at(10, &[("s", true)]).at(30, &[("s", false)]);
    let (scenario, first) = typical(&world);
    world.set[0] = vec![("r".to_string(), true)];
    let (_, other) = typical(&world);
    assert_ne!(first.windows[1].before, State::default());
    assert_ne!(first.windows[1].before, other.windows[1].before);
    let subject = Subject { kind: Kind::CriticalRace, shape: None, question: None, net: None, moment: Some(1) };
    let fact = Fact { subject, breaks_rule: true, measure: None, place: None };
    assert_eq!(race_pair(&scenario, &Asked::of(&scenario), &fact, &first, Some(&other)), None);
}
