//! The fewest quantities that must leave typical for a finding to happen, and how far each.
//!
//! From a failing case quantities are put back to typical as long as the finding stays ([`reduce`](super::reduce)), then
//! what is left is moved toward typical as far as it goes ([`approach`](super::approach)). Every claim rests on a run.
//! Draws that a group joins are moved one by one: the reduced case need not be one that the groups could draw.

use super::probe::{Budget, Cut, Probe};
use super::reduce::Search;
use crate::control::Control;
use crate::engine::Program;
use crate::findings::Asked;
use crate::instance::{Instance, Quantities, Quantity, Which};
use crate::review::ReviewError;
use crate::scenario::Scenario;
use crate::sweep::{Finding, SweepReport};
use crate::time::Span;

/// Runs for one finding, at most; and events in them.
const BUDGET: Budget = Budget { runs: 2000, events: 4_000_000 };

/// A small set of quantities that must leave typical for a finding to happen.
#[derive(Clone, Debug)]
pub struct Needs {
    /// What is away from typical, the farthest first; empty if typical values show the finding.
    pub away: Vec<Away>,
    /// Is it shown, each by a run, that the finding is gone with any of them put back to typical, and with any of them 1 fs
    /// nearer to typical, the others being as they are? False only where the search was cut.
    pub minimal: bool,
    /// What stays as in the failing case though typical has it otherwise.
    pub kept: Kept,
    /// The case with nothing but all this away from typical; it shows the finding and can be replayed.
    pub case: Box<Instance>,
    /// Runs that it took.
    pub runs: u64,
    /// What ended the search before all ways were tried; `None`: nothing.
    pub cut: Option<Cut>,
}

impl Needs {
    /// Do typical values show the finding, with what is [`kept`](Self::kept)?
    pub fn typical_shows_it(&self) -> bool {
        self.away.is_empty()
    }
}

/// What of a failing case is never put back to typical.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Kept {
    /// Its start bits, which are not those of the typical run.
    pub start: bool,
    /// Its bounces, likewise.
    pub bounces: bool,
    /// The delays of its firings, where they differ from firing to firing.
    pub firings: bool,
    /// Something that the scenario gives no range.
    pub exact: bool,
}

/// One quantity away from typical.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Away {
    /// Which.
    pub quantity: Quantity,
    /// Its value in the typical run.
    pub typical: Span,
    /// Its value in the case.
    pub value: Span,
}

impl Away {
    /// Where the value lies on the way from typical (0) to the end of the range on its side: below 0 toward the least, -1
    /// there; above 0 toward the greatest, 1 there.
    pub fn place(&self) -> f64 {
        let (value, typical) = (self.value.fs() as f64, self.typical.fs() as f64);
        let [min, max] = [self.quantity.range.min, self.quantity.range.max].map(|end| end.fs() as f64);
        match value < typical {
            true => (value - typical) / (typical - min).max(1.0),
            false => (value - typical) / (max - typical).max(1.0),
        }
    }
}

/// What a finding needs; `None`: its case does not show it by itself, cannot be put together from what is drawn, or it was
/// interrupted at once.
pub(super) fn of(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    sweep: &SweepReport,
    finding: &Finding,
    control: &Control,
) -> Result<Option<Needs>, ReviewError> {
    let sample = finding.worst_sample.or(finding.sample);
    let Some(which) = finding.shown_by() else { return Ok(None) };
    let failing = Instance::of(scenario, &which);
    let typical = Instance::of(scenario, &Which::Typ);
    let quantities: Vec<Quantity> = Quantities::of(scenario).iter().copied().collect();
    let probe = Probe::new(scenario, program, asked, sweep, finding.subject, control);
    let mut search = Search::new(probe, BUDGET, &quantities, &typical, &failing);
    let case = search.failing();
    match search.shows(&case) {
        Ok(true) => {}
        Ok(false) if sample.is_some() => {
            let (which, kind) = (which.words(), finding.subject.kind.word());
            return Err(ReviewError::Contradiction(format!("{which} run alone does not show its {kind}")));
        }
        Ok(false) | Err(_) => return Ok(None),
    }
    let found = search.least(case);
    let case = search.case(&found.set);
    let mut away: Vec<(u64, Away)> = Vec::new();
    for (number, value) in &found.set {
        let quantity = quantities[*number as usize];
        let it = Away { quantity, typical: typical.get(&quantity), value: *value };
        away.push((search.distance(*number, *value), it));
    }
    away.sort_by_key(|(distance, it)| (std::cmp::Reverse(*distance), it.quantity.target));
    let kept = Kept {
        start: case.start != typical.start,
        bounces: case.bounces != typical.bounces,
        firings: case.firings != typical.firings,
        exact: exact_moved(&case, &typical, &away),
    };
    Ok(Some(Needs {
        away: away.into_iter().map(|it| it.1).collect(),
        minimal: found.minimal,
        kept,
        case: Box::new(case),
        runs: search.runs(),
        cut: found.cut,
    }))
}

/// Is anything else away from typical than what is named, start bits and bounces?
fn exact_moved(case: &Instance, typical: &Instance, away: &[(u64, Away)]) -> bool {
    let mut rest = case.clone();
    away.iter().for_each(|(_, it)| rest.set(&it.quantity, it.typical));
    (rest.start, rest.bounces, rest.firings) =
        (typical.start.clone(), typical.bounces.clone(), typical.firings.clone());
    rest != *typical
}
