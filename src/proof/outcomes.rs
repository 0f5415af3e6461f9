//! Claims about whole states at rest: races, the reference, steps that come before rest.

use std::collections::{BTreeMap, BTreeSet};

use super::claim::{Call, Variation};
use super::evidence::{Least, Trail};
use super::explored::{Explored, Fired, Mode, Rest, START};
use super::goals::Goal;
use super::key::{bit, put};
use super::looking::reached;
use super::outside::Stretch;
use super::prove::{Prover, Unsaid, World};
use super::race::Race;
use super::ratio::Ratio;
use super::system::System;
use super::watch::Nothing;
use super::watches::BeforeRest;
use crate::circuit::NetId;
use crate::findings::Question;
use crate::flow::{Answer, Coming, Passed};
use crate::instance::Instance;
use crate::logic::{Bits, State};
use crate::scenario::Alternative;
use crate::sweep::race_breaks;

/// Whole states made of those of the parts, at most.
const STATES: usize = 256;
/// Ways that are made into cases, at most, for one claim.
const WAYS: usize = 24;

/// One part of the circuit, explored.
struct Part {
    world: World,
    found: Explored,
    /// Without what takes exactly equal times.
    apart: Explored,
}

/// An outcome, as a run reached it.
struct Reached {
    system: System,
    instance: Instance,
    trace: Vec<Fired>,
    start: Vec<u64>,
}

/// By the state that a window began in, the states that it came to rest in, each with a way.
type Followed = BTreeMap<Box<[u64]>, BTreeMap<Box<[u64]>, u32>>;

impl Part {
    /// The states at rest of a window, by the state that it began in.
    fn outcomes(&self, found: &Explored, steps: &Stretch) -> Followed {
        let mut all: Followed = BTreeMap::new();
        let these = found.rests.iter().filter(|(rest, _)| steps.contains(&rest.steps) && rest.origin < START);
        for (rest, node) in these {
            let state = |number: u32| -> Box<[u64]> {
                let mut values = found.states[number as usize].clone();
                let plant = &self.world.plant;
                let others = (0..plant.signals()).filter(|signal| !plant.core[*signal]);
                others.for_each(|signal| put(&mut values, signal, false));
                values
            };
            all.entry(state(rest.origin)).or_default().entry(state(rest.state)).or_insert(*node);
        }
        all
    }
}

impl Prover<'_> {
    /// Does more than one state follow a step from one state, against the rule?
    pub(super) fn races(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let mut parts = Vec::new();
        for nets in self.parts() {
            let world = self.world(&nets, &[])?;
            let found = self.explore(&world, &Nothing, Mode::default())?;
            let apart = self.explore(&world, &Nothing, Mode { joint: false, ..Mode::default() })?;
            parts.push(Part { world, found, apart });
        }
        for question in questions {
            if let Err(unsaid) = self.race(&parts, *question) {
                self.unsaid(&[*question], &unsaid);
            }
        }
        Ok(())
    }

    fn race(&mut self, parts: &[Part], question: u32) -> Result<(), Unsaid> {
        let moment = self.asked.questions[question as usize].moment.expect("a race is asked of a moment");
        let several = |ties: bool| -> Vec<(usize, Vec<(State, u32)>)> {
            let mut all = Vec::new();
            for (number, part) in parts.iter().enumerate() {
                let steps = self.steps_of(&part.world.plant, question);
                let found = if ties { &part.found } else { &part.apart };
                for outcomes in part.outcomes(found, &steps).into_values().filter(|outcomes| outcomes.len() > 1) {
                    let states = outcomes.into_iter().map(|(values, node)| (self.whole(&part.world, &values), node));
                    all.push((number, states.collect()));
                }
            }
            all
        };
        let with = several(true);
        if with.is_empty() {
            self.claim(question, Call::Proved);
            return Ok(());
        }
        // outcomes that each have an alternative of their own break nothing; where several parts choose, whole states count
        let choosing: BTreeSet<usize> = with.iter().map(|(part, _)| *part).collect();
        let alternatives = self.alternatives(moment);
        if alternatives.len() > 1 {
            if choosing.len() > 1 {
                let reason = "several parts of the circuit choose at once, and the step has alternatives".to_string();
                return Err(Unsaid { call: Call::Undecided, reason });
            }
            let part = &parts[with[0].0].world.plant;
            let inside = alternatives.iter().flatten().all(|(net, _)| part.local(*net).is_some());
            if !inside {
                let reason =
                    "the alternatives of the step name nets of another part than the one that chooses".to_string();
                return Err(Unsaid { call: Call::Undecided, reason });
            }
        }
        let breaks = |all: &[(usize, Vec<(State, u32)>)]| {
            all.iter().any(|(_, states)| {
                let states: BTreeSet<&State> = states.iter().map(|(state, _)| state).take(STATES).collect();
                race_breaks(self.scenario, moment, &states)
            })
        };
        if !breaks(&with) {
            self.claim(question, Call::Proved);
            return Ok(());
        }
        let without = several(false);
        let ties = !breaks(&without);
        let ways = if ties { &with } else { &without };
        let mut shown: Option<Instance> = None;
        let (mut reason, mut race) = (None, None);
        for (number, states) in ways {
            let part = &parts[*number];
            let found = if ties { &part.found } else { &part.apart };
            let ways: Vec<(Vec<Fired>, Vec<u64>)> =
                states.iter().take(WAYS).map(|(_, node)| (found.trace(*node), found.start(*node))).collect();
            // any two of the outcomes are a race
            for (number, ours) in ways.iter().enumerate() {
                for theirs in &ways[..number] {
                    let both = [(&theirs.0[..], &theirs.1[..]), (&ours.0[..], &ours.1[..])];
                    self.keep(&part.world, &both, question, &Goal::Reached);
                }
            }
            if shown.is_some() {
                continue;
            }
            let mut ran: BTreeMap<Option<State>, BTreeMap<State, Reached>> = BTreeMap::new();
            for (trace, start) in ways {
                match self.case_of(&part.world, &trace, &start) {
                    Ok((system, instance)) => {
                        let Some((before, after)) = self.passage(&instance, moment) else {
                            reason = Some("delays were found, but their run does not come to rest".to_string());
                            continue;
                        };
                        let reached = ran.entry(before).or_default();
                        reached.insert(after, Reached { system, instance, trace, start });
                        let states: BTreeSet<&State> = reached.keys().collect();
                        if race_breaks(self.scenario, moment, &states) {
                            shown = reached.values().next_back().map(|it| it.instance.clone());
                            race = self.choosing(&part.world, reached, moment, ties);
                            break;
                        }
                    }
                    Err(why) => reason = Some(why.to_string()),
                }
            }
        }
        let reason = reason.unwrap_or_else(|| "the runs of the delays that were found do not differ".to_string());
        let claim = self.claim(question, if shown.is_some() { Call::Refuted } else { Call::Undecided });
        claim.but_for_ties = ties;
        claim.variation = Some(if shown.is_some() { Variation::Constant } else { Variation::Unknown });
        claim.reason = if shown.is_some() { None } else { Some(reason) };
        claim.witness = shown.map(Box::new);
        claim.race = race;
        Ok(())
    }

    /// The inequality that decides between the outcomes of a race: that of the outcome which the typical run has not, and
    /// which asks least of the ranges.
    fn choosing(&self, world: &World, reached: &BTreeMap<State, Reached>, moment: u32, ties: bool) -> Option<Race> {
        let far = |it: &Reached| match Trail::of(&world.plant, &it.system).least(self.scenario) {
            Least::At { factor, .. } => factor,
            Least::Never | Least::GaveUp => Ratio::ZERO,
        };
        let mut all: Vec<(Ratio, &State, &Reached)> = reached.iter().map(|(state, it)| (far(it), state, it)).collect();
        all.sort_by_key(|it| std::cmp::Reverse(it.0));
        all.into_iter().find_map(|(_, state, it)| {
            let shows = |case: &Instance| self.passage(case, moment).is_some_and(|(_, after)| after == *state);
            self.deciding(world, &it.system, (&it.trace, &it.start), ties, &shows)
        })
    }

    /// The alternatives that the step of a moment expects.
    fn alternatives(&self, moment: u32) -> Vec<Alternative> {
        let stimulus = &self.scenario.stimulus;
        let step = stimulus.step_of(&stimulus.moments[moment as usize]);
        step.and_then(|step| step.expect.as_ref()).map_or_else(Vec::new, |expect| expect.alternatives.clone())
    }

    /// The state before and after the window of a moment in the run of a case, if it began and ended at rest.
    fn passage(&self, instance: &Instance, moment: u32) -> Option<(Option<State>, State)> {
        let run = self.run(instance)?;
        let at = run.windows.iter().position(|window| window.moment == moment)?;
        let window = &run.windows[at];
        let before = if at == 0 { run.start.clone() } else { run.windows[at - 1].state.clone() };
        (window.began_at_rest && window.settling.is_some()).then(|| (Some(before), window.state.clone()))
    }

    /// Values of a part as a state of the circuit, other nets at 0.
    fn whole(&self, world: &World, values: &[u64]) -> State {
        let mut state = State::known(Bits::zeros(self.scenario.circuit.net_count()));
        for (local, net) in world.plant.nets.iter().enumerate() {
            state.set(net.index(), bit(values, local).into());
        }
        state
    }

    /// Is every state at rest one that the reference allows?
    pub(super) fn reference(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let Some(allowed) = self.asked.allowed.clone() else { return Ok(()) };
        let mut nets: Vec<NetId> = allowed.reference().compare.iter().map(|(net, _)| *net).collect();
        // the reference sees every input
        nets.extend(self.scenario.circuit.inputs());
        let world = self.world(&nets, &[])?;
        let found = self.explore(&world, &Nothing, Mode::default())?;
        let apart = self.explore(&world, &Nothing, Mode { joint: false, ..Mode::default() })?;
        for question in questions {
            let steps = self.steps_of(&world.plant, *question);
            let moment = self.asked.questions[*question as usize].moment.expect("it is asked of a moment");
            let stimulus = &self.scenario.stimulus;
            let moment = &stimulus.moments[moment as usize];
            let step = stimulus.step_of(moment);
            let skewed = step.and_then(|step| step.skew).is_some_and(|skew| !skew.is_exact());
            let bounce = step.and_then(|step| step.bounce.as_ref());
            let coming = match bounce.is_some_and(|bounce| bounce.pulses.1 > 0) {
                true => Coming::Restless(stimulus.inputs_of(moment)),
                false if skewed => Coming::Apart,
                false => Coming::Together,
            };
            let mut gave_up = false;
            let mut bad = |found: &Explored| -> Vec<(u32, Rest)> {
                let mut all = Vec::new();
                for (rest, node) in found.rests.iter().filter(|(rest, _)| steps.contains(&rest.steps)) {
                    let view = |number: u32| allowed.view(&self.whole(&world, &found.states[number as usize]).ones);
                    let power_up = world.plant.power_up && rest.steps == 0;
                    let before = (rest.origin < START && !power_up).then(|| view(rest.origin));
                    let passed = Passed { before: before.as_ref(), coming: &coming, after: &view(rest.state) };
                    match allowed.answer(&passed) {
                        Answer::Allowed => {}
                        Answer::NotAllowed => all.push((*node, *rest)),
                        Answer::GaveUp => gave_up = true,
                    }
                }
                all
            };
            let (with, without) = (bad(&found), bad(&apart));
            if gave_up {
                let reason = "what the reference allows was not found out within its budget".to_string();
                self.unsaid(&[*question], &Unsaid { call: Call::Undecided, reason });
            } else if with.is_empty() {
                self.claim(*question, Call::Proved);
            } else if without.is_empty() {
                let ways: Vec<(u32, bool)> = with.iter().map(|(node, _)| (*node, true)).collect();
                self.refute(&world, &found, &ways, *question, &Goal::Reached);
            } else {
                let ways: Vec<(u32, bool)> = without.iter().map(|(node, _)| (*node, false)).collect();
                self.refute(&world, &apart, &ways, *question, &Goal::Reached);
            }
        }
        Ok(())
    }

    /// Does every step come at rest?
    pub(super) fn before_rest(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        let mut worst: BTreeMap<u32, super::claim::Claim> = BTreeMap::new();
        for nets in self.parts() {
            let world = self.world(&nets, &[])?;
            let from = self.proof.claims.len();
            let early = |_: &Question, steps: &Stretch, hit: u32| steps.start == hit;
            self.by_window(&world, &BeforeRest, questions, &early, &reached)?;
            for claim in self.proof.claims.drain(from..) {
                let question = claim.question;
                let graver = worst.get(&question).is_none_or(|it| it.call.severity() < claim.call.severity());
                if graver {
                    worst.insert(question, claim);
                }
            }
        }
        self.proof.claims.extend(worst.into_values());
        Ok(())
    }
}
