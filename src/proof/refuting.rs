//! From traces that break a claim to a case, and what its run shows.

use super::claim::{Call, Variation};
use super::evidence::{Evidence, trails};
use super::explored::{Explored, Fired};
use super::goals::Goal;
use super::grouped::grouped;
use super::prove::{Prover, World};
use super::system::{Points, Sense, System};
use super::witness::{case, one_draw};
use crate::engine::Trace;
use crate::findings::{Answers, Judge};
use crate::instance::{Instance, Which};

/// Traces that are made into cases for one claim, at most.
const WAYS: usize = 16;

impl Prover<'_> {
    /// Traces break a question: makes one of them a case, runs it, and says what came of it.
    pub(super) fn refute(&mut self, world: &World, found: &Explored, ways: &[(u32, bool)], question: u32, goal: &Goal) {
        let but_for_ties = !ways.is_empty() && ways.iter().all(|(_, tie)| *tie);
        let mut witness = None;
        let mut race = None;
        let mut reason = "delays were found, but their run does not show it";
        for (node, _) in ways.iter().take(WAYS) {
            let (trace, start) = (found.trace(*node), found.start(*node));
            self.keep(world, &[(&trace, &start)], question, goal);
            if witness.is_some() {
                continue;
            }
            match self.cases_of(world, &trace, &start, goal) {
                Ok(cases) => {
                    if let Some((system, case)) = cases.into_iter().find(|(_, case)| self.shows(case, question)) {
                        let shows = |case: &Instance| self.shows(case, question);
                        race = self.deciding(world, &system, (&trace, &start), but_for_ties, &shows);
                        witness = Some(case);
                    }
                }
                Err(why) => reason = why,
            }
        }
        // the usual cases lie in the ranges, too
        let usual = [Which::Typ, Which::Min, Which::Max].map(|which| Instance::of(self.scenario, &which));
        let witness = witness.or_else(|| usual.into_iter().find(|case| self.shows(case, question)));
        let refuted = witness.is_some();
        let claim = self.claim(question, if refuted { Call::Refuted } else { Call::Undecided });
        claim.but_for_ties = but_for_ties;
        claim.variation = Some(if refuted { Variation::Constant } else { Variation::Unknown });
        claim.witness = witness.map(Box::new);
        claim.race = race;
        claim.reason = (!refuted).then(|| reason.to_string());
    }

    /// Keeps what traces, which must all be possible, say against a claim.
    pub(super) fn keep(&mut self, world: &World, traces: &[(&[Fired], &[u64])], question: u32, goal: &Goal) {
        if !self.collects {
            return;
        }
        match traces {
            [(trace, start)] => {
                for trail in trails(world, trace, start, goal) {
                    self.evidence.push(Evidence { question, trails: vec![trail] });
                }
            }
            traces => {
                let trails = traces.iter().flat_map(|(trace, start)| trails(world, trace, start, goal)).collect();
                self.evidence.push(Evidence { question, trails });
            }
        }
    }

    /// Cases that go the way of a trace to a goal, with their systems, one for each way to reach it, or why there is none.
    pub(super) fn cases_of(
        &self,
        world: &World,
        trace: &[Fired],
        start: &[u64],
        goal: &Goal,
    ) -> Result<Vec<(System, Instance)>, &'static str> {
        let shared = one_draw(self.scenario, &world.plant);
        let system = System::of(&world.plant, start, trace, &shared);
        let mut cases = Vec::new();
        let mut why = "what was found has no length that could be looked for";
        for forms in goal.ways(&world.plant, &system, start, trace) {
            let mut system = system.clone();
            forms.into_iter().for_each(|form| system.push(form, Sense::Below));
            match system.solve() {
                Points::Some(point) => {
                    let instance = case(self.scenario, &world.plant, &system, &point, trace, start).instance;
                    match grouped(self.scenario, &world.plant, &system, instance) {
                        Some(instance) => cases.push((system, instance)),
                        None => why = "the delays that were found are excluded by a group",
                    }
                }
                Points::None => why = "no constant delays were found that show it",
                Points::GaveUp => why = "the numbers of the linear program grew too large",
            }
        }
        if cases.is_empty() { Err(why) } else { Ok(cases) }
    }

    /// A case that goes the way of a trace with its system, or why there is none.
    pub(super) fn case_of(
        &self,
        world: &World,
        trace: &[Fired],
        start: &[u64],
    ) -> Result<(System, Instance), &'static str> {
        let cases = self.cases_of(world, trace, start, &Goal::Reached)?;
        cases.into_iter().next().ok_or("no case was found")
    }

    /// Everything that happens in the run of a case; `None` if it was stopped.
    pub(super) fn run(&self, instance: &Instance) -> Option<Trace> {
        let mut trace = Trace::default();
        self.program.machine().hear(instance, &self.budget.control, &mut trace).then_some(trace)
    }

    /// Does a run of this case break the question?
    pub(super) fn shows(&self, instance: &Instance, question: u32) -> bool {
        let mut observers = (Trace::default(), Judge::new(self.scenario, self.asked, Answers::default()));
        if !self.program.machine().hear(instance, &self.budget.control, &mut observers) {
            return false;
        }
        let facts = &observers.1.sink.facts;
        facts.iter().any(|fact| fact.breaks_rule && fact.subject.question == Some(question))
    }
}
