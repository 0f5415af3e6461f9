//! What the review says nothing of: what was not analysed, judged, exercised or drawn, and what the models leave out.

use maud::{Markup, html};

use super::Told;
use crate::output::cautions::NOT_MODELLED;
use crate::output::text::covered;
use crate::output::words::{clean, count, many, sentence};
use crate::proof::Call;

/// Most reasons of one kind.
const REASONS: usize = 12;

pub(super) fn section(told: &Told<'_>) -> Markup {
    let all = left_out(told);
    html! {
        h3 { "Not covered by this review" }
        ul { @for text in &all { li { (clean(text)) } } }
        h3 { "Not modelled" }
        ul { @for text in NOT_MODELLED { li { (sentence(text)) } } }
    }
}

fn left_out(told: &Told<'_>) -> Vec<String> {
    let (scenario, review) = (told.scenario, told.review);
    let (sweep, flow) = (&review.sweep, &review.states.flow);
    let mut all = scenario.not_analysed.clone();
    all.push(
        "A sweep finds failures or does not; it proves nothing. Delays between the draws, and steps that the scenario does not \
         make, were not run."
            .to_string(),
    );
    match &review.proof {
        None => all.push("No proof was asked for.".to_string()),
        Some(proof) => {
            for (call, word) in [(Call::Undecided, "undecided"), (Call::NotCovered, "not covered by the proof")] {
                let mut reasons: Vec<(&str, u64)> = Vec::new();
                for claim in proof.claims.iter().filter(|claim| claim.call == call) {
                    let reason = claim.reason.as_deref().unwrap_or("no reason is known");
                    match reasons.iter_mut().find(|it| it.0 == reason) {
                        Some(it) => it.1 += 1,
                        None => reasons.push((reason, 1)),
                    }
                }
                let told = reasons.iter().take(REASONS);
                all.extend(told.map(|(reason, n)| format!("{} {word}: {reason}.", many(*n, "claim"))));
                let left = reasons.len().saturating_sub(REASONS) as u64;
                if left > 0 {
                    all.push(format!("Claims {word} for {} more reasons: see the table of claims.", count(left)));
                }
            }
        }
    }
    let unjudged = sweep.rules.iter().filter(|rule| !rule.not_judged.is_empty()).count() as u64;
    if unjudged > 0 {
        all.push(format!(
            "{} not judged in some draws: see the table of rules for the reasons.",
            many(unjudged, "question")
        ));
    }
    let untested = sweep.rules.iter().filter(|rule| rule.judged == 0 && rule.not_judged.is_empty()).count() as u64;
    if untested > 0 {
        all.push(format!("{} never put to the test: nothing that they speak of happened.", many(untested, "question")));
    }
    if flow.table.states.is_empty() {
        all.push("There is no flow table: what may follow what was not found out.".to_string());
    } else if !flow.coverage.missing.is_empty() || flow.coverage.truncated {
        all.push(format!("{}.", covered(flow)));
    }
    for (cut, what) in [
        (flow.table.states_truncated, "A limit cut the flow table."),
        (flow.table.steps_truncated, "A limit cut the steps of the flow table."),
        (flow.hazards_truncated, "A limit cut the search for hazards."),
        (review.states.inputs_truncated, "A limit cut the list of input vectors."),
    ] {
        if cut {
            all.push(what.to_string());
        }
    }
    let unexplained =
        sweep.findings.iter().enumerate().filter(|(number, finding)| {
            finding.breaks_rule && review.why.get(*number).and_then(Option::as_ref).is_none()
        });
    let unexplained = unexplained.count() as u64;
    if unexplained > 0 {
        all.push(format!("{} that break a rule were not looked into for their causes.", many(unexplained, "finding")));
    }
    if told.drawn.iter().filter(|run| run.finding.is_some()).count() < sweep.findings.len() {
        all.push("Not every finding has a picture: the command beside it draws it.".to_string());
    }
    if !scenario.conditions.is_empty() {
        all.push("Pictures, causes and the proof are of the delays of the file, not of its conditions.".to_string());
    }
    all
}
