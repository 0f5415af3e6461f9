//! How sure the figures of a sweep are.

use super::paper::{Paper, Tone};
use crate::output::words;
use crate::scenario::Scenario;
use crate::sweep::{AtMost, SweepReport, UnseenMass};

/// What was never seen, and what has not been seen yet.
pub(super) fn sure(paper: &mut Paper, scenario: &Scenario, report: &SweepReport) {
    if report.samples == 0 {
        return;
    }
    let mut lines: Vec<(Tone, String)> = Vec::new();
    if !report.plan.draw.allows_intervals() {
        let draw = report.plan.draw.name();
        lines.push((
            Tone::Plain,
            format!("Draws of {draw} are not independent draws of parts: no interval and no upper bound is given."),
        ));
    } else if let Some(at_most) = report.at_most {
        lines.push((Tone::Plain, format!("None of {} broke a rule. {}.", of(&at_most), bound(&at_most))));
    } else {
        // of the rules that no draw broke, the one that was judged least
        let kept = report.rules.iter().filter_map(|rule| rule.at_most);
        if let Some(weakest) = kept.max_by(|a, b| a.share.total_cmp(&b.share)) {
            let text =
                format!("A rule that none of {} broke: {}.", of(&weakest), bound(&weakest).replacen('A', "a", 1));
            lines.push((Tone::Plain, text));
        }
    }
    if let Some(mass) = &report.unseen {
        lines.push(unseen(scenario, mass));
    }
    match report.unseen_untold {
        0 => {}
        n => lines.push((
            Tone::Unsure,
            format!(
                "In {} there were too many different orders of loop nets to tell what was not seen yet.",
                words::many(n, "step")
            ),
        )),
    }
    if !lines.is_empty() {
        paper.heading("How sure");
        lines.into_iter().for_each(|(tone, text)| paper.item(tone, &text));
    }
}

fn of(at_most: &AtMost) -> String {
    words::many(at_most.of, if at_most.boards { "board" } else { "draw" })
}

fn bound(at_most: &AtMost) -> String {
    let what = if at_most.boards { "boards" } else { "draws" };
    format!("At most {} of such {what} break it (upper bound, one-sided 95 %)", words::percent(at_most.share))
}

fn unseen(scenario: &Scenario, mass: &UnseenMass) -> (Tone, String) {
    let step = words::step(scenario, Some(mass.moment)).unwrap_or_default();
    let figures = format!(
        "step {step}: {} (estimate by Good and Turing; at most {}, one-sided 95 %)",
        words::percent(mass.estimate),
        words::percent(mass.upper)
    );
    if mass.is_high() {
        let text = format!(
            "Much has not been seen yet. Chance that the next draw changes loop nets in a new order, {figures}. Draw more samples."
        );
        (Tone::Unsure, text)
    } else {
        (Tone::Plain, format!("Chance that the next draw changes loop nets in a new order, {figures}."))
    }
}
