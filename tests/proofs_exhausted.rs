//! The proof against every case on a grid: small circuits whose delays and waits are all run, half of each unit apart. No case
//! breaks what is proved, and what every case keeps is seldom left undecided. Asked are tolerated glitches, wanted
//! oscillations, patterns that steps wait for and contacts that bounce.

use std::collections::BTreeMap;
use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Function, NetId};
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::engine::Program;
use stillgate::findings::{Answers, Asked, Judge};
use stillgate::instance::{Instance, Which};
use stillgate::proof::{Call, Spend, prove};
use stillgate::scenario::{Bounce, GlitchFree, Mark, Oscillation, Place, Scenario};
use stillgate::time::Span;

use crate::support::share;
use crate::support::small_nets::SmallNet;
use crate::support::world::{World, fs, stable_states};
use crate::support::written;

/// Cases of one circuit, at most.
const CASES: usize = 2500;
/// Femtoseconds of a unit; cases are 1 fs apart.
const UNIT: u64 = 2;

/// Where a delay or wait of a case is.
#[derive(Clone, Copy)]
enum At {
    Gate(usize, usize),
    Place(usize),
    /// One of the bounces of an input of a step.
    Bounce(usize),
}

/// All bounces of an input on the grid: of 2k toggles the last comes at the end of the span, the others before it.
fn bounces(bounce: &Bounce) -> Vec<Vec<Span>> {
    let mut all = Vec::new();
    for pairs in bounce.pulses.0..=bounce.pulses.1 {
        if pairs == 0 {
            all.push(Vec::new());
            continue;
        }
        for span in bounce.lasting.min.fs()..=bounce.lasting.max.fs() {
            let mut some: Vec<Vec<Span>> = vec![Vec::new()];
            for _ in 1..2 * pairs {
                let from = |it: &Vec<Span>| it.last().map_or(0, |last| last.fs());
                let longer = |it: &Vec<Span>| {
                    (from(it)..span).map(|at| it.iter().copied().chain([fs(at)]).collect()).collect::<Vec<Vec<Span>>>()
                };
                some = some.iter().flat_map(longer).collect();
            }
            all.extend(some.into_iter().map(|it| it.into_iter().chain([fs(span)]).collect()));
        }
    }
    all
}

fn range(rng: &mut ChaCha8Rng, from: u64, width: u64) -> DelayRange {
    let least = UNIT * rng.random_range(from..=4);
    DelayRange::between(fs(least), fs(least + UNIT * rng.random_range(0..=width)))
}

/// Two or three gates, a step at rest, and often one that waits for a pattern.
fn world(rng: &mut ChaCha8Rng, bounces: bool) -> World {
    let gates = rng.random_range(2..=3);
    let net = SmallNet::random_of_two(rng, 1, gates);
    let mut world = World::new();
    world.input("i0", rng.random());
    let name = |at: usize| if at == 0 { "i0".to_string() } else { format!("g{}", at - 1) };
    for (gate, (function, pins)) in net.gates.iter().enumerate() {
        let pins: Vec<String> = pins.iter().map(|pin| name(*pin)).collect();
        let pins: Vec<&str> = pins.iter().map(String::as_str).collect();
        world.gate(&format!("g{gate}"), function.clone(), &pins, 1);
        world.gates[gate].delay = [range(rng, 1, 1), range(rng, 1, 1)];
    }
    if rng.random_bool(0.4) {
        // a slow gate beside a fast one that reads the input as well: it may glitch
        let slow = if rng.random() { Function::Not } else { Function::Buf };
        let fast = [Function::And, Function::Or, Function::Xor, Function::Nand][rng.random_range(0..4usize)].clone();
        (world.gates[0].function, world.gates[0].pins) = (slow, vec!["i0".into()]);
        (world.gates[1].function, world.gates[1].pins) = (fast, vec!["i0".into(), "g0".into()]);
        world.gates[1].delay = [0, 1].map(|_| DelayRange::between(fs(UNIT), fs(UNIT * rng.random_range(1..=2))));
    }
    let first = !world.inputs[0].1;
    world.step(Place::Rest(fs(0)), &[("i0", first)]);
    if rng.random_bool(0.6) {
        let pattern = vec![(NetId(rng.random_range(1..=gates as u32)), rng.random())];
        let wait = range(rng, 0, 1);
        let timeout = rng.random_bool(0.5).then(|| fs(UNIT * rng.random_range(1..=10)));
        world.step(Place::When { pattern, wait, timeout }, &[("i0", !first)]);
    }
    if bounces {
        let least = rng.random_range(1..=3);
        let lasting = DelayRange::between(fs(UNIT * least), fs(UNIT * (least + rng.random_range(0..=1))));
        let fewest = rng.random_range(0..=1);
        let step = rng.random_range(0..world.steps.len());
        world.steps[step].bounce = Some(Bounce { lasting, pulses: (fewest, rng.random_range(1..=2)) });
    }
    world
}

fn asks(scenario: &mut Scenario, rng: &mut ChaCha8Rng) {
    let gates: Vec<NetId> = scenario.circuit.gates().map(|gate| scenario.circuit.net_of(gate)).collect();
    scenario.watched.clone_from(&gates);
    let rules = Arc::make_mut(&mut scenario.rules);
    rules.oscillation = if rng.random_bool(0.5) { Oscillation::Required } else { Oscillation::Allowed };
    let asked = |net| GlitchFree { net, shorter_than: fs(UNIT * rng.random_range(1..=6)), mark: Mark(0) };
    rules.glitch_free = gates.into_iter().map(asked).collect();
    if rules.oscillation == Oscillation::Required {
        // also of the first step alone
        let stimulus = Arc::make_mut(&mut scenario.stimulus);
        stimulus.steps[0].oscillation = Some(Oscillation::Required);
    }
}

/// Everything that a case can choose, with its least and greatest value in femtoseconds.
fn choices(scenario: &Scenario) -> Vec<(At, DelayRange)> {
    let delays = scenario.delays.gate.iter().enumerate();
    let mut all: Vec<(At, DelayRange)> =
        delays.flat_map(|(gate, edges)| [(At::Gate(gate, 0), edges[0]), (At::Gate(gate, 1), edges[1])]).collect();
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        if let Place::When { wait, .. } = &step.place {
            all.push((At::Place(s), *wait));
        }
        if let Some(bounce) = &step.bounce {
            let ways = bounces(bounce).len() as u64;
            all.push((At::Bounce(s), DelayRange::between(fs(0), fs(ways - 1))));
        }
    }
    all
}

/// How often each question of a scenario is broken by the cases on the grid.
fn broken(scenario: &Scenario, program: &Program, asked: &Asked) -> Option<Vec<u64>> {
    let choices = choices(scenario);
    let of = |step: &stillgate::scenario::Step| step.bounce.as_ref().map_or_else(Vec::new, bounces);
    let bounces: Vec<Vec<Vec<Span>>> = scenario.stimulus.steps.iter().map(of).collect();
    let count: usize = choices.iter().map(|(_, range)| (range.max.fs() - range.min.fs() + 1) as usize).product();
    if count > CASES {
        return None;
    }
    let mut counts = vec![0; asked.questions.len()];
    let mut instance = Instance::of(scenario, &Which::Typ);
    for number in 0..count {
        let mut rest = number as u64;
        for (at, range) in &choices {
            let width = range.max.fs() - range.min.fs() + 1;
            let value = Span::from_fs(range.min.fs() + rest % width);
            rest /= width;
            match at {
                At::Gate(gate, edge) => instance.delays.gate[*gate][*edge] = value,
                At::Place(step) => instance.places[*step] = value,
                At::Bounce(step) => instance.bounces[*step][0].clone_from(&bounces[*step][value.fs() as usize]),
            }
        }
        let mut judge = Judge::new(scenario, asked, Answers::default());
        assert!(program.machine().run(&instance, &Control::default(), &mut judge));
        let mut questions: Vec<u32> =
            judge.sink.facts.iter().filter(|fact| fact.breaks_rule).filter_map(|fact| fact.subject.question).collect();
        questions.sort_unstable();
        questions.dedup();
        questions.into_iter().for_each(|question| counts[question as usize] += 1);
    }
    Some(counts)
}

#[test]
fn no_case_on_a_grid_breaks_what_is_proved() {
    let cases = compared(71, share(2500), false);
    assert!(cases > share(1200), "{cases}");
}

/// Contacts that bounce in every way that the grid has.
#[test]
fn no_bounce_on_a_grid_breaks_what_is_proved() {
    let cases = compared(72, share(1500), true);
    assert!(cases > share(400), "{cases}");
}

/// Compares so many worlds; how many were small enough.
fn compared(seed: u64, count: u64, bounces: bool) -> u64 {
    // by rule: proved, refuted and met on the grid, refuted only off it, undecided and met, undecided and not met
    let mut met: BTreeMap<&str, [u64; 5]> = BTreeMap::new();
    let mut cases = 0;
    for stream in 0..count {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(stream);
        let world = world(&mut rng, bounces);
        let mut scenario = world.scenario();
        asks(&mut scenario, &mut rng);
        let Some(rest) = stable_states(&scenario.circuit, &[world.inputs[0].1]).into_iter().next() else { continue };
        let program = Program::with_rest(&scenario, &rest);
        let asked = Asked::of(&scenario);
        let Some(broken) = broken(&scenario, &program, &asked) else { continue };
        cases += 1;
        let proof =
            prove(&scenario, &program, &asked, &Spend { zones: 20_000, ..Spend::default() }, &Control::default());
        for claim in &proof.claims {
            let question = &asked.questions[claim.question as usize];
            let count = broken[claim.question as usize];
            let place = match (claim.call, count) {
                (Call::Proved, 0) => 0,
                (Call::Refuted, 1..) => 1,
                (Call::Refuted, 0) => 2,
                (Call::Undecided, 1..) => 3,
                (Call::Undecided, 0) => 4,
                (call, count) => {
                    let start: Vec<bool> = (1..=world.gates.len()).map(|net| rest.get(net)).collect();
                    panic!(
                        "stream {stream}: {question:?} is {}, and {count} cases break it\n{}",
                        call.word(),
                        written::scenario(&world, &start)
                    )
                }
            };
            met.entry(question.rule.word()).or_default()[place] += 1;
        }
    }
    for rule in ["glitch_free", "oscillation", "when"] {
        let [proved, refuted, off, known, open] = met[rule];
        let all = proved + refuted + off + known + open;
        assert!(proved * 20 > all && refuted * 50 > all, "{rule}: {met:?}");
        assert!(known * 50 < all && open * 20 < all && off * 50 < all, "{rule}: {met:?}");
    }
    cases
}
