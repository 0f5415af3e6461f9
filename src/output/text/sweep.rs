//! The sweep alone.

use super::Page;
use super::paper::Tone;
use super::review::body;
use crate::findings::Asked;
use crate::output::words;
use crate::scenario::Scenario;
use crate::sweep::SweepReport;

/// The text of `sweep`.
pub fn sweep(scenario: &Scenario, asked: &Asked, report: &SweepReport, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let broken = report.findings.iter().filter(|finding| finding.breaks_rule).count() as u64;
    let draws = words::many(report.samples, "draw");
    let steps = words::steps(scenario);
    let (tone, text) = match (broken, report.samples) {
        (_, 0) => (Tone::Unsure, "Nothing was run.".to_string()),
        (0, _) => {
            let missed = report.rules.iter().filter(|rule| !rule.not_judged.is_empty()).count() as u64;
            let but = match missed {
                0 => String::new(),
                _ => format!("; {} not judged in some of them", words::many(missed, "question")),
            };
            (Tone::Strong, format!("No failure found in {draws} for the {steps} of this scenario{but}."))
        }
        (n, _) => {
            let verb = if n == 1 { "breaks" } else { "break" };
            (Tone::Bad, format!("{} {verb} a rule in {draws} for the {steps} of this scenario.", words::many(n, "finding")))
        }
    };
    paper.say(0, tone, &text);
    body(&mut paper, page, scenario, asked, report);
    paper.finish()
}
