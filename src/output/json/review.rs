//! The whole review.

use serde::Serialize;

use super::listed::MOST_VALUES;
use super::parts::Lines;
use super::prove;
use super::run::Run;
use super::search::{Question, search};
use super::states::States;
use super::sweep::Sweep;
use crate::instance::Which;
use crate::output::search::{case_files, file_of, rare_file};
use crate::review::Review;
use crate::scenario::Scenario;

#[derive(Serialize)]
struct Whole<'a> {
    format: u32,
    title: &'a str,
    unit: &'static str,
    verdict: &'static str,
    sentence: &'a str,
    reasons: &'a [String],
    draws: u64,
    not_analysed: &'a [String],
    states: States<'a>,
    typical: Option<Run<'a>>,
    sweep: Sweep<'a>,
    search: Option<Lines<Question<'a>>>,
    proof: Option<prove::Document<'a>>,
}

/// The document of `review`. `states`, `typical`, `sweep` and `proof` have the keys of their own documents, but for `format`.
pub fn review(scenario: &Scenario, review: &Review) -> String {
    let asked = &review.asked;
    let files = case_files(review);
    let mut sweep = Sweep::of(scenario, asked, &review.sweep, None).explained(scenario, review);
    let witnesses = review.proof.as_ref().map_or_else(Vec::new, |proof| proof.witness_files());
    for (told, finding) in sweep.findings.iter_mut().zip(&review.sweep.findings) {
        if finding.rare {
            told.case = rare_file(review, finding);
        } else if let Some(Which::Given(_)) = finding.case.as_deref() {
            told.case = file_of(&files, finding.subject.question).map(String::from);
        }
    }
    super::document(&Whole {
        format: super::FORMAT,
        title: &scenario.title,
        unit: scenario.unit.name(),
        verdict: review.verdict.call.words(),
        sentence: &review.verdict.sentence,
        reasons: &review.verdict.reasons,
        draws: review.sweep.samples,
        not_analysed: &scenario.not_analysed,
        states: States::of(scenario, &review.states, None, MOST_VALUES),
        typical: review.typical.as_ref().map(|run| Run::of(scenario, asked, run, None)),
        sweep,
        search: search(scenario, review, &files),
        proof: review.proof.as_ref().map(|proof| prove::document(scenario, asked, proof, &witnesses)),
    })
}
