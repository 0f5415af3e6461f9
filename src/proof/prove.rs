//! From questions to explorations, and from what they find to claims.
//!
//! Each question is asked of the cone of its nets alone: nothing else has to do with it. A hull is explored first, which
//! holds all that can happen and perhaps more; what it does not find is proved. Where it finds something, the exact
//! exploration decides, and a trace of it becomes a case that is run with the judges of the sweep: only what the run shows
//! is called refuted.

use std::collections::{BTreeMap, BTreeSet};
use std::time::{Duration, Instant};

use super::claim::{Call, Claim, Proof, Variation};
use super::cycles::{RestVerdict, comes_to_rest_within};
use super::evidence::{Evidence, trails};
use super::explore::explore;
use super::explored::{Budget, Ended, Explored, Fired, Merge, Mode, SINCE, START};
use super::goals::Goal;
use super::grouped::grouped;
use super::key::bit;
use super::outside::Stretch;
use super::plant::Plant;
use super::system::{Points, Sense, System};
use super::watch::{Nothing, Watch};
use super::watches::{Answered, Apart, Edge, Late, Moves, Shows, ShowsLonger, Swallows, Tolerates, Width};
use super::witness::{case, one_draw};
use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::{Program, Trace};
use crate::findings::{Answers, Asked, Judge, Pattern, Question, RuleKey};
use crate::instance::{Instance, Which};
use crate::scenario::{Alternative, Place, Scenario};
use crate::time::Span;

/// Gates of a cone that may begin at random, at most: every start is explored.
const RANDOM_GATES: usize = 12;

/// Of what all explorations together may keep, the share that one may: one part in so many.
const SHARE: u64 = 10;
/// Gates of a cone that cost as much as a zone.
const GATES_A_ZONE: usize = 64;

/// Traces that are made into cases for one claim, at most.
const WAYS: usize = 16;

/// Nothing has to be shown but that the trace ends where it does.
pub(super) fn reached(_: &Plant, _: &Question) -> Goal {
    Goal::Reached
}

/// What a proof may spend.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Spend {
    /// Zones of one exploration, at most.
    pub zones: u64,
    /// Zones of all explorations together, at most; `None` for no bound. What begins when they are spent is undecided. A
    /// cone counts as a zone for every 64 gates.
    pub total: Option<u64>,
    /// Bytes of one exploration, at most.
    pub bytes: u64,
    /// Time for all, at most; `None` for no bound.
    pub time: Option<Duration>,
    /// Look for the margin of each claim as well: several explorations a claim.
    pub margins: bool,
    /// Look for delays to add that make what is refuted proved: the whole proof several times over.
    pub padding: bool,
}

impl Default for Spend {
    fn default() -> Spend {
        Spend { zones: 200_000, total: None, bytes: 1 << 30, time: None, margins: false, padding: false }
    }
}

impl Spend {
    /// So many zones in all, a tenth of them for one exploration, so that no question leaves the others without.
    pub fn in_all(zones: u64) -> Spend {
        Spend { zones: (zones / SHARE).max(1), total: Some(zones), ..Spend::default() }
    }
}

/// Proves or refutes what a scenario asks.
pub fn prove(scenario: &Scenario, program: &Program, asked: &Asked, spend: &Spend, control: &Control) -> Proof {
    let budget = Budget {
        zones: spend.zones,
        bytes: spend.bytes,
        until: spend.time.map(|time| Instant::now() + time),
        control: control.clone(),
    };
    let mut prover = Prover::new(scenario, program, asked, budget);
    prover.left = spend.total;
    prover.branches = Some(spend.total.map_or(u64::MAX, |zones| zones / super::varying::ZONES_A_BRANCH));
    prover.proof.allowed = spend.total;
    prover.collects = spend.margins || spend.padding;
    prover.questions(&|_| true);
    prover.windows();
    prover.proof.claims.sort_by_key(|claim| claim.question);
    if spend.margins {
        prover.margins();
    }
    if spend.padding {
        prover.padding();
    }
    prover.proof
}

pub(super) struct Prover<'a> {
    pub(super) scenario: &'a Scenario,
    pub(super) program: &'a Program,
    pub(super) asked: &'a Asked,
    pub(super) budget: Budget,
    /// Zones that all explorations together may still keep.
    left: Option<u64>,
    /// Beginnings of traces that all searches for constant delays may still keep; `None`: there are no such searches.
    pub(super) branches: Option<u64>,
    pub(super) proof: Proof,
    /// Is evidence kept?
    pub(super) collects: bool,
    /// What speaks against claims.
    pub(super) evidence: Vec<Evidence>,
}

/// Why nothing can be said, and whether that is for want of time or by nature.
pub(super) struct Unsaid {
    pub call: Call,
    pub reason: String,
}

/// A cone with the states that it begins in.
pub(super) struct World {
    pub plant: Plant,
    pub starts: Vec<Vec<bool>>,
}

/// What looking for something in a world came to.
enum Looked {
    /// It cannot happen.
    Never,
    /// It can: hits, each with its way.
    Hits { found: Box<Explored>, hits: BTreeMap<u32, u32>, ties: BTreeMap<u32, bool>, short: Option<Unsaid> },
}

impl<'a> Prover<'a> {
    pub(super) fn new(scenario: &'a Scenario, program: &'a Program, asked: &'a Asked, budget: Budget) -> Prover<'a> {
        let (proof, collects, evidence) = (Proof::default(), false, Vec::new());
        Prover { scenario, program, asked, budget, left: None, branches: None, proof, collects, evidence }
    }

    pub(super) fn world(&mut self, nets: &[NetId], spans: &[Span]) -> Result<World, Unsaid> {
        let plant = Plant::of(self.scenario, nets, spans)
            .map_err(|what| Unsaid { call: Call::NotCovered, reason: what.to_string() })?;
        self.spend((plant.gates.len() / GATES_A_ZONE) as u64);
        let starts = match self.program.start() {
            Some(start) => vec![plant.nets.iter().map(|net| start.ones.get(net.index())).collect()],
            None if plant.gates.len() > RANDOM_GATES => {
                let reason = format!(
                    "it begins at random with {} gates; every start of up to {RANDOM_GATES} is explored",
                    plant.gates.len()
                );
                return Err(Unsaid { call: Call::NotCovered, reason });
            }
            None => (0..1u64 << plant.gates.len())
                .map(|bits| {
                    let gates = (0..plant.gates.len()).map(|gate| bits >> gate & 1 == 1);
                    plant.initial.iter().copied().chain(gates).collect()
                })
                .collect(),
        };
        Ok(World { plant, starts })
    }

    /// Explores to the end.
    pub(super) fn explore<W: Watch>(&mut self, world: &World, watch: &W, mode: Mode) -> Result<Explored, Unsaid> {
        let (found, short) = self.explore_some(world, watch, mode);
        short.map_or(Ok(found), Err)
    }

    /// Explores as far as the budget goes, and says why no farther.
    pub(super) fn explore_some<W: Watch>(
        &mut self,
        world: &World,
        watch: &W,
        mode: Mode,
    ) -> (Explored, Option<Unsaid>) {
        if let Some(spent) = self.spent() {
            return (Explored::nothing(&world.plant), Some(spent));
        }
        let found = explore(&world.plant, &world.starts, watch, mode, &self.allowance());
        self.proof.zones += found.zones;
        let short = match found.ended {
            Ended::Complete | Ended::Hit => None,
            ended => Some(Unsaid { call: Call::Undecided, reason: self.why(ended) }),
        };
        self.spend(found.zones);
        (found, short)
    }

    /// Does every window of a world come to rest? If not, also after which numbers of steps there may be cycles beside those
    /// that were found.
    pub(super) fn comes_to_rest(&mut self, world: &World) -> (RestVerdict, BTreeSet<u32>) {
        if self.spent().is_some() {
            return (RestVerdict::Undecided(Ended::Zones), BTreeSet::new());
        }
        let looked = comes_to_rest_within(&world.plant, &world.starts, &self.allowance());
        self.proof.zones += looked.zones;
        self.spend(looked.zones);
        (looked.verdict, looked.open)
    }

    /// What the next exploration may keep.
    pub(super) fn allowance(&self) -> Budget {
        Budget { zones: self.left.map_or(self.budget.zones, |left| left.min(self.budget.zones)), ..self.budget.clone() }
    }

    fn spend(&mut self, zones: u64) {
        self.left = self.left.map(|left| left.saturating_sub(zones));
    }

    /// Why nothing more is explored, where all zones are spent.
    pub(super) fn spent(&self) -> Option<Unsaid> {
        let zones = self.proof.allowed.filter(|_| self.left == Some(0))?;
        Some(Unsaid { call: Call::Undecided, reason: format!("the budget of {zones} zones in all ran out") })
    }

    pub(super) fn why(&self, ended: Ended) -> String {
        match ended {
            Ended::Complete | Ended::Hit => "nothing stopped it".to_string(),
            Ended::Zones if self.left.is_some_and(|left| left < self.budget.zones) => {
                format!("the budget of {} zones in all ran out", self.proof.allowed.unwrap_or_default())
            }
            Ended::Zones => format!("the budget of {} zones ran out", self.budget.zones),
            Ended::Bytes => format!("the budget of {} MiB ran out", self.budget.bytes >> 20),
            Ended::Seconds => "the time for the proof ran out".to_string(),
            Ended::Together => "too many gates may fire at one instant".to_string(),
            Ended::InFlight => "too many changes are under way on one wire".to_string(),
            Ended::Cancelled => "interrupted".to_string(),
        }
    }

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

    pub(super) fn claim(&mut self, question: u32, call: Call) -> &mut Claim {
        self.proof.claims.push(Claim::new(question, call));
        self.proof.claims.last_mut().expect("it was just added")
    }

    pub(super) fn unsaid(&mut self, questions: &[u32], unsaid: &Unsaid) {
        for question in questions {
            self.claim(*question, unsaid.call).reason = Some(unsaid.reason.clone());
        }
    }

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
                let edge = |spec: &crate::scenario::EdgeSpec| Edge {
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

    /// A question about whole runs: any hit breaks it.
    fn whole_run<W: Watch>(&mut self, world: &World, watch: &W, goal: &Goal, question: u32) -> Result<(), Unsaid> {
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
                                let here = |_: &Explored, hits: &[u32], _: Option<&super::explored::Rest>| {
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
        let is_bad = |found: &Explored, steps: &Stretch, rest: &super::explored::Rest| {
            steps.contains(&rest.steps)
                && rest.origin <= latest
                && !good(&world.plant, &found.states[rest.state as usize], rest.origin)
        };
        let bad = |found: &Explored, steps: &Stretch| -> Vec<(u32, super::explored::Rest)> {
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
        let values =
            |found: &Explored, rest: super::explored::Rest| (rest.steps, found.states[rest.state as usize].clone());
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
            let here = |found: &Explored, _: &[u32], rest: Option<&super::explored::Rest>| {
                rest.is_some_and(|rest| is_bad(found, steps, rest))
            };
            self.vary(&world, &Nothing, *question, &Goal::Reached, &here);
        }
        Ok(())
    }

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

    /// The gates of the circuit, those tied together by gates in one part.
    pub(super) fn parts(&self) -> Vec<Vec<NetId>> {
        let circuit = &*self.scenario.circuit;
        let mut parts: Vec<Vec<NetId>> = vec![Vec::new(); circuit.block_count()];
        for gate in circuit.gates() {
            parts[circuit.block(gate) as usize].push(circuit.net_of(gate));
        }
        // edges of every clock begin windows of all parts
        for part in &mut parts {
            part.extend(self.scenario.stimulus.clocks.iter().map(|clock| clock.net));
        }
        parts
    }
}

/// A partial state by the numbers of the plant.
fn local(plant: &Plant, state: &Alternative) -> Vec<(u32, bool)> {
    state.iter().filter_map(|(net, value)| plant.local(*net).map(|net| (net, *value))).collect()
}
