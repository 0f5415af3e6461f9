//! A small set of gates that cuts every loop.

use std::collections::BTreeSet;

use super::topology::Graph;

/// Neighbours up to which a sorted list is kept.
const FEW: usize = 64;

/// The neighbours of a gate, ascending: taking one out or putting one in costs no more than the logarithm of their number,
/// also where a net is read by very many gates.
enum Neighbours {
    Few(Vec<u32>),
    Many(BTreeSet<u32>),
}

impl Default for Neighbours {
    fn default() -> Neighbours {
        Neighbours::Few(Vec::new())
    }
}

impl Neighbours {
    /// Of a list that is ascending.
    fn of(ascending: Vec<u32>) -> Neighbours {
        if ascending.len() > FEW {
            Neighbours::Many(ascending.into_iter().collect())
        } else {
            Neighbours::Few(ascending)
        }
    }

    fn len(&self) -> usize {
        match self {
            Neighbours::Few(list) => list.len(),
            Neighbours::Many(set) => set.len(),
        }
    }

    fn contains(&self, gate: u32) -> bool {
        match self {
            Neighbours::Few(list) => list.binary_search(&gate).is_ok(),
            Neighbours::Many(set) => set.contains(&gate),
        }
    }

    fn remove(&mut self, gate: u32) {
        match self {
            Neighbours::Few(list) => {
                if let Ok(at) = list.binary_search(&gate) {
                    list.remove(at);
                }
            }
            Neighbours::Many(set) => {
                set.remove(&gate);
            }
        }
    }

    fn insert(&mut self, gate: u32) {
        match self {
            Neighbours::Few(list) => {
                if let Err(at) = list.binary_search(&gate) {
                    list.insert(at, gate);
                }
                if list.len() > FEW {
                    *self = Neighbours::of(std::mem::take(list));
                }
            }
            Neighbours::Many(set) => {
                set.insert(gate);
            }
        }
    }

    fn into_vec(self) -> Vec<u32> {
        match self {
            Neighbours::Few(list) => list,
            Neighbours::Many(set) => set.into_iter().collect(),
        }
    }
}

/// A small set of gates that cuts every loop. Gates with no way in or out fall away; a gate with a single way in or out
/// is folded into its neighbour; a gate that reads itself must be cut; when nothing of this applies, the gate with the
/// most ways through it is cut (the reductions of Levy and Low 1988, with a greedy choice).
pub(super) fn cut_set(graph: &Graph, component: &[u32], in_loop: &[bool]) -> Vec<bool> {
    let n = graph.reads.len();
    let mut cut = vec![false; n];
    let inside = |a: usize, b: u32| component[a] == component[b as usize];
    let keep = |g: usize, list: &[u32]| -> Neighbours {
        if !in_loop[g] {
            return Neighbours::default();
        }
        let mut kept: Vec<u32> = list.iter().copied().filter(|to| inside(g, *to)).collect();
        kept.sort_unstable();
        kept.dedup();
        Neighbours::of(kept)
    };
    let mut ins: Vec<Neighbours> = (0..n).map(|g| keep(g, graph.reads.of_gate(g))).collect();
    let mut outs: Vec<Neighbours> = (0..n).map(|g| keep(g, graph.feeds.of_gate(g))).collect();
    let mut alive: Vec<bool> = in_loop.to_vec();
    let mut work: Vec<u32> = (0..n as u32).rev().filter(|g| in_loop[*g as usize]).collect();
    let mut queued = in_loop.to_vec();
    // gates by ways through, for the greedy choice; entries go stale and are checked when taken
    let weight = |ins: &[Neighbours], outs: &[Neighbours], g: usize| (ins[g].len() * outs[g].len()) as u64;
    let mut heap: std::collections::BinaryHeap<(u64, std::cmp::Reverse<u32>)> =
        work.iter().map(|g| (weight(&ins, &outs, *g as usize), std::cmp::Reverse(*g))).collect();
    loop {
        while let Some(g) = work.pop() {
            let gate = g as usize;
            queued[gate] = false;
            if !alive[gate] {
                continue;
            }
            let must_cut = ins[gate].contains(g);
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
    ins: &mut [Neighbours],
    outs: &mut [Neighbours],
    touched: &mut impl FnMut(u32, u64),
) {
    let g = gate as u32;
    let (from, to) = (std::mem::take(&mut ins[gate]).into_vec(), std::mem::take(&mut outs[gate]).into_vec());
    for a in from.iter().filter(|a| **a != g) {
        outs[*a as usize].remove(g);
    }
    for b in to.iter().filter(|b| **b != g) {
        ins[*b as usize].remove(g);
    }
    if bridge {
        for a in from.iter().filter(|a| **a != g) {
            for b in to.iter().filter(|b| **b != g) {
                outs[*a as usize].insert(*b);
                ins[*b as usize].insert(*a);
            }
        }
    }
    for x in from.iter().chain(&to).filter(|x| **x != g) {
        touched(*x, (ins[*x as usize].len() * outs[*x as usize].len()) as u64);
    }
}
