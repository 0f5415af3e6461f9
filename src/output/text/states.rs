//! Stable states, and what may follow what.

use super::Page;
use super::paper::{Paper, Table, Tone};
use super::steps::state;
use super::{flow, notes};
use crate::circuit::NetId;
use crate::logic::{Bits, State};
use crate::output::words;
use crate::review::StatesReport;
use crate::scenario::Scenario;

/// Most rows told of.
const ROWS: usize = 10;
const ROWS_OF_A_PAGE: usize = 64;
/// Most names in a list.
const NAMES: usize = 12;

/// The text of `states`: how many there are, the flow table if it is small (else some states by input vector), and what is
/// read off it: races, hazards, coverage, the automaton, the reference.
pub fn states(scenario: &Scenario, report: &StatesReport, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    state_set(&mut paper, scenario, report);
    flow::dynamics(&mut paper, scenario, &report.flow);
    flow::reading(&mut paper, scenario, &report.flow);
    flow::reference(&mut paper, scenario, &report.flow);
    notes::notes(&mut paper, scenario);
    paper.finish()
}

/// How many stable states there are, what tells them apart, and the flow table or some states by input vector.
pub(super) fn state_set(paper: &mut Paper, scenario: &Scenario, report: &StatesReport) {
    let (tone, count) = match &report.count {
        Some(count) => {
            let plural = if count == "1" { "" } else { "s" };
            (Tone::Strong, format!("{count} stable state{plural}"))
        }
        None => (Tone::Unsure, "stable states were not counted: the budget ran out".to_string()),
    };
    paper.say(0, tone, &format!("{}: {count}.", scenario.title));
    let list = |nets: &[NetId]| match nets {
        [] => "none".to_string(),
        nets => words::some_names(&words::nets(scenario, nets), NAMES),
    };
    if let Some([none, one, several]) = &report.vectors {
        let text = format!(
            "Input vectors without a stable state (must oscillate): {none}; with one: {one}; with several (memory): {several}."
        );
        paper.say(2, Tone::Plain, &text);
    }
    paper.say(2, Tone::Plain, &format!("Feedback nets (cut every loop): {}.", list(&report.feedback)));
    let fewest = if report.state_variables_exact { "surely the fewest" } else { "perhaps not the fewest" };
    // none is an answer only where it is sure
    let known = report.state_variables_exact || !report.state_variables.is_empty();
    let variables = if known { list(&report.state_variables) } else { "not known, the budget ran out".to_string() };
    let fewest = if report.state_variables.is_empty() { String::new() } else { format!(" ({fewest})") };
    paper.say(2, Tone::Plain, &format!("State variables: {variables}{fewest}."));
    if !flow::table(paper, scenario, report) {
        by_inputs(paper, scenario, report);
    }
}

fn by_inputs(paper: &mut Paper, scenario: &Scenario, report: &StatesReport) {
    if report.inputs.is_empty() {
        return;
    }
    let mut nets = report.state_variables.clone();
    nets.extend(scenario.outputs.iter().filter(|net| !report.state_variables.contains(net)));
    let inputs: Vec<NetId> = scenario.circuit.inputs().collect();
    let mut table = Table::new().text("inputs").text("stable states");
    let mut rows = 0usize;
    let mut shown = 0usize;
    for (vector, states) in &report.inputs {
        if rows > 0 && rows + states.len().max(1) > paper.most(ROWS, ROWS_OF_A_PAGE) {
            break;
        }
        shown += 1;
        let given = State::known(Bits::of(vector.iter().copied()));
        let mut label = state(scenario, &inputs, &given);
        if inputs.is_empty() {
            label = "(no inputs)".to_string();
        }
        if states.is_empty() {
            table.row(Tone::Unsure, vec![label.clone(), "none: it must oscillate".to_string()]);
            rows += 1;
        }
        for one in states {
            table.row(Tone::Plain, vec![label.clone(), state(scenario, &nets, &State::known(one.clone()))]);
            rows += 1;
            label.clear();
        }
    }
    paper.heading("By input vector (state variables, then outputs)");
    paper.table(&table);
    super::more(paper, report.inputs.len() - shown, "states.csv");
    if report.inputs_truncated {
        paper.say(2, Tone::Unsure, "A limit cut the list of input vectors.");
    }
}
