//! The views against each other: whatever a run that began at rest settled in must be an outcome of the delay-free view.

use super::ReviewError;
use crate::control::Control;
use crate::engine::{End, Trace};
use crate::flow::{FlowError, follow, outside};
use crate::logic::{Bits, State};
use crate::scenario::Scenario;
use crate::statics::{self, Change, Outcome};
use crate::sweep::Tally;

/// Values looked at, at most: passages times nets. Checking is a safeguard, and may not cost more than the sweep.
const LOOKED_AT: usize = 1 << 24;

impl From<FlowError> for ReviewError {
    fn from(error: FlowError) -> ReviewError {
        match error {
            FlowError::Contradiction(what) => ReviewError::Contradiction(what),
            FlowError::Cancelled => ReviewError::Cancelled,
        }
    }
}

/// Checks every kept passage of a sweep: from the state before, by the change of the inputs, to the settled state.
pub(super) fn sweep(scenario: &Scenario, tally: &Tally, control: &Control) -> Result<(), ReviewError> {
    let mut left = LOOKED_AT / scenario.circuit.net_count().max(1);
    for (moment, window) in tally.windows.iter().enumerate() {
        let mut known = None;
        for (passage, count) in window.passages.iter() {
            let Some(before) = &passage.before else { continue };
            let Some(rest) = left.checked_sub(1) else { return Ok(()) };
            left = rest;
            let place = Place { scenario, moment: moment as u32, run: &format!("sample {}", count.first), control };
            place.passage(before, &passage.after, &mut known)?;
        }
    }
    Ok(())
}

/// Checks every settled window of one run that began at rest.
pub(super) fn run(scenario: &Scenario, name: &str, trace: &Trace, control: &Control) -> Result<(), ReviewError> {
    let mut before = &trace.start;
    let mut at_rest = true;
    let left = LOOKED_AT / scenario.circuit.net_count().max(1);
    for window in trace.windows.iter().take(left) {
        if at_rest && window.began_at_rest && window.end == End::Settled {
            let place = Place { scenario, moment: window.moment, run: name, control };
            place.passage(before, &window.state, &mut None)?;
        }
        (before, at_rest) = (&window.state, window.end == End::Settled);
    }
    Ok(())
}

/// Where a passage was seen.
struct Place<'a> {
    scenario: &'a Scenario,
    moment: u32,
    run: &'a str,
    control: &'a Control,
}

impl Place<'_> {
    /// Checks one passage. `known` keeps the outcome of the last state before, since passages come sorted by it.
    fn passage(
        &self,
        before: &State,
        after: &State,
        known: &mut Option<(Bits, Change, Outcome)>,
    ) -> Result<(), ReviewError> {
        let circuit = &*self.scenario.circuit;
        if before.has_unknown() || after.has_unknown() || !statics::is_stable(circuit, before) {
            return Ok(());
        }
        let (from, to) = (&before.ones, &after.ones);
        let mut change = Change::between(circuit, from, to);
        // steps of one instant share a window: any of them may have skew or bounce
        let touches = |step: &&crate::scenario::Step| step.set.iter().any(|said| change.set.contains(said));
        let steps: Vec<_> = self.scenario.stimulus.steps.iter().filter(touches).collect();
        let bounced = steps.iter().any(|step| step.bounce.is_some());
        change.apart = steps.iter().any(|step| step.skew.is_some());
        let outcome = match known {
            Some((state, same, outcome)) if state == from && *same == change => outcome.clone(),
            _ => follow(self.scenario, from, &change, bounced, self.control)?,
        };
        *known = Some((from.clone(), change, outcome.clone()));
        let what = match &outcome {
            Outcome::Exact { states, .. } if states.contains(to) => return Ok(()),
            Outcome::Exact { .. } => "a stable state that the multiple-winner method does not reach".to_string(),
            Outcome::Bound(bound) => match outside(circuit, to, bound) {
                None => return Ok(()),
                Some(net) => format!("a state in which `{net}` has another value than ternary simulation gives"),
            },
        };
        let label = &self.scenario.stimulus.moments[self.moment as usize].label;
        Err(ReviewError::Contradiction(format!("after \"{label}\" {} settles in {what}", self.run)))
    }
}
