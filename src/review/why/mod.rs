//! Why something was found: the two paths that race, the delays it takes, and the delays that matter.

mod approach;
mod needs;
mod probe;
mod pull;
mod ranks;
mod reduce;
mod strays;

use std::sync::Mutex;
use std::sync::atomic::{AtomicUsize, Ordering};

pub use needs::{Away, Kept, Needs};
pub use probe::Cut;
pub use pull::{Pull, Pulls, Untold};
pub use ranks::{Ranks, mann_whitney};

use super::ReviewError;
use crate::control::Control;
use crate::engine::Program;
use crate::findings::{Asked, Kind, RacePair};
use crate::scenario::Scenario;
use crate::sweep::SweepReport;
use strays::Strays;

/// Findings that are looked into, at most: those that break a rule, worst first.
pub const LOOKED_INTO: usize = 24;

/// The cause of one finding.
#[derive(Clone, Debug, Default)]
pub struct Why {
    /// The two paths that race; `None` where the finding has no such pair.
    pub race: Option<RacePair>,
    /// The least that must leave typical for it to happen; `None` where no case shows it by itself (a race that no draw
    /// made), its case cannot be put together from what is drawn, or it was interrupted.
    pub needs: Option<Needs>,
    /// Which quantities decide; `None` where only the paths were looked for.
    pub pull: Option<Pulls>,
}

/// Looks into the first [`LOOKED_INTO`] findings of a sweep that break a rule, on this many threads (0: all cores): one
/// entry a finding, `None` where it was not looked into.
///
/// The result depends on nothing but scenario and sweep, unless the control cancels. Errors: a sample run alone does not
/// show what the sweep found in it.
pub fn causes(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    sweep: &SweepReport,
    threads: usize,
    control: &Control,
) -> Result<Vec<Option<Why>>, ReviewError> {
    let mut causes = vec![None; sweep.findings.len()];
    let breakers = sweep.findings.iter().enumerate().filter(|(_, finding)| finding.breaks_rule);
    let chosen: Vec<usize> = breakers.take(LOOKED_INTO).map(|(index, _)| index).collect();
    if chosen.is_empty() || control.cancelled() {
        return Ok(causes);
    }
    let races = chosen.iter().any(|index| sweep.findings[*index].subject.kind == Kind::CriticalRace);
    let strays = if races { Strays::of(scenario, program, asked, sweep, control) } else { Strays::default() };

    let threads = match threads {
        0 => std::thread::available_parallelism().map_or(1, usize::from),
        n => n,
    };
    let (next, done) = (AtomicUsize::new(0), AtomicUsize::new(0));
    let found: Mutex<Vec<(usize, Result<Why, ReviewError>)>> = Mutex::new(Vec::new());
    let work = || {
        while let Some(index) = chosen.get(next.fetch_add(1, Ordering::Relaxed)) {
            let finding = &sweep.findings[*index];
            let needs = needs::of(scenario, program, asked, sweep, finding, control);
            let why =
                needs.map(|needs| Why { race: None, needs, pull: Some(pull::of(scenario, sweep, finding, &strays)) });
            found.lock().unwrap_or_else(std::sync::PoisonError::into_inner).push((*index, why));
            // behind the samples, so that a bar never goes back
            let (whole, done) = (sweep.samples, done.fetch_add(1, Ordering::Relaxed) as u64 + 1);
            control.report(whole + done, whole + chosen.len() as u64);
        }
    };
    match threads.min(chosen.len()) {
        0 | 1 => work(),
        several => std::thread::scope(|scope| {
            (0..several).for_each(|_| {
                scope.spawn(work);
            });
        }),
    }
    let mut found = found.into_inner().unwrap_or_else(std::sync::PoisonError::into_inner);
    // of several errors always the same
    found.sort_by_key(|it| it.0);
    for (index, why) in found {
        causes[index] = Some(why?);
    }
    Ok(causes)
}
