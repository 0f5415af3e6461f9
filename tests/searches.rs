//! The directed search finds what blind draws miss, claims nothing that no draw could give, and keeps to its budget.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind, RuleKey};
use stillgate::instance::{Instance, Quantities, Which};
use stillgate::output::instance::write_instance;
use stillgate::output::text::{self, Page};
use stillgate::output::{bundle, json};
use stillgate::reader::{self, read_instance};
use stillgate::review::{self, Call, Review};
use stillgate::scenario::Scenario;
use stillgate::search::{Ended, Guidance, search};
use stillgate::time::Span;

use super::support::random_rules::add_rules;
use super::support::random_worlds::{self, Filters, Kind as Worlds, Lengths, Start};

fn read(text: &str) -> Scenario {
    reader::read(text, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario
}

fn reviewed(scenario: &Scenario, threads: usize) -> Review {
    let program = Program::new(scenario, &Control::default()).unwrap();
    review::review(scenario, &program, threads, &Control::default()).unwrap()
}

fn ns(ns: u64) -> Span {
    Span::from_fs(ns * 1_000_000)
}

/// Six gates in a row, of 1 to 11 ns each, and one of exactly 18 ns, against a row of three of 1 to 11 ns. The first is the
/// quicker if six numbers from 0 to 1 and the complements of three others are below 0.9 in sum: 0.9^9 / 9! = 1.07 in a
/// million (Irwin–Hall). Neither all least nor all greatest delays show it.
const ROW: &str = r#"
outputs = ["late"]
[inputs]
go = 0
[gates]
r1 = { buf = ["go"], delay = [1, 11] }
r2 = { buf = ["r1"], delay = [1, 11] }
r3 = { buf = ["r2"], delay = [1, 11] }
r4 = { buf = ["r3"], delay = [1, 11] }
r5 = { buf = ["r4"], delay = [1, 11] }
r6 = { buf = ["r5"], delay = [1, 11] }
row = { buf = ["r6"], delay = 18 }
f1 = { buf = ["go"], delay = [1, 11] }
f2 = { buf = ["f1"], delay = [1, 11] }
late = { not = ["f2"], delay = [1, 11] }
GATES
[[steps]]
at = 10
set = { go = 1 }
RULES
"#;

fn row(gates: &str, rules: &str) -> Scenario {
    read(&ROW.replace("GATES", gates).replace("RULES", rules))
}

/// Every value of a case lies in its range.
fn within(scenario: &Scenario, case: &Instance) {
    for quantity in Quantities::of(scenario).iter() {
        let value = case.get(quantity);
        assert!((quantity.range.min..=quantity.range.max).contains(&value), "{quantity:?} is {value:?}");
    }
}

/// The one finding of a review that breaks a rule was met by the search alone, and its case shows it when it is run from its
/// file.
fn found_by_search_alone(scenario: &Scenario, kind: Kind) -> (Review, Instance) {
    let review = reviewed(scenario, 1);
    let broken: Vec<_> = review.sweep.findings.iter().filter(|it| it.breaks_rule).collect();
    let finding = broken.iter().find(|it| it.subject.kind == kind).unwrap_or_else(|| panic!("{kind:?}: {broken:?}"));
    assert_eq!((finding.count, finding.share, finding.sample), (0, None, None));
    let Some(Which::Given(case)) = finding.case.as_deref() else { panic!("{finding:?}") };
    within(scenario, case);
    let budget = scenario.plan.search;
    assert!(review.search.as_ref().unwrap().searched.iter().all(|it| it.runs <= budget));
    let read = read_instance(&write_instance(case, scenario), "worst-1.toml", scenario).unwrap();
    assert_eq!(read, **case);
    let asked = Asked::of(scenario);
    let program = Program::new(scenario, &Control::default()).unwrap();
    let run = review::run_one(scenario, &program, &asked, Which::Given(Box::new(read)), &Control::default()).unwrap();
    let shows = run.facts.iter().any(|fact| fact.subject == finding.subject);
    assert!(shows || kind == Kind::CriticalRace, "{:?}", run.facts);
    assert_eq!(review.verdict.call, Call::Broken);
    let words = format!("in no draw of {}, but met by directed search", review::grouped(finding.of));
    assert!(review.verdict.reasons.iter().any(|reason| reason.contains(&words)), "{:?}", review.verdict);
    let case = (**case).clone();
    (review, case)
}

#[test]
fn two_gates_open_at_once_in_one_case_of_a_million() {
    let scenario = row("", "[[rules.never]]\nname = \"both\"\nstate = { row = 1, late = 1 }");
    assert_eq!((scenario.plan.samples, scenario.plan.search), (10_000, 1_000), "what a review does by default");
    let (review, case) = found_by_search_alone(&scenario, Kind::Never);
    // the worst of it: the row at its least takes 24 ns, the other at its most 33, so both are open for 9
    let edge = |gate: usize| case.delays.gate[gate];
    assert!((0..6).all(|gate| edge(gate)[1] == ns(1)) && edge(7)[1] == ns(11) && edge(8)[1] == ns(11));
    assert_eq!(edge(9)[0], ns(11));
    let entry = &review.search.as_ref().unwrap().searched[0];
    assert!(matches!(entry.guidance, Guidance::Apart(_)), "{entry:?}");
    let page = text::review(&scenario, &review, &Page { scenario: Some("row.toml"), folder: "out", ..Page::default() });
    assert!(page.contains("stillgate run row.toml --delays out/worst-1.toml"), "{page}");
    assert!(page.contains("worst met, no bound"), "{page}");
    let files = bundle::of_review(&scenario, &review, &Page::default()).files;
    let file = files.iter().find(|file| file.name == "worst-1.toml").unwrap();
    assert_eq!(file.bytes, write_instance(&case, &scenario).into_bytes());
    assert!(files.iter().any(|file| file.name.starts_with("waves-never-")), "a picture of it");
    let document: serde_json::Value = serde_json::from_str(&json::review(&scenario, &review)).unwrap();
    assert_eq!(document["search"][0]["case"], "worst-1.toml");
    assert_eq!(document["search"][0]["rule"], "never");
    let finding = &document["sweep"]["findings"][0];
    assert_eq!((&finding["count"], &finding["case"]), (&0.into(), &"worst-1.toml".into()));
    assert_eq!((&finding["share"], &finding["sample"]), (&serde_json::Value::Null, &serde_json::Value::Null));
}

/// The same with a dead time of 0.05 ns: 0.905^9 / 9! less 0.9^9 / 9!, one in twenty million.
#[test]
fn a_dead_time_is_broken_between_the_corners() {
    let rules = "[[rules.timing]]\nname = \"dead time\"\nfrom = \"late fall\"\nto = \"row rise\"\nmin = 0.05";
    let (review, _) = found_by_search_alone(&row("", rules), Kind::Timing);
    let timing = review.sweep.rules.iter().position(|it| it.question.rule == RuleKey::Timing).unwrap();
    let entry = &review.search.as_ref().unwrap().searched[timing];
    assert!((-50_000..0).contains(&entry.margin.unwrap()), "{entry:?}");
    assert_eq!(entry.guidance, Guidance::Margin);
}

/// The bound lies 1 fs below the sum of all greatest delays: broken at one corner alone.
#[test]
fn settling_reaches_the_sum_of_all_greatest_delays() {
    for (bound, broken) in [("83.999999", true), ("84", false)] {
        let scenario = read(
            &ROW.replace("outputs = [\"late\"]", "outputs = [\"row\"]")
                .replace("GATES", "")
                .replace("RULES", &format!("[rules]\nsettle_within = {bound}")),
        );
        let review = reviewed(&scenario, 1);
        let settle = review.sweep.rules.iter().position(|it| it.question.rule == RuleKey::SettleWithin).unwrap();
        let entry = &review.search.as_ref().unwrap().searched[settle];
        assert_eq!(entry.margin, Some(-i128::from(broken)), "{bound}: {entry:?}");
        let case = entry.case.as_ref().unwrap();
        assert!(case.delays.gate[..6].iter().all(|edges| edges[1] == ns(11)));
        assert_eq!(entry.breach.is_some(), broken);
        assert_eq!(review.verdict.call == Call::Broken, broken, "{:?}", review.verdict);
        if !broken {
            // the page shows both margins
            let page = text::review(&scenario, &review, &Page::default());
            assert!(page.contains("by search") && page.contains("worst-1.toml"), "{page}");
        }
    }
}

/// A pulse as wide as the row is late, on an AND of both.
#[test]
fn a_short_pulse_is_found_where_its_width_has_no_number_in_most_draws() {
    let gates = "pulse = { nor = [\"row\", \"late\"], delay = 0.001 }";
    let scenario = row(gates, "[rules]\nmin_pulse = { pulse = { high = 0.2 } }");
    let review = reviewed(&scenario, 1);
    let number = review.sweep.rules.iter().position(|it| it.question.rule == RuleKey::MinPulse).unwrap();
    assert_eq!(review.sweep.rules[number].broken, 0, "0.92^9 / 9! less 0.9^9 / 9!: a quarter in a million");
    let entry = &review.search.as_ref().unwrap().searched[number];
    let breach = entry.breach.as_ref().unwrap_or_else(|| panic!("{entry:?}"));
    assert_eq!(breach.subject.kind, Kind::MinPulse);
    assert!(entry.margin.unwrap() < 0);
}

/// A latch whose inputs let go: the one behind the row nearly always last. No number tells how near the other outcome is.
#[test]
fn a_latch_that_falls_the_other_way_once_in_a_million() {
    let gates = r#"
fast = { buf = ["f2"], delay = [1, 11] }
q = { nand = ["fast", "qn"], delay = 0.01 }
qn = { nand = ["row", "q"], delay = 0.01 }"#;
    for rules in ["", "[rules]\ncritical_race = \"allowed\"\n[[rules.never_at_rest]]\nstate = { q = 1, qn = 0 }"] {
        let scenario = row(gates, rules);
        let kind = if rules.is_empty() { Kind::CriticalRace } else { Kind::NeverAtRest };
        let (review, case) = found_by_search_alone(&scenario, kind);
        let after = |names: &[&str]| -> u64 {
            let gate = |name: &&str| scenario.circuit.driver(scenario.circuit.net(name).unwrap()).unwrap();
            names.iter().map(|name| case.delays.gate[gate(name).index()][1].fs()).sum()
        };
        let (slow, fast) = (after(&["r1", "r2", "r3", "r4", "r5", "r6", "row"]), after(&["f1", "f2", "fast"]));
        assert!(slow < fast, "the row was first: {slow} {fast}");
        let search = review.search.unwrap();
        let found = search.searched.iter().find(|it| it.breach.is_some()).unwrap();
        assert_eq!((found.guidance, found.ended), (Guidance::Meetings, Ended::Found), "{found:?}");
    }
}

/// Delays that track, and delays that are scaled together: every case is one that a draw could give.
#[test]
fn what_is_found_in_a_group_could_be_drawn() {
    let group = |how: &str| format!("[[groups]]\ngates = [\"r1\", \"r2\", \"r3\", \"r4\", \"r5\", \"r6\"]\n{how}\n");
    let never = "[[rules.never]]\nstate = { row = 1, late = 1 }\n";
    // six that track each other by a tenth are short together a little oftener, but still not once in 2,000 draws
    let mut scenario = row("", &format!("{}{never}", group("tracking = 0.1")));
    scenario.plan.samples = 2_000;
    let (_, case) = found_by_search_alone(&scenario, Kind::Never);
    // all of them track one number: delays of the same range are the same, and not even the search may part them
    let equal = row("", &format!("{}{}", group("tracking = 1"), never.replace("row = 1", "row = 1, r1 = 0")));
    let review = reviewed(&equal, 1);
    assert!(review.search.unwrap().searched.iter().all(|it| it.breach.is_none()));
    let sum: u64 = case.delays.gate[..6].iter().map(|edges| edges[1].fs()).sum();
    assert!(sum < ns(15).fs());
    // 0.5 to 1.5 of typical 6 ns: the row takes at least 18 + 18 ns, the other at most 33, though the ranges would let it win
    let scaled = row("", &format!("{}{never}", group("scale = [0.5, 1.5]\nmismatch = 0")));
    let review = reviewed(&scaled, 1);
    let entry = &review.search.as_ref().unwrap().searched[0];
    assert_eq!(entry.guidance, Guidance::Apart(ns(3).fs() as i64), "36 ns against 33: {entry:?}");
    assert_eq!(review.verdict.call, Call::NoFailureFound, "{:?}", review.verdict);
}

/// The margin of small circuits at all corners and on a grid between them, by brute force: the search reaches the least and
/// never says less.
#[test]
fn no_margin_is_below_the_least_of_all_cases() {
    let text = r#"
outputs = ["out"]
[inputs]
a = 0
[gates]
x = { not = ["a"], delay = [2, 7] }
y = { buf = ["a"], delay = [1, 5] }
z = { expr = "y & x | z & y", delay = [3, 4] }
out = { xor = ["z", "a"], delay = [1, 2] }
[[steps]]
at = [10, 12]
set = { a = 1 }
[[steps]]
rest = 5
set = { a = 0 }
[rules]
settle_within = 40
glitch_free = { out = { shorter_than = 30 } }
[[rules.timing]]
from = "a any"
to = "out any"
min = 0
max = 60
[sweep]
samples = 20
"#;
    let scenario = read(text);
    let asked = Asked::of(&scenario);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = reviewed(&scenario, 1);
    let quantities = Quantities::of(&scenario);
    let all: Vec<_> = quantities.iter().copied().collect();
    assert_eq!(all.len(), 5);
    let mut least = vec![None::<i64>; asked.questions.len()];
    let mut instance = Instance::of(&scenario, &Which::Typ);
    const GRID: u64 = 5;
    for case in 0..GRID.pow(all.len() as u32) {
        let mut digits = case;
        for quantity in &all {
            let (min, max) = (quantity.range.min.fs(), quantity.range.max.fs());
            instance.set(quantity, Span::from_fs(min + (max - min) * (digits % GRID) / (GRID - 1)));
            digits /= GRID;
        }
        let mut heard = Slacks(&mut least);
        let mut judge = stillgate::findings::Judge::new(&scenario, &asked, &mut heard);
        program.machine::<()>().run(&instance, &Control::default(), &mut judge);
    }
    let mut compared = 0;
    for it in &review.search.unwrap().searched {
        let Some(least) = least[it.question as usize] else { continue };
        let margin = it.margin.or(it.start_margin).unwrap();
        // the last step is less than a ten-thousandth of a range
        assert!(
            margin <= i128::from(least) + 2_000_000,
            "{:?}: {it:?}, {least}",
            asked.questions[it.question as usize]
        );
        // what the grid misses by lying between its points is less than one of its steps
        assert!(margin >= i128::from(least) - i128::from(ns(2).fs()), "{it:?}, {least}");
        compared += 1;
    }
    assert!(compared >= 4, "{compared}");
}

struct Slacks<'a>(&'a mut Vec<Option<i64>>);

impl stillgate::findings::Sink for &mut Slacks<'_> {
    fn judged(&mut self, question: u32, _broken: bool, slack: Option<i64>) {
        let least = &mut self.0[question as usize];
        *least = least.iter().copied().chain(slack).min();
    }
    fn not_judged(&mut self, _question: u32, _reason: stillgate::findings::Reason) {}
    fn fact(&mut self, _fact: stillgate::findings::Fact) {}
    fn reached(&mut self, _moment: u32, _named: bool) {}
    fn window(&mut self, _window: &stillgate::findings::Seen<'_>) {}
}

/// Two equal gates that cross-couple oscillate for ever if their delays are exactly equal, as at all corners: no part does.
#[test]
fn exactly_equal_delays_are_no_finding() {
    let scenario = read(
        r#"
[inputs]
s = 0
r = 0
[gates]
q = { nand = ["s", "qn"], delay = [5, 9] }
qn = { nand = ["r", "q"], delay = [5, 9] }
[[steps]]
at = 10
set = { s = 1, r = 1 }
[rules]
critical_race = "allowed"
"#,
    );
    let review = reviewed(&scenario, 1);
    let search = review.search.as_ref().unwrap();
    assert!(search.searched.iter().all(|it| it.breach.is_none()), "{search:?}");
    assert!(search.searched.iter().any(|it| it.ties > 0), "it was met, and set aside: {search:?}");
    assert_eq!(search.findings(&review.sweep).len(), 0);
}

#[test]
fn budgets_threads_and_interrupts() {
    let mut scenario = row("", "[rules]\nsettle_within = 34\n[[rules.never]]\nstate = { row = 1, late = 1 }");
    scenario.plan.samples = 100;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let [one, two] = [1, 2].map(|threads| reviewed(&scenario, threads));
    assert_eq!(json::review(&scenario, &one), json::review(&scenario, &two), "the same bytes");
    let asked = Asked::of(&scenario);
    for budget in [50, 51, 77, 100, 300] {
        scenario.plan.search = budget;
        let report = search(&scenario, &program, &asked, &one.sweep, 1, &Control::default());
        assert!(report.searched.iter().all(|it| it.runs <= budget), "{budget}: {report:?}");
        let used: u64 = report.searched.iter().map(|it| it.runs).sum();
        assert_eq!(used, report.runs);
        let all = (asked.questions.len() as u64 * budget).min(20 * budget);
        assert!(report.runs <= all);
    }
    let control = Control::default();
    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    let report = search(&scenario, &program, &asked, &one.sweep, 2, &control);
    assert!(report.interrupted && report.runs == 0 && !report.searched.is_empty());
    assert!(report.searched.iter().any(|it| it.ended == Ended::Interrupted));
    scenario.plan.search = 0;
    assert!(reviewed(&scenario, 1).search.is_none());
    let report = search(&scenario, &program, &asked, &one.sweep, 1, &Control::default());
    assert!(report.runs == 0 && report.searched.iter().all(|it| it.ended == Ended::Off));
}

/// More questions than the budget of all: those nearest to being broken are searched, the others named.
#[test]
fn what_is_left_out_is_named() {
    let mut text = ROW.replace("GATES", "").replace("RULES", "");
    for _ in 0..40 {
        text += "[[steps]]\nset = { go = 0 }\n[[steps]]\nset = { go = 1 }\n";
    }
    let mut scenario = read(&text);
    (scenario.plan.samples, scenario.plan.search) = (20, 50);
    let review = reviewed(&scenario, 1);
    let search = review.search.as_ref().unwrap();
    assert!(search.left_out() > 0 && search.count() == 20, "{} {}", search.left_out(), search.count());
    assert!(search.runs <= 1_000);
    let page = text::review(&scenario, &review, &Page::default());
    assert!(page.contains("no runs left for"), "{page}");
}

/// Whatever the circuit, the search ends, keeps its budget, and every breach shows when its case is run by itself.
#[test]
fn random_circuits() {
    let kind = |begin: Start| Worlds {
        gates: (1, 5),
        filters: if begin == Start::Unknown { Filters::Inertial } else { Filters::All },
        begin,
        wires: 0.3,
        delays: Lengths::Wide,
        steps: (0, 4),
        clocks: true,
        limits: &[60],
        rings: false,
        hazards: false,
        hands: 0.3,
        anew: begin == Start::Random,
    };
    let (mut breaches, mut searched) = (0, 0);
    let kinds = [(Start::Rest, 16), (Start::Random, 8), (Start::Unknown, 8)];
    let cases = kinds.into_iter().flat_map(|(begin, count)| random_worlds::cases(count, kind(begin)));
    for (number, case) in cases.enumerate() {
        let mut scenario = case.scenario;
        let mut rng = ChaCha8Rng::seed_from_u64(number as u64);
        add_rules(&mut scenario, &mut rng, Lengths::Wide);
        (scenario.plan.samples, scenario.plan.search) = (5, 60);
        let program = Program::with_rest(&scenario, &case.rest);
        let asked = Asked::of(&scenario);
        let sweep = review::sweep(&scenario, &program, &asked, 1, &Control::default()).unwrap();
        let report = search(&scenario, &program, &asked, &sweep, 1, &Control::default());
        assert!(report.searched.iter().all(|it| it.runs <= 60), "{number}");
        searched += report.count();
        for finding in report.findings(&sweep) {
            let which = finding.case.as_deref().cloned().unwrap();
            let Which::Given(instance) = &which else { panic!("{which:?}") };
            within(&scenario, instance);
            let run = review::run_one(&scenario, &program, &asked, which, &Control::default()).unwrap();
            let shows = run.facts.iter().any(|fact| fact.subject == finding.subject);
            assert!(shows || finding.subject.kind == Kind::CriticalRace, "{number}: {finding:?} {:?}", run.facts);
            breaches += 1;
        }
    }
    assert!(breaches > 5 && searched > 100, "{breaches} {searched}");
}
