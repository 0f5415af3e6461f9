//! A sweep of a scenario and of its conditions: in one go, in stretches with something kept after each, or from the
//! tallies of parts; and the checks of what it says against the delay-free view.

use std::ops::Range;
use std::sync::Arc;

use super::{ReviewError, contained, ties};
use crate::control::Control;
use crate::engine::Program;
use crate::findings::Asked;
use crate::scenario::Scenario;
use crate::statics;
use crate::sweep::{Cases, ConditionReport, Curve, Ranges, Stopped, SweepReport, Tally, looks};
use crate::sweep::{run_samples, run_samples_with_envelope};

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
    let mut cases = Cases::with_envelope(scenario, asked);
    let sweeper = Sweeper::new(scenario, program, asked, threads)?;
    sweeper.run(&mut cases, 0..scenario.plan.samples, control);
    sweeper.conclude(&cases, None, control)
}

/// Runs the samples of a scenario under its own delays and under all its conditions.
pub struct Sweeper<'a> {
    scenario: &'a Scenario,
    program: &'a Program,
    asked: &'a Asked,
    threads: usize,
    conditions: Vec<(Scenario, Program)>,
}

/// Where a sweep pauses.
#[derive(Clone, Debug)]
pub struct Stops {
    /// The samples that are to be done.
    pub range: Range<u64>,
    /// Something is kept after each so many samples, rounded up to whole boards.
    pub every: Option<u64>,
}

/// Keeps what is done, at a stop. An error ends the sweep.
pub type Saved<'a, E> = &'a mut dyn FnMut(&Cases, Option<&Curve>) -> Result<(), E>;

impl<'a> Sweeper<'a> {
    /// A sweeper on this many threads (0: all cores).
    pub fn new(
        scenario: &'a Scenario,
        program: &'a Program,
        asked: &'a Asked,
        threads: usize,
    ) -> Result<Sweeper<'a>, ReviewError> {
        let under = scenario.conditions.iter().map(|condition| {
            let under = scenario.under(condition);
            // where a run may begin does not depend on delays
            match Program::new(&under, &Control::default()) {
                Ok(program) => Ok((under, program)),
                Err(_) => {
                    let what = format!("under condition {} no start is found", condition.name);
                    Err(ReviewError::Contradiction(what))
                }
            }
        });
        let conditions = under.collect::<Result<_, _>>()?;
        Ok(Sweeper { scenario, program, asked, threads, conditions })
    }

    /// Runs those samples of a range that are not done yet; fewer if the control cancels.
    pub fn run(&self, cases: &mut Cases, range: Range<u64>, control: &Control) {
        let nominal = std::iter::once((self.scenario, self.program));
        let all = nominal.chain(self.conditions.iter().map(|(scenario, program)| (scenario, program)));
        let missing: u64 = cases.0.iter().map(|case| case.done.missing(range.clone()).count()).sum();
        let mut before = 0;
        for ((scenario, program), case) in all.zip(&mut cases.0) {
            for gap in case.done.missing(range.clone()).iter() {
                let control = shifted(control, before, missing);
                before += gap.end - gap.start;
                let run = match case.tally.envelope {
                    None => run_samples,
                    Some(_) => run_samples_with_envelope,
                };
                let tally = run(scenario, program, self.asked, gap.clone(), self.threads, &control);
                case.done.add(&Ranges::of(gap.start..gap.start + tally.samples));
                case.tally.merge(&tally);
                if control.cancelled() {
                    return;
                }
            }
        }
    }

    /// Runs the samples of a sweep in stretches: up to each look of the curve, if there is one, where the sweep ends if the
    /// shares are sure; and up to each multiple of `stops.every`, where what is done is handed to `save`. Looks and stops
    /// that are behind it already are passed over, so that what was kept can be gone on with.
    ///
    /// Errors: those of `save`, and contradictions found while looking.
    pub fn go_on<E: From<ReviewError>>(
        &self,
        cases: &mut Cases,
        mut curve: Option<&mut Curve>,
        stops: &Stops,
        control: &Control,
        save: Saved<'_, E>,
    ) -> Result<(), E> {
        let plan = &self.scenario.plan;
        let range = stops.range.clone();
        let looks = looks(plan);
        let every = stops.every.map(|every| every.div_ceil(plan.tries).saturating_mul(plan.tries).max(1));
        let mut at = range.start;
        while at < range.end && !curve.as_ref().is_some_and(|curve| curve.sure) {
            let pause = every.map(|every| at.saturating_add(every));
            let look = looks.iter().copied().find(|look| curve.is_some() && *look > at);
            let to = [pause, look].into_iter().flatten().fold(range.end, u64::min);
            let each = cases.0.len() as u64;
            let control = shifted(control, each * (at - range.start), each * (range.end - range.start));
            let fresh = cases.0.iter().any(|case| !case.done.missing(at..to).is_empty());
            self.run(cases, at..to, &control);
            if control.cancelled() {
                return Ok(());
            }
            if let Some(curve) = curve.as_deref_mut().filter(|curve| look == Some(to) && curve.looked < to) {
                curve.look(&conclude_cases(self.scenario, self.asked, cases, looks.len() as u64)?);
            }
            if fresh && pause == Some(to) && to < range.end {
                save(cases, curve.as_deref())?;
            }
            at = to;
        }
        Ok(())
    }

    /// Draws the conclusions of a sweep of all samples of the plan and checks them, as [`sweep`] does. `curve`: it was to
    /// stop when sure. If the control cancels, equal times are not looked into.
    pub fn conclude(
        &self,
        cases: &Cases,
        curve: Option<&Curve>,
        control: &Control,
    ) -> Result<SweepReport, ReviewError> {
        let scenario = self.scenario;
        let looks = curve.map_or(1, |_| looks(&scenario.plan).len() as u64);
        let mut report = conclude_cases(scenario, self.asked, cases, looks)?;
        let end = curve.filter(|curve| curve.sure).map_or(scenario.plan.samples, |curve| curve.looked);
        report.missing = cases.0[0].done.missing(0..end);
        report.stopped = curve.map(|curve| Box::new(Stopped::of(curve.clone(), looks, &report)));
        let runs = ties::look(scenario, self.program, self.asked, &cases.0[0].tally, &mut report, control)?;
        for (which, trace) in &runs {
            contained::run(scenario, &format!("the {} run", which.words()), trace, &Control::default())?;
        }
        for ((condition, case), (scenario, program)) in
            report.conditions.iter_mut().zip(&cases.0[1..]).zip(&self.conditions)
        {
            condition.sweep.missing = case.done.missing(0..end);
            ties::look(scenario, program, self.asked, &case.tally, &mut condition.sweep, control)?;
        }
        Ok(report)
    }
}

/// The same control, whose progress is that of a stretch of something longer.
fn shifted(control: &Control, before: u64, total: u64) -> Control {
    let progress = control.progress.clone().map(|progress| {
        let shifted: crate::control::Progress = Arc::new(move |done, _| progress(before + done, total));
        shifted
    });
    Control { progress, ..control.clone() }
}

fn conclude_cases(scenario: &Scenario, asked: &Asked, cases: &Cases, looks: u64) -> Result<SweepReport, ReviewError> {
    let mut report = conclude_one(scenario, asked, &cases.0[0].tally, looks)?;
    for (condition, case) in scenario.conditions.iter().zip(&cases.0[1..]) {
        let sweep = conclude_one(&scenario.under(condition), asked, &case.tally, looks)?;
        report.conditions.push(ConditionReport { condition: condition.clone(), sweep });
    }
    Ok(report)
}

fn conclude_one(scenario: &Scenario, asked: &Asked, tally: &Tally, looks: u64) -> Result<SweepReport, ReviewError> {
    let report = crate::sweep::conclude_after(scenario, asked, tally, looks);
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
    contained::sweep(scenario, tally, &Control::default())?;
    Ok(report)
}
