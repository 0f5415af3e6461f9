//! Contacts that bounce: claims of the proof at bounds that are worked out by hand, and the cases that refute.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::instance::Instance;
use stillgate::output;
use stillgate::proof::{Call, Proof, Ratio, Spend, prove};
use stillgate::scenario::Scenario;

use crate::bounded::read;

fn proof(text: &str, spend: &Spend) -> (Scenario, Asked, Proof) {
    let scenario = read(text);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let proof = prove(&scenario, &program, &asked, spend, &Control::default());
    (scenario, asked, proof)
}

/// The gravest verdict of the claims of a rule, whether only exactly equal times break it, and a case that does.
fn claim(text: &str, rule: &str) -> (Call, bool, Option<Instance>) {
    let (scenario, asked, proof) = proof(text, &Spend::default());
    let of = proof.claims.iter().filter(|it| asked.questions[it.question as usize].rule.word() == rule);
    let claim = of.max_by_key(|claim| claim.call.severity()).unwrap();
    let case = claim.witness.as_deref().cloned();
    if let Some(case) = &case {
        is_a_draw(&scenario, case);
    }
    (claim.call, claim.but_for_ties, case)
}

fn call(text: &str, rule: &str) -> Call {
    claim(text, rule).0
}

/// Could the bounces of a case be drawn? (Or come from a draw by pairs of toggles that fall together.)
fn is_a_draw(scenario: &Scenario, case: &Instance) {
    for (step, of_step) in scenario.stimulus.steps.iter().zip(&case.bounces) {
        let Some(bounce) = &step.bounce else { continue };
        for toggles in of_step {
            let pairs = toggles.len() as u32 / 2;
            assert!(toggles.len() % 2 == 0 && (bounce.pulses.0..=bounce.pulses.1).contains(&pairs), "{toggles:?}");
            assert!(toggles.is_sorted());
            if let [.., before, last] = toggles[..] {
                assert!(before < last && bounce.lasting.min <= last && last <= bounce.lasting.max, "{toggles:?}");
            }
        }
    }
    // as a file it is taken back as it is
    let text = output::instance::write_instance(case, scenario);
    let again = stillgate::reader::read_instance(&text, "case.toml", scenario).unwrap();
    assert_eq!(again.bounces, case.bounces);
}

/// A changeover contact leaves one side and, later, comes to the other; both bounce, and never are both closed.
fn changeover(q: &str, qn: &str) -> String {
    format!(
        r#"
outputs = ["q"]
[inputs]
r = 1
s = 0
[gates]
q = {{ nor = ["r", "qn"], delay = {q} }}
qn = {{ nor = ["s", "q"], delay = {qn} }}
[[steps]]
label = "leaves"
at = 10
set = {{ r = 0 }}
bounce = {{ lasting = [5, 40], pulses = [0, 3] }}
expect = {{ q = 0 }}
edges = {{ q = 0 }}
[[steps]]
label = "arrives"
after = 40
set = {{ s = 1 }}
bounce = {{ lasting = [5, 40], pulses = [0, 3] }}
expect = {{ q = 1 }}
edges = {{ q = 1 }}
"#
    )
}

/// The output of the latch never shows the bounce: once `qn` has fallen, `q` rises before `qn` could come back.
#[test]
fn a_latch_behind_a_changeover_contact_never_shows_its_bounce() {
    let (_, asked, proved) = proof(&changeover("[1, 2]", "[3, 4]"), &Spend::default());
    for claim in &proved.claims {
        let rule = asked.questions[claim.question as usize].rule.word();
        if ["edges", "expect", "critical_race", "oscillation"].contains(&rule) {
            assert_eq!(claim.call, Call::Proved, "{rule}: {:?}", claim.reason);
        }
    }
    // where `qn` could come back at the very instant at which `q` rises, both do
    let (call, ties, _) = claim(&changeover("[1, 3]", "[3, 4]"), "edges");
    assert!(ties && call != Call::Proved, "{call:?}");
    let (call, ties, _) = claim(&changeover("[1, 2.999999]", "[3, 4]"), "edges");
    assert_eq!((call, ties), (Call::Proved, false));
}

/// A filter: it rises 3 to 5 after its contact closes and falls 4 to 6 after it opens.
fn filter(lasting: &str, pulses: &str, rules: &str) -> String {
    format!(
        r#"
outputs = ["y"]
[inputs]
a = 0
[gates]
y = {{ buf = ["a"], rise = [3, 5], fall = [4, 6] }}
[[steps]]
at = 10
set = {{ a = 1 }}
bounce = {{ lasting = {lasting}, pulses = {pulses} }}
[rules]
{rules}
"#
    )
}

/// A first touch of 3 and an opening of 4 get through: bounces that are over within 7 do not.
#[test]
fn a_filter_longer_than_the_bounce() {
    let glitch = |lasting: &str, pulses: &str| claim(&filter(lasting, pulses, "glitch_free = [\"y\"]"), "glitch_free");
    for pulses in ["[1, 1]", "[0, 3]", "[3, 3]"] {
        let (call, ties, _) = glitch("[2, 6.999999]", pulses);
        assert_eq!((call, ties), (Call::Proved, false), "{pulses}");
        // what is due at the instant of a toggle still comes
        let (call, ties, _) = glitch("[2, 7]", pulses);
        assert_eq!((call, ties), (Call::Refuted, false), "{pulses}");
        let (call, ties, case) = glitch("[2, 7.000002]", pulses);
        assert_eq!((call, ties), (Call::Refuted, false), "{pulses}");
        assert!(!case.unwrap().bounces[0][0].is_empty());
    }
    assert_eq!(glitch("[2, 50]", "[0, 0]").0, Call::Proved);
    // settling counts from the last toggle
    let settle =
        |within: &str| call(&filter("[2, 50]", "[0, 2]", &format!("settle_within = {within}")), "settle_within");
    assert_eq!(settle("5"), Call::Proved);
    assert_eq!(settle("4.999999"), Call::Refuted);
}

/// Of k pairs of toggles a fast gate shows at most 2k + 1 changes, and as few as one.
#[test]
fn as_many_edges_as_there_are_toggles() {
    let edges = |pulses: &str, count: &str| {
        let text = filter("[20, 30]", pulses, "").replace("rise = [3, 5], fall = [4, 6]", "delay = [1, 2]");
        call(&text.replace("bounce =", &format!("edges = {{ y = {count} }}\nbounce =")), "edges")
    };
    assert_eq!(edges("[0, 2]", "[1, 5]"), Call::Proved);
    assert_eq!(edges("[0, 2]", "[1, 4]"), Call::Refuted);
    assert_eq!(edges("[2, 2]", "[1, 5]"), Call::Proved);
    // toggles may fall together
    assert_eq!(edges("[2, 2]", "[3, 5]"), Call::Refuted);
    assert_eq!(edges("[1, 1]", "[1, 3]"), Call::Proved);
    assert_eq!(edges("[1, 1]", "[1, 2]"), Call::Refuted);
}

/// A contact that is set to what it has bounces all the same; a least number of pairs of 0 lets it be.
#[test]
fn a_contact_that_ends_where_it_began() {
    let edges = |pulses: &str, count: &str| {
        let text = filter("[20, 30]", pulses, "").replace("a = 0", "a = 1").replace("[3, 5]", "[1, 2]");
        call(&text.replace("bounce =", &format!("edges = {{ y = {count} }}\nbounce =")), "edges")
    };
    assert_eq!(edges("[1, 2]", "[0, 4]"), Call::Proved);
    assert_eq!(edges("[1, 2]", "[0, 3]"), Call::Refuted);
    assert_eq!(edges("[0, 1]", "[0, 2]"), Call::Proved);
}

/// A counter bit of six NANDs counts every bounce of its contact; the case that refutes is run.
#[test]
fn a_counter_behind_a_bare_contact_counts_the_bounces() {
    let text = std::fs::read_to_string(concat!(env!("CARGO_MANIFEST_DIR"), "/scenarios/push-button.toml")).unwrap();
    // the counter alone, and shorter times
    let cut = text.find("[[steps]]").unwrap();
    let text = format!(
        "{}[[steps]]\nat = 100\nset = {{ button = 1 }}\nbounce = {{ lasting = [50, 90], pulses = [0, 1] }}\n\
         edges = {{ odd = 1 }}\n[rules]\ncritical_race = \"allowed\"\n",
        &text[..cut]
    );
    let (call, ties, case) = claim(&text, "edges");
    assert_eq!((call, ties), (Call::Refuted, false));
    assert!(!case.unwrap().bounces[0][0].is_empty());
    let (call, ..) = claim(&text.replace("pulses = [0, 1]", "pulses = [0, 0]"), "edges");
    assert_eq!(call, Call::Proved);
}

/// A greater delay than a bounce is a cure, and the margin of a filter is what its delays have in hand over it.
#[test]
fn what_is_in_hand_over_a_bounce() {
    let spend = Spend { margins: true, ..Spend::default() };
    let text = filter("[2, 6]", "[0, 1]", "glitch_free = [\"y\"]").replace("[3, 5]", "[3, 4, 5]");
    let (_, asked, found) = proof(&text.replace("[4, 6]", "[4, 5, 6]"), &spend);
    let glitch = found.claims.iter().find(|it| asked.questions[it.question as usize].rule.word() == "glitch_free");
    let margin = glitch.unwrap().margin.as_ref().unwrap();
    // from typical 4 and 5 down to a sum of 6: 9 - 2f = 6
    assert_eq!(margin.factor, Ratio::new(3, 2).unwrap());
}

/// What is not covered is named.
#[test]
fn what_is_not_covered_is_named() {
    let reason = |text: &str| {
        let (_, _, found) = proof(text, &Spend::default());
        let claim = found.claims.iter().find(|claim| claim.call == Call::NotCovered).unwrap();
        claim.reason.clone().unwrap()
    };
    let skewed = changeover("[1, 2]", "[3, 4]").replace("set = { r = 0 }", "set = { r = 0, s = 0 }\nskew = [0, 1]");
    assert!(reason(&skewed.replace("after = 40", "after = 41")).contains("bounces and has skew"));
}
