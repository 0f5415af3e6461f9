//! Loops, feedback nets, blocks and an evaluation order, all in linear or nearly linear time and without recursion.

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
struct Graph {
    reads: Vec<Vec<u32>>,
    feeds: Vec<Vec<u32>>,
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
            reads: (0..gates)
                .map(|g| {
                    let range = source_start[g] as usize..source_start[g + 1] as usize;
                    sources[range].iter().filter_map(|(net, _)| net.0.checked_sub(inputs as u32)).collect()
                })
                .collect(),
            feeds: (0..gates)
                .map(|g| {
                    let range = fan_start[inputs + g] as usize..fan_start[inputs + g + 1] as usize;
                    fan[range].iter().map(|reader| reader.gate.0).collect()
                })
                .collect(),
        };
        let (component, sizes) = components(&graph.reads);
        let in_loop: Vec<bool> =
            (0..gates).map(|g| sizes[component[g] as usize] > 1 || graph.reads[g].contains(&(g as u32))).collect();
        let cut = cut_set(&graph, &component, &in_loop);
        let feedback = (0..gates).filter(|g| cut[*g]).map(|g| NetId((inputs + g) as u32)).collect();
        let (block, blocks) = blocks(&graph);
        let order = order(&graph, &cut);
        Topology { component, in_loop, feedback, block, blocks, order }
    }
}

/// The strongly connected component of each gate, and their sizes.
fn components(reads: &[Vec<u32>]) -> (Vec<u32>, Vec<u32>) {
    let (mut component, mut sizes) = (vec![0; reads.len()], Vec::new());
    for group in strong_components(reads.len(), |gate| &reads[gate as usize]).groups() {
        group.iter().for_each(|gate| component[*gate as usize] = sizes.len() as u32);
        sizes.push(group.len() as u32);
    }
    (component, sizes)
}

/// A small set of gates that cuts every loop. Gates with no way in or out fall away; a gate with a single way in or out
/// is folded into its neighbour; a gate that reads itself must be cut; when nothing of this applies, the gate with the
/// most ways through it is cut (the reductions of Levy and Low 1988, with a greedy choice).
fn cut_set(graph: &Graph, component: &[u32], in_loop: &[bool]) -> Vec<bool> {
    let n = graph.reads.len();
    let mut cut = vec![false; n];
    let inside = |a: usize, b: u32| component[a] == component[b as usize];
    let keep = |g: usize, list: &[u32]| -> Vec<u32> {
        if !in_loop[g] {
            return Vec::new();
        }
        let mut kept: Vec<u32> = list.iter().copied().filter(|to| inside(g, *to)).collect();
        kept.sort_unstable();
        kept.dedup();
        kept
    };
    let mut ins: Vec<Vec<u32>> = (0..n).map(|g| keep(g, &graph.reads[g])).collect();
    let mut outs: Vec<Vec<u32>> = (0..n).map(|g| keep(g, &graph.feeds[g])).collect();
    let mut alive: Vec<bool> = in_loop.to_vec();
    let mut work: Vec<u32> = (0..n as u32).rev().filter(|g| in_loop[*g as usize]).collect();
    let mut queued = in_loop.to_vec();
    // gates by ways through, for the greedy choice; entries go stale and are checked when taken
    let weight = |ins: &[Vec<u32>], outs: &[Vec<u32>], g: usize| (ins[g].len() * outs[g].len()) as u64;
    let mut heap: std::collections::BinaryHeap<(u64, std::cmp::Reverse<u32>)> =
        work.iter().map(|g| (weight(&ins, &outs, *g as usize), std::cmp::Reverse(*g))).collect();
    loop {
        while let Some(g) = work.pop() {
            let gate = g as usize;
            queued[gate] = false;
            if !alive[gate] {
                continue;
            }
            let must_cut = ins[gate].binary_search(&g).is_ok();
            let fold = !must_cut
                && (ins[gate].len() <= 1 || outs[gate].len() <= 1)
                && ins[gate].len() * outs[gate].len() <= 64;
            if !must_cut && !fold {
                continue;
            }
            cut[gate] |= must_cut;
            take_out(gate, !must_cut, &mut ins, &mut outs, &mut |touched, ways| {
                heap.push((ways, std::cmp::Reverse(touched)));
                if !queued[touched as usize] {
                    queued[touched as usize] = true;
                    work.push(touched);
                }
            });
            alive[gate] = false;
        }
        let Some((ways, std::cmp::Reverse(g))) = heap.pop() else { break };
        let gate = g as usize;
        if !alive[gate] {
            continue;
        }
        let now = weight(&ins, &outs, gate);
        if now != ways {
            heap.push((now, std::cmp::Reverse(g)));
            continue;
        }
        cut[gate] = true;
        alive[gate] = false;
        take_out(gate, false, &mut ins, &mut outs, &mut |touched, ways| {
            heap.push((ways, std::cmp::Reverse(touched)));
            if !queued[touched as usize] {
                queued[touched as usize] = true;
                work.push(touched);
            }
        });
    }
    cut
}

/// Takes a gate out of the graph; with `bridge`, every way through it becomes a direct way.
fn take_out(
    gate: usize,
    bridge: bool,
    ins: &mut [Vec<u32>],
    outs: &mut [Vec<u32>],
    touched: &mut impl FnMut(u32, u64),
) {
    let g = gate as u32;
    let (from, to) = (std::mem::take(&mut ins[gate]), std::mem::take(&mut outs[gate]));
    let remove = |list: &mut Vec<u32>, item: u32| {
        if let Ok(at) = list.binary_search(&item) {
            list.remove(at);
        }
    };
    for a in from.iter().filter(|a| **a != g) {
        remove(&mut outs[*a as usize], g);
    }
    for b in to.iter().filter(|b| **b != g) {
        remove(&mut ins[*b as usize], g);
    }
    if bridge {
        let insert = |list: &mut Vec<u32>, item: u32| {
            if let Err(at) = list.binary_search(&item) {
                list.insert(at, item);
            }
        };
        for a in from.iter().filter(|a| **a != g) {
            for b in to.iter().filter(|b| **b != g) {
                insert(&mut outs[*a as usize], *b);
                insert(&mut ins[*b as usize], *a);
            }
        }
    }
    for x in from.iter().chain(&to).filter(|x| **x != g) {
        touched(*x, (ins[*x as usize].len() * outs[*x as usize].len()) as u64);
    }
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
            for to in graph.reads[g as usize].iter().chain(&graph.feeds[g as usize]) {
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
        (0..n).map(|g| graph.reads[g].iter().filter(|r| !cut[**r as usize]).count() as u32).collect();
    let mut ready: std::collections::BinaryHeap<std::cmp::Reverse<u32>> =
        (0..n).filter(|g| waiting[*g] == 0).map(|g| std::cmp::Reverse(g as u32)).collect();
    let mut order = Vec::with_capacity(n);
    while let Some(std::cmp::Reverse(g)) = ready.pop() {
        order.push(GateId(g));
        if cut[g as usize] {
            continue;
        }
        for to in &graph.feeds[g as usize] {
            waiting[*to as usize] -= 1;
            if waiting[*to as usize] == 0 {
                ready.push(std::cmp::Reverse(*to));
            }
        }
    }
    debug_assert_eq!(order.len(), n, "the cut gates cut every loop");
    order
}
