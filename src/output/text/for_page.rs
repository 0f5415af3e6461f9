//! What the report page takes over from the texts, section by section: the same words, lists that are cut later.

use super::blocks::Block;
use super::paper::Paper;
use super::search::Searching;
use super::{Page, challenge, conditions, flow, prove, review, rules, search, states, steps, sure, ties};
use crate::output::search::case_files;
use crate::proof::Proof;
use crate::review::Review;
use crate::scenario::Scenario;

fn recorded(write: impl FnOnce(&mut Paper)) -> Vec<Block> {
    let mut paper = Paper::recorded();
    write(&mut paper);
    paper.blocks()
}

/// The verdict: its sentence comes first.
pub(in crate::output) fn verdict(review: &Review) -> Vec<Block> {
    recorded(|paper| review::verdict(paper, &review.verdict))
}

/// How the questions were answered as a whole, how sure that is, what exact ties have to do with it, what was searched.
pub(in crate::output) fn answers(page: &Page<'_>, review: &Review) -> Vec<Block> {
    let files = case_files(review);
    recorded(|paper| {
        rules::count(paper, &review.sweep);
        sure::sure(paper, &review.sweep);
        ties::ties(paper, &review.sweep);
        if let Some(report) = &review.search {
            search::search(paper, page, Searching { report, files: &files });
        }
    })
}

/// Was everything drawn that was asked for? Nothing if so.
pub(in crate::output) fn missing(review: &Review) -> Vec<Block> {
    recorded(|paper| review::missing(paper, &review.sweep))
}

/// Conditions side by side; nothing if there are none.
pub(in crate::output) fn by_condition(page: &Page<'_>, scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| conditions::conditions(paper, page, scenario, &review.asked, &review.sweep))
}

/// Steps with outcomes and settling times.
pub(in crate::output) fn outcomes(scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| steps::steps(paper, scenario, &review.sweep))
}

/// How the claims of the proof came out as a whole.
pub(in crate::output) fn proof(scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| challenge::challenge(paper, scenario, review))
}

/// Windows over all delays, margins, and what the proof left out.
pub(in crate::output) fn proof_windows(scenario: &Scenario, review: &Review, proof: &Proof) -> Vec<Block> {
    recorded(|paper| prove::beside_claims(paper, scenario, &review.asked, proof))
}

/// How many stable states there are, and the flow table.
pub(in crate::output) fn state_set(scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| states::state_set(paper, scenario, &review.states))
}

/// Races, oscillations and hazards of the flow table, and the reference.
pub(in crate::output) fn dynamics(scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| {
        flow::dynamics(paper, scenario, &review.states.flow);
        flow::reference(paper, scenario, &review.states.flow);
    })
}

/// What the steps exercise, and the circuit as an automaton.
pub(in crate::output) fn coverage(scenario: &Scenario, review: &Review) -> Vec<Block> {
    recorded(|paper| flow::reading(paper, scenario, &review.states.flow))
}
