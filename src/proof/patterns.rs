//! Claims about steps that wait for a pattern: does it always come?

use super::claim::{Call, Claim};
use super::cycles::{Cycle, RestVerdict};
use super::explored::{Explored, Merge, Mode};
use super::goals::Goal;
use super::prove::{Prover, Unsaid, World};
use super::watch::Nothing;
use crate::scenario::{MomentKind, Place};

impl Prover<'_> {
    /// Does the pattern come that each of these steps waits for?
    pub(super) fn patterns(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let world = self.world(&[], &[])?;
        let hull = self.explore(&world, &Nothing, Mode { merge: Merge::Hull, ..Mode::default() });
        let mut exact = None;
        let mut rest = None;
        for question in questions {
            let moment = self.asked.questions[*question as usize].moment.expect("it is asked of a step");
            let MomentKind::Step(step) = self.scenario.stimulus.moments[moment as usize].kind else { continue };
            let Place::When { timeout, .. } = self.scenario.stimulus.steps[step as usize].place else { continue };
            let comes = hull.as_ref().is_ok_and(|found| !found.missed.contains_key(&step));
            if !comes {
                if exact.is_none() {
                    exact = Some(
                        [true, false]
                            .map(|joint| self.explore_some(&world, &Nothing, Mode { joint, ..Mode::default() })),
                    );
                }
                let [(whole, short), (apart, apart_short)] = exact.as_ref().expect("it was just made");
                if whole.missed.contains_key(&step) || apart.missed.contains_key(&step) {
                    let tie = !apart.missed.contains_key(&step) && apart_short.is_none();
                    let found = if apart.missed.contains_key(&step) { apart } else { whole };
                    self.misses(&world, found, step, tie, *question);
                    continue;
                }
                if let Some(unsaid) = short {
                    self.unsaid(&[*question], unsaid);
                    continue;
                }
            }
            // without an end of the wait the circuit may also oscillate for ever
            if timeout.is_some() {
                self.claim(*question, Call::Proved);
                continue;
            }
            if rest.is_none() {
                rest = Some(self.comes_to_rest(&world));
            }
            let (verdict, open) = rest.as_ref().expect("it was just made");
            let clocked = !world.plant.clocks.is_empty();
            let cycles: Vec<&Cycle> = match verdict {
                RestVerdict::Always => Vec::new(),
                RestVerdict::Cycles(cycles) => cycles.iter().filter(|cycle| clocked || cycle.steps == step).collect(),
                RestVerdict::Undecided(ended) => {
                    let unsaid = Unsaid { call: Call::Undecided, reason: self.why(*ended) };
                    self.unsaid(&[*question], &unsaid);
                    continue;
                }
            };
            let claim = match cycles.is_empty() {
                true if open.is_empty() => Claim::new(*question, Call::Proved),
                true => Claim {
                    reason: Some("the budget ran out before all cycles were looked for".to_string()),
                    ..Claim::new(*question, Call::Undecided)
                },
                false => self.goes_round(&world, &cycles, *question),
            };
            self.proof.claims.push(claim);
        }
        Ok(())
    }

    fn misses(&mut self, world: &World, found: &Explored, step: u32, tie: bool, question: u32) {
        let it = &world.plant.steps[step as usize];
        let timeout = match it.place {
            super::plant::PlantPlace::When { timeout, .. } => timeout,
            _ => None,
        };
        let goal = Goal::Missed { nets: it.pattern.iter().map(|entry| entry.0).collect(), timeout };
        self.refute(world, found, &[(found.missed[&step], tie)], question, &goal);
    }
}
