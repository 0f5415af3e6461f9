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
