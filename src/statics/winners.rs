//! The general multiple-winner method (Brzozowski & Yoeli 1979; Brzozowski & Seger, "Asynchronous Circuits", Springer
//! 1995, chapters 6 and 7): of the excited gates any non-empty set may change at once, again and again. The outcomes are
//! the stable states that can be reached, and the cycles in which the circuit may stay for ever.
//!
//! A cycle is a strongly connected set of at least two states. It is transient, and no outcome, when some gate is excited
//! with the same value in every state of it: gates have finite delays, so the gate fires. A set that is part of a
//! transient one is transient as well, so only the greatest strongly connected sets need looking at.
//!
//! Three things keep it small, and exact:
//! * Only nets that ternary simulation leaves at X can move; the others are constants, and a gate depends on what its
//!   function with these constants depends on.
//! * Gates that nothing cyclic hangs on follow in the end: what loops do does not depend on them, and beside a lasting
//!   cycle they add no second one (each is free to toggle, or pinned).
//! * Of what is left, parts that have nothing to do with each other are explored apart: every combination of their
//!   outcomes can be reached, and only those.
//!
//! A set of gates that fires at once can be split in two that fire one after the other, unless firing any part of it
//! calms some of the rest. So beside single gates only sets need firing in which every gate reads one of the others and
//! is read by one: the reachable states and the strongly connected sets stay the same.

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::change::Change;
use super::outcome::{Outcome, Race};
use crate::circuit::{Circuit, Compiled, GateId, NetId, strong_components};
use crate::control::Control;
use crate::logic::{Bits, State, Value};

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

/// The outcomes of a change, or `None` where they take more than the effort, or more than is `left` of a common budget:
/// gates evaluated and firings followed are taken from it. `spread` is the first half of ternary simulation: the nets that
/// may move are at X.
pub(super) fn winners(
    circuit: &Circuit,
    from: &Bits,
    change: &Change,
    spread: &State,
    effort: Effort,
    left: &mut usize,
    control: &Control,
) -> Result<Option<Outcome>, GaveUp> {
    let moving = Moving::of(circuit, from, change, spread);
    let nodes = moving.nodes.len();
    let order = strong_components(nodes, |node| moving.reads(node));
    let cyclic: Vec<bool> = {
        let mut cyclic = vec![false; nodes];
        for group in order.groups() {
            let whole = group.len() > 1 || moving.reads(group[0]).contains(&group[0]);
            group.iter().for_each(|node| cyclic[*node as usize] = whole);
        }
        cyclic
    };

    let trunk = moving.with_sources((0..nodes as u32).filter(|node| cyclic[*node as usize]));
    let mut parts = Vec::new();
    for members in moving.parts(&trunk) {
        match explore(&moving, &members, effort, left, control)? {
            Some(found) => parts.push(Part { members, found }),
            None => return Ok(None),
        }
    }

    let mut ends = 1usize; // stable states and cycles together, of all parts
    let mut stable = 1usize;
    for part in &parts {
        stable = stable.saturating_mul(part.found.stable.len());
        ends = ends.saturating_mul(part.found.stable.len().saturating_add(part.found.cycles));
    }
    if ends > effort.outcomes {
        return Ok(None);
    }
    let cycles = (ends - stable) as u64;
    let race = if ends > 1 {
        Race::Critical
    } else {
        match together(&moving, &parts, effort, left, control)? {
            Some(true) => Race::NonCritical,
            Some(false) => Race::None,
            None => return Ok(None),
        }
    };

    // what follows: gates outside the trunk, sources before readers
    let after: Vec<u32> = order.groups().flatten().copied().filter(|node| !trunk[*node as usize]).collect();
    let mut states = Vec::with_capacity(stable);
    for number in 0..stable {
        let mut rest = number;
        let mut values = moving.start.clone();
        for part in &parts {
            let one = &part.found.stable[rest % part.found.stable.len()];
            rest /= part.found.stable.len();
            for (place, node) in part.members.iter().enumerate() {
                values[*node as usize] = one.get(place);
            }
        }
        for node in &after {
            values[*node as usize] = moving.target(*node, |other| values[other as usize]);
        }
        let mut state = from.clone();
        for (net, bit) in &change.set {
            state.set(net.index(), *bit);
        }
        for (node, value) in moving.nodes.iter().zip(&values) {
            state.set(node.net.index(), *value);
        }
        states.push(state);
    }
    states.sort_by(super::relation::net_by_net);
    Ok(Some(Outcome::Exact { states, cycles, race }))
}

/// What may move: gates at X after spreading, and inputs that change apart from each other.
struct Moving<'a> {
    nodes: Vec<Node<'a>>,
    /// of all nodes, flat: the nodes that each depends on, with their weights
    sources: Vec<(u32, u64)>,
    /// the same without weights
    reads: Vec<u32>,
    /// values when the change comes
    start: Vec<bool>,
}

/// A net that may move.
struct Node<'a> {
    net: NetId,
    target: Target<'a>,
    first: u32,
    last: u32,
    /// the loop that it is in
    component: Option<u32>,
}

/// What a net wants to be.
enum Target<'a> {
    /// An input: its new value.
    Given(bool),
    /// A gate: a function of the sum of its constants and its sources.
    Function { form: &'a Compiled, constants: u64 },
}

impl<'a> Moving<'a> {
    fn of(circuit: &'a Circuit, from: &Bits, change: &Change, spread: &State) -> Moving<'a> {
        let apart: Vec<(NetId, bool)> = if change.apart { change.moving(from).collect() } else { Vec::new() };
        let mut nets: Vec<(NetId, Option<GateId>)> = apart.iter().map(|(net, _)| (*net, None)).collect();
        let gates = circuit.gates().map(|gate| (circuit.net_of(gate), Some(gate)));
        nets.extend(gates.filter(|(net, _)| spread.get(net.index()) == Value::X));
        let place: FxHashMap<NetId, u32> = nets.iter().enumerate().map(|(i, (net, _))| (*net, i as u32)).collect();
        let mut moving =
            Moving { nodes: Vec::with_capacity(nets.len()), sources: Vec::new(), reads: Vec::new(), start: Vec::new() };
        for (net, gate) in &nets {
            let first = moving.sources.len() as u32;
            let target = match gate {
                None => Target::Given(!from.get(net.index())),
                Some(gate) => {
                    let mut constants = 0;
                    let mut sources = Vec::new();
                    for (source, weight) in circuit.sources(*gate) {
                        match place.get(source) {
                            Some(node) => sources.push((*node, *weight)),
                            None => {
                                let said = change.set.iter().find(|(input, _)| input == source).map(|(_, bit)| *bit);
                                if said.unwrap_or(from.get(source.index())) {
                                    constants += weight;
                                }
                            }
                        }
                    }
                    let form = circuit.compiled(*gate);
                    let all: Vec<u64> = sources.iter().map(|(_, weight)| *weight).collect();
                    let depends = |(_, weight): &(u32, u64)| depends_on(form, constants, *weight, &all);
                    moving.sources.extend(sources.iter().copied().filter(depends));
                    Target::Function { form, constants }
                }
            };
            let last = moving.sources.len() as u32;
            let component = gate.filter(|_| circuit.in_loop(*net)).map(|gate| circuit.component(gate));
            moving.nodes.push(Node { net: *net, target, first, last, component });
            moving.start.push(from.get(net.index()));
        }
        moving.reads = moving.sources.iter().map(|(node, _)| *node).collect();
        moving
    }

    /// The nodes that a node depends on.
    fn reads(&self, node: u32) -> &[u32] {
        let node = &self.nodes[node as usize];
        &self.reads[node.first as usize..node.last as usize]
    }

    /// What a node wants to be.
    fn target(&self, node: u32, value: impl Fn(u32) -> bool) -> bool {
        let node = &self.nodes[node as usize];
        match node.target {
            Target::Given(bit) => bit,
            Target::Function { form, constants } => {
                let sources = &self.sources[node.first as usize..node.last as usize];
                let sum = sources.iter().filter(|(source, _)| value(*source)).map(|(_, weight)| weight).sum::<u64>();
                form.value(constants + sum)
            }
        }
    }

    /// These nodes and all that they depend on.
    fn with_sources(&self, nodes: impl Iterator<Item = u32>) -> Vec<bool> {
        let mut inside = vec![false; self.nodes.len()];
        let mut open: Vec<u32> = nodes.collect();
        while let Some(node) = open.pop() {
            if !std::mem::replace(&mut inside[node as usize], true) {
                open.extend_from_slice(self.reads(node));
            }
        }
        inside
    }

    /// Nodes that have something to do with each other, each part ascending. `inside` holds with each node its sources.
    fn parts(&self, inside: &[bool]) -> Vec<Vec<u32>> {
        let mut above: Vec<u32> = (0..self.nodes.len() as u32).collect();
        let find = |above: &mut [u32], mut node: u32| {
            while above[node as usize] != node {
                above[node as usize] = above[above[node as usize] as usize];
                node = above[node as usize];
            }
            node
        };
        let members = || (0..self.nodes.len() as u32).filter(|node| inside[*node as usize]);
        for node in members() {
            for source in self.reads(node) {
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
}

/// Does a function depend on a source of this weight, whatever the other moving sources may be?
fn depends_on(form: &Compiled, constants: u64, weight: u64, all: &[u64]) -> bool {
    match form {
        Compiled::Table(_) => {
            // weights of a table are single bits
            let others = all.iter().filter(|other| **other != weight).fold(0, |mask, other| mask | other);
            let mut rest = others;
            loop {
                if form.value(constants + rest) != form.value(constants + rest + weight) {
                    return true;
                }
                if rest == 0 {
                    return false;
                }
                rest = (rest - 1) & others;
            }
        }
        _ => weight > 0,
    }
}

/// A part with what was found of it.
struct Part {
    /// its nodes, ascending
    members: Vec<u32>,
    found: Found,
}

/// The outcomes of one part.
struct Found {
    /// the reachable stable states, values by place in the part
    stable: Vec<Bits>,
    cycles: usize,
    /// for each loop the most of its nets that are excited together, up to two; ascending
    excited: Vec<(u32, u32)>,
}

/// Are two nets of one loop ever excited together? `None`: too much to say.
fn together(
    moving: &Moving<'_>,
    parts: &[Part],
    effort: Effort,
    left: &mut usize,
    control: &Control,
) -> Result<Option<bool>, GaveUp> {
    let mut loops: FxHashMap<u32, Vec<u32>> = FxHashMap::default();
    for (node, it) in moving.nodes.iter().enumerate() {
        if let Some(component) = it.component {
            loops.entry(component).or_default().push(node as u32);
        }
    }
    let mut loops: Vec<(u32, Vec<u32>)> = loops.into_iter().filter(|(_, nets)| nets.len() > 1).collect();
    loops.sort_unstable();
    for (component, nets) in loops {
        let inside = moving.with_sources(nets.into_iter());
        let (mut most, mut counted) = (0, Vec::new());
        for members in moving.parts(&inside) {
            let held_in = |part: &Part| members.iter().all(|node| part.members.binary_search(node).is_ok());
            // what sources do does not depend on their readers
            let excited = match parts.iter().position(held_in) {
                Some(part) if counted.contains(&part) => 0,
                Some(part) => {
                    counted.push(part);
                    parts[part].found.excited_of(component)
                }
                None => match explore(moving, &members, effort, left, control)? {
                    Some(found) => found.excited_of(component),
                    None => return Ok(None),
                },
            };
            most += excited;
        }
        if most > 1 {
            return Ok(Some(true));
        }
    }
    Ok(Some(false))
}

impl Found {
    fn excited_of(&self, component: u32) -> u32 {
        self.excited.binary_search_by_key(&component, |it| it.0).map_or(0, |at| self.excited[at].1)
    }
}

/// Follows every firing of the nodes of one part from the start. `None`: more than the effort.
fn explore(
    moving: &Moving<'_>,
    members: &[u32],
    effort: Effort,
    left: &mut usize,
    control: &Control,
) -> Result<Option<Found>, GaveUp> {
    let n = members.len();
    let place: FxHashMap<u32, u32> = members.iter().enumerate().map(|(i, node)| (*node, i as u32)).collect();
    let mut ties: Vec<Vec<u32>> = vec![Vec::new(); n];
    for (at, node) in members.iter().enumerate() {
        ties[at] = moving.reads(*node).iter().map(|source| place[source]).collect();
    }
    let mut states = vec![Bits::of(members.iter().map(|node| moving.start[*node as usize]))];
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
        let wants = |at: usize| moving.target(members[at], |source| state.get(place[&source] as usize));
        let now = Bits::of((0..n).map(|at| wants(at) != state.get(at)));
        let mut count: FxHashMap<u32, u32> = FxHashMap::default();
        for component in now.ones().filter_map(|at| moving.nodes[members[at] as usize].component) {
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
