//! Claims about oscillation.

use std::collections::BTreeMap;

use super::claim::{Call, Claim, Variation};
use super::cycles::{Cycle, RestVerdict, comes_to_rest};
use super::prove::{Prover, Unsaid, World};
use crate::instance::{Instance, Which};

impl Prover<'_> {
    /// Does no window oscillate, where that is forbidden?
    pub(super) fn oscillation(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let mut worst: BTreeMap<u32, Claim> = BTreeMap::new();
        for nets in self.parts() {
            let world = self.world(&nets, &[])?;
            let cycles = match comes_to_rest(&world.plant, &world.starts, &self.budget) {
                RestVerdict::Always => Vec::new(),
                RestVerdict::Cycles(cycles) => cycles,
                RestVerdict::Undecided(ended) => {
                    return Err(Unsaid { call: Call::Undecided, reason: self.why(ended) });
                }
            };
            for question in questions {
                let claim = self.endless(&world, &cycles, *question);
                if worst.get(question).is_none_or(|it| it.call.severity() < claim.call.severity()) {
                    worst.insert(*question, claim);
                }
            }
        }
        self.proof.claims.extend(worst.into_values());
        Ok(())
    }

    /// What the oscillations of one part say of a question.
    fn endless(&self, world: &World, cycles: &[Cycle], question: u32) -> Claim {
        let mut claim =
            Claim { question, call: Call::Proved, but_for_ties: false, variation: None, witness: None, reason: None };
        if self.asked.questions[question as usize].wants_oscillation {
            claim.call = Call::NotCovered;
            claim.reason = Some("the proof does not know oscillations that are required".to_string());
            return claim;
        }
        let steps = self.steps_of(&world.plant, question);
        let here: Vec<&Cycle> = cycles.iter().filter(|cycle| steps.contains(&cycle.steps)).collect();
        if here.is_empty() {
            return claim;
        }
        claim.but_for_ties = here.iter().all(|cycle| cycle.needs_ties == Some(true));
        // the way there is no way round: whether it goes on, the run says
        let ways = here.iter().filter_map(|cycle| self.case_of(world, &cycle.lead, &cycle.start).ok());
        let usual = [Which::Typ, Which::Min, Which::Max].map(|which| Instance::of(self.scenario, &which));
        let shown = ways.chain(usual).find(|instance| self.shows(instance, question));
        claim.call = if shown.is_some() { Call::Refuted } else { Call::Undecided };
        claim.variation = Some(if shown.is_some() { Variation::Constant } else { Variation::Unknown });
        if shown.is_none() {
            claim.reason = Some("it can go round once; delays that keep it going were not found".to_string());
        }
        claim.witness = shown.map(Box::new);
        claim
    }
}
