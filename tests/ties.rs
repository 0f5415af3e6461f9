//! Exactly equal times: what they hide and what they make is found by moving every time by single femtoseconds, and each
//! such case can be replayed.

use std::process::{Command, Output};
use std::sync::atomic::Ordering;

use stillgate::control::Control;
use stillgate::delay::{Filter, is_causal};
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind};
use stillgate::instance::{Instance, PERTURBATIONS, Unmovable, Which};
use stillgate::output::instance::write_instance;
use stillgate::output::text::{self, Page};
use stillgate::reader::{self, read_instance};
use stillgate::review::{self, Call, Review, run_one};
use stillgate::scenario::{Begin, Place, Scenario};
use stillgate::sweep::{Finding, Tie};

use crate::support::random_worlds::{self as worlds, Filters, Lengths, Start};
use crate::support::world::{World, exact, fs, run};

fn reviewed(text: &str) -> (Scenario, Review) {
    let scenario = reader::read(text, "test.toml").unwrap_or_else(|faults| panic!("{faults}\n{text}")).scenario;
    let program = Program::new(&scenario, &Control::default()).expect("a state to begin in");
    let review = review::review(&scenario, &program, 1, &Control::default()).unwrap_or_else(|error| panic!("{error}"));
    (scenario, review)
}

fn find(review: &Review, kind: Kind) -> Option<&Finding> {
    review.sweep.findings.iter().find(|finding| finding.subject.kind == kind)
}

/// An AND that passes every pulse; at 100 ns one input comes and the other goes.
const CROSSING: &str = r#"
    [inputs]
    a = 0
    b = 1
    [gates]
    out = { and = ["a", "b"], delay = 5, filter = "transport" }
    [[steps]]
    label = "crossing"
    at = 100
    set = { a = 1, b = 0 }
    [sweep]
    samples = 20
"#;

#[test]
fn a_pulse_that_only_equality_hides_appears_and_is_replayed() {
    let (scenario, review) = reviewed(CROSSING);
    let finding = find(&review, Kind::Glitch).expect("it appears");
    assert_eq!((finding.tie, finding.count, finding.of), (Some(Tie::Appears), 0, 20), "{finding:?}");
    assert_eq!((finding.sample, finding.worst_sample, finding.share), (None, None, None));
    assert_eq!((finding.subject.net, finding.subject.moment), (scenario.circuit.net("out"), Some(0)));
    assert!(finding.breaks_rule);
    assert_eq!(review.verdict.call, Call::Broken);
    let words =
        "static-0 glitch at out after \"crossing\" in no draw, only when times are moved by single femtoseconds";
    assert!(review.verdict.sentence.contains(words), "{}", review.verdict.sentence);
    // the review draws the failing case
    let (_, shown) = &review.shown[0];
    let case = finding.case.as_deref().unwrap();
    assert_eq!(&shown.which, case);
    let page = text::review(&scenario, &review, &Page::default());
    assert!(page.contains(&format!("--delays {}", case.key())), "{page}");

    // the glitch is there in the replay, as wide as the inputs are apart, and not without the perturbation
    let Which::Perturbed(base, number) = case else { panic!("{case:?}") };
    assert_eq!(**base, Which::Typ);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let alone = |which| run_one(&scenario, &program, &review.asked, which, &Control::default()).unwrap();
    let facts = |which: Which| alone(which).facts.iter().map(|fact| fact.subject).collect::<Vec<_>>();
    assert!(facts(case.clone()).contains(&finding.subject) && facts(Which::Typ).is_empty());
    // moved the other way round the inputs come in the other order, and there is no pulse
    let other = (number + 3) % 8 + 1;
    assert!(facts(Which::Perturbed(base.clone(), other)).is_empty());

    // the file of the case is enough
    let file = write_instance(&shown.instance, &scenario);
    let read = read_instance(&file, "case", &scenario).unwrap_or_else(|faults| panic!("{faults}\n{file}"));
    assert_eq!(facts(Which::Given(Box::new(read))), [finding.subject]);

    // an inertial gate swallows such a pulse, whatever the order
    let (_, inertial) = reviewed(&CROSSING.replace(", filter = \"transport\"", ""));
    assert_eq!((inertial.verdict.call, find(&inertial, Kind::Glitch).is_none()), (Call::Proved, true));
}

#[test]
fn what_both_runs_show_is_no_tie() {
    // the mux without its third term, all of it longer than any femtosecond
    let (_, review) = reviewed(
        r#"
        [inputs]
        s = 1
        a = 1
        b = 1
        [gates]
        not_s = { not = ["s"], delay = [5, 9] }
        upper = { and = ["a", "s"], delay = [1, 2] }
        lower = { and = ["b", "not_s"], delay = [1, 2] }
        out = { or = ["upper", "lower"], delay = [1, 2] }
        [[steps]]
        at = 100
        set = { s = 0 }
        [sweep]
        samples = 200
        "#,
    );
    let finding = find(&review, Kind::Glitch).unwrap();
    assert_eq!((finding.count, finding.tie, &finding.case), (200, None, &None));
    assert!(review.sweep.findings.iter().all(|it| it.tie.is_none() && it.count > 0), "{:?}", review.sweep.findings);
    assert!(review.sweep.ties.done && review.sweep.ties.unmoved.is_none() && review.sweep.ties.left_out == 0);
}

/// Only the longest delays break the bound; no draw is so long.
#[test]
fn what_only_the_longest_delays_break_breaks_its_rule() {
    let buffer = |bound: &str| {
        reviewed(&format!(
            r#"
            [inputs]
            a = 0
            [gates]
            out = {{ buf = ["a"], delay = [5, 9] }}
            [[steps]]
            at = 100
            set = {{ a = 1 }}
            settle_within = {bound}
            [sweep]
            samples = 100
            "#
        ))
    };
    let (_, review) = buffer("8.99999");
    let finding = find(&review, Kind::SettleWithin).expect("found in the run with the longest delays");
    assert_eq!((finding.case.as_deref(), finding.tie, finding.count), (Some(&Which::Max), None, 0));
    assert_eq!(review.verdict.call, Call::Broken);
    assert!(review.verdict.sentence.contains("in no draw, but with max delays"), "{}", review.verdict.sentence);
    // a bound that is met exactly is met: moving the delay past it is no tie
    let (_, review) = buffer("9");
    assert_eq!(review.verdict.call, Call::Proved, "{:?}", review.sweep.findings);
}

#[test]
fn times_that_cannot_be_moved_are_said() {
    let text = CROSSING.replace("delay = 5", "delay = \"99 fs\"");
    let (scenario, review) = reviewed(&text);
    let unmoved = review.sweep.ties.unmoved.as_ref().expect("typical, min, max");
    assert_eq!((unmoved.cases, &unmoved.first, unmoved.why), (3, &Which::Typ, Unmovable::ShortDelay(fs(99))));
    assert!(find(&review, Kind::Glitch).is_none());
    let page = text::review(&scenario, &review, &Page::default());
    let words = page.split_whitespace().collect::<Vec<_>>().join(" ");
    let said = "Exactly equal times were not looked for in 3 cases, of which the first is typical delays: a hundredth \
        of the least delay (99 fs) is below 1 fs.";
    assert!(words.contains(said), "{page}");
    // a little longer is enough
    let (_, review) = reviewed(&text.replace("99 fs", "1 ps"));
    assert!(find(&review, Kind::Glitch).is_some_and(|it| it.tie == Some(Tie::Appears)));
}

#[test]
fn an_interrupted_sweep_says_that_ties_were_not_looked_for() {
    let scenario = reader::read(CROSSING, "test.toml").unwrap().scenario;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let control = Control::default();
    control.cancel.store(true, Ordering::Relaxed);
    let asked = Asked::of(&scenario);
    let report = review::sweep(&scenario, &program, &asked, 1, &control).unwrap();
    assert!(!report.ties.done && report.findings.is_empty());
    let verdict = review::verdict(&scenario, &report);
    let page = text::sweep(&scenario, &asked, &report, &verdict, &Page::default());
    assert!(page.contains("Interrupted before exactly equal times were looked for."), "{page}");
}

fn stillgate(folder: &std::path::Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillgate")).current_dir(folder).args(arguments).output().unwrap()
}

#[test]
fn the_command_line_replays_a_perturbation_and_refuses_what_there_is_not() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("crossing.toml"), CROSSING).unwrap();
    std::fs::write(folder.path().join("short.toml"), CROSSING.replace("delay = 5", "delay = \"99 fs\"")).unwrap();
    let json = |arguments: &[&str]| {
        let output = stillgate(folder.path(), arguments);
        assert!(output.status.success(), "{output:?}");
        serde_json::from_slice::<serde_json::Value>(&output.stdout).unwrap()
    };
    let sweep = json(&["sweep", "crossing.toml", "--json"]);
    let finding = &sweep["findings"][0];
    assert_eq!((&finding["tie"], &finding["count"]), (&"appears".into(), &0.into()));
    assert_eq!((&finding["sample"], &finding["share"]), (&serde_json::Value::Null, &serde_json::Value::Null));
    assert_eq!(sweep["ties"]["looked_for"], true);
    let case = finding["case"].as_str().unwrap();
    let csv = std::fs::read_to_string(folder.path().join("stillgate-out/crossing/findings.csv")).unwrap();
    assert!(csv.contains("appears") && csv.contains(case), "{csv}");
    let replay = json(&["run", "crossing.toml", "--delays", case, "--json"]);
    assert_eq!((&replay["delays"], &replay["facts"][0]["kind"]), (&case.into(), &"glitch".into()));
    let name = format!("case-{}.toml", case.replace("typ~", "typical-perturbation-"));
    let again = format!("stillgate-out/crossing/{name}");
    let replay = json(&["run", "crossing.toml", "--delays", &again, "--json"]);
    assert_eq!(replay["facts"][0]["kind"], "glitch");
    assert_eq!(json(&["run", "crossing.toml", "--delays", "sample:12~5", "--json"])["delays"], "sample:12~5");

    let numbered = "perturbations are numbered from 1 to 8";
    for (file, case, words) in [
        ("crossing.toml", "typ~9", numbered),
        ("crossing.toml", "typ~0", numbered),
        ("crossing.toml", "typ~", numbered),
        ("crossing.toml", "sample:3~x", numbered),
        ("crossing.toml", "sample:x~3", "names no sample"),
        ("crossing.toml", "tip~3", "there is no such file"),
        ("short.toml", "max~1", "a hundredth of the least delay (99 fs) is below 1 fs"),
    ] {
        let output = stillgate(folder.path(), &["run", file, "--delays", case]);
        let said = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(2), "{case}: {said}");
        assert!(said.contains(words), "{case}: {said}");
    }
}

/// Kinds of random worlds with delays that can be moved.
fn kinds() -> [worlds::Kind; 3] {
    let wide = worlds::Kind { delays: Lengths::Wide, wires: 0.3, ..worlds::PLAIN };
    [
        worlds::Kind { filters: Filters::Reject, hands: 0.4, ..wide },
        worlds::Kind { filters: Filters::Involution, clocks: true, begin: Start::Random, ..wide },
        worlds::Kind { filters: Filters::All, clocks: true, hands: 0.4, steps: (2, 8), begin: Start::Random, ..wide },
    ]
}

/// When each input changes: for each step the instants of its changes, from where its chain of steps begins.
fn instants(scenario: &Scenario, instance: &Instance) -> Vec<Vec<i128>> {
    let mut all: Vec<Vec<i128>> = Vec::new();
    let mut placed = 0;
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        let place = i128::from(instance.places[s].fs());
        placed = match step.place {
            Place::After(_) if s > 0 => placed + place,
            _ => place,
        };
        let least = instance.skews[s].iter().min().map_or(0, |skew| skew.fs());
        let later = |i: usize| instance.skews[s].get(i).map_or(0, |skew| i128::from(skew.fs() - least));
        all.push((0..step.set.len().max(1)).map(|i| placed + later(i)).collect());
    }
    all
}

/// From the last toggle of each step to the next step, where that is placed by time.
fn gaps(scenario: &Scenario, instance: &Instance) -> Vec<Option<i128>> {
    let all = instants(scenario, instance);
    let toggled = |s: usize, i: usize| instance.bounces[s].get(i).and_then(|it| it.last()).map_or(0, |it| it.fs());
    let last = |s: usize| all[s].iter().enumerate().map(|(i, at)| at + i128::from(toggled(s, i))).max().unwrap();
    let gap = |s: usize| {
        let waits = matches!(scenario.stimulus.steps[s].place, Place::Rest(_) | Place::When { .. });
        (s > 0 && !waits).then(|| all[s].iter().min().unwrap() - last(s - 1))
    };
    (0..all.len()).map(gap).collect()
}

/// All that a perturbation moves on its own: delays, changes of inputs, edges of clocks.
fn moves(scenario: &Scenario, base: &Instance, moved: &Instance) -> Vec<i128> {
    let delays = |it: &Instance| {
        let all: Vec<i128> =
            it.delays.gate.iter().chain(&it.delays.wire).flatten().map(|span| i128::from(span.fs())).collect();
        all
    };
    let gaps = gaps(scenario, base);
    let inputs = |it: &Instance| {
        let all = instants(scenario, it).into_iter().enumerate();
        // a step that the next one follows without any time between stays with it
        all.filter(|(s, _)| gaps.get(s + 1) != Some(&Some(0))).flat_map(|(_, at)| at).collect::<Vec<_>>()
    };
    let edges = |it: &Instance| {
        let clocks = scenario.stimulus.clocks.iter().zip(&it.clocks);
        let each = clocks.flat_map(|(clock, case)| {
            let initial = scenario.stimulus.initial[clock.net.index()];
            (0..2 * clock.count).map(move |edge| i128::from(case.edge(initial, edge)))
        });
        each.collect::<Vec<_>>()
    };
    let all = |it: &Instance| [delays(it), inputs(it), edges(it)].concat();
    all(moved).iter().zip(all(base)).map(|(moved, base)| moved - base).collect()
}

#[test]
fn every_time_is_moved_differently_and_every_pair_both_ways() {
    let (mut pairs, mut refused, mut checked) = (0u64, 0, 0);
    for kind in kinds() {
        for case in worlds::cases(60, kind) {
            let scenario = &case.scenario;
            for which in [Which::Typ, Which::Min, Which::Max, Which::Sample(3)] {
                let base = Instance::of(scenario, &which);
                let least = base.delays.gate.iter().chain(&base.delays.wire).flatten().min().unwrap().fs();
                let all: Vec<_> = (1..=PERTURBATIONS).map(|number| base.perturbed(scenario, number)).collect();
                let Ok(first) = &all[0] else {
                    assert!(all.iter().all(|it| it == &all[0]), "{}", case.name);
                    assert_eq!(all[0] == Err(Unmovable::ShortDelay(fs(least))), least < 100, "{}", case.name);
                    refused += 1;
                    continue;
                };
                let reach = i128::from(first.reach.fs());
                let inputs: usize = scenario.stimulus.steps.iter().map(|step| step.set.len().max(1)).sum();
                let edges: u32 = scenario.stimulus.clocks.iter().map(|clock| 2 * clock.count).sum();
                let delays = 2 * (base.delays.gate.len() + base.delays.wire.len());
                let few = (delays + inputs + edges as usize) as i128 <= reach;
                assert!(reach >= 1 && reach <= i128::from(least / 100).min(1000), "{}", case.name);
                let all: Vec<Instance> = all.into_iter().map(|it| it.unwrap().instance).collect();
                let moved: Vec<Vec<i128>> = all.iter().map(|it| moves(scenario, &base, it)).collect();
                for (number, (perturbed, moved)) in all.iter().zip(&moved).enumerate() {
                    let name = format!("{} {which:?}~{}", case.name, number + 1);
                    assert!(moved.iter().all(|by| (1..=reach).contains(&by.abs())), "{name}: {moved:?}");
                    if few {
                        let mut sorted = moved.clone();
                        sorted.sort_unstable();
                        assert!(sorted.windows(2).all(|two| two[0] != two[1]), "{name}: {moved:?}");
                    }
                    is_legal(scenario, &base, perturbed, &name);
                }
                // every pair, where all can be moved differently, in both orders
                let n = moved[0].len();
                for (a, b) in (0..n).flat_map(|a| (0..a).map(move |b| (a, b))).filter(|_| few) {
                    let order = |greater: bool| moved.iter().any(|it| (it[a] > it[b]) == greater && it[a] != it[b]);
                    assert!(order(true) && order(false), "{} {which:?}: {a} and {b}", case.name);
                    pairs += 1;
                }
                checked += 1;
            }
        }
    }
    assert!(pairs > 10_000 && checked > 200 && refused > 0, "{pairs} pairs of {checked} cases, {refused} refused");
}

/// A perturbed case is one that the scenario could have, that its file keeps, and that can be run.
fn is_legal(scenario: &Scenario, base: &Instance, perturbed: &Instance, name: &str) {
    for (filter, [fall, rise]) in scenario.delays.filter.iter().zip(&perturbed.delays.gate) {
        match filter {
            Filter::Reject(limit) => assert!(limit < fall.min(rise), "{name}"),
            Filter::Involution(tau) => assert!(is_causal(*tau, *rise, *fall), "{name}"),
            Filter::Inertial | Filter::Transport => {}
        }
    }
    for (was, is) in gaps(scenario, base).iter().zip(gaps(scenario, perturbed)) {
        assert_eq!(was.map(i128::signum), is.map(i128::signum), "{name}: order of steps");
    }
    assert_eq!(base.bounces, perturbed.bounces, "{name}");
    for (clock, case) in scenario.stimulus.clocks.iter().zip(&perturbed.clocks) {
        let initial = scenario.stimulus.initial[clock.net.index()];
        let edges: Vec<u64> = (0..2 * clock.count).map(|edge| case.edge(initial, edge)).collect();
        assert!(edges.is_sorted_by(|a, b| a < b), "{name}: {edges:?}");
    }
    let file = write_instance(perturbed, scenario);
    let read = read_instance(&file, "case", scenario).unwrap_or_else(|faults| panic!("{name}\n{faults}\n{file}"));
    assert_eq!(&read, perturbed, "{name}");
    if scenario.begin == Begin::Random {
        run(scenario, &stillgate::logic::Bits::default(), perturbed);
    }
}

/// More quantities than different moves: any two are still split both ways somewhere.
#[test]
fn with_few_different_moves_every_pair_is_still_split() {
    for (delay, gates, reach) in [(100, 8, 1), (299, 16, 2), (1_000, 100, 10), (10_000, 600, 100)] {
        let mut world = World::new();
        world.input("a", false);
        for gate in 0..gates {
            world.gate(&format!("g{gate}"), stillgate::circuit::Function::Buf, &["a"], delay);
        }
        let scenario = world.scenario();
        let base = Instance::of(&scenario, &Which::Typ);
        let all: Vec<_> = (1..=PERTURBATIONS).map(|number| base.perturbed(&scenario, number).unwrap()).collect();
        assert!(all.iter().all(|it| it.reach.fs() == reach));
        let moved: Vec<Vec<i128>> = all.iter().map(|it| moves(&scenario, &base, &it.instance)).collect();
        for (a, b) in (0..2 * gates).flat_map(|a| (0..a).map(move |b| (a, b))) {
            assert!(moved.iter().any(|it| it[a] > it[b]) && moved.iter().any(|it| it[a] < it[b]), "{reach}: {a}, {b}");
        }
    }
}

/// Waits of nothing cannot be shorter, inputs at one instant are split, steps at one instant stay together.
#[test]
fn waits_of_nothing_and_steps_of_one_instant() {
    let mut world = World::new();
    world.input("a", false).input("b", false).input("c", false);
    world.gate("g", stillgate::circuit::Function::Or, &["a", "b", "c"], 100_000);
    world.at(0, &[("a", true)]).at(0, &[("b", true), ("c", true)]).rest(0, &[("a", false), ("b", false)]);
    world.after(50_000, &[("a", true)]).after(0, &[("b", true)]);
    world.steps[4].place = Place::After(exact(0));
    let scenario = world.scenario();
    let base = Instance::of(&scenario, &Which::Typ);
    for number in 1..=PERTURBATIONS {
        let it = base.perturbed(&scenario, number).unwrap().instance;
        let at = instants(&scenario, &it);
        assert_eq!(at[0][0], *at[1].iter().min().unwrap(), "{number}: {at:?}");
        assert_eq!(at[3], at[4], "{number}: {at:?}");
        assert!(at[1][0] != at[1][1] && at[2][0] != at[2][1], "{number}: {at:?}");
        assert!(at[..3].iter().flatten().all(|at| (1..=1000).contains(at)), "{number}: {at:?}");
    }
}

/// Whatever the circuit, looking for ties ends well, and what is found is what its case shows.
#[test]
fn random_scenarios_are_searched_for_ties() {
    let (mut appear, mut vanish, mut found) = (0, 0, 0);
    let ties =
        worlds::Kind { filters: Filters::Mixed, clocks: true, rings: true, begin: Start::Random, ..worlds::PLAIN };
    for kind in kinds().into_iter().chain([ties]) {
        for mut case in worlds::cases(25, kind) {
            if case.world.steps.is_empty() {
                continue;
            }
            if matches!(kind.delays, Lengths::Ties) {
                // the same ties, with room to move
                stretch(&mut case.world);
                case.scenario = case.world.scenario();
            }
            let scenario = &mut case.scenario;
            scenario.plan.samples = 5;
            scenario.watched = scenario.circuit.gates().map(|gate| scenario.circuit.net_of(gate)).collect();
            scenario.outputs = scenario.watched.clone();
            let asked = Asked::of(scenario);
            let program = Program::with_rest(scenario, &case.rest);
            let report = review::sweep(scenario, &program, &asked, 1, &Control::default());
            let report = report.unwrap_or_else(|error| panic!("{}: {error}", case.name));
            assert!(report.ties.done, "{}", case.name);
            for finding in &report.findings {
                assert_eq!(finding.case.is_some(), finding.count == 0, "{}: {finding:?}", case.name);
                let drawn = finding.count > 0;
                assert!(finding.tie != Some(Tie::Appears) || !drawn, "{}: {finding:?}", case.name);
                appear += u64::from(finding.tie == Some(Tie::Appears));
                vanish += u64::from(finding.tie == Some(Tie::Vanishes));
                found += u64::from(finding.tie.is_none());
                let race = finding.subject.kind == Kind::CriticalRace;
                if let (Some(Tie::Vanishes), Some(sample), false) = (finding.tie, finding.sample, race) {
                    for number in 1..=PERTURBATIONS {
                        let which = Which::Perturbed(Box::new(Which::Sample(sample)), number);
                        let run = run_one(scenario, &program, &asked, which, &Control::default()).unwrap();
                        let shown = run.facts.iter().any(|fact| fact.subject == finding.subject);
                        assert!(!shown, "{}: {finding:?} in perturbation {number}", case.name);
                    }
                }
            }
        }
    }
    assert!(appear > 5 && vanish > 3 && found > 100, "{appear} appear, {vanish} vanish, {found} others");
}

/// Every time a thousand times as long, so that what was equal stays so.
fn stretch(world: &mut World) {
    let range = |range: &mut stillgate::delay::DelayRange| {
        for span in [&mut range.min, &mut range.typ, &mut range.max] {
            *span = fs(span.fs() * 1000);
        }
    };
    world.gates.iter_mut().flat_map(|gate| &mut gate.delay).for_each(range);
    world.wires.iter_mut().flat_map(|wire| &mut wire.2).for_each(range);
    for step in &mut world.steps {
        match &mut step.place {
            Place::At(at) | Place::After(at) => range(at),
            Place::When { wait, timeout, .. } => {
                range(wait);
                *timeout = timeout.map(|it| fs(it.fs() * 1000));
            }
            Place::Rest(wait) => *wait = fs(wait.fs() * 1000),
        }
        step.skew.iter_mut().for_each(range);
        step.bounce.iter_mut().for_each(|bounce| range(&mut bounce.lasting));
    }
    for (_, clock) in &mut world.clocks {
        [&mut clock.first, &mut clock.period, &mut clock.high].into_iter().for_each(range);
        clock.jitter = fs(clock.jitter.fs() * 1000);
    }
    world.limits.time = world.limits.time.map(|it| fs(it.fs() * 1000));
}
