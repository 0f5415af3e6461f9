//! What a reader must bear in mind.

use super::paper::{Paper, Tone};
use crate::output::assumptions::assumptions;
use crate::scenario::Scenario;

/// Most names of gates in one assumption.
const NAMES: usize = 6;
/// Most notes of the scenario.
const NOTES: usize = 5;

/// What is not analysed yet, what was assumed, notes of the scenario, and a caution.
pub(super) fn notes(paper: &mut Paper, scenario: &Scenario) {
    paper.heading("Notes");
    for text in &scenario.not_analysed {
        paper.item(Tone::Unsure, text);
    }
    for text in assumptions(scenario, NAMES) {
        paper.item(Tone::Plain, &text);
    }
    for text in scenario.notes.iter().take(NOTES) {
        paper.item(Tone::Plain, text);
    }
    super::more(paper, scenario.notes.len().saturating_sub(NOTES), "check");
    for text in cautions(scenario) {
        paper.item(Tone::Plain, text);
    }
}

/// A logic simulation is no safety case; more of that where an interlock is spoken of.
fn cautions(scenario: &Scenario) -> Vec<&'static str> {
    let mut all = vec![
        "Caution: a logic simulation is no safety case. Left out are metastable dwell, voltage levels, noise, supply ramps \
         and part failures.",
    ];
    let names = scenario.circuit.nets().map(|net| scenario.circuit.name(net));
    let labels = scenario.stimulus.moments.iter().map(|moment| moment.label.as_str());
    let mut words = names.chain(labels).chain([scenario.title.as_str()]);
    if words.any(|text| text.to_lowercase().contains("interlock")) {
        all.push(
            "Interlocks: the safety function follows the local code and is signed off by licensed people; mechanical \
             interlocks and emergency stops stay independent of the logic.",
        );
    }
    all
}
