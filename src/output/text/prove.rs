//! What a proof says: what is refuted and how it is replayed, what is open and why, what is proved, and windows.

use std::collections::BTreeMap;

use super::Page;
use super::paper::{Paper, Table, Tone};
use crate::findings::Asked;
use crate::output::{deciding, words};
use crate::proof::{Call, Claim, Proof};
use crate::scenario::Scenario;

/// Claims told in full, of each kind.
const FULL: usize = 8;
/// Windows told of.
const WINDOWS: usize = 16;
const WINDOWS_OF_A_PAGE: usize = 120;

/// The text of `prove`. `files` are the names of the files of the witnesses, by claim.
pub fn prove(scenario: &Scenario, asked: &Asked, proof: &Proof, files: &[Option<String>], page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let count = |call: Call| proof.claims.iter().filter(|claim| claim.call == call).count() as u64;
    let (proved, refuted, undecided) = (count(Call::Proved), count(Call::Refuted), count(Call::Undecided));
    let left = count(Call::NotCovered);
    let tone = match (refuted, undecided + left) {
        (0, 0) => Tone::Strong,
        (0, _) => Tone::Unsure,
        _ => Tone::Bad,
    };
    let all = words::many(proof.claims.len() as u64, "claim");
    let sentence = format!(
        "{}: of {all} {} proved, {} refuted, {} undecided, {} not covered.",
        scenario.title,
        words::count(proved),
        words::count(refuted),
        words::count(undecided),
        words::count(left)
    );
    paper.say(0, tone, &sentence);
    let zones = words::count(proof.zones);
    paper.say(
        2,
        Tone::Plain,
        &format!("For every delay in the ranges, each firing taking its own; bounded inertial gates, {zones} zones."),
    );
    let about = |claim: &Claim| words::question(scenario, &asked.questions[claim.question as usize]);
    let of = |call: Call| proof.claims.iter().zip(files).filter(move |(claim, _)| claim.call == call);
    if refuted > 0 {
        paper.heading("Refuted: delays in the ranges break it");
        for (i, (claim, file)) in of(Call::Refuted).take(FULL).enumerate() {
            let ties = if claim.but_for_ties { ", only by exactly equal times" } else { "" };
            paper.hang(2, 4, Tone::Bad, &format!("{} {}{ties}", i + 1, about(claim)));
            match &claim.race {
                Some(race) => paper.hang(4, 6, Tone::Plain, &deciding::race(scenario, race)),
                None => paper.say(4, Tone::Plain, "no single inequality was found that decides it"),
            }
            if let Some(file) = file {
                paper.whole(4, &page.replay_file(file));
            }
        }
        super::more(&mut paper, (refuted as usize).saturating_sub(FULL), "proof.json");
    }
    reasons(&mut paper, "Undecided", &of(Call::Undecided).map(|(claim, _)| (about(claim), claim)).collect::<Vec<_>>());
    reasons(
        &mut paper,
        "Not covered",
        &of(Call::NotCovered).map(|(claim, _)| (about(claim), claim)).collect::<Vec<_>>(),
    );
    if proved > 0 {
        let mut rules: BTreeMap<&str, u64> = BTreeMap::new();
        for (claim, _) in of(Call::Proved) {
            *rules.entry(asked.questions[claim.question as usize].rule.word()).or_insert(0) += 1;
        }
        paper.heading("Proved");
        let each: Vec<String> =
            rules.iter().map(|(rule, count)| format!("{rule} ({})", words::count(*count))).collect();
        paper.say(2, Tone::Plain, &format!("{}.", each.join(", ")));
    }
    beside_claims(&mut paper, scenario, asked, proof);
    paper.finish()
}

/// Windows over all delays, margins, delays to add, and what was left out.
pub(super) fn beside_claims(paper: &mut Paper, scenario: &Scenario, asked: &Asked, proof: &Proof) {
    if !proof.windows.is_empty() {
        paper.heading("Windows, over all delays");
        let most = paper.most(WINDOWS, WINDOWS_OF_A_PAGE);
        let mut table = Table::new().text("step").number("states", 0).number("settles from", 0).number("to", 0);
        let shown = || proof.windows.iter().take(most);
        let remarked = shown().any(|window| window.settling_but_for_ties || window.settling_below);
        if remarked {
            table = table.text("remark");
        }
        for window in shown() {
            let label = scenario.stimulus.moments[window.moment as usize].label.clone();
            let states = window.states.as_ref().map_or("?".to_string(), |it| words::count(it.len() as u64));
            let [least, most] = match window.settling {
                Some((least, most)) => [least.rounded().to_string(), most.rounded().to_string()],
                None => ["?".to_string(), "no bound".to_string()],
            };
            let note = match (window.settling_but_for_ties, window.settling_below) {
                (true, _) => "but for exactly equal times",
                (false, true) => "less than that",
                (false, false) => "",
            };
            let mut cells = vec![label, states, least, most];
            cells.extend(remarked.then(|| note.to_string()));
            table.row(Tone::Plain, cells);
        }
        paper.table(&table);
        super::more(paper, proof.windows.len().saturating_sub(most), "proof.json");
    }
    super::prove_more::margins(paper, scenario, asked, proof);
    if let Some(padding) = &proof.padding {
        super::prove_more::padding(paper, scenario, padding);
    }
    for note in &proof.notes {
        paper.say(0, Tone::Unsure, note);
    }
}

/// Claims with their reasons, those of one reason together.
fn reasons(paper: &mut Paper, title: &str, claims: &[(String, &Claim)]) {
    if claims.is_empty() {
        return;
    }
    paper.heading(title);
    let mut groups: Vec<(&str, Vec<&str>)> = Vec::new();
    for (about, claim) in claims {
        let reason = claim.reason.as_deref().unwrap_or("no reason is known");
        match groups.iter_mut().find(|group| group.0 == reason) {
            Some(group) => group.1.push(about),
            None => groups.push((reason, vec![about])),
        }
    }
    for (reason, abouts) in groups.iter().take(FULL) {
        let more = match abouts.len() - 1 {
            0 => String::new(),
            n => format!(" and {n} more"),
        };
        paper.item(Tone::Unsure, &format!("{}{more}: {reason}", abouts[0]));
    }
    super::more(paper, groups.len().saturating_sub(FULL), "proof.json");
}
