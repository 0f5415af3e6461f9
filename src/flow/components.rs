//! Strongly connected groups of a graph (Tarjan 1972), without recursion.

/// The groups of a graph given by the targets of each node. Every group comes after all that it leads to; each ascending.
pub(super) fn components(targets: &[Vec<u32>]) -> Vec<Vec<u32>> {
    const NEW: u32 = u32::MAX;
    let nodes = targets.len();
    // order of discovery, and the earliest node of the stack that can be reached
    let mut found = vec![NEW; nodes];
    let mut low = vec![0u32; nodes];
    let mut on_stack = vec![false; nodes];
    let mut stack: Vec<u32> = Vec::new();
    let mut groups = Vec::new();
    let mut next = 0;
    // nodes on the way, with the next target to look at
    let mut way: Vec<(u32, usize)> = Vec::new();
    for root in 0..nodes as u32 {
        if found[root as usize] != NEW {
            continue;
        }
        way.push((root, 0));
        while let Some((node, at)) = way.last_mut() {
            let n = *node as usize;
            if *at == 0 {
                (found[n], low[n]) = (next, next);
                next += 1;
                stack.push(*node);
                on_stack[n] = true;
            }
            if let Some(target) = targets[n].get(*at) {
                *at += 1;
                let t = *target as usize;
                if found[t] == NEW {
                    way.push((*target, 0));
                } else if on_stack[t] {
                    low[n] = low[n].min(found[t]);
                }
                continue;
            }
            way.pop();
            if let Some((above, _)) = way.last() {
                low[*above as usize] = low[*above as usize].min(low[n]);
            }
            if low[n] == found[n] {
                let start = stack.iter().rposition(|other| *other as usize == n).expect("it is on the stack");
                let mut group = stack.split_off(start);
                for member in &group {
                    on_stack[*member as usize] = false;
                }
                group.sort_unstable();
                groups.push(group);
            }
        }
    }
    groups
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_come_after_what_they_lead_to() {
        // 0 <-> 1 -> 2 <-> 3, 4 -> 0, 5 alone with a loop
        let graph = [vec![1], vec![0, 2], vec![3], vec![2], vec![0], vec![5]];
        assert_eq!(components(&graph), [vec![2, 3], vec![0, 1], vec![4], vec![5]]);
        assert_eq!(components(&[]), Vec::<Vec<u32>>::new());
    }

    #[test]
    fn a_cycle_through_an_older_node_is_one_group() {
        // 0 -> 1 -> 2 -> 0, and 2 -> 3
        assert_eq!(components(&[vec![1], vec![2], vec![3, 0], vec![]]), [vec![3], vec![0, 1, 2]]);
    }

    #[test]
    fn a_long_way_does_not_overflow() {
        let n = 300_000u32;
        let ring: Vec<Vec<u32>> = (0..n).map(|node| vec![(node + 1) % n]).collect();
        assert_eq!(components(&ring).len(), 1);
    }
}
