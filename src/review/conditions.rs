//! Conditions of temperature and supply: each swept as a case of its own, with the same draws, and compared.

use super::report::{Call, Verdict};
use super::verdict::of_one;
use crate::circuit::NetId;
use crate::delay::Billionths;
use crate::findings::{RuleKey, Subject};
use crate::scenario::{Condition, Scenario};
use crate::sweep::{Settling, SweepReport};
use crate::time::Span;

/// What a sweep says under one condition.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ByCondition {
    /// Its name; the file's own delays first, called `nominal`.
    pub name: String,
    /// What every delay was multiplied by.
    pub scale: Billionths,
    /// The verdict under it alone.
    pub verdict: Verdict,
}

/// The verdict under each condition, the file's own delays first; empty if there are no conditions.
pub fn by_condition(scenario: &Scenario, sweep: &SweepReport) -> Vec<ByCondition> {
    if sweep.conditions.is_empty() {
        return Vec::new();
    }
    cases(sweep)
        .map(|(name, scale, sweep)| ByCondition { name: name.to_string(), scale, verdict: of_one(scenario, sweep) })
        .collect()
}

/// Each sweep with its condition, the file's own delays first.
fn cases(sweep: &SweepReport) -> impl Iterator<Item = (&str, Billionths, &SweepReport)> {
    let nominal = (Condition::NOMINAL, Billionths::ONE, sweep);
    let others = sweep.conditions.iter().map(|it| (it.condition.name.as_str(), it.condition.scale, &it.sweep));
    std::iter::once(nominal).chain(others)
}

/// One verdict of all conditions: the worst of them, named, and what the others say.
pub(super) fn together(each: Vec<ByCondition>) -> Option<Verdict> {
    let rank = |call: Call| match call {
        Call::Broken => 0,
        Call::Undecided => 1,
        Call::NoFailureFound => 2,
        Call::Proved => 3,
    };
    let worst = each.iter().min_by_key(|it| rank(it.verdict.call))?;
    let call = worst.verdict.call;
    let name = |it: &ByCondition| match it.name.as_str() {
        Condition::NOMINAL => "with nominal delays".to_string(),
        name => format!("under condition {name}"),
    };
    let sentence = worst.verdict.sentence.trim();
    // behind the call, so that the sentence still begins with it
    let sentence = match sentence.strip_prefix(call.words()) {
        Some(rest) => format!("{} {}{rest}", call.words(), name(worst)),
        None => format!("{} {}: {sentence}", call.words(), name(worst)),
    };
    let others: Vec<String> = each
        .iter()
        .filter(|it| it.name != worst.name)
        .map(|it| format!("{} {}", it.name, it.verdict.call.words()))
        .collect();
    let sentence = format!("{sentence}; {}", others.join(", "));
    let mut reasons: Vec<String> = Vec::new();
    let nominal = each.first().map(|it| it.verdict.reasons.clone()).unwrap_or_default();
    for it in &each {
        for reason in &it.verdict.reasons {
            if it.name == Condition::NOMINAL {
                reasons.push(reason.clone());
            } else if !nominal.contains(reason) {
                reasons.push(format!("{}: {reason}", it.name));
            }
        }
    }
    Some(Verdict { call, sentence, reasons })
}

/// The conditions side by side: one column each, the file's own delays first.
#[derive(Clone, Debug, PartialEq)]
pub struct Comparison {
    /// Names, and what every delay was multiplied by.
    pub columns: Vec<(String, Billionths)>,
    /// Rows in the order verdict, findings, margins, settling; each has one cell a column.
    pub rows: Vec<(Compared, Vec<Option<Cell>>)>,
}

/// What a row compares.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Compared {
    /// The verdict.
    Verdict,
    /// How often a finding that breaks a rule was seen.
    Share(Subject),
    /// The worst margin of a rule: its number, and that of one of its questions.
    Margin(u32),
    /// Median settling time of the windows of a moment.
    Median(u32),
    /// Longest settling time of the windows of a moment.
    Longest(u32),
}

/// One figure.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Cell {
    /// The verdict.
    Call(Call),
    /// Draws that show a finding, and draws judged.
    Count(u64, u64),
    /// A signed time in fs.
    Margin(i128),
    /// A time; a cut window could make it longer.
    Time(Span, bool),
}

/// Compares the conditions of a sweep; `None` if there are none.
pub fn compare(scenario: &Scenario, sweep: &SweepReport) -> Option<Comparison> {
    if sweep.conditions.is_empty() {
        return None;
    }
    let cases: Vec<(&str, Billionths, &SweepReport)> = cases(sweep).collect();
    let row = |what: Compared, cell: &dyn Fn(&SweepReport) -> Option<Cell>| {
        (what, cases.iter().map(|case| cell(case.2)).collect::<Vec<_>>())
    };
    let mut rows = Vec::new();
    rows.push(row(Compared::Verdict, &|sweep| Some(Cell::Call(of_one(scenario, sweep).call))));

    let mut subjects: Vec<Subject> = Vec::new();
    for finding in cases.iter().flat_map(|case| &case.2.findings).filter(|it| it.breaks_rule) {
        if !subjects.contains(&finding.subject) {
            subjects.push(finding.subject);
        }
    }
    for subject in subjects {
        rows.push(row(Compared::Share(subject), &|sweep| {
            let found = sweep.findings.iter().find(|it| it.subject == subject);
            // what was not found was found in none of the draws in which it was judged
            let judged = || Some((0, sweep.rules.get(subject.question? as usize)?.judged));
            found.map(|it| (it.count, it.of)).or_else(judged).map(|(count, of)| Cell::Count(count, of))
        }));
    }

    // of one rule all steps together
    let key = |number: usize| {
        let question = &sweep.rules[number].question;
        (question.rule, question.index, question.net)
    };
    let mut seen: Vec<(RuleKey, u32, Option<NetId>)> = Vec::new();
    for number in 0..sweep.rules.len() {
        let any = cases.iter().any(|case| case.2.rules[number].margin.is_some());
        if !any || seen.contains(&key(number)) {
            continue;
        }
        seen.push(key(number));
        rows.push(row(Compared::Margin(number as u32), &|sweep| {
            let same = (0..sweep.rules.len()).filter(|other| key(*other) == key(number));
            same.filter_map(|other| sweep.rules[other].margin).min().map(Cell::Margin)
        }));
    }
    for moment in 0..sweep.windows.len() {
        let figure = |what: Compared, of: fn(&Settling) -> (Span, bool)| {
            row(what, &|sweep| {
                let settling = sweep.windows.get(moment)?.settling.as_ref()?;
                let (time, at_least) = of(settling);
                Some(Cell::Time(time, at_least))
            })
        };
        rows.push(figure(Compared::Median(moment as u32), |it| (it.median, it.median_at_least)));
        rows.push(figure(Compared::Longest(moment as u32), |it| (it.max, it.max_at_least)));
    }
    let columns = cases.iter().map(|case| (case.0.to_string(), case.1)).collect();
    Some(Comparison { columns, rows })
}
