//! Following every firing of some nodes that want to change, whatever their delays.
//!
//! A set of nodes that fires at once can be split in two that fire one after the other, unless firing any part of it
//! calms some of the rest. So beside single nodes only sets need firing in which every node reads one of the others and
//! is read by one: the reachable states and the strongly connected sets stay the same.

use rustc_hash::FxHashMap;

use super::GaveUp;
use crate::circuit::strong_components;
use crate::control::Control;
use crate::logic::Bits;

/// Nodes that change one after the other or together, each with a delay of its own.
pub(super) trait Network {
    /// The nodes that a node depends on.
    fn reads(&self, node: u32) -> &[u32];
    /// Its value at the start.
    fn start(&self, node: u32) -> bool;
    /// The loop that it is in.
    fn component(&self, node: u32) -> Option<u32>;
    /// What it wants to be, by the values of the nodes that it reads.
    fn target(&self, node: u32, value: impl Fn(u32) -> bool) -> bool;
}

/// What one exploration may take; more of it gives up.
#[derive(Clone, Copy, Debug)]
pub(super) struct Effort {
    /// States of one part.
    pub states: usize,
    /// Firings looked at in one part.
    pub firings: usize,
    /// Gates of one loop that are excited together.
    pub together: u32,
    /// Outcomes of all parts together.
    pub outcomes: usize,
}

impl Effort {
    /// Enough for what people draw on one sheet; a second or less.
    pub const DEFAULT: Effort = Effort { states: 1 << 16, firings: 1 << 20, together: 12, outcomes: 1 << 10 };
}

/// States between two looks at the cancel flag.
const LOOK: usize = 1 << 10;

/// The outcomes of one part.
pub(super) struct Found {
    /// The reachable stable states, values by place in the part
    pub stable: Vec<Bits>,
    pub cycles: usize,
    /// For each loop the most of its nets that are excited together, up to two; ascending
    excited: Vec<(u32, u32)>,
}

impl Found {
    /// The most nets of a loop that are excited together, up to two.
    pub fn excited_of(&self, component: u32) -> u32 {
        self.excited.binary_search_by_key(&component, |it| it.0).map_or(0, |at| self.excited[at].1)
    }
}

/// Nodes that have something to do with each other, each part ascending. `inside` holds with each node its sources.
pub(super) fn parts_of(network: &impl Network, nodes: usize, inside: &[bool]) -> Vec<Vec<u32>> {
    let mut above: Vec<u32> = (0..nodes as u32).collect();
    let find = |above: &mut [u32], mut node: u32| {
        while above[node as usize] != node {
            above[node as usize] = above[above[node as usize] as usize];
            node = above[node as usize];
        }
        node
    };
    let members = || (0..nodes as u32).filter(|node| inside[*node as usize]);
    for node in members() {
        for source in network.reads(node) {
            let (a, b) = (find(&mut above, node), find(&mut above, *source));
            above[a.max(b) as usize] = a.min(b);
        }
    }
    let mut parts: Vec<Vec<u32>> = Vec::new();
    let mut part_of = FxHashMap::default();
    for node in members() {
        let root = find(&mut above, node);
        let part = *part_of.entry(root).or_insert(parts.len());
        if part == parts.len() {
            parts.push(Vec::new());
        }
        parts[part].push(node);
    }
    parts
}

/// Follows every firing of the nodes of one part from the start. `None`: more than the effort, or more than is `left` of a
/// common budget.
pub(super) fn explore(
    network: &impl Network,
    members: &[u32],
    effort: Effort,
    left: &mut usize,
    control: &Control,
) -> Result<Option<Found>, GaveUp> {
    let n = members.len();
    let place: FxHashMap<u32, u32> = members.iter().enumerate().map(|(i, node)| (*node, i as u32)).collect();
    let mut ties: Vec<Vec<u32>> = vec![Vec::new(); n];
    for (at, node) in members.iter().enumerate() {
        ties[at] = network.reads(*node).iter().map(|source| place[source]).collect();
    }
    let mut states = vec![Bits::of(members.iter().map(|node| network.start(*node)))];
    let mut excited: Vec<Bits> = Vec::new();
    let mut number: FxHashMap<Bits, u32> = FxHashMap::default();
    number.insert(states[0].clone(), 0);
    let mut first_firing = vec![0usize];
    let mut firings: Vec<u32> = Vec::new();
    let mut most: FxHashMap<u32, u32> = FxHashMap::default();
    let mut next = 0;
    while next < states.len() {
        if next.is_multiple_of(LOOK) && control.cancelled() {
            return Err(GaveUp::Cancelled);
        }
        let state = states[next].clone();
        let wants = |at: usize| network.target(members[at], |source| state.get(place[&source] as usize));
        let now = Bits::of((0..n).map(|at| wants(at) != state.get(at)));
        let mut count: FxHashMap<u32, u32> = FxHashMap::default();
        for component in now.ones().filter_map(|at| network.component(members[at])) {
            *count.entry(component).or_insert(0) += 1;
        }
        for (component, count) in count {
            let most = most.entry(component).or_insert(0);
            *most = (*most).max(count.min(2));
        }
        let mut cost = n;
        let Some(sets) = firing_sets(&now, &ties, effort.together, &mut cost) else { return Ok(None) };
        if firings.len() + sets.len() > effort.firings || cost > *left {
            *left = left.saturating_sub(cost);
            return Ok(None);
        }
        *left -= cost;
        for set in &sets {
            let mut to = state.clone();
            set.iter().for_each(|at| to.flip(*at as usize));
            let id = match number.get(&to) {
                Some(id) => *id,
                None => {
                    if states.len() == effort.states {
                        return Ok(None);
                    }
                    let id = states.len() as u32;
                    number.insert(to.clone(), id);
                    states.push(to);
                    id
                }
            };
            firings.push(id);
        }
        excited.push(now);
        first_firing.push(firings.len());
        next += 1;
    }

    let groups = strong_components(states.len(), |state| {
        &firings[first_firing[state as usize]..first_firing[state as usize + 1]]
    });
    let mut stable = Vec::new();
    let mut cycles = 0;
    for group in groups.groups() {
        match group {
            [state] if !excited[*state as usize].any() => stable.push(states[*state as usize].clone()),
            [_] => {}
            group => cycles += usize::from(lasts(group, &states, &excited)),
        }
    }
    let mut excited: Vec<(u32, u32)> = most.into_iter().collect();
    excited.sort_unstable();
    Ok(Some(Found { stable, cycles, excited }))
}

/// Is no gate excited with the same value in all of these states?
fn lasts(group: &[u32], states: &[Bits], excited: &[Bits]) -> bool {
    let words = states[0].words().len();
    (0..words).all(|word| {
        let (mut at_one, mut at_zero) = (u64::MAX, u64::MAX);
        for state in group {
            let (value, excited) = (states[*state as usize].words()[word], excited[*state as usize].words()[word]);
            at_one &= excited & value;
            at_zero &= excited & !value;
        }
        at_one | at_zero == 0
    })
}

/// The sets of excited nodes that need firing: each alone, and those of several of which no part can go first without
/// perhaps calming the rest. `None`: too many are excited together. The sets looked at are added to `cost`.
fn firing_sets(excited: &Bits, ties: &[Vec<u32>], together: u32, cost: &mut usize) -> Option<Vec<Vec<u32>>> {
    let nodes: Vec<u32> = excited.ones().map(|at| at as u32).collect();
    let mut sets: Vec<Vec<u32>> = nodes.iter().map(|node| vec![*node]).collect();
    *cost += sets.len();
    if nodes.len() < 2 {
        return Some(sets);
    }
    let place: FxHashMap<u32, u32> = nodes.iter().enumerate().map(|(i, node)| (*node, i as u32)).collect();
    let tied: Vec<Vec<u32>> = nodes
        .iter()
        .map(|node| ties[*node as usize].iter().filter_map(|source| place.get(source).copied()).collect())
        .collect();
    for group in strong_components(nodes.len(), |node| &tied[node as usize]).groups().filter(|group| group.len() > 1) {
        if group.len() > together as usize {
            return None;
        }
        *cost += 1 << group.len();
        let within: FxHashMap<u32, u32> = group.iter().enumerate().map(|(i, node)| (*node, i as u32)).collect();
        let (mut reads, mut read_by) = (vec![0u32; group.len()], vec![0u32; group.len()]);
        for (reader, node) in group.iter().enumerate() {
            for source in tied[*node as usize].iter().filter_map(|source| within.get(source)) {
                if *source as usize != reader {
                    reads[reader] |= 1 << source;
                    read_by[*source as usize] |= 1 << reader;
                }
            }
        }
        for set in 1u32..1 << group.len() {
            let members = || (0..group.len()).filter(move |at| set >> at & 1 == 1);
            if set.count_ones() > 1 && members().all(|at| reads[at] & set != 0 && read_by[at] & set != 0) {
                sets.push(members().map(|at| nodes[group[at] as usize]).collect());
            }
        }
    }
    Some(sets)
}
