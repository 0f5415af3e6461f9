//! The directed search of a review.

use serde::Serialize;

use super::parts::{Exact, Lines};
use crate::output::search::{CaseFile, file_of};
use crate::output::words;
use crate::review::Review;
use crate::scenario::Scenario;

/// One question: the worst margin of the draws and of the search (null without a number), why it ended, the file of its
/// worst case where that is worse than the draws.
#[derive(Serialize)]
pub(super) struct Question<'a> {
    rule: &'static str,
    name: Option<&'a str>,
    net: Option<&'a str>,
    pattern: Option<String>,
    step: Option<&'a str>,
    start_margin: Option<Exact>,
    margin: Option<Exact>,
    guide: &'static str,
    least: Option<Exact>,
    runs: u64,
    ended: &'static str,
    ties: u64,
    broken: bool,
    case: Option<&'a str>,
}

/// All questions; `None` if none was searched for.
pub(super) fn search<'a>(
    scenario: &'a Scenario,
    review: &'a Review,
    files: &'a [CaseFile<'_>],
) -> Option<Lines<Question<'a>>> {
    let search = review.search.as_ref()?;
    let each = search.searched.iter().map(|it| {
        let question = &review.asked.questions[it.question as usize];
        Question {
            rule: question.rule.word(),
            name: question.name.as_deref(),
            net: question.net.map(|net| words::net(scenario, net)),
            pattern: question.pattern.as_ref().map(|pattern| pattern.words(&scenario.circuit)),
            step: words::step(scenario, question.moment),
            start_margin: it.start_margin.map(|fs| Exact::signed(fs, scenario.unit)),
            margin: it.margin.map(|fs| Exact::signed(fs, scenario.unit)),
            guide: it.guidance.word(),
            least: it.guidance.least().map(|fs| Exact::signed(i128::from(fs), scenario.unit)),
            runs: it.runs,
            ended: it.ended.words(),
            ties: it.ties,
            broken: it.breach.is_some(),
            case: file_of(files, Some(it.question)),
        }
    });
    Some(Lines(each.collect()))
}
