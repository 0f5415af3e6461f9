//! One firing: what it asks of the clocks, what it changes, and which clocks run after it.

use super::explore::Explorer;
use super::explored::{Ended, NOWHERE, SINCE};
use super::key::{self, Agent, Key, KeyMut, Mover, Slot, bit, put};
use super::outside;
use super::passed::Cell;
use super::plant::{Plant, PlantPlace};
use super::semantics::Semantics;
use super::watch::{Block, Fate, Watch};
use super::zone;

/// What fires out of a key.
#[derive(Clone, Copy)]
struct Firing<'m> {
    key: u32,
    movers: &'m [Mover],
    /// Steps taken before it.
    steps: usize,
    /// Steps that are part of it.
    stepping: usize,
    /// Clocks of which an edge is part of it, a bit a clock.
    edges: u32,
}

impl Firing<'_> {
    fn has(&self, mover: Mover) -> bool {
        self.movers.contains(&mover)
    }

    /// Does it begin a window?
    fn opens(&self) -> bool {
        self.stepping > 0 || self.edges != 0
    }

    /// Is what comes from outside as this agent part of it, or was it to come in its place?
    fn replaces(&self, agent: &Agent) -> bool {
        self.stepping > 0 && agent.steps > 0 || self.edges & agent.edges != 0
    }

    /// How many of the changes under way on a wire are overtaken.
    fn overtaken(&self, wire: u32) -> u8 {
        let over = self.movers.iter().find_map(|mover| match mover {
            Mover::Overtaking(other, over) if *other == wire => Some(*over),
            _ => None,
        });
        over.unwrap_or(0)
    }
}

/// The greatest delay of an excited gate.
fn gate_max(plant: &Plant, values: &[u64], gate: usize) -> i64 {
    plant.gates[gate].delay[usize::from(!bit(values, plant.inputs + gate))].max
}

impl<W: Watch, S: Semantics, C: Cell> Explorer<'_, W, S, C> {
    /// Fires movers together out of the zone in `base`; `words` has the values after it.
    pub fn fire_so(&mut self, node: u32, agents: &[Agent], movers: &[Mover], stepping: usize) {
        let key = self.found.nodes[node as usize].key;
        let edges = movers.iter().fold(0, |all, mover| if let Mover::Edge(c) = mover { all | 1 << c } else { all });
        let firing = Firing { key, movers, steps: self.found.key(key).steps(), stepping, edges };
        self.work.load(self.base.size, &self.base.bounds);
        if self.is_due(&firing, agents) && self.set_out(&firing) && self.excite(&firing) && self.is_cool(&firing) {
            self.cool(&firing);
            self.forget_toggles(key, movers);
            let (number, fates) = self.next_key(&firing);
            let moves = firing.opens() || movers.iter().any(Mover::is_late);
            let next = self.found.key(number);
            if self.plant.ends && moves && next.skew() == 0 && !outside::ended(self.plant, next) {
                let last = self.at_end(number);
                self.next_clocks(&firing, last, fates);
                self.arrive(last, node, movers);
            }
            self.next_clocks(&firing, number, fates);
            self.arrive(number, node, movers);
        }
    }

    /// Cuts the zone to where all of it is due. False: nothing is left.
    fn is_due(&mut self, firing: &Firing<'_>, agents: &[Agent]) -> bool {
        let (plant, steps) = (self.plant, firing.steps);
        let info = &self.known.infos[firing.key as usize];
        let held = info.row(Slot::Held);
        if firing.has(Mover::Apart) {
            return self.work.bound(held, 0, zone::AT_MOST_ZERO);
        }
        if held > 0 && !agents.is_empty() && !self.work.bound(0, held, self.semantics.later()) {
            return false;
        }
        if !self.toggles_are_due(firing.key, firing.movers) {
            return false;
        }
        let info = &self.known.infos[firing.key as usize];
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
                Mover::Arrival(wire) if self.found.key(firing.key).apart(wire as usize) => info.row(Slot::Apart(wire)),
                _ => 0,
            };
            if !able || apart > 0 && !self.work.bound(0, apart, self.semantics.later()) {
                return false;
            }
            for clock in outside::numbers(agent.edges) {
                let key = self.found.key(firing.key);
                for (row, ticks) in outside::measures(plant, key, info, clock).into_iter().flatten() {
                    if !self.work.at_least(row, self.semantics.due(ticks.min)) {
                        return false;
                    }
                }
            }
        }
        if firing.opens() {
            // those of one instant come together, and before everything else
            let key = self.found.key(firing.key);
            let fired = info.row(Slot::Fired);
            let since = if steps > 0 { info.row(Slot::Since) } else { 0 };
            let came = (0..plant.clocks.len()).filter(|c| key.edges(*c) > 0);
            let edges = came.map(|c| info.row(Slot::Edge(c as u32)));
            for row in [fired, since].into_iter().chain(edges) {
                if row > 0 && !self.work.bound(0, row, self.semantics.later()) {
                    return false;
                }
            }
        }
        if firing.stepping > 0 {
            let start = info.row(Slot::Start);
            for other in &plant.steps[steps + 1..steps + firing.stepping] {
                if let PlantPlace::At(ticks) = other.place
                    && !self.work.at_least(start, ticks.min)
                {
                    return false;
                }
            }
        }
        true
    }

    /// What is under way on wires after it. False: nothing is left.
    fn set_out(&mut self, firing: &Firing<'_>) -> bool {
        let (plant, layout) = (self.plant, self.layout);
        let info = &self.known.infos[firing.key as usize];
        let key = self.found.key(firing.key);
        for (w, wire) in plant.wires.iter().enumerate() {
            let arrives = firing.has(Mover::Arrival(w as u32));
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
                let over = firing.overtaken(w as u32);
                let delay = wire.delay[usize::from(bit(&self.words, wire.net as usize))];
                for place in 0..flights {
                    let (row, before) = due(first + place);
                    let able = if place < flights - over {
                        self.work.bound(0, row, zone::below(delay.max - before.min))
                    } else {
                        self.work.bound(row, 0, zone::at_most(before.max - delay.min))
                    };
                    if !able {
                        return false;
                    }
                }
                flights = flights - over + u8::from(over.is_multiple_of(2));
            }
            if flights > key::FLIGHTS {
                self.end(Ended::InFlight);
                return false;
            }
            KeyMut { words: &mut self.words, layout }.set_flights(w, flights, apart && flights > 0);
        }
        true
    }

    /// The gates that are excited after it; those that no longer are were not due yet. False: nothing is left.
    fn excite(&mut self, firing: &Firing<'_>) -> bool {
        let plant = self.plant;
        let info = &self.known.infos[firing.key as usize];
        let key = self.found.key(firing.key);
        self.excited.clone_from(&info.excited);
        let (excited, words) = (&mut self.excited, &self.words);
        let mut again = |gate: usize| put(excited, gate, key::excited(plant, words, gate));
        for (at, (before, after)) in key.values().iter().zip(words).enumerate() {
            let mut differ = before ^ after;
            while differ != 0 {
                let signal = 64 * at + differ.trailing_zeros() as usize;
                differ &= differ - 1;
                plant.readers[signal].iter().for_each(|gate| again(*gate as usize));
                if let Some(gate) = signal.checked_sub(plant.inputs).filter(|gate| *gate < plant.gates.len()) {
                    again(gate);
                }
            }
        }
        self.disabled.clear();
        for agent in &info.agents {
            if let Mover::Gate(gate) = agent.mover
                && !bit(&self.excited, gate as usize)
                && !firing.has(agent.mover)
            {
                let most = self.semantics.cancelled(gate_max(plant, key.values(), gate as usize));
                if !self.work.bound(agent.row, 0, most) {
                    return false;
                }
                self.disabled.push((gate, agent.row));
            }
        }
        true
    }

    /// What cools may not be excited again at the instant at which it was disabled. False: nothing is left.
    fn is_cool(&mut self, firing: &Firing<'_>) -> bool {
        if !self.found.key(firing.key).any_cools() {
            return true;
        }
        for (slot, row) in self.known.infos[firing.key as usize].slots.iter().zip(1..) {
            if let Slot::Cool(gate) = slot
                && bit(&self.excited, *gate as usize)
                && !self.work.bound(0, row, self.semantics.later())
            {
                return false;
            }
        }
        true
    }

    /// Could something else that is due excite this gate again at the instant of the firing?
    fn could_excite(&self, firing: &Firing<'_>, gate: u32) -> bool {
        let (plant, steps) = (self.plant, firing.steps);
        let key = self.found.key(firing.key);
        let reads = |signal: u32| plant.gates[gate as usize].reads.iter().any(|read| read.0 == signal);
        self.known.infos[firing.key as usize].agents.iter().any(|agent| {
            let gone = match agent.mover {
                _ if agent.opens() => firing.replaces(agent),
                Mover::Toggle(entry, _) => {
                    firing.has(Mover::Toggle(entry, false)) || firing.has(Mover::Toggle(entry, true))
                }
                mover => firing.has(mover),
            };
            !gone
                && self.work.may_reach(agent.row, agent.min)
                && match agent.mover {
                    Mover::Gate(other) => {
                        bit(&self.excited, other as usize) && reads((plant.inputs + other as usize) as u32)
                    }
                    Mover::Arrival(wire) => reads((plant.nets.len() + wire as usize) as u32),
                    Mover::Overtaking(..) | Mover::Apart => false,
                    Mover::Edge(_) => outside::numbers(agent.edges).any(|c| reads(plant.clocks[c].net)),
                    Mover::Step(_) => {
                        let edges = outside::numbers(agent.edges).any(|c| reads(plant.clocks[c].net));
                        let all = &plant.steps[steps..steps + agent.steps as usize];
                        let late = plant.steps[..steps].last().filter(|_| key.skew() != 0);
                        edges || all.iter().chain(late).any(|step| step.set.iter().any(|(net, _)| reads(*net)))
                    }
                    Mover::Late(entry) | Mover::Toggle(entry, _) => reads(plant.net_set(steps, entry)),
                }
        })
    }

    /// Which gates cool after it: those that were disabled at this very instant, as long as that can matter.
    fn cool(&mut self, firing: &Firing<'_>) {
        let layout = self.layout;
        let mut cooling = std::mem::take(&mut self.cooling);
        cooling.clear();
        if self.found.key(firing.key).any_cools() {
            for row in 1..self.work.size {
                let Slot::Cool(gate) = self.known.infos[firing.key as usize].slots[row - 1] else { continue };
                let still = self.work.at(0, row) == zone::AT_MOST_ZERO;
                let cools = !bit(&self.excited, gate as usize) && still && self.could_excite(firing, gate);
                KeyMut { words: &mut self.words, layout }.set_cools(gate as usize, cools);
            }
        }
        if self.semantics.cools() {
            cooling.extend(self.disabled.iter().map(|it| it.0).filter(|gate| self.could_excite(firing, *gate)));
        }
        for gate in &cooling {
            KeyMut { words: &mut self.words, layout }.set_cools(*gate as usize, true);
        }
        self.cooling = cooling;
    }

    /// The key after it, and where the clocks of the watch come from.
    fn next_key(&mut self, firing: &Firing<'_>) -> (u32, [Fate; 2]) {
        let (plant, layout) = (self.plant, self.layout);
        let info = &self.known.infos[firing.key as usize];
        let key = self.found.key(firing.key);
        let step = firing.stepping > 0;
        let came = key.came() && !step;
        // a step or edge that is due comes before what fires at its instant, or together with others
        let due = |agent: &Agent| agent.opens() && !firing.replaces(agent) && self.work.may_reach(agent.row, agent.min);
        let fired = info.agents.iter().any(due);
        self.opens.clear();
        self.opens.extend((firing.steps..firing.steps + firing.stepping).map(|step| step as u32 + 1));
        // clocks that only a pattern knows begin no window of what is asked about
        let edges = outside::numbers(firing.edges).filter(|c| plant.core[plant.clocks[*c].net as usize]);
        self.opens.extend(edges.map(|c| plant.clocks[c].base + key.edges(c)));
        let window = match self.opens.as_slice() {
            [] => key.window(),
            [.., last] if plant.clocks.is_empty() => *last,
            [one] => *one,
            [first, ..] => plant.windows + first,
        };
        let edges: Vec<(usize, u32)> = outside::numbers(firing.edges).map(|c| (c, key.edges(c) + 1)).collect();
        let pending = Key { words: &self.words, layout }.skew();
        let block = Block {
            plant,
            before: key.values(),
            after: &self.words[..layout.values],
            step: step.then_some(firing.steps),
            steps: firing.stepping,
            opens: &self.opens,
            rested: info.core_rest,
            late: plant.moves_late(firing.steps, firing.movers),
            moving: plant.is_moving(firing.steps + firing.stepping, pending),
            disabled: &self.disabled,
            zone: &self.work,
            row: info.watch_row,
        };
        let (touches, rested) = (block.touches(), info.core_rest);
        self.hits.clear();
        let hits = &mut self.hits;
        let (state, fates) = self.watch.block(key.watch(), &block, &mut |hit| hits.push(hit));
        let origin = match (touches, rested) {
            (false, true) if step && key.origin() == NOWHERE => SINCE,
            (false, _) => key.origin(),
            (true, false) => NOWHERE,
            (true, true) => {
                let before = key.values().to_vec();
                self.state_number(&before)
            }
        };
        let mut next = KeyMut { words: &mut self.words, layout };
        next.set_pattern(came, firing.has(Mover::Apart));
        next.set_step(firing.steps + firing.stepping, origin);
        next.set_watch(state, fired);
        next.set_window(window);
        edges.into_iter().for_each(|(clock, edges)| next.set_edges(clock, edges));
        (self.intern(), fates)
    }

    /// The clocks after it, into `entry`.
    fn next_clocks(&mut self, firing: &Firing<'_>, number: u32, fates: [Fate; 2]) {
        let (old, new) = (&self.known.infos[firing.key as usize], &self.known.infos[number as usize]);
        let key: Key<'_> = self.found.key(firing.key);
        self.from.clear();
        let mut last = 0;
        for slot in &new.slots {
            let from = match *slot {
                Slot::Gate(gate) if firing.has(Mover::Gate(gate)) => None,
                Slot::Flight(wire, place) => {
                    let first = u8::from(firing.has(Mover::Arrival(wire)));
                    let end = key.flights(wire as usize) - firing.overtaken(wire);
                    (first + place < end).then_some(Slot::Flight(wire, first + place))
                }
                Slot::Since if firing.stepping > 0 => None,
                Slot::Edge(clock) if firing.edges >> clock & 1 == 1 => None,
                // the edge that was the last is the one before it now
                Slot::Cycle(clock) if firing.edges >> clock & 1 == 1 => Some(Slot::Edge(clock)),
                Slot::Fired | Slot::Held => None,
                Slot::Apart(wire) if firing.has(Mover::Arrival(wire)) => None,
                Slot::Toggled(entry) if firing.has(Mover::Toggle(entry, false)) => None,
                Slot::Cool(gate) if self.cooling.contains(&gate) => None,
                Slot::Watch(clock) => match fates[clock as usize] {
                    Fate::Keep(place) => Some(Slot::Watch(place)),
                    Fate::Begin => None,
                },
                slot => Some(slot),
            };
            let row = from.map_or(0, |slot| old.row_after(slot, last));
            last = last.max(row);
            self.from.push(row);
        }
        self.work.gather(&self.from, &mut self.entry);
    }
}
