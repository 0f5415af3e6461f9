//! What the proof of a review says, in a few lines: how many claims came out how, what is rare, what is open and why.

use super::paper::{Paper, Tone};
use crate::output::search::{rare_claim, rare_file};
use crate::output::words;
use crate::proof::{Call, Claim, Proof};
use crate::review::Review;
use crate::scenario::Scenario;

/// Claims named of each kind.
const NAMED: usize = 3;

/// The proof beside the sweep.
pub(super) fn challenge(paper: &mut Paper, scenario: &Scenario, review: &Review) {
    let Some(proof) = &review.proof else {
        let text = "Proof over all delays: none was asked for, so nothing is proved.";
        return paper.say(0, Tone::Unsure, text);
    };
    let counted = |call: Call, word: &str| {
        let count = words::count(proof.count(call));
        match reason(proof, call) {
            Some((reason, 0)) => format!("{count} {word} ({reason})"),
            Some((reason, _)) => format!("{count} {word} (mostly: {reason})"),
            None => format!("{count} {word}"),
        }
    };
    let conditions = match scenario.conditions.is_empty() {
        true => "",
        false => " It speaks of nominal delays, not of conditions.",
    };
    let text = format!(
        "Proof over all delays: of {} {} proved, {} refuted, {}, {}.{conditions}",
        words::many(proof.claims.len() as u64, "claim"),
        words::count(proof.count(Call::Proved)),
        words::count(proof.count(Call::Refuted)),
        counted(Call::Undecided, "undecided"),
        counted(Call::NotCovered, "not covered"),
    );
    let open = proof.count(Call::Undecided) + proof.count(Call::NotCovered) > 0;
    paper.say(0, if open { Tone::Unsure } else { Tone::Plain }, &text);
    let about = |claim: &Claim| words::question(scenario, &review.asked.questions[claim.question as usize]);
    let rare: Vec<String> = review
        .sweep
        .findings
        .iter()
        .filter_map(|finding| Some((rare_claim(review, finding)?, rare_file(review, finding)?)))
        .map(|(claim, file)| format!("{} ({file})", about(claim)))
        .collect();
    named(paper, Tone::Bad, "Rare, refuted and met by nothing else", &rare);
    let ties = proof.claims.iter().filter(|claim| claim.call == Call::Refuted && claim.but_for_ties);
    named(paper, Tone::Plain, "Refuted only by exactly equal times", &ties.map(about).collect::<Vec<_>>());
}

/// A few of a list, and how many more.
fn named(paper: &mut Paper, tone: Tone, title: &str, all: &[String]) {
    if all.is_empty() {
        return;
    }
    let more = match all.len().saturating_sub(NAMED) {
        0 => String::new(),
        n => format!("; and {} more", words::count(n as u64)),
    };
    paper.hang(2, 4, tone, &format!("{title}: {}{more}.", all[..all.len().min(NAMED)].join("; ")));
}

/// The commonest reason of claims that came out so, and how many others there are.
fn reason(proof: &Proof, call: Call) -> Option<(&str, u64)> {
    let mut reasons: Vec<(&str, u64)> = Vec::new();
    for claim in proof.claims.iter().filter(|claim| claim.call == call) {
        let reason = claim.reason.as_deref().unwrap_or("no reason is known");
        match reasons.iter_mut().find(|it| it.0 == reason) {
            Some(it) => it.1 += 1,
            None => reasons.push((reason, 1)),
        }
    }
    let others = (reasons.len() as u64).saturating_sub(1);
    // of equally common ones the first
    reasons.into_iter().rev().max_by_key(|it| it.1).map(|(reason, _)| (reason, others))
}
