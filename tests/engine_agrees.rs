//! Every machine tells the same story as the slow engine, on thousands of random small circuits in which ties are the
//! rule.

use stillgate::circuit::{Compiled, Function, NetId};
use stillgate::control::Control;
use stillgate::delay::Filter;
use stillgate::engine::{End, Hit, Program};
use stillgate::instance::{Firings, Instance};
use stillgate::logic::{Bits, Value};
use stillgate::scenario::{Begin, MomentKind, Place, Scenario};

use crate::support::random_worlds::{Case, Filters, Kind, Lengths, PLAIN, Start, cases};
use crate::support::recorder::{Record, Recorder};
use crate::support::slow_engine;
use crate::support::world::{World, fs, stable_states};

/// How often each thing was met: a comparison that never meets it proves nothing.
#[derive(Debug, Default)]
struct Met {
    cases: usize,
    cut: usize,
    settled: usize,
    exact: usize,
    inexact: usize,
    transitions: usize,
    time: usize,
    swallowed: usize,
    unknown_left: usize,
    bounced: usize,
    /// Steps that waited for a pattern which came.
    came: usize,
    never_came: usize,
    /// Cases in which firings differ: drawn, given.
    anew: [usize; 2],
    /// Gates of more than six nets: counting, parity, table.
    wide: [usize; 3],
}

impl Met {
    fn count(&mut self, scenario: &Scenario, instance: &Instance, record: &Record) {
        let circuit = &scenario.circuit;
        self.cases += 1;
        for moment in record.windows.iter().flat_map(|window| &window.opening.moments) {
            if let MomentKind::Step(step) = scenario.stimulus.moments[*moment as usize].kind {
                let place = &scenario.stimulus.steps[step as usize].place;
                self.came += usize::from(matches!(place, Place::When { .. }));
                self.bounced += usize::from(instance.bounces[step as usize].iter().any(|toggles| !toggles.is_empty()));
            }
        }
        match instance.firings {
            None => {}
            Some(Firings::Drawn(_)) => self.anew[0] += 1,
            Some(Firings::Given(_)) => self.anew[1] += 1,
        }
        self.never_came += usize::from(record.never_came.is_some());
        for gate in circuit.gates() {
            match circuit.compiled(gate) {
                Compiled::Table(_) => {}
                Compiled::Count { .. } => self.wide[0] += 1,
                Compiled::Parity { .. } => self.wide[1] += 1,
                Compiled::Wide(_) => self.wide[2] += 1,
            }
        }
        self.swallowed += record.swallowed.len();
        for window in &record.windows {
            *match window.end {
                End::Cut => &mut self.cut,
                End::Settled => &mut self.settled,
                End::Oscillating { range: None, .. } => &mut self.exact,
                End::Oscillating { range: Some(_), .. } => &mut self.inexact,
                End::Unsettled(Hit::Time) => &mut self.time,
                End::Unsettled(_) => &mut self.transitions,
            } += 1;
            if window.end == End::Settled && window.state.contains(&Value::X) {
                self.unknown_left += 1;
            }
        }
    }
}

/// The case in full, for the message of a failure.
pub fn print(scenario: &Scenario, rest: &Bits, instance: &Instance) -> String {
    let circuit = &scenario.circuit;
    let name = |net: &NetId| circuit.name(*net).to_string();
    let mut text = format!("begin {:?}, limits {:?}\ninputs", scenario.begin, scenario.limits);
    for (net, bit) in circuit.inputs().zip(&scenario.stimulus.initial) {
        text += &format!(" {}={}", name(&net), u8::from(*bit));
    }
    for gate in circuit.gates() {
        let net = circuit.net_of(gate);
        let function = match circuit.function(gate) {
            Function::Expr(expr) => format!("expr {}", expr.text()),
            function => function.name().to_string(),
        };
        let pins: Vec<String> = circuit.pins(gate).iter().map(name).collect();
        let [fall, rise] = instance.delays.gate[gate.index()].map(|span| span.fs());
        let filter = scenario.delays.filter[gate.index()];
        let start = match scenario.begin {
            Begin::AtRest { .. } => u8::from(rest.get(net.index())).to_string(),
            Begin::Random => u8::from(instance.start.get(gate.index())).to_string(),
            Begin::Unknown => "X".into(),
        };
        text += &format!("\n{} = {function} {pins:?} rise {rise} fall {fall} {filter:?} starts {start}", name(&net));
    }
    for (wire, (net, gate)) in circuit.wires().iter().enumerate() {
        let [fall, rise] = instance.delays.wire[wire].map(|span| span.fs());
        text += &format!("\nwire {} to {} rise {rise} fall {fall}", name(net), name(&circuit.net_of(*gate)));
    }
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        let set: Vec<String> = step.set.iter().map(|(net, bit)| format!("{}={}", name(net), u8::from(*bit))).collect();
        let word = match &step.place {
            Place::At(_) => "at".to_string(),
            Place::After(_) => "after".to_string(),
            Place::Rest(_) => "rest".to_string(),
            Place::When { pattern, timeout, .. } => format!("when {pattern:?} timeout {timeout:?}"),
        };
        let (wait, skew, bounce) = (instance.places[s].fs(), &instance.skews[s], &instance.bounces[s]);
        text += &format!("\nstep {} {word} {wait} sets {set:?} skew {skew:?} bounce {bounce:?}", s + 1);
    }
    if let Some(firings) = &instance.firings {
        text += &format!("\n{firings:?}");
    }
    for (clock, case) in scenario.stimulus.clocks.iter().zip(&instance.clocks) {
        text += &format!("\nclock {} {case:?}", name(&clock.net));
    }
    text
}

/// The first difference of two records, in words.
fn difference(slow: &Record, fast: &Record) -> Option<String> {
    if slow == fast {
        return None;
    }
    let list = |what: &str, slow: Vec<String>, fast: Vec<String>| {
        let at = slow.iter().zip(&fast).position(|(a, b)| a != b).unwrap_or(slow.len().min(fast.len()));
        let get = |list: &[String]| list.get(at).cloned().unwrap_or_else(|| "none".into());
        (slow != fast).then(|| format!("{what} {at}:\n  slow {}\n  fast {}", get(&slow), get(&fast)))
    };
    let words = |record: &Record| -> [Vec<String>; 3] {
        [
            record.changes.iter().map(|change| format!("{change:?}")).collect(),
            record.windows.iter().map(|window| format!("{window:?}")).collect(),
            record.swallowed.iter().map(|swallow| format!("{swallow:?}")).collect(),
        ]
    };
    let ([changes, windows, swallowed], [fast_changes, fast_windows, fast_swallowed]) = (words(slow), words(fast));
    list("change", changes, fast_changes)
        .or_else(|| list("window", windows, fast_windows))
        .or_else(|| list("swallowed", swallowed, fast_swallowed))
        .or_else(|| Some(format!("start or events: {} {}", slow.events, fast.events)))
}

/// Runs one case by the slow engine and by every machine.
fn compare(scenario: &Scenario, rest: &Bits, instance: &Instance, of: &str) -> Record {
    let start = matches!(scenario.begin, Begin::AtRest { .. }).then_some(rest);
    let slow = slow_engine::run(scenario, start, instance).in_order();
    let program = Program::with_rest(scenario, rest);
    for (sorted, lists) in [(true, false), (true, true), (false, false), (false, true)] {
        let mut recorder = Recorder::new(scenario.circuit.net_count());
        let mut machine = program.machine_with(sorted, lists);
        // twice on one machine: nothing may stay behind from the run before
        for again in [false, true] {
            machine.run(instance, &Control::default(), &mut recorder);
            let fast = recorder.record.clone().in_order();
            if let Some(difference) = difference(&slow, &fast) {
                let case = print(scenario, rest, instance);
                panic!("{of}, sorted {sorted}, lists {lists}, again {again}: {difference}\n{case}");
            }
        }
    }
    slow
}

/// Compares random cases of a kind; returns what was met.
fn agree(count: u64, kind: Kind) -> Met {
    let mut met = Met::default();
    for Case { name, scenario, rest, instance, .. } in cases(count, kind) {
        met.count(&scenario, &instance, &compare(&scenario, &rest, &instance, &name));
    }
    met
}

#[test]
fn inertial_from_rest() {
    let met = agree(2700, PLAIN);
    assert!(met.cases > 300 && met.settled > 500 && met.cut > 100 && met.exact > 30 && met.swallowed > 100, "{met:?}");
    let met = agree(900, Kind { delays: Lengths::Wide, clocks: true, ..PLAIN });
    assert!(met.cases > 100 && met.settled > 200 && met.cut > 100 && met.swallowed > 20, "{met:?}");
}

#[test]
fn transport_and_mixtures_from_rest() {
    let met = agree(1500, Kind { filters: Filters::Transport, delays: Lengths::Short, ..PLAIN });
    assert!(met.cases > 100 && met.settled > 200 && met.swallowed > 20, "{met:?}");
    let met = agree(2100, Kind { filters: Filters::Mixed, wires: 0.3, ..PLAIN });
    assert!(met.cases > 200 && met.settled > 200 && met.cut > 100 && met.exact > 20 && met.swallowed > 50, "{met:?}");
}

#[test]
fn reject_and_involution_from_rest() {
    let met = agree(1500, Kind { filters: Filters::Reject, delays: Lengths::Short, ..PLAIN });
    assert!(met.cases > 100 && met.settled > 200 && met.exact > 20 && met.swallowed > 100, "{met:?}");
    let met = agree(1500, Kind { filters: Filters::Involution, delays: Lengths::Short, ..PLAIN });
    assert!(met.cases > 100 && met.settled > 200 && met.exact > 20 && met.swallowed > 100, "{met:?}");
    let met = agree(900, Kind { filters: Filters::Involution, delays: Lengths::Wide, hazards: true, ..PLAIN });
    assert!(met.cases > 100 && met.settled > 200 && met.swallowed > 100, "{met:?}");
    let met = agree(1500, Kind { filters: Filters::All, wires: 0.3, ..PLAIN });
    assert!(met.cases > 200 && met.settled > 200 && met.cut > 100 && met.exact > 20 && met.swallowed > 50, "{met:?}");
}

#[test]
fn random_starts() {
    let kind = Kind { begin: Start::Random, gates: (2, 12), ..PLAIN };
    let met = agree(1800, Kind { clocks: true, ..kind });
    assert!(met.settled > 300 && met.cut > 300 && met.exact > 50 && met.transitions > 50 && met.time > 20, "{met:?}");
    assert!(met.wide.iter().all(|gates| *gates > 20), "{met:?}");
    let met = agree(1800, Kind { filters: Filters::Mixed, wires: 0.3, delays: Lengths::Short, clocks: true, ..kind });
    assert!(met.settled > 300 && met.cut > 300 && met.exact > 20 && met.transitions > 50, "{met:?}");
}

#[test]
fn hands_and_partners() {
    let kind = Kind { hands: 0.35, steps: (3, 10), ..PLAIN };
    let met = agree(1500, kind);
    assert!(met.bounced > 100 && met.came > 100 && met.never_came > 50 && met.cut > 100, "{met:?}");
    let met = agree(900, Kind { filters: Filters::All, wires: 0.2, delays: Lengths::Short, ..kind });
    assert!(met.bounced > 100 && met.came > 50 && met.never_came > 50, "{met:?}");
    let met = agree(900, Kind { begin: Start::Random, clocks: true, rings: true, ..kind });
    assert!(met.bounced > 100 && met.came > 100 && met.never_came > 10 && met.exact > 20, "{met:?}");
    let met = agree(600, Kind { begin: Start::Unknown, delays: Lengths::Wide, ..kind });
    assert!(met.bounced > 50 && met.came > 50 && met.never_came > 50, "{met:?}");
}

#[test]
fn unknown_starts() {
    let kind = Kind { begin: Start::Unknown, gates: (2, 12), wires: 0.2, ..PLAIN };
    let met = agree(2100, kind);
    assert!(met.unknown_left > 100 && met.settled > 300 && met.cut > 100, "{met:?}");
    assert!(met.wide.iter().all(|gates| *gates > 20), "{met:?}");
    let met = agree(900, Kind { clocks: true, delays: Lengths::Short, ..kind });
    assert!(met.unknown_left > 50 && met.settled > 100 && met.cut > 100, "{met:?}");
}

#[test]
fn rings_that_recur_and_rings_that_nearly_do() {
    let kind = Kind { begin: Start::Random, gates: (2, 4), limits: &[150, 5000, 20_000], rings: true, ..PLAIN };
    let met = agree(750, Kind { clocks: true, ..kind });
    assert!(met.exact > 100, "{met:?}");
    let met = agree(750, Kind { filters: Filters::Mixed, wires: 0.2, delays: Lengths::Short, ..kind });
    assert!(met.exact > 50, "{met:?}");
    let met = agree(180, Kind { delays: Lengths::Wide, ..kind });
    assert!(met.inexact > 10, "{met:?}");
    let met = agree(450, Kind { filters: Filters::All, wires: 0.2, delays: Lengths::Short, clocks: true, ..kind });
    assert!(met.exact > 50 && met.cut > 100, "{met:?}");
}

/// Every gate asks for its k-th event at the same place in every machine, whatever comes to pass in one instant.
#[test]
fn firings_that_differ() {
    let kind = Kind { anew: true, ..PLAIN };
    let met = agree(1500, kind);
    assert!(met.anew.iter().all(|cases| *cases > 50) && met.settled > 300 && met.swallowed > 100, "{met:?}");
    let met = agree(1500, Kind { filters: Filters::All, wires: 0.3, delays: Lengths::Short, clocks: true, ..kind });
    assert!(met.settled > 200 && met.cut > 100 && met.swallowed > 100, "{met:?}");
    let met = agree(600, Kind { filters: Filters::Involution, delays: Lengths::Wide, hazards: true, ..kind });
    assert!(met.settled > 100 && met.swallowed > 50, "{met:?}");
    let met = agree(900, Kind { begin: Start::Random, filters: Filters::Mixed, hands: 0.2, ..kind });
    assert!(met.settled > 100 && met.came > 20 && met.bounced > 20, "{met:?}");
    let met = agree(900, Kind { begin: Start::Unknown, wires: 0.2, ..kind });
    assert!(met.settled > 100 && met.unknown_left > 20, "{met:?}");
    let kind = Kind { begin: Start::Random, gates: (2, 4), limits: &[150, 5000, 20_000], rings: true, ..kind };
    let met = agree(200, kind);
    assert!(met.exact > 10 && met.inexact > 30, "{met:?}");
    let met = agree(200, Kind { filters: Filters::All, wires: 0.2, delays: Lengths::Short, ..kind });
    assert!(met.exact > 10 && met.inexact > 30, "{met:?}");
    let met = agree(12, Kind { gates: (100, 160), limits: &[2000], rings: false, ..kind });
    assert!(met.settled + met.transitions + met.inexact > 5, "{met:?}");
}

/// One machine for cases with and without firings of their own: nothing of one stays for the next.
#[test]
fn a_machine_runs_cases_of_both_kinds() {
    let kind = Kind { anew: true, filters: Filters::All, wires: 0.2, ..PLAIN };
    let mut met = 0;
    for Case { name, scenario, rest, instance, .. } in cases(300, kind) {
        let plain = Instance { firings: None, ..instance.clone() };
        let program = Program::with_rest(&scenario, &rest);
        let (mut one, mut recorder) = (program.machine(), Recorder::new(scenario.circuit.net_count()));
        let mut records = Vec::new();
        for case in [&instance, &plain, &instance, &plain] {
            one.run(case, &Control::default(), &mut recorder);
            records.push(recorder.record.clone());
            let mut fresh = Recorder::new(scenario.circuit.net_count());
            program.machine().run(case, &Control::default(), &mut fresh);
            assert_eq!(fresh.record, recorder.record, "{name}");
        }
        met += usize::from(records[0] != records[1]);
    }
    assert!(met > 30, "the two kinds differ: {met}");
}

/// Enough gates for the other queue, and for a heap that is more than one level deep.
#[test]
fn larger_circuits() {
    let kind = Kind { gates: (100, 160), begin: Start::Random, limits: &[2000], clocks: true, ..PLAIN };
    let met = agree(15, kind);
    assert!(met.cut > 100 && met.exact + met.transitions > 5, "{met:?}");
    let met = agree(15, Kind { filters: Filters::Mixed, wires: 0.2, delays: Lengths::Wide, ..kind });
    assert!(met.cut > 100 && met.exact + met.transitions > 5, "{met:?}");
}

/// Runs a world by all machines, from the first of its stable states.
fn compare_world(world: &World, of: &str) -> Record {
    let scenario = world.scenario();
    let rest = stable_states(&scenario.circuit, &scenario.stimulus.initial).swap_remove(0);
    compare(&scenario, &rest, &world.instance(&scenario), of)
}

#[test]
fn a_block_that_dies_away_does_not_name_the_period() {
    // a pulse of 300 in a loop of two transport gates loses 1 fs a turn of 2000 fs: it passes through the same values a
    // hundred times and is called an oscillation, then dies; the ring b recurs later and goes on
    let mut world = World::new();
    world.input("s", false).input("e", false).input("t", false);
    world.gate_edges("p", Function::Or, &["s", "q"], 1001, 1000).gate("q", Function::Buf, &["p"], 1000);
    world.filter(Filter::Transport);
    world.gate("b", Function::Nand, &["e", "b"], 10_000);
    world.at(0, &[("s", true), ("e", true)]).at(300, &[("s", false)]).at(1_000_000, &[("t", true)]);
    let record = compare_world(&world, "dying pulse");
    let window = &record.windows[1];
    assert_eq!(window.end, End::Oscillating { period: fs(20_000), range: None });
    assert_eq!(window.moving, vec![(world.net("b"), 2)]);
    assert!(record.of(world.net("q")).last().unwrap().0 < 700_000, "the pulse has died");
}

#[test]
fn of_blocks_that_recur_at_one_instant_the_first_names_the_period() {
    // blocks of a (its second gate comes after b in the list) and b, periods 2·(2 + 2) and 2·3
    let mut periods = [0; 2];
    for lead in 0..200 {
        let mut world = World::new();
        world.input("d", false).input("e", false);
        world.gate("a", Function::Nand, &["d", "c"], 2).gate("b", Function::Nand, &["e", "b"], 3);
        world.gate("c", Function::Buf, &["a"], 2);
        world.at(0, &[("e", true)]).at(lead, &[("d", true)]);
        let record = compare_world(&world, &format!("lead {lead}"));
        match record.windows.last().unwrap().end {
            End::Oscillating { period, range: None } => periods[usize::from(period == fs(6))] += 1,
            end => panic!("{end:?}"),
        }
    }
    assert!(periods[0] > 0 && periods[1] > 0, "{periods:?}");
}
