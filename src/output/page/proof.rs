//! The proof: every claim with how it came out, what decides it, and why it is open.

use maud::{Markup, html};

use super::Told;
use super::parts::{Cell, Table, blocks, cut};
use crate::output::text::{self, Tone, for_page};
use crate::output::{deciding, words};
use crate::proof::{Call, Claim, Proof};

/// Most claims.
const ROWS: usize = 240;

pub(super) fn section(told: &Told<'_>) -> Markup {
    html! {
        (blocks("challenge", "Proof", &for_page::proof(told.scenario, told.review)))
        @if let Some(proof) = &told.review.proof { (claims(told, proof)) }
    }
}

/// Claims of one rule, net and pattern that came out alike for the same reason, with nothing else to say of them.
struct Alike<'a> {
    claim: &'a Claim,
    file: &'a Option<String>,
    steps: u64,
}

fn alike<'a>(told: &Told<'_>, proof: &'a Proof, files: &'a [Option<String>]) -> Vec<Alike<'a>> {
    let mut all: Vec<Alike<'a>> = Vec::new();
    let question = |claim: &Claim| &told.review.asked.questions[claim.question as usize];
    for (claim, file) in proof.claims.iter().zip(files) {
        let bare = |claim: &Claim| claim.race.is_none() && claim.witness.is_none();
        let same = |group: &&mut Alike<'_>| {
            let (one, other) = (question(group.claim), question(claim));
            let alike = (one.rule, one.index, one.net) == (other.rule, other.index, other.net);
            let out = (group.claim.call, group.claim.but_for_ties, &group.claim.reason);
            let out = out == (claim.call, claim.but_for_ties, &claim.reason);
            alike && one.pattern == other.pattern && out && bare(group.claim) && bare(claim)
        };
        match all.iter_mut().find(same) {
            Some(group) => group.steps += 1,
            None => all.push(Alike { claim, file, steps: 1 }),
        }
    }
    all
}

fn claims(told: &Told<'_>, proof: &Proof) -> Markup {
    let row = |Alike { claim, file, steps }: &Alike<'_>| {
        let question = &told.review.asked.questions[claim.question as usize];
        let about = match steps {
            1 => words::question(told.scenario, question),
            n => format!("{} ({})", text::about_rule(told.scenario, question, false), words::many(*n, "step")),
        };
        let decides = claim.race.as_ref().map(|race| deciding::race(told.scenario, race));
        let (tone, call) = match (claim.call, claim.but_for_ties) {
            (Call::Proved, _) => (Tone::Plain, "proved"),
            (Call::Refuted, true) => (Tone::Plain, "refuted, only by exactly equal times"),
            (Call::Refuted, false) => (Tone::Bad, "refuted"),
            (Call::Undecided, _) => (Tone::Unsure, "undecided"),
            (Call::NotCovered, _) => (Tone::Unsure, "not covered"),
        };
        let why = [decides, claim.reason.clone()].into_iter().flatten().collect::<Vec<_>>().join("; ");
        let takes = claim.variation.map(|variation| format!("{} delays", variation.word()));
        vec![
            Cell::Text(about),
            Cell::Marked(tone, call.to_string()),
            if why.is_empty() { Cell::Empty } else { Cell::Text(why) },
            takes.map_or(Cell::Empty, Cell::Text),
            file.as_ref().map_or(Cell::Empty, |file| Cell::Code(told.page.replay_file(file))),
        ]
    };
    let files = proof.witness_files();
    let all = alike(told, proof, &files);
    let table = Table {
        id: "claims",
        caption: "Claims: that a rule is kept for every delay in the ranges, each firing taking its own. Steps at which the same \
                  came out share a row; result.json has each",
        head: vec![
            ("claim", false),
            ("came out", false),
            ("what decides it, or why it is open", false),
            ("what it takes", false),
            ("replay", false),
        ],
        rows: all.iter().take(ROWS).map(row).collect(),
    };
    html! {
        @if !proof.claims.is_empty() { (table.draw()) }
        (cut(all.len().saturating_sub(ROWS), "rows", "result.json"))
        (blocks("over-all-delays", "Windows", &for_page::proof_windows(told.scenario, told.review, proof)))
    }
}
