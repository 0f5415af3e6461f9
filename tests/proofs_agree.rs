//! The proof against the sweep on random scenarios with rules of every kind: nothing that is proved is ever broken by a draw, a
//! typical, min or max run or a search, and no window ends where the proof says it cannot. A review checks that of itself and
//! says so if it is not.

use std::collections::BTreeMap;
use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::proof::Call;
use stillgate::review::{self, ReviewError};

use crate::support::random_rules::add_rules;
use crate::support::random_worlds::{Kind, Lengths, PLAIN, Start, cases};

/// How many claims of each rule came out as each verdict.
type Met = BTreeMap<(&'static str, &'static str), u64>;

fn reviewed(kind: Kind, count: u64, met: &mut Met) {
    let percent: u64 = std::env::var("STILLGATE_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(100);
    for (number, case) in cases(count * percent / 100, kind).enumerate() {
        let mut rng = ChaCha8Rng::seed_from_u64(61);
        rng.set_stream(number as u64);
        let mut scenario = case.scenario;
        add_rules(&mut scenario, &mut rng, kind.delays);
        for delay in Arc::make_mut(&mut scenario.delays).gate.iter_mut().flatten() {
            delay.max = delay.max + stillgate::time::Span::from_fs(rng.random_range(0..=2));
        }
        scenario.plan.samples = 40;
        let program = Program::with_rest(&scenario, &case.rest);
        match review::review_proving(&scenario, &program, 4_000, 1, &Control::default()) {
            Err(ReviewError::Contradiction(what)) => {
                let inputs = case.world.inputs.len();
                let start: Vec<bool> =
                    (inputs..inputs + case.world.gates.len()).map(|net| case.rest.get(net)).collect();
                let written = crate::support::written::scenario(&case.world, &start);
                panic!("{}: {what}\n{written}{:?}\n{:?}", case.name, scenario.delays.gate, scenario.rules);
            }
            Err(ReviewError::Cancelled) => unreachable!("nobody cancels"),
            Ok(review) => {
                for claim in review.proof.iter().flat_map(|proof| &proof.claims) {
                    let rule = review.asked.questions[claim.question as usize].rule.word();
                    *met.entry((rule, claim.call.word())).or_insert(0) += 1;
                    assert_eq!(claim.call == Call::Refuted, claim.witness.is_some());
                }
            }
        }
    }
}

/// Steps that wait for patterns, and contacts that bounce.
#[test]
fn hands_and_partners() {
    let mut met = Met::new();
    let kind = Kind { gates: (1, 4), steps: (2, 4), hands: 0.4, limits: &[2000], ..PLAIN };
    reviewed(kind, 60, &mut met);
    reviewed(Kind { wires: 0.2, delays: Lengths::Short, ..kind }, 15, &mut met);
    reviewed(Kind { begin: Start::Random, clocks: true, ..kind }, 15, &mut met);
    // a comparison that meets nothing proves nothing
    let met = |rule: &'static str, call: &'static str| met.get(&(rule, call)).copied().unwrap_or(0);
    for rule in ["when", "expect", "timing"] {
        assert!(met(rule, "proved") > 0 && met(rule, "refuted") > 0, "{rule}");
    }
}

/// Rings and hazards: wanted oscillations, tolerated glitches.
#[test]
fn rings_and_hazards() {
    let mut met = Met::new();
    let kind = Kind { gates: (1, 4), steps: (1, 2), rings: true, hands: 0.0, limits: &[2000], ..PLAIN };
    reviewed(kind, 40, &mut met);
    reviewed(Kind { rings: false, hazards: true, ..kind }, 40, &mut met);
    let met = |rule: &'static str, call: &'static str| met.get(&(rule, call)).copied().unwrap_or(0);
    for rule in ["oscillation", "glitch_free"] {
        assert!(met(rule, "proved") > 0 && met(rule, "refuted") > 0, "{rule}");
    }
}
