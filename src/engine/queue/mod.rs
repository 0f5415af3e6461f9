//! Queues of nodes by due time, at most one entry a node.
//!
//! A queue gives back entries in order of time; entries of one instant come in any order, and the kernel sorts them.

mod prefetch;
mod sorted;
mod wheel;

pub use sorted::Sorted;
pub use wheel::Wheel;

pub use prefetch::fetch;

/// Later than every event.
pub const NEVER: u64 = u64::MAX;

/// A node and when it is due.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Entry {
    at: u64,
    node: u32,
}

/// What a queue asks of the nodes that are in it.
pub trait Nodes {
    /// When the node is due; [`NEVER`] if it is not in the queue.
    fn due(&self, node: u32) -> u64;
    /// The node will soon be due. It is told of three times, in stages 0 to 2: what is read first may lead to what is read
    /// next.
    fn soon(&self, _node: u32, _stage: usize) {}
}

/// A queue of nodes by due time.
pub trait Queue {
    /// Is an entry told from one that was taken out by the node's `due`?
    const LAZY: bool;
    /// An empty queue for this many nodes.
    fn new(nodes: usize) -> Self;
    /// Takes everything out. `delays`: samples of the delays to come (fs), in any order; they alter the speed alone.
    fn clear(&mut self, delays: impl Fn() -> Vec<u64>);
    /// Is nothing in?
    fn is_empty(&self) -> bool;
    /// When the earliest entry is due; [`NEVER`] if none is. If that is later than `until`, the answer may be [`NEVER`].
    fn top(&mut self, until: u64, nodes: &impl Nodes) -> u64;
    /// Nothing is due before `at`, and nothing will be.
    fn pass(&mut self, at: u64);
    /// Takes out an entry of the earliest instant. To be called after [`Queue::top`] has told of one, with nothing put in
    /// or taken out since, but entries of that instant by this call. If the queue is [`Queue::LAZY`], the node's `due` is
    /// to be [`NEVER`] at once.
    fn pop(&mut self) -> u32;
    /// Puts a node in that is not in. Its `due` is `at` from here on.
    fn insert(&mut self, node: u32, at: u64);
    /// Takes a node out that is in. Its `due` is another from here on.
    fn remove(&mut self, node: u32);
    /// All nodes that are in, in no particular order.
    fn each(&self, nodes: &impl Nodes, each: impl FnMut(u32));
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use proptest::prelude::*;

    use super::*;

    /// The nodes' side of a queue, and a shadow model: an ordered set of (time, node).
    struct Shadow {
        due: Vec<u64>,
        set: BTreeSet<(u64, u32)>,
    }

    impl Nodes for Shadow {
        fn due(&self, node: u32) -> u64 {
            self.due[node as usize]
        }
    }

    fn remove(queue: &mut impl Queue, shadow: &mut Shadow, node: u32) {
        let at = std::mem::replace(&mut shadow.due[node as usize], NEVER);
        if at != NEVER {
            queue.remove(node);
            shadow.set.remove(&(at, node));
        }
    }

    /// What is done to a queue: to which node, what, and how much later than the last that came out.
    fn agrees<Q: Queue>(steps: &[(u8, u64)], delays: &[u64]) -> Result<(), TestCaseError> {
        let mut queue = Q::new(16);
        for round in 0..2 {
            let mut shadow = Shadow { due: vec![NEVER; 16], set: BTreeSet::new() };
            queue.clear(|| delays.to_vec());
            prop_assert!(queue.is_empty());
            let mut now = 0;
            for &(what, wait) in steps {
                let node = u32::from(what % 16);
                match what / 16 % 8 {
                    0..4 => {
                        remove(&mut queue, &mut shadow, node);
                        let at = now + 1 + wait;
                        queue.insert(node, at);
                        shadow.due[node as usize] = at;
                        shadow.set.insert((at, node));
                    }
                    4 => remove(&mut queue, &mut shadow, node),
                    5 => {
                        // something from outside comes first, or is not before the earliest entry
                        let until = now + wait;
                        let first = shadow.set.first().map_or(NEVER, |first| first.0);
                        let top = queue.top(until, &shadow);
                        prop_assert!(top == first || top == NEVER && first > until);
                        now = until.min(first);
                        queue.pass(now);
                    }
                    _ => {
                        let Some(&(first, _)) = shadow.set.first() else { continue };
                        let mut batch = BTreeSet::new();
                        while queue.top(first, &shadow) == first {
                            let node = queue.pop();
                            prop_assert!(shadow.set.remove(&(first, node)));
                            shadow.due[node as usize] = NEVER;
                            batch.insert(node);
                        }
                        prop_assert!(!batch.is_empty());
                        prop_assert!(shadow.set.first().is_none_or(|next| next.0 > first));
                        now = first;
                    }
                }
                let mut nodes = Vec::new();
                queue.each(&shadow, |node| nodes.push(node));
                nodes.sort_unstable();
                let mut wanted: Vec<u32> = shadow.set.iter().map(|entry| entry.1).collect();
                wanted.sort_unstable();
                prop_assert_eq!(nodes, wanted);
                prop_assert_eq!(queue.is_empty(), shadow.set.is_empty());
            }
            let top = queue.top(NEVER, &shadow);
            prop_assert_eq!(top, shadow.set.first().map_or(NEVER, |first| first.0), "round {}", round);
        }
        Ok(())
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: if cfg!(miri) { 6 } else { 600 }, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(1), ..ProptestConfig::default() })]
        #[test]
        fn queues_agree_with_an_ordered_set(
            steps in proptest::collection::vec((any::<u8>(), prop_oneof![0u64..12, 0u64..1000, Just(0), 0u64..1_000_000]), 0..300),
            delays in prop_oneof![Just(vec![]), Just(vec![3]), Just(vec![1, 7, 9]), Just(vec![1_000; 9]), Just(vec![5, 1 << 40])],
        ) {
            agrees::<Sorted>(&steps, &delays)?;
            agrees::<Wheel>(&steps, &delays)?;
        }
    }
}
