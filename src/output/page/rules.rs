//! Rules: how often each was judged, how it came out, and its margin.

use maud::{Markup, html};

use super::parts::{Cell, Table, blocks, cut, figure};
use super::{Told, anchor};
use crate::output::text::{self, Tone, for_page};
use crate::output::{margin_charts, margins};
use crate::output::words::{self, count, many};
use crate::sweep::RuleReport;
use crate::time::rounded;

/// Most rows.
const ROWS: usize = 240;

/// How a question came out.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Came {
    /// A finding tells.
    Found(usize),
    Broken,
    Untested,
    NotJudged,
    NotAlways,
    NoFailure,
}

/// One rule at steps where it came out alike.
struct Alike<'a> {
    came: Came,
    /// Numbers and reports, in the order of the questions.
    rules: Vec<(u32, &'a RuleReport)>,
}

pub(super) fn section(told: &Told<'_>) -> Markup {
    let all = alike(told);
    let table = Table {
        id: "rules-table",
        caption: "Rules. Steps at which a rule came out alike share a row, with the smallest margin of them; rules.csv has each. \
                  Counts are of draws, added up over the steps of a row; a margin is the worst slack seen, negative where the rule is broken",
        head: vec![
            ("rule", false),
            ("step", false),
            ("came out", false),
            ("judged", true),
            ("broken", true),
            ("not judged", false),
            ("margin", true),
            ("by search", true),
            ("bound", true),
            ("margin at step", false),
            ("sample", true),
        ],
        rows: all.iter().take(ROWS).map(|group| row(told, group)).collect(),
    };
    html! {
        (blocks("answers", "Answers", &for_page::answers(told.page, told.review)))
        @if !all.is_empty() { (table.draw()) }
        (cut(all.len().saturating_sub(ROWS), "rows", "rules.csv"))
        @if margins::any(&told.review.sweep) {
            (figure("margins", &margin_charts::svg(told.scenario, &told.review.sweep), &html! {
                "How the margins of the draws spread, the least first; of each draw its worst slack. Left of 0 the rule is broken. \
                 Files: " code { "margins.svg" } ", " code { "margins.csv" } "."
            }))
        }
    }
}

/// Questions of one rule, net and pattern that came out alike.
fn alike<'a>(told: &Told<'a>) -> Vec<Alike<'a>> {
    let review: &'a crate::review::Review = told.review;
    let mut all: Vec<Alike<'a>> = Vec::new();
    for (number, rule) in (0..).zip(&review.sweep.rules) {
        let finding = review.sweep.findings.iter().position(|it| it.breaks_rule && it.subject.question == Some(number));
        let came = match (finding, rule.broken, rule.not_judged.is_empty(), rule.judged) {
            (Some(finding), ..) => Came::Found(finding),
            (None, 1.., ..) => Came::Broken,
            (None, 0, true, 0) => Came::Untested,
            (None, 0, false, 0) => Came::NotJudged,
            (None, 0, false, _) => Came::NotAlways,
            (None, 0, true, _) => Came::NoFailure,
        };
        let same = |group: &&mut Alike<'_>| {
            let (one, other) = (&group.rules[0].1.question, &rule.question);
            let alike = (one.rule, one.index, one.net) == (other.rule, other.index, other.net);
            alike && one.pattern == other.pattern && one.bound == other.bound && group.came == came
        };
        match all.iter_mut().find(same) {
            Some(group) => group.rules.push((number, rule)),
            None => all.push(Alike { came, rules: vec![(number, rule)] }),
        }
    }
    all
}

fn row(told: &Told<'_>, group: &Alike<'_>) -> Vec<Cell> {
    let scenario = told.scenario;
    let first = group.rules[0].1;
    let label = |rule: &RuleReport| words::step(scenario, rule.question.moment).unwrap_or("whole run").to_string();
    let least = group.rules.iter().filter_map(|(_, rule)| Some((rule.margin?, *rule))).min_by_key(|it| it.0);
    let searched = told.review.search.iter().flat_map(|search| &search.searched);
    let searched = searched.filter(|it| group.rules.iter().any(|rule| rule.0 == it.question));
    let searched = searched.filter_map(|it| it.margin).min();
    let mut reasons: Vec<(&str, u64)> = Vec::new();
    for (reason, n) in group.rules.iter().flat_map(|rule| &rule.1.not_judged) {
        match reasons.iter_mut().find(|it| it.0 == reason.words()) {
            Some(it) => it.1 += n,
            None => reasons.push((reason.words(), *n)),
        }
    }
    let unjudged: Vec<String> = reasons.iter().map(|(reason, n)| format!("{} ({reason})", count(*n))).collect();
    let one = group.rules.len() == 1;
    vec![
        Cell::Text(text::about_rule(scenario, &first.question, false)),
        Cell::Text(if one { label(first) } else { many(group.rules.len() as u64, "step") }),
        match group.came {
            Came::Found(finding) => Cell::Link(anchor(finding), format!("broken: finding {}", finding + 1)),
            Came::Broken => Cell::Marked(Tone::Bad, "broken".into()),
            Came::Untested => Cell::Marked(Tone::Unsure, "never put to the test".into()),
            Came::NotJudged => Cell::Marked(Tone::Unsure, "not judged".into()),
            Came::NotAlways => Cell::Marked(Tone::Unsure, "not judged in some draws".into()),
            Came::NoFailure => Cell::Text("no failure found".into()),
        },
        Cell::Number(count(group.rules.iter().map(|rule| rule.1.judged).sum())),
        Cell::Number(count(group.rules.iter().map(|rule| rule.1.broken).sum())),
        if unjudged.is_empty() { Cell::Empty } else { Cell::Text(unjudged.join(", ")) },
        least.map_or(Cell::Empty, |(margin, _)| Cell::Number(rounded(margin))),
        searched.map_or(Cell::Empty, |margin| Cell::Number(rounded(margin))),
        first.question.bound.filter(|it| it.fs() > 0).map_or(Cell::Empty, |bound| Cell::Number(bound.rounded())),
        least.filter(|_| !one).map_or(Cell::Empty, |(_, rule)| Cell::Text(label(rule))),
        least.and_then(|it| it.1.margin_sample).map_or(Cell::Empty, |sample| Cell::Number(sample.to_string())),
    ]
}
