//! What the program assumed where a scenario says nothing.

use crate::circuit::GateId;
use crate::output::words;
use crate::scenario::{Begin, Scenario};

/// What was assumed, a sentence each, with the names of at most `most` gates a sentence.
pub(super) fn assumptions(scenario: &Scenario, most: usize) -> Vec<String> {
    let delays = &scenario.delays;
    let mut all = Vec::new();
    if !delays.no_delay.is_empty() {
        let many = words::many(delays.no_delay.len() as u64, "gate");
        let names = names(scenario, &delays.no_delay, most);
        all.push(format!("{many} without any delay given: each takes 1 {} ({names}).", scenario.unit));
    }
    if !delays.assumed_min.is_empty() {
        let many = words::many(delays.assumed_min.len() as u64, "gate");
        let names = names(scenario, &delays.assumed_min, most);
        all.push(format!("{many} without a minimum given: it is assumed from typical ({names})."));
    }
    match scenario.begin {
        Begin::AtRest { .. } => {}
        Begin::Random => all.push("Every run begins with random gate outputs.".into()),
        Begin::Unknown => all.push("Every run begins with unknown gate outputs (X).".into()),
    }
    all
}

fn names(scenario: &Scenario, gates: &[GateId], most: usize) -> String {
    let nets: Vec<_> = gates.iter().map(|gate| scenario.circuit.net_of(*gate)).collect();
    words::some_names(&words::nets(scenario, &nets), most)
}
