//! A short sorted list of what is due first, and the rest in no order: the best for up to some dozens of nodes.

use super::{Entry, NEVER, Nodes, Queue};

/// Places of the near list; a power of two, so that a place needs no check.
const PLACES: usize = 16;
/// Length at which the later half of the near list goes to the far one.
const NEAR: usize = PLACES - 2;
/// How many entries it holds when the others went, or when it was filled from the far one.
const FILL: usize = 7;

/// Two lists. The near one is in order of time with the earliest entry at its end; its first entry is due never, so that
/// there is an end to read when it is empty, and no search runs off its beginning. The far one holds, in no
/// order, what is due no earlier than anything near. With few entries everything is near; something is near as long as something is far.
#[derive(Clone, Debug)]
pub struct Sorted {
    near: [Entry; PLACES],
    /// Place of the earliest entry.
    end: usize,
    far: Vec<Entry>,
    /// What is due later than this is far.
    horizon: u64,
}

impl Sorted {
    /// The near list is full: its later half goes.
    #[cold]
    #[inline(never)]
    fn shorten(&mut self) {
        let gone = self.end - FILL;
        self.far.extend_from_slice(&self.near[1..=gone]);
        self.near.copy_within(gone + 1..=self.end, 1);
        self.end = FILL;
        self.horizon = self.near[1].at;
    }

    /// The near list is empty: takes what is due first from the far one.
    #[cold]
    #[inline(never)]
    fn fill(&mut self) {
        let (mut first, mut last) = (NEVER, 0);
        for entry in &self.far {
            first = first.min(entry.at);
            last = last.max(entry.at);
        }
        // as if they were evenly spread
        let share = (last - first) / self.far.len().max(1) as u64;
        let until = first.saturating_add(share.saturating_mul(FILL as u64));
        self.horizon = until;
        let mut i = 0;
        while i < self.far.len() {
            let entry = self.far[i];
            // if more come than the near list holds, the later go back and the horizon is nearer; of one instant no more
            // come than it holds, or they would come and go forever
            if entry.at < self.horizon || entry.at == self.horizon && self.end + 1 < NEAR {
                self.far.swap_remove(i);
                self.insert(entry.node, entry.at);
            } else {
                i += 1;
            }
        }
        if self.far.is_empty() {
            self.horizon = NEVER;
        }
    }
}

impl Queue for Sorted {
    const LAZY: bool = false;

    fn new(nodes: usize) -> Sorted {
        let never = Entry { at: NEVER, node: 0 };
        Sorted { near: [never; PLACES], end: 0, far: Vec::with_capacity(nodes), horizon: NEVER }
    }

    fn clear(&mut self, _delays: impl Fn() -> Vec<u64>) {
        self.end = 0;
        self.far.clear();
        self.horizon = NEVER;
    }

    #[inline(always)]
    fn is_empty(&self) -> bool {
        self.end == 0
    }

    #[inline(always)]
    fn top(&mut self, _until: u64, _nodes: &impl Nodes) -> u64 {
        self.near[self.end % PLACES].at
    }

    #[inline(always)]
    fn pass(&mut self, _at: u64) {}

    #[inline(always)]
    fn pop(&mut self) -> u32 {
        let node = self.near[self.end % PLACES].node;
        self.end -= 1;
        if self.end == 0 && !self.far.is_empty() {
            self.fill();
        }
        node
    }

    #[inline(always)]
    fn insert(&mut self, node: u32, at: u64) {
        if at > self.horizon {
            self.far.push(Entry { at, node });
            return;
        }
        self.end += 1;
        let mut place = self.end;
        while self.near[(place - 1) % PLACES].at < at {
            self.near[place % PLACES] = self.near[(place - 1) % PLACES];
            place -= 1;
        }
        self.near[place % PLACES] = Entry { at, node };
        if self.end == NEAR {
            self.shorten();
        }
    }

    #[inline]
    fn remove(&mut self, node: u32) {
        let mut place = self.end;
        while place > 0 && self.near[place % PLACES].node != node {
            place -= 1;
        }
        if place == 0 {
            if let Some(place) = self.far.iter().position(|entry| entry.node == node) {
                self.far.swap_remove(place);
            }
            return;
        }
        while place < self.end {
            self.near[place % PLACES] = self.near[(place + 1) % PLACES];
            place += 1;
        }
        self.end -= 1;
        if self.end == 0 && !self.far.is_empty() {
            self.fill();
        }
    }

    fn each(&self, _nodes: &impl Nodes, mut each: impl FnMut(u32)) {
        for entry in self.near[1..=self.end].iter().chain(&self.far) {
            each(entry.node);
        }
    }
}
