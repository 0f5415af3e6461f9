//! Margins: just inside the factor a claim is proved, just outside it is not.

use stillgate::proof::{Call, MarginEnd, Ratio};
use stillgate::scenario::Scenario;

use crate::bounded::{latch_text, read};
use crate::races::{claim, names, proof, selector};

/// A scenario with all ranges of its gates and wires stretched by hand, in whole femtoseconds.
fn stretched(scenario: &Scenario, factor: f64) -> Scenario {
    let mut delays = scenario.delays.as_ref().clone();
    for range in delays.gate.iter_mut().chain(&mut delays.wire).flatten() {
        let typ = range.typ.fs() as f64;
        let least = (typ - factor * (typ - range.min.fs() as f64)).ceil().max(1.0);
        let most = (typ + factor * (range.max.fs() as f64 - typ)).floor();
        range.min = stillgate::time::Span::from_fs(least as u64);
        range.max = stillgate::time::Span::from_fs(most as u64);
    }
    Scenario { delays: delays.into(), ..scenario.clone() }
}

/// The factor of a claim; just inside it is proved, just outside it is not.
fn factor(scenario: &Scenario, rule: &str, net: Option<&str>) -> (Ratio, MarginEnd) {
    let (asked, told) = proof(scenario, true, false);
    let margin = claim(scenario, &asked, &told, rule, 1, net).margin.clone().unwrap();
    for (times, good) in [(0.999, true), (1.001, false)] {
        let other = stretched(scenario, margin.factor.to_f64() * times);
        let (asked, told) = proof(&other, false, false);
        let call = claim(&other, &asked, &told, rule, 1, net).call;
        assert_eq!(call == Call::Proved, good, "{rule} {times} of {}: {call:?}", margin.factor);
    }
    (margin.factor, margin.end)
}

/// 4 to 6 against 7 to 9: they touch when stretched by a half. 4 to 6 against 5 to 9 must shrink to two thirds.
#[test]
fn margins_of_latches() {
    let ratio = |a, b| Ratio::new(a, b).unwrap();
    let far = read(&latch_text("[4, 6]", "[7, 9]"));
    assert_eq!(factor(&far, "critical_race", None), (ratio(3, 2), MarginEnd::Refuted));
    let near = read(&latch_text("[4, 6]", "[5, 9]"));
    assert_eq!(factor(&near, "critical_race", None), (ratio(2, 3), MarginEnd::Refuted));
    // what breaks first, and what it has in hand
    let (asked, told) = proof(&far, true, false);
    let margin = claim(&far, &asked, &told, "critical_race", 1, None).margin.clone().unwrap();
    let race = margin.first.unwrap();
    assert_eq!((names(&far, &race.first), names(&far, &race.second)), (vec!["q^".into()], vec!["qn^".into()]));
    assert_eq!(race.short(&far), -1_000_000);
}

/// Typical 3.5 + 4 + 4 + 5.5: the output drops once 3.5 + 1.5 f + 4 + f exceeds 4 − f + 5.5 − 1.5 f and the wire.
#[test]
fn margins_of_a_selector() {
    // 7.5 + 2.5 f = 9.5 − 2.5 f + 0.5 with a wire of 0.5: f = 1/2
    let scenario = selector("0.5", "");
    assert_eq!(factor(&scenario, "glitch_free", Some("y")), (Ratio::new(1, 2).unwrap(), MarginEnd::Refuted));
    // with a wire of 8: f = 2
    let scenario = selector("8", "");
    assert_eq!(factor(&scenario, "glitch_free", Some("y")), (Ratio::whole(2), MarginEnd::Refuted));
}

/// Delays without ranges have nothing to stretch; what typical delays break has no margin at all.
#[test]
fn margins_at_both_ends() {
    let scenario = read(&latch_text("5", "7"));
    let (_, told) = proof(&scenario, true, false);
    assert!(
        told.claims.iter().all(|claim| claim.margin.as_ref().unwrap().end == MarginEnd::Limit),
        "{:?}",
        told.claims
    );
    let scenario = read(&format!("{}\n[rules]\nsettle_within = 1\n", latch_text("[4, 6]", "[7, 9]")));
    let (asked, told) = proof(&scenario, true, false);
    let margin = claim(&scenario, &asked, &told, "settle_within", 1, Some("q")).margin.clone().unwrap();
    assert_eq!((margin.factor, margin.end), (Ratio::ZERO, MarginEnd::Refuted));
}
