//! Loops, feedback nets, blocks and an evaluation order, all in linear or nearly linear time and without recursion.

use super::cut::cut_set;
use super::{GateId, NetId, Reader, strong_components};
use crate::logic::Bits;

/// A set of nets of one circuit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NetSet(Bits);

impl NetSet {
    /// The empty set, for a circuit of this many nets.
    pub fn none(nets: usize) -> NetSet {
        NetSet(Bits::zeros(nets))
    }

    /// Adds a net; was it new?
    pub fn insert(&mut self, net: NetId) -> bool {
        let new = !self.contains(net);
        self.0.set(net.index(), true);
        new
    }

    /// Is the net in the set?
    pub fn contains(&self, net: NetId) -> bool {
        self.0.get(net.index())
    }

    /// The nets, in order.
    pub fn iter(&self) -> impl Iterator<Item = NetId> + '_ {
        self.0.ones().map(|i| NetId(i as u32))
    }
}

#[derive(Clone, Debug)]
pub(super) struct Topology {
    pub component: Vec<u32>,
    pub in_loop: Vec<bool>,
    pub feedback: Vec<NetId>,
    pub block: Vec<u32>,
    pub blocks: u32,
    pub order: Vec<GateId>,
}

/// The gate graph: an edge from a gate to each gate it reads (`reads`), or that reads it (`feeds`).
pub(super) struct Graph {
    pub reads: Lists,
    pub feeds: Lists,
}

/// A list of gates for each gate, one behind the other.
pub(super) struct Lists {
    ends: Vec<u32>,
    items: Vec<u32>,
}

impl Lists {
    fn of<I: Iterator<Item = u32>>(gates: usize, list: impl Fn(usize) -> I) -> Lists {
        let mut lists = Lists { ends: Vec::with_capacity(gates), items: Vec::new() };
        for gate in 0..gates {
            lists.items.extend(list(gate));
            lists.ends.push(lists.items.len() as u32);
        }
        lists
    }

    /// The number of gates.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// The list of one gate.
    pub fn of_gate(&self, gate: usize) -> &[u32] {
        let begin = gate.checked_sub(1).map_or(0, |before| self.ends[before]);
        &self.items[begin as usize..self.ends[gate] as usize]
    }
}

impl Topology {
    pub(super) fn of(
        inputs: usize,
        source_start: &[u32],
        sources: &[(NetId, u64)],
        fan_start: &[u32],
        fan: &[Reader],
    ) -> Topology {
        let gates = source_start.len() - 1;
        let graph = Graph {
            reads: Lists::of(gates, |g| {
                let range = source_start[g] as usize..source_start[g + 1] as usize;
                sources[range].iter().filter_map(|(net, _)| net.0.checked_sub(inputs as u32))
            }),
            feeds: Lists::of(gates, |g| {
                let range = fan_start[inputs + g] as usize..fan_start[inputs + g + 1] as usize;
                fan[range].iter().map(|reader| reader.gate.0)
            }),
        };
        let (component, sizes) = components(&graph.reads);
        let in_loop: Vec<bool> = (0..gates)
            .map(|g| sizes[component[g] as usize] > 1 || graph.reads.of_gate(g).contains(&(g as u32)))
            .collect();
        let cut = cut_set(&graph, &component, &in_loop);
        let feedback = (0..gates).filter(|g| cut[*g]).map(|g| NetId((inputs + g) as u32)).collect();
        let (block, blocks) = blocks(&graph);
        let order = order(&graph, &cut);
        Topology { component, in_loop, feedback, block, blocks, order }
    }
}

/// The strongly connected component of each gate, and their sizes.
fn components(reads: &Lists) -> (Vec<u32>, Vec<u32>) {
    let (mut component, mut sizes) = (vec![0; reads.len()], Vec::new());
    for group in strong_components(reads.len(), |gate| reads.of_gate(gate as usize)).groups() {
        group.iter().for_each(|gate| component[*gate as usize] = sizes.len() as u32);
        sizes.push(group.len() as u32);
    }
    (component, sizes)
}

/// Gates tied together by gates, numbered in gate order.
fn blocks(graph: &Graph) -> (Vec<u32>, u32) {
    let n = graph.reads.len();
    let mut block = vec![u32::MAX; n];
    let (mut count, mut open) = (0, Vec::new());
    for root in 0..n {
        if block[root] != u32::MAX {
            continue;
        }
        block[root] = count;
        open.push(root as u32);
        while let Some(g) = open.pop() {
            for to in graph.reads.of_gate(g as usize).iter().chain(graph.feeds.of_gate(g as usize)) {
                if block[*to as usize] == u32::MAX {
                    block[*to as usize] = count;
                    open.push(*to);
                }
            }
        }
        count += 1;
    }
    (block, count)
}

/// Gates in dependency order, taking the cut gates as known.
fn order(graph: &Graph, cut: &[bool]) -> Vec<GateId> {
    let n = graph.reads.len();
    let mut waiting: Vec<u32> =
        (0..n).map(|g| graph.reads.of_gate(g).iter().filter(|r| !cut[**r as usize]).count() as u32).collect();
    let mut ready: std::collections::BinaryHeap<std::cmp::Reverse<u32>> =
        (0..n).filter(|g| waiting[*g] == 0).map(|g| std::cmp::Reverse(g as u32)).collect();
    let mut order = Vec::with_capacity(n);
    while let Some(std::cmp::Reverse(g)) = ready.pop() {
        order.push(GateId(g));
        if cut[g as usize] {
            continue;
        }
        for to in graph.feeds.of_gate(g as usize) {
            waiting[*to as usize] -= 1;
            if waiting[*to as usize] == 0 {
                ready.push(std::cmp::Reverse(*to));
            }
        }
    }
    debug_assert_eq!(order.len(), n, "the cut gates cut every loop");
    order
}
