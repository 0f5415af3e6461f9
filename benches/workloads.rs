//! The scenarios that the speed of a run is measured on.

use stillgate::circuit::Function;
use stillgate::scenario::{BeginAt, Builder, NewStep, Scenario};

use super::networks::Draw;

/// A latch of two NANDs with this many input edges: set and released, reset and released.
pub fn latch(edges: usize) -> Scenario {
    let mut b = Builder::new("latch");
    b.input("s", true);
    b.input("r", true);
    b.gate("q", Function::Nand, ["s", "qn"]).delay(["6", "9", "14"]);
    b.gate("qn", Function::Nand, ["r", "q"]).delay(["6", "9", "14"]);
    b.initial("q", false);
    for i in 0..edges {
        let net = if i % 4 < 2 { "s" } else { "r" };
        b.step(NewStep::after("50").set(net, i % 2 == 1));
    }
    b.rules().glitch_free("q");
    b.samples(10_000u64);
    b.finish().expect("the latch is a good scenario")
}

/// Six NANDs that halve the frequency of `clock`; the output is `{name}.q`.
fn divider(b: &mut Builder, name: &str, clock: &str) {
    let n = |part: &str| format!("{name}.{part}");
    let nand = |b: &mut Builder, out: &str, ins: &[String]| {
        b.gate(n(out), Function::Nand, ins.iter().map(String::as_str)).delay(["6", "9", "14"]);
    };
    nand(b, "n1", &[n("n4"), n("n2")]);
    nand(b, "n2", &[n("n1"), clock.to_string()]);
    nand(b, "n3", &[n("n2"), clock.to_string(), n("n4")]);
    nand(b, "n4", &[n("n3"), n("qn")]);
    nand(b, "q", &[n("n2"), n("qn")]);
    nand(b, "qn", &[n("n3"), n("q")]);
    b.initial(n("q"), false); // the clock at 0 decides the rest
}

/// A chain of dividers, each driven by the output of the one before, and a chain of inverters at the last output, with
/// this many edges of the first clock.
pub fn dividers(stages: usize, inverters: usize, edges: usize) -> Scenario {
    let mut b = Builder::new("dividers");
    b.input("clock", false);
    let mut clock = "clock".to_string();
    for stage in 0..stages {
        divider(&mut b, &format!("d{stage}"), &clock);
        clock = format!("d{stage}.q");
    }
    for i in 0..inverters {
        b.gate(format!("i{i}"), Function::Not, [clock.as_str()]).delay(["6", "9", "14"]);
        clock = format!("i{i}");
    }
    for i in 0..edges {
        b.step(NewStep::after("1000").set("clock", i % 2 == 0));
    }
    b.rules().glitch_free(clock.as_str());
    b.output(clock.as_str());
    b.finish().expect("the dividers are a good scenario")
}

/// A network that never rests, which begins at random and runs for this many transitions. Of six gates three are a ring of
/// inverters; the others are a NAND, a NOR and an XOR that read two gates at most 100 places away. Delays are 15 to
/// 40 ps. The only input stays as it is, but for one change far beyond the end: periodic rings do not end the run.
pub fn busy(gates: usize, transitions: u64) -> Scenario {
    let mut draw = Draw::new(1);
    let mut b = Builder::new("always busy");
    b.begin(BeginAt::Random);
    b.default_delays().delay(["0.015", "0.025", "0.040"]);
    b.input("run", true);
    let name = |at: usize| format!("g{at}");
    for at in 0..gates {
        let mut near = || name((at + gates - 1 - draw.below(100.min(gates - 1))) % gates);
        let (function, pins) = match at % 6 {
            0 if at + 2 < gates => (Function::Nand, vec!["run".into(), name(at + 2)]),
            1 | 2 => (Function::Not, vec![name(at - 1)]),
            0 => (Function::Not, vec![near()]),
            3 => (Function::Nand, vec![near(), near()]),
            4 => (Function::Nor, vec![near(), near()]),
            _ => (Function::Xor, vec![near(), near()]),
        };
        b.gate(name(at), function, pins.iter().map(String::as_str));
    }
    b.step(NewStep::after("1000000").set("run", false));
    b.only_named_outputs();
    b.limit_transitions(transitions);
    b.finish().expect("the rings are a good scenario")
}
