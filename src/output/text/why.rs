//! Why a finding happens: what must leave typical, what decides, and how to replay it with nothing else.

use super::Page;
use super::paper::{Paper, Tone};
use crate::output::{causes, words};
use crate::review::{Away, Pull, Review, Why};
use crate::scenario::Scenario;
use crate::sweep::Finding;
use crate::time::rounded;

/// Most quantities named of one finding, of either kind.
const NAMED: usize = 4;

/// What a review knows of causes, and the files that it writes.
pub(super) struct Causes<'a> {
    review: &'a Review,
    files: Vec<Option<String>>,
}

impl<'a> Causes<'a> {
    pub fn of(scenario: &Scenario, review: &'a Review) -> Causes<'a> {
        Causes { review, files: causes::case_files(scenario, review) }
    }

    /// Tells why a finding happens, if that was looked into.
    pub fn say(&self, paper: &mut Paper, page: &Page<'_>, scenario: &Scenario, finding: &Finding) {
        let mut all = self.review.sweep.findings.iter();
        let Some(number) = all.position(|it| it.subject == finding.subject) else { return };
        let Some(why) = self.review.why.get(number).and_then(Option::as_ref) else { return };
        let text = [needs(scenario, why), pull(scenario, why)].into_iter().flatten().collect::<Vec<_>>().join("; ");
        if !text.is_empty() {
            paper.say(4, Tone::Plain, &words::sentence(&text));
        }
        if let Some(file) = self.files.get(number).and_then(Option::as_deref) {
            paper.whole(4, &page.replay_file(file));
        }
    }
}

/// `it takes green fall 13.2 ns [9 … 16 ns], 29 % of the way from typ to max, all else typical`.
fn needs(scenario: &Scenario, why: &Why) -> Option<String> {
    let needs = why.needs.as_ref()?;
    let mut parts: Vec<String> = needs.away.iter().take(NAMED).map(|it| away(scenario, it)).collect();
    let more = needs.away.len().saturating_sub(NAMED);
    if more > 0 {
        parts.push(format!("{} more (causes.csv)", words::count(more as u64)));
    }
    let mut text = match parts.is_empty() {
        true => String::new(),
        false => format!("it takes {}; all else typical", parts.join(", ")),
    };
    for remark in causes::remarks(needs) {
        let gap = if text.is_empty() { "" } else { ", " };
        text += &format!("{gap}{remark}");
    }
    Some(text)
}

fn away(scenario: &Scenario, it: &Away) -> String {
    let time = |span| rounded(words::value(&it.quantity, span));
    let end = if it.value < it.typical { "min" } else { "max" };
    format!(
        "{} {} [{} … {}] ({} from typ to {end})",
        words::quantity(scenario, it.quantity.target),
        time(it.value),
        time(it.quantity.range.min),
        time(it.quantity.range.max),
        words::percent(it.place().abs()),
    )
}

/// `most decisive: float_not long (0.83), up_b short (0.31)`.
fn pull(scenario: &Scenario, why: &Why) -> Option<String> {
    let told = &why.pull.told;
    let each = |it: &Pull| {
        let side = if it.strength > 0.0 { "long" } else { "short" };
        format!("{} {side} ({:.2})", words::quantity(scenario, it.quantity.target), it.strength.abs())
    };
    let named: Vec<String> = told.iter().take(NAMED).map(each).collect();
    let more = told.len().saturating_sub(NAMED) as u64 + why.pull.more;
    let more = if more > 0 { format!(" and {} more", words::count(more)) } else { String::new() };
    (!named.is_empty()).then(|| format!("over all failing draws decisive: {}{more}", named.join(", ")))
}
