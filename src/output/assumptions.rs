//! What the program assumed where a scenario says nothing.

use crate::circuit::GateId;
use crate::delay::Marginal;
use crate::output::words;
use crate::scenario::{Begin, Scenario, Vary};

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
    if scenario.plan.vary == Vary::PerEvent {
        all.push(per_event(scenario));
    }
    match scenario.begin {
        Begin::AtRest { .. } => {}
        Begin::Random => all.push("Every run begins with random gate outputs.".into()),
        Begin::Unknown => all.push("Every run begins with unknown gate outputs (X).".into()),
    }
    all
}

/// How often what is drawn.
fn per_event(scenario: &Scenario) -> String {
    let clocks = !scenario.stimulus.clocks.is_empty();
    let kept = [
        (!scenario.delays.wire.is_empty(), "wires"),
        (clocks, "clock periods"),
        (!scenario.delays.groups.is_empty(), "what a group has in common"),
    ];
    let kept: Vec<&str> = kept.into_iter().filter(|it| it.0).map(|it| it.1).collect();
    let mut text = "In draws every firing of a gate takes a delay of its own".to_string();
    if !kept.is_empty() {
        text += &format!("; a board keeps {}", kept.join(", "));
    }
    if scenario.plan.draw == Marginal::Hypercube {
        text += "; of a hypercube firings are drawn independently";
    }
    text + "."
}

fn names(scenario: &Scenario, gates: &[GateId], most: usize) -> String {
    let nets: Vec<_> = gates.iter().map(|gate| scenario.circuit.net_of(*gate)).collect();
    words::some_names(&words::nets(scenario, &nets), most)
}
