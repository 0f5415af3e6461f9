//! Does it take delays that change from one firing to the next? A search over all traces that break a claim.
//!
//! One trace without constant delays shows nothing: others may lead to the same breach. So the exploration is walked once
//! more as a tree, a branch for every order of events, and each beginning of a trace is kept only while one constant delay
//! for each gate, edge and wire fits all its conditions (an exact linear program). Every run with constant delays goes
//! along some branch and meets its conditions, if "below" is read as "at most": where nothing is left, no such run
//! breaks the claim. Two beginnings are one if they demand the same and differ only in the order of events that have nothing
//! to do with each other (traces of Mazurkiewicz 1977).

use std::collections::BTreeSet;
use std::rc::Rc;

use rustc_hash::{FxHashMap, FxHashSet};

use super::claim::{Call, Variation};
use super::explore::explore_heard;
use super::explored::{Budget, Ended, Explored, Fired, Listener, Merge, Mode, Rest};
use super::goals::Goal;
use super::grouped::grouped;
use super::key::{Mover, bit};
use super::plant::{Plant, PlantPlace};
use super::prove::{Prover, World};
use super::simplex::{Program, Solved};
use super::system::{Form, Points, Sense, System, Unknown};
use super::watch::Watch;
use super::witness::{case, one_draw};
use crate::instance::Instance;
use crate::scenario::Vary;

/// Beginnings of traces that are kept for one claim, at most.
const BRANCHES: u64 = 2_000;
/// Of the zones that one exploration may keep (and all of them), one beginning for so many.
pub(super) const ZONES_A_BRANCH: u64 = 4;
/// Conditions in all linear programs for one claim, at most: so many in all, and so many for each zone that one exploration
/// may keep.
const ROWS: u64 = 100_000;
const ROWS_A_ZONE: u64 = 10;
/// Traces to the breach that are looked at for one claim, at most.
const TRACES: u64 = 500;

/// What of an arrival breaks the claim: hits of the watch and a state at rest.
pub(super) type Breaks<'a> = &'a dyn Fn(&Explored, &[u32], Option<&Rest>) -> bool;

/// What a search came to.
enum Searched {
    /// A case that breaks the claim when it is run, with its trace.
    Shown(Box<Shown>),
    /// No constant delays do.
    Never,
    /// Neither.
    Open(String),
}

/// A case with the trace that it goes along.
struct Shown {
    case: Instance,
    system: System,
    trace: Vec<Fired>,
    start: Vec<u64>,
}

/// Constant delays that fit a beginning, by the search's number of the unknown: numerators over one denominator.
struct Fit {
    values: Vec<Option<i128>>,
    denominator: i128,
}

/// Unknowns and forms of all systems of a search, by number.
#[derive(Default)]
struct Names {
    unknowns: FxHashMap<Unknown, u32>,
    forms: FxHashMap<(Vec<(u32, i64)>, i64), u32>,
}

impl Names {
    /// The numbers of a system's unknowns.
    fn of(&mut self, system: &System) -> Vec<u32> {
        let mut number = |unknown: &Unknown| {
            let next = self.unknowns.len() as u32;
            *self.unknowns.entry(*unknown).or_insert(next)
        };
        system.unknowns.iter().map(&mut number).collect()
    }

    /// The number of a form, whatever the order of its system's unknowns.
    fn form(&mut self, unknowns: &[u32], form: &Form) -> u32 {
        let mut terms: Vec<(u32, i64)> = form.terms.iter().map(|(u, factor)| (unknowns[*u], *factor)).collect();
        terms.sort_unstable();
        let next = self.forms.len() as u32;
        *self.forms.entry((terms, form.constant)).or_insert(next)
    }
}

/// What tells kinds of beginnings apart; forms by number.
#[derive(PartialEq, Eq, Hash)]
struct Kind {
    start: Vec<u64>,
    /// Each condition, and how it stands to 0.
    conditions: Vec<(u32, u8)>,
    /// When each signal changed, signal by signal.
    changes: Vec<(u32, u32)>,
    /// When what pends is due.
    pending: Vec<(u32, u32)>,
    /// Blocks whose order counts.
    order: Vec<(Vec<Mover>, Vec<u64>)>,
}

/// The search along one tree.
struct Search<'a, 'p> {
    prover: &'a Prover<'p>,
    world: &'a World,
    goal: &'a Goal,
    question: u32,
    breaks: Breaks<'a>,
    /// Keys from which a breach can be reached; `None` if not known.
    live: Option<FxHashSet<Box<[u64]>>>,
    fits: FxHashMap<u32, Rc<Fit>>,
    dead: FxHashSet<u32>,
    kinds: FxHashMap<Kind, u32>,
    names: Names,
    /// Conditions in all programs, and how many there may be.
    rows: u64,
    most: u64,
    /// Traces to the breach whose conditions up to there have constant delays.
    traces: u64,
    /// Why it shows nothing if it finds nothing.
    open: Option<&'static str>,
    shown: Option<Box<Shown>>,
}

/// Gathers keys that lead to breaches.
struct Goals<'a> {
    breaks: Breaks<'a>,
    nodes: Vec<u32>,
    keys: Vec<u32>,
}

impl Listener for Goals<'_> {
    fn branch(&mut self, _: &Explored, _: u32) -> Option<u32> {
        None
    }

    fn arrived(
        &mut self,
        found: &Explored,
        parent: u32,
        key: u32,
        _: Option<u32>,
        (hits, rest): (&[u32], Option<Rest>),
    ) -> bool {
        if (self.breaks)(found, hits, rest.as_ref()) {
            self.keys.push(key);
            if parent != u32::MAX {
                self.nodes.push(parent);
            }
        }
        false
    }
}

/// The keys from which a breach can be reached, but for the state that their window began in; `None` if not all are known.
fn live<W: Watch>(world: &World, watch: &W, breaks: Breaks<'_>, budget: &Budget) -> Option<FxHashSet<Box<[u64]>>> {
    let mut goals = Goals { breaks, nodes: Vec::new(), keys: Vec::new() };
    let mode = Mode { edges: true, ..Mode::default() };
    let found = explore_heard(&world.plant, &world.starts, watch, mode, budget, &mut goals);
    if found.ended != Ended::Complete {
        return None;
    }
    let mut comes: FxHashMap<Box<[u64]>, BTreeSet<u32>> = FxHashMap::default();
    for (from, to) in &found.edges {
        comes.entry(found.place(*to)).or_default().insert(*from);
    }
    // a node that is kept for what was found there, and not to go on
    for (number, node) in found.nodes.iter().enumerate().filter(|(_, node)| node.parent != u32::MAX) {
        comes.entry(found.place(number as u32)).or_default().insert(node.parent);
    }
    let mut live: FxHashSet<Box<[u64]>> = goals.keys.iter().map(|key| found.key(*key).without_origin()).collect();
    let mut open: Vec<Box<[u64]>> = live.iter().cloned().collect();
    for place in goals.nodes.iter().map(|node| found.place(*node)) {
        if live.insert(place.clone()) {
            open.push(place);
        }
    }
    while let Some(place) = open.pop() {
        for from in comes.get(&place).into_iter().flatten() {
            let place = found.place(*from);
            if live.insert(place.clone()) {
                open.push(place);
            }
        }
    }
    Some(live)
}

/// Does it come from outside?
fn from_outside(mover: &Mover) -> bool {
    mover.moves_inputs() || matches!(mover, Mover::Apart)
}

impl Kind {
    fn of(
        (plant, goal): (&Plant, &Goal),
        (names, unknowns): (&mut Names, &[u32]),
        system: &System,
        start: &[u64],
        trace: &[Fired],
    ) -> Kind {
        // where something may wait for a pattern, or overtake, the whole order counts
        let whole = plant.steps.iter().any(|step| matches!(step.place, PlantPlace::When { .. }))
            || plant.wires.iter().any(|wire| !wire.in_order);
        let nets = goal.nets();
        let mut conditions: Vec<(u32, u8)> =
            system.rows.iter().map(|row| (names.form(unknowns, &row.form), row.sense as u8)).collect();
        conditions.sort_unstable();
        conditions.dedup();
        let mut changes = Vec::new();
        let mut order = Vec::new();
        let mut before = start;
        for (block, time) in trace.iter().zip(&system.times) {
            let time = names.form(unknowns, time);
            let changed = (0..plant.signals()).filter(|signal| bit(before, *signal) != bit(&block.values, *signal));
            changes.extend(changed.map(|signal| (signal as u32, time)));
            let counts = nets.iter().any(|net| bit(before, *net as usize) != bit(&block.values, *net as usize));
            if whole || counts || block.movers.is_empty() || block.movers.iter().any(from_outside) {
                let values = if whole { block.values.clone() } else { Vec::new() };
                let movers = block.movers.iter().filter(|mover| {
                    whole || from_outside(mover) || matches!(mover, Mover::Gate(gate) if nets.contains(&((plant.inputs + *gate as usize) as u32)))
                });
                order.push((movers.copied().collect(), values));
            }
            before = &block.values;
        }
        // signal by signal, each in its order
        changes.sort_by_key(|change| change.0);
        let pending = system.pending.iter().map(|(gate, due)| (*gate, names.form(unknowns, due)));
        Kind { start: start.to_vec(), conditions, changes, pending: pending.collect(), order }
    }
}

impl System {
    /// Values that keep every condition with "below" read as "at most", or `Some(None)` if there are none; `None` if the numbers
    /// grew too large.
    fn fit(&self, numbers: &[u32]) -> Option<Option<Fit>> {
        let mut program = Program { variables: self.unknowns.len(), ..Program::default() };
        let mut known = BTreeSet::new();
        for row in self.rows.iter().filter(|row| known.insert((&row.form.terms, row.form.constant, row.sense as u8))) {
            let base: i64 = row.form.terms.iter().map(|(unknown, factor)| factor * self.ranges[*unknown].min).sum();
            let limit = -row.form.constant - base;
            if row.sense == Sense::Equal {
                let other = row.form.terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
                program.rows.push((other, -limit));
            }
            program.rows.push((row.form.terms.clone(), limit));
        }
        for (unknown, range) in self.ranges.iter().enumerate() {
            program.rows.push((vec![(unknown, 1)], range.max - range.min));
        }
        match program.solve() {
            Solved::Best(best) => {
                let value = |at: usize| best.values[at] + i128::from(self.ranges[at].min) * best.denominator;
                let most = numbers.iter().max().map_or(0, |most| *most as usize + 1);
                let mut values = vec![None; most];
                numbers.iter().enumerate().for_each(|(at, number)| values[*number as usize] = Some(value(at)));
                Some(Some(Fit { values, denominator: best.denominator }))
            }
            Solved::Infeasible => Some(None),
            Solved::Unbounded | Solved::GaveUp => None,
        }
    }

    /// Do these values keep every condition, new unknowns at their least?
    fn keeps(&self, fit: &Fit, numbers: &[u32]) -> Option<Fit> {
        let of = |(number, range): (&u32, &super::plant::Ticks)| {
            let known = fit.values.get(*number as usize).copied().flatten();
            known.unwrap_or(i128::from(range.min) * fit.denominator)
        };
        let own: Vec<i128> = numbers.iter().zip(&self.ranges).map(of).collect();
        let kept = self.rows.iter().all(|row| {
            let sum: i128 = row.form.terms.iter().map(|(u, factor)| own[*u] * i128::from(*factor)).sum();
            let sum = sum + i128::from(row.form.constant) * fit.denominator;
            if row.sense == Sense::Equal { sum == 0 } else { sum <= 0 }
        });
        kept.then(|| {
            let most = numbers.iter().max().map_or(0, |most| *most as usize + 1);
            let mut values = vec![None; most];
            numbers.iter().zip(own).for_each(|(number, value)| values[*number as usize] = Some(value));
            Fit { values, denominator: fit.denominator }
        })
    }
}

impl Goal {
    /// The nets whose changes count for it, by their number in the plant.
    fn nets(&self) -> Vec<u32> {
        match self {
            Goal::Reached => Vec::new(),
            Goal::Late { net, .. } | Goal::Short { net, .. } | Goal::Wide { net, .. } => vec![*net],
            Goal::Close { from, to, .. } | Goal::Open { from, to, .. } => vec![from.net, to.net],
            Goal::Missed { nets, .. } => nets.clone(),
            Goal::Long { pattern, .. } => pattern.iter().map(|entry| entry.0).collect(),
        }
    }

    /// Must every run that goes along this trace and breaks the claim at its end meet one of the ways to the goal?
    fn must(&self, plant: &Plant, start: &[u64], trace: &[Fired]) -> bool {
        let Some(last) = trace.len().checked_sub(1) else { return true };
        let before = |block: usize| block.checked_sub(1).map_or(start, |it| &trace[it].values[..]);
        let changes = |net: u32, block: usize| {
            let (old, new) = (bit(before(block), net as usize), bit(&trace[block].values, net as usize));
            (old != new).then_some(new)
        };
        match self {
            Goal::Reached | Goal::Short { .. } => true,
            // both edges at one instant need no earlier one
            Goal::Close { from, to, .. } => {
                from.net == to.net || !changes(from.net, last).is_some_and(|new| from.kind.is(new))
            }
            Goal::Open { from, to, .. } => from.net != to.net,
            Goal::Long { pattern, .. } => !pattern.iter().all(|(net, value)| bit(start, *net as usize) == *value),
            // the time counts from what changes an input of the cone, and from no idle step
            Goal::Late { .. } => {
                let begin = (0..last).rev().find(|block| trace[*block].movers.iter().any(Mover::moves_inputs));
                begin.is_some_and(|block| {
                    (0..plant.inputs as u32).any(|net| plant.core[net as usize] && changes(net, block).is_some())
                })
            }
            Goal::Wide { .. } | Goal::Missed { .. } => false,
        }
    }
}

impl Search<'_, '_> {
    fn system(&self, start: &[u64], trace: &[Fired]) -> System {
        System::of(&self.world.plant, start, trace, &one_draw(self.prover.scenario, &self.world.plant))
    }

    /// Has a beginning constant delays, as far as is known?
    fn goes(&mut self, found: &Explored, node: u32, system: &System, numbers: &[u32]) -> bool {
        if self.dead.contains(&node) {
            return false;
        }
        if self.fits.contains_key(&node) {
            return true;
        }
        let parent = found.nodes[node as usize].parent;
        let fit = match self.fits.get(&parent).and_then(|fit| system.keeps(fit, numbers)) {
            Some(fit) => Some(fit),
            None => {
                self.rows += (system.rows.len() + system.unknowns.len()) as u64;
                match system.fit(numbers) {
                    Some(Some(fit)) => Some(fit),
                    Some(None) => {
                        self.dead.insert(node);
                        return false;
                    }
                    None => None,
                }
            }
        };
        if let Some(fit) = fit {
            self.fits.insert(node, Rc::new(fit));
        }
        true
    }

    fn spent(&mut self) -> bool {
        if self.rows > self.most {
            self.open = Some("the budget of conditions ran out");
        } else if self.traces > TRACES {
            self.open = Some("the budget of traces ran out");
        }
        self.rows > self.most || self.traces > TRACES
    }

    /// Looks for a case in which a trace breaks the claim.
    fn try_out(&mut self, system: System, trace: Vec<Fired>, start: Vec<u64>) -> bool {
        let (scenario, plant) = (self.prover.scenario, &self.world.plant);
        let ways = self.goal.ways(plant, &system, &start, &trace);
        let must = self.goal.must(plant, &start, &trace);
        self.traces += 1;
        let mut possible = !must;
        for forms in ways {
            let mut system = system.clone();
            forms.into_iter().for_each(|form| system.push(form, Sense::Below));
            self.rows += (system.rows.len() + system.unknowns.len()) as u64;
            match system.solve() {
                Points::Some(point) => {
                    possible = true;
                    let instance = case(scenario, plant, &system, &point, &trace, &start).instance;
                    let fitted = grouped(scenario, plant, &system, instance);
                    if let Some(instance) = fitted.filter(|it| self.prover.shows(it, self.question)) {
                        self.shown = Some(Box::new(Shown { case: instance, system, trace, start }));
                        return true;
                    }
                }
                Points::None => {}
                Points::GaveUp => possible = true,
            }
        }
        if possible {
            self.open = self.open.or(Some("a trace has constant delays, but no run was found that shows it"));
        }
        false
    }
}

impl Listener for Search<'_, '_> {
    fn branch(&mut self, found: &Explored, node: u32) -> Option<u32> {
        if self.spent() || self.live.as_ref().is_some_and(|live| !live.contains(&found.place(node))) {
            return None;
        }
        let (trace, start) = (found.trace(node), found.start(node));
        let system = self.system(&start, &trace);
        let numbers = self.names.of(&system);
        if !self.goes(found, node, &system, &numbers) {
            return None;
        }
        let about = (&self.world.plant, self.goal);
        let kind = Kind::of(about, (&mut self.names, &numbers), &system, &start, &trace);
        let next = self.kinds.len() as u32;
        Some(*self.kinds.entry(kind).or_insert(next))
    }

    fn arrived(
        &mut self,
        found: &Explored,
        _: u32,
        _: u32,
        node: Option<u32>,
        (hits, rest): (&[u32], Option<Rest>),
    ) -> bool {
        if self.spent() || !(self.breaks)(found, hits, rest.as_ref()) {
            return false;
        }
        let Some(node) = node else {
            self.open = Some("a trace was lost");
            return false;
        };
        let (trace, start) = (found.trace(node), found.start(node));
        let system = self.system(&start, &trace);
        let numbers = self.names.of(&system);
        self.goes(found, node, &system, &numbers) && self.try_out(system, trace, start)
    }
}

impl Prover<'_> {
    /// Where the last claim is open, since what breaks it was found, but not with constant delays: looks through all traces.
    pub(super) fn vary<W: Watch>(&mut self, world: &World, watch: &W, question: u32, goal: &Goal, breaks: Breaks<'_>) {
        let Some(claim) = self.proof.claims.last() else { return };
        let open = claim.call == Call::Undecided && claim.variation == Some(Variation::Unknown);
        if !open || claim.question != question {
            return;
        }
        let (ties, before) = (claim.but_for_ties, claim.reason.clone().unwrap_or_default());
        let Some(left) = self.branches else { return };
        if left == 0 {
            let reason = format!("{before}; constant delays are undecided: the budget for all searches ran out");
            self.proof.claims.last_mut().expect("there is one").reason = Some(reason);
            return;
        }
        let budget = self.allowance();
        let early = |clock: &super::outside::PlantClock| clock.first.min < clock.jitter;
        if world.plant.clocks.iter().any(early) {
            return;
        }
        let live = live(world, watch, breaks, &budget);
        // small budgets of zones make small searches; all of them together have a share as well
        let most = ROWS.min(ROWS_A_ZONE * budget.zones);
        let branches = BRANCHES.min(budget.zones / ZONES_A_BRANCH).min(left).max(1);
        let budget = Budget { zones: branches, ..budget };
        let (mut beginnings, mut traces) = (0, 0);
        let mut searched = Searched::Never;
        let mut joint = ties;
        // what takes exactly equal times comes last
        for together in [false, true].into_iter().skip(usize::from(ties)) {
            joint = together;
            let mut search = Search {
                prover: self,
                world,
                goal,
                question,
                breaks,
                live: live.clone(),
                fits: FxHashMap::default(),
                dead: FxHashSet::default(),
                kinds: FxHashMap::default(),
                names: Names::default(),
                rows: 0,
                most,
                traces: 0,
                open: None,
                shown: None,
            };
            let mode = Mode { merge: Merge::Branch, joint: together, ..Mode::default() };
            let found = explore_heard(&world.plant, &world.starts, watch, mode, &budget, &mut search);
            let (shown, open) = (search.shown, search.open);
            (beginnings, traces) = (beginnings + found.zones, search.traces);
            if let Some(shown) = shown {
                searched = Searched::Shown(shown);
                break;
            }
            let short = match found.ended {
                Ended::Complete | Ended::Hit => open.map(str::to_string),
                Ended::Zones => Some(format!("the budget of {} beginnings of traces ran out", budget.zones)),
                ended => Some(self.why(ended)),
            };
            if let Some(short) = short {
                searched = Searched::Open(short);
                break;
            }
        }
        self.branches = Some(left.saturating_sub(beginnings));
        let race = match &searched {
            Searched::Shown(shown) => {
                let shows = |case: &Instance| self.shows(case, question);
                self.deciding(world, &shown.system, (&shown.trace, &shown.start), joint, &shows)
            }
            _ => None,
        };
        let anew = self.scenario.plan.vary == Vary::PerEvent;
        let Some(claim) = self.proof.claims.last_mut() else { return };
        match searched {
            Searched::Shown(shown) => {
                claim.call = Call::Refuted;
                claim.variation = Some(Variation::Constant);
                claim.but_for_ties = joint;
                claim.witness = Some(Box::new(shown.case));
                claim.race = race;
                claim.reason = None;
            }
            Searched::Never => {
                claim.variation = Some(Variation::CycleToCycle);
                let mut reason =
                    "proved for constant delays only: no trace that breaks it has any, it takes delays that \
                                  change from one firing to the next"
                        .to_string();
                if anew {
                    reason += ", as the draws of this scenario do";
                }
                claim.reason = Some(reason);
            }
            Searched::Open(why) => {
                claim.reason = Some(format!(
                    "{before}; constant delays are undecided: {why} ({beginnings} beginnings of traces and {traces} whole \
                     traces tried)"
                ));
            }
        }
    }
}
