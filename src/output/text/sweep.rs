//! The sweep alone.

use super::Page;
use super::notes;
use super::review::{body, verdict as say_verdict};
use crate::findings::Asked;
use crate::review::Verdict;
use crate::scenario::Scenario;
use crate::sweep::SweepReport;

/// The text of `sweep`: the same as that of a review, from the sweep alone.
pub fn sweep(scenario: &Scenario, asked: &Asked, report: &SweepReport, verdict: &Verdict, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    say_verdict(&mut paper, verdict);
    body(&mut paper, page, scenario, asked, report, None, None);
    notes::notes(&mut paper, scenario);
    paper.finish()
}
