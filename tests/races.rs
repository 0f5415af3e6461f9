//! The inequality that decides a claim names the two sums of delays that race, and is where the engine says.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Answers, Asked, Judge};
use stillgate::instance::{Instance, Which};
use stillgate::proof::{Call, Claim, Proof, Race, Relation, Spend, Sum, prove};
use stillgate::scenario::Scenario;

use crate::bounded::read;

pub fn proof(scenario: &Scenario, margins: bool, padding: bool) -> (Asked, Proof) {
    let program = Program::new(scenario, &Control::default()).unwrap();
    let asked = Asked::of(scenario);
    let spend = Spend { zones: 20_000, margins, padding, ..Spend::default() };
    let proof = prove(scenario, &program, &asked, &spend, &Control::default());
    (asked, proof)
}

/// The claim of a rule at a step (by number, from 1), of a net if one is named.
pub fn claim<'a>(
    scenario: &Scenario,
    asked: &Asked,
    proof: &'a Proof,
    rule: &str,
    step: u32,
    net: Option<&str>,
) -> &'a Claim {
    let net = net.map(|net| scenario.circuit.net(net).unwrap());
    let fits = |claim: &&Claim| {
        let question = &asked.questions[claim.question as usize];
        question.rule.word() == rule && question.moment == Some(step - 1) && (net.is_none() || question.net == net)
    };
    proof.claims.iter().find(fits).unwrap_or_else(|| panic!("no {rule} at step {step}"))
}

/// The names in a sum, in order, with edges as `^` and `v`.
pub fn names(scenario: &Scenario, sum: &Sum) -> Vec<String> {
    let circuit = &scenario.circuit;
    let edges = |edges: [bool; 2]| match edges {
        [true, true] => "",
        [true, false] => "v",
        _ => "^",
    };
    let name = |quantity: stillgate::proof::Quantity| match quantity {
        stillgate::proof::Quantity::Gate(gate, of) => format!("{}{}", circuit.name(circuit.net_of(gate)), edges(of)),
        stillgate::proof::Quantity::Wire(wire, of) => {
            let (net, gate) = circuit.wires()[wire.index()];
            format!("{}>{}{}", circuit.name(net), circuit.name(circuit.net_of(gate)), edges(of))
        }
        stillgate::proof::Quantity::Place(step) => format!("step {}", step + 1),
        stillgate::proof::Quantity::First(clock) => format!("first {clock}"),
        stillgate::proof::Quantity::Period(clock) => format!("period {clock}"),
        stillgate::proof::Quantity::High(clock) => format!("high {clock}"),
        stillgate::proof::Quantity::Jitter(clock, edge) => format!("jitter {clock} {edge}"),
        stillgate::proof::Quantity::Toggle { step, net, number, .. } => {
            format!("toggle {} {} {}", number + 1, step + 1, circuit.name(net))
        }
        stillgate::proof::Quantity::Late(step, net) => format!("late {} {}", step + 1, circuit.name(net)),
    };
    let mut names: Vec<String> = sum.terms.iter().map(|(of, times)| name(*of).repeat(*times as usize)).collect();
    names.sort();
    names
}

pub fn sides(scenario: &Scenario, race: &Race) -> (Vec<String>, Relation, Vec<String>) {
    (names(scenario, &race.first), race.relation, names(scenario, &race.second))
}

const NS: i128 = 1_000_000;

fn latch(q: &str, qn: &str) -> Scenario {
    read(&crate::bounded::latch_text(q, qn))
}

/// Two cross-coupled gates let go at once: the sooner one wins. Overlapping ranges are refuted with that inequality, disjoint
/// ones proved; ranges that touch leave one exact tie, which goes on for ever, and is told as such.
#[test]
fn latches_let_go_at_once() {
    let scenario = latch("[4, 8]", "[5, 9]");
    let (asked, proof) = self::proof(&scenario, false, false);
    let race = claim(&scenario, &asked, &proof, "critical_race", 1, None);
    assert_eq!((race.call, race.but_for_ties), (Call::Refuted, false));
    let race = race.race.as_ref().unwrap();
    let (mut gates, relation, second) = sides(&scenario, race);
    gates.extend(second);
    gates.sort();
    assert_eq!(gates, ["q^", "qn^"]);
    assert_ne!(relation, Relation::Apart);
    // 8 against 5, or 9 against 4
    assert!([3 * NS, 5 * NS].contains(&race.short(&scenario)), "{race:?}");

    let scenario = latch("[4, 6]", "[7, 9]");
    let (_, proof) = self::proof(&scenario, false, false);
    assert!(proof.claims.iter().all(|claim| claim.call == Call::Proved && claim.race.is_none()), "{:?}", proof.claims);

    let scenario = latch("[4, 6]", "[6, 9]");
    let (asked, proof) = self::proof(&scenario, false, false);
    let oscillation = claim(&scenario, &asked, &proof, "oscillation", 1, None);
    assert_eq!((oscillation.call, oscillation.but_for_ties), (Call::Refuted, true), "{oscillation:?}");
    let (first, relation, second) = sides(&scenario, oscillation.race.as_ref().unwrap());
    assert_eq!(relation, Relation::Apart);
    assert_eq!([first, second].concat().len(), 2);
    // the other state at rest takes a tie that then ends otherwise: no constant delays do that
    let race = claim(&scenario, &asked, &proof, "critical_race", 1, None);
    assert_eq!((race.call, race.but_for_ties, race.race.is_some()), (Call::Undecided, true, false), "{race:?}");
}

/// A selector without its consensus term: the output drops unless the way that lets go is slow enough.
pub fn selector(wire: &str, more: &str) -> Scenario {
    read(&format!(
        r#"
outputs = ["y"]
[inputs]
a = 1
b = 1
c = 1
[gates]
na = {{ not = ["a"], rise = [2, 5], fall = [2, 5] }}
ab = {{ nand = ["a", "b"], rise = [3, 5], fall = [3, 5], wires = {{ a = {wire} }} }}
ac = {{ nand = ["na", "c"], rise = [3, 5], fall = [3, 5] }}
y = {{ nand = ["ab", "ac"], rise = [4, 7], fall = [4, 7] }}
[[steps]]
set = {{ a = 0 }}
{more}
"#
    ))
}

/// Runs a case in which all delays are typical but those named, in femtoseconds; does it break the question?
pub fn breaks(scenario: &Scenario, asked: &Asked, question: u32, delays: &[(&str, bool, i128)]) -> bool {
    let mut instance = Instance::of(scenario, &Which::Typ);
    for (gate, rise, fs) in delays {
        let net = scenario.circuit.net(gate).unwrap();
        let gate = scenario.circuit.driver(net).unwrap();
        let span = stillgate::time::Span::from_fs(*fs as u64);
        instance.delays.gate[gate.index()][usize::from(*rise)] = span;
    }
    let program = Program::new(scenario, &Control::default()).unwrap();
    let mut judge = Judge::new(scenario, asked, Answers::default());
    assert!(program.machine().run(&instance, &Control::default(), &mut judge));
    judge.sink.facts.iter().any(|fact| fact.breaks_rule && fact.subject.question == Some(question))
}

/// Static-1: `ab↑ + y↓` and the wire against `na↑ + ac↓`, 10 at most against 7 and a wire of 1 fs; the cured twin is proved,
/// and so is a wire that makes up for it.
#[test]
fn the_selector_that_drops() {
    let scenario = selector("\"1 fs\"", "");
    let (asked, proof) = self::proof(&scenario, false, false);
    let glitch = claim(&scenario, &asked, &proof, "glitch_free", 1, Some("y"));
    assert_eq!((glitch.call, glitch.but_for_ties), (Call::Refuted, false));
    let race = glitch.race.as_ref().unwrap();
    let (first, relation, second) = sides(&scenario, race);
    assert_eq!(first, ["acv", "na^"]);
    assert_eq!(second.iter().filter(|name| !name.starts_with("a>ab")).collect::<Vec<_>>(), ["ab^", "yv"]);
    assert_eq!(race.short(&scenario), 3 * NS - 1);
    // the engine agrees on both sides of it, 1 fs apart: 8 + 1 fs against a sum
    let at = |sum: i128| {
        breaks(
            &scenario,
            &asked,
            glitch.question,
            &[("na", true, sum - 4 * NS), ("ac", false, 4 * NS), ("ab", true, 4 * NS), ("y", false, 4 * NS)],
        )
    };
    // equal is just long enough to pass
    assert_eq!(relation, Relation::Below);
    assert!(at(8 * NS + 1) && !at(8 * NS));

    let cured = scenario_cured();
    let (asked, proof) = self::proof(&cured, false, false);
    assert_eq!(claim(&cured, &asked, &proof, "glitch_free", 1, Some("y")).call, Call::Proved);
    for (wire, call) in [("3.000001", Call::Proved), ("3", Call::Refuted)] {
        let scenario = selector(wire, "");
        let (asked, proof) = self::proof(&scenario, false, false);
        assert_eq!(claim(&scenario, &asked, &proof, "glitch_free", 1, Some("y")).call, call, "{wire}");
    }
}

fn scenario_cured() -> Scenario {
    let text = r#"
outputs = ["y"]
[inputs]
a = 1
b = 1
c = 1
[gates]
na = { not = ["a"], delay = [2, 5] }
ab = { nand = ["a", "b"], delay = [3, 5] }
ac = { nand = ["na", "c"], delay = [3, 5] }
bc = { nand = ["b", "c"], delay = [3, 5] }
y = { nand = ["ab", "ac", "bc"], delay = [4, 7] }
[[steps]]
set = { a = 0 }
"#;
    read(text)
}
