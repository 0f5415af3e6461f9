//! The views put together: runs, states and sweep of one scenario, the checks of the views against each other, and the
//! verdict. Plain data; nothing is drawn here.

mod conditions;
mod contained;
mod departure;
mod paths;
mod report;
mod single;
mod ties;
mod verdict;
mod why;

use std::collections::BTreeMap;

pub use conditions::{ByCondition, Cell, Compared, Comparison, by_condition, compare};
pub use departure::{DepartureWords, departure_words};
pub use report::{Call, Review, RunReport, StatesReport, Verdict};
pub use single::{run_one, states};
pub use verdict::{grouped, verdict, without_draws};
pub use why::{Away, Needs, Pull, Why};

use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::{Program, Trace};
use crate::findings::{Asked, Kind, RuleKey};
use crate::flow::FlowError;
use crate::instance::Which;
use crate::scenario::Scenario;
use crate::statics;
use crate::sweep::{ConditionReport, SweepReport, conclude, run_samples};

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

/// Sweeps all samples of the plan on this many threads (0: all cores), draws the conclusions, and checks that every
/// settled state is a stable state and, where its window began at rest, an outcome that the delay-free view allows; so
/// are typical, min and max runs. What only these show is a finding, too, and what exactly equal times have to do with
/// findings is looked into. Then the same for every condition of the scenario. A cancelled sweep concludes from what was
/// complete.
pub fn sweep(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    threads: usize,
    control: &Control,
) -> Result<SweepReport, ReviewError> {
    let (mut report, runs) = sweep_one(scenario, program, asked, threads, control)?;
    for (which, trace) in &runs {
        contained::run(scenario, &format!("the {} run", which.words()), trace, &Control::default())?;
    }
    for condition in &scenario.conditions {
        let under = scenario.under(condition);
        // where a run may begin does not depend on delays
        let program = Program::new(&under, &Control::default())
            .map_err(|_| ReviewError::Contradiction(format!("under condition {} no start is found", condition.name)))?;
        let (sweep, _) = sweep_one(&under, &program, asked, threads, control)?;
        report.conditions.push(ConditionReport { condition: condition.clone(), sweep });
    }
    Ok(report)
}

fn sweep_one(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    threads: usize,
    control: &Control,
) -> Result<(SweepReport, Vec<(Which, Trace)>), ReviewError> {
    let tally = run_samples(scenario, program, asked, 0..scenario.plan.samples, threads, control);
    let mut report = conclude(scenario, asked, &tally);
    for window in &report.windows {
        for outcome in window.outcomes.iter().filter(|outcome| !outcome.state.has_unknown()) {
            if !statics::is_stable(&scenario.circuit, &outcome.state) {
                let label = &scenario.stimulus.moments[window.moment as usize].label;
                return Err(ReviewError::Contradiction(format!(
                    "after \"{label}\" sample {} settles in a state that is not stable",
                    outcome.first
                )));
            }
        }
    }
    contained::sweep(scenario, &tally, &Control::default())?;
    let runs = ties::look(scenario, program, asked, &tally, &mut report, control)?;
    Ok((report, runs))
}

/// The main job: stable states, typical run, sweep, failing cases, verdict.
///
/// Every failing case is run again by itself and must show what the sweep found.
pub fn review(
    scenario: &Scenario,
    program: &Program,
    threads: usize,
    control: &Control,
) -> Result<Review, ReviewError> {
    let asked = Asked::of(scenario);
    let states = states(scenario, control)?;
    let typical = run_one(scenario, program, &asked, Which::Typ, control).ok_or(ReviewError::Cancelled)?;
    let sweep = sweep(scenario, program, &asked, threads, control)?;
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
        shown.push((index, run));
    }
    let verdict = verdict(scenario, &sweep);
    let mut why = vec![None; sweep.findings.len()];
    paths::fill_races(scenario, program, &asked, &sweep, &shown, &mut why, control);
    Ok(Review { asked, states, typical: Some(typical), sweep, shown, why, verdict })
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
