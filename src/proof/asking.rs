//! What each rule asks: of which nets, with which watch, and what breaks it.

use std::collections::BTreeMap;

use super::claim::Call;
use super::explored::Explored;
use super::goals::Goal;
use super::key::bit;
use super::looking::reached;
use super::outside::Stretch;
use super::plant::Plant;
use super::prove::{Prover, Unsaid};
use super::watches::{Answered, Apart, Edge, Late, Moves, Shows, ShowsLonger, Swallows, Tolerates, Width};
use crate::circuit::NetId;
use crate::findings::{Pattern, Question, RuleKey};
use crate::scenario::{Alternative, EdgeSpec, Place};
use crate::time::Span;

impl Prover<'_> {
    /// The questions that are wanted, those of one rule and net together.
    pub(super) fn questions(&mut self, wanted: &dyn Fn(u32) -> bool) {
        let mut groups: BTreeMap<(RuleKey, u32, Option<NetId>), Vec<u32>> = BTreeMap::new();
        for (number, question) in self.asked.questions.iter().enumerate().filter(|(number, _)| wanted(*number as u32)) {
            groups.entry((question.rule, question.index, question.net)).or_default().push(number as u32);
        }
        let total = groups.len() as u64;
        for (done, ((rule, index, net), questions)) in groups.into_iter().enumerate() {
            self.budget.control.report(done as u64, total);
            if let Some(spent) = self.spent() {
                self.unsaid(&questions, &spent);
                continue;
            }
            if let Err(unsaid) = self.group(rule, index, net, &questions) {
                self.unsaid(&questions, &unsaid);
            }
        }
    }

    fn group(&mut self, rule: RuleKey, index: u32, net: Option<NetId>, questions: &[u32]) -> Result<(), Unsaid> {
        let rules = self.scenario.rules.clone();
        match rule {
            RuleKey::Never => {
                let never = &rules.never[index as usize];
                let nets: Vec<NetId> = never.state.iter().map(|(net, _)| *net).collect();
                let nets = if never.longer_than > Span::ZERO { self.while_others_work(nets) } else { nets };
                let world = self.world(&nets, &[never.longer_than])?;
                let pattern = local(&world.plant, &never.state);
                // the state at the start counts, even where the first step comes at that very instant
                let at_start = |start: &Vec<bool>| pattern.iter().all(|(net, value)| start[*net as usize] == *value);
                if never.longer_than == Span::ZERO && world.starts.iter().any(at_start) {
                    self.refute(&world, &Explored::nothing(&world.plant), &[], questions[0], &Goal::Reached);
                    return Ok(());
                }
                if never.longer_than == Span::ZERO {
                    self.whole_run(&world, &Shows { pattern }, &Goal::Reached, questions[0])
                } else {
                    let longer = world.plant.ticks(never.longer_than);
                    let goal = Goal::Long { pattern: pattern.clone(), longer };
                    self.whole_run(&world, &ShowsLonger { pattern, longer }, &goal, questions[0])
                }
            }
            RuleKey::Timing => {
                let timing = &rules.timing[index as usize];
                let spans: Vec<Span> = timing.min.into_iter().chain(timing.max).collect();
                let mut nets = vec![timing.from.net, timing.to.net];
                if timing.max.is_some() {
                    nets = self.while_others_work(nets);
                }
                let world = self.world(&nets, &spans)?;
                let edge = |spec: &EdgeSpec| Edge {
                    net: world.plant.local(spec.net).expect("the cone holds its nets"),
                    kind: spec.edge,
                };
                let (from, to) = (edge(&timing.from), edge(&timing.to));
                let min = timing.min.filter(|min| *min > Span::ZERO).map(|min| Apart {
                    from,
                    to,
                    min: world.plant.ticks(min),
                });
                let must = !self.scenario.circuit.is_input(timing.to.net);
                let max = timing.max.map(|max| Answered { from, to, max: world.plant.ticks(max), must });
                let close = Goal::Close { from, to, min: min.map_or(0, |min| min.min) };
                let open = Goal::Open { from, to, max: max.map_or(0, |max| max.max) };
                match (min, max) {
                    (Some(min), None) => self.whole_run(&world, &min, &close, questions[0]),
                    (None, Some(max)) => self.whole_run(&world, &max, &open, questions[0]),
                    (Some(min), Some(max)) => {
                        self.whole_run(&world, &min, &close, questions[0])?;
                        let first = self.proof.claims.pop();
                        self.whole_run(&world, &max, &open, questions[0])?;
                        // the worse of both answers for the rule
                        if let Some(first) = first
                            && self
                                .proof
                                .claims
                                .last()
                                .is_some_and(|second| first.call.severity() > second.call.severity())
                        {
                            *self.proof.claims.last_mut().expect("there is one") = first;
                        }
                        Ok(())
                    }
                    (None, None) => {
                        self.claim(questions[0], Call::Proved);
                        Ok(())
                    }
                }
            }
            RuleKey::MinPulse => {
                let rule = &rules.min_pulse[index as usize];
                let spans: Vec<Span> = rule.high.into_iter().chain(rule.low).collect();
                let world = self.world(&[rule.net], &spans)?;
                let ticks = |span: Option<Span>| span.map_or(0, |span| world.plant.ticks(span));
                let net = world.plant.local(rule.net).expect("the cone holds its nets");
                let watch = Width { net, least: [ticks(rule.low), ticks(rule.high)] };
                self.whole_run(&world, &watch, &Goal::Short { net, least: watch.least }, questions[0])
            }
            RuleKey::Swallowed => {
                let nets: Vec<NetId> = match net {
                    Some(net) => vec![net],
                    None => self.scenario.circuit.gates().map(|gate| self.scenario.circuit.net_of(gate)).collect(),
                };
                for net in nets {
                    let world = self.world(&[net], &[])?;
                    let net = world.plant.local(net).expect("the cone holds its nets");
                    let Some(gate) = (net as usize).checked_sub(world.plant.inputs) else { continue };
                    self.whole_run(&world, &Swallows { gate: gate as u32 }, &Goal::Reached, questions[0])?;
                    if self.proof.claims.last().is_some_and(|claim| claim.call != Call::Proved) {
                        return Ok(());
                    }
                    self.proof.claims.pop();
                }
                self.claim(questions[0], Call::Proved);
                Ok(())
            }
            RuleKey::GlitchFree => self.glitches(index, questions),
            RuleKey::Edges => self.edges(questions),
            RuleKey::SettleWithin => self.settle_within(net.expect("it is asked of a net"), questions),
            RuleKey::NeverAtRest => {
                let state = rules.never_at_rest[index as usize].state.clone();
                let nets: Vec<NetId> = state.iter().map(|(net, _)| *net).collect();
                self.rests(&nets, questions, &|plant, values, _| {
                    !local(plant, &state).iter().all(|(n, v)| bit(values, *n as usize) == *v)
                })
            }
            RuleKey::Expect => {
                // each step expects something of its own
                for question in questions {
                    let Some(Pattern::OneOf(expect)) = &self.asked.questions[*question as usize].pattern else {
                        continue;
                    };
                    let mut nets: Vec<NetId> = expect.alternatives.iter().flatten().map(|(net, _)| *net).collect();
                    nets.sort_unstable();
                    nets.dedup();
                    let alternatives = expect.alternatives.clone();
                    let fits = |plant: &Plant, values: &[u64], _: u32| {
                        let fit =
                            |it: &Alternative| local(plant, it).iter().all(|(n, v)| bit(values, *n as usize) == *v);
                        alternatives.iter().any(fit)
                    };
                    if let Err(unsaid) = self.rests(&nets, &[*question], &fits) {
                        self.unsaid(&[*question], &unsaid);
                    }
                }
                Ok(())
            }
            RuleKey::Reference => self.reference(questions),
            RuleKey::CriticalRace => self.races(questions),
            RuleKey::Oscillation => self.oscillation(questions),
            RuleKey::When => self.patterns(questions),
            RuleKey::BeforeRest => self.before_rest(questions),
        }
    }

    /// The nets that a question must know which asks how long something lasts: a step at rest waits for the whole circuit,
    /// and not for the cone alone.
    fn while_others_work(&self, nets: Vec<NetId>) -> Vec<NetId> {
        let waits = self.scenario.stimulus.steps.iter().any(|step| matches!(step.place, Place::Rest(_)));
        if waits { self.scenario.circuit.nets().collect() } else { nets }
    }

    fn glitches(&mut self, index: u32, questions: &[u32]) -> Result<(), Unsaid> {
        let rule = self.scenario.rules.glitch_free[index as usize].clone();
        let world = self.world(&[rule.net], &[rule.shorter_than])?;
        let net = world.plant.local(rule.net).expect("the cone holds its nets");
        let glitch = |_: &Question, steps: &Stretch, hit: u32| {
            let moved = Moves::moved(hit);
            steps.contains(&moved.steps) && moved.count >= 2
        };
        if rule.shorter_than == Span::ZERO {
            let watch = Moves { net, most: 2, from: None };
            return self.by_window(&world, &watch, questions, &glitch, &reached);
        }
        let shorter = world.plant.ticks(rule.shorter_than);
        let goal = move |_: &Plant, _: &Question| Goal::Wide { net, least: shorter };
        self.by_window(&world, &Tolerates { net, shorter }, questions, &glitch, &goal)
    }

    fn edges(&mut self, questions: &[u32]) -> Result<(), Unsaid> {
        for question in questions {
            let Some(Pattern::Count(count)) = self.asked.questions[*question as usize].pattern.clone() else {
                continue;
            };
            let world = self.world(&[count.net], &[])?;
            let most = count.most.max(count.least);
            if most > 100 {
                let reason = "more than 100 edges are not counted by the proof".to_string();
                self.unsaid(&[*question], &Unsaid { call: Call::NotCovered, reason });
                continue;
            }
            let from = Some(self.steps_of(&world.plant, *question).start);
            let watch = Moves { net: world.plant.local(count.net).expect("the cone holds its nets"), most, from };
            let wrong = |_: &Question, steps: &Stretch, hit: u32| {
                let moved = Moves::moved(hit);
                steps.contains(&moved.steps) && !(count.least..=count.most).contains(&moved.count)
            };
            if let Err(unsaid) = self.by_window(&world, &watch, &[*question], &wrong, &reached) {
                self.unsaid(&[*question], &unsaid);
            }
        }
        Ok(())
    }

    fn settle_within(&mut self, net: NetId, questions: &[u32]) -> Result<(), Unsaid> {
        let spans: Vec<Span> = questions.iter().filter_map(|q| self.asked.questions[*q as usize].bound).collect();
        let world = self.world(&[net], &spans)?;
        let mut bounds = vec![None; world.plant.windows as usize];
        for question in questions {
            let first = self.steps_of(&world.plant, *question).start;
            bounds[first as usize] =
                self.asked.questions[*question as usize].bound.map(|bound| world.plant.ticks(bound));
        }
        let watch = Late { net: world.plant.local(net).expect("the cone holds its nets"), bounds };
        let late = watch.net;
        let goal = move |plant: &Plant, question: &Question| Goal::Late {
            net: late,
            bound: question.bound.map_or(0, |bound| plant.ticks(bound)),
        };
        self.by_window(&world, &watch, questions, &|_, steps, hit| steps.start == hit, &goal)
    }
}

/// A partial state by the numbers of the plant.
fn local(plant: &Plant, state: &Alternative) -> Vec<(u32, bool)> {
    state.iter().filter_map(|(net, value)| plant.local(*net).map(|net| (net, *value))).collect()
}
