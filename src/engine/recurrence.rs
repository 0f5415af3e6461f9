//! Oscillation, found on a fixed schedule so that every kernel ends a window at the same instant.
//!
//! For each block the transitions of its gates' nets are counted from the last change of an input that it reads. After
//! the batch that brings the count to or past 64, 128, 256, … the block's configuration (values, pending events with
//! their remaining times) is noted, each note replacing the one before. The block has recurred at the first later batch
//! that reproduces the note. A batch with the noted values but other remaining times is a pass; the hundredth pass of
//! one note ends it: oscillating, not exactly periodic. No batch reproduces a note if since then a gate of the block has
//! scheduled an event whose delay is its own, whatever the remaining times: nothing says that the same follows again.

use crate::circuit::{Circuit, NetId};
use crate::logic::Value;
use crate::time::Span;

/// Count at which the first note is taken.
const FIRST_NOTE: u64 = 64;
/// Passes of one note that end it.
const PASSES: u32 = 100;

/// A pending event of a block: node, time from now, value.
pub(super) type Rest = (u32, u64, Value);

/// What recurred in a block.
#[derive(Clone, Debug)]
pub(super) struct Recurred {
    pub period: Span,
    pub range: Option<(Span, Span)>,
    /// Nets that move, with their transitions from the note to here (a period, where it is exact).
    pub moving: Vec<(NetId, u32)>,
}

#[derive(Clone, Debug, Default)]
struct Note {
    active: bool,
    /// How many events with delays of their own the block had scheduled.
    own: u64,
    at: u64,
    values: Vec<Value>,
    pending: Vec<Rest>,
    counts: Vec<u32>,
    differing: u32,
    passes: u32,
    last_pass: u64,
    least: u64,
    greatest: u64,
}

/// The state of the search, for every block of a circuit. Nodes are gates, then wires.
#[derive(Clone, Debug)]
pub(super) struct Recurrence {
    block_of: Vec<u32>,
    slot: Vec<u32>,
    member_start: Vec<u32>,
    members: Vec<u32>,
    gates: u32,
    /// Blocks that read each input.
    readers: Vec<Vec<u32>>,
    count: Vec<u64>,
    /// At or above this count a transition needs a closer look; 0 while a note is active.
    watch: Vec<u64>,
    next_note: Vec<u64>,
    recurred: Vec<bool>,
    /// Blocks that have recurred, in the order in which they did.
    found: Vec<(u32, Recurred)>,
    notes: Vec<Note>,
    touched: Vec<u32>,
    stamp: Vec<u64>,
    batch: u64,
}

impl Recurrence {
    pub(super) fn new(circuit: &Circuit) -> Recurrence {
        let blocks = circuit.block_count();
        let gates = circuit.gate_count();
        let block_of: Vec<u32> = circuit
            .gates()
            .map(|gate| circuit.block(gate))
            .chain(circuit.wires().iter().map(|(_, gate)| circuit.block(*gate)))
            .collect();
        let mut member_start = vec![0u32; blocks + 1];
        for block in &block_of {
            member_start[*block as usize + 1] += 1;
        }
        for block in 0..blocks {
            member_start[block + 1] += member_start[block];
        }
        let mut next = member_start.clone();
        let mut members = vec![0u32; block_of.len()];
        let mut slot = vec![0u32; block_of.len()];
        for (node, block) in block_of.iter().enumerate() {
            let place = &mut next[*block as usize];
            members[*place as usize] = node as u32;
            slot[node] = *place - member_start[*block as usize];
            *place += 1;
        }
        let readers = circuit
            .inputs()
            .map(|input| {
                let mut blocks: Vec<u32> = circuit.readers(input).iter().map(|r| circuit.block(r.gate)).collect();
                blocks.sort_unstable();
                blocks.dedup();
                blocks
            })
            .collect();
        Recurrence {
            block_of,
            slot,
            member_start,
            members,
            gates: gates as u32,
            readers,
            count: vec![0; blocks],
            watch: vec![FIRST_NOTE; blocks],
            next_note: vec![FIRST_NOTE; blocks],
            recurred: vec![false; blocks],
            found: Vec::new(),
            notes: vec![Note::default(); blocks],
            touched: Vec::new(),
            stamp: vec![0; blocks],
            batch: 0,
        }
    }

    pub(super) fn reset(&mut self) {
        self.count.fill(0);
        self.watch.fill(FIRST_NOTE);
        self.next_note.fill(FIRST_NOTE);
        self.recurred.fill(false);
        self.found.clear();
        self.touched.clear();
    }

    /// An input changes: the blocks that read it begin anew.
    pub(super) fn input_changed(&mut self, input: NetId) {
        for block in &self.readers[input.index()] {
            let b = *block as usize;
            self.count[b] = 0;
            self.watch[b] = FIRST_NOTE;
            self.next_note[b] = FIRST_NOTE;
            if self.recurred[b] {
                self.recurred[b] = false;
                self.found.retain(|(found, _)| found != block);
            }
        }
    }

    /// A gate's net changes; returns whether [`Recurrence::moved`] must be called too.
    #[inline]
    pub(super) fn count(&mut self, gate: u32) -> bool {
        let b = self.block_of[gate as usize] as usize;
        self.count[b] += 1;
        self.count[b] >= self.watch[b]
    }

    /// A change arrives at a wire's end; returns whether [`Recurrence::moved`] must be called too.
    #[inline]
    pub(super) fn watches(&self, wire_node: u32) -> bool {
        self.watch[self.block_of[wire_node as usize] as usize] == 0
    }

    /// A node of a watched block takes a new value.
    #[cold]
    pub(super) fn moved(&mut self, node: u32, new: Value) {
        let block = self.block_of[node as usize];
        let b = block as usize;
        if self.recurred[b] {
            return;
        }
        if self.stamp[b] != self.batch + 1 {
            self.stamp[b] = self.batch + 1;
            self.touched.push(block);
        }
        let note = &mut self.notes[b];
        if self.watch[b] == 0 && note.active {
            let slot = self.slot[node as usize] as usize;
            // three values: a net may move between two values that both differ from the note
            let was_differing = note.counts[slot] & DIFFERS != 0;
            let differs = note.values[slot] != new;
            match (was_differing, differs) {
                (false, true) => note.differing += 1,
                (true, false) => note.differing -= 1,
                _ => {}
            }
            let moves = (note.counts[slot] & !DIFFERS) + 1;
            note.counts[slot] = moves | if differs { DIFFERS } else { 0 };
        }
    }

    /// Must [`Recurrence::end_batch`] be called?
    #[inline]
    pub(super) fn is_touched(&self) -> bool {
        !self.touched.is_empty()
    }

    /// Looks at the blocks that moved in the batch at `now`. `value` gives a node's value, `pending` appends a node's
    /// pending events in order; `own` counts the events with delays of their own that a node has scheduled.
    #[cold]
    pub(super) fn end_batch(
        &mut self,
        now: u64,
        value: &impl Fn(u32) -> Value,
        pending: &impl Fn(u32, &mut Vec<Rest>),
        own: &impl Fn(u32) -> u64,
        net_of: &impl Fn(u32) -> NetId,
    ) {
        self.batch += 1;
        let mut touched = std::mem::take(&mut self.touched);
        // of blocks that recur in one batch the lower number counts as the first
        touched.sort_unstable();
        for block in &touched {
            self.look(*block, now, value, pending, own, net_of);
        }
        self.touched = touched;
        self.touched.clear();
    }

    fn look(
        &mut self,
        block: u32,
        now: u64,
        value: &impl Fn(u32) -> Value,
        pending: &impl Fn(u32, &mut Vec<Rest>),
        own: &impl Fn(u32) -> u64,
        net_of: &impl Fn(u32) -> NetId,
    ) {
        let b = block as usize;
        let members = &self.members[self.member_start[b] as usize..self.member_start[b + 1] as usize];
        let note = &mut self.notes[b];
        let active = self.watch[b] == 0 && note.active;
        if active && note.differing == 0 {
            let mut rest = Vec::new();
            for node in members {
                pending(*node, &mut rest);
            }
            let moving = |note: &Note| {
                members
                    .iter()
                    .zip(&note.counts)
                    .filter(|(node, count)| **node < self.gates && **count & !DIFFERS > 0)
                    .map(|(node, count)| (net_of(*node), count & !DIFFERS))
                    .collect()
            };
            let found = if rest == note.pending && note.own == members.iter().map(|node| own(*node)).sum::<u64>() {
                Some(Recurred { period: Span::from_fs(now - note.at), range: None, moving: moving(note) })
            } else {
                let gap = now - note.last_pass;
                note.least = note.least.min(gap);
                note.greatest = note.greatest.max(gap);
                note.last_pass = now;
                note.passes += 1;
                (note.passes == PASSES).then(|| Recurred {
                    period: Span::from_fs((now - note.at) / u64::from(PASSES)),
                    range: Some((Span::from_fs(note.least), Span::from_fs(note.greatest))),
                    moving: moving(note),
                })
            };
            if let Some(found) = found {
                note.active = false;
                self.recurred[b] = true;
                self.watch[b] = u64::MAX;
                self.found.push((block, found));
                return;
            }
        }
        if self.count[b] >= self.next_note[b] {
            while self.next_note[b] <= self.count[b] {
                self.next_note[b] *= 2;
            }
            note.active = true;
            note.own = members.iter().map(|node| own(*node)).sum();
            note.at = now;
            note.values.clear();
            note.values.extend(members.iter().map(|node| value(*node)));
            note.pending.clear();
            for node in members {
                pending(*node, &mut note.pending);
            }
            note.counts.clear();
            note.counts.resize(members.len(), 0);
            note.differing = 0;
            note.passes = 0;
            note.last_pass = now;
            note.least = u64::MAX;
            note.greatest = 0;
            self.watch[b] = 0;
        }
    }

    /// Has any block recurred?
    #[inline]
    pub(super) fn any(&self) -> bool {
        !self.found.is_empty()
    }

    /// Has the block of this node recurred?
    pub(super) fn has(&self, node: u32) -> bool {
        self.recurred[self.block_of[node as usize] as usize]
    }

    /// The block that recurred first, of those of these nodes: a block that never was exactly periodic may have died.
    pub(super) fn first<I: Iterator<Item = u32>>(&self, at_work: impl Fn() -> I) -> Option<&Recurred> {
        let works = |block: u32| at_work().any(|node| self.block_of[node as usize] == block);
        self.found.iter().find(|(block, _)| works(*block)).map(|(_, recurred)| recurred)
    }
}

/// Top bit of a count: the value differs from the note.
const DIFFERS: u32 = 1 << 31;
