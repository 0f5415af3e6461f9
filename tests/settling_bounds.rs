//! The settling bounds of a proof: no draw goes beyond them, and in loop-free circuits a case meets the greatest to the
//! femtosecond, also where the longest path through the gates is a false one.

use std::path::Path;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::delay::Marginal;
use stillgate::engine::{Program, Trace};
use stillgate::findings::{Asked, RuleKey};
use stillgate::instance::Instance;
use stillgate::proof::{Call, Claim, Proof, Spend, prove};
use stillgate::scenario::{Scenario, Vary};
use stillgate::sweep::{conclude, run_samples};
use stillgate::time::Span;

use crate::bounded::read;
use crate::support::share;

const ZONES: u64 = 20_000;

fn proof(scenario: &Scenario) -> Proof {
    let control = Control::default();
    let program = Program::new(scenario, &control).unwrap();
    let spend = Spend { zones: ZONES, ..Spend::default() };
    prove(scenario, &program, &Asked::of(scenario), &spend, &control)
}

/// Uniform draws and draws of the ends alone, anew for each event where the proof allows that, stay within what is proved
/// of each window. Returns how many windows had bounds.
fn within(path: &str, scenario: &mut Scenario, samples: u64) -> u64 {
    let proof = proof(scenario);
    let control = Control::default();
    let (asked, program) = (Asked::of(scenario), Program::new(scenario, &control).unwrap());
    let kinds = [(Marginal::Uniform, Vary::PerPart), (Marginal::Corners, Vary::PerPart)];
    for (draw, vary) in kinds {
        (scenario.plan.draw, scenario.plan.vary, scenario.plan.samples) = (draw, vary, samples);
        let tally = run_samples(scenario, &program, &asked, 0..samples, 2, &control);
        let sweep = conclude(scenario, &asked, &tally);
        assert_eq!(sweep.samples, samples);
        for window in &proof.windows {
            let seen = &sweep.windows[window.moment as usize].settling;
            let (Some((least, most)), Some(seen)) = (window.settling, seen) else { continue };
            let moment = &scenario.stimulus.moments[window.moment as usize];
            let skewed = scenario.stimulus.step_of(moment).is_some_and(|step| step.skew.is_some());
            let at = format!("{path}, {}: {seen:?}, proved {least:?} to {most:?}", moment.label);
            // ends of ranges tie, and what takes exactly equal times may be left out; a cut window has not settled
            if !window.settling_but_for_ties {
                let late = if window.settling_below { seen.max >= most } else { seen.max > most };
                assert!(seen.max_at_least || !late, "{at}");
                assert!(skewed || seen.min.is_none_or(|min| least <= min), "{at}");
            }
        }
    }
    proof.windows.iter().filter(|window| window.settling.is_some()).count() as u64
}

/// 100,000 draws of each kind on the selector and on a latch that many delays decide, fewer on the other demonstrations.
#[test]
fn no_draw_settles_later_or_sooner_than_proved() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let mut bounded = 0;
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_none_or(|it| it != "toml") {
            continue;
        }
        let mut scenario = stillgate::reader::load(&path).unwrap().scenario;
        let many = path.file_stem().is_some_and(|stem| stem == "selector");
        bounded += within(&path.display().to_string(), &mut scenario, share(if many { 100_000 } else { 2_000 }));
    }
    assert!(bounded > 40, "{bounded}");

    let mut latch = read(&crate::bounded::latch_text("[4, 8]", "[5, 9]"));
    assert!(within("latch", &mut latch, share(100_000)) > 0);
}

/// The claims about settling within so long, one a watched net; the bounds of the window, and whether the greatest is only
/// come near to.
fn settles(scenario: &Scenario) -> (Vec<Claim>, Option<(Span, Span)>, bool) {
    let asked = Asked::of(scenario);
    let proof = proof(scenario);
    let window = proof.windows.iter().find(|window| window.moment == 0).unwrap();
    let of = |claim: &Claim| asked.questions[claim.question as usize].rule == RuleKey::SettleWithin;
    (proof.claims.iter().filter(|claim| of(claim)).cloned().collect(), window.settling, window.settling_below)
}

fn run(scenario: &Scenario, case: &Instance) -> Span {
    let program = Program::new(scenario, &Control::default()).unwrap();
    let mut trace = Trace::default();
    assert!(program.machine().hear(case, &Control::default(), &mut trace));
    trace.windows[0].settling.expect("it comes to rest")
}

/// The greatest sum of delays along any path of gates from the input that changes: what a look at the graph alone would say.
fn longest_path(scenario: &Scenario) -> u64 {
    let circuit = &scenario.circuit;
    let mut until = vec![None; circuit.net_count()];
    let moved = scenario.stimulus.steps[0].set[0].0;
    until[moved.index()] = Some(0u64);
    // files list gates after what they read
    for gate in circuit.gates() {
        let net = NetId(circuit.input_count() as u32 + gate.0);
        let latest = circuit.sources(gate).iter().filter_map(|(source, _)| until[source.index()]).max();
        let slowest = scenario.delays.gate[gate.index()].iter().map(|range| range.max.fs()).max().unwrap();
        until[net.index()] = latest.map(|latest| latest + slowest);
    }
    until.into_iter().flatten().max().unwrap()
}

/// The greatest settling time is proved to the femtosecond, and where it can be met, a case that runs meets it.
/// Returns whether it is below the longest path.
fn is_met(text: &dyn Fn(&str) -> String) -> bool {
    let shown = |fs: u64| format!("{}.{:06}", fs / 1_000_000, fs % 1_000_000);
    let (_, bounds, below) = settles(&read(&text("1000")));
    let (_, most) = bounds.unwrap_or_else(|| panic!("no bounds: {}", text("1000")));
    let at = read(&text(&shown(most.fs())));
    assert!(settles(&at).0.iter().all(|claim| claim.call == Call::Proved), "{}", text(&shown(most.fs())));
    assert!(most.fs() <= longest_path(&at), "{}", text("1000"));
    if most.fs() > 0 {
        let text = text(&shown(most.fs() - 1));
        let scenario = read(&text);
        let refuted: Vec<Claim> = settles(&scenario).0.into_iter().filter(|it| it.call != Call::Proved).collect();
        // what is come near to is not met a femtosecond earlier either
        assert_eq!(refuted.is_empty(), below, "{refuted:?} {text}");
        for claim in refuted {
            // it may take a gate that fires twice with two delays, and constant ones were looked for
            let Some(case) = &claim.witness else {
                assert_eq!(claim.call, Call::Undecided, "{claim:?} {text}");
                continue;
            };
            assert_eq!((claim.call, run(&scenario, case)), (Call::Refuted, most), "{text}");
        }
    }
    most.fs() < longest_path(&at)
}

/// A carry that skips two stages: the path through both stages and the skip is never taken, since the skip is open only
/// where both stages pass the carry on, and then the carry has come along the skip already.
///
/// The example of a false path in McGeer, Brayton, "Efficient algorithms for computing the longest viable path in a
/// combinational network", 1989 (from memory); the delays are ours.
#[test]
fn a_carry_that_skips_takes_the_true_path() {
    let text = |within: &str| {
        format!(
            r#"
[inputs]
carry = 0
p = 1
[gates]
one = {{ and = ["carry", "p"], delay = [6, 10] }}
two = {{ and = ["one", "p"], delay = [6, 10] }}
skip = {{ and = ["carry", "p"], delay = [5, 8] }}
held = {{ not = ["p"], delay = [1, 2] }}
slow = {{ and = ["two", "held"], delay = [5, 10] }}
out = {{ or = ["slow", "skip"], delay = [2, 4] }}
[rules]
glitch_free = ["one", "two", "skip", "held", "slow", "out"]
settle_within = {within}
[[steps]]
set = {{ carry = 1 }}
"#
        )
    };
    // along the graph 10 + 10 + 10 + 4; `two` moves after 12 to 20, and what it leads to is shut
    let scenario = read(&text("1000"));
    assert_eq!(longest_path(&scenario), 34_000_000);
    assert_eq!(settles(&scenario).1, Some((Span::from_fs(12_000_000), Span::from_fs(20_000_000))));
    assert!(is_met(&text), "the longest path is false");
}

/// Random loop-free networks of two to six gates.
#[test]
fn bounds_of_loop_free_networks_are_met() {
    let mut rng = ChaCha8Rng::seed_from_u64(2026);
    let (mut met, mut false_paths) = (0, 0);
    let many = share(300);
    while met < many {
        let inputs = ["a", "b"];
        let gates: usize = rng.random_range(2..=6);
        let mut lines = String::new();
        for gate in 0..gates {
            let source = |from: usize| if from < 2 { inputs[from].to_string() } else { format!("g{}", from - 2) };
            let kind = ["and", "or", "nand", "nor", "xor"][rng.random_range(0..5)];
            // one pin reads the gate before, so that paths are long
            let first = if gate == 0 { 0 } else { gate + 1 };
            let second = rng.random_range(0..gate + 2);
            if first == second {
                lines += &format!("g{gate} = {{ not = [\"{}\"], delay = ", source(first));
            } else {
                lines += &format!("g{gate} = {{ {kind} = [\"{}\", \"{}\"], delay = ", source(first), source(second));
            }
            let least: u64 = rng.random_range(1..8);
            lines += &format!("[{least}, {}] }}\n", least + rng.random_range(0..6u64));
        }
        let b = rng.random_range(0..2u8);
        let names: Vec<String> = (0..gates).map(|gate| format!("\"g{gate}\"")).collect();
        let rules = format!("[rules]\nglitch_free = [{}]\nsettle_within = ", names.join(", "));
        let text = |within: &str| {
            format!("[inputs]\na = 0\nb = {b}\n[gates]\n{lines}{rules}{within}\n[[steps]]\nset = {{ a = 1 }}\n")
        };
        met += 1;
        false_paths += u64::from(is_met(&text));
    }
    assert!(false_paths * 10 > many && false_paths < many, "{false_paths} of {many}");
}
