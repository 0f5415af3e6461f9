//! The judges say of every run what the slow judge says of its complete record, on thousands of random small scenarios
//! with random rules.

use std::collections::{BTreeMap, BTreeSet, HashMap};

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Judge};
use stillgate::instance::{Instance, Which};
use stillgate::logic::{State, Value};
use stillgate::scenario::Scenario;

use crate::engine_agrees::print;
use crate::support::heard::Heard;
use crate::support::random_rules::add_rules;
use crate::support::random_worlds::{Case, Filters, Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::slow_judge::{self, Answer, Found, Log, Said};

/// The rules that one run alone can break.
const RULES: [&str; 12] = [
    "never",
    "never_at_rest",
    "expect",
    "reference",
    "oscillation",
    "glitch_free",
    "edges",
    "timing",
    "min_pulse",
    "settle_within",
    "swallowed",
    "before_rest",
];

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
    let mut text = format!("outputs {:?} watched {:?}\n{:?}", scenario.outputs, scenario.watched, scenario.rules);
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        let expect = step.expect.as_ref().map(|it| &it.alternatives);
        let (within, oscillation) = (step.settle_within, step.oscillation);
        text += &format!("\nstep {}: expect {expect:?} edges {:?} {within:?} {oscillation:?}", s + 1, step.edges);
    }
    for (number, question) in asked.questions.iter().enumerate() {
        let moment = question.moment.map(|moment| &scenario.stimulus.moments[moment as usize].label);
        let (rule, net, bound) = (question.rule, question.net, question.bound);
        let pattern = question.pattern.as_ref().map(|it| it.words(&scenario.circuit));
        text += &format!("\nquestion {number}: {rule:?} {} {net:?} {pattern:?} {moment:?} {bound:?}", question.index);
    }
    text
}

/// Is the same found? Of several that are equally bad the judges may tell any one.
fn same(slow: Option<&Found>, fast: Option<&Found>) -> bool {
    match (slow, fast) {
        (Some(slow), Some(fast)) => {
            slow.breaks_rule == fast.breaks_rule
                && slow.worst.is_empty() == fast.worst.is_empty()
                && fast.worst.iter().all(|it| slow.worst.contains(it))
        }
        _ => slow.is_none() && fast.is_none(),
    }
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
        if !same(slow, fast) {
            all.insert(format!("{subject:?}: slow {slow:?}, fast {fast:?}"));
        }
    }
    (!all.is_empty()).then(|| all.into_iter().collect::<Vec<_>>().join("\n"))
}

/// What is told of windows is what the record holds.
fn windows_agree(scenario: &Scenario, log: &Log, heard: &Heard, orders: &mut Orders, of: &str) {
    let record = &log.recorder.record;
    let reached: Vec<(u32, bool)> = record
        .windows
        .iter()
        .flat_map(|window| window.opening.moments.iter().map(|moment| (*moment, *moment == window.moment)))
        .collect();
    assert_eq!(heard.reached, reached, "{of}: moments");
    assert_eq!(heard.windows.len(), record.windows.len(), "{of}");
    let values = |state: &State| scenario.circuit.nets().map(|net| state.get(net.index())).collect::<Vec<_>>();
    for (number, (heard, window)) in heard.windows.iter().zip(&record.windows).enumerate() {
        let of = format!("{of}, window {number}: {heard:?} of {window:?}");
        assert_eq!((heard.moment, heard.end), (window.moment, window.end), "{of}");
        assert_eq!(heard.began_at_rest, window.began_at_rest, "{of}");
        assert_eq!(values(&heard.state), window.state, "{of}");
        let known = window.began_at_rest && !window.opening.state.contains(&Value::X);
        let before = known.then(|| window.opening.state.clone());
        assert_eq!(heard.before.as_ref().map(values), before, "{of}");
        match window.end {
            End::Settled => assert_eq!(Some(heard.time), window.settling, "{of}"),
            End::Cut => assert_eq!(heard.time, window.stop.saturating_sub(window.settle_from), "{of}"),
            _ => {}
        }
        let order = slow_judge::order(scenario, log, number);
        let known = orders.by_hash.entry(heard.order).or_insert_with(|| order.clone());
        assert_eq!(*known, order, "{of}: two orders of one hash");
        let known = *orders.hash_of.entry(order).or_insert(heard.order);
        assert_eq!(known, heard.order, "{of}: two hashes of one order");
    }
}

/// Orders in which loop nets changed, and their hashes.
#[derive(Default)]
struct Orders {
    by_hash: HashMap<u64, Vec<BTreeSet<NetId>>>,
    hash_of: HashMap<Vec<BTreeSet<NetId>>, u64>,
}

/// Compares several runs of one random scenario.
fn compare(case: &Case, rng: &mut ChaCha8Rng, delays: Lengths, met: &mut Met) {
    let mut scenario = case.scenario.clone();
    add_rules(&mut scenario, rng, delays);
    let asked = Asked::of(&scenario);
    let program = Program::with_rest(&scenario, &case.rest);
    let mut judge = Judge::new(&scenario, &asked, Heard::default());
    let mut orders = Orders::default();
    for sample in 0..3 {
        // one judge for all runs: nothing may stay behind from the run before
        judge.sink = Heard::default();
        let instance = Instance::of(&scenario, &Which::Sample(sample));
        program.machine().run(&instance, &Control::default(), &mut judge);
        let mut log = Log::new(scenario.circuit.net_count());
        program.machine().run(&instance, &Control::default(), &mut log);
        let of = format!("{} sample {sample}", case.name);
        windows_agree(&scenario, &log, &judge.sink, &mut orders, &of);
        let slow = slow_judge::judge(&scenario, &asked, &log);
        if let Some(difference) = difference(&asked, &slow, &judge.sink.said) {
            panic!(
                "{of}:\n{difference}\n\n{}\n{}\n\n{}",
                print(&scenario, &case.rest, &instance),
                rules_in_words(&scenario, &asked),
                log.in_words()
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
    let met = agree(10_000, PLAIN);
    for rule in RULES {
        assert!(met.judged[rule] > 500 && met.broken[rule] > 20, "{rule} in {met:#?}");
    }
    let met = agree(1500, Worlds { delays: Lengths::Wide, gates: (3, 7), ..PLAIN });
    assert!(met.broken["settle_within"] > 500 && met.broken["timing"] > 500, "{met:#?}");
}

#[test]
fn rows_of_pulses() {
    let kind = Worlds { hazards: true, gates: (0, 3), filters: Filters::Transport, ..PLAIN };
    let met = agree(5000, kind);
    assert!(met.broken["glitch_free"] > 500 && met.facts["glitch"] > 1000, "{met:#?}");
    let met = agree(3000, Worlds { delays: Lengths::Short, ..kind });
    assert!(met.broken["glitch_free"] > 200 && met.broken["min_pulse"] > 200, "{met:#?}");
    let met = agree(3000, Worlds { begin: Start::Unknown, filters: Filters::Inertial, ..kind });
    assert!(met.broken["glitch_free"] > 50 && met.not_judged["unresolved"] > 500, "{met:#?}");
}

#[test]
fn wires_filters_and_clocks() {
    let kind = Worlds { delays: Lengths::Short, filters: Filters::Mixed, wires: 0.2, ..PLAIN };
    let met = agree(4000, Worlds { clocks: true, ..kind });
    assert!(met.broken["min_pulse"] > 500 && met.not_judged["cut"] > 1000, "{met:#?}");
    let met = agree(2000, Worlds { delays: Lengths::Ties, hazards: true, clocks: true, gates: (1, 4), ..kind });
    assert!(met.broken["glitch_free"] > 50 && met.facts["glitch"] > 200, "{met:#?}");
}

#[test]
fn hands_and_partners() {
    let kind = Worlds { hands: 0.35, steps: (3, 8), ..PLAIN };
    let met = agree(2500, kind);
    assert!(met.broken["when"] > 300 && met.judged["when"] > 1000 && met.not_judged["not reached"] > 1000, "{met:#?}");
    let met = agree(1000, Worlds { filters: Filters::All, delays: Lengths::Short, clocks: true, ..kind });
    assert!(met.broken["when"] > 50 && met.judged["when"] > 200, "{met:#?}");
}

#[test]
fn random_starts() {
    let met = agree(4000, Worlds { begin: Start::Random, clocks: true, ..PLAIN });
    for rule in RULES {
        assert!(met.judged[rule] > 200, "{rule} in {met:#?}");
    }
    assert!(met.not_judged["oscillating"] > 20 && met.not_judged["unsettled"] > 100, "{met:#?}");
}

#[test]
fn unknown_starts() {
    let kind = Worlds { begin: Start::Unknown, wires: 0.2, ..PLAIN };
    let met = agree(5000, kind);
    assert!(met.not_judged["unresolved"] > 1000 && met.facts["unresolved"] > 500, "{met:#?}");
    let met = agree(1500, Worlds { clocks: true, delays: Lengths::Short, ..kind });
    assert!(met.not_judged["unresolved"] > 500 && met.judged["min_pulse"] > 100, "{met:#?}");
}

#[test]
fn rings() {
    let kind = Worlds { begin: Start::Random, gates: (2, 4), limits: &[150, 5000], rings: true, ..PLAIN };
    let met = agree(800, Worlds { clocks: true, ..kind });
    assert!(met.facts["oscillation"] > 100 && met.not_judged["oscillating"] > 50, "{met:#?}");
    let met = agree(600, Worlds { delays: Lengths::Short, ..kind });
    assert!(met.broken["oscillation"] > 50, "{met:#?}");
}
