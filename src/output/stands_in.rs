//! Which drawn quantities stand in the inequality that a proof has for the same question.

use crate::instance::Target;
use crate::proof::{Quantity, Race};
use crate::review::Review;
use crate::scenario::Scenario;
use crate::sweep::Finding;

/// The inequality that decides the question of a finding, if the proof refutes its claim and has one.
pub(super) fn race_of<'a>(review: &'a Review, finding: &Finding) -> Option<&'a Race> {
    let question = finding.subject.question?;
    let mut claims = review.proof.as_ref()?.claims.iter();
    claims.find(|claim| claim.question == question)?.race.as_ref()
}

/// Is what is drawn here a term of the inequality, on either side?
pub(super) fn stands_in(scenario: &Scenario, race: &Race, target: Target) -> bool {
    let is = |quantity: Quantity| match (quantity, target) {
        (Quantity::Gate(gate, edges), Target::Gate { gate: of, edge }) => gate.0 == of && edges[usize::from(edge)],
        (Quantity::Gate(gate, _), Target::GateBoth(of)) => gate.0 == of,
        (Quantity::Wire(wire, edges), Target::Wire { wire: of, edge }) => wire.0 == of && edges[usize::from(edge)],
        (Quantity::Wire(wire, _), Target::WireBoth(of)) => wire.0 == of,
        (Quantity::Place(step), Target::Place(of)) => step == of,
        (Quantity::First(clock), Target::First(of)) => clock == of,
        (Quantity::Period(clock), Target::Period(of)) => clock == of,
        (Quantity::High(clock), Target::High(of)) => clock == of,
        (Quantity::Jitter(clock, edge), Target::Jitter { clock: of, edge: at }) => (clock, edge) == (of, at),
        (Quantity::Late(step, net), Target::Skew { step: of, entry }) => {
            let set = scenario.stimulus.steps.get(of as usize).and_then(|it| it.set.get(entry as usize));
            step == of && set.is_some_and(|it| it.0 == net)
        }
        _ => false,
    };
    race.first.terms.iter().chain(&race.second.terms).any(|(quantity, _)| is(*quantity))
}
