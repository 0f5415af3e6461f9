//! Scenarios of any size that keep every gate at work.

use stillgate::circuit::{Function, NetId};
use stillgate::engine::{Finish, Observer};
use stillgate::logic::Value;
use stillgate::scenario::{Builder, NewStep, Scenario};
use stillgate::time::Time;

const DELAY: [&str; 3] = ["6", "9", "14"];
/// Rows of the grid.
const ROWS: u64 = 20;

/// Rings of three inverting gates, let go at 10 ns, each ring read by an XOR that also reads the XOR before: one network,
/// whose state does not come back in any run of interest. It runs until it has made so many transitions.
pub fn rings(gates: u64, transitions: u64) -> Scenario {
    let mut b = Builder::new("rings");
    b.input("go", false);
    let mut before = "go".to_string();
    for ring in 0..gates.div_ceil(4) {
        let n = |part: &str| format!("{part}{ring}");
        b.gate(n("a"), Function::Nand, ["go".to_string(), n("c")]).delay(DELAY);
        b.gate(n("b"), Function::Not, [n("a")]).delay(DELAY);
        b.gate(n("c"), Function::Not, [n("b")]).delay(DELAY);
        b.gate(n("x"), Function::Xor, [n("c"), before]).delay(DELAY);
        before = n("x");
    }
    b.output(before);
    b.step(NewStep::at("10").set("go", true));
    b.limit_transitions(transitions);
    b.finish().expect("the rings are a good scenario")
}

/// A grid of 20 rows of XORs, each reading two of the row before; every tenth input changes in each of four steps.
pub fn grid(gates: u64) -> Scenario {
    let columns = gates / ROWS;
    let mut b = Builder::new("grid");
    for c in 0..columns {
        b.input(format!("i{c}"), c % 3 == 0);
    }
    for r in 0..ROWS {
        for c in 0..columns {
            let source = |c: u64| {
                let c = c % columns;
                if r == 0 { format!("i{c}") } else { format!("g{}.{c}", r - 1) }
            };
            b.gate(format!("g{r}.{c}"), Function::Xor, [source(c), source(c + 7)]).delay(DELAY);
        }
    }
    for i in 0..4 {
        let mut step = NewStep::rest("10");
        for c in (i..columns).step_by(10) {
            step = step.set(format!("i{c}"), c % 3 != 0);
        }
        b.step(step);
    }
    b.output(format!("g{}.0", ROWS - 1));
    b.limit_transitions(1u64 << 40);
    b.finish().expect("the grid is a good scenario")
}

/// A latch of two NANDs, set and reset once: eight transitions a sample.
pub fn latch() -> Scenario {
    let mut b = Builder::new("latch");
    b.input("s", true);
    b.input("r", true);
    b.gate("q", Function::Nand, ["s", "qn"]).delay(DELAY);
    b.gate("qn", Function::Nand, ["r", "q"]).delay(DELAY);
    b.initial("q", false);
    for (net, value) in [("s", false), ("s", true), ("r", false), ("r", true)] {
        b.step(NewStep::after("50").set(net, value));
    }
    b.rules().glitch_free("q");
    b.finish().expect("the latch is a good scenario")
}

/// A divider of six NANDs, with 20 edges of its clock.
pub fn divider() -> Scenario {
    let mut b = Builder::new("divider");
    b.input("c", false);
    let pins: [(&str, &[&str]); 6] = [
        ("n1", &["n4", "n2"]),
        ("n2", &["n1", "c"]),
        ("n3", &["n2", "c", "n4"]),
        ("n4", &["n3", "qn"]),
        ("q", &["n2", "qn"]),
        ("qn", &["n3", "q"]),
    ];
    for (name, pins) in pins {
        b.gate(name, Function::Nand, pins.iter().copied()).delay(DELAY);
    }
    b.initial("q", false);
    for edge in 0..20 {
        b.step(NewStep::after("1000").set("c", edge % 2 == 0));
    }
    b.rules().glitch_free("q");
    b.finish().expect("the divider is a good scenario")
}

/// Counts transitions.
#[derive(Default)]
pub struct Count(pub u64);

impl Observer for Count {
    type Tag = ();

    fn change(&mut self, _: Time, _: NetId, _: Value, _: ()) {}

    fn finish(&mut self, finish: &Finish<'_>) {
        self.0 = finish.events;
    }
}
