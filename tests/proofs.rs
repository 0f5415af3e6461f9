//! `stillgate prove`: what is refuted replays, what is proved no draw breaks, and what is open says why.

use std::process::Command;

use crate::bounded::{latch_text as latch, read};

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::proof::{Call, Proof, Spend, prove};
use stillgate::time::Span;

fn proof(text: &str, zones: u64) -> (Asked, Proof) {
    let scenario = read(text);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let proof = prove(&scenario, &program, &asked, &Spend { zones, ..Spend::default() }, &Control::default());
    (asked, proof)
}

/// The verdict of the first claim of a rule, and whether it is one but for exact ties.
fn call(text: &str, rule: &str) -> (Call, bool) {
    let (asked, proof) = proof(text, 50_000);
    let of = |question: u32| asked.questions[question as usize].rule.word() == rule;
    let claim =
        proof.claims.iter().filter(|claim| of(claim.question)).max_by_key(|claim| claim.call.severity()).unwrap();
    (claim.call, claim.but_for_ties)
}

/// Overlapping ranges race, disjoint ones do not, touching ones only by an exact tie; the oscillation needs exact equality.
#[test]
fn a_latch_released_at_once() {
    assert_eq!(call(&latch("[4, 8]", "[5, 9]"), "critical_race"), (Call::Refuted, false));
    let (endless, ties) = call(&latch("[4, 8]", "[5, 9]"), "oscillation");
    assert!(endless != Call::Proved && ties, "{endless:?} {ties}");
    assert_eq!(call(&latch("[4, 6]", "[7, 9]"), "critical_race"), (Call::Proved, false));
    assert_eq!(call(&latch("[4, 6]", "[7, 9]"), "oscillation"), (Call::Proved, false));
    let (touching, ties) = call(&latch("[4, 6]", "[6, 9]"), "critical_race");
    assert!(touching != Call::Proved && ties, "{touching:?} {ties}");
}

/// A buffer chain: the settling bound is the sum of the greatest delays, to the femtosecond, whatever rule asks for it.
#[test]
fn the_longest_path_is_the_bound() {
    let chain = |within: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
b = {{ buf = ["a"], delay = [2, 5] }}
c = {{ buf = ["b"], delay = [3, 7.000001] }}
[rules]
settle_within = {within}
[[steps]]
set = {{ a = 1 }}
"#
        )
    };
    assert_eq!(call(&chain("12.000001"), "settle_within").0, Call::Proved);
    assert_eq!(call(&chain("12"), "settle_within").0, Call::Refuted);
    let (_, proof) = proof(&chain("20"), 1000);
    let (least, most) = proof.windows[0].settling.unwrap();
    assert_eq!((least.fs(), most.fs()), (5_000_000, 12_000_001));
}

/// Rules with lengths hold at their bounds and not a femtosecond beyond: two edges of one input, a high between them, the time between two nets.
#[test]
fn lengths_at_their_bounds() {
    let pulse = |rules: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
y = {{ buf = ["a"], rise = [2, 4], fall = [3, 6] }}
z = {{ not = ["a"], delay = [5, 8] }}
[rules]
{rules}
[[steps]]
at = 10
set = {{ a = 1 }}
[[steps]]
after = 20
set = {{ a = 0 }}
[[steps]]
after = 40
set = {{ a = 1 }}
"#
        )
    };
    // high: 20 - rise + fall, from 19 to 24; low: 40 - fall + rise, from 36 to 41
    let high = |ns: &str| call(&pulse(&format!("min_pulse = {{ y = {{ high = {ns} }} }}")), "min_pulse").0;
    assert_eq!(high("19"), Call::Proved);
    assert_eq!(high("19.000001"), Call::Refuted);
    let low = |ns: &str| call(&pulse(&format!("min_pulse = {{ y = {{ low = {ns} }} }}")), "min_pulse").0;
    assert_eq!(low("36"), Call::Proved);
    assert_eq!(low("36.000001"), Call::Refuted);
    // y rises 1 to 6 before z falls
    let timing = |bound: &str| {
        let rule = format!("[[rules.timing]]\nfrom = \"y rise\"\nto = \"z fall\"\n{bound}");
        call(&pulse(&rule), "timing").0
    };
    assert_eq!(timing("min = 1"), Call::Proved);
    assert_eq!(timing("min = 1.000001"), Call::Refuted);
    assert_eq!(timing("max = 6"), Call::Proved);
    assert_eq!(timing("max = 5.999999"), Call::Refuted);
    // both high, or both low, for as long
    let never = |longer: &str| {
        let rule = format!("[[rules.never]]\nstate = {{ y = 1, z = 1 }}\nlonger_than = {longer}");
        call(&pulse(&rule), "never").0
    };
    assert_eq!(never("6"), Call::Proved);
    assert_eq!(never("5.999999"), Call::Refuted);
}

/// What the method does not cover, and what a budget ends, is never counted as proved.
#[test]
fn what_is_left_open_says_why() {
    let text = latch("[4, 8]", "[5, 9]").replace("delay = [5, 9]", "delay = [5, 9], filter = \"transport\"");
    let (_, open) = proof(&text, 1000);
    assert!(!open.claims.is_empty());
    for claim in &open.claims {
        assert_eq!(claim.call, Call::NotCovered);
        assert!(claim.reason.as_ref().unwrap().contains("qn is none"), "{claim:?}");
    }
    let (_, short) = proof(include_str!("../scenarios/interlock.toml"), 3);
    assert!(short.claims.iter().all(|claim| claim.call == Call::Undecided), "{:?}", short.claims);
    assert!(short.claims.iter().all(|claim| claim.reason.as_ref().unwrap().contains("zones ran out")));
}

/// An essential hazard is refuted by a case even where the budget leaves other claims open.
#[test]
fn what_is_found_before_the_budget_ends_was_found() {
    let (asked, short) = proof(include_str!("../scenarios/stepper.toml"), 1000);
    let expect = |claim: &&stillgate::proof::Claim| asked.questions[claim.question as usize].rule.word() == "expect";
    let expected: Vec<Call> = short.claims.iter().filter(expect).map(|claim| claim.call).collect();
    assert!(expected.contains(&Call::Refuted), "{expected:?}");
    assert!(expected.contains(&Call::Undecided), "{expected:?}");
    assert!(!expected.contains(&Call::Proved), "{expected:?}");
}

/// Of two windows that can both oscillate, the way from the first past its rest to the second hides neither.
#[test]
fn an_oscillation_before_another_is_found() {
    let text = r#"
[inputs]
a = 1
[initial]
g = 1
h = 1
[gates]
g = { buf = ["h"], delay = [30, 90] }
h = { xor = ["h", "a", "g"], fall = [18, 54], rise = [20, 60] }
[[steps]]
set = { a = 0 }
[[steps]]
rest = 76
set = { a = 1 }
"#;
    let (asked, proof) = proof(text, 50_000);
    let oscillates = |claim: &&stillgate::proof::Claim| {
        asked.questions[claim.question as usize].rule == stillgate::findings::RuleKey::Oscillation
    };
    let claims: Vec<_> = proof.claims.iter().filter(oscillates).collect();
    assert_eq!(claims.iter().map(|it| (it.call, it.but_for_ties)).collect::<Vec<_>>(), [(Call::Refuted, false); 2]);
}

/// A glitch belongs to the window of its step, also where the next step comes at the same instant, or changes nothing here.
#[test]
fn windows_go_on_past_steps_that_begin_none() {
    let selector = include_str!("../scenarios/selector.toml");
    let head = selector.split("[[steps]]").next().unwrap();
    for place in ["after = 0", "after = 3"] {
        let first = "[[steps]]\nat = 50\nset = { choose_upper = 0 }\n";
        let second = format!("[[steps]]\n{place}\nset = {{ gauge_upper = 1 }}\n");
        let (asked, proof) = proof(&format!("{head}{first}{second}"), 20_000);
        let first = |claim: &&stillgate::proof::Claim| {
            let question = &asked.questions[claim.question as usize];
            question.rule.word() == "glitch_free" && question.moment == Some(0)
        };
        let call = proof.claims.iter().find(first).unwrap().call;
        assert_ne!(call, Call::Proved, "{place}");
    }
}

/// `never` looks at the state at the start as well, even where the first step comes at once.
#[test]
fn the_start_counts() {
    let text = "[inputs]\na = 0\n[gates]\ny = { buf = [\"a\"], delay = [2, 3] }\n[[rules.never]]\nstate = { a = 0, y = 0 }\n[[steps]]\nat = 0\nset = { a = 1 }\n";
    assert_eq!(call(text, "never"), (Call::Refuted, false));
    assert_eq!(call(&text.replace("{ a = 0, y = 0 }", "{ a = 0, y = 1 }"), "never"), (Call::Proved, false));
}

/// The command writes a case for what is refuted, and the case shows it when it is run as the text says.
#[test]
fn refuted_cases_replay() {
    let folder = tempfile::tempdir().unwrap();
    let run = |arguments: &[&str]| {
        let done = Command::new(env!("CARGO_BIN_EXE_stillgate")).args(arguments).output().unwrap();
        (done.status.code(), String::from_utf8(done.stdout).unwrap())
    };
    let scenario = concat!(env!("CARGO_MANIFEST_DIR"), "/scenarios/selector.toml");
    let out = folder.path().join("proof");
    let out = out.to_str().unwrap();
    let (code, text) = run(&["prove", scenario, "--out", out, "--strict"]);
    assert_eq!(code, Some(1), "{text}");
    assert!(text.contains("9 proved, 1 refuted, 0 undecided, 0 not covered"), "{text}");
    let line = text.lines().find(|line| line.contains("stillgate run")).unwrap();
    let words: Vec<&str> = line.split_whitespace().skip(1).collect();
    let again = folder.path().join("run");
    let (code, shown) = run(&[&words[..], &["--out", again.to_str().unwrap()]].concat());
    assert_eq!(code, Some(0));
    assert!(shown.contains("glitch"), "{shown}");

    let (code, json) = run(&["prove", scenario, "--out", out, "--json"]);
    assert_eq!(code, Some(0));
    let json: serde_json::Value = serde_json::from_str(&json).unwrap();
    assert_eq!(json["format"], 1);
    let refuted = json["claims"].as_array().unwrap().iter().filter(|claim| claim["verdict"] == "refuted");
    let files: Vec<&str> = refuted.map(|claim| claim["witness"].as_str().unwrap()).collect();
    let number = json["claims"].as_array().unwrap().iter().position(|claim| claim["verdict"] == "refuted").unwrap() + 1;
    assert_eq!(files, [format!("refuted-{number}.toml")], "the number of its claim");
    assert_eq!(json["windows"][0]["settling"][1], 23);
}

/// What recurs before the next step comes is an oscillation, though it ends: the proof says so as the run does.
#[test]
fn a_ring_that_is_let_go_for_a_while() {
    let ring = |steps: &str| {
        format!(
            "[inputs]\ngo = 0\n[gates]\na = {{ nand = [\"go\", \"c\"], delay = [2, 3] }}\nb = {{ not = [\"a\"], delay = [2, 3] }}\nc = {{ not = [\"b\"], delay = [2, 3] }}\n{steps}"
        )
    };
    let timed = ring("[[steps]]\nat = 10\nset = { go = 1 }\n[[steps]]\nafter = 800\nset = { go = 0 }\n");
    assert_eq!(call(&timed, "oscillation").0, Call::Refuted);
    let clocked = ring("[[clocks]]\nnet = \"go\"\nfirst = 10\nperiod = 1600\nhigh = 800\ncount = 1\n");
    assert_eq!(call(&clocked, "oscillation").0, Call::Refuted);
}

/// A clock of one period in ranges: bounds on times from edge to edge hold at the femtosecond and not beyond, jitter included.
#[test]
fn clocks_at_their_bounds() {
    let clock = |rule: &str, jitter: &str| {
        format!(
            r#"
[inputs]
tick = 0
[gates]
y = {{ buf = ["tick"], rise = [2, 4], fall = [3, 6] }}
[[clocks]]
net = "tick"
first = [10, 30]
period = [98, 102]
high = [40, 44]
{jitter}
count = 2
[rules]
{rule}
"#
        )
    };
    let high = |ns: &str, jitter: &str| {
        call(&clock(&format!("min_pulse = {{ y = {{ high = {ns} }} }}"), jitter), "min_pulse").0
    };
    // 40 - 4 + 3
    assert_eq!(high("39", ""), Call::Proved);
    assert_eq!(high("39.000001", ""), Call::Refuted);
    // and both edges nearer by 1
    assert_eq!(high("37", "jitter = 1"), Call::Proved);
    assert_eq!(high("37.000001", "jitter = 1"), Call::Refuted);
    // from rise to rise: 98, and y's own rise does not vary from one to the next where delays are constant
    let period = |ns: &str| {
        let rule = format!("[[rules.timing]]\nfrom = \"tick rise\"\nto = \"tick rise\"\nmin = {ns}");
        call(&clock(&rule, "jitter = 1"), "timing").0
    };
    assert_eq!(period("96"), Call::Proved);
    assert_eq!(period("96.000001"), Call::Refuted);
}

/// An edge and a step that may cross: what the case shows is made of one period, one time high and one first edge.
#[test]
fn a_clock_and_a_step_that_may_cross() {
    let gated = |at: &str| {
        format!(
            r#"
outputs = ["out"]
[inputs]
open = 0
tick = 0
[gates]
out = {{ and = ["open", "tick"], delay = [1, 2] }}
[[steps]]
at = {at}
set = {{ open = 1 }}
[[clocks]]
net = "tick"
first = [10, 12]
period = [50, 51]
high = [20, 21]
count = 4
[rules]
glitch_free = []
min_pulse = {{ out = {{ high = 15 }} }}
"#
        )
    };
    // the third pulse is from [110, 114] to [130, 135]
    let cut = gated("[116, 120]");
    assert_eq!(call(&cut, "min_pulse").0, Call::Refuted);
    assert_eq!(call(&gated("[136, 150]"), "min_pulse").0, Call::Proved);
    let (asked, proof) = proof(&cut, 20_000);
    let claim = proof.claims.iter().find(|claim| claim.call == Call::Refuted).unwrap();
    assert_eq!(asked.questions[claim.question as usize].rule.word(), "min_pulse");
    let clock = &claim.witness.as_ref().unwrap().clocks[0];
    let inside =
        |span: stillgate::time::Span, ns: [u64; 2]| (ns[0] * 1_000_000..=ns[1] * 1_000_000).contains(&span.fs());
    assert!(
        inside(clock.first, [10, 12]) && inside(clock.period, [50, 51]) && inside(clock.high, [20, 21]),
        "{clock:?}"
    );
}

/// Beside a clock a window of an edge counts from that edge, also while inputs of a step before it still change: at 105 ns the
/// edge comes, up to 15 ns later the last input of the step, and y moves 2 to 3 ns after that.
#[test]
fn an_edge_counts_from_itself_while_inputs_are_late() {
    let text = "outputs = [\"y\"]\n[inputs]\na = 0\nb = 1\nc = 0\n[gates]\ny = { xor = [\"b\", \"c\"], delay = [2, 3] }\n\
        z = { and = [\"a\", \"b\"], delay = [2, 3] }\n[[clocks]]\nnet = \"c\"\nfirst = 105\nperiod = 1000\nhigh = 400\ncount = 1\n\
        [[steps]]\nat = 100\nset = { a = 1, b = 0 }\nskew = [0, 20]\n";
    let (_, proved) = proof(text, 20_000);
    let ns = |n: u64| Span::from_fs(n * 1_000_000);
    let bounds: Vec<_> = proved.windows.iter().map(|window| window.settling).collect();
    assert_eq!(bounds, [Some((Span::ZERO, ns(3))), Some((Span::ZERO, ns(18))), Some((ns(2), ns(3)))]);
    let rise = |text: &str| {
        let (asked, proved) = proof(text, 20_000);
        let of = |claim: &&stillgate::proof::Claim| {
            let question = &asked.questions[claim.question as usize];
            question.rule.word() == "settle_within" && question.moment == Some(1)
        };
        proved.claims.iter().find(of).unwrap().call
    };
    assert_eq!(rise(&format!("{text}[rules]\nsettle_within = 18\n")), Call::Proved);
    assert_ne!(rise(&format!("{text}[rules]\nsettle_within = \"17.9 ns\"\n")), Call::Proved);
}

/// Parts of a circuit may count from different inputs of one step: the least time of the whole is not that of a part.
#[test]
fn skew_over_two_parts_has_no_least_time() {
    let text = "outputs = [\"y\"]\n[inputs]\na = 0\nb = 0\nk = 0\n[gates]\ny = { buf = [\"a\"], delay = [2, 3] }\n\
        z = { and = [\"k\", \"b\"], delay = [2, 3] }\n[[steps]]\nat = 100\nset = { a = 1, b = 1 }\nskew = [0, 20]\n";
    let ns = |n: u64| Span::from_fs(n * 1_000_000);
    assert_eq!(proof(text, 20_000).1.windows[0].settling, Some((Span::ZERO, ns(3))));
    let without = text.replace("skew = [0, 20]\n", "");
    assert_eq!(proof(&without, 20_000).1.windows[0].settling, Some((ns(2), ns(3))));
}
