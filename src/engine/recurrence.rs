//! Oscillation, found on a fixed schedule so that every kernel ends a window at the same instant.
//!
//! For each block the transitions of its gates' nets are counted from the last change of an input that it reads. After
//! the batch that brings the count to or past 64, 128, 256, … the block's configuration (values, pending events with
//! their remaining times) is noted, each note replacing the one before. The block has recurred at the first later batch
//! that reproduces the note. A batch with the noted values but other remaining times is a pass; the hundredth pass of
//! one note ends it: oscillating, not exactly periodic. No batch reproduces a note if since then a gate of the block has
//! scheduled an event whose delay is its own, whatever the remaining times: nothing says that the same follows again.

use super::level::Level;
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

/// What is noted of a node. The kernel keeps it with the node, whose memory an event touches anyway.
#[derive(Clone, Copy, Debug)]
pub(super) struct Mark<L> {
    /// How often it has moved since.
    moves: u32,
    noted: L,
    /// Does it have another value now?
    differs: bool,
}

impl<L> Mark<L> {
    /// A node of this value is noted.
    #[inline]
    pub(super) fn new(value: L) -> Mark<L> {
        Mark { moves: 0, noted: value, differs: false }
    }
}

#[derive(Clone, Debug, Default)]
struct Note {
    /// How many events with delays of their own the block had scheduled.
    own: u64,
    at: u64,
    pending: Vec<Rest>,
    passes: u32,
    last_pass: u64,
    least: u64,
    greatest: u64,
}

/// What is counted of a block.
#[derive(Clone, Copy, Debug)]
struct Counter {
    count: u64,
    /// At or above this count a transition needs a closer look; 0 while a note is active.
    watch: u64,
    next_note: u64,
    /// Nodes that have another value than noted.
    differing: u32,
    recurred: bool,
}

impl Counter {
    const NEW: Counter = Counter { count: 0, watch: FIRST_NOTE, next_note: FIRST_NOTE, differing: 0, recurred: false };
}

/// The state of the search, for every block of a circuit. Nodes are gates, then wires.
#[derive(Clone, Debug)]
pub(super) struct Recurrence {
    block_of: Vec<u32>,
    member_start: Vec<u32>,
    members: Vec<u32>,
    gates: u32,
    /// Blocks that read each input: from here to there in `reading`.
    readers: Vec<(u32, u32)>,
    reading: Vec<u32>,
    counters: Vec<Counter>,
    /// Blocks that have recurred, in the order in which they did.
    found: Vec<(u32, Recurred)>,
    notes: Vec<Note>,
    touched: Vec<u32>,
    /// Blocks whose nodes are to be marked.
    noted: Vec<u32>,
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
        for (node, block) in block_of.iter().enumerate() {
            let place = &mut next[*block as usize];
            members[*place as usize] = node as u32;
            *place += 1;
        }
        let mut reading = Vec::new();
        let readers = circuit
            .inputs()
            .map(|input| {
                let first = reading.len() as u32;
                let mut blocks: Vec<u32> = circuit.readers(input).iter().map(|r| circuit.block(r.gate)).collect();
                blocks.sort_unstable();
                blocks.dedup();
                reading.extend(blocks);
                (first, reading.len() as u32)
            })
            .collect();
        Recurrence {
            block_of,
            member_start,
            members,
            gates: gates as u32,
            readers,
            reading,
            counters: vec![Counter::NEW; blocks],
            found: Vec::new(),
            notes: vec![Note::default(); blocks],
            touched: Vec::new(),
            noted: Vec::new(),
            stamp: vec![0; blocks],
            batch: 0,
        }
    }

    pub(super) fn reset(&mut self) {
        self.counters.fill(Counter::NEW);
        self.found.clear();
        self.touched.clear();
    }

    /// An input changes: the blocks that read it begin anew.
    #[inline]
    pub(super) fn input_changed(&mut self, input: NetId) {
        let (first, last) = self.readers[input.index()];
        for block in &self.reading[first as usize..last as usize] {
            let counter = &mut self.counters[*block as usize];
            if counter.recurred {
                self.found.retain(|(found, _)| found != block);
            }
            *counter = Counter::NEW;
        }
    }

    /// The net of a gate of this block changes; returns whether [`Recurrence::moved`] must be called too.
    #[inline]
    pub(super) fn count(&mut self, block: u32) -> bool {
        let counter = &mut self.counters[block as usize];
        counter.count += 1;
        counter.count >= counter.watch
    }

    /// A change arrives at the end of a wire to this block; returns whether [`Recurrence::moved`] must be called too.
    #[inline]
    pub(super) fn watches(&self, block: u32) -> bool {
        self.counters[block as usize].watch == 0
    }

    /// A node of a block takes a new value, and [`Recurrence::count`] or [`Recurrence::watches`] said so. Returns whether
    /// [`Recurrence::end_batch`] must be called.
    #[inline]
    pub(super) fn moved<L: Level>(&mut self, block: u32, mark: &mut Mark<L>, new: L) -> bool {
        let b = block as usize;
        let counter = &mut self.counters[b];
        let mut look = counter.count >= counter.next_note;
        if counter.watch == 0 {
            // three values: a net may move between two values that both differ from the note
            let differs = mark.noted != new;
            counter.differing = counter.differing + u32::from(differs) - u32::from(mark.differs);
            mark.differs = differs;
            mark.moves += 1;
            look |= counter.differing == 0;
        } else if counter.recurred {
            return false;
        }
        if look {
            self.touch(block);
        }
        look
    }

    #[cold]
    fn touch(&mut self, block: u32) {
        let stamp = &mut self.stamp[block as usize];
        if *stamp != self.batch + 1 {
            *stamp = self.batch + 1;
            self.touched.push(block);
        }
    }

    /// Must [`Recurrence::end_batch`] be called?
    #[inline]
    pub(super) fn is_touched(&self) -> bool {
        !self.touched.is_empty()
    }

    /// Looks at the blocks that moved in the batch at `now`. `mark` gives a node's mark, `pending` appends a node's
    /// pending events in order; `own` counts the events with delays of their own that a node has scheduled.
    #[cold]
    pub(super) fn end_batch<L: Level>(
        &mut self,
        now: u64,
        mark: &impl Fn(u32) -> Mark<L>,
        pending: &impl Fn(u32, &mut Vec<Rest>),
        own: &impl Fn(u32) -> u64,
        net_of: &impl Fn(u32) -> NetId,
    ) {
        self.batch += 1;
        let mut touched = std::mem::take(&mut self.touched);
        // of blocks that recur in one batch the lower number counts as the first
        touched.sort_unstable();
        for block in &touched {
            self.look(*block, now, mark, pending, own, net_of);
        }
        self.touched = touched;
        self.touched.clear();
    }

    fn look<L: Level>(
        &mut self,
        block: u32,
        now: u64,
        mark: &impl Fn(u32) -> Mark<L>,
        pending: &impl Fn(u32, &mut Vec<Rest>),
        own: &impl Fn(u32) -> u64,
        net_of: &impl Fn(u32) -> NetId,
    ) {
        let b = block as usize;
        let members = &self.members[self.member_start[b] as usize..self.member_start[b + 1] as usize];
        let note = &mut self.notes[b];
        if self.counters[b].watch == 0 && self.counters[b].differing == 0 {
            let mut rest = Vec::new();
            for node in members {
                pending(*node, &mut rest);
            }
            let moving = || {
                members
                    .iter()
                    .map(|node| (*node, mark(*node).moves))
                    .filter(|(node, moves)| *node < self.gates && *moves > 0)
                    .map(|(node, moves)| (net_of(node), moves))
                    .collect()
            };
            let found = if rest == note.pending && note.own == members.iter().map(|node| own(*node)).sum::<u64>() {
                Some(Recurred { period: Span::from_fs(now - note.at), range: None, moving: moving() })
            } else {
                let gap = now - note.last_pass;
                note.least = note.least.min(gap);
                note.greatest = note.greatest.max(gap);
                note.last_pass = now;
                note.passes += 1;
                (note.passes == PASSES).then(|| Recurred {
                    period: Span::from_fs((now - note.at) / u64::from(PASSES)),
                    range: Some((Span::from_fs(note.least), Span::from_fs(note.greatest))),
                    moving: moving(),
                })
            };
            if let Some(found) = found {
                self.counters[b].recurred = true;
                self.counters[b].watch = u64::MAX;
                self.found.push((block, found));
                return;
            }
        }
        let counter = &mut self.counters[b];
        if counter.count >= counter.next_note {
            while counter.next_note <= counter.count {
                counter.next_note *= 2;
            }
            note.own = members.iter().map(|node| own(*node)).sum();
            note.at = now;
            note.pending.clear();
            for node in members {
                pending(*node, &mut note.pending);
            }
            note.passes = 0;
            note.last_pass = now;
            note.least = u64::MAX;
            note.greatest = 0;
            counter.watch = 0;
            counter.differing = 0;
            self.noted.push(block);
        }
    }

    /// Calls back for each node that is to be marked anew after [`Recurrence::end_batch`].
    pub(super) fn mark_anew(&mut self, mut each: impl FnMut(u32)) {
        for block in self.noted.drain(..) {
            let b = block as usize;
            self.members[self.member_start[b] as usize..self.member_start[b + 1] as usize]
                .iter()
                .for_each(|node| each(*node));
        }
    }

    /// Has any block recurred?
    #[inline]
    pub(super) fn any(&self) -> bool {
        !self.found.is_empty()
    }

    /// Has this block recurred?
    pub(super) fn has(&self, block: u32) -> bool {
        self.counters[block as usize].recurred
    }

    /// The block that recurred first, of those of these nodes: a block that never was exactly periodic may have died.
    pub(super) fn first(&self, at_work: &[u32]) -> Option<&Recurred> {
        let works = |block: u32| at_work.iter().any(|node| self.block_of[*node as usize] == block);
        self.found.iter().find(|(block, _)| works(*block)).map(|(_, recurred)| recurred)
    }
}
