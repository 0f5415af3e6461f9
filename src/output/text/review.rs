//! The review: verdict first.

use super::Page;
use super::paper::{Paper, Tone};
use super::search::{Searching, search};
use super::why::Causes;
use super::{challenge, conditions, findings, flow, notes, rules, steps, sure, ties};
use crate::output::search::case_files;
use crate::output::words;
use crate::review::{Call, Review, Verdict};
use crate::scenario::{Scenario, Vary};
use crate::sweep::SweepReport;

/// Most reasons of the verdict.
const REASONS: usize = 5;
const REASONS_OF_A_PAGE: usize = 40;

/// The text of `review`: verdict, reasons, steps, findings, rules, the delay-free view in short, notes.
pub fn review(scenario: &Scenario, review: &Review, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    verdict(&mut paper, &review.verdict);
    let files = case_files(review);
    let searching = review.search.as_ref().map(|report| Searching { report, files: &files });
    let mut causes = Causes::of(scenario, review);
    body(&mut paper, page, scenario, &review.asked, &review.sweep, searching, Some(&mut causes));
    challenge::challenge(&mut paper, scenario, review);
    flow::short(&mut paper, scenario, &review.states.flow);
    notes::notes(&mut paper, scenario);
    paper.finish()
}

/// The verdict in one sentence, and its reasons.
pub(super) fn verdict(paper: &mut Paper, verdict: &Verdict) {
    let (words, sentence) = (verdict.call.words(), verdict.sentence.trim());
    let sentence = match sentence.to_lowercase().starts_with(words) {
        true => sentence.to_string(),
        false => format!("{words}: {sentence}"),
    };
    let mut letters = sentence.chars();
    let capital = letters.next().map_or_else(String::new, |first| first.to_uppercase().collect());
    let tone = match verdict.call {
        Call::Broken => Tone::Bad,
        Call::Undecided => Tone::Unsure,
        Call::Proved | Call::NoFailureFound => Tone::Strong,
    };
    paper.say(0, tone, &format!("{capital}{}", letters.as_str()));
    // a single reason is in the sentence already
    if verdict.reasons.len() > 1 {
        let most = paper.most(REASONS, REASONS_OF_A_PAGE);
        for reason in verdict.reasons.iter().take(most) {
            paper.item(Tone::Plain, reason);
        }
        super::more(paper, verdict.reasons.len().saturating_sub(most), "the JSON, with --json");
    }
}

/// Everything about a sweep below its first sentence, but for the notes.
pub(super) fn body(
    paper: &mut Paper,
    page: &Page<'_>,
    scenario: &Scenario,
    asked: &crate::findings::Asked,
    report: &SweepReport,
    searching: Option<Searching<'_>>,
    causes: Option<&mut Causes<'_>>,
) {
    paper.heading(&format!("{}: steps and settling times ({})", scenario.title, draws(report)));
    missing(paper, report);
    steps::steps(paper, scenario, report);
    findings::findings(paper, page, scenario, asked, report, searching, causes);
    conditions::conditions(paper, page, scenario, asked, report);
    rules::count(paper, report);
    sure::sure(paper, report);
    ties::ties(paper, report);
    rules::not_judged(paper, scenario, report);
    rules::margins(paper, scenario, report, searching);
    if let Some(searching) = searching {
        search(paper, page, searching);
    }
}

/// What of the draws that were asked for was not run.
pub(super) fn missing(paper: &mut Paper, report: &SweepReport) {
    if report.samples < report.plan.samples && !report.stopped.as_ref().is_some_and(|it| it.curve.sure) {
        let (done, wanted) = (words::count(report.samples), words::count(report.plan.samples));
        let missing = match report.missing.is_empty() {
            true => String::new(),
            false => format!(" Missing: {}.", report.missing.words()),
        };
        paper.say(2, Tone::Unsure, &format!("Only {done} of {wanted} draws were run.{missing}"));
    }
    for condition in report.conditions.iter().filter(|it| it.sweep.missing != report.missing) {
        let (name, missing) = (&condition.condition.name, condition.sweep.missing.words());
        paper.say(2, Tone::Unsure, &format!("Under condition {name}: missing {missing}."));
    }
}

/// What was drawn: `Monte Carlo, 10,000 draws, uniform, seed 1`.
pub(in crate::output) fn draws(report: &SweepReport) -> String {
    let mut text = format!(
        "Monte Carlo, {}, {}, seed {}",
        words::many(report.samples, "draw"),
        report.plan.draw.name(),
        report.plan.seed
    );
    if report.plan.vary == Vary::PerEvent {
        text += ", every firing anew";
    }
    if report.plan.tries > 1 {
        text += &format!(", {} tries a board", words::count(report.plan.tries));
    }
    text
}
