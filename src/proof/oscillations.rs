//! Claims about oscillation.

use std::collections::BTreeMap;

use super::claim::{Call, Claim, Variation};
use super::cycles::{Cycle, RestVerdict};
use super::explored::{Explored, Fired, Mode, Rest, START};
use super::goals::Goal;
use super::key::{Mover, bit};
use super::plant::Plant;
use super::prove::{Prover, Unsaid, World};
use super::watch::Nothing;
use crate::instance::{Instance, Which};

/// The blocks of a cycle; `None` where wires may overtake, so that values do not tell what happened.
fn once_round(plant: &Plant, cycle: &Cycle) -> Option<Vec<Fired>> {
    if plant.wires.iter().any(|wire| !wire.in_order) {
        return None;
    }
    let mut before = cycle.lead.last().map_or(&cycle.start, |block| &block.values);
    let mut blocks = Vec::new();
    for values in &cycle.round {
        let changed = |signal: &usize| bit(before, *signal) != bit(values, *signal);
        let mover = |signal: usize| match signal.checked_sub(plant.nets.len()) {
            Some(wire) => Mover::Arrival(wire as u32),
            None => Mover::Gate((signal - plant.inputs) as u32),
        };
        let movers: Vec<Mover> = (plant.inputs..plant.signals()).filter(changed).map(mover).collect();
        if movers.is_empty() {
            return None;
        }
        blocks.push(Fired { movers, values: values.clone(), steps: cycle.steps as usize, came: false });
        before = values;
    }
    Some(blocks)
}

impl Prover<'_> {
    /// Does no window oscillate, where that is forbidden?
    pub(super) fn oscillation(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let wants = |question: &&u32| self.asked.questions[**question as usize].wants_oscillation;
        let (wanted, questions): (Vec<u32>, Vec<u32>) = questions.iter().partition(wants);
        if !wanted.is_empty()
            && let Err(unsaid) = self.required(&wanted)
        {
            self.unsaid(&wanted, &unsaid);
        }
        if questions.is_empty() {
            return Ok(());
        }
        let forbidden = self.forbidden(&questions);
        if let Err(unsaid) = forbidden {
            self.unsaid(&questions, &unsaid);
        }
        Ok(())
    }

    /// Can the circuit come to rest in a window that must oscillate? It is at rest only if each part of it is.
    fn required(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let mut parts = Vec::new();
        for nets in self.parts() {
            let world = self.world(&nets, &[])?;
            let found = self.explore(&world, &Nothing, Mode::default())?;
            let apart = self.explore(&world, &Nothing, Mode { joint: false, ..Mode::default() })?;
            parts.push((world, found, apart));
        }
        if parts.is_empty() {
            return Err(Unsaid { call: Call::Undecided, reason: "there is no gate that could oscillate".to_string() });
        }
        let (steps, clocked) = (self.scenario.stimulus.steps.len(), !self.scenario.stimulus.clocks.is_empty());
        for question in questions {
            let moment = self.asked.questions[*question as usize].moment;
            let bad = |world: &World, found: &Explored| -> Vec<u32> {
                let stretch = self.steps_of(&world.plant, *question);
                let here = |rest: &Rest| match moment {
                    Some(_) => stretch.contains(&rest.steps),
                    // a whole run breaks the rule only if it reaches its last window, which began and ends at rest, uncut
                    None => clocked || rest.steps as usize == steps && rest.origin <= START,
                };
                found.rests.iter().filter(|(rest, _)| here(rest)).map(|(_, node)| *node).collect()
            };
            let with: Vec<Vec<u32>> = parts.iter().map(|(world, found, _)| bad(world, found)).collect();
            let without: Vec<Vec<u32>> = parts.iter().map(|(world, _, apart)| bad(world, apart)).collect();
            if with.iter().any(Vec::is_empty) {
                self.claim(*question, Call::Proved);
                continue;
            }
            let tie = without.iter().any(Vec::is_empty);
            // the part with the fewest ways says most
            let of = (0..parts.len()).min_by_key(|part| with[*part].len()).unwrap_or(0);
            let (world, found, apart) = &parts[of];
            let (found, nodes) = if tie { (found, &with[of]) } else { (apart, &without[of]) };
            let ways: Vec<(u32, bool)> = nodes.iter().map(|node| (*node, tie)).collect();
            self.refute(world, found, &ways, *question, &Goal::Reached);
        }
        Ok(())
    }

    fn forbidden(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let mut worst: BTreeMap<u32, Claim> = BTreeMap::new();
        for nets in self.parts() {
            let mut world = self.world(&nets, &[])?;
            // what recurs before the next step is told as well
            world.plant.ends = world.plant.is_timed();
            let (verdict, open) = self.comes_to_rest(&world);
            let cycles = match verdict {
                RestVerdict::Always => Vec::new(),
                RestVerdict::Cycles(cycles) => cycles,
                RestVerdict::Undecided(ended) => {
                    return Err(Unsaid { call: Call::Undecided, reason: self.why(ended) });
                }
            };
            for question in questions {
                let mut claim = self.endless(&world, &cycles, *question);
                let steps = self.steps_of(&world.plant, *question);
                if claim.call == Call::Proved && open.iter().any(|it| steps.contains(it)) {
                    claim.call = Call::Undecided;
                    claim.reason = Some("the budget ran out before all cycles were looked for".to_string());
                }
                if worst.get(question).is_none_or(|it| it.call.severity() < claim.call.severity()) {
                    worst.insert(*question, claim);
                }
            }
        }
        self.proof.claims.extend(worst.into_values());
        Ok(())
    }

    /// What the oscillations of one part say of a question.
    fn endless(&mut self, world: &World, cycles: &[Cycle], question: u32) -> Claim {
        let claim = Claim::new(question, Call::Proved);
        let steps = self.steps_of(&world.plant, question);
        let here: Vec<&Cycle> = cycles.iter().filter(|cycle| steps.contains(&cycle.steps)).collect();
        if here.is_empty() { claim } else { self.goes_round(world, &here, question) }
    }

    /// What oscillations that break a question say of it: looks for a case that shows it.
    pub(super) fn goes_round(&mut self, world: &World, here: &[&Cycle], question: u32) -> Claim {
        let mut claim = Claim::new(question, Call::Undecided);
        claim.but_for_ties = here.iter().all(|cycle| cycle.needs_ties == Some(true));
        // the way there is no way round: whether it goes on, the run says
        let mut shown = None;
        for cycle in here {
            // once round, where it can be told what fires; then only the way there
            let round = once_round(&world.plant, cycle);
            let whole: Option<Vec<Fired>> = round.map(|round| cycle.lead.iter().cloned().chain(round).collect());
            let known = whole.as_ref().unwrap_or(&cycle.lead);
            self.keep(world, &[(known, &cycle.start)], question, &Goal::Reached);
            for way in whole.iter().chain([&cycle.lead]) {
                if shown.is_none()
                    && let Ok((system, instance)) = self.case_of(world, way, &cycle.start)
                    && self.shows(&instance, question)
                {
                    let shows = |case: &Instance| self.shows(case, question);
                    let way = (&way[..], &cycle.start[..]);
                    claim.race = self.deciding(world, &system, way, claim.but_for_ties, &shows);
                    shown = Some(instance);
                }
            }
        }
        let usual = [Which::Typ, Which::Min, Which::Max].map(|which| Instance::of(self.scenario, &which));
        let shown = shown.or_else(|| usual.into_iter().find(|instance| self.shows(instance, question)));
        claim.call = if shown.is_some() { Call::Refuted } else { Call::Undecided };
        claim.variation = Some(if shown.is_some() { Variation::Constant } else { Variation::Unknown });
        if shown.is_none() {
            claim.reason = Some("it can go round once; delays that keep it going were not found".to_string());
        }
        claim.witness = shown.map(Box::new);
        claim
    }
}
