//! The two paths that race, for the findings of a sweep.

use std::cell::Cell;

use super::single::run_one;
use super::why::Why;
use crate::control::Control;
use crate::engine::{Program, Trace};
use crate::findings::{Asked, Fact, Kind, RacePair, Races, race_pair};
use crate::instance::Which;
use crate::review::RunReport;
use crate::scenario::Scenario;
use crate::sweep::{Finding, SweepReport};

/// Findings that break a rule whose paths are looked for, worst first.
const BREAKING: usize = 200;
/// Findings that break none.
const OTHERS: usize = 12;
/// Runs that a wrong state is compared with, at most.
const COMPARED: usize = 8;
/// Transitions of all runs that are made for it: with more, no further finding is looked at.
const TRANSITIONS: usize = 20_000_000;

/// Fills in which two paths race, for the first findings that break a rule and the first that break none. Findings beyond
/// keep `None` if nothing else was looked into: results say how many.
pub(super) fn fill_races(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    sweep: &SweepReport,
    shown: &[(usize, RunReport)],
    why: &mut [Option<Why>],
    control: &Control,
) {
    let mut left = [OTHERS, BREAKING];
    let transitions = Cell::new(0);
    let run = |which: Which| {
        let report = run_one(scenario, program, asked, which, control)?;
        transitions.set(transitions.get() + report.trace.changes.len());
        Some(report)
    };
    for (index, finding) in sweep.findings.iter().enumerate() {
        let left = &mut left[usize::from(finding.breaks_rule)];
        if *left == 0 || transitions.get() > TRANSITIONS || control.cancelled() {
            continue;
        }
        *left -= 1;
        let Some(case) = finding.shown_by() else { continue };
        let kept = shown.iter().find(|it| it.0 == index).map(|it| it.1.clone());
        let Some(failing) = kept.or_else(|| run(case)) else { continue };
        let race = race_of(scenario, asked, sweep, finding, &failing, run);
        why[index].get_or_insert_default().race = race;
    }
}

/// The pair of one finding in the run that shows it, compared with other runs where one run does not tell.
fn race_of(
    scenario: &Scenario,
    asked: &Asked,
    sweep: &SweepReport,
    finding: &Finding,
    failing: &RunReport,
    run: impl Fn(Which) -> Option<RunReport>,
) -> Option<RacePair> {
    let subject = finding.subject;
    let seen = failing.facts.iter().find(|fact| fact.subject == subject).copied();
    // a race is a difference between runs: no single one has it as a fact
    let fact = seen.unwrap_or(Fact { subject, breaks_rule: finding.breaks_rule, measure: None, place: None });
    let pair = |other: Option<&Trace>| race_pair(scenario, asked, &fact, &failing.trace, other);
    if !compares(subject.kind) {
        return pair(None);
    }
    let shows = |other: &RunReport| other.facts.iter().any(|it| it.subject == subject);
    let mut cases = vec![Which::Typ];
    let windows = sweep.windows.iter().filter(|window| Some(window.moment) == subject.moment);
    cases.extend(windows.flat_map(|window| &window.outcomes).map(|outcome| Which::Sample(outcome.first)));
    if subject.kind == Kind::NonCriticalRace {
        cases.extend((0..sweep.samples.min(COMPARED as u64)).map(Which::Sample));
    }
    cases.retain(|case| *case != failing.which);
    cases.dedup();
    cases.truncate(COMPARED);
    let others = cases.into_iter().filter_map(run).filter(|other| !shows(other));
    others.map(|other| pair(Some(&other.trace))).find(Option::is_some).unwrap_or_else(|| pair(None))
}

/// Is the pair of this kind found by comparing runs?
fn compares(kind: Kind) -> bool {
    let by_comparison =
        [Kind::Expect, Kind::NeverAtRest, Kind::NotInReference, Kind::CriticalRace, Kind::NonCriticalRace];
    by_comparison.contains(&kind)
}

impl RunReport {
    /// The two paths that race where a fact of this run was found, as far as the run tells it alone: for a wrong state at
    /// rest a review compares runs, and can say more.
    pub fn race(&self, scenario: &Scenario, asked: &Asked, fact: &Fact) -> Option<RacePair> {
        race_pair(scenario, asked, fact, &self.trace, None)
    }

    /// As [`RunReport::race`], for many facts of this run.
    pub fn races<'a>(&'a self, scenario: &'a Scenario, asked: &'a Asked) -> Races<'a> {
        Races::new(scenario, asked, &self.trace)
    }
}
