//! Steps that wait for a pattern, tolerated glitches and wanted oscillations: claims at bounds that are worked out by hand.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::proof::{Call, Spend, prove};

use crate::bounded::read;

/// The gravest verdict of the claims of a rule.
fn call(text: &str, rule: &str) -> Call {
    let scenario = read(text);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let proof = prove(&scenario, &program, &asked, &Spend::default(), &Control::default());
    let of = proof.claims.iter().filter(|it| asked.questions[it.question as usize].rule.word() == rule);
    of.map(|claim| claim.call).max_by_key(|call| call.severity()).unwrap()
}

/// `y` follows 4 to 6 after `a`, and 1 to 3 after that the step sets `b`: 5 to 9 after `a`.
#[test]
fn a_pattern_is_waited_for() {
    let waits = |timeout: &str, rules: &str| {
        format!(
            r#"
[inputs]
a = 0
b = 0
[gates]
y = {{ buf = ["a"], delay = [4, 6] }}
z = {{ buf = ["b"], delay = 1 }}
[[steps]]
at = 10
set = {{ a = 1 }}
[[steps]]
when = {{ y = 1 }}
wait = [1, 3]
{timeout}
set = {{ b = 1 }}
[rules]
{rules}
"#
        )
    };
    // what comes at the very instant of the timeout has come
    assert_eq!(call(&waits("timeout = 6", ""), "when"), Call::Proved);
    assert_eq!(call(&waits("timeout = 5.999999", ""), "when"), Call::Refuted);
    assert_eq!(call(&waits("", ""), "when"), Call::Proved);
    assert_eq!(call(&waits("", "").replace("when = { y = 1 }", "when = { y = 1, z = 1 }"), "when"), Call::Refuted);
    let timing = |bound: &str| {
        let rule = format!("[[rules.timing]]\nfrom = \"a rise\"\nto = \"b rise\"\n{bound}");
        call(&waits("timeout = 20", &rule), "timing")
    };
    assert_eq!(timing("min = 5"), Call::Proved);
    assert_eq!(timing("min = 5.000001"), Call::Refuted);
    assert_eq!(timing("max = 9"), Call::Proved);
    assert_eq!(timing("max = 8.999999"), Call::Refuted);
}

/// What two gates show between their changes at one instant is no state: the pattern is looked for after whole batches.
#[test]
fn a_pattern_between_the_parts_of_a_batch_has_not_come() {
    let two = |second: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
y = {{ buf = ["a"], delay = 5 }}
w = {{ buf = ["a"], delay = {second} }}
[[steps]]
at = 10
set = {{ a = 1 }}
[[steps]]
when = {{ y = 1, w = 0 }}
set = {{ a = 0 }}
"#
        )
    };
    assert_eq!(call(&two("5"), "when"), Call::Refuted);
    assert_eq!(call(&two("6"), "when"), Call::Proved);
    assert_eq!(call(&two("[5, 6]"), "when"), Call::Refuted);
    assert_eq!(call(&two("[5.000001, 6]"), "when"), Call::Proved);
}

/// An oscillation that never shows the pattern is waited through for ever; with a timeout the wait ends.
#[test]
fn a_pattern_that_an_oscillation_never_shows() {
    let text = r#"
[inputs]
go = 0
b = 0
[gates]
r = { nand = ["go", "t"], delay = [2, 3] }
s = { not = ["r"], delay = [2, 3] }
t = { not = ["s"], delay = [2, 3] }
q = { and = ["go", "b"], delay = 1 }
[[steps]]
at = 10
set = { go = 1 }
[[steps]]
when = { q = 1 }
set = { b = 1 }
[rules]
oscillation = "allowed"
"#;
    assert_eq!(call(text, "when"), Call::Refuted);
    assert_eq!(call(&text.replace("q = 1", "t = 0"), "when"), Call::Proved);
}

/// The pulse at `y` is as long as `n` takes, and longer by what falling takes more than rising: 2 + 1 - 2 to 3 + 2 - 1.
#[test]
fn glitches_shorter_than_a_bound_are_tolerated() {
    let pulse = |shorter: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
n = {{ not = ["a"], delay = [2, 3] }}
y = {{ and = ["a", "n"], rise = [1, 2], fall = [1, 2] }}
[[steps]]
at = 10
set = {{ a = 1 }}
[rules.glitch_free]
y = {{ shorter_than = {shorter} }}
"#
        )
    };
    assert_eq!(call(&pulse("4.000001"), "glitch_free"), Call::Proved);
    assert_eq!(call(&pulse("4"), "glitch_free"), Call::Refuted);
    assert_eq!(call(&pulse("1"), "glitch_free"), Call::Refuted);
}

/// A ring that is let go has no state of rest; held, or of an even number of inverters, it has.
#[test]
fn oscillations_that_are_wanted() {
    let ring = |value: u8, rule: &str, own: &str| {
        format!(
            r#"
[inputs]
go = 0
[gates]
r = {{ nand = ["go", "t"], delay = [2, 3] }}
s = {{ not = ["r"], delay = [2, 3] }}
t = {{ not = ["s"], delay = [2, 3] }}
[[steps]]
at = 10
set = {{ go = {value} }}
{own}
[rules]
oscillation = "{rule}"
"#
        )
    };
    let own = "oscillation = \"required\"";
    assert_eq!(call(&ring(1, "required", ""), "oscillation"), Call::Proved);
    assert_eq!(call(&ring(1, "allowed", own), "oscillation"), Call::Proved);
    assert_eq!(call(&ring(0, "required", ""), "oscillation"), Call::Refuted);
    assert_eq!(call(&ring(0, "allowed", own), "oscillation"), Call::Refuted);
}

/// A step that changes nothing begins a window of its own for what is expected of it, and the start counts.
#[test]
fn steps_that_change_nothing() {
    let idle = |expect: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
y = {{ buf = ["a"], delay = [5, 6] }}
[[steps]]
at = 0
set = {{ a = 1 }}
[[steps]]
after = 3
set = {{ a = 0 }}
[[steps]]
after = 100
set = {{ a = 0 }}
{expect}
[[rules.never_at_rest]]
state = {{ a = 0, y = 0 }}
"#
        )
    };
    assert_eq!(call(&idle("expect = { y = 1 }"), "expect"), Call::Refuted);
    assert_eq!(call(&idle("expect = { y = 0 }"), "expect"), Call::Proved);
    assert_eq!(call(&idle("edges = { y = 1 }"), "edges"), Call::Refuted);
    assert_eq!(call(&idle("edges = { y = 0 }"), "edges"), Call::Proved);
    assert_eq!(call(&idle(""), "never_at_rest"), Call::Refuted);
}

/// A step at rest waits for the whole circuit, also where a question is about a part of it: the input goes back 7 to 9 after it
/// came, which is when the slow gate rests.
#[test]
fn a_step_at_rest_waits_for_gates_outside_the_cone() {
    let slow = |rule: &str| {
        format!(
            r#"
[inputs]
a = 0
[gates]
slow = {{ buf = ["a"], delay = [7, 9] }}
y = {{ buf = ["a"], delay = 1 }}
[[steps]]
at = 10
set = {{ a = 1 }}
[[steps]]
rest = 0
set = {{ a = 0 }}
[rules]
{rule}
"#
        )
    };
    let max = |max: &str| {
        let rule = format!("[[rules.timing]]\nfrom = \"a rise\"\nto = \"a fall\"\nmax = {max}");
        call(&slow(&rule), "timing")
    };
    assert_eq!(max("9"), Call::Proved);
    assert_eq!(max("8.999999"), Call::Refuted);
    let never =
        |longer: &str| call(&slow(&format!("[[rules.never]]\nstate = {{ y = 1 }}\nlonger_than = {longer}")), "never");
    assert_eq!(never("9"), Call::Proved);
    assert_eq!(never("8.999999"), Call::Refuted);
}
