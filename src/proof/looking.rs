//! Looking for what breaks a claim: a hull first, then exactly, then without what takes exactly equal times.

use std::collections::BTreeMap;

use super::claim::Call;
use super::explored::{Explored, Merge, Mode, Rest, SINCE, START};
use super::goals::Goal;
use super::outside::Stretch;
use super::plant::Plant;
use super::prove::{Prover, Unsaid, World};
use super::watch::{Nothing, Watch};
use crate::circuit::NetId;
use crate::findings::{Question, RuleKey};

/// Nothing has to be shown but that the trace ends where it does.
pub(super) fn reached(_: &Plant, _: &Question) -> Goal {
    Goal::Reached
}

/// What looking for something in a world came to.
enum Looked {
    /// It cannot happen.
    Never,
    /// It can: hits, each with its way.
    Hits { found: Box<Explored>, hits: BTreeMap<u32, u32>, ties: BTreeMap<u32, bool>, short: Option<Unsaid> },
}

impl Prover<'_> {
    /// Looks for hits: a hull first, then exactly, then without what takes exactly equal times.
    fn look<W: Watch>(&mut self, world: &World, watch: &W, wanted: &dyn Fn(u32) -> bool) -> Result<Looked, Unsaid> {
        let hull = Mode { merge: Merge::Hull, ..Mode::default() };
        if let Ok(found) = self.explore(world, watch, hull)
            && !found.hits.keys().any(|hit| wanted(*hit))
        {
            return Ok(Looked::Never);
        }
        // what was found before a budget ran out was found
        let (exact, short) = self.explore_some(world, watch, Mode::default());
        let hits: BTreeMap<u32, u32> =
            exact.hits.iter().filter(|(hit, _)| wanted(**hit)).map(|(h, n)| (*h, *n)).collect();
        if hits.is_empty() {
            return short.map_or(Ok(Looked::Never), Err);
        }
        let (apart, apart_short) = self.explore_some(world, watch, Mode { joint: false, ..Mode::default() });
        let needs_tie = |hit: &u32| !apart.hits.contains_key(hit) && apart_short.is_none();
        let ties: BTreeMap<u32, bool> = hits.keys().map(|hit| (*hit, needs_tie(hit))).collect();
        // a way without exact ties is the better one
        let (found, hits) = match hits.keys().all(|hit| apart.hits.contains_key(hit)) {
            true => {
                let hits = hits.keys().map(|hit| (*hit, apart.hits[hit])).collect();
                (apart, hits)
            }
            false => (exact, hits),
        };
        Ok(Looked::Hits { found: Box::new(found), hits, ties, short })
    }

    /// A question about whole runs: any hit breaks it.
    pub(super) fn whole_run<W: Watch>(
        &mut self,
        world: &World,
        watch: &W,
        goal: &Goal,
        question: u32,
    ) -> Result<(), Unsaid> {
        match self.look(world, watch, &|_| true)? {
            Looked::Never => {
                self.claim(question, Call::Proved);
            }
            Looked::Hits { found, hits, ties, .. } => {
                let ways: Vec<(u32, bool)> = hits.iter().map(|(hit, node)| (*node, ties[hit])).collect();
                self.refute(world, &found, &ways, question, goal);
                // what one net or bound of a rule needs is not all that the rule needs
                let asked = &self.asked.questions[question as usize];
                let timing = (asked.rule == RuleKey::Timing).then(|| &self.scenario.rules.timing[asked.index as usize]);
                let several = timing.is_some_and(|timing| timing.min.is_some() && timing.max.is_some());
                if asked.rule != RuleKey::Swallowed && !several {
                    self.vary(world, watch, question, goal, &|_, hits, _| !hits.is_empty());
                }
            }
        }
        Ok(())
    }

    /// Questions about windows: hits of each say whether they break it, and what a case must show then.
    pub(super) fn by_window<W: Watch>(
        &mut self,
        world: &World,
        watch: &W,
        questions: &[u32],
        breaks: &dyn Fn(&Question, &Stretch, u32) -> bool,
        goal: &dyn Fn(&Plant, &Question) -> Goal,
    ) -> Result<(), Unsaid> {
        let ranges: Vec<(u32, Stretch)> =
            questions.iter().map(|question| (*question, self.steps_of(&world.plant, *question))).collect();
        let asked = self.asked;
        let wanted = |hit: u32| ranges.iter().any(|(q, steps)| breaks(&asked.questions[*q as usize], steps, hit));
        match self.look(world, watch, &wanted)? {
            Looked::Never => {
                for question in questions {
                    self.claim(*question, Call::Proved);
                }
            }
            Looked::Hits { found, hits, ties, short } => {
                for (question, steps) in &ranges {
                    let ask = &asked.questions[*question as usize];
                    let of: Vec<(u32, bool)> = hits
                        .iter()
                        .filter(|(hit, _)| breaks(ask, steps, **hit))
                        .map(|(hit, node)| (*node, ties[hit]))
                        .collect();
                    match of.is_empty() {
                        true => match &short {
                            Some(unsaid) => self.unsaid(&[*question], unsaid),
                            None => {
                                self.claim(*question, Call::Proved);
                            }
                        },
                        false => {
                            let goal = goal(&world.plant, ask);
                            self.refute(world, &found, &of, *question, &goal);
                            // other parts of the circuit may come before rest, too
                            if ask.rule != RuleKey::BeforeRest {
                                let here = |_: &Explored, hits: &[u32], _: Option<&Rest>| {
                                    hits.iter().any(|hit| breaks(ask, steps, *hit))
                                };
                                self.vary(world, watch, *question, &goal, &here);
                            }
                        }
                    }
                }
            }
        }
        Ok(())
    }

    /// The windows in which a question about one of them is asked.
    pub(super) fn steps_of(&self, plant: &Plant, question: u32) -> Stretch {
        let moment = self.asked.questions[question as usize].moment;
        // power-up is window 0, if there is one
        let first = moment.map_or(0, |moment| moment + u32::from(self.scenario.begin_window().is_none()));
        plant.stretch(first)
    }

    /// Questions about where nets rest. `good` says whether values (with the origin of the window) are allowed.
    pub(super) fn rests(
        &mut self,
        nets: &[NetId],
        questions: &[u32],
        good: &dyn Fn(&Plant, &[u64], u32) -> bool,
    ) -> Result<(), Unsaid> {
        let world = self.world(nets, &[])?;
        // what is expected of a step begins with it, even if it changes nothing
        let own = questions.iter().any(|question| self.asked.questions[*question as usize].rule == RuleKey::Expect);
        let latest = if own { SINCE } else { START };
        let ranges: Vec<(u32, Stretch)> =
            questions.iter().map(|question| (*question, self.steps_of(&world.plant, *question))).collect();
        let is_bad = |found: &Explored, steps: &Stretch, rest: &Rest| {
            steps.contains(&rest.steps)
                && rest.origin <= latest
                && !good(&world.plant, &found.states[rest.state as usize], rest.origin)
        };
        let bad = |found: &Explored, steps: &Stretch| -> Vec<(u32, Rest)> {
            let all = found.rests.iter().filter(|(rest, _)| is_bad(found, steps, rest));
            all.map(|(rest, node)| (*node, *rest)).collect()
        };
        let hull = Mode { merge: Merge::Hull, ..Mode::default() };
        if let Ok(found) = self.explore(&world, &Nothing, hull)
            && ranges.iter().all(|(_, steps)| bad(&found, steps).is_empty())
        {
            for question in questions {
                self.claim(*question, Call::Proved);
            }
            return Ok(());
        }
        let (exact, short) = self.explore_some(&world, &Nothing, Mode::default());
        let (apart, apart_short) = self.explore_some(&world, &Nothing, Mode { joint: false, ..Mode::default() });
        let values = |found: &Explored, rest: Rest| (rest.steps, found.states[rest.state as usize].clone());
        for (question, steps) in &ranges {
            let all = bad(&exact, steps);
            if all.is_empty() {
                match &short {
                    Some(unsaid) => self.unsaid(&[*question], unsaid),
                    None => {
                        self.claim(*question, Call::Proved);
                    }
                }
                continue;
            }
            let without = bad(&apart, steps);
            if without.is_empty() {
                let tie = apart_short.is_none();
                let ways: Vec<(u32, bool)> = all.iter().map(|(node, _)| (*node, tie)).collect();
                self.refute(&world, &exact, &ways, *question, &Goal::Reached);
            } else {
                let mut seen = Vec::new();
                let ways = without.iter().filter(|(_, rest)| {
                    let new = !seen.contains(&values(&apart, *rest));
                    seen.push(values(&apart, *rest));
                    new
                });
                let ways: Vec<(u32, bool)> = ways.map(|(node, _)| (*node, false)).collect();
                self.refute(&world, &apart, &ways, *question, &Goal::Reached);
            }
            let here =
                |found: &Explored, _: &[u32], rest: Option<&Rest>| rest.is_some_and(|rest| is_bad(found, steps, rest));
            self.vary(&world, &Nothing, *question, &Goal::Reached, &here);
        }
        Ok(())
    }
}
