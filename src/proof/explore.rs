//! The exploration: every key and zone that some delays in their ranges can lead to.
//!
//! Gates are excited for at least their least and at most their greatest delay (bi-bounded inertial delay; Maler and Pnueli
//! 1995). What is due at one instant may fire together; only sets that no part of could fire first are tried (see
//! `joint.rs`). Judged is what lasts: a state from which time may go on before the next batch.

use std::collections::VecDeque;
use std::time::Instant;

use rustc_hash::FxHashMap;

use super::explored::{Budget, Ended, Explored, Listener, Merge, Mode, Node, START};
use super::key::{self, Agent, KeyMut, Layout, Mover, put};
use super::known::Known;
use super::outside;
use super::passed::{Bounds, Cell};
use super::plant::{Plant, PlantPlace};
use super::semantics::{Exact, Semantics};
use super::watch::Watch;
use super::zone::{self, Matrix};

/// Zones looked at, for each that may be kept: those that are joined are looked at again.
const EXPANDED: u64 = 8;

/// Explores a plant from start states (values of inputs and gates; wires have those of their nets).
pub fn explore<W: Watch>(plant: &Plant, starts: &[Vec<bool>], watch: &W, mode: Mode, budget: &Budget) -> Explored {
    explore_under(&Exact, plant, starts, watch, mode, budget)
}

/// Explores a plant under given rules.
pub fn explore_under<W: Watch, S: Semantics>(
    semantics: &S,
    plant: &Plant,
    starts: &[Vec<bool>],
    watch: &W,
    mode: Mode,
    budget: &Budget,
) -> Explored {
    // bounds are kept in 32 bits as long as all of them fit
    let narrow = explore_in::<W, S, i32>(semantics, plant, starts, watch, mode, budget, None);
    match narrow {
        Some(found) => found,
        None => explore_in::<W, S, i64>(semantics, plant, starts, watch, mode, budget, None)
            .expect("every bound fits where it is worked on"),
    }
}

/// Explores a plant while a listener hears of everything that is come by.
pub(super) fn explore_heard<W: Watch>(
    plant: &Plant,
    starts: &[Vec<bool>],
    watch: &W,
    mode: Mode,
    budget: &Budget,
    listener: &mut dyn Listener,
) -> Explored {
    explore_in::<W, Exact, i64>(&Exact, plant, starts, watch, mode, budget, Some(listener))
        .expect("every bound fits where it is worked on")
}

/// Explores with bounds kept as wide as `C`. `None`: one of them did not fit.
fn explore_in<'a, W: Watch, S: Semantics, C: Cell>(
    semantics: &'a S,
    plant: &'a Plant,
    starts: &[Vec<bool>],
    watch: &'a W,
    mode: Mode,
    budget: &'a Budget,
    listener: Option<&'a mut (dyn Listener + 'a)>,
) -> Option<Explored> {
    let mut explorer = Explorer::<W, S, C>::new(semantics, plant, watch, mode, budget);
    explorer.listener = listener;
    for start in starts {
        explorer.begin(start);
    }
    while explorer.found.ended == Ended::Complete
        && explorer.fits
        && let Some(node) = explorer.next()
    {
        explorer.expand(node);
    }
    explorer.fits.then_some(explorer.found)
}

/// An exploration under way.
pub(super) struct Explorer<'a, W, S, C> {
    pub semantics: &'a S,
    pub plant: &'a Plant,
    pub watch: &'a W,
    pub mode: Mode,
    pub budget: &'a Budget,
    pub layout: Layout,
    pub known: Known,
    pub kept: Bounds<C>,
    /// Nodes to expand, first first.
    pub open: VecDeque<u32>,
    pub state_numbers: FxHashMap<Box<[u64]>, u32>,
    pub found: Explored,
    /// Hears of what is come by.
    pub listener: Option<&'a mut dyn Listener>,
    /// The kind of each branch, by node.
    pub kinds: FxHashMap<u32, u32>,
    /// Did all bounds fit so far?
    pub fits: bool,
    expanded: u64,
    /// How often zones were joined to that of a node.
    pub joins: FxHashMap<u32, u32>,
    /// Were bounds given up in joining?
    pub widened: bool,
    /// The zone that is expanded.
    pub base: Matrix,
    // working memory
    pub work: Matrix,
    pub entry: Matrix,
    pub lasting: Matrix,
    pub words: Vec<u64>,
    pub excited: Vec<u64>,
    pub cooling: Vec<u32>,
    pub from: Vec<usize>,
    pub disabled: Vec<(u32, usize)>,
    pub opens: Vec<u32>,
    pub hits: Vec<u32>,
}

impl<'a, W: Watch, S: Semantics, C: Cell> Explorer<'a, W, S, C> {
    fn new(semantics: &'a S, plant: &'a Plant, watch: &'a W, mode: Mode, budget: &'a Budget) -> Self {
        let layout = Layout::of(plant);
        let most = plant.gates.iter().flat_map(|gate| gate.delay).map(|delay| delay.max).max().unwrap_or(0);
        Explorer {
            semantics,
            plant,
            watch,
            mode,
            budget,
            layout,
            known: Known::default(),
            kept: Bounds::new(most),
            open: VecDeque::new(),
            state_numbers: FxHashMap::default(),
            found: Explored::nothing(plant),
            listener: None,
            kinds: FxHashMap::default(),
            fits: true,
            expanded: 0,
            joins: FxHashMap::default(),
            widened: false,
            base: Matrix::default(),
            work: Matrix::default(),
            entry: Matrix::default(),
            lasting: Matrix::default(),
            words: vec![0; layout.len],
            excited: vec![0; plant.gates.len().div_ceil(64)],
            cooling: Vec::new(),
            from: Vec::new(),
            disabled: Vec::new(),
            opens: Vec::new(),
            hits: Vec::new(),
        }
    }

    /// The next node to expand.
    fn next(&mut self) -> Option<u32> {
        if self.mode.merge == Merge::Branch { self.open.pop_back() } else { self.open.pop_front() }
    }

    /// Begins in a state, every clock at 0.
    fn begin(&mut self, start: &[bool]) {
        self.words.fill(0);
        for (net, value) in start.iter().enumerate() {
            put(&mut self.words, net, *value);
        }
        for (w, wire) in self.plant.wires.iter().enumerate() {
            put(&mut self.words, self.plant.nets.len() + w, start[wire.net as usize]);
        }
        let values = self.words[..self.layout.values].to_vec();
        let watch = self.watch.start(self.plant, &values);
        let origin = if self.plant.power_up { self.state_number(&values) } else { START };
        for gate in 0..self.plant.gates.len() {
            put(&mut self.excited, gate, key::excited(self.plant, &values, gate));
        }
        let mut key = KeyMut { words: &mut self.words, layout: self.layout };
        key.set_watch(watch, false);
        key.set_step(0, origin);
        let number = self.intern();
        self.entry = Matrix::zero(self.known.infos[number as usize].slots.len());
        self.hits.clear();
        self.arrive(number, u32::MAX, &[]);
        if self.plant.ends && !outside::ended(self.plant, self.found.key(number)) {
            let number = self.at_end(number);
            self.entry = Matrix::zero(self.known.infos[number as usize].slots.len());
            self.arrive(number, u32::MAX, &[]);
        }
    }

    /// The number of the key in `words`, with the gates in `excited`.
    pub fn intern(&mut self) -> u32 {
        let (number, new) =
            self.known.number(self.plant, self.watch, self.semantics, &self.words, &self.excited, &mut self.found);
        if new && self.known.infos[number as usize].agents.len() > 64 {
            self.end(Ended::Together);
        }
        number
    }

    /// The key with nothing to come from outside.
    pub fn at_end(&mut self, number: u32) -> u32 {
        self.words.copy_from_slice(self.found.key(number).words);
        let origin = self.found.key(number).origin();
        self.excited.clone_from(&self.known.infos[number as usize].excited);
        let held = self.found.key(number).held();
        let mut key = KeyMut { words: &mut self.words, layout: self.layout };
        key.set_pattern(false, held);
        key.set_step(self.plant.steps.len(), origin);
        self.plant.clocks.iter().enumerate().for_each(|(c, clock)| key.set_edges(c, clock.edges));
        self.intern()
    }

    /// Ends the exploration, unless something else has.
    pub fn end(&mut self, why: Ended) {
        if self.found.ended == Ended::Complete {
            self.found.ended = why;
        }
    }

    /// The number of a state at rest.
    pub fn state_number(&mut self, values: &[u64]) -> u32 {
        if let Some(number) = self.state_numbers.get(values) {
            return *number;
        }
        let number = self.found.states.len() as u32;
        self.found.states.push(values.into());
        self.state_numbers.insert(values.into(), number);
        number
    }

    /// Tries everything that can come next.
    fn expand(&mut self, node: u32) {
        let Node { key, at, gone, .. } = self.found.nodes[node as usize];
        if gone {
            return;
        }
        self.expanded += 1;
        if self.expanded > self.budget.zones.saturating_mul(EXPANDED) {
            self.end(Ended::Zones);
        }
        if self.expanded & 0xFFF == 0 {
            if self.budget.control.cancelled() {
                self.end(Ended::Cancelled);
            } else if self.budget.until.is_some_and(|until| Instant::now() > until) {
                self.end(Ended::Seconds);
            }
        }
        let info = &self.known.infos[key as usize];
        self.kept.load(at, info.slots.len() + 1, &mut self.base);
        if info.rest
            && matches!(self.next_place(key), Some(PlantPlace::Rest(_)))
            && self.found.key(key).clocks_over(self.plant)
        {
            self.try_fire(node, &[]);
            return;
        }
        let it = self.found.key(key);
        if it.came()
            && it.held()
            && let Some(PlantPlace::When { wait, .. }) = self.next_place(key)
            && wait.min == 0
            && self.semantics.follows()
        {
            for steps in self.plant.at_once(it.steps()) {
                // row 0 stands for "at this very instant"
                self.try_fire(node, &[Agent { mover: Mover::Step(u64::MAX), row: 0, min: 0, steps, edges: 0 }]);
            }
        }
        let mut enabled = 0u64;
        let mut at = 0;
        while let Some(agent) = self.known.infos[key as usize].agents.get(at).copied() {
            if at < 64 && self.base.at(agent.row, 0) >= zone::at_most(self.semantics.due(agent.min)) {
                enabled |= 1 << at;
                self.try_fire(node, &[agent]);
            }
            at += 1;
        }
        if !self.mode.joint || enabled.count_ones() < 2 {
            return;
        }
        let (info, joint) = (&mut self.known.infos[key as usize], &mut self.known.joint[key as usize]);
        let (sets, complete) = joint.sets(self.plant, self.found.key(key), info, enabled);
        if !complete {
            self.end(Ended::Together);
        }
        for set in sets.iter() {
            let all = &self.known.infos[key as usize].agents;
            let agents: Vec<Agent> = (0..all.len()).filter(|i| set >> i & 1 == 1).map(|i| all[i]).collect();
            self.try_fire(node, &agents);
        }
    }

    fn next_place(&self, key: u32) -> Option<PlantPlace> {
        self.plant.steps.get(self.found.key(key).steps()).map(|step| step.place)
    }
}
