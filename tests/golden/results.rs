//! Results of a sweep and a review, built by hand: every kind of value and gap occurs somewhere.

use std::collections::BTreeMap;

use stillgate::circuit::NetId;
use stillgate::findings::{Asked, Kind, Leg, Path, Question, RacePair, Reason, RuleKey, Shape, Subject};
use stillgate::instance::{Instance, Quantities, Quantity, Which};
use stillgate::logic::{Bits, State, Value};
use stillgate::proof::{Call as Claimed, Claim, Proof, Variation, WindowProof};
use stillgate::review::{Away, Call, Cut, Kept, Needs, Pull, Pulls, Review, StatesReport, Untold, Verdict, Why};
use stillgate::scenario::Scenario;
use stillgate::sweep::{
    AtMost, Boards, Finding, Margins, Outcome, Ranges, RuleReport, Settling, SweepReport, Tie, TiesSought, UnseenMass,
    WindowReport, Worst,
};
use stillgate::time::{Span, Time};

use super::cases::{self, ns};
use super::flows;

/// A state from letters in net order: `0`, `1`, `X`.
pub fn state(letters: &str) -> State {
    let mut state = State::zeros(letters.len());
    for (net, letter) in letters.chars().enumerate() {
        let value = match letter {
            '0' => Value::Zero,
            '1' => Value::One,
            _ => Value::X,
        };
        state.set(net, value);
    }
    state
}

fn bits(letters: &str) -> Bits {
    Bits::of(letters.chars().map(|letter| letter == '1').collect::<Vec<_>>().into_iter())
}

/// Margins from the one that [`sweep`] tells upwards.
fn margins(question: &Question, number: i64) -> Margins {
    let mut margins = Margins::default();
    if let Some(bound) = question.bound {
        let least = bound.fs() as i64 - 2_345_678 * number;
        (0..40i64).for_each(|i| margins.add(least + i * i * 12_345));
    }
    margins
}

pub fn settling(from: &str, step: &str, counts: &[u64]) -> Settling {
    let (from, step) = (ns(from), ns(step));
    let edge = |k: usize| Span::from_fs(from.fs() + step.fs() * k as u64);
    let bars: Vec<_> = counts.iter().enumerate().map(|(k, count)| (edge(k), edge(k + 1), *count)).collect();
    Settling {
        min: Some(from),
        median: edge(counts.len() / 2),
        median_at_least: false,
        p99: edge(counts.len() - 1),
        p99_at_least: false,
        max: edge(counts.len()),
        max_at_least: false,
        resolution: 0.001,
        bars,
        far: false,
    }
}

pub fn window(moment: u32, outcomes: Vec<Outcome>, settling: Option<Settling>) -> WindowReport {
    let settled = outcomes.iter().map(|outcome| outcome.count).sum();
    WindowReport {
        moment,
        reached: 10_000,
        named: 10_000,
        outcomes,
        outcomes_truncated: false,
        settled,
        unsettled: 0,
        hits: Vec::new(),
        oscillating: 0,
        cut: 0,
        began_before_rest: 0,
        settling,
        forks: Vec::new(),
    }
}

pub fn outcome(letters: &str, count: u64, first: u64, breaks_rule: bool) -> Outcome {
    Outcome { state: state(letters), count, first, breaks_rule }
}

pub fn finding(kind: Kind, net: Option<NetId>, moment: u32, count: u64) -> Finding {
    Finding {
        subject: Subject { kind, shape: None, question: None, net, moment: Some(moment) },
        breaks_rule: true,
        count,
        of: 10_000,
        share: Some(count as f64 / 10_000.0),
        interval: Some((0.9 * count as f64 / 10_000.0, 1.1 * count as f64 / 10_000.0)),
        boards: None,
        worst: None,
        against: None,
        tie: None,
        sample: Some(17),
        worst_sample: Some(8123),
        case: None,
        rare: false,
    }
}

/// What a sweep of [`cases::lock`] could say.
pub fn sweep(scenario: &Scenario, asked: &Asked) -> SweepReport {
    let humps = [1, 4, 30, 211, 801, 1733, 2411, 2300, 1504, 702, 240, 51, 11, 1];
    let mut windows = vec![
        window(0, vec![outcome("100110", 10_000, 0, false)], Some(settling("6.5", "1.1", &humps))),
        window(1, vec![outcome("110110", 10_000, 0, false)], Some(settling("0", "0.000001", &[10_000]))),
        window(2, vec![outcome("001100", 10_000, 0, false)], Some(settling("7.25", "1.1", &humps))),
        window(
            3,
            vec![outcome("110110", 8_877, 0, false), outcome("111001", 1_113, 17, true)],
            Some(settling("6.5", "4.25", &[9_000, 700, 100, 20, 0, 0, 2, 0, 1])),
        ),
    ];
    windows[3].oscillating = 7;
    windows[3].unsettled = 3;
    windows[3].hits = vec![(stillgate::engine::Hit::Transitions, 3)];
    windows[2].cut = 12;
    let settling = windows[2].settling.as_mut().unwrap();
    (settling.p99_at_least, settling.max_at_least) = (true, true);

    let upper = cases::net(scenario, "open_upper");
    let lower = cases::net(scenario, "open_lower");
    let mut glitch = finding(Kind::Glitch, Some(lower), 3, 412);
    glitch.subject.shape = Some(Shape::Static0);
    glitch.subject.question = asked.find(RuleKey::GlitchFree, 1, Some(lower), Some(3));
    glitch.worst = Some(Worst::Time(ns("2.100001")));
    glitch.tie = Some(Tie::Vanishes);
    let mut never = finding(Kind::Never, None, 3, 9);
    never.subject.question = asked.find(RuleKey::Never, 0, None, None);
    never.worst = Some(Worst::Time(ns("0.25")));
    never.boards = Some(Boards {
        of: 1_000,
        failing: 8,
        interval: Some((0.003_46, 0.015_7)),
        mean_share: 0.112_5,
        worst_share: 0.2,
    });
    never.interval = None;
    let mut swallowed = finding(Kind::Swallowed, Some(cases::net(scenario, "hold_lower")), 3, 9_996);
    swallowed.breaks_rule = false;
    swallowed.worst = Some(Worst::Share(0.987_654_321));
    let mut appears = finding(Kind::Oscillation, None, 3, 0);
    (appears.share, appears.interval, appears.sample, appears.worst_sample) = (None, None, None, None);
    appears.tie = Some(Tie::Appears);
    appears.case = Some(Box::new(Which::Perturbed(Box::new(Which::Typ), 3)));
    let mut late = finding(Kind::SettleWithin, Some(upper), 0, 1);
    late.subject.question = asked.find(RuleKey::SettleWithin, 0, Some(upper), Some(0));
    late.worst = Some(Worst::Time(ns("21.9")));

    let rules = asked
        .questions
        .iter()
        .enumerate()
        .map(|(i, question)| RuleReport {
            question: question.clone(),
            judged: if i == 2 { 9_990 } else { 10_000 },
            broken: if question.rule == RuleKey::Never { 9 } else { 0 },
            not_judged: if i == 2 { vec![(Reason::Oscillating, 7), (Reason::Unsettled, 3)] } else { Vec::new() },
            margin: question.bound.map(|bound| i128::from(bound.fs()) - 2_345_678 * i as i128),
            margin_sample: question.bound.map(|_| 42),
            margins: margins(question, i as i64),
            at_most: (i == 2).then_some(AtMost { share: 0.000_299_8, of: 9_990, boards: false }),
        })
        .collect();
    SweepReport {
        plan: scenario.plan,
        samples: 10_000,
        windows,
        rules,
        findings: vec![never, finding(Kind::CriticalRace, None, 3, 1_113), appears, glitch, late, swallowed],
        at_most: None,
        unseen: Some(UnseenMass { moment: 3, once: 120, of: 10_000, estimate: 0.012, upper: 0.112 }),
        unseen_untold: 0,
        failing: BTreeMap::new(),
        missing: Ranges::default(),
        stopped: None,
        conditions: Vec::new(),
        ties: TiesSought { done: true, ..TiesSought::default() },
        envelope: None,
    }
}

/// What the delay-free view of [`cases::lock`] could say.
pub fn states(scenario: &Scenario) -> StatesReport {
    let net = |name| cases::net(scenario, name);
    StatesReport {
        count: Some("5".into()),
        feedback: vec![net("hold_upper")],
        state_variables: vec![net("hold_upper")],
        state_variables_exact: true,
        variables: vec![net("call_upper"), net("call_lower"), net("hold_upper")],
        rows: vec![
            vec![Some(false), None, Some(true)],
            vec![Some(true), Some(false), Some(false)],
            vec![Some(true), Some(true), None],
        ],
        rows_truncated: false,
        inputs: vec![
            (vec![false, false], vec![bits("001100")]),
            (vec![false, true], vec![bits("011001")]),
            (vec![true, false], vec![bits("100110")]),
            (vec![true, true], vec![bits("110110"), bits("111001")]),
        ],
        inputs_truncated: false,
        vectors: Some(["0".into(), "3".into(), "1".into()]),
        flow: flows::lock(scenario),
    }
}

/// The first finding with a pair of paths that begin apart, the second with none, the others not looked into.
fn why(scenario: &Scenario, findings: usize) -> Vec<Option<Why>> {
    let net = |name: &str| scenario.circuit.net(name).unwrap();
    let fs = |ps: u64| Span::from_fs(ps * 1000);
    let path = |from: &str, start: u64, legs: &[(&str, Value, u64, bool)]| {
        let at = Time::ZERO + fs(start);
        let mut end = at;
        let legs = legs.iter().map(|(name, new, delay, came)| {
            end = end + fs(*delay);
            Leg { net: net(name), wire: None, new: *new, delay: fs(*delay), at: end, came: *came }
        });
        let legs = legs.collect();
        Path { from: Some((net(from), Value::One)), moment: Some(2), at, legs, left_out: 0 }
    };
    let (one, zero) = (Value::One, Value::Zero);
    let pair = RacePair {
        first: path("call_upper", 230_000, &[("hold_upper", zero, 9_800, true), ("open_upper", one, 11_645, true)]),
        second: Some(path("call_lower", 231_500, &[("hold_lower", zero, 10_020, false)])),
        meet: Some(net("hold_lower")),
    };
    let mut why = causes(scenario, findings);
    why[0].get_or_insert_default().race = Some(pair);
    why
}

/// What a review of [`cases::lock`] could say.
pub fn review(scenario: &Scenario) -> Review {
    let asked = Asked::of(scenario);
    let sweep = sweep(scenario, &asked);
    Review {
        states: states(scenario),
        typical: Some(cases::run(scenario, Which::Typ)),
        shown: vec![
            (0, cases::run(scenario, Which::Sample(8123))),
            (1, cases::run(scenario, Which::Sample(17))),
            (3, cases::run(scenario, Which::Sample(8123))),
        ],
        why: why(scenario, sweep.findings.len()),
        search: None,
        proof: Some(proof(scenario)),
        sweep,
        asked,
        verdict: Verdict {
            call: Call::Broken,
            sentence: "broken: 4 findings break a rule in 10,000 draws, for the 4 steps of this scenario".into(),
            reasons: vec![
                "never \"both gates open\" in 9 of 10,000 draws".into(),
                "critical race after step together in 1,113 of 10,000 draws".into(),
            ],
        },
    }
}

/// What a proof of [`cases::lock`] could say of its first questions.
fn proof(scenario: &Scenario) -> Proof {
    let claim = |question: u32, call: Claimed| Claim {
        question,
        call,
        but_for_ties: false,
        variation: None,
        witness: None,
        reason: None,
        race: None,
        margin: None,
    };
    let why = |reason: &str| Some(reason.to_string());
    let claims = vec![
        Claim {
            but_for_ties: true,
            variation: Some(Variation::Constant),
            witness: Some(Box::new(Instance::of(scenario, &Which::Max))),
            ..claim(0, Claimed::Refuted)
        },
        claim(1, Claimed::Proved),
        Claim { reason: why("the budget of 2000 zones ran out"), ..claim(2, Claimed::Undecided) },
        Claim { reason: why("the budget of 2000 zones ran out"), ..claim(3, Claimed::Undecided) },
        Claim { reason: why("nothing stopped it"), ..claim(4, Claimed::Undecided) },
        Claim { reason: why("the proof does not know clocks yet: tick"), ..claim(5, Claimed::NotCovered) },
    ];
    let window = WindowProof {
        moment: 1,
        states: Some(vec![state("110110")]),
        settling: Some((Span::ZERO, Span::from_fs(25_000_001))),
        settling_below: true,
        settling_but_for_ties: false,
    };
    Proof { claims, windows: vec![window], zones: 12_345, allowed: Some(20_000), ..Proof::default() }
}

/// Why the first findings of [`review`] could happen: one needs two delays, one is cut short, of the others nothing is told.
fn causes(scenario: &Scenario, findings: usize) -> Vec<Option<Why>> {
    let quantities: Vec<Quantity> = Quantities::of(scenario).iter().copied().collect();
    let away = |number: usize, value: Span| Away {
        quantity: quantities[number],
        typical: quantities[number].range.typ,
        value,
    };
    let least = away(0, quantities[0].range.min);
    let far = away(1, Span::from_fs(quantities[1].range.max.fs() - 1_234));
    let needs = Needs {
        away: vec![far, least],
        minimal: true,
        kept: Kept::default(),
        case: Box::new(Instance::of(scenario, &Which::Typ)),
        runs: 123,
        cut: None,
    };
    let pull = |number: usize, strength| Pull { quantity: quantities[number], strength, failing: 9, passing: 1_024 };
    let told = vec![pull(1, 0.871_234_5), pull(2, -0.25)];
    let both = Why {
        race: None,
        needs: Some(needs.clone()),
        pull: Some(Pulls { told, more: 3, samples: (9, 1_024), untold: None }),
    };
    let kept = Kept { start: true, bounces: false, firings: false, exact: false };
    let away = vec![least];
    let cut = Why {
        race: None,
        needs: Some(Needs { away, minimal: false, kept, cut: Some(Cut::Runs(2_000)), runs: 2_000, ..needs }),
        pull: Some(Pulls { untold: Some(Untold::FewFail), ..Pulls::default() }),
    };
    let mut all = vec![None; findings];
    (all[0], all[1]) = (Some(both), Some(cut));
    all
}

/// A sweep that was broken off before its first draw.
pub fn sweep_of_nothing(scenario: &Scenario) -> SweepReport {
    SweepReport {
        plan: scenario.plan,
        samples: 0,
        windows: Vec::new(),
        rules: Vec::new(),
        findings: Vec::new(),
        at_most: None,
        unseen: None,
        unseen_untold: 0,
        failing: BTreeMap::new(),
        missing: Ranges::default(),
        stopped: None,
        conditions: Vec::new(),
        ties: TiesSought::default(),
        envelope: None,
    }
}
