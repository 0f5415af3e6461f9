//! How far exactly equal times were looked for: nothing where all was.

use super::paper::{Paper, Tone};
use crate::output::words;
use crate::sweep::{SweepReport, Unmoved};

/// What was not looked into, a line each.
pub(super) fn ties(paper: &mut Paper, report: &SweepReport) {
    let ties = &report.ties;
    if !ties.done {
        paper.say(0, Tone::Unsure, "Interrupted before exactly equal times were looked for.");
    }
    if let Some(Unmoved { cases, first, why }) = &ties.unmoved {
        let cases = match cases {
            1 => words::delays(first),
            n => format!("{} cases, of which the first is {}", words::count(*n), words::delays(first)),
        };
        paper.say(0, Tone::Unsure, &format!("Exactly equal times were not looked for in {cases}: {why}."));
    }
    if ties.left_out > 0 {
        let findings = words::many(ties.left_out, "finding");
        paper.say(
            0,
            Tone::Unsure,
            &format!("Exactly equal times were not looked for in {findings}: there are too many."),
        );
    }
}
