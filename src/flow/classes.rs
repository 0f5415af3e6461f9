//! Classes of nodes that cannot be told apart: partition refinement (Moore 1956), with the idea of Hopcroft (1971) that of
//! the parts of a class the largest keeps its name, so that every node is looked at again at most a logarithmic number
//! of times.

use std::collections::BTreeMap;

/// What a node leads to, once for each way out: the targets of that way.
pub(super) type Ways = Vec<Vec<u32>>;

/// Splits classes until any two nodes of one class lead, on each way, to the same set of classes.
///
/// `class` gives the class of each node to begin with; nodes of one class have the same number of ways. The result is
/// the coarsest such partition, as a class for each node; the numbers mean nothing.
pub(super) fn refine(mut class: Vec<u32>, ways: &[Ways]) -> Vec<u32> {
    let nodes = class.len();
    let mut before: Vec<Vec<u32>> = vec![Vec::new(); nodes];
    for (node, ways) in ways.iter().enumerate() {
        for target in ways.iter().flatten() {
            before[*target as usize].push(node as u32);
        }
    }
    let mut next = class.iter().max().map_or(0, |last| last + 1);
    let mut sizes = vec![0usize; next as usize];
    for of in &class {
        sizes[*of as usize] += 1;
    }
    let mut waits = vec![true; nodes];
    let mut work: Vec<u32> = (0..nodes as u32).collect();
    while !work.is_empty() {
        // the nodes to look at, by class and by where they lead
        let mut groups: BTreeMap<u32, BTreeMap<Ways, Vec<u32>>> = BTreeMap::new();
        for node in work.drain(..) {
            waits[node as usize] = false;
            let mut leads: Ways = Vec::with_capacity(ways[node as usize].len());
            for targets in &ways[node as usize] {
                let mut classes: Vec<u32> = targets.iter().map(|target| class[*target as usize]).collect();
                classes.sort_unstable();
                classes.dedup();
                leads.push(classes);
            }
            groups.entry(class[node as usize]).or_default().entry(leads).or_default().push(node);
        }
        for (of, parts) in groups {
            // the nodes of this class that need no look lead to old classes only, the others to a new one: they differ
            let looked_at: usize = parts.values().map(Vec::len).sum();
            let others = sizes[of as usize] - looked_at;
            let mut parts: Vec<Vec<u32>> = parts.into_values().collect();
            let largest = (0..parts.len()).max_by_key(|part| parts[*part].len()).expect("a group has a part");
            if others < parts[largest].len() {
                if others > 0 {
                    // rare: the part that was looked at is the larger one. The others take the new name
                    let kept = parts.swap_remove(largest);
                    let mut is_kept = rustc_hash::FxHashSet::default();
                    is_kept.extend(kept.iter().chain(parts.iter().flatten()).copied());
                    let rest = (0..nodes as u32).filter(|node| class[*node as usize] == of && !is_kept.contains(node));
                    parts.push(rest.collect());
                } else {
                    parts.swap_remove(largest);
                }
            }
            for part in parts {
                sizes[of as usize] -= part.len();
                sizes.push(part.len());
                for node in part {
                    class[node as usize] = next;
                    for from in &before[node as usize] {
                        if !std::mem::replace(&mut waits[*from as usize], true) {
                            work.push(*from);
                        }
                    }
                }
                next += 1;
            }
        }
    }
    class
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The same by looking at all nodes until nothing changes (Moore 1956).
    fn slowly(mut class: Vec<u32>, ways: &[Ways]) -> Vec<u32> {
        loop {
            let mut names: BTreeMap<(u32, Ways), u32> = BTreeMap::new();
            let mut new = Vec::new();
            for (node, ways) in ways.iter().enumerate() {
                let mut leads: Ways =
                    ways.iter().map(|targets| targets.iter().map(|target| class[*target as usize]).collect()).collect();
                leads.iter_mut().for_each(|classes: &mut Vec<u32>| {
                    classes.sort_unstable();
                    classes.dedup();
                });
                let next = names.len() as u32;
                new.push(*names.entry((class[node], leads)).or_insert(next));
            }
            if names.len() == class.iter().collect::<std::collections::BTreeSet<_>>().len() {
                return new;
            }
            class = new;
        }
    }

    /// Classes by their first member.
    fn named(class: &[u32]) -> Vec<usize> {
        class.iter().map(|of| class.iter().position(|other| other == of).expect("itself")).collect()
    }

    #[test]
    fn a_chain_falls_apart_and_a_ring_does_not() {
        // 0 → 1 → 2 → 3 → 3, where 3 is special: all are told apart by their distance
        let chain = [vec![vec![1]], vec![vec![2]], vec![vec![3]], vec![vec![3]]];
        assert_eq!(named(&refine(vec![0, 0, 0, 1], &chain)), [0, 1, 2, 3]);
        let ring = [vec![vec![1]], vec![vec![2]], vec![vec![0]]];
        assert_eq!(named(&refine(vec![0, 0, 0], &ring)), [0, 0, 0]);
    }

    #[test]
    fn it_is_the_coarsest_partition_of_random_graphs() {
        // a small generator with a fixed seed (xorshift)
        let mut seed = 0x9e37_79b9_7f4a_7c15u64;
        let mut below = |most: u32| {
            seed ^= seed << 13;
            seed ^= seed >> 7;
            seed ^= seed << 17;
            (seed >> 33) as u32 % most
        };
        for case in 0..2000 {
            let nodes = 1 + below(12);
            let class: Vec<u32> = (0..nodes).map(|_| below(2)).collect();
            // a class decides how many ways its nodes have
            let ways: Vec<Ways> = class
                .iter()
                .map(|of| {
                    let ways = if *of == 0 { 1 } else { 2 };
                    (0..ways).map(|_| (0..below(3)).map(|_| below(nodes)).collect()).collect()
                })
                .collect();
            let classes: u32 = class.iter().max().map_or(0, |last| last + 1);
            let class: Vec<u32> = class.iter().map(|of| of % classes).collect();
            assert_eq!(named(&refine(class.clone(), &ways)), named(&slowly(class, &ways)), "case {case}: {ways:?}");
        }
    }
}
