//! What a reader must bear in mind.

use super::paper::{Paper, Tone};
use crate::output::assumptions::assumptions;
use crate::output::cautions::cautions;
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
