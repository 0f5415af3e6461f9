//! The views put together: runs, states and sweep of one scenario, the checks of the views against each other, and the
//! verdict. Plain data; nothing is drawn here.

mod challenge;
mod conditions;
mod contained;
mod departure;
mod paths;
mod report;
mod single;
mod sweeping;
mod ties;
mod verdict;
mod why;

use std::collections::BTreeMap;

pub use challenge::{challenge, challenge_run};
pub use conditions::{ByCondition, Cell, Compared, Comparison, by_condition, compare};
pub use departure::{DepartureWords, departure_words};
pub use report::{Call, Review, RunReport, StatesReport, Verdict};
pub use single::{MOST_KEPT, run_heard, run_one, states};
pub use sweeping::{Saved, Stops, Sweeper, sweep};
pub use verdict::{grouped, reviewed, verdict, without_draws};
pub use why::{Away, Cut, Kept, LOOKED_INTO, Needs, Pull, Pulls, Ranks, Untold, Why, causes, mann_whitney};

use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::Program;
use crate::findings::{Asked, Kind, RuleKey};
use crate::flow::FlowError;
use crate::instance::Which;
use crate::proof::{Spend, prove};
use crate::scenario::Scenario;
use crate::search::{SearchReport, search};
use crate::sweep::{SweepReport, worst_first};

/// Failing cases that a review shows as pictures, worst findings first.
const SHOWN: usize = 12;

/// Why a review came to no end.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum ReviewError {
    /// Two views contradict each other: a defect of the program.
    #[error("{0}")]
    Contradiction(String),
    /// The control cancelled it before anything could be said.
    #[error("interrupted")]
    Cancelled,
}

impl From<FlowError> for ReviewError {
    fn from(error: FlowError) -> ReviewError {
        match error {
            FlowError::Contradiction(what) => ReviewError::Contradiction(what),
            FlowError::Cancelled => ReviewError::Cancelled,
        }
    }
}

/// Zones that the proof of a review may keep in all, if nothing else is said.
pub const PROOF_ZONES: u64 = 20_000;

/// The main job: stable states, typical run, sweep, failing cases, verdict, and a proof within [`PROOF_ZONES`] zones.
///
/// Every failing case is run again by itself and must show what the sweep found.
pub fn review(
    scenario: &Scenario,
    program: &Program,
    threads: usize,
    control: &Control,
) -> Result<Review, ReviewError> {
    review_proving(scenario, program, PROOF_ZONES, threads, control)
}

/// As [`review`], with so many zones for the proof in all; 0: no proof.
pub fn review_proving(
    scenario: &Scenario,
    program: &Program,
    zones: u64,
    threads: usize,
    control: &Control,
) -> Result<Review, ReviewError> {
    let asked = Asked::of(scenario);
    let states = states(scenario, control)?;
    let typical = run_one(scenario, program, &asked, Which::Typ, control).ok_or(ReviewError::Cancelled)?;
    let mut sweep = sweep(scenario, program, &asked, threads, control)?;
    let search = search_worst(scenario, program, &asked, &mut sweep, threads, control)?;
    let proof = (zones > 0).then(|| prove(scenario, program, &asked, &Spend::in_all(zones), &quiet(control)));
    if let Some(proof) = &proof {
        challenge(scenario, &asked, proof, &sweep)?;
        challenge_run(scenario, &asked, proof, &typical)?;
        sweep.findings.extend(challenge::rare(scenario, program, &asked, proof, &sweep)?);
        worst_first(&mut sweep.findings);
    }
    let mut shown = Vec::new();
    for index in to_show(&asked, &sweep) {
        let finding = &sweep.findings[index];
        let Some(which) = finding.shown_by() else { continue };
        let Some(run) = run_one(scenario, program, &asked, which, control) else { continue };
        let race = matches!(finding.subject.kind, Kind::CriticalRace | Kind::NonCriticalRace);
        if !race && !run.facts.iter().any(|fact| fact.subject == finding.subject) {
            let kind = finding.subject.kind.word();
            let case = run.which.words();
            return Err(ReviewError::Contradiction(format!("{case} run alone does not show its {kind}")));
        }
        if let Some(proof) = &proof {
            challenge_run(scenario, &asked, proof, &run)?;
        }
        shown.push((index, run));
    }
    let verdict = reviewed(scenario, &asked, &sweep, proof.as_ref());
    let mut why = causes(scenario, program, &asked, &sweep, threads, control)?;
    paths::fill_races(scenario, program, &asked, &sweep, &shown, &mut why, control);
    Ok(Review { asked, states, typical: Some(typical), sweep, search, proof, shown, why, verdict })
}

/// The same control without its progress, which is that of the draws.
fn quiet(control: &Control) -> Control {
    Control { progress: None, ..control.clone() }
}

/// Searches for the worst case of what no draw broke, if the plan says so, and adds what it breaks to the findings. Each
/// such case is checked against the delay-free view as the draws are.
fn search_worst(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    sweep: &mut SweepReport,
    threads: usize,
    control: &Control,
) -> Result<Option<SearchReport>, ReviewError> {
    if scenario.plan.search == 0 {
        return Ok(None);
    }
    let report = search(scenario, program, asked, sweep, threads, control);
    let findings = report.findings(sweep);
    for finding in &findings {
        let Some(case) = finding.case.as_deref().cloned() else { continue };
        if let Some(run) = run_one(scenario, program, asked, case, &Control::default()) {
            contained::run(scenario, "a case of the directed search", &run.trace, &Control::default())?;
        }
    }
    // what typical, min or max shows is told by that, unless it is a tie there
    for finding in findings {
        match sweep.findings.iter_mut().find(|old| old.subject == finding.subject && old.breaks_rule) {
            Some(old) if old.count > 0 || old.tie.is_none() => {}
            Some(old) => *old = finding,
            None => sweep.findings.push(finding),
        }
    }
    worst_first(&mut sweep.findings);
    Ok(Some(report))
}

/// What makes findings alike: kind, rule and which of several, net.
type Alike = (Kind, Option<(RuleKey, u32)>, Option<NetId>);

/// Pictures of findings that are alike, at most.
const ALIKE: usize = 2;

/// The findings whose failing case is shown: rule breakers first, one a kind, rule and net before more of the same.
fn to_show(asked: &Asked, sweep: &SweepReport) -> Vec<usize> {
    let mut first = Vec::new();
    let mut more = Vec::new();
    let mut seen: BTreeMap<Alike, usize> = BTreeMap::new();
    for (index, finding) in sweep.findings.iter().enumerate() {
        let subject = finding.subject;
        let question = subject.question.and_then(|number| asked.questions.get(number as usize));
        let alike = seen.entry((subject.kind, question.map(|q| (q.rule, q.index)), subject.net)).or_insert(0);
        *alike += 1;
        match (finding.breaks_rule, *alike) {
            (true, 1) => first.push(index),
            (true, 2..=ALIKE) => more.push(index),
            (false, 1) if subject.kind != Kind::NonCriticalRace => more.push(index),
            _ => {}
        }
    }
    first.append(&mut more);
    first.truncate(SHOWN);
    first.sort_unstable();
    first
}
