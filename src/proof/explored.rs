//! How an exploration goes, what it may spend, and what it found.

use std::collections::BTreeMap;
use std::time::Instant;

use super::key::{Key, Layout, Mover};
use super::plant::Plant;
use crate::control::Control;

/// The origin of a window that did not begin at rest.
pub const NOWHERE: u32 = u32::MAX;
/// The same where a step that changes nothing has come at rest since.
pub const SINCE: u32 = u32::MAX - 1;
/// The origin where nothing has changed since a start at rest.
pub const START: u32 = u32::MAX - 2;

/// What is done with a zone whose key is known.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Merge {
    /// Dropped if nothing can come of it that does not come of one that is known: exact.
    #[default]
    Inclusion,
    /// Joined to the one zone of the key: holds all that can happen, and perhaps more.
    Hull,
    /// Dropped only if it is known: exact, and every cycle is a real one.
    Equality,
    /// Kept as a branch of its own, last come first looked at, as far as the listener lets it: a tree of traces.
    Branch,
}

/// How an exploration goes.
#[derive(Clone, Copy, Debug)]
pub struct Mode {
    /// What is done with a zone whose key is known.
    pub merge: Merge,
    /// May things due at one instant fire together? Without, what needs exactly equal times is left out.
    pub joint: bool,
    /// Keep which zone leads to which.
    pub edges: bool,
    /// End at the first hit of the watch.
    pub first_hit: bool,
}

impl Default for Mode {
    fn default() -> Mode {
        Mode { merge: Merge::Inclusion, joint: true, edges: false, first_hit: false }
    }
}

/// What an exploration may spend.
#[derive(Clone, Debug)]
pub struct Budget {
    /// Zones kept, at most.
    pub zones: u64,
    /// Bytes of zones and keys, at most.
    pub bytes: u64,
    /// When it ends at the latest.
    pub until: Option<Instant>,
    /// Stops it.
    pub control: Control,
}

/// Why an exploration did not come to its end.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ended {
    /// It did.
    Complete,
    /// The watch has its hit.
    Hit,
    /// As many zones as it may keep.
    Zones,
    /// As much memory as it may take.
    Bytes,
    /// As long as it may take.
    Seconds,
    /// More things at one instant than are tried together, or than fit a word.
    Together,
    /// More changes under way on one wire than are kept.
    InFlight,
    /// The caller asked to stop.
    Cancelled,
}

/// One zone that was kept, and how it was come by.
#[derive(Clone, Debug)]
pub(super) struct Node {
    pub key: u32,
    pub at: usize,
    pub parent: u32,
    /// What fired, as a range of `fired`.
    pub fired: (u32, u32),
    pub gone: bool,
}

/// A state at rest, and the first node that led to it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Rest {
    /// The window: steps taken. With clocks the number of the step that began it, from 1, or behind those of all steps that of the
    /// edge, in the order of the scenario's moments; where several came at once that of the first, and [`Plant::windows`] more.
    pub steps: u32,
    /// The state at rest in which its window began (with the last step that changed an input here), by number; [`NOWHERE`]
    /// if it did not begin at rest, [`SINCE`] if a step that changes nothing has come at rest since, [`START`] before the first.
    pub origin: u32,
    /// Itself, by number.
    pub state: u32,
}

/// One block of a trace.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fired {
    /// What fired together; empty for a step that waited for rest.
    pub movers: Vec<Mover>,
    /// The values of all signals after it.
    pub values: Vec<u64>,
    /// Steps taken after it.
    pub steps: usize,
    /// Has the pattern come by then that the next step waits for?
    pub came: bool,
}

/// What an exploration found.
pub struct Explored {
    /// Why it ended.
    pub ended: Ended,
    /// Zones that were kept.
    pub zones: u64,
    /// Zones that were come by, those included that were known or made needless by others.
    pub met: u64,
    /// Bytes of zones and keys.
    pub bytes: u64,
    /// States at rest, each with the node that led to it first.
    pub rests: BTreeMap<Rest, u32>,
    /// Steps (by number) that wait for a pattern that does not come, each with the node at which the first of them gives up.
    pub missed: BTreeMap<u32, u32>,
    /// The states that numbers stand for: values of all signals.
    pub states: Vec<Box<[u64]>>,
    /// Hits of the watch, each with the node that led to it first.
    pub hits: BTreeMap<u32, u32>,
    /// Which node leads to which, where that was asked for; one that lies in a later one leads to that.
    pub edges: Vec<(u32, u32)>,
    pub(super) nodes: Vec<Node>,
    pub(super) movers: Vec<Mover>,
    pub(super) keys: Vec<u64>,
    pub(super) layout: Layout,
}

/// Someone who hears of what an exploration comes by.
pub(super) trait Listener {
    /// A branch would grow from this node ([`Merge::Branch`] only). `None`: nothing is to come of it. Else the number of its
    /// kind: it is dropped if its zone lies in that of another branch of the same key and kind.
    fn branch(&mut self, found: &Explored, node: u32) -> Option<u32>;

    /// A key was arrived at that lasts, with these hits and this state at rest. `node` is its node, if it has one. True: the
    /// exploration ends.
    fn arrived(
        &mut self,
        found: &Explored,
        parent: u32,
        key: u32,
        node: Option<u32>,
        said: (&[u32], Option<Rest>),
    ) -> bool;
}

impl Explored {
    /// Of a plant that was not explored yet.
    pub(super) fn nothing(plant: &Plant) -> Explored {
        Explored {
            ended: Ended::Complete,
            zones: 0,
            met: 0,
            bytes: 0,
            rests: BTreeMap::new(),
            missed: BTreeMap::new(),
            states: Vec::new(),
            hits: BTreeMap::new(),
            edges: Vec::new(),
            nodes: Vec::new(),
            movers: Vec::new(),
            keys: Vec::new(),
            layout: Layout::of(plant),
        }
    }

    #[inline]
    pub(super) fn key(&self, number: u32) -> Key<'_> {
        let at = number as usize * self.layout.len;
        Key { words: &self.keys[at..at + self.layout.len], layout: self.layout }
    }

    /// The blocks that led to a node, first first.
    pub fn trace(&self, node: u32) -> Vec<Fired> {
        let mut blocks = Vec::new();
        let mut at = node;
        while self.nodes[at as usize].parent != u32::MAX {
            let it = &self.nodes[at as usize];
            let key = self.key(it.key);
            let movers = self.movers[it.fired.0 as usize..it.fired.1 as usize].to_vec();
            blocks.push(Fired { movers, values: key.values().to_vec(), steps: key.steps(), came: key.came() });
            at = it.parent;
        }
        blocks.reverse();
        blocks
    }

    /// The key of a node, but for the state in which its window began.
    pub(super) fn place(&self, node: u32) -> Box<[u64]> {
        self.key(self.nodes[node as usize].key).without_origin()
    }

    /// How many nodes there are.
    pub(super) fn nodes(&self) -> usize {
        self.nodes.len()
    }

    /// The values of all signals at a node.
    pub(super) fn values(&self, node: u32) -> Vec<u64> {
        self.key(self.nodes[node as usize].key).values().to_vec()
    }

    /// The window at a node.
    pub(super) fn window(&self, node: u32) -> u32 {
        self.key(self.nodes[node as usize].key).window()
    }

    /// The values of the signals where a trace begins.
    pub fn start(&self, node: u32) -> Vec<u64> {
        let mut at = node;
        while self.nodes[at as usize].parent != u32::MAX {
            at = self.nodes[at as usize].parent;
        }
        self.key(self.nodes[at as usize].key).values().to_vec()
    }
}
