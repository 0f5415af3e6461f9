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

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::change::Change;
use super::explore::{Effort, Found, Network, explore, parts_of};
use super::outcome::{Outcome, Race};
use crate::circuit::{Circuit, Compiled, GateId, NetId, strong_components};
use crate::control::Control;
use crate::logic::{Bits, State, Value};

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
    for members in parts_of(&moving, moving.nodes.len(), &trunk) {
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
}

impl Network for Moving<'_> {
    fn reads(&self, node: u32) -> &[u32] {
        let node = &self.nodes[node as usize];
        &self.reads[node.first as usize..node.last as usize]
    }

    fn start(&self, node: u32) -> bool {
        self.start[node as usize]
    }

    fn component(&self, node: u32) -> Option<u32> {
        self.nodes[node as usize].component
    }

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
        let mut most = 0;
        for members in parts_of(moving, moving.nodes.len(), &inside) {
            let has = |nodes: &[u32], node: &u32| nodes.binary_search(node).is_ok();
            // what sources do does not depend on their readers, but only the nets of these members are to be counted
            let explored = |part: &&Part| {
                let of_loop = |node: &&u32| moving.component(**node) == Some(component);
                members.iter().all(|node| has(&part.members, node))
                    && part.members.iter().filter(of_loop).all(|node| has(&members, node))
            };
            let excited = match parts.iter().find(explored) {
                Some(part) => part.found.excited_of(component),
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
