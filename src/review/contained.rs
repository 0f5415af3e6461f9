//! The views against each other: whatever a run that began at rest settled in must be an outcome of the delay-free view.

use super::ReviewError;
use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::{End, Trace};
use crate::flow::{follow, outside};
use crate::logic::{Bits, State};
use crate::scenario::{MomentKind, Place, Scenario, Step};
use crate::statics::{self, Change, Outcome};
use crate::sweep::Tally;
use crate::time::Span;

/// Values looked at, at most: passages times nets. Checking is a safeguard, and may not cost more than the sweep.
const LOOKED_AT: usize = 1 << 24;

/// Checks every kept passage of a sweep: from the state before, by the change of the inputs, to the settled state.
pub(super) fn sweep(scenario: &Scenario, tally: &Tally, control: &Control) -> Result<(), ReviewError> {
    let mut left = LOOKED_AT / scenario.circuit.net_count().max(1);
    for (moment, window) in tally.windows.iter().enumerate() {
        let mut known = None;
        for (passage, count) in window.passages.iter() {
            let Some(before) = &passage.before else { continue };
            let Some(rest) = left.checked_sub(1) else { return Ok(()) };
            left = rest;
            let place = Seen { scenario, moment: moment as u32, run: &format!("sample {}", count.first), control };
            place.passage(before, &passage.after, &mut known)?;
        }
    }
    Ok(())
}

/// Checks every window of one run that began at rest and settled or oscillates.
pub(super) fn run(scenario: &Scenario, name: &str, trace: &Trace, control: &Control) -> Result<(), ReviewError> {
    let mut before = &trace.start;
    let left = LOOKED_AT / scenario.circuit.net_count().max(1);
    for window in trace.windows.iter().take(left) {
        if window.began_at_rest && statics::is_stable(&scenario.circuit, before) {
            let place = Seen { scenario, moment: window.moment, run: name, control };
            match window.end {
                End::Settled => place.passage(before, &window.state, &mut None)?,
                End::Oscillating { .. } => place.oscillation(before, &window.state)?,
                End::Unsettled(_) | End::Cut => {}
            }
        }
        before = &window.state;
    }
    Ok(())
}

/// Where a passage was seen.
struct Seen<'a> {
    scenario: &'a Scenario,
    moment: u32,
    run: &'a str,
    control: &'a Control,
}

impl Seen<'_> {
    /// Checks one passage. `known` keeps the outcome of the last state before, since passages come sorted by it.
    fn passage(
        &self,
        before: &State,
        after: &State,
        known: &mut Option<(Bits, Change, Outcome)>,
    ) -> Result<(), ReviewError> {
        if before.has_unknown() || after.has_unknown() {
            return Ok(());
        }
        let to = &after.ones;
        let (change, restless) = self.change(&before.ones, to);
        let outcome = match known.take() {
            Some((state, same, outcome)) if state == before.ones && same == change => outcome,
            _ => follow(self.scenario, &before.ones, &change, restless, self.control)?,
        };
        let outcome = &known.insert((before.ones.clone(), change, outcome)).2;
        let what = match outcome {
            Outcome::Exact { states, .. } if states.contains(to) => return Ok(()),
            Outcome::Exact { .. } => {
                "settles in a stable state that the multiple-winner method does not reach".to_string()
            }
            Outcome::Bound(bound) => match outside(&self.scenario.circuit, to, bound) {
                None => return Ok(()),
                Some(net) => format!("settles with another value of `{net}` than ternary simulation gives"),
            },
        };
        Err(self.contradiction(&what))
    }

    /// Checks an oscillation; `during` is some state of it.
    fn oscillation(&self, before: &State, during: &State) -> Result<(), ReviewError> {
        if before.has_unknown() || during.has_unknown() {
            return Ok(());
        }
        let (change, restless) = self.change(&before.ones, &during.ones);
        match follow(self.scenario, &before.ones, &change, restless, self.control)? {
            Outcome::Exact { cycles: 0, .. } => {
                Err(self.contradiction("oscillates where the multiple-winner method finds no lasting cycle"))
            }
            Outcome::Bound(bound) if !bound.has_unknown() => {
                Err(self.contradiction("oscillates where ternary simulation gives one state"))
            }
            _ => Ok(()),
        }
    }

    /// The change of inputs from one state to another, and whether they may move back and forth.
    fn change(&self, from: &Bits, to: &Bits) -> (Change, bool) {
        let stimulus = &self.scenario.stimulus;
        let change = Change::between(&self.scenario.circuit, from, to);
        let steps = match stimulus.moments[self.moment as usize].kind {
            MomentKind::Step(first) => self.of_one_instant(first as usize),
            MomentKind::PowerUp | MomentKind::Edge { .. } => &[],
        };
        let skew = steps.iter().any(|step| step.skew.is_some());
        let restless = steps.iter().any(|step| step.bounce.is_some()) || (skew && steps.len() > 1);
        if !restless {
            return (Change { apart: skew, ..change }, false);
        }
        let clocks = change.set.into_iter();
        let said = steps.iter().flat_map(|step| &step.set).map(|(net, _)| (*net, to.get(net.index())));
        let mut set: Vec<(NetId, bool)> = clocks.chain(said).collect();
        set.sort_unstable();
        set.dedup();
        (Change { set, apart: true }, true)
    }

    /// This listed step and those after it that may come at the same instant: they share its window.
    fn of_one_instant(&self, first: usize) -> &[Step] {
        let steps = &self.scenario.stimulus.steps[first..];
        // the latest moment of the step before, where it has one
        let at = |step: &Step| match &step.place {
            Place::At(range) => Some(range.max),
            _ => None,
        };
        let mut latest = at(&steps[0]);
        let together = |step: &&Step| {
            let may = match &step.place {
                Place::At(range) => latest.is_none_or(|latest| range.min <= latest),
                Place::After(range) => range.min == Span::ZERO,
                Place::Rest(_) | Place::When { .. } => false,
            };
            latest = at(step);
            may
        };
        let more = steps[1..].iter().take_while(together).count();
        &steps[..=more]
    }

    fn contradiction(&self, what: &str) -> ReviewError {
        let label = &self.scenario.stimulus.moments[self.moment as usize].label;
        ReviewError::Contradiction(format!("after \"{label}\" {} {what}", self.run))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::engine::Program;
    use crate::findings::Asked;
    use crate::instance::Which;
    use crate::review::{RunReport, run_one};

    fn typical(wire: &str) -> (Scenario, RunReport) {
        let text = format!(
            r#"
            outputs = ["q"]
            [inputs]
            r = 0
            s = 0
            [initial]
            q = 0
            [gates]
            q = {{ nor = ["r", "qn"], delay = 3{wire} }}
            qn = {{ nor = ["s", "q"], delay = 4 }}
            [[steps]]
            set = {{ s = 1 }}
            [[steps]]
            set = {{ s = 0 }}
            "#
        );
        let scenario = crate::reader::read(&text, "latch.toml").unwrap().scenario;
        let control = Control::default();
        let program = Program::new(&scenario, &control).unwrap();
        let run = run_one(&scenario, &program, &Asked::of(&scenario), Which::Typ, &control).unwrap();
        (scenario, run)
    }

    #[test]
    fn a_run_that_settles_where_nothing_leads_is_a_contradiction() {
        for (wire, method) in [("", "multiple-winner"), (", wires = { qn = 1 }", "ternary")] {
            let (scenario, run) = typical(wire);
            let control = Control::default();
            assert_eq!(super::run(&scenario, "the typical run", &run.trace, &control), Ok(()));
            // the bit is lost at the end, although it rests in a stable state
            let mut wrong = run.trace.clone();
            let last = wrong.windows.last_mut().unwrap();
            for net in [2, 3] {
                last.state.ones.flip(net);
            }
            assert!(statics::is_stable(&scenario.circuit, &last.state));
            let said = super::run(&scenario, "the typical run", &wrong, &control).unwrap_err().to_string();
            assert!(said.contains(method) && said.contains("step 2") && said.contains("the typical run"), "{said}");
            let mut endless = run.trace;
            endless.windows.last_mut().unwrap().end = End::Oscillating { period: Span::from_fs(7), range: None };
            let said = super::run(&scenario, "the typical run", &endless, &control).unwrap_err().to_string();
            assert!(said.contains(method) && said.contains("oscillates"), "{said}");
        }
    }
}
