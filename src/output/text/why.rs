//! Why a finding happens: what must leave typical, what decides, and how to replay it with nothing else.

use super::Page;
use super::paper::{Paper, Tone};
use crate::output::search::{rare_claim, rare_file};
use crate::output::{causes, deciding, words};
use crate::review::{Away, Pull, Review, Why};
use crate::scenario::Scenario;
use crate::sweep::Finding;
use crate::time::rounded;

/// Most quantities named of one finding, of either kind.
const NAMED: usize = 4;
/// Causes told in full; those of further findings are in the table.
const FULL: usize = 1;
/// Below this share of its way how far a quantity is from typical is told as a time.
const HARDLY: f64 = 0.001;

/// What a review knows of causes, and the files that it writes.
pub(super) struct Causes<'a> {
    review: &'a Review,
    files: Vec<Option<String>>,
    /// What was said of each finding so far, in the order of the text.
    told: Vec<String>,
}

impl<'a> Causes<'a> {
    pub fn of(scenario: &Scenario, review: &'a Review) -> Causes<'a> {
        Causes { review, files: causes::case_files(scenario, review), told: Vec::new() }
    }

    /// One a finding of the sweep.
    pub fn why(&self) -> &'a [Option<Why>] {
        &self.review.why
    }

    /// Of a rare finding the inequality that decides it, where one is known, and the command that replays its witness.
    pub fn rare(&self, page: &Page<'_>, scenario: &Scenario, finding: &Finding) -> Option<(Option<String>, String)> {
        let claim = rare_claim(self.review, finding)?;
        let file = rare_file(self.review, finding)?;
        Some((claim.race.as_ref().map(|race| deciding::race(scenario, race)), page.replay_file(&file)))
    }

    /// Is something left to the table?
    pub fn more(&self) -> bool {
        let mut more = self.told.iter().enumerate().skip(FULL);
        more.any(|(number, text)| !text.is_empty() && !self.told[..number].contains(text))
    }

    /// Why the next finding of the text happens, if that was looked into. What was told of one before is not told again.
    pub fn next(&mut self, page: &Page<'_>, scenario: &Scenario, finding: &Finding) -> Told {
        let mut all = self.review.sweep.findings.iter();
        let number = all.position(|it| it.subject == finding.subject);
        let why = number.and_then(|number| Some((number, self.review.why.get(number)?.as_ref()?)));
        let text = why.map_or_else(String::new, |(_, why)| {
            [needs(scenario, why), pull(scenario, why)].into_iter().flatten().collect::<Vec<_>>().join("; ")
        });
        let before = self.told.iter().position(|it| *it == text && !text.is_empty());
        self.told.push(text.clone());
        if let Some(before) = before {
            return Told::SameAs(before + 1);
        }
        if self.told.len() > FULL && !text.is_empty() {
            return Told::InTheTable;
        }
        let file = number.and_then(|number| self.files.get(number)?.as_deref());
        Told::Anew { text, replay: file.map(|file| page.replay_file(file)) }
    }
}

/// What the text says of one cause.
pub(super) enum Told {
    /// What was said of the finding with this number, from 1.
    SameAs(usize),
    /// Nothing: the page is full.
    InTheTable,
    /// A sentence (empty if nothing is known), and the command that replays it.
    Anew { text: String, replay: Option<String> },
}

impl Told {
    /// What is added to the figures of the finding.
    pub fn beside(&self) -> String {
        match self {
            Told::SameAs(number) => format!("; it takes the same as {number}"),
            Told::InTheTable | Told::Anew { .. } => String::new(),
        }
    }

    /// What stands below them.
    pub fn say(&self, paper: &mut Paper) {
        let Told::Anew { text, replay } = self else { return };
        if !text.is_empty() {
            paper.say(4, Tone::Plain, &words::sentence(text));
        }
        if let Some(replay) = replay {
            paper.whole(4, replay);
        }
    }
}

/// `it takes green fall 13.2 ns [9 … 16 ns] (29 % from typ to max); else typical`.
pub(in crate::output) fn needs(scenario: &Scenario, why: &Why) -> Option<String> {
    let needs = why.needs.as_ref()?;
    let mut parts: Vec<String> = needs.away.iter().take(NAMED).map(|it| away(scenario, it)).collect();
    let more = needs.away.len().saturating_sub(NAMED);
    if more > 0 {
        parts.push(format!("{} more (causes.csv)", words::count(more as u64)));
    }
    let mut text = match parts.is_empty() {
        true => String::new(),
        false => format!("it takes {}; else typical", parts.join(", ")),
    };
    for remark in causes::remarks(needs) {
        let gap = if text.is_empty() { "" } else { ", " };
        text += &format!("{gap}{remark}");
    }
    Some(text)
}

fn away(scenario: &Scenario, it: &Away) -> String {
    let time = |span| rounded(words::value(&it.quantity, span));
    let (end, side) = if it.value < it.typical { ("min", "below") } else { ("max", "above") };
    // what only has to be a little longer or shorter than another
    let way = match it.place().abs() {
        way if way < HARDLY => format!("{} {side} typ", rounded(i128::from(it.value.fs().abs_diff(it.typical.fs())))),
        way => format!("{} from typ to {end}", words::percent(way)),
    };
    let (min, max) = (time(it.quantity.range.min), time(it.quantity.range.max));
    // a unit that both have is written once
    let unit = |text: &str| text.rsplit_once(' ').map(|(digits, unit)| (digits.to_string(), unit.to_string()));
    let min = match (unit(&min), unit(&max)) {
        (Some((digits, unit)), Some((_, same))) if unit == same => digits,
        _ => min,
    };
    format!("{} {} [{min} … {max}] ({way})", words::quantity(scenario, it.quantity.target), time(it.value))
}

/// `over all failing draws: float_not delay long (0.83), up_b delay short (0.31)`.
pub(in crate::output) fn pull(scenario: &Scenario, why: &Why) -> Option<String> {
    let told = &why.pull.as_ref()?.told;
    let each = |it: &Pull| {
        let side = if it.strength > 0.0 { "long" } else { "short" };
        format!("{} {side} ({:.2})", words::quantity(scenario, it.quantity.target), it.strength.abs())
    };
    let named: Vec<String> = told.iter().take(NAMED).map(each).collect();
    let more = told.len().saturating_sub(NAMED) as u64 + why.pull.as_ref()?.more;
    let more = if more > 0 { format!(" and {} more", words::count(more)) } else { String::new() };
    (!named.is_empty()).then(|| format!("over all failing draws: {}{more}", named.join(", ")))
}
