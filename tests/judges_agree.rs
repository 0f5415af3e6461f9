//! The judges say of every run what the slow judge says of its complete record, on thousands of random small scenarios
//! with random rules.

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::sync::Arc;

use rand::seq::IndexedRandom;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Fact, Judge, Kind, Reason, RuleKey, Seen, Sink};
use stillgate::instance::{Instance, Which};
use stillgate::logic::Value;
use stillgate::scenario::{
    Alternative, Before, EdgeCount, EdgeKind, EdgeSpec, Expectation, GlitchFree, Mark, MinPulse, Never, NeverAtRest,
    Oscillation, Permission, Reference, RefNet, Rules, Scenario, Swallowed, Timing,
};
use stillgate::time::Span;

use crate::engine_agrees::print;
use crate::support::random_worlds::{Case, Filters, Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::slow_judge::{self, Answer, Found, Log, Said};
use crate::support::world::fs;

/// Takes what the judges say of one run, and sees that each thing is said once.
#[derive(Debug, Default)]
struct Heard {
    said: Said,
    reached: Vec<(u32, bool)>,
    windows: Vec<HeardWindow>,
}

#[derive(Debug)]
struct HeardWindow {
    moment: u32,
    before: Option<Vec<Value>>,
    began_at_rest: bool,
    end: End,
    state: Vec<Value>,
    time: u64,
    order: u64,
}

impl Heard {
    fn answer(&mut self, question: u32, answer: Answer) {
        let before = self.said.answers.insert(question, answer);
        assert_eq!(before, None, "question {question} answered twice");
    }
}

impl Sink for Heard {
    fn judged(&mut self, question: u32, broken: bool, slack: Option<i64>) {
        self.answer(question, Answer::Judged { broken, slack });
    }

    fn not_judged(&mut self, question: u32, reason: Reason) {
        self.answer(question, Answer::Not(reason));
    }

    fn fact(&mut self, fact: Fact) {
        let found = Found { breaks_rule: fact.breaks_rule, measure: fact.measure };
        let before = self.said.facts.insert(fact.subject, found);
        assert_eq!(before, None, "{:?} found twice", fact.subject);
    }

    fn reached(&mut self, moment: u32, named: bool) {
        self.reached.push((moment, named));
    }

    fn window(&mut self, window: &Seen<'_>) {
        let nets = |state: &stillgate::logic::State| (0..64).map(|net| state.get(net)).collect::<Vec<_>>();
        let _ = nets;
        self.windows.push(HeardWindow {
            moment: window.moment,
            before: None,
            began_at_rest: window.began_at_rest,
            end: window.end,
            state: Vec::new(),
            time: window.time.fs(),
            order: window.order,
        });
    }
}

/// Short times, so that bounds are met, missed by one, and far away.
fn bound(rng: &mut ChaCha8Rng, delays: Lengths) -> Span {
    fs(match delays {
        Lengths::Ties => rng.random_range(1..=12),
        Lengths::Short => rng.random_range(1..=90),
        Lengths::Wide => rng.random_range(1..=250_000),
    })
}

fn pattern(rng: &mut ChaCha8Rng, nets: &[NetId]) -> Alternative {
    let mut chosen: Vec<NetId> = nets.sample(rng, rng.clone().random_range(1..=2)).copied().collect();
    chosen.sort_unstable();
    chosen.into_iter().map(|net| (net, rng.random())).collect()
}

/// Random rules for a scenario, and random clauses for its steps.
fn add_rules(scenario: &mut Scenario, rng: &mut ChaCha8Rng, delays: Lengths) {
    let nets: Vec<NetId> = scenario.circuit.nets().collect();
    let gates: Vec<NetId> = scenario.circuit.gates().map(|gate| scenario.circuit.net_of(gate)).collect();
    let mut rules = Rules::default();
    for _ in 0..rng.random_range(0..=2) {
        let longer_than = if rng.random() { fs(0) } else { bound(rng, delays) };
        rules.never.push(Never { name: None, state: pattern(rng, &nets), longer_than, mark: Mark(0) });
    }
    for _ in 0..rng.random_range(0..=2) {
        rules.never_at_rest.push(NeverAtRest { name: None, state: pattern(rng, &nets), mark: Mark(0) });
    }
    for _ in 0..rng.random_range(0..=3) {
        let edge = |rng: &mut ChaCha8Rng| EdgeSpec {
            net: *nets.choose(rng).unwrap(),
            edge: *[EdgeKind::Rise, EdgeKind::Fall, EdgeKind::Any].choose(rng).unwrap(),
        };
        let from = edge(rng);
        let to = match rng.random_range(0..4) {
            0 => from,
            1 => EdgeSpec { net: from.net, ..edge(rng) },
            _ => edge(rng),
        };
        let bounds = [bound(rng, delays), bound(rng, delays)];
        let (min, max) = match rng.random_range(0..3) {
            0 => (Some(bounds[0]), None),
            1 => (None, Some(bounds[0])),
            _ => (Some(bounds[0].min(bounds[1])), Some(bounds[0].max(bounds[1]))),
        };
        rules.timing.push(Timing { name: None, from, to, min, max, mark: Mark(0) });
    }
    for net in nets.sample(rng, rng.clone().random_range(0..=2)) {
        let bounds = [Some(bound(rng, delays)), Some(bound(rng, delays))];
        let [high, low] = *[bounds, [bounds[0], None], [None, bounds[0]]].choose(rng).unwrap();
        rules.min_pulse.push(MinPulse { net: *net, high, low, mark: Mark(0) });
    }
    for net in gates.sample(rng, rng.clone().random_range(0..=2)) {
        let shorter_than = if rng.random() { fs(0) } else { bound(rng, delays) };
        rules.glitch_free.push(GlitchFree { net: *net, shorter_than, mark: Mark(0) });
    }
    rules.settle_within = rng.random_bool(0.6).then(|| bound(rng, delays));
    rules.critical_race = *[Permission::Forbidden, Permission::Allowed].choose(rng).unwrap();
    let words = [Oscillation::Forbidden, Oscillation::Allowed, Oscillation::Required];
    rules.oscillation = *words.choose(rng).unwrap();
    rules.swallowed = match rng.random_range(0..3) {
        0 => Swallowed::Listed,
        1 => Swallowed::Forbidden,
        _ => {
            let mut at: Vec<NetId> = gates.sample(rng, 2).copied().collect();
            at.sort_unstable();
            Swallowed::At(at)
        }
    };
    rules.before_rest = *[Before::Allowed, Before::Forbidden].choose(rng).unwrap();
    scenario.outputs = gates.sample(rng, 2).copied().collect();
    let watched: BTreeSet<NetId> =
        scenario.outputs.iter().copied().chain(rules.glitch_free.iter().map(|rule| rule.net)).collect();
    scenario.watched = watched.into_iter().collect();
    for step in &mut Arc::make_mut(&mut scenario.stimulus).steps {
        if rng.random_bool(0.5) {
            let alternatives = (0..rng.random_range(1..=2)).map(|_| pattern(rng, &nets)).collect();
            step.expect = Some(Expectation { alternatives, mark: Mark(0) });
        }
        if rng.random_bool(0.4) {
            let mut at: Vec<NetId> = scenario.watched.sample(rng, 1).copied().collect();
            at.extend(gates.choose(rng));
            at.sort_unstable();
            at.dedup();
            for net in at {
                let least = rng.random_range(0..=2);
                step.edges.push(EdgeCount { net, least, most: least + rng.random_range(0..=1) });
            }
        }
        step.settle_within = rng.random_bool(0.2).then(|| bound(rng, delays));
        step.oscillation = rng.random_bool(0.3).then(|| *words.choose(rng).unwrap());
    }
    if rng.random_bool(0.1) {
        let compare = scenario.outputs.iter().map(|net| (*net, RefNet(*net))).collect();
        let circuit = (*scenario.circuit).clone();
        scenario.reference = Some(Arc::new(Reference { circuit, compare }));
    }
    scenario.rules = Arc::new(rules);
}

/// How often each thing was met: a comparison that never meets it proves nothing.
#[derive(Debug, Default)]
struct Met {
    runs: usize,
    judged: BTreeMap<&'static str, usize>,
    broken: BTreeMap<&'static str, usize>,
    not_judged: BTreeMap<&'static str, usize>,
    facts: BTreeMap<&'static str, usize>,
}

impl Met {
    fn count(&mut self, asked: &Asked, said: &Said) {
        self.runs += 1;
        for (question, answer) in &said.answers {
            let word = asked.questions[*question as usize].rule.word();
            match answer {
                Answer::Judged { broken, .. } => {
                    *self.judged.entry(word).or_default() += 1;
                    *self.broken.entry(word).or_default() += usize::from(*broken);
                }
                Answer::Not(reason) => *self.not_judged.entry(reason.words()).or_default() += 1,
            }
        }
        for subject in said.facts.keys() {
            *self.facts.entry(subject.kind.word()).or_default() += 1;
        }
    }
}

fn rules_in_words(scenario: &Scenario, asked: &Asked) -> String {
    let mut text = format!("outputs {:?} watched {:?}\n{:#?}", scenario.outputs, scenario.watched, scenario.rules);
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        text += &format!(
            "\nstep {}: expect {:?} edges {:?} settle_within {:?} oscillation {:?}",
            s + 1,
            step.expect.as_ref().map(|it| &it.alternatives),
            step.edges,
            step.settle_within,
            step.oscillation
        );
    }
    for (number, question) in asked.questions.iter().enumerate() {
        text += &format!("\nquestion {number}: {question:?}");
    }
    text
}

/// The first difference, in words.
fn difference(asked: &Asked, slow: &Said, fast: &Said) -> Option<String> {
    let mut all = BTreeSet::new();
    for (number, question) in asked.questions.iter().enumerate() {
        let number = number as u32;
        let (slow, fast) = (slow.answers.get(&number), fast.answers.get(&number));
        if slow != fast {
            all.insert(format!("{:?} question {number}: slow {slow:?}, fast {fast:?}", question.rule));
        }
    }
    let subjects: BTreeSet<_> = slow.facts.keys().chain(fast.facts.keys()).collect();
    for subject in subjects {
        let (slow, fast) = (slow.facts.get(subject), fast.facts.get(subject));
        if slow != fast {
            all.insert(format!("{subject:?}: slow {slow:?}, fast {fast:?}"));
        }
    }
    (!all.is_empty()).then(|| all.into_iter().collect::<Vec<_>>().join("\n"))
}

/// Compares several runs of one random scenario.
fn compare(case: &Case, rng: &mut ChaCha8Rng, delays: Lengths, met: &mut Met) {
    let mut scenario = case.scenario.clone();
    add_rules(&mut scenario, rng, delays);
    let asked = Asked::of(&scenario);
    let program = Program::with_rest(&scenario, &case.rest);
    let mut judge = Judge::new(&scenario, &asked, Heard::default());
    for sample in 0..3 {
        // one judge for all runs: nothing may stay behind from the run before
        judge.sink = Heard::default();
        let instance = Instance::of(&scenario, &Which::Sample(sample));
        program.machine().run(&instance, &Control::default(), &mut judge);
        let mut log = Log::new(scenario.circuit.net_count());
        program.machine().run(&instance, &Control::default(), &mut log);
        let slow = slow_judge::judge(&scenario, &asked, &log);
        if let Some(difference) = difference(&asked, &slow, &judge.sink.said) {
            panic!(
                "{}, sample {sample}:\n{difference}\n\n{}\n{}\n\n{:#?}\n{:?}",
                case.name,
                print(&scenario, &case.rest, &instance),
                rules_in_words(&scenario, &asked),
                log.recorder.record,
                log.batches
            );
        }
        met.count(&asked, &slow);
    }
}

fn agree(count: u64, kind: Worlds) -> Met {
    let mut met = Met::default();
    for (number, case) in cases(count, kind).enumerate() {
        let mut rng = ChaCha8Rng::seed_from_u64(2);
        rng.set_stream(number as u64);
        compare(&case, &mut rng, kind.delays, &mut met);
    }
    met
}

#[test]
fn from_rest() {
    let met = agree(3000, PLAIN);
    println!("{met:#?}");
}

#[test]
fn with_clocks() {
    let met = agree(1500, Worlds { clocks: true, delays: Lengths::Short, filters: Filters::Mixed, wires: 0.2, ..PLAIN });
    println!("{met:#?}");
}

#[test]
fn random_starts() {
    let met = agree(1500, Worlds { begin: Start::Random, clocks: true, ..PLAIN });
    println!("{met:#?}");
}

#[test]
fn unknown_starts() {
    let met = agree(1500, Worlds { begin: Start::Unknown, wires: 0.2, ..PLAIN });
    println!("{met:#?}");
}

#[test]
fn rings() {
    let kind = Worlds { begin: Start::Random, gates: (2, 4), limits: &[150, 5000], rings: true, ..PLAIN };
    let met = agree(500, Worlds { clocks: true, ..kind });
    println!("{met:#?}");
}
