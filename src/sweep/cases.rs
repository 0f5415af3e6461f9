//! How far a sweep is: under the scenario's own delays and under each of its conditions, which samples are done and
//! what they showed.

use serde::{Deserialize, Serialize};

use super::ranges::Ranges;
use super::tally::Tally;
use crate::findings::Asked;
use crate::scenario::{Condition, Scenario};

/// The sweep under one condition.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Case {
    /// The name of the condition; [`Condition::NOMINAL`] for the scenario's own delays.
    pub condition: String,
    /// Samples that are done.
    pub done: Ranges,
    /// Their tally.
    pub tally: Tally,
}

/// The sweep under the scenario's own delays, then under each of its conditions in their order.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Cases(pub Vec<Case>);

impl Cases {
    /// Nothing done yet.
    pub fn new(scenario: &Scenario, asked: &Asked) -> Cases {
        let case = |name: &str| Case {
            condition: name.to_string(),
            done: Ranges::default(),
            tally: Tally::new(scenario, asked),
        };
        Cases(names(scenario).map(case).collect())
    }

    /// Nothing done yet; between which times each edge comes is kept of the scenario's own delays.
    pub fn with_envelope(scenario: &Scenario, asked: &Asked) -> Cases {
        let mut cases = Cases::new(scenario, asked);
        cases.0[0].tally = Tally::with_envelope(scenario, asked);
        cases
    }

    /// Adds the tallies of other samples of the same sweep.
    pub fn merge(&mut self, other: &Cases) {
        for (ours, theirs) in self.0.iter_mut().zip(&other.0) {
            ours.done.add(&theirs.done);
            ours.tally.merge(&theirs.tally);
        }
    }

    /// No sample done under any condition?
    pub fn is_empty(&self) -> bool {
        self.0.iter().all(|case| case.done.is_empty())
    }

    /// Samples that are done under every condition.
    pub fn done(&self) -> Ranges {
        let mut each = self.0.iter().map(|case| &case.done);
        let first = each.next().cloned().unwrap_or_default();
        each.fold(first, |common, done| common.common(done))
    }

    /// Could these be of this scenario, within the samples of its plan?
    ///
    /// Errors: what cannot be.
    pub(super) fn fit(&self, scenario: &Scenario, asked: &Asked) -> Result<(), &'static str> {
        if !self.0.iter().map(|case| case.condition.as_str()).eq(names(scenario)) {
            return Err("other conditions than the scenario has");
        }
        let plan = &scenario.plan;
        for case in &self.0 {
            let whole = |at: u64| at == plan.samples || at.is_multiple_of(plan.tries.max(1));
            if case.done.hull().is_some_and(|it| it.end > plan.samples) {
                return Err("samples that the sweep does not have");
            }
            if !case.done.iter().all(|it| whole(it.start) && whole(it.end)) {
                return Err("boards that are cut short");
            }
            if case.done.count() != case.tally.samples {
                return Err("a tally of another number of samples");
            }
            case.tally.fits(scenario, asked)?;
        }
        Ok(())
    }
}

fn names(scenario: &Scenario) -> impl Iterator<Item = &str> {
    std::iter::once(Condition::NOMINAL).chain(scenario.conditions.iter().map(|it| it.name.as_str()))
}
