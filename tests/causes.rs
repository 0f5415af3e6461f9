//! Why a finding happens: what must leave typical is the least, and what is said to decide does.

use std::collections::BTreeSet;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Kind, Subject};
use stillgate::instance::{Instance, Quantities, Target, Which};
use stillgate::output::bundle;
use stillgate::output::text::Page;
use stillgate::reader::read_instance;
use stillgate::review::{self, Away, Needs, Review, Untold, Why, run_one};
use stillgate::scenario::Scenario;
use stillgate::sweep::SweepReport;
use stillgate::time::Span;

use crate::support::random_rules::add_rules;
use crate::support::random_worlds::{Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::world::fs;

/// A scenario with everything that a run of it needs.
struct Block {
    scenario: Scenario,
    program: Program,
    asked: Asked,
}

impl Block {
    fn of(scenario: Scenario) -> Block {
        let program = Program::new(&scenario, &Control::default()).unwrap();
        Block { asked: Asked::of(&scenario), scenario, program }
    }

    fn read(text: &str, samples: u64) -> Block {
        let read = stillgate::reader::read(text, "block.toml").unwrap_or_else(|it| panic!("{}", it.render(false)));
        let mut scenario = read.scenario;
        scenario.plan.samples = samples;
        Block::of(scenario)
    }

    fn demonstration(name: &str, samples: u64) -> Block {
        let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
        Block::read(&std::fs::read_to_string(path).unwrap(), samples)
    }

    fn review(&self, threads: usize) -> Review {
        review::review(&self.scenario, &self.program, threads, &Control::default()).unwrap()
    }

    /// Does a case show a finding? A race: is there a window from rest to rest whose end is not the commonest of several?
    fn shows(&self, case: &Instance, subject: &Subject, sweep: &SweepReport) -> bool {
        let which = Which::Given(Box::new(case.clone()));
        let run = run_one(&self.scenario, &self.program, &self.asked, which, &Control::default()).unwrap();
        if subject.kind != Kind::CriticalRace {
            return run.facts.iter().any(|fact| fact.subject == *subject);
        }
        let forks = &sweep.windows[subject.moment.unwrap() as usize].forks;
        let mut before = &run.trace.start;
        run.trace.windows.iter().any(|window| {
            let from = std::mem::replace(&mut before, &window.state);
            let fork = forks.iter().find(|fork| fork.before == *from);
            let here = Some(window.moment) == subject.moment && window.began_at_rest && window.end == End::Settled;
            here && !window.state.has_unknown() && fork.is_some_and(|fork| fork.commonest != window.state)
        })
    }

    /// Runs that show that nothing of it can be spared, and nothing moved by 1 fs. How many values it checked.
    fn is_minimal(&self, needs: &Needs, subject: &Subject, sweep: &SweepReport, of: &str) -> usize {
        let of = format!("{of}: {subject:?} {:?}", needs.away);
        assert!(self.shows(&needs.case, subject, sweep), "{of}: the case does not show it");
        let typical = Instance::of(&self.scenario, &Which::Typ);
        // nothing else is away from typical
        let named: BTreeSet<Target> = needs.away.iter().map(|it| it.quantity.target).collect();
        for quantity in Quantities::of(&self.scenario).iter() {
            let away = needs.case.get(quantity) != typical.get(quantity);
            assert_eq!(away, named.contains(&quantity.target), "{of}: {quantity:?}");
        }
        for Away { quantity, typical, value } in &needs.away {
            assert_eq!(needs.case.get(quantity), *value, "{of}");
            if !needs.minimal {
                continue;
            }
            let mut put_back = (*needs.case).clone();
            put_back.set(quantity, *typical);
            assert!(!self.shows(&put_back, subject, sweep), "{of}: {quantity:?} can be spared");
            let (min, max) = (quantity.range.min, quantity.range.max);
            let nearer = Span::from_fs(if value < typical { value.fs() + 1 } else { value.fs() - 1 });
            if (min..=max).contains(&nearer) {
                put_back.set(quantity, nearer);
                assert!(!self.shows(&put_back, subject, sweep), "{of}: {quantity:?} may be nearer");
            }
        }
        needs.away.len()
    }
}

/// Findings with their causes.
fn causes(review: &Review) -> impl Iterator<Item = (&Subject, &Why)> {
    let each = review.sweep.findings.iter().zip(&review.why);
    each.filter_map(|(finding, why)| Some((&finding.subject, why.as_ref().filter(|why| why.pull.is_some())?)))
}

#[test]
fn of_every_demonstration_nothing_can_be_spared() {
    let table = [
        ("interlock", 400),
        ("selector", 300),
        ("contactors", 2000),
        ("clock-switch", 60),
        ("sequencer", 300),
        ("permit", 1000),
        ("stepper", 300),
        ("push-button", 40),
    ];
    for (name, samples) in table {
        let block = Block::demonstration(name, samples);
        let review = block.review(1);
        let mut values = 0;
        let mut looked_into = 0;
        for (subject, why) in causes(&review) {
            let needs = why.needs.as_ref().expect("a sample shows it");
            assert!(needs.minimal && needs.runs <= 2000, "{name}: {subject:?} {:?}", needs.cut);
            values += block.is_minimal(needs, subject, &review.sweep, name);
            looked_into += 1;
        }
        let broken = review.sweep.findings.iter().filter(|it| it.breaks_rule).count();
        assert_eq!(looked_into, broken.min(review::LOOKED_INTO), "{name}");
        // a hazard that every draw shows needs nothing, and a bounce nothing but itself
        assert_eq!(values == 0, ["selector", "push-button"].contains(&name), "{name}");
    }
}

/// By hand, with 8 ns a gate: `full` rises at 16 ns and `up_a` at 24 ns, until the inverter (d) ends it 8 ns after d. `fill`
/// follows with a pulse of d - 16 ns, which goes around with `up_b` in 16 ns: it stays if the gap of 32 ns - d is shorter than
/// a gate. So d must be longer than three gates, as the first comment of the demonstration says.
#[test]
fn the_essential_hazard_takes_an_inverter_slower_than_three_gates() {
    let block = Block::demonstration("sequencer", 300);
    let review = block.review(1);
    let (_, why) = causes(&review).find(|(subject, _)| subject.kind == Kind::Expect).expect("the wrong state");
    let [away] = why.needs.as_ref().unwrap().away[..] else { panic!("{:?}", why.needs) };
    let gate = block.scenario.circuit.net("float_not").unwrap().0 - block.scenario.circuit.input_count() as u32;
    assert_eq!((away.quantity.target, away.value), (Target::GateBoth(gate), Span::from_fs(24_000_001)));
    assert_eq!(
        why.pull.as_ref().unwrap().told.iter().map(|it| it.quantity.target).collect::<Vec<_>>(),
        [away.quantity.target]
    );
}

/// Two ways from one input to an AND: `slow` falls as `quick` rises. The AND takes 2 ns and passes a pulse of 2 ns or more.
fn two_ways(quick: &str, slow: &str, more: &str) -> String {
    format!(
        r#"
        outputs = ["pulse"]
        [inputs]
        go = 0
        [gates]
        quick = {{ buf = ["go"], delay = {quick} }}
        slow = {{ not = ["go"], delay = {slow} }}
        pulse = {{ and = ["quick", "slow"], delay = 2 }}
        {more}
        [[steps]]
        at = 100
        set = {{ go = 1 }}
        "#
    )
}

fn glitch(review: &Review) -> &Why {
    let mut all = causes(review).filter(|(subject, _)| subject.kind == Kind::Glitch);
    let (_, why) = all.next().expect("a glitch");
    assert_eq!(all.count(), 0);
    why
}

/// By hand: the pulse at the AND is slow - quick long, and passes from 2 ns on.
#[test]
fn two_ways_race_to_the_very_femtosecond() {
    // one is exact: the other must be 22 ns, or 18 ns
    for (quick, slow, value) in [("20", "[10, 15, 30]", 22_000_000), ("[10, 21, 30]", "20", 18_000_000)] {
        let block = Block::read(&two_ways(quick, slow, ""), 300);
        let review = block.review(1);
        let needs = glitch(&review).needs.as_ref().unwrap();
        let [away] = needs.away[..] else { panic!("{:?}", needs.away) };
        assert_eq!((away.value, needs.minimal, needs.cut), (Span::from_fs(value), true, None));
        assert!(!needs.typical_shows_it());
        let place = if slow == "20" { -3.0 / 11.0 } else { 7.0 / 15.0 };
        assert!((away.place() - place).abs() < 1e-9, "{}", away.place());
    }
    // either can do it alone: one is enough, the one that is less far out (7/15 of its way, not 7/10)
    let block = Block::read(&two_ways("[10, 20, 30]", "[10, 15, 30]", ""), 3000);
    let review = block.review(1);
    let needs = glitch(&review).needs.as_ref().unwrap();
    let [away] = needs.away[..] else { panic!("{:?}", needs.away) };
    // behind one input
    let gate = |name: &str| block.scenario.circuit.net(name).unwrap().0 - 1;
    assert_eq!((away.quantity.target, away.value), (Target::GateBoth(gate("slow")), Span::from_fs(22_000_000)));
    // neither can alone: both, and between them 2 ns to 1 fs
    let block = Block::read(&two_ways("[14, 20, 30]", "[10, 15, 19]", ""), 3000);
    let review = block.review(1);
    let needs = glitch(&review).needs.as_ref().unwrap();
    let delay = |name: &str| needs.case.delays.gate[gate(name) as usize][1].fs();
    assert_eq!((needs.away.len(), delay("slow") - delay("quick")), (2, 2_000_000), "{:?}", needs.away);
    // by one share of both ways, 7 of 10 ns: none stays far out for the other's sake
    assert!(needs.away.iter().all(|it| (it.place().abs() - 0.7).abs() < 0.001), "{:?}", needs.away);
    // typical delays do it
    let block = Block::read(&two_ways("[10, 15, 20]", "[10, 18, 20]", ""), 300);
    let review = block.review(1);
    let needs = glitch(&review).needs.as_ref().unwrap();
    assert!(needs.typical_shows_it() && needs.minimal && needs.away.is_empty());
}

#[test]
fn of_many_delays_those_two_are_named_that_decide() {
    let others: String = (0..20).map(|i| format!("g{i} = {{ buf = [\"go\"], delay = [5, 9, 30] }}\n")).collect();
    for draw in ["uniform", "normal", "hypercube", "corners"] {
        let text = two_ways("[10, 20, 30]", "[10, 15, 30]", &others) + &format!("[sweep]\ndraw = \"{draw}\"\n");
        let block = Block::read(&text, 1500);
        let review = block.review(1);
        let pull = glitch(&review).pull.as_ref().unwrap();
        let names: Vec<(&str, bool)> = pull
            .told
            .iter()
            .map(|it| {
                let Target::GateBoth(gate) = it.quantity.target else { panic!("{it:?}") };
                let net = block.scenario.circuit.net_of(stillgate::circuit::GateId(gate));
                (block.scenario.circuit.name(net), it.strength > 0.0)
            })
            .collect();
        let set: BTreeSet<_> = names.iter().copied().collect();
        assert_eq!(set, BTreeSet::from([("quick", false), ("slow", true)]), "{draw}: {pull:?}");
        assert!(pull.untold.is_none() && pull.more == 0, "{pull:?}");
        assert!(pull.told.iter().all(|it| (0.1..=1.0).contains(&it.strength.abs())), "{pull:?}");
        assert!(pull.told.is_sorted_by(|a, b| a.strength.abs() >= b.strength.abs()), "{pull:?}");
    }
    // too few to say anything
    let block = Block::read(&two_ways("[10, 20, 30]", "[10, 15, 30]", &others), 12);
    let pull = glitch(&block.review(1)).pull.clone().unwrap();
    assert!(matches!(pull.untold, Some(Untold::FewFail | Untold::FewPass)) && pull.told.is_empty(), "{pull:?}");
}

/// Delays that differ from firing to firing stay as they were drawn, and that is said.
#[test]
fn firings_stay_as_they_were() {
    let text = two_ways("[10, 20, 30]", "[10, 15, 30]", "") + "[sweep]\nvary = \"per-event\"\n";
    let block = Block::read(&text, 500);
    let review = block.review(1);
    let needs = glitch(&review).needs.as_ref().unwrap();
    assert!(needs.typical_shows_it() && needs.kept.firings && !needs.kept.exact, "{needs:?}");
    let (subject, _) = causes(&review).next().unwrap();
    block.is_minimal(needs, subject, &review.sweep, "firings");
    let bundle = bundle::of_review(&block.scenario, &review, &Page::default());
    let file = bundle.files.iter().find(|file| file.name.starts_with("case-glitch")).expect("a case");
    let read = read_instance(std::str::from_utf8(&file.bytes).unwrap(), "case", &block.scenario).unwrap();
    assert_eq!(read, *needs.case);
    let page = stillgate::output::text::review(&block.scenario, &review, &Default::default());
    assert!(page.contains("It takes delays of firings as in the failing case, else typical"), "{page}");
}

/// A gate that keeps what it wakes with: no delay has anything to do with it.
#[test]
fn a_toss_of_start_bits_is_decided_by_no_delay() {
    let others: String = (0..20).map(|i| format!("g{i} = {{ buf = [\"set\"], delay = [5, 9, 30] }}\n")).collect();
    let text = format!(
        "begin = \"random\"\n[inputs]\nset = 0\n[gates]\nkept = {{ or = [\"set\", \"kept\"], delay = [5, 9, 30] }}\n{others}\
        [[steps]]\nat = 500\nset = {{ set = 1 }}\n[[rules.never_at_rest]]\nstate = {{ kept = 1, set = 0 }}\n"
    );
    let mut kept = BTreeSet::new();
    for seed in 0..4 {
        let mut block = Block::read(&text, 1000);
        block.scenario.plan.seed = seed;
        let review = block.review(1);
        let mut all = causes(&review).filter(|(subject, _)| subject.kind == Kind::NeverAtRest);
        let (subject, why) = all.next().expect("half of the draws rest there");
        let needs = why.needs.as_ref().unwrap();
        block.is_minimal(needs, subject, &review.sweep, "toss");
        assert!(needs.typical_shows_it(), "{:?}", needs.away);
        kept.insert(needs.kept.start);
        let pull = why.pull.as_ref().unwrap();
        assert!(pull.told.is_empty() && pull.untold.is_none() && pull.samples.0 > 100, "{pull:?}");
    }
    assert!(kept.contains(&true), "start bits other than those of the typical run are said");
}

/// What is drawn once a board is compared between boards, what each try draws between tries.
#[test]
fn boards_and_tries_decide_for_themselves() {
    let text = r#"
        outputs = ["late"]
        [inputs]
        a = 0
        b = 0
        [gates]
        x = { buf = ["a"], delay = [1, 5, 9] }
        late = { and = ["x", "b"], delay = [1, 2, 3] }
        [[steps]]
        at = 100
        set = { a = 1, b = 1 }
        skew = [0, 20]
        [rules]
        settle_within = 2
        [sweep]
        tries = 10
        "#;
    let block = Block::read(text, 4000);
    let review = block.review(1);
    let (subject, why) = causes(&review).find(|(subject, _)| subject.kind == Kind::SettleWithin).expect("late");
    block.is_minimal(why.needs.as_ref().unwrap(), subject, &review.sweep, "boards");
    let skew = |target: Target| matches!(target, Target::Skew { .. });
    assert!(why.pull.as_ref().unwrap().told.iter().any(|it| skew(it.quantity.target)), "{:?}", why.pull);
    for pull in &why.pull.as_ref().unwrap().told {
        let most = if skew(pull.quantity.target) { 256 } else { 400 };
        assert!(pull.failing <= most && pull.passing <= 1024, "{pull:?}");
    }
}

#[test]
fn any_number_of_threads_says_the_same() {
    for (name, samples) in [("interlock", 300), ("contactors", 1000), ("power-up", 100)] {
        let block = Block::demonstration(name, samples);
        let [one, two] = [1, 2].map(|threads| block.review(threads));
        assert_eq!(format!("{:?}", one.why), format!("{:?}", two.why), "{name}");
        assert_eq!(
            bundle::of_review(&block.scenario, &one, &Page::default()),
            bundle::of_review(&block.scenario, &two, &Page::default()),
            "{name}"
        );
    }
}

#[test]
fn no_world_is_too_odd() {
    let kind = Worlds { delays: Lengths::Short, ..PLAIN };
    let kinds = [
        kind,
        Worlds { hazards: true, gates: (0, 4), ..kind },
        Worlds { clocks: true, delays: Lengths::Ties, ..kind },
        Worlds { begin: Start::Random, gates: (2, 5), ..kind },
        Worlds { begin: Start::Unknown, delays: Lengths::Ties, ..kind },
        Worlds { delays: Lengths::Wide, gates: (3, 6), ..PLAIN },
    ];
    let (mut checked, mut typical, mut races, mut skews) = (0, 0, 0, 0);
    for (batch, kind) in kinds.into_iter().enumerate() {
        for (number, case) in cases(40, kind).enumerate() {
            let mut rng = ChaCha8Rng::seed_from_u64(7);
            rng.set_stream((batch * 1000 + number) as u64);
            let mut scenario = case.scenario;
            add_rules(&mut scenario, &mut rng, kind.delays);
            let delays = std::sync::Arc::make_mut(&mut scenario.delays);
            for delay in delays.gate.iter_mut().flatten() {
                *delay = DelayRange::between(delay.min, delay.min + fs(rng.random_range(0..=2 * delay.max.fs())));
            }
            scenario.plan.samples = 40;
            scenario.plan.tries = rng.random_range(1..=3);
            let program = Program::with_rest(&scenario, &case.rest);
            let block = Block { asked: Asked::of(&scenario), scenario, program };
            let control = Control::default();
            let sweep = review::sweep(&block.scenario, &block.program, &block.asked, 1, &control).unwrap();
            let why = review::causes(&block.scenario, &block.program, &block.asked, &sweep, 1, &control).unwrap();
            assert_eq!(why.len(), sweep.findings.len());
            for (finding, why) in sweep.findings.iter().zip(&why) {
                assert!(why.is_none() || finding.breaks_rule);
                let Some(needs) = why.as_ref().and_then(|why| why.needs.as_ref()) else { continue };
                checked += block.is_minimal(needs, &finding.subject, &sweep, &case.name);
                typical += usize::from(needs.typical_shows_it());
                races += usize::from(finding.subject.kind == Kind::CriticalRace);
                skews += needs.away.iter().filter(|it| matches!(it.quantity.target, Target::Skew { .. })).count();
            }
        }
    }
    assert!(checked > 300 && typical > 100 && races > 10 && skews > 10, "{checked} {typical} {races} {skews}");
}

/// A caller that has enough gets what there is.
#[test]
fn an_interrupted_review_says_so() {
    let block = Block::demonstration("selector", 200);
    let control = Control::default();
    let sweep = review::sweep(&block.scenario, &block.program, &block.asked, 1, &control).unwrap();
    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    let why = review::causes(&block.scenario, &block.program, &block.asked, &sweep, 1, &control).unwrap();
    assert!(why.iter().all(Option::is_none));
}

/// Progress goes on behind the samples of the sweep and never back.
#[test]
fn progress_goes_up() {
    let block = Block::demonstration("sequencer", 300);
    let sweep = review::sweep(&block.scenario, &block.program, &block.asked, 1, &Control::default()).unwrap();
    let heard = std::sync::Arc::new(std::sync::Mutex::new(Vec::new()));
    let (ears, control) = (heard.clone(), Control::default());
    let hear = move |done, total| ears.lock().unwrap().push((done, total));
    let control = Control { progress: Some(std::sync::Arc::new(hear)), ..control };
    let why = review::causes(&block.scenario, &block.program, &block.asked, &sweep, 1, &control).unwrap();
    let told = why.iter().flatten().count() as u64;
    let heard = heard.lock().unwrap();
    let expected: Vec<(u64, u64)> = (1..=told).map(|done| (300 + done, 300 + told)).collect();
    assert!(told > 1 && *heard == expected, "{heard:?}");
}

#[test]
fn every_file_tells_it_and_the_case_replays() {
    let folder = tempfile::tempdir().unwrap();
    let scenario = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/permit.toml");
    let run = |arguments: &[&str]| {
        let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_stillgate"));
        let output = command.current_dir(folder.path()).args(arguments).output().unwrap();
        assert!(output.status.success(), "{output:?}");
        String::from_utf8(output.stdout).unwrap()
    };
    let json = |text: &str| serde_json::from_str::<serde_json::Value>(text).unwrap();
    let path = scenario.to_string_lossy();
    let text = run(&["review", &path, "--samples", "1000"]);
    assert!(text.contains("It takes ") && text.contains("; else typical"), "{text}");
    // the line of the text as it stands
    let line = text.lines().find(|line| line.contains("case-not-in-reference")).expect("a line to replay");
    let words: Vec<&str> = line.split_whitespace().skip(1).collect();
    let replay = json(&run(&[&words[..], &["--json"]].concat()));
    let facts = replay["facts"].as_array().unwrap();
    assert!(facts.iter().any(|it| it["kind"] == "not-in-reference" && it["step"] == "key let go"), "{replay}");

    let out = folder.path().join("stillgate-out/permit");
    let result = json(&std::fs::read_to_string(out.join("result.json")).unwrap());
    let finding = &result["sweep"]["findings"][0];
    let needs = &finding["needs"];
    assert_eq!((&needs["typical_shows_it"], &needs["minimal"]), (&false.into(), &true.into()), "{needs}");
    assert_eq!(needs["cut"], serde_json::Value::Null);
    let away = needs["away"].as_array().unwrap();
    assert!(!away.is_empty() && away.iter().all(|it| it["place"].as_f64().unwrap().abs() <= 1.0), "{needs}");
    assert!(line.ends_with(needs["case"].as_str().unwrap()), "{needs} {line}");
    let read = stillgate::reader::load(&scenario).unwrap().scenario;
    let case = std::fs::read_to_string(out.join(needs["case"].as_str().unwrap())).unwrap();
    read_instance(&case, "case", &read).unwrap();

    let table = std::fs::read_to_string(out.join("causes.csv")).unwrap();
    let mut rows = csv::Reader::from_reader(table.as_bytes());
    let head = rows.headers().unwrap().clone();
    let column = |name: &str| head.iter().position(|it| it == name).unwrap();
    let rows: Vec<csv::StringRecord> = rows.records().map(|row| row.unwrap()).collect();
    for it in away {
        let row = rows.iter().find(|row| row[column("quantity")] == *it["what"].as_str().unwrap()).expect("a row");
        for (name, key) in [("value [ns]", "value"), ("min [ns]", "min"), ("typ [ns]", "typ"), ("max [ns]", "max")] {
            assert_eq!(row[column(name)], it[key].to_string(), "{name}");
        }
        assert_eq!(row[column("case")], *needs["case"].as_str().unwrap());
    }
    for it in finding["pull"].as_array().unwrap() {
        let row = rows.iter().find(|row| row[column("quantity")] == *it["what"].as_str().unwrap()).expect("a row");
        assert_eq!(row[column("strength")], it["strength"].to_string());
    }
}
