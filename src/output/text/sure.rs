//! How sure the figures of a sweep are.

use super::paper::{Paper, Tone};
use crate::output::words;
use crate::sweep::{AtMost, Stopped, SweepReport, UnseenMass};

/// What was never seen, and what has not been seen yet: a few lines below the count of questions.
pub(super) fn sure(paper: &mut Paper, report: &SweepReport) {
    if report.samples == 0 {
        return;
    }
    if let Some(stopped) = &report.stopped {
        until(paper, report, stopped);
    }
    if !report.plan.draw.allows_intervals() {
        let draw = report.plan.draw.name();
        let text = format!("Draws of {draw} are not independent draws of parts: no interval, no upper bound is given.");
        paper.say(0, Tone::Plain, &text);
    } else if let Some(at_most) = report.at_most {
        let text = format!("No rule broken in {}: in at most {}.", of(&at_most), bound(&at_most));
        paper.say(0, Tone::Plain, &text);
    } else if let Some(weakest) = least_judged(report) {
        let text = format!("A rule not broken in {}: in at most {}.", of(&weakest), bound(&weakest));
        paper.say(0, Tone::Plain, &text);
    }
    if let Some(mass) = &report.unseen {
        unseen(paper, mass);
    }
    if report.unseen_untold > 0 {
        let steps = words::many(report.unseen_untold, "step");
        let text = format!("In {steps} loop nets changed in too many orders to tell what was not seen yet.");
        paper.say(0, Tone::Unsure, &text);
    }
}

/// Did it stop because it was sure, and how wide is what it says?
fn until(paper: &mut Paper, report: &SweepReport, stopped: &Stopped) {
    let (curve, most) = (&stopped.curve, words::count(report.plan.samples));
    let looks = words::many(stopped.looks, "planned look");
    match stopped.widest {
        Some(widest) if curve.sure => {
            let text = format!(
                "Stopped after {} of at most {most} draws: no 95 % interval is wider than {} (asked for: {}). Intervals \
                 allow for all {looks}.",
                words::count(curve.looked),
                words::three(widest),
                curve.until
            );
            paper.say(0, Tone::Plain, &text);
        }
        Some(widest) => {
            let text = format!(
                "Not sure: the widest 95 % interval is {} wide (asked for: {}). Intervals allow for all {looks}.",
                words::three(widest),
                curve.until
            );
            paper.say(0, Tone::Unsure, &text);
        }
        None => paper.say(0, Tone::Unsure, "Not sure: there is no share with an interval."),
    }
}

/// Of the rules that no draw broke, the one that was judged least.
fn least_judged(report: &SweepReport) -> Option<AtMost> {
    let kept = report.rules.iter().filter_map(|rule| rule.at_most);
    kept.max_by(|a, b| a.share.total_cmp(&b.share))
}

fn of(at_most: &AtMost) -> String {
    words::many(at_most.of, if at_most.boards { "board" } else { "draw" })
}

fn bound(at_most: &AtMost) -> String {
    let what = if at_most.boards { "boards" } else { "draws" };
    format!("{} of {what} (upper bound, one-sided 95 %)", words::percent(at_most.share))
}

/// One line; the step it speaks of is in the JSON.
fn unseen(paper: &mut Paper, mass: &UnseenMass) {
    let (estimate, upper) = (words::percent(mass.estimate), words::percent(mass.upper));
    let figures = format!("orders of loop nets in {estimate} of further draws (at most {upper}, one-sided 95 %).");
    if mass.is_high() {
        paper.say(0, Tone::Unsure, &format!("Draw more: new {figures}"));
    } else {
        paper.say(0, Tone::Plain, &format!("New {figures}"));
    }
}
