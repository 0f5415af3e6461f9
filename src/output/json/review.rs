//! The whole review.

use serde::Serialize;

use super::run::Run;
use super::states::States;
use super::sweep::Sweep;
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
    proof: Option<()>,
}

/// The document of `review`. `states`, `typical` and `sweep` have the keys of their own documents, but for `format`.
pub fn review(scenario: &Scenario, review: &Review) -> String {
    let asked = &review.asked;
    super::document(&Whole {
        format: super::FORMAT,
        title: &scenario.title,
        unit: scenario.unit.name(),
        verdict: review.verdict.call.words(),
        sentence: &review.verdict.sentence,
        reasons: &review.verdict.reasons,
        draws: review.sweep.samples,
        not_analysed: &scenario.not_analysed,
        states: States::of(scenario, &review.states, None),
        typical: review.typical.as_ref().map(|run| Run::of(scenario, asked, run, None)),
        sweep: Sweep::of(scenario, asked, &review.sweep, None).explained(scenario, &review.why),
        proof: None,
    })
}
