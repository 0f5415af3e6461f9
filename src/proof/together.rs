//! What can fire at one instant: in which ways a step, late inputs, and changes that overtake others can be part of it.

use super::bounce::Begins;
use super::explore::Explorer;
use super::key::{Agent, Key, KeyMut, Mover, bit, put};
use super::outside;
use super::passed::Cell;
use super::semantics::Semantics;
use super::watch::Watch;

impl<W: Watch, S: Semantics, C: Cell> Explorer<'_, W, S, C> {
    /// Fires agents of a node together, in every way in which steps among them can come. No agents: the step that waited
    /// for rest.
    pub fn try_fire(&mut self, node: u32, agents: &[Agent]) {
        let key = self.found.nodes[node as usize].key;
        if let [Agent { mover: mover @ (Mover::Gate(_) | Mover::Late(_) | Mover::Toggle(..)), .. }] = agents {
            self.fire(node, agents, &[*mover], 0);
            return;
        }
        let taken = self.found.key(key).steps();
        let mut movers: Vec<Mover> = Vec::with_capacity(agents.len() + 1);
        let opening = agents.iter().find(|agent| agent.opens());
        let of_step = opening.filter(|agent| agent.steps > 0);
        if of_step.is_some() {
            // inputs that are late come first; of those that bounce the last toggle
            let late = self.found.key(key).skew();
            let bounces = taken > 0 && self.plant.steps[taken - 1].bounce.is_some();
            let mover = |entry| if bounces { Mover::Toggle(entry, true) } else { Mover::Late(entry) };
            movers.extend((0..64).filter(|entry| late >> entry & 1 == 1).map(mover));
        }
        if agents.first().is_some_and(|agent| agent.row == 0) {
            movers.push(Mover::Apart);
        }
        movers.extend(agents.iter().filter(|agent| !agent.opens()).map(|agent| agent.mover));
        let edges = opening.map_or(0, |agent| agent.edges);
        movers.extend(outside::numbers(edges).map(|clock| Mover::Edge(clock as u32)));
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
        if let Some(bounce) = step.bounce {
            return step.beginnings(bounce);
        }
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
        let mut taken = self.found.key(key).steps();
        self.words.copy_from_slice(self.found.key(key).words);
        let flip = |words: &mut [u64], signal: usize| {
            let value = !bit(words, signal);
            put(words, signal, value);
        };
        for mover in movers {
            match *mover {
                Mover::Gate(gate) => flip(&mut self.words, plant.inputs + gate as usize),
                Mover::Arrival(wire) => flip(&mut self.words, plant.nets.len() + wire as usize),
                Mover::Overtaking(..) | Mover::Apart => {}
                Mover::Edge(clock) => flip(&mut self.words, plant.clocks[clock as usize].net as usize),
                Mover::Step(mask) => {
                    if let Some(bounce) = plant.steps[taken].bounce {
                        self.begin_bounce(taken, bounce, Begins(mask));
                        taken += 1;
                        continue;
                    }
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
                Mover::Toggle(entry, last) => self.toggle(taken, entry, last),
                Mover::Late(entry) => {
                    let (net, value) = plant.steps[taken - 1].set[entry as usize];
                    put(&mut self.words, net as usize, value);
                    let left = Key { words: &self.words, layout }.skew() & !(1 << entry);
                    KeyMut { words: &mut self.words, layout }.set_skew(left);
                }
            }
        }
    }
}
