//! Assumptions: where every delay came from, what gates do with short pulses, how delays are drawn and joined.

use maud::{Markup, html};

use super::Told;
use super::parts::{Cell, Table, cut};
use crate::circuit::GateId;
use crate::delay::{Filter, Marginal, Together};
use crate::output::assumptions::assumptions;
use crate::output::words::{self, clean};
use crate::scenario::Scenario;

/// Most names in a list.
const NAMES: usize = 60;
/// Most rows of a table.
const ROWS: usize = 80;
/// Most notes.
const NOTES: usize = 60;

pub(super) fn section(told: &Told<'_>) -> Markup {
    let scenario = told.scenario;
    let notes = &scenario.notes;
    html! {
        ul {
            li { (drawn(told)) }
            @for text in assumptions(scenario, NAMES) { li { (clean(&text)) } }
            @for text in notes.iter().take(NOTES) { li { (clean(text)) } }
        }
        (cut(notes.len().saturating_sub(NOTES), "notes", "stillgate check"))
        (sources(scenario))
        (groups(scenario))
    }
}

/// How delays spread over their ranges.
fn drawn(told: &Told<'_>) -> String {
    let plan = &told.review.sweep.plan;
    let how = match plan.draw {
        Marginal::Uniform => "every femtosecond of a range is equally likely",
        Marginal::Triangular => "a triangle with its peak at typical",
        Marginal::Normal => {
            "a bell with its median at typical; least and greatest lie at three sigma of their own side and cut it"
        }
        Marginal::Corners => "least or greatest, nothing between: no share of such draws is a probability",
        Marginal::Hypercube => {
            "each range is cut into as many layers as there are draws, one draw a layer: draws are not independent"
        }
    };
    format!("Drawn {}, seed {}: {how}.", plan.draw.name(), plan.seed)
}

/// Where the delays of a gate came from.
fn source(scenario: &Scenario, gate: GateId) -> &'static str {
    let delays = &scenario.delays;
    if delays.no_delay.binary_search(&gate).is_ok() {
        "assumed: no delay is given, one time unit"
    } else if delays.assumed_min.binary_search(&gate).is_ok() {
        "given; the least is assumed from typical"
    } else {
        "given in the file"
    }
}

/// What a gate does with short pulses.
fn filter(scenario: &Scenario, gate: GateId) -> String {
    match scenario.delays.filter[gate.index()] {
        Filter::Inertial => "inertial: swallows pulses shorter than its delay".to_string(),
        Filter::Transport => "transport: every pulse passes".to_string(),
        Filter::Reject(r) => format!("reject: swallows pulses not longer than {}", r.rounded()),
        Filter::Involution(tau) => format!("involution, time constant {}: short pulses shrink", tau.rounded()),
    }
}

/// Where delays come from, whether both edges take one draw, the filter; and the gates.
type Alike = ((&'static str, bool, String), Vec<GateId>);

/// Gates by where their delays came from, and by what they do with short pulses.
fn sources(scenario: &Scenario) -> Markup {
    let mut kinds: Vec<Alike> = Vec::new();
    for gate in scenario.circuit.gates() {
        let key = (source(scenario, gate), scenario.delays.gate_one_draw[gate.index()], filter(scenario, gate));
        match kinds.iter_mut().find(|it| it.0 == key) {
            Some(it) => it.1.push(gate),
            None => kinds.push((key, vec![gate])),
        }
    }
    let row = |((source, one, filter), gates): &Alike| {
        vec![
            Cell::Text(names(scenario, gates)),
            Cell::Text((*source).to_string()),
            Cell::Text(if *one { "one for both edges" } else { "one for each edge" }.to_string()),
            Cell::Text(filter.clone()),
        ]
    };
    let table = Table {
        id: "sources",
        caption: "Where delays come from, and what gates do with short pulses",
        head: vec![("gates", false), ("delays", false), ("draws", false), ("filter", false)],
        rows: kinds.iter().take(ROWS).map(row).collect(),
    };
    html! { (table.draw()) (cut(kinds.len().saturating_sub(ROWS), "kinds of gates", "the scenario file")) }
}

/// Groups of gates that share something.
fn groups(scenario: &Scenario) -> Markup {
    let groups = &scenario.delays.groups;
    if groups.is_empty() {
        return html! { p { "No gates are grouped: every delay is drawn by itself." } };
    }
    let row = |group: &crate::delay::Group| {
        let how = match group.how {
            Together::Tracking(rho) => format!("track each other with correlation {rho}"),
            Together::Scale { least, greatest, mismatch } => {
                format!("typical times a common factor from {least} to {greatest}, each off by up to {mismatch}")
            }
        };
        vec![Cell::Text(names(scenario, &group.gates)), Cell::Text(how)]
    };
    let table = Table {
        id: "groups",
        caption: "Groups: gates that share a package or a die",
        head: vec![("gates", false), ("how", false)],
        rows: groups.iter().take(ROWS).map(row).collect(),
    };
    html! { (table.draw()) (cut(groups.len().saturating_sub(ROWS), "groups", "the scenario file")) }
}

fn names(scenario: &Scenario, gates: &[GateId]) -> String {
    let nets: Vec<_> = gates.iter().map(|gate| scenario.circuit.net_of(*gate)).collect();
    words::some_names(&words::nets(scenario, &nets), NAMES)
}
