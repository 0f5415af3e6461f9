//! A timing wheel (Varghese, Lauck 1987): for any number of pending events.
//!
//! Time is cut into ticks of a power of two of femtoseconds; the wheel has a bucket for each of the next ticks. What is
//! due in the tick that is under way waits in a sorted list, what is due beyond the wheel's horizon in a heap. An entry
//! that was taken out stays until it comes up: it is stale if its node is due at another time.

use std::cmp::Reverse;
use std::collections::BinaryHeap;

use super::{Entry, NEVER, Nodes, Queue};

/// Nodes from which on the memory that an event touches is fetched ahead.
const FETCH_AHEAD: usize = 50_000;
/// Buckets ahead at which nodes are fetched, what names their readers, and the readers.
const AHEAD: [u64; 3] = [6, 4, 2];
/// Nodes a bucket.
const SHARE: usize = 64;
/// Least and greatest number of buckets.
const BUCKETS: [usize; 2] = [64, 1 << 16];
/// Entries from which on the heap is rid of what is stale.
const FAR: usize = 1024;

/// The wheel.
#[derive(Clone, Debug)]
pub struct Wheel {
    /// What is due in the tick under way or was put in for a time before it, earliest at the end.
    current: Vec<Entry>,
    /// The tick under way.
    tick: u64,
    /// Bucket of a tick: its last bits.
    buckets: Box<[Vec<Entry>]>,
    /// Which buckets hold something: bit by bit.
    occupied: Box<[u64]>,
    /// Which words of `occupied` are not 0: bit by bit.
    words: Box<[u64]>,
    /// Entries beyond the wheel's horizon when they were put in: time, node.
    far: BinaryHeap<Reverse<(u64, u32)>>,
    /// Length at which the heap is rid of what is stale.
    far_limit: usize,
    /// A tick is 2 to the power of this, in fs.
    shift: u32,
    /// Entries that are not stale.
    live: usize,
    fetches: bool,
}

impl Wheel {
    fn mask(&self) -> u64 {
        self.buckets.len() as u64 - 1
    }

    fn mark(&mut self, bucket: usize) {
        self.occupied[bucket >> 6] |= 1 << (bucket & 63);
        self.words[bucket >> 12] |= 1 << (bucket >> 6 & 63);
    }

    fn unmark(&mut self, bucket: usize) {
        let word = &mut self.occupied[bucket >> 6];
        *word &= !(1 << (bucket & 63));
        if *word == 0 {
            self.words[bucket >> 12] &= !(1 << (bucket >> 6 & 63));
        }
    }

    /// The first bucket from this one on that holds something, no further than the last one.
    fn next_from(&self, bucket: usize) -> Option<usize> {
        let word = bucket >> 6;
        let here = self.occupied.get(word)? & !0 << (bucket & 63);
        if here != 0 {
            return Some((word << 6) + here.trailing_zeros() as usize);
        }
        let mut at = (word + 1) >> 6;
        let mut rest = *self.words.get(at)? & !0 << ((word + 1) & 63);
        while rest == 0 {
            at += 1;
            rest = *self.words.get(at)?;
        }
        let word = (at << 6) + rest.trailing_zeros() as usize;
        Some((word << 6) + self.occupied[word].trailing_zeros() as usize)
    }

    /// The next tick for which the wheel holds something.
    fn next_tick(&self) -> Option<u64> {
        let after = self.tick + 1;
        let first = (after & self.mask()) as usize;
        let bucket = self.next_from(first).or_else(|| self.next_from(0))?;
        Some(after + ((bucket as u64).wrapping_sub(after) & self.mask()))
    }

    /// Nothing is due up to `until`: its tick is the one under way.
    fn skip(&mut self, until: u64) {
        if until != NEVER {
            self.tick = self.tick.max(until >> self.shift);
        }
    }

    /// Goes on to the next tick that has something due, if that is not after `until`. Returns whether it did.
    fn advance(&mut self, until: u64, nodes: &impl Nodes) -> bool {
        // what is stale may be due at a time that was skipped
        while let Some(Reverse((at, node))) = self.far.peek()
            && nodes.due(*node) != *at
        {
            self.far.pop();
        }
        let near = self.next_tick();
        let far = self.far.peek().map(|entry| entry.0.0 >> self.shift);
        let Some(tick) = near.into_iter().chain(far).min().filter(|tick| *tick <= until >> self.shift) else {
            self.skip(until);
            return false;
        };
        self.tick = tick;
        if self.far.len() > self.far_limit {
            self.far.retain(|entry| nodes.due(entry.0.1) == entry.0.0);
            self.far_limit = 2 * self.far.len().max(FAR);
        }
        if near == Some(tick) {
            let bucket = (tick & self.mask()) as usize;
            let mut full = std::mem::take(&mut self.buckets[bucket]);
            // the list is empty; what is stale already need not be sorted
            self.current.extend(full.drain(..).filter(|entry| nodes.due(entry.node) == entry.at));
            self.buckets[bucket] = full;
            self.unmark(bucket);
        }
        while let Some(Reverse((at, node))) = self.far.peek().copied()
            && at >> self.shift <= tick
        {
            self.far.pop();
            if nodes.due(node) == at {
                self.current.push(Entry { at, node });
            }
        }
        self.current.sort_unstable_by_key(|entry| Reverse(entry.at));
        if self.fetches {
            for (stage, ahead) in AHEAD.iter().enumerate() {
                for entry in &self.buckets[((tick + ahead) & self.mask()) as usize] {
                    nodes.soon(entry.node, stage);
                }
            }
        }
        true
    }
}

impl Queue for Wheel {
    const LAZY: bool = true;

    fn new(nodes: usize) -> Wheel {
        let buckets = (nodes / SHARE).next_power_of_two().clamp(BUCKETS[0], BUCKETS[1]);
        let words = buckets / 64;
        Wheel {
            current: Vec::new(),
            tick: 0,
            buckets: vec![Vec::new(); buckets].into(),
            occupied: vec![0; words].into(),
            words: vec![0; words.div_ceil(64)].into(),
            far: BinaryHeap::new(),
            far_limit: FAR,
            shift: 0,
            live: 0,
            fetches: nodes >= FETCH_AHEAD,
        }
    }

    /// The horizon is to hold nine of ten delays, a tick not to be longer than nine of ten: the list stays short where
    /// delays differ widely, and the heap takes what is far.
    fn clear(&mut self, delays: impl Fn() -> Vec<u64>) {
        self.current.clear();
        for bucket in &mut self.buckets {
            bucket.clear();
        }
        self.occupied.fill(0);
        self.words.fill(0);
        self.far.clear();
        self.tick = 0;
        self.live = 0;
        let mut delays = delays();
        let decile = delays.len() / 10;
        let (short, long) = match delays.len() {
            0 => (1, 1),
            count => (*delays.select_nth_unstable(decile).1, *delays.select_nth_unstable(count - 1 - decile).1),
        };
        let room = self.buckets.len() as u64 - 2;
        self.shift = (long.div_ceil(room).max(1).next_power_of_two().trailing_zeros()).min(short.max(1).ilog2());
    }

    #[inline]
    fn is_empty(&self) -> bool {
        self.live == 0
    }

    #[inline]
    fn top(&mut self, until: u64, nodes: &impl Nodes) -> u64 {
        loop {
            while let Some(entry) = self.current.last() {
                if nodes.due(entry.node) == entry.at {
                    return entry.at;
                }
                self.current.pop();
            }
            if self.live == 0 {
                self.skip(until);
                return NEVER;
            }
            if !self.advance(until, nodes) {
                return NEVER;
            }
        }
    }

    #[inline]
    fn pop(&mut self) -> u32 {
        self.live -= 1;
        self.current.pop().map_or(0, |entry| entry.node)
    }

    #[inline]
    fn insert(&mut self, node: u32, at: u64) {
        self.live += 1;
        let tick = at >> self.shift;
        let entry = Entry { at, node };
        if tick > self.tick && tick - self.tick < self.buckets.len() as u64 {
            let bucket = (tick & self.mask()) as usize;
            if self.buckets[bucket].is_empty() {
                self.mark(bucket);
            }
            self.buckets[bucket].push(entry);
        } else if tick <= self.tick {
            let place = self.current.partition_point(|other| other.at > at);
            self.current.insert(place, entry);
        } else {
            self.far.push(Reverse((at, node)));
        }
    }

    #[inline]
    fn remove(&mut self, _node: u32) {
        self.live -= 1;
    }

    fn each(&self, nodes: &impl Nodes, mut each: impl FnMut(u32)) {
        // a node that was taken out and put in for the same time stands twice
        let mut found: Vec<u32> = self
            .current
            .iter()
            .chain(self.buckets.iter().flatten())
            .map(|entry| (entry.at, entry.node))
            .chain(self.far.iter().map(|entry| entry.0))
            .filter(|(at, node)| nodes.due(*node) == *at)
            .map(|(_, node)| node)
            .collect();
        found.sort_unstable();
        found.dedup();
        found.into_iter().for_each(&mut each);
    }
}
