//! A sweep says what its samples say one by one, however they are split, ordered and spread over threads.

use std::collections::BTreeMap;
use std::sync::Arc;

use rand::seq::SliceRandom;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::GateId;
use stillgate::control::Control;
use stillgate::delay::{Billionths, DelayRange, Group, Marginal, Together};
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind};
use stillgate::instance::Which;
use stillgate::review::run_one;
use stillgate::scenario::{Place, Scenario};
use stillgate::sweep::{SweepReport, Tally, Worst, conclude, run_samples};

use crate::support::random_rules::add_rules;
use crate::support::random_worlds::{Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::slow_sweep::{Whole, one_by_one};
use crate::support::world::fs;

/// Samples of the random sweeps: the last board of several tries may be cut short.
const SAMPLES: u64 = 60;

/// A scenario with everything that a sweep of it needs.
struct Swept {
    name: String,
    scenario: Scenario,
    program: Program,
    asked: Asked,
}

impl Swept {
    fn tally(&self, samples: std::ops::Range<u64>, threads: usize) -> Tally {
        run_samples(&self.scenario, &self.program, &self.asked, samples, threads, &Control::default())
    }

    fn report(&self, samples: u64) -> SweepReport {
        conclude(&self.scenario, &self.asked, &self.tally(0..samples, 1))
    }
}

/// Random scenarios with random rules whose delays are ranges.
fn random_sweeps(count: u64, kind: Worlds) -> impl Iterator<Item = (Swept, ChaCha8Rng)> {
    cases(count, kind).enumerate().map(move |(number, case)| {
        let mut rng = ChaCha8Rng::seed_from_u64(3);
        rng.set_stream(number as u64);
        let mut scenario = case.scenario;
        add_rules(&mut scenario, &mut rng, kind.delays);
        let delays = Arc::make_mut(&mut scenario.delays);
        for delay in delays.gate.iter_mut().flatten() {
            *delay = DelayRange::between(delay.min, delay.min + fs(rng.random_range(0..=2 * delay.max.fs())));
        }
        scenario.plan.tries = if rng.random_bool(0.4) { rng.random_range(2..=7) } else { 1 };
        scenario.plan.samples = SAMPLES;
        match rng.random_range(0..20) {
            0..3 => scenario.plan.draw = Marginal::Corners,
            3..6 => scenario.plan.draw = Marginal::Hypercube,
            _ => {}
        }
        let gates = scenario.circuit.gate_count() as u32;
        if gates > 1 && rng.random_bool(0.3) {
            let how = Together::Tracking(Billionths::nearest(rng.random_range(0.0..=1.0)));
            Arc::make_mut(&mut scenario.delays).groups =
                vec![Group { gates: (0..gates / 2).map(GateId).collect(), how }];
        }
        let program = Program::with_rest(&scenario, &case.rest);
        let asked = Asked::of(&scenario);
        (Swept { name: case.name, scenario, program, asked }, rng)
    })
}

/// Kinds of circuits that between them show everything a sweep can find.
fn kinds() -> [Worlds; 5] {
    let kind = Worlds { delays: Lengths::Short, ..PLAIN };
    [
        kind,
        Worlds { hazards: true, gates: (0, 4), ..kind },
        Worlds { clocks: true, delays: Lengths::Ties, ..kind },
        Worlds { begin: Start::Random, gates: (2, 5), ..kind },
        Worlds { begin: Start::Unknown, delays: Lengths::Ties, ..kind },
    ]
}

#[test]
fn a_sweep_says_what_its_samples_say() {
    // how often each thing was met: a comparison that never meets it proves nothing
    let mut met: BTreeMap<&str, usize> = BTreeMap::new();
    let mut meet = |what: &'static str, times: usize| *met.entry(what).or_default() += times;
    for kind in kinds() {
        for (swept, _) in random_sweeps(600, kind) {
            let runs = one_by_one(&swept.scenario, &swept.program, &swept.asked, SAMPLES);
            let report = swept.report(SAMPLES);
            Whole { scenario: &swept.scenario, asked: &swept.asked, runs: &runs }.check(&report, &swept.name);
            for finding in &report.findings {
                meet(finding.subject.kind.word(), 1);
                meet("boards", finding.boards.is_some().into());
                meet("no share", finding.share.is_none().into());
            }
            for window in &report.windows {
                meet("median at least", window.settling.as_ref().is_some_and(|it| it.median_at_least).into());
                meet("marked", window.outcomes.iter().filter(|it| it.breaks_rule).count());
            }
        }
    }
    for what in ["critical-race", "non-critical-race", "boards", "no share", "median at least", "marked", "unresolved"]
    {
        assert!(met[what] > 100, "{what} in {met:#?}");
    }
}

#[test]
fn settling_figures_of_many_different_times_keep_their_resolution() {
    let kind = Worlds { delays: Lengths::Wide, gates: (3, 6), steps: (2, 3), ..PLAIN };
    let mut coarse = 0;
    for (swept, _) in random_sweeps(90, kind) {
        let mut scenario = swept.scenario.clone();
        scenario.plan.samples = 3000;
        let runs = one_by_one(&scenario, &swept.program, &swept.asked, 3000);
        let tally = run_samples(&scenario, &swept.program, &swept.asked, 0..3000, 1, &Control::default());
        let report = conclude(&scenario, &swept.asked, &tally);
        Whole { scenario: &scenario, asked: &swept.asked, runs: &runs }.check(&report, &swept.name);
        let figures = report.windows.iter().filter_map(|window| window.settling.as_ref());
        coarse += figures.filter(|it| it.resolution > 0.0).count();
    }
    assert!(coarse > 10, "{coarse} with classes");
}

#[test]
fn any_split_in_any_order_is_the_whole() {
    let mut cut_boards = 0;
    for kind in kinds() {
        for (swept, mut rng) in random_sweeps(150, kind) {
            let whole = swept.tally(0..SAMPLES, 1);
            let mut cuts: Vec<u64> = (0..rng.random_range(1..6)).map(|_| rng.random_range(0..=SAMPLES)).collect();
            cuts.extend([0, SAMPLES]);
            cuts.sort_unstable();
            let tries = swept.scenario.plan.tries;
            cut_boards += cuts.iter().filter(|cut| *cut % tries != 0).count();
            let mut parts: Vec<Tally> = cuts.windows(2).map(|it| swept.tally(it[0]..it[1], 1)).collect();
            parts.shuffle(&mut rng);
            let mut merged = Tally::new(&swept.scenario, &swept.asked);
            parts.iter().for_each(|part| merged.merge(part));
            let of = format!("{}, tries {tries}, cut at {cuts:?}", swept.name);
            let (a, b) = (format!("{merged:#?}"), format!("{whole:#?}"));
            let different = a.lines().zip(b.lines()).enumerate().find(|(_, (a, b))| a != b);
            assert!(merged == whole, "{of}: {different:?}\n{a}");
            let report = |tally: &Tally| format!("{:#?}", conclude(&swept.scenario, &swept.asked, tally));
            assert_eq!(report(&merged), report(&whole), "{of}");
        }
    }
    assert!(cut_boards > 100, "{cut_boards} cuts through a board");
}

#[test]
fn two_threads_say_what_one_says() {
    for kind in kinds() {
        for (swept, _) in random_sweeps(12, kind) {
            // several chunks for each
            let [one, two] = [1, 2].map(|threads| swept.tally(0..1500, threads));
            assert_eq!(one, two, "{}", swept.name);
        }
    }
}

#[test]
fn every_finding_replays() {
    let mut replayed = 0;
    for kind in kinds() {
        for (swept, _) in random_sweeps(80, kind) {
            for finding in swept.report(SAMPLES).findings {
                if matches!(finding.subject.kind, Kind::CriticalRace | Kind::NonCriticalRace) {
                    continue;
                }
                let of = format!("{}: {finding:?}", swept.name);
                for sample in [finding.sample, finding.worst_sample] {
                    let which = Which::Sample(sample.expect("a sample"));
                    let control = Control::default();
                    let run = run_one(&swept.scenario, &swept.program, &swept.asked, which, &control).expect("a run");
                    let fact = run.facts.iter().find(|fact| fact.subject == finding.subject);
                    let fact = fact.unwrap_or_else(|| panic!("sample {sample:?} alone does not show {of}"));
                    assert_eq!(fact.breaks_rule, finding.breaks_rule, "{of}");
                    let value = fact.measure.map(|it| match finding.subject.kind {
                        Kind::Swallowed => Worst::Share(it.as_share()),
                        _ if it == stillgate::findings::Measure::ENDLESS => Worst::Endless,
                        _ => Worst::Time(fs(it.value)),
                    });
                    assert_eq!(value.is_some(), finding.worst.is_some(), "{of}");
                    if sample == finding.worst_sample {
                        assert_eq!(value, finding.worst, "{of}");
                    }
                    replayed += 1;
                }
            }
        }
    }
    assert!(replayed > 1000, "{replayed}");
}

#[test]
fn with_one_value_for_every_delay_there_is_one_outcome() {
    let mut windows = 0;
    // delays, places and skews of one value each, and no bounce
    for (number, case) in cases(300, Worlds { delays: Lengths::Short, ..PLAIN }).enumerate() {
        let mut rng = ChaCha8Rng::seed_from_u64(4);
        rng.set_stream(number as u64);
        let mut scenario = case.scenario;
        add_rules(&mut scenario, &mut rng, Lengths::Short);
        for step in &mut Arc::make_mut(&mut scenario.stimulus).steps {
            step.skew = step.skew.map(|skew| DelayRange::exact(skew.max));
            step.bounce = None;
            if let Place::When { wait, .. } = &mut step.place {
                *wait = DelayRange::exact(wait.max);
            }
        }
        let program = Program::with_rest(&scenario, &case.rest);
        let asked = Asked::of(&scenario);
        let report = Swept { name: case.name, scenario, program, asked }.report(20);
        for window in &report.windows {
            assert!(window.outcomes.len() <= 1, "{window:?}");
            assert!([0, 20].contains(&window.settled), "{window:?}");
            windows += window.outcomes.len();
        }
        assert!(report.findings.iter().all(|it| it.count == 20), "{:#?}", report.findings);
        assert!(report.rules.iter().all(|rule| [0, 20].contains(&rule.broken)), "{:#?}", report.rules);
    }
    assert!(windows > 200, "{windows}");
}
