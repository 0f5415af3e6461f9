//! Rules that were not judged in every draw, and the margins of those without a failure.

use super::paper::{Paper, Table, Tone};
use super::search::Searching;
use crate::findings::Question;
use crate::output::words;
use crate::scenario::Scenario;
use crate::sweep::{RuleReport, SweepReport};
use crate::time::{Span, rounded};

/// Most rules told of in each list.
const MOST: usize = 5;

/// A question in words: `settle_within, open_upper, step together`.
pub(in crate::output) fn about(scenario: &Scenario, question: &Question, with_step: bool) -> String {
    let mut text = question.rule.word().to_string();
    if let Some(name) = &question.name {
        text += &format!(" \"{name}\"");
    }
    if let Some(pattern) = &question.pattern {
        text += &format!(" ({})", pattern.words(&scenario.circuit));
    }
    if let Some(net) = question.net {
        text += &format!(", {}", words::net(scenario, net));
    }
    if let Some(step) = words::step(scenario, question.moment).filter(|_| with_step) {
        text += &format!(", {}", words::the_step(step));
    }
    text
}

/// What was asked and how it was answered, in one sentence.
pub(super) fn count(paper: &mut Paper, report: &SweepReport) {
    let broken = report.rules.iter().filter(|rule| rule.broken > 0).count() as u64;
    let unjudged = report.rules.iter().filter(|rule| rule.broken == 0 && !rule.not_judged.is_empty()).count() as u64;
    let asked = report.rules.len() as u64;
    let untested = report.rules.iter().filter(|rule| rule.judged == 0 && rule.not_judged.is_empty()).count() as u64;
    let rest = asked - broken - unjudged - untested;
    let never = match untested {
        0 => String::new(),
        n => format!("; never put to the test: {}", words::count(n)),
    };
    let draws = words::many(report.samples, "draw");
    let text = format!(
        "Asked: {} (a rule and a step, or a rule for the whole run). Broken: {}; not judged in some draws: {}{never}; no failure found in {draws}: {}.",
        words::many(asked, "question"),
        words::count(broken),
        words::count(unjudged),
        words::count(rest),
    );
    paper.gap();
    paper.say(0, Tone::Plain, &text);
}

/// Rules that were not judged in some draws, those with most such draws first.
pub(super) fn not_judged(paper: &mut Paper, scenario: &Scenario, report: &SweepReport) {
    let missed = |rule: &RuleReport| rule.not_judged.iter().map(|(_, n)| n).sum::<u64>();
    let mut rules: Vec<&RuleReport> = report.rules.iter().filter(|rule| missed(rule) > 0).collect();
    rules.sort_by_key(|rule| (!rule.question.written, std::cmp::Reverse(missed(rule))));
    if rules.is_empty() {
        return;
    }
    paper.heading("Not judged");
    for rule in rules.iter().take(MOST) {
        let why = rule.not_judged.iter().map(|(reason, n)| format!("{} {}", reason.words(), words::count(*n)));
        let text = format!(
            "{}: {} ({})",
            about(scenario, &rule.question, true),
            words::many(missed(rule), "draw"),
            why.collect::<Vec<_>>().join(", ")
        );
        paper.item(Tone::Unsure, &text);
    }
    super::more(paper, rules.len().saturating_sub(MOST), "rules.csv");
}

/// Margins of rules with a number that no draw broke, smallest first; of one rule the step with the smallest. Beside each
/// the smallest that a directed search met at any of its steps.
pub(super) fn margins(paper: &mut Paper, scenario: &Scenario, report: &SweepReport, searching: Option<Searching<'_>>) {
    let same_rule = |rule: &RuleReport, number: u32| {
        let key = |it: &Question| (it.rule, it.index, it.net);
        report.rules.get(number as usize).is_some_and(|other| key(&other.question) == key(&rule.question))
    };
    let mut least: Vec<(&RuleReport, i128, Span)> = Vec::new();
    for rule in &report.rules {
        let (Some(margin), Some(bound)) = (rule.margin, rule.question.bound) else { continue };
        if bound == Span::ZERO {
            continue;
        }
        let same = |other: &Question| {
            let key = |it: &Question| (it.rule, it.index, it.net);
            key(other) == key(&rule.question)
        };
        match least.iter_mut().find(|entry| same(&entry.0.question)) {
            Some(entry) if margin < entry.1 => *entry = (rule, margin, bound),
            Some(_) => {}
            None => least.push((rule, margin, bound)),
        }
    }
    // a rule that one of its steps broke is among the findings
    least.retain(|(rule, margin, _)| rule.broken == 0 && *margin >= 0);
    least.retain(|(rule, ..)| !searching.is_some_and(|it| it.broke(|number| same_rule(rule, number))));
    // nor is one without a failure that the proof refutes
    let rare = report.findings.iter().filter(|finding| finding.rare).filter_map(|it| it.subject.question);
    least.retain(|(rule, ..)| !rare.clone().any(|number| same_rule(rule, number)));
    least.sort_by_key(|entry| entry.1);
    if least.is_empty() {
        return;
    }
    paper.heading(&format!("Smallest margins without a failure, in {}", words::many(report.samples, "draw")));
    let mut table = Table::new().number("margin", 0);
    if searching.is_some() {
        table = table.number("by search", 0);
    }
    table = table.number("bound", 0).text("rule").text("step").number("sample", 1);
    for (rule, margin, bound) in least.iter().take(MOST) {
        let mut row = vec![rounded(*margin)];
        if let Some(searching) = searching {
            row.push(searching.margin(|number| same_rule(rule, number)).map_or_else(String::new, rounded));
        }
        row.extend([
            bound.rounded(),
            about(scenario, &rule.question, false),
            words::step(scenario, rule.question.moment).unwrap_or("whole run").to_string(),
            rule.margin_sample.map_or_else(String::new, |sample| sample.to_string()),
        ]);
        table.row(Tone::Plain, row);
    }
    paper.table(&table);
    super::more(paper, least.len().saturating_sub(MOST), "rules.csv");
}
