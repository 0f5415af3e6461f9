//! What was understood of a scenario.

use serde::Serialize;

use super::parts::{Exact, Object, OneLine};
use crate::output::assumptions::assumptions;
use crate::output::words;
use crate::scenario::Scenario;

#[derive(Serialize)]
struct Check<'a> {
    format: u32,
    title: &'a str,
    unit: &'static str,
    inputs: OneLine<Vec<&'a str>>,
    gates: OneLine<Vec<&'a str>>,
    outputs: OneLine<Vec<&'a str>>,
    watched: OneLine<Vec<&'a str>>,
    why_watched: Object<&'a str, &'static str>,
    steps: usize,
    moments: usize,
    feedback: OneLine<Vec<&'a str>>,
    conditions: OneLine<Object<&'a str, Exact>>,
    notes: &'a [String],
    assumptions: Vec<String>,
    not_analysed: &'a [String],
}

/// The document of `check`. `steps` counts listed steps with loops unrolled, `moments` also clock edges and power-up.
pub fn check(scenario: &Scenario) -> String {
    let circuit = &scenario.circuit;
    let name = |net| words::net(scenario, net);
    super::document(&Check {
        format: super::FORMAT,
        title: &scenario.title,
        unit: scenario.unit.name(),
        inputs: OneLine(circuit.inputs().map(name).collect()),
        gates: OneLine(circuit.gates().map(|gate| name(circuit.net_of(gate))).collect()),
        outputs: OneLine(words::nets(scenario, &scenario.outputs)),
        watched: OneLine(words::nets(scenario, &scenario.watched)),
        why_watched: Object(scenario.watched.iter().map(|net| (name(*net), scenario.why_watched(*net))).collect()),
        steps: scenario.stimulus.steps.len(),
        moments: scenario.stimulus.moments.len(),
        feedback: OneLine(words::nets(scenario, circuit.feedback())),
        conditions: OneLine(Object(
            scenario.conditions.iter().map(|it| (it.name.as_str(), Exact::factor(it.scale))).collect(),
        )),
        notes: &scenario.notes,
        assumptions: assumptions(scenario, usize::MAX),
        not_analysed: &scenario.not_analysed,
    })
}
