//! A sweep is the sum of its samples: whatever the split, the order, the number of threads; and each can be run again.

use std::collections::{BTreeMap, BTreeSet};

use stillgate::control::Control;
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Fact, Kind, Measure, Subject};
use stillgate::instance::Which;
use stillgate::logic::State;
use stillgate::review::{self, RunReport};
use stillgate::scenario::Scenario;
use stillgate::sweep::{Finding, SweepReport, Tally, Worst, conclude, run_samples};
use stillgate::time::Span;

/// A latch and a selector, steps close together, a clock, a race, a glitch: something of everything.
const MIXED: &str = r#"
title = "mixed"
outputs = ["out", "q"]
[inputs]
a = 1
s = 1
r = 1
tick = 0
[initial]
q = 0
[gates]
an  = { not = ["a"], delay = [2, 9] }
p   = { and = ["a", "tick"], delay = [3, 8] }
o   = { nand = ["an", "a"], delay = [2, 4] }
out = { or = ["p", "an"], delay = [2, 6] }
q   = { nand = ["s", "qn"], rise = [3, 9], fall = [4, 7] }
qn  = { nand = ["r", "q"], delay = [3, 9] }
[[steps]]
label = "a falls"
at = [50, 70]
set = { a = 0 }
[[steps]]
label = "a rises"
after = [8, 22]
set = { a = 1 }
[[steps]]
label = "both down"
after = 60
set = { s = 0, r = 0 }
[[steps]]
label = "both up"
after = 40
set = { s = 1, r = 1 }
skew = [0, 8]
[[steps]]
label = "last"
rest = 5
set = { a = 0 }
[[clocks]]
net = "tick"
first = [10, 40]
period = [30, 34]
high = 14
jitter = 0.5
count = 4
[rules]
settle_within = 15
critical_race = "forbidden"
min_pulse = { out = { high = 3, low = 3 } }
[[rules.timing]]
from = "a any"
to = "out any"
min = 4
[[rules.never]]
state = { q = 1, qn = 1 }
longer_than = 41
[sweep]
samples = 600
seed = 5
"#;

fn scenario(text: &str) -> Scenario {
    stillgate::reader::read(text, "case.toml").unwrap_or_else(|faults| panic!("{}", faults.render(false))).scenario
}

fn with_tries(tries: u64) -> Scenario {
    scenario(&MIXED.replace("seed = 5", &format!("seed = 5\ntries = {tries}")))
}

struct Sweep {
    scenario: Scenario,
    program: Program,
    asked: Asked,
}

impl Sweep {
    fn of(scenario: Scenario) -> Sweep {
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = Asked::of(&scenario);
        Sweep { scenario, program, asked }
    }

    fn tally(&self, samples: std::ops::Range<u64>, threads: usize) -> Tally {
        run_samples(&self.scenario, &self.program, &self.asked, samples, threads, &Control::default())
    }

    fn whole(&self) -> Tally {
        self.tally(0..self.scenario.plan.samples, 1)
    }

    fn report(&self) -> SweepReport {
        conclude(&self.scenario, &self.asked, &self.whole())
    }

    fn single(&self, sample: u64) -> RunReport {
        let which = Which::Sample(sample);
        review::run_one(&self.scenario, &self.program, &self.asked, which, &Control::default()).unwrap()
    }

    fn singles(&self) -> Vec<RunReport> {
        (0..self.scenario.plan.samples).map(|sample| self.single(sample)).collect()
    }
}

#[test]
fn any_split_in_any_order_and_any_number_of_threads_is_the_whole() {
    for tries in [1, 4, 7] {
        let sweep = Sweep::of(with_tries(tries));
        let whole = sweep.whole();
        assert_eq!(whole.samples, 600);
        assert!(whole.facts.len() > 5, "the case shows too little: {:?}", whole.facts.keys());
        for threads in [2, 3] {
            assert!(sweep.tally(0..600, threads) == whole, "{tries} tries, {threads} threads");
        }
        // cuts inside boards, uneven parts, both orders
        for cuts in [vec![0, 300, 600], vec![0, 1, 2, 3, 597, 600], vec![0, 127, 128, 129, 255, 410, 600]] {
            let parts: Vec<Tally> = cuts.windows(2).map(|cut| sweep.tally(cut[0]..cut[1], 1)).collect();
            let join = |order: &mut dyn Iterator<Item = &Tally>| {
                let mut all = Tally::new(&sweep.scenario, &sweep.asked);
                order.for_each(|part| all.merge(part));
                all
            };
            assert!(join(&mut parts.iter()) == whole, "{tries} tries, cut at {cuts:?}");
            assert!(join(&mut parts.iter().rev()) == whole, "{tries} tries, cut at {cuts:?}, backwards");
        }
    }
}

/// The measure that a finding tells, as in a fact.
fn same_worst(finding: &Finding, fact: &Fact) -> bool {
    match (finding.worst, fact.measure) {
        (None, None) => true,
        (Some(Worst::Time(span)), Some(measure)) => span.fs() == measure.value,
        (Some(Worst::Share(share)), Some(measure)) => share == measure.as_share(),
        _ => false,
    }
}

#[test]
fn every_finding_is_the_sum_of_its_samples_and_replays() {
    let sweep = Sweep::of(scenario(MIXED));
    let report = sweep.report();
    let singles = sweep.singles();
    let mut truth: BTreeMap<Subject, (u64, u64, Option<(Measure, u64)>)> = BTreeMap::new();
    for (sample, run) in singles.iter().enumerate() {
        for fact in &run.facts {
            let entry = truth.entry(fact.subject).or_insert((0, sample as u64, None));
            entry.0 += 1;
            if fact.measure.is_some_and(|m| entry.2.is_none_or(|(worst, _)| m > worst)) {
                entry.2 = fact.measure.map(|m| (m, sample as u64));
            }
        }
    }
    let races = |finding: &&Finding| matches!(finding.subject.kind, Kind::CriticalRace | Kind::NonCriticalRace);
    let plain: Vec<&Finding> = report.findings.iter().filter(|finding| !races(finding)).collect();
    assert_eq!(plain.len(), truth.len());
    for finding in plain {
        let (count, first, worst) = truth[&finding.subject];
        assert_eq!((finding.count, finding.sample), (count, Some(first)), "{:?}", finding.subject);
        assert_eq!(finding.worst_sample, Some(worst.map_or(first, |worst| worst.1)), "{:?}", finding.subject);
        let replay = sweep.single(finding.worst_sample.unwrap());
        let fact = replay.facts.iter().find(|fact| fact.subject == finding.subject).expect("the replay shows it");
        assert!(same_worst(finding, fact), "{finding:?} {fact:?}");
        assert!(finding.of >= finding.count && finding.of <= 600, "{finding:?}");
    }
    let rank = |f: &Finding| (!f.breaks_rule, f.subject.kind);
    assert!(report.findings.windows(2).all(|two| rank(&two[0]) <= rank(&two[1])), "worst first");
}

#[test]
fn outcomes_and_races_are_those_of_the_single_runs() {
    let sweep = Sweep::of(scenario(MIXED));
    let report = sweep.report();
    let singles = sweep.singles();
    let mut races = 0;
    for window in &report.windows {
        let mut outcomes: BTreeMap<&State, u64> = BTreeMap::new();
        let mut from: BTreeMap<State, BTreeMap<&State, (u64, u64)>> = BTreeMap::new();
        for (sample, run) in singles.iter().enumerate() {
            let mut before = run.trace.start.clone();
            for seen in &run.trace.windows {
                if seen.moment == window.moment && seen.end == End::Settled {
                    *outcomes.entry(&seen.state).or_insert(0) += 1;
                    if seen.began_at_rest {
                        let of = from.entry(before.clone()).or_default();
                        of.entry(&seen.state).or_insert((0, sample as u64)).0 += 1;
                    }
                }
                before.copy_from(&seen.state);
            }
        }
        let told: BTreeMap<&State, u64> = window.outcomes.iter().map(|o| (&o.state, o.count)).collect();
        assert_eq!(told, outcomes, "moment {}", window.moment);
        // a critical race: the samples that did not do the commonest thing
        let (mut strays, mut first) = (0, u64::MAX);
        for ends in from.values().filter(|ends| ends.len() > 1) {
            let commonest =
                ends.iter().max_by_key(|(_, (count, first))| (*count, std::cmp::Reverse(*first))).unwrap().0;
            for (_, (count, sample)) in ends.iter().filter(|(state, _)| *state != commonest) {
                strays += count;
                first = first.min(*sample);
            }
        }
        let critical = |f: &&Finding| f.subject.kind == Kind::CriticalRace && f.subject.moment == Some(window.moment);
        let finding = report.findings.iter().find(critical);
        assert_eq!(finding.map_or(0, |finding| finding.count), strays, "moment {}", window.moment);
        if let Some(finding) = finding {
            races += 1;
            assert_eq!(finding.sample, Some(first));
            assert!(finding.breaks_rule);
        }
    }
    assert!(races > 0, "both up is a race");
}

#[test]
fn settling_figures_are_those_of_the_single_runs() {
    let sweep = Sweep::of(scenario(MIXED));
    let report = sweep.report();
    let singles = sweep.singles();
    let mut cut_seen = 0;
    for window in &report.windows {
        let (mut settled, mut cut) = (Vec::new(), Vec::new());
        for seen in singles.iter().flat_map(|run| &run.trace.windows).filter(|w| w.moment == window.moment) {
            match seen.end {
                End::Settled => settled.push(seen.settling.unwrap().fs()),
                End::Cut => cut.push(seen.stop.since(seen.settle_from).fs()),
                _ => {}
            }
        }
        assert_eq!((window.settled, window.cut), (settled.len() as u64, cut.len() as u64));
        let mut all = [settled.clone(), cut.clone()].concat();
        all.sort_unstable();
        let Some(told) = &window.settling else {
            assert!(all.is_empty());
            continue;
        };
        let rank = |share: f64| all[((share * all.len() as f64).ceil() as usize).max(1) - 1];
        let told_to = told.resolution;
        let near =
            |told: Span, truth: u64| told.fs() <= truth && (truth - told.fs()) as f64 <= told.fs() as f64 * told_to;
        assert_eq!(told.min.map(Span::fs), settled.iter().min().copied());
        assert_eq!(told.max.fs(), *all.last().unwrap());
        assert!(near(told.median, rank(0.5)) && near(told.p99, rank(0.99)), "{told:?}");
        let shortest = cut.iter().min().copied();
        assert_eq!(told.median_at_least, shortest.is_some_and(|cut| cut <= told.median.fs()));
        assert_eq!(told.max_at_least, shortest.is_some());
        cut_seen += cut.len();
        assert_eq!(told.bars.iter().map(|bar| bar.2).sum::<u64>(), settled.len() as u64);
    }
    assert!(cut_seen > 50, "the case must cut windows: {cut_seen}");
}

#[test]
fn boards_are_counted_as_the_single_runs_say() {
    let sweep = Sweep::of(with_tries(7)); // 600 is no multiple of 7: the last board has 5 tries
    let report = sweep.report();
    let mut failing: BTreeMap<Subject, BTreeMap<u64, u64>> = BTreeMap::new();
    for (sample, run) in sweep.singles().iter().enumerate() {
        for fact in &run.facts {
            *failing.entry(fact.subject).or_default().entry(sample as u64 / 7).or_insert(0) += 1;
        }
    }
    let mut checked = 0;
    for finding in &report.findings {
        assert!(finding.interval.is_none(), "no interval where boards share draws: {finding:?}");
        let Some(boards) = finding.boards else { continue };
        let by_board = &failing[&finding.subject];
        let worst = by_board.iter().map(|(board, n)| *n as f64 / if *board == 85 { 5.0 } else { 7.0 });
        assert_eq!((boards.of, boards.failing), (86, by_board.len() as u64), "{:?}", finding.subject);
        assert!((boards.worst_share - worst.fold(0.0, f64::max)).abs() < 1e-12, "{:?}", finding.subject);
        checked += 1;
    }
    assert!(checked > 5);
}

#[test]
fn corners_have_counts_but_no_shares() {
    let sweep = Sweep::of(scenario(&MIXED.replace("seed = 5", "seed = 5\ndraw = \"corners\"")));
    let report = sweep.report();
    assert!(!report.findings.is_empty());
    assert!(report.findings.iter().all(|f| f.count > 0 && f.share.is_none() && f.interval.is_none()));
}

#[test]
fn exact_delays_have_one_outcome() {
    let exact = MIXED
        .replace("[2, 9]", "5")
        .replace("[3, 8]", "5")
        .replace("[2, 4]", "3")
        .replace("[2, 6]", "4")
        .replace("[3, 9]", "6")
        .replace("[4, 7]", "5")
        .replace("[50, 70]", "60")
        .replace("[8, 22]", "20")
        .replace("skew = [0, 8]", "")
        .replace("[10, 40]", "20")
        .replace("[30, 34]", "32")
        .replace("jitter = 0.5", "")
        .replace("samples = 600", "samples = 50");
    let report = Sweep::of(scenario(&exact)).report();
    for window in &report.windows {
        assert!(window.outcomes.len() <= 1, "moment {}", window.moment);
        let settling: BTreeSet<Option<Span>> = window.settling.iter().flat_map(|s| [s.min, Some(s.max)]).collect();
        assert!(settling.len() <= 1 || window.cut > 0, "moment {}", window.moment);
    }
}
