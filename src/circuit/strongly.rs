//! Strongly connected components of a graph (Tarjan 1972), without recursion.

/// The strongly connected components of a graph: every group comes after all groups that its members lead to.
pub(crate) struct Strong {
    /// all nodes, group by group
    nodes: Vec<u32>,
    /// where each group ends in `nodes`
    ends: Vec<usize>,
}

impl Strong {
    /// The groups, ascending within each.
    pub fn groups(&self) -> impl DoubleEndedIterator<Item = &[u32]> + '_ {
        let start = |at: usize| if at == 0 { 0 } else { self.ends[at - 1] };
        (0..self.ends.len()).map(move |at| &self.nodes[start(at)..self.ends[at]])
    }
}

/// Finds the strongly connected components of the nodes `0..count`; `leads_to` gives the nodes that one leads to.
pub(crate) fn strong_components<'a>(count: usize, leads_to: impl Fn(u32) -> &'a [u32]) -> Strong {
    const UNSEEN: u32 = u32::MAX;
    let mut strong = Strong { nodes: Vec::with_capacity(count), ends: Vec::new() };
    let (mut index, mut low) = (vec![UNSEEN; count], vec![0u32; count]);
    let mut done = vec![false; count];
    let (mut stack, mut walk, mut next) = (Vec::new(), Vec::new(), 0u32);
    for root in 0..count as u32 {
        if index[root as usize] != UNSEEN {
            continue;
        }
        walk.push((root, 0usize));
        while let Some((node, edge)) = walk.last_mut() {
            let (node, at) = (*node, *node as usize);
            if *edge == 0 && index[at] == UNSEEN {
                (index[at], low[at]) = (next, next);
                next += 1;
                stack.push(node);
            }
            if let Some(to) = leads_to(node).get(*edge).copied() {
                *edge += 1;
                if index[to as usize] == UNSEEN {
                    walk.push((to, 0));
                } else if !done[to as usize] {
                    low[at] = low[at].min(index[to as usize]);
                }
                continue;
            }
            walk.pop();
            if let Some((parent, _)) = walk.last() {
                low[*parent as usize] = low[*parent as usize].min(low[at]);
            }
            if low[at] == index[at] {
                let begin = strong.nodes.len();
                while let Some(member) = stack.pop() {
                    done[member as usize] = true;
                    strong.nodes.push(member);
                    if member == node {
                        break;
                    }
                }
                strong.nodes[begin..].sort_unstable();
                strong.ends.push(strong.nodes.len());
            }
        }
    }
    strong
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_come_after_those_that_they_lead_to() {
        // 0 → 1 ⇄ 2 → 3, 3 → 3, 4 alone, 5 → 0
        let edges: [&[u32]; 6] = [&[1], &[2], &[1, 3], &[3], &[], &[0]];
        let strong = strong_components(6, |node| edges[node as usize]);
        let groups: Vec<&[u32]> = strong.groups().collect();
        assert_eq!(groups, [&[3][..], &[1, 2], &[0], &[4], &[5]]);
    }

    #[test]
    fn a_long_path_and_a_long_ring() {
        let n = 200_000u32;
        let path: Vec<u32> = (1..n).collect();
        let ends = |node: u32| if node + 1 < n { &path[node as usize..=node as usize] } else { &[] };
        assert_eq!(strong_components(n as usize, ends).groups().count(), n as usize);
        let ring: Vec<u32> = (1..n).chain([0]).collect();
        let strong = strong_components(n as usize, |node| &ring[node as usize..=node as usize]);
        assert_eq!(strong.groups().map(<[u32]>::len).collect::<Vec<_>>(), [n as usize]);
    }
}
