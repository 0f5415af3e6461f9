//! What the kernel keeps of a gate or a wire end, on one cache line.

use crate::engine::level::Level;
use crate::engine::plan::{Fan, Kind, Plan};
use crate::engine::queue::{NEVER, Nodes, fetch};
use crate::engine::recurrence::Mark;
use crate::logic::Value;

/// A gate or a wire end. A gate has an event pending if `next != out` (one a node) or its list is not empty (many).
#[derive(Clone, Copy, Debug)]
#[repr(align(64))]
pub(super) struct Node<L: Level, T> {
    /// When it is due: the earliest of its pending events; [`NEVER`] without one.
    pub due: u64,
    pub sum: L::Sum,
    pub table: u64,
    pub delay: [u64; 2],
    pub fan: (u32, u32),
    pub block: u32,
    pub out: L,
    /// The value after all pending events.
    pub next: L,
    pub kind: Kind,
    pub mark: Mark<L>,
    pub tag: T,
}

impl<L: Level, T: Copy + Default> Node<L, T> {
    pub fn new(plan: &Plan, node: u32) -> Node<L, T> {
        Node {
            due: NEVER,
            sum: L::Sum::default(),
            table: plan.table(node),
            delay: [1, 1],
            fan: plan.fan_range(node),
            block: plan.block(node),
            out: L::of(Value::Zero),
            next: L::of(Value::Zero),
            kind: plan.kind(node),
            mark: Mark::new(L::of(Value::Zero)),
            tag: T::default(),
        }
    }
}

/// A pending event in a node's list.
#[derive(Clone, Copy, Debug)]
pub(super) struct Event<L, T> {
    pub due: u64,
    /// When it was scheduled.
    pub since: u64,
    pub value: L,
    pub tag: T,
}

/// The nodes as the queue sees them.
pub(super) struct Lines<'a, L: Level, T> {
    pub nodes: &'a [Node<L, T>],
    pub fan: &'a [Fan],
}

impl<L: Level, T> Nodes for Lines<'_, L, T> {
    #[inline(always)]
    fn due(&self, node: u32) -> u64 {
        self.nodes[node as usize].due
    }

    fn soon(&self, node: u32, stage: usize) {
        match stage {
            0 => fetch(self.nodes, node as usize),
            1 => fetch(self.fan, self.nodes[node as usize].fan.0 as usize),
            _ => {
                let (first, last) = self.nodes[node as usize].fan;
                for fan in &self.fan[first as usize..last.min(first + READERS) as usize] {
                    fetch(self.nodes, fan.node as usize);
                }
            }
        }
    }
}

/// Readers of a net that are fetched ahead.
const READERS: u32 = 4;

/// The nodes as the queue sees them.
#[inline(always)]
pub(super) fn lines<'a, L: Level, T>(nodes: &'a [Node<L, T>], plan: &'a Plan) -> Lines<'a, L, T> {
    Lines { nodes, fan: &plan.fan }
}
