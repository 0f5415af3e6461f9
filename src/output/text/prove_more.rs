//! Margins and delays to add, as text.

use super::paper::{Paper, Table, Tone};
use crate::findings::Asked;
use crate::output::{deciding, words};
use crate::proof::{MarginEnd, Padding, PaddingEnd, Proof};
use crate::scenario::Scenario;
use crate::time::Span;

/// Margins told of, the least first.
const ROWS: usize = 16;
/// Races told of.
const RACES: usize = 6;

/// How far the ranges may be stretched for each claim, the least first, and what breaks first.
pub(super) fn margins(paper: &mut Paper, scenario: &Scenario, asked: &Asked, proof: &Proof) {
    let mut known: Vec<_> = proof.claims.iter().filter_map(|claim| Some((claim.margin.as_ref()?, claim))).collect();
    if known.is_empty() {
        return;
    }
    known.sort_by_key(|it| it.0.factor);
    paper.heading("Margins: how far all ranges may be stretched about typical, still proved");
    let mut table = Table::new().text("claim").number("factor", 0).text("");
    for (margin, claim) in known.iter().take(ROWS) {
        let note = match margin.end {
            MarginEnd::Refuted => "refuted beyond",
            MarginEnd::Undecided => "undecided beyond",
            MarginEnd::Limit => "not tried farther",
            MarginEnd::Budget => "the budget ended",
        };
        let tone = if margin.factor.numerator() <= margin.factor.denominator() { Tone::Bad } else { Tone::Plain };
        let about = words::question(scenario, &asked.questions[claim.question as usize]);
        table.row(tone, vec![about, deciding::margin(margin), note.to_string()]);
    }
    paper.table(&table);
    super::more(paper, known.len().saturating_sub(ROWS), "proof.json");
    let mut told: Vec<String> = Vec::new();
    for (margin, claim) in &known {
        // what refutes it now was told with the claim
        let Some(race) = margin.first.as_ref().filter(|race| claim.race.as_ref() != Some(*race)) else { continue };
        let text = deciding::race(scenario, race);
        if !told.contains(&text) {
            told.push(text);
        }
    }
    for text in told.iter().take(RACES) {
        paper.hang(2, 4, Tone::Plain, &format!("breaks first: {text}"));
    }
    super::more(paper, told.len().saturating_sub(RACES), "proof.json");
}

/// Delays to add, and the lines that say so in the file.
pub(super) fn padding(paper: &mut Paper, scenario: &Scenario, padding: &Padding) {
    paper.heading("Padding: least delay to add so that what is refuted is proved");
    match &padding.end {
        PaddingEnd::NotNeeded => {
            paper.say(2, Tone::Plain, "Nothing is refuted.");
            return;
        }
        PaddingEnd::Impossible(why) => {
            paper.say(2, Tone::Bad, &format!("Impossible: {why}."));
            return;
        }
        PaddingEnd::Undecided(why) => {
            paper.say(2, Tone::Unsure, &format!("Not found: {why}."));
            return;
        }
        PaddingEnd::Found => {}
    }
    let unit = scenario.unit;
    let mut table = Table::new().text("where").number(format!("add ({unit})"), 0);
    for (place, pad) in &padding.pads {
        table.row(Tone::Plain, vec![deciding::place(scenario, *place), pad.decimal(unit).to_string()]);
    }
    let total = padding.pads.iter().fold(Span::ZERO, |total, (_, pad)| total + *pad);
    table.row(Tone::Strong, vec!["in all".to_string(), total.decimal(unit).to_string()]);
    paper.table(&table);
    let least = if padding.cut { "; less may do, the search was cut" } else { "" };
    let proofs = words::many(u64::from(padding.rounds), "proof");
    paper.say(2, Tone::Plain, &format!("Shown by {proofs} with the ranges shifted{least}. In the scenario:"));
    for (place, pad) in &padding.pads {
        for line in deciding::patch(scenario, *place, *pad) {
            paper.whole(4, &line);
        }
    }
}
