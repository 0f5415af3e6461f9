//! Findings of a sweep, worst first.

use super::Page;
use super::paper::{Paper, Tone};
use crate::findings::{Asked, Kind, Subject};
use crate::output::words;
use crate::scenario::Scenario;
use crate::sweep::{Finding, SweepReport, Tie, Worst};

/// Most findings told in full.
const FULL: usize = 5;
/// Most findings listed that break no rule.
const LISTED: usize = 4;

/// What a finding is about: `glitch static-0, open_lower, step together`.
pub(super) fn about(scenario: &Scenario, asked: &Asked, subject: &Subject) -> String {
    let named = words::subject(scenario, asked, subject);
    let mut text = named.kind.to_string();
    if let Some(shape) = named.shape {
        text += &format!(" {shape}");
    }
    if let Some(name) = named.rule_name {
        text += &format!(" \"{name}\"");
    }
    if let Some(pattern) = named.pattern {
        text += &format!(" ({pattern})");
    }
    if let Some(net) = named.net {
        text += &format!(", {net}");
    }
    if let Some(step) = named.step {
        text += &format!(", step {step}");
    }
    text
}

/// The worst value in words, by what it measures.
pub(super) fn worst(kind: Kind, worst: Worst) -> String {
    match (kind, worst) {
        (Kind::Glitch | Kind::MinPulse, Worst::Time(width)) => format!("narrowest {}", width.rounded()),
        (Kind::SettleWithin, Worst::Time(time)) => format!("latest {}", time.rounded()),
        (Kind::Never, Worst::Time(time)) => format!("longest {}", time.rounded()),
        (_, Worst::Time(time)) => format!("worst {}", time.rounded()),
        (_, Worst::Share(share)) => format!("up to {} of the delay", words::three(share)),
    }
}

/// How often, how surely, how bad.
fn figures(finding: &Finding) -> String {
    let mut text = match (finding.tie, finding.count) {
        (Some(Tie::Appears), 0) => "in no draw; only when delays are moved by single femtoseconds".to_string(),
        _ => format!("{} of {} draws", words::count(finding.count), words::count(finding.of)),
    };
    if let Some(share) = finding.share {
        text += &format!(", {}", words::percent(share));
    }
    if let Some((low, high)) = finding.interval {
        text += &format!(" (95 %: {} to {})", words::percent(low), words::percent(high));
    }
    if let Some(boards) = finding.boards {
        let (failing, of) = (words::count(boards.failing), words::count(boards.of));
        let worst = words::percent(boards.worst_share);
        text += &format!("; {failing} of {of} boards, the worst in {worst} of its tries");
    }
    if let Some(value) = finding.worst {
        text += &format!("; {}", worst(finding.subject.kind, value));
    }
    if finding.tie == Some(Tie::Vanishes) {
        text += "; gone when delays are moved by single femtoseconds (exactly equal times)";
    }
    text
}

/// Findings that break a rule in full, then those that break none.
pub(super) fn findings(paper: &mut Paper, page: &Page<'_>, scenario: &Scenario, asked: &Asked, report: &SweepReport) {
    let (broken, listed): (Vec<&Finding>, Vec<&Finding>) = report.findings.iter().partition(|it| it.breaks_rule);
    if !broken.is_empty() {
        paper.heading("Findings that break a rule, worst first");
        for (i, finding) in broken.iter().take(FULL).enumerate() {
            let text = format!("{} {}", i + 1, about(scenario, asked, &finding.subject));
            paper.hang(2, 4, Tone::Bad, &text);
            paper.say(4, Tone::Plain, &figures(finding));
            if let Some(sample) = finding.worst_sample.or(finding.sample) {
                paper.whole(4, &page.replay(sample));
            }
        }
        super::more(paper, broken.len().saturating_sub(FULL), "findings.csv");
    }
    if !listed.is_empty() {
        paper.heading("Also seen, breaks no rule");
        for finding in listed.iter().take(LISTED) {
            let text = format!("{}: {}", about(scenario, asked, &finding.subject), figures(finding));
            paper.item(Tone::Plain, &text);
        }
        super::more(paper, listed.len().saturating_sub(LISTED), "findings.csv");
    }
}
