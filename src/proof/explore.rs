//! The exploration: every key and zone that some delays in their ranges can lead to.
//!
//! Gates are excited for at least their least and at most their greatest delay (bi-bounded inertial delay; Maler and Pnueli
//! 1995). What is due at one instant may fire together; only sets that no part of could fire first are tried (see
//! `joint.rs`). Judged is what lasts: a state from which time may go on before the next batch.

use std::collections::VecDeque;
use std::time::Instant;

use rustc_hash::FxHashMap;

use super::explored::{Budget, Ended, Explored, Merge, Mode, NOWHERE, Node, Rest};
use super::joint::Joint;
use super::key::{self, Agent, Info, Key, KeyMut, Layout, Mover, Slot, bit, put};
use super::plant::{Plant, PlantPlace};
use super::semantics::{Exact, Semantics};
use super::watch::{Arrival, Block, Fate, Watch};
use super::zone::{self, Matrix};

/// Joins of one zone until what still grows is given up.
const JOINS: u32 = 32;
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
    let mut explorer = Explorer::new(semantics, plant, watch, mode, budget);
    for start in starts {
        explorer.begin(start);
    }
    while explorer.found.ended == Ended::Complete
        && let Some(node) = explorer.open.pop_front()
    {
        explorer.expand(node);
    }
    explorer.found
}

/// The greatest delay of an excited gate.
fn gate_max(plant: &Plant, values: &[u64], gate: usize) -> i64 {
    plant.gates[gate].delay[usize::from(!bit(values, plant.inputs + gate))].max
}

/// What follows from each known key, by its number.
#[derive(Default)]
struct Known {
    /// By hash the last key of that hash; others are told apart word by word.
    last: FxHashMap<u64, u32>,
    /// The key of the same hash before it.
    before: Vec<u32>,
    infos: Vec<Info>,
    /// The nodes of each key that are no part of another.
    nodes: Vec<Vec<u32>>,
    joint: Vec<Joint>,
}

struct Explorer<'a, W, S> {
    semantics: &'a S,
    plant: &'a Plant,
    watch: &'a W,
    mode: Mode,
    budget: &'a Budget,
    layout: Layout,
    known: Known,
    matrices: Vec<zone::Code>,
    open: VecDeque<u32>,
    state_numbers: FxHashMap<Box<[u64]>, u32>,
    found: Explored,
    expanded: u64,
    /// How often zones were joined to that of a node.
    joins: FxHashMap<u32, u32>,
    // working memory
    work: Matrix,
    entry: Matrix,
    lasting: Matrix,
    words: Vec<u64>,
    from: Vec<usize>,
    disabled: Vec<(u32, usize)>,
    hits: Vec<u32>,
}

impl<'a, W: Watch, S: Semantics> Explorer<'a, W, S> {
    fn new(semantics: &'a S, plant: &'a Plant, watch: &'a W, mode: Mode, budget: &'a Budget) -> Self {
        let layout = Layout::of(plant);
        let found = Explored::nothing(plant);
        Explorer {
            semantics,
            plant,
            watch,
            mode,
            budget,
            layout,
            known: Known::default(),
            matrices: Vec::new(),
            open: VecDeque::new(),
            state_numbers: FxHashMap::default(),
            found,
            expanded: 0,
            joins: FxHashMap::default(),
            work: Matrix::default(),
            entry: Matrix::default(),
            lasting: Matrix::default(),
            words: vec![0; layout.len],
            from: Vec::new(),
            disabled: Vec::new(),
            hits: Vec::new(),
        }
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
        let origin = if self.plant.power_up { self.state_number(&values) } else { NOWHERE };
        let mut excited = vec![0; self.plant.gates.len().div_ceil(64)];
        for gate in 0..self.plant.gates.len() {
            put(&mut excited, gate, key::excited(self.plant, &values, gate));
        }
        let mut key = KeyMut { words: &mut self.words, layout: self.layout };
        key.set_watch(watch, false);
        key.set_step(0, origin);
        let number = self.intern(&excited);
        self.entry = Matrix::zero(self.known.infos[number as usize].slots.len());
        self.hits.clear();
        self.arrive(number, u32::MAX, &[]);
    }

    /// The number of the key in `words`.
    fn intern(&mut self, excited: &[u64]) -> u32 {
        let hash = {
            let mut hasher = rustc_hash::FxHasher::default();
            std::hash::Hash::hash(&self.words[..], &mut hasher);
            std::hash::Hasher::finish(&hasher)
        };
        let mut number = self.known.last.get(&hash).copied().unwrap_or(u32::MAX);
        while number != u32::MAX {
            if self.found.key(number).words == &self.words[..] {
                return number;
            }
            number = self.known.before[number as usize];
        }
        let number = self.known.infos.len() as u32;
        let key = Key { words: &self.words, layout: self.layout };
        let info = key::info(self.plant, key, excited.to_vec(), self.watch.clocks(key.watch()));
        if info.agents.len() > 64 {
            self.end(Ended::Together);
        }
        self.found.bytes += (self.layout.len * 8 + info.slots.len() * 48 + 250) as u64;
        self.known.before.push(self.known.last.insert(hash, number).unwrap_or(u32::MAX));
        self.known.infos.push(info);
        self.known.nodes.push(Vec::new());
        self.known.joint.push(Joint::default());
        self.found.keys.extend_from_slice(&self.words);
        number
    }

    fn end(&mut self, why: Ended) {
        if self.found.ended == Ended::Complete {
            self.found.ended = why;
        }
    }

    fn state_number(&mut self, values: &[u64]) -> u32 {
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
        let size = info.slots.len() + 1;
        if info.rest && matches!(self.next_place(key), Some(PlantPlace::Rest(_))) {
            self.try_fire(node, &[]);
            return;
        }
        let reach =
            |agent: &Agent| self.matrices[at + agent.row * size] >= zone::at_most(self.semantics.due(agent.min));
        let able: Vec<usize> = (0..info.agents.len()).filter(|i| reach(&info.agents[*i])).collect();
        let agents: Vec<Agent> = able.iter().map(|i| info.agents[*i]).collect();
        for agent in &agents {
            self.try_fire(node, std::slice::from_ref(agent));
        }
        if !self.mode.joint || able.len() < 2 {
            return;
        }
        let mut joint = std::mem::take(&mut self.known.joint[key as usize]);
        let enabled = able.iter().fold(0u64, |all, i| all | 1 << i);
        let words = self.found.key(key);
        if !joint.prepare(self.plant, words, &mut self.known.infos[key as usize], enabled) {
            self.end(Ended::Together);
        }
        let sets: Vec<u64> = joint.sets().into_iter().filter(|set| set & !enabled == 0).collect();
        self.known.joint[key as usize] = joint;
        for set in sets {
            let all = &self.known.infos[key as usize].agents;
            let agents: Vec<Agent> = (0..all.len()).filter(|i| set >> i & 1 == 1).map(|i| all[i]).collect();
            self.try_fire(node, &agents);
        }
    }

    fn next_place(&self, key: u32) -> Option<PlantPlace> {
        self.plant.steps.get(self.found.key(key).steps()).map(|step| step.place)
    }

    /// Fires agents of a node together, in every way in which steps among them can come. No agents: the step that waited
    /// for rest.
    fn try_fire(&mut self, node: u32, agents: &[Agent]) {
        let key = self.found.nodes[node as usize].key;
        let taken = self.found.key(key).steps();
        let mut movers: Vec<Mover> = Vec::with_capacity(agents.len() + 1);
        let of_step = agents.iter().find(|agent| matches!(agent.mover, Mover::Step(_)));
        if of_step.is_some() {
            // inputs that are late come first
            let late = self.found.key(key).skew();
            movers.extend((0..64).filter(|entry| late >> entry & 1 == 1).map(Mover::Late));
        }
        movers.extend(agents.iter().map(|agent| agent.mover).filter(|mover| !matches!(mover, Mover::Step(_))));
        let numbers = match of_step {
            Some(agent) => vec![agent.steps],
            None if agents.is_empty() => self.plant.at_once(taken),
            None => {
                self.fire(node, agents, &movers, 0);
                return;
            }
        };
        for steps in numbers {
            let steps = steps as usize;
            let before = movers.len();
            movers.extend((1..steps).map(|_| Mover::Step(u64::MAX)));
            for mask in self.first_changes(key, taken, steps) {
                movers.push(Mover::Step(mask));
                self.fire(node, agents, &movers, steps);
                movers.pop();
            }
            movers.truncate(before);
        }
    }

    /// The sets of inputs (a bit an entry) that the last of these steps can change at its very instant.
    fn first_changes(&self, key: u32, taken: usize, steps: usize) -> Vec<u64> {
        let step = &self.plant.steps[taken + steps - 1];
        if step.skew == 0 {
            return vec![u64::MAX];
        }
        let key = self.found.key(key);
        let mut values = key.values().to_vec();
        if let Some(last) = taken.checked_sub(1) {
            for (entry, (net, value)) in self.plant.steps[last].set.iter().enumerate() {
                if entry < 64 && key.skew() >> entry & 1 == 1 {
                    put(&mut values, *net as usize, *value);
                }
            }
        }
        for step in &self.plant.steps[taken..taken + steps - 1] {
            step.set.iter().for_each(|(net, value)| put(&mut values, *net as usize, *value));
        }
        let differs = |(net, value): &(u32, bool)| bit(&values, *net as usize) != *value;
        let changing =
            step.set.iter().enumerate().filter(|(_, entry)| differs(entry)).fold(0u64, |all, (i, _)| all | 1 << i);
        // one that stays as it is may be the first as well
        let none = step.others || changing.count_ones() < step.set.len() as u32;
        let mut parts = Vec::new();
        let mut part = changing;
        while part != 0 {
            parts.push(part);
            part = (part - 1) & changing;
        }
        if none || changing == 0 {
            parts.push(0);
        }
        parts
    }

    /// Fires movers together out of a node, in every way in which the changes that set out on wires can overtake others.
    fn fire(&mut self, node: u32, agents: &[Agent], movers: &[Mover], steps: usize) {
        let plant = self.plant;
        let key = self.found.nodes[node as usize].key;
        self.next_values(key, movers);
        let key = self.found.key(key);
        let mut free: Vec<(u32, u8)> = Vec::new();
        if !plant.wires.is_empty() {
            for (w, wire) in plant.wires.iter().enumerate() {
                let flights = key.flights(w) - u8::from(movers.contains(&Mover::Arrival(w as u32)));
                let changes = bit(key.values(), wire.net as usize) != bit(&self.words, wire.net as usize);
                if changes && flights > 0 && !wire.in_order {
                    free.push((w as u32, flights));
                }
            }
        }
        if free.is_empty() {
            self.fire_so(node, agents, movers, steps);
            return;
        }
        let mut taken = vec![0u8; free.len()];
        loop {
            let mut all = movers.to_vec();
            let overtaken = free.iter().zip(&taken).filter(|(_, number)| **number > 0);
            all.extend(overtaken.map(|((wire, _), number)| Mover::Overtaking(*wire, *number)));
            self.next_values(self.found.nodes[node as usize].key, movers);
            self.fire_so(node, agents, &all, steps);
            let Some(next) = (0..free.len()).find(|at| taken[*at] < free[*at].1) else { return };
            taken[next] += 1;
            taken[..next].fill(0);
        }
    }

    /// The words of a key after some movers, but for what pends, into `words`.
    fn next_values(&mut self, key: u32, movers: &[Mover]) {
        let (plant, layout) = (self.plant, self.layout);
        let key = self.found.key(key);
        let mut taken = key.steps();
        self.words.copy_from_slice(key.words);
        let flip = |words: &mut [u64], signal: usize| {
            let value = !bit(words, signal);
            put(words, signal, value);
        };
        for mover in movers {
            match *mover {
                Mover::Gate(gate) => flip(&mut self.words, plant.inputs + gate as usize),
                Mover::Arrival(wire) => flip(&mut self.words, plant.nets.len() + wire as usize),
                Mover::Overtaking(..) => {}
                Mover::Step(mask) => {
                    let mut waits = 0;
                    for (entry, (net, value)) in plant.steps[taken].set.iter().enumerate() {
                        if mask == u64::MAX || mask >> entry & 1 == 1 {
                            put(&mut self.words, *net as usize, *value);
                        } else if bit(&self.words, *net as usize) != *value {
                            waits |= 1 << entry;
                        }
                    }
                    KeyMut { words: &mut self.words, layout }.set_skew(waits);
                    taken += 1;
                }
                Mover::Late(entry) => {
                    let (net, value) = plant.steps[taken - 1].set[entry as usize];
                    put(&mut self.words, net as usize, value);
                    let left = Key { words: &self.words, layout }.skew() & !(1 << entry);
                    KeyMut { words: &mut self.words, layout }.set_skew(left);
                }
            }
        }
    }

    /// Fires movers together out of a node; `words` has the values after it.
    fn fire_so(&mut self, node: u32, agents: &[Agent], movers: &[Mover], stepping: usize) {
        let (old_key, at) = (self.found.nodes[node as usize].key, self.found.nodes[node as usize].at);
        let (plant, layout) = (self.plant, self.layout);
        let info = &self.known.infos[old_key as usize];
        let size = info.slots.len() + 1;
        self.work.load(size, &self.matrices[at..at + size * size]);
        let key = self.found.key(old_key);
        let steps = key.steps();
        let step = stepping > 0;
        let late = movers.iter().any(|mover| matches!(mover, Mover::Late(_)));
        if agents.is_empty()
            && let PlantPlace::Rest(wait) = plant.steps[steps].place
        {
            self.work.shift(wait);
        }
        for agent in agents {
            let able = match agent.mover {
                Mover::Late(_) => self.work.bound(0, agent.row, self.semantics.later()),
                _ => self.work.at_least(agent.row, self.semantics.due(agent.min)),
            };
            // arrivals on one wire come one after the other
            let apart = match agent.mover {
                Mover::Arrival(wire) if key.apart(wire as usize) => info.row(Slot::Apart(wire)),
                _ => 0,
            };
            if !able || apart > 0 && !self.work.bound(0, apart, self.semantics.later()) {
                return;
            }
        }
        if step {
            // those of one instant come together, and before everything else
            let fired = info.row(Slot::Fired);
            let since = if steps > 0 { info.row(Slot::Since) } else { 0 };
            for row in [fired, since] {
                if row > 0 && !self.work.bound(0, row, self.semantics.later()) {
                    return;
                }
            }
            let start = info.row(Slot::Start);
            for other in &plant.steps[steps + 1..steps + stepping] {
                if let PlantPlace::At(ticks) = other.place
                    && !self.work.at_least(start, ticks.min)
                {
                    return;
                }
            }
        }

        // what is under way
        let mut changed: Vec<u32> = Vec::with_capacity(movers.len());
        for at in 0..layout.values {
            let mut differ = key.words[at] ^ self.words[at];
            while differ != 0 {
                changed.push((64 * at) as u32 + differ.trailing_zeros());
                differ &= differ - 1;
            }
        }
        for (w, wire) in plant.wires.iter().enumerate() {
            let arrives = movers.contains(&Mover::Arrival(w as u32));
            let sets_out = bit(key.values(), wire.net as usize) != bit(&self.words, wire.net as usize);
            let first = u8::from(arrives);
            let mut flights = key.flights(w) - first;
            let due = |place: u8| {
                let row = info.row(Slot::Flight(w as u32, place));
                (row, key::flight_delay(plant, key.values(), w, place))
            };
            let mut apart =
                key.apart(w) && !arrives && self.work.at(0, info.row(Slot::Apart(w as u32))) == zone::AT_MOST_ZERO;
            if arrives && flights > 0 {
                let (row, delay) = due(1);
                apart = self.work.may_reach(row, delay.min);
            }
            if sets_out {
                let over = movers.iter().find_map(|mover| match mover {
                    Mover::Overtaking(wire, over) if *wire == w as u32 => Some(*over),
                    _ => None,
                });
                let over = over.unwrap_or(0);
                let delay = wire.delay[usize::from(bit(&self.words, wire.net as usize))];
                for place in 0..flights {
                    let (row, before) = due(first + place);
                    let able = if place < flights - over {
                        self.work.bound(0, row, zone::below(delay.max - before.min))
                    } else {
                        self.work.bound(row, 0, zone::at_most(before.max - delay.min))
                    };
                    if !able {
                        return;
                    }
                }
                flights = flights - over + u8::from(over.is_multiple_of(2));
            }
            if flights > key::FLIGHTS {
                self.end(Ended::InFlight);
                return;
            }
            KeyMut { words: &mut self.words, layout }.set_flights(w, flights, apart && flights > 0);
        }
        let mut excited = info.excited.clone();
        let mut again = |gate: usize| put(&mut excited, gate, key::excited(plant, &self.words, gate));
        for signal in &changed {
            plant.readers[*signal as usize].iter().for_each(|gate| again(*gate as usize));
            if let Some(gate) = (*signal as usize).checked_sub(plant.inputs).filter(|gate| *gate < plant.gates.len()) {
                again(gate);
            }
        }

        // what is no longer excited was not due yet
        self.disabled.clear();
        for agent in &info.agents {
            if let Mover::Gate(gate) = agent.mover
                && !bit(&excited, gate as usize)
                && !movers.contains(&agent.mover)
            {
                let most = self.semantics.cancelled(gate_max(plant, key.values(), gate as usize));
                if !self.work.bound(agent.row, 0, most) {
                    return;
                }
                self.disabled.push((gate, agent.row));
            }
        }
        // what cools may not be excited again at the instant at which it was disabled
        for (slot, row) in info.slots.iter().zip(1..) {
            if let Slot::Cool(gate) = slot
                && bit(&excited, *gate as usize)
                && !self.work.bound(0, row, self.semantics.later())
            {
                return;
            }
        }
        let due = |agent: &Agent| self.work.may_reach(agent.row, agent.min);
        let could_excite = |gate: u32| {
            info.agents.iter().any(|agent| {
                let reads = |signal: u32| plant.gates[gate as usize].reads.iter().any(|read| read.0 == signal);
                let gone = match agent.mover {
                    Mover::Step(_) => step,
                    mover => movers.contains(&mover),
                };
                !gone
                    && due(agent)
                    && match agent.mover {
                        Mover::Gate(other) => {
                            bit(&excited, other as usize) && reads((plant.inputs + other as usize) as u32)
                        }
                        Mover::Arrival(wire) => reads((plant.nets.len() + wire as usize) as u32),
                        Mover::Overtaking(..) => false,
                        Mover::Step(_) => {
                            let all = &plant.steps[steps..steps + agent.steps as usize];
                            let late = plant.steps[..steps].last().filter(|_| key.skew() != 0);
                            all.iter().chain(late).any(|step| step.set.iter().any(|(net, _)| reads(*net)))
                        }
                        Mover::Late(entry) => reads(plant.steps[steps - 1].set[entry as usize].0),
                    }
            })
        };
        let mut next = KeyMut { words: &mut self.words, layout };
        for (slot, row) in info.slots.iter().zip(1..) {
            if let Slot::Cool(gate) = *slot {
                let still = self.work.at(0, row) == zone::AT_MOST_ZERO;
                let cools = !bit(&excited, gate as usize) && still && could_excite(gate);
                next.set_cools(gate as usize, cools);
            }
        }
        let cools = self.semantics.cools();
        let cooling: Vec<u32> =
            self.disabled.iter().map(|(gate, _)| *gate).filter(|gate| cools && could_excite(*gate)).collect();
        for gate in &cooling {
            next.set_cools(*gate as usize, true);
        }
        // a step that is due comes before what fires at its instant
        let fired = !step && info.agents.iter().any(|agent| matches!(agent.mover, Mover::Step(_)) && due(agent));

        let before = key.values();
        let (watched, origin, rested) = (key.watch(), key.origin(), info.rest);
        let block = Block {
            plant,
            before,
            after: &self.words[..layout.values],
            step: step.then_some(steps),
            steps: stepping,
            rested,
            late,
            disabled: &self.disabled,
            zone: &self.work,
            row: info.watch_row,
        };
        let touches = block.touches();
        self.hits.clear();
        let hits = &mut self.hits;
        let (state, fates) = self.watch.block(watched, &block, &mut |hit| hits.push(hit));
        let new_origin = match (touches, rested) {
            (false, _) => origin,
            (true, false) => NOWHERE,
            (true, true) => {
                let before = before.to_vec();
                self.state_number(&before)
            }
        };
        let mut next = KeyMut { words: &mut self.words, layout };
        next.set_step(steps + stepping, new_origin);
        next.set_watch(state, fired);
        let number = self.intern(&excited);

        // the clocks after it
        let (old, new) = (&self.known.infos[old_key as usize], &self.known.infos[number as usize]);
        let old_words = self.found.key(old_key);
        let remaining = |wire: u32| {
            let first = u8::from(movers.contains(&Mover::Arrival(wire)));
            let over = movers.iter().find_map(|mover| match mover {
                Mover::Overtaking(other, over) if *other == wire => Some(*over),
                _ => None,
            });
            (first, old_words.flights(wire as usize) - over.unwrap_or(0))
        };
        self.from.clear();
        for slot in &new.slots {
            let row = match *slot {
                Slot::Gate(gate) if movers.contains(&Mover::Gate(gate)) => 0,
                Slot::Flight(wire, place) => {
                    let (first, end) = remaining(wire);
                    if first + place < end { old.row(Slot::Flight(wire, first + place)) } else { 0 }
                }
                Slot::Since if step => 0,
                Slot::Fired => 0,
                Slot::Apart(wire) if movers.contains(&Mover::Arrival(wire)) => 0,
                Slot::Cool(gate) if cooling.contains(&gate) => 0,
                Slot::Watch(clock) => match fates[clock as usize] {
                    Fate::Keep(place) => old.row(Slot::Watch(place)),
                    Fate::Begin => 0,
                },
                slot => old.row(slot),
            };
            self.from.push(row);
        }
        self.work.gather(&self.from, &mut self.entry);
        self.arrive(number, node, movers);
    }

    /// A key was arrived at, with the zone in `entry` and the hits of the block.
    fn arrive(&mut self, number: u32, parent: u32, movers: &[Mover]) {
        let info = &self.known.infos[number as usize];
        let key = self.found.key(number);
        let (state, rest, steps, row) = (key.watch(), info.rest, key.steps(), info.watch_row);
        self.lasting.load(self.entry.size, &self.entry.bounds);
        let lasting = info.limits.iter().all(|(row, most)| self.lasting.bound(*row, 0, self.semantics.lasts(*most)));
        if lasting {
            let arrival = Arrival { plant: self.plant, values: key.values(), rest, steps, zone: &self.lasting, row };
            let hits = &mut self.hits;
            self.watch.arrive(state, &arrival, &mut |hit| hits.push(hit));
        }
        let rested = (rest && lasting).then(|| {
            let (values, origin) = (key.values().to_vec(), key.origin());
            (values, origin)
        });
        let rested =
            rested.map(|(values, origin)| Rest { steps: steps as u32, origin, state: self.state_number(&values) });

        // time passes, but for a step that waits for rest
        let mut number = number;
        let waits = rest && matches!(self.plant.steps.get(steps).map(|step| step.place), Some(PlantPlace::Rest(_)));
        let mut goes_on = true;
        if !waits {
            let info = &self.known.infos[number as usize];
            self.entry.elapse(&info.limits);
            let hits = &mut self.hits;
            let (new_state, left) = self.watch.elapsed(state, &mut self.entry, row, &mut |hit| hits.push(hit));
            goes_on = left;
            if left && new_state != state {
                number = self.with_watch(number, new_state);
            }
        }
        let node = match goes_on {
            true => self.keep(number, parent, movers),
            false => None,
        };
        // what was found is kept with a way to it, even if the zone is not
        let first = rested.is_some_and(|rest| !self.found.rests.contains_key(&rest))
            || self.hits.iter().any(|hit| !self.found.hits.contains_key(hit));
        let node = match node {
            None if first => Some(self.push(number, parent, movers, true)),
            node => node,
        };
        if let Some(node) = node {
            if let Some(rest) = rested {
                self.found.rests.entry(rest).or_insert(node);
            }
            for hit in self.hits.drain(..) {
                self.found.hits.entry(hit).or_insert(node);
            }
        }
        if self.mode.first_hit && !self.found.hits.is_empty() {
            self.end(Ended::Hit);
        }
    }

    /// The key with another state of the watch; `entry` gets its clocks.
    fn with_watch(&mut self, number: u32, state: u32) -> u32 {
        self.words.copy_from_slice(self.found.key(number).words);
        let fired = self.found.key(number).fired();
        KeyMut { words: &mut self.words, layout: self.layout }.set_watch(state, fired);
        let excited = self.known.infos[number as usize].excited.clone();
        let other = self.intern(&excited);
        let (old, new) = (&self.known.infos[number as usize], &self.known.infos[other as usize]);
        self.from.clear();
        self.from.extend(new.slots.iter().map(|slot| old.row(*slot)));
        std::mem::swap(&mut self.work, &mut self.entry);
        self.work.gather(&self.from, &mut self.entry);
        other
    }

    /// Keeps the zone in `entry`, unless it is known. Returns its node, if it is a new one.
    fn keep(&mut self, number: u32, parent: u32, movers: &[Mover]) -> Option<u32> {
        let size = self.entry.size * self.entry.size;
        let mut nodes = std::mem::take(&mut self.known.nodes[number as usize]);
        let mut known = None;
        let mut joined = false;
        let next = self.found.nodes.len() as u32;
        nodes.retain(|node| {
            let at = self.found.nodes[*node as usize].at;
            let kept = &mut self.matrices[at..at + size];
            match self.mode.merge {
                _ if known.is_some() => true,
                Merge::Equality => {
                    known = (kept == &self.entry.bounds[..]).then_some(*node);
                    true
                }
                Merge::Inclusion if zone::within(&self.entry.bounds, kept) => {
                    known = Some(*node);
                    true
                }
                Merge::Inclusion if zone::within(kept, &self.entry.bounds) => {
                    self.found.nodes[*node as usize].gone = true;
                    if self.mode.edges {
                        // it leads on as the larger one does, which is the next node
                        self.found.edges.push((*node, next));
                    }
                    false
                }
                Merge::Inclusion => true,
                Merge::Hull => {
                    known = Some(*node);
                    joined = !zone::within(&self.entry.bounds, kept);
                    let often = self.joins.entry(*node).or_insert(0);
                    *often += u32::from(joined);
                    match *often > JOINS {
                        true => zone::widen(kept, &self.entry.bounds),
                        false => zone::hull(kept, &self.entry.bounds),
                    }
                    true
                }
            }
        });
        if let Some(node) = known {
            self.known.nodes[number as usize] = nodes;
            if self.mode.edges && parent != u32::MAX {
                self.found.edges.push((parent, node));
            }
            if joined {
                self.open.push_back(node);
            }
            return None;
        }
        let node = self.push(number, parent, movers, false);
        nodes.push(node);
        self.known.nodes[number as usize] = nodes;
        if self.mode.edges && parent != u32::MAX {
            self.found.edges.push((parent, node));
        }
        self.open.push_back(node);
        self.found.zones += 1;
        if self.found.zones > self.budget.zones {
            self.end(Ended::Zones);
        } else if self.found.bytes > self.budget.bytes {
            self.end(Ended::Bytes);
        }
        Some(node)
    }

    fn push(&mut self, key: u32, parent: u32, movers: &[Mover], gone: bool) -> u32 {
        let first = self.found.movers.len() as u32;
        self.found.movers.extend_from_slice(movers);
        let at = self.matrices.len();
        if !gone {
            self.matrices.extend_from_slice(&self.entry.bounds);
        }
        self.found.bytes += (self.entry.bounds.len() * 8 + movers.len() * 16 + 44) as u64;
        let fired = (first, self.found.movers.len() as u32);
        self.found.nodes.push(Node { key, at, parent, fired, gone });
        self.found.nodes.len() as u32 - 1
    }
}
