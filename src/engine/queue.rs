//! Queues of nodes: at most one entry a node, earliest first, nodes of one instant in node order.

/// A node that is due, or nothing.
pub type Due = Option<(u64, u32)>;

/// A queue of nodes by due time.
pub trait Queue {
    /// An empty queue for this many nodes.
    fn new(nodes: usize) -> Self;
    /// The earliest entry.
    fn top(&self) -> Due;
    /// Takes the earliest entry out.
    fn pop(&mut self) -> Due;
    /// Puts a node in that is not in.
    fn insert(&mut self, node: u32, at: u64);
    /// Takes a node out that is in, due at `at`.
    fn remove(&mut self, node: u32, at: u64);
    /// All nodes that are in, in no particular order.
    fn nodes(&self) -> impl Iterator<Item = u32> + '_;
    /// Takes everything out.
    fn clear(&mut self);
}

/// A sorted list with the earliest entry at its end: the best for up to some dozens of pending events.
#[derive(Clone, Debug)]
pub struct Sorted {
    /// Time above node, so that one comparison orders both.
    list: Vec<u128>,
}

fn key(at: u64, node: u32) -> u128 {
    u128::from(at) << 64 | u128::from(node)
}

fn due(key: u128) -> (u64, u32) {
    ((key >> 64) as u64, key as u32)
}

impl Queue for Sorted {
    fn new(nodes: usize) -> Sorted {
        Sorted { list: Vec::with_capacity(nodes) }
    }

    #[inline]
    fn top(&self) -> Due {
        self.list.last().map(|key| due(*key))
    }

    #[inline]
    fn pop(&mut self) -> Due {
        self.list.pop().map(due)
    }

    #[inline]
    fn insert(&mut self, node: u32, at: u64) {
        let new = key(at, node);
        let mut i = self.list.len();
        self.list.push(new);
        while i > 0 && self.list[i - 1] < new {
            self.list[i] = self.list[i - 1];
            i -= 1;
        }
        self.list[i] = new;
    }

    #[inline]
    fn remove(&mut self, node: u32, at: u64) {
        let gone = key(at, node);
        if let Some(i) = self.list.iter().rposition(|key| *key == gone) {
            self.list.remove(i);
        }
    }

    fn nodes(&self) -> impl Iterator<Item = u32> + '_ {
        self.list.iter().map(|key| due(*key).1)
    }

    fn clear(&mut self) {
        self.list.clear();
    }
}

/// A heap with four children a place and an index from node to place: for any number of pending events.
#[derive(Clone, Debug)]
pub struct Heap {
    heap: Vec<u128>,
    place: Vec<u32>,
}

const OUT: u32 = u32::MAX;

impl Heap {
    fn put(&mut self, i: usize, entry: u128) {
        self.heap[i] = entry;
        self.place[due(entry).1 as usize] = i as u32;
    }

    fn rise(&mut self, mut i: usize, entry: u128) {
        while i > 0 {
            let parent = (i - 1) / 4;
            if self.heap[parent] <= entry {
                break;
            }
            self.put(i, self.heap[parent]);
            i = parent;
        }
        self.put(i, entry);
    }

    fn sink(&mut self, mut i: usize, entry: u128) {
        loop {
            let first = 4 * i + 1;
            if first >= self.heap.len() {
                break;
            }
            let last = (first + 4).min(self.heap.len());
            let mut least = first;
            for child in first + 1..last {
                if self.heap[child] < self.heap[least] {
                    least = child;
                }
            }
            if entry <= self.heap[least] {
                break;
            }
            self.put(i, self.heap[least]);
            i = least;
        }
        self.put(i, entry);
    }

    fn take(&mut self, i: usize) {
        let Some(last) = self.heap.pop() else { return };
        if i == self.heap.len() {
            return;
        }
        let gone = self.heap[i];
        if last < gone { self.rise(i, last) } else { self.sink(i, last) }
    }
}

impl Queue for Heap {
    fn new(nodes: usize) -> Heap {
        Heap { heap: Vec::with_capacity(nodes.min(1 << 16)), place: vec![OUT; nodes] }
    }

    #[inline]
    fn top(&self) -> Due {
        self.heap.first().map(|key| due(*key))
    }

    fn pop(&mut self) -> Due {
        let top = self.top()?;
        self.take(0);
        self.place[top.1 as usize] = OUT;
        Some(top)
    }

    fn insert(&mut self, node: u32, at: u64) {
        let entry = key(at, node);
        self.heap.push(entry);
        self.rise(self.heap.len() - 1, entry);
    }

    fn remove(&mut self, node: u32, _at: u64) {
        let i = self.place[node as usize];
        if i != OUT {
            self.take(i as usize);
            self.place[node as usize] = OUT;
        }
    }

    fn nodes(&self) -> impl Iterator<Item = u32> + '_ {
        self.heap.iter().map(|key| due(*key).1)
    }

    fn clear(&mut self) {
        for entry in self.heap.drain(..) {
            self.place[due(entry).1 as usize] = OUT;
        }
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use proptest::prelude::*;

    use super::*;

    /// A shadow model: an ordered set of (time, node).
    fn agrees<Q: Queue>(steps: &[(u8, u8)]) -> Result<(), TestCaseError> {
        let mut queue = Q::new(16);
        let mut model: BTreeSet<(u64, u32)> = BTreeSet::new();
        for &(what, time) in steps {
            let (node, at) = (u32::from(what % 16), u64::from(time));
            match what / 16 % 4 {
                0 | 1 => {
                    if let Some(old) = model.iter().find(|entry| entry.1 == node).copied() {
                        queue.remove(node, old.0);
                        model.remove(&old);
                    }
                    queue.insert(node, at);
                    model.insert((at, node));
                }
                2 => prop_assert_eq!(queue.pop(), model.pop_first()),
                _ => {
                    if let Some(old) = model.iter().find(|entry| entry.1 == node).copied() {
                        queue.remove(node, old.0);
                        model.remove(&old);
                    }
                }
            }
            prop_assert_eq!(queue.top(), model.first().copied());
            let mut nodes: Vec<u32> = queue.nodes().collect();
            nodes.sort_unstable();
            let mut wanted: Vec<u32> = model.iter().map(|entry| entry.1).collect();
            wanted.sort_unstable();
            prop_assert_eq!(nodes, wanted);
        }
        queue.clear();
        prop_assert_eq!(queue.top(), None);
        Ok(())
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 300, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(1), ..ProptestConfig::default() })]
        #[test]
        fn queues_agree_with_an_ordered_set(steps in proptest::collection::vec((any::<u8>(), 0u8..12), 0..200)) {
            agrees::<Sorted>(&steps)?;
            agrees::<Heap>(&steps)?;
        }
    }
}
