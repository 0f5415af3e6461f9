//! Which movers must be tried together: sets due at one instant of which no part could go first.
//!
//! A set is reducible if some part of it can fire first, at the same instant, such that afterwards every gate of the rest is
//! still excited, and every gate outside that is excited before and after the whole set is excited in between, too (else it
//! would begin anew); a step that is in the set is in that part. Then firing the parts one after the other does the same.
//! Irreducible sets hang together: of any two parts one reads the other, or an excited gate reads both. And each member,
//! fired alone, would disable something: else it could go first (a step apart: only with it can others go).

use std::rc::Rc;

use rustc_hash::{FxHashMap, FxHashSet};

use super::key::{Agent, Info, Key, Mover, bit, excited, put};
use super::outside;
use super::plant::{Plant, PlantStep};

/// Movers of one set, at most.
const TOGETHER: u32 = 8;
/// Sets looked at for one key, at most.
const SETS: usize = 20_000;

/// The irreducible sets of one key that were asked for so far, a bit an agent.
#[derive(Clone, Debug, Default)]
pub(super) struct Joint {
    known: FxHashMap<u64, bool>,
    /// For each mask that was asked for the sets inside it, and whether those are all.
    asked: FxHashMap<u64, (Rc<[u64]>, bool)>,
    /// For each agent the gates (as agents) that are no longer excited once it has fired alone.
    victims: Vec<u64>,
}

impl Joint {
    /// The irreducible sets among the agents of this mask, and whether there may be no more than these.
    pub fn sets(&mut self, plant: &Plant, key: Key<'_>, info: &mut Info, enabled: u64) -> (Rc<[u64]>, bool) {
        if let Some(found) = self.asked.get(&enabled) {
            return found.clone();
        }
        let complete = self.look(plant, key, info, enabled);
        let inside = self.known.iter().filter(|(set, keep)| **keep && **set & !enabled == 0);
        let mut sets: Vec<u64> = inside.map(|(set, _)| *set).collect();
        sets.sort_unstable();
        let found = (Rc::from(sets), complete);
        self.asked.insert(enabled, found.clone());
        found
    }

    /// Looks for those among the agents of this mask. False: there may be more than were looked at.
    fn look(&mut self, plant: &Plant, key: Key<'_>, info: &mut Info, enabled: u64) -> bool {
        if info.near.is_empty() {
            info.near = near(plant, info, key);
        }
        // steps come with or without others at their instant, and with all inputs that are late
        let of = |is: fn(&Agent) -> bool| {
            let all = info.agents.iter().enumerate();
            all.filter(|(_, agent)| is(agent)).fold(0u64, |all, (i, _)| all | 1 << i)
        };
        if self.victims.is_empty() {
            self.victims = (0..info.agents.len()).map(|i| victims(plant, key, info, i)).collect();
        }
        let harmless = |mask: u64| {
            (0..64).filter(|i| mask >> i & 1 == 1 && self.victims[*i] == 0).fold(0u64, |all, i| all | 1 << i)
        };
        let steps = of(|agent| agent.opens());
        let stepping_late = of(|agent| agent.steps > 0);
        let skewed = steps != 0 && plant.steps[key.steps()..].iter().any(PlantStep::moves_on);
        // a step that disables nothing goes first; beside one that does all others may matter
        let stepping = enabled & steps & !if skewed { 0 } else { harmless(enabled & steps) };
        let alone = enabled & !steps & !harmless(enabled & !steps);
        let late = of(|agent| agent.mover.is_late());
        // one input toggles once, for the last time or not
        let twice = |set: u64| {
            let entry = |i: usize| match info.agents[i].mover {
                Mover::Toggle(entry, _) => 1u64 << entry,
                _ => 0,
            };
            let toggles = (0..info.agents.len()).filter(|i| set >> i & 1 == 1).map(entry).filter(|entry| *entry != 0);
            toggles.clone().count() as u32 != toggles.fold(0, |all, entry| all | entry).count_ones()
        };
        let mut complete = true;
        let first = |mask: u64| (0..info.agents.len()).filter(move |i| mask >> i & 1 == 1).map(|i| 1u64 << i);
        let mut open: Vec<u64> = first(alone).chain(first(stepping)).collect();
        let mut seen: FxHashSet<u64> = open.iter().copied().collect();
        while let Some(set) = open.pop() {
            let mut around = 0;
            let mut rest = set;
            while rest != 0 {
                around |= info.near[rest.trailing_zeros() as usize];
                rest &= rest - 1;
            }
            let others = if set & steps != 0 { (enabled & !steps) | (set & steps) } else { alone };
            let mut next = around & others & !set;
            while next != 0 {
                let grown = set | 1 << next.trailing_zeros();
                next &= next - 1;
                if grown & stepping_late != 0 && grown & late != 0 || twice(grown) {
                    continue;
                }
                if !seen.insert(grown) {
                    continue;
                }
                if grown.count_ones() > TOGETHER || seen.len() > SETS {
                    complete = false;
                    continue;
                }
                open.push(grown);
                let victims = &self.victims;
                self.known.entry(grown).or_insert_with(|| is_irreducible(plant, key, info, grown, victims));
            }
        }
        complete
    }
}

/// The signals that an agent changes.
fn signals(plant: &Plant, key: Key<'_>, agent: &Agent) -> Vec<(u32, bool)> {
    let flipped = |signal: usize| vec![(signal as u32, !bit(key.values(), signal))];
    match agent.mover {
        Mover::Gate(gate) => flipped(plant.inputs + gate as usize),
        Mover::Arrival(wire) => flipped(plant.nets.len() + wire as usize),
        Mover::Overtaking(..) | Mover::Apart => Vec::new(),
        Mover::Step(_) | Mover::Edge(_) => {
            let taken = key.steps();
            let edges = outside::numbers(agent.edges).flat_map(|clock| flipped(plant.clocks[clock].net as usize));
            let late = plant.steps[..taken].last().filter(|_| key.skew() != 0 && agent.steps > 0);
            let late = late.into_iter().flat_map(|step| step.set.iter().enumerate());
            let late = late.filter(|(entry, _)| key.skew() >> entry & 1 == 1).map(|(_, set)| *set);
            late.chain(
                plant.steps[taken..taken + agent.steps as usize].iter().flat_map(|step| step.set.iter().copied()),
            )
            .chain(edges)
            .collect()
        }
        Mover::Toggle(entry, _) => flipped(plant.net_set(key.steps(), entry) as usize),
        Mover::Late(entry) => vec![plant.steps[key.steps() - 1].set[entry as usize]],
    }
}

/// For each agent those that it may have to fire together with.
fn near(plant: &Plant, info: &Info, key: Key<'_>) -> Vec<u64> {
    let mut readers: FxHashMap<u32, u64> = FxHashMap::default();
    // who changes something that a gate reads
    for (i, agent) in info.agents.iter().enumerate() {
        for (signal, _) in signals(plant, key, agent) {
            for gate in &plant.readers[signal as usize] {
                *readers.entry(*gate).or_insert(0) |= 1 << i;
            }
        }
    }
    let mut near = vec![0u64; info.agents.len()];
    for (i, agent) in info.agents.iter().enumerate() {
        if let Mover::Gate(gate) = agent.mover {
            // every gate here is excited: it may need those that change what it reads, and they each other
            let movers = readers.get(&gate).copied().unwrap_or(0);
            let all = movers | 1 << i;
            let mut rest = all;
            while rest != 0 {
                near[rest.trailing_zeros() as usize] |= all;
                rest &= rest - 1;
            }
        }
    }
    for (i, mask) in near.iter_mut().enumerate() {
        *mask &= !(1 << i);
    }
    near
}

/// The gates (as agents) that are no longer excited once an agent has fired alone.
fn victims(plant: &Plant, key: Key<'_>, info: &Info, agent: usize) -> u64 {
    let values = after(plant, key, info, 1 << agent);
    let mut victims = 0;
    for (i, other) in info.agents.iter().enumerate() {
        if let Mover::Gate(gate) = other.mover
            && i != agent
            && !excited(plant, &values, gate as usize)
        {
            victims |= 1 << i;
        }
    }
    victims
}

/// Values after some agents have fired.
fn after(plant: &Plant, key: Key<'_>, info: &Info, set: u64) -> Vec<u64> {
    let mut values = key.values().to_vec();
    let mut rest = set;
    while rest != 0 {
        let agent = &info.agents[rest.trailing_zeros() as usize];
        for (signal, value) in signals(plant, key, agent) {
            put(&mut values, signal as usize, value);
        }
        rest &= rest - 1;
    }
    values
}

fn is_irreducible(plant: &Plant, key: Key<'_>, info: &Info, set: u64, victims: &[u64]) -> bool {
    let gates = |mask: u64, inside: bool| {
        info.agents.iter().enumerate().filter_map(move |(i, agent)| match agent.mover {
            Mover::Gate(gate) if (mask >> i & 1 == 1) == inside => Some(gate as usize),
            _ => None,
        })
    };
    let step = (0..info.agents.len()).filter(|i| info.agents[*i].opens());
    let step = step.fold(0u64, |all, i| all | 1 << i) & set;
    // with skew or bounce, a part of the inputs may change: all such sets are tried
    let skewed = |agent: &Agent| plant.steps[key.steps()..][..agent.steps as usize].iter().any(PlantStep::moves_on);
    if step != 0 && skewed(&info.agents[step.trailing_zeros() as usize]) {
        return true;
    }
    let whole = after(plant, key, info, set);
    // gates outside that are excited before and after
    let kept: Vec<usize> = gates(set, false).filter(|gate| excited(plant, &whole, *gate)).collect();
    // one that alone disables neither a member nor a gate that is kept could go first
    let kept_mask = info.agents.iter().enumerate().fold(0u64, |all, (i, agent)| match agent.mover {
        Mover::Gate(gate) if kept.contains(&(gate as usize)) => all | 1 << i,
        _ => all,
    });
    let members = if step == 0 { set } else { step };
    if (0..info.agents.len()).any(|i| members >> i & 1 == 1 && victims[i] & (set | kept_mask) == 0) {
        return false;
    }
    let mut part = (set - 1) & set;
    while part != 0 {
        if part & step == step {
            let between = after(plant, key, info, part);
            let goes = gates(set & !part, true).all(|gate| excited(plant, &between, gate))
                && kept.iter().all(|gate| excited(plant, &between, *gate));
            if goes {
                return false;
            }
        }
        part = (part - 1) & set;
    }
    true
}
