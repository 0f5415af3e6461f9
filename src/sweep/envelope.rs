//! Between which times each edge of each net came, over all samples: integers that merge in any order, in a space that does
//! not grow with the number of samples.

use serde::{Deserialize, Serialize};

use super::tally::WindowTally;
use crate::circuit::NetId;
use crate::engine::{Observer, Opening};
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::time::{Span, Time};

/// Edges of a net that are told apart in one window, at most.
pub const MOST_EDGES: usize = 64;
/// Edges that are told apart in all, each to 0, to 1 and to X: less of each window where there are many nets and windows,
/// then the first windows only.
const MOST: usize = 1 << 18;
/// Values that an edge may lead to.
const VALUES: usize = 3;

/// When the edges of each net came in the windows of each moment, over all samples of a tally.
///
/// Edges are told apart by net, by the moment that names the window, by their number within the window from 0, and by the
/// value that they lead to. Times count from the start of the window, which is the instant of its step, with skew the
/// earliest.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "Written", into = "Written")]
pub struct Envelope {
    nets: usize,
    /// Moments that are kept, from the first.
    moments: usize,
    /// Edges that are told apart in one window.
    edges: usize,
    /// By moment, then by net.
    cells: Vec<Cell>,
}

/// The edges of one net in the windows of one moment.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
struct Cell {
    /// By number, then by value; as long as it must be.
    slots: Vec<Slot>,
    /// Samples with more edges than are told apart.
    more: u64,
}

#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
struct Slot {
    count: u64,
    earliest: u64,
    latest: u64,
}

/// One edge of one net, over all samples that had it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct EdgeSpan {
    /// Its number within the window, from 0.
    pub number: usize,
    /// The value that it leads to.
    pub to: Value,
    /// Earliest time from the start of the window.
    pub earliest: Span,
    /// Latest.
    pub latest: Span,
    /// Samples that had it.
    pub samples: u64,
}

impl Slot {
    #[inline]
    fn add(&mut self, at: u64) {
        if self.count == 0 {
            (self.earliest, self.latest) = (at, at);
        }
        self.count += 1;
        self.earliest = self.earliest.min(at);
        self.latest = self.latest.max(at);
    }

    fn merge(&mut self, other: &Slot) {
        match (self.count, other.count) {
            (_, 0) => {}
            (0, _) => *self = *other,
            _ => {
                self.count += other.count;
                self.earliest = self.earliest.min(other.earliest);
                self.latest = self.latest.max(other.latest);
            }
        }
    }
}

impl Envelope {
    /// An empty one for a scenario.
    pub fn new(scenario: &Scenario) -> Envelope {
        let (nets, all) = (scenario.circuit.net_count(), scenario.stimulus.moments.len());
        let moments = all.min(MOST / nets.max(1));
        let cells = nets * moments;
        let edges = (MOST / cells.max(1)).clamp(1, MOST_EDGES);
        Envelope { nets, moments, edges, cells: vec![Cell::default(); cells] }
    }

    /// Moments whose windows are in it, from the first on; the others are left out for want of space.
    pub fn moments(&self) -> usize {
        self.moments
    }

    /// Edges of a net that are told apart in one window: later ones are counted by [`Envelope::more`] alone.
    pub fn edges(&self) -> usize {
        self.edges
    }

    fn cell(&self, moment: u32, net: NetId) -> Option<&Cell> {
        let (moment, net) = (moment as usize, net.index());
        (moment < self.moments && net < self.nets).then(|| &self.cells[moment * self.nets + net])
    }

    /// The edges of a net in the windows that a moment names, by number, then in the order 0, 1, X of the value they lead
    /// to.
    pub fn of(&self, moment: u32, net: NetId) -> impl Iterator<Item = EdgeSpan> + '_ {
        let slots = self.cell(moment, net).map_or(&[][..], |cell| &cell.slots);
        slots.iter().enumerate().filter(|(_, slot)| slot.count > 0).map(|(i, slot)| EdgeSpan {
            number: i / VALUES,
            to: [Value::Zero, Value::One, Value::X][i % VALUES],
            earliest: Span::from_fs(slot.earliest),
            latest: Span::from_fs(slot.latest),
            samples: slot.count,
        })
    }

    /// Samples in which a net had more edges in the window that a moment names than are told apart.
    pub fn more(&self, moment: u32, net: NetId) -> u64 {
        self.cell(moment, net).map_or(0, |cell| cell.more)
    }

    /// Adds that of other samples of the same scenario.
    pub(super) fn merge(&mut self, other: &Envelope) {
        for (ours, theirs) in self.cells.iter_mut().zip(&other.cells) {
            if ours.slots.len() < theirs.slots.len() {
                ours.slots.resize(theirs.slots.len(), Slot::default());
            }
            ours.slots.iter_mut().zip(&theirs.slots).for_each(|(ours, theirs)| ours.merge(theirs));
            ours.more += theirs.more;
        }
    }

    /// Could this be of a scenario, with these windows?
    pub(super) fn fits(&self, scenario: &Scenario, windows: &[WindowTally]) -> bool {
        let empty = Envelope::new(scenario);
        if (empty.nets, empty.moments, empty.edges) != (self.nets, self.moments, self.edges) {
            return false;
        }
        // of each sample that has an edge, it also has all before it
        self.cells.chunks(self.nets.max(1)).zip(windows).all(|(cells, window)| {
            cells.iter().all(|cell| {
                let each = cell.slots.chunks(VALUES).map(|it| it.iter().map(|slot| slot.count));
                let mut all = each.map(|mut counts| counts.try_fold(0, u64::checked_add));
                let last = all.try_fold(window.named, |most, count| count.filter(|count| *count <= most));
                last.is_some_and(|last| {
                    cell.more <= last && (cell.more == 0 || cell.slots.len() == self.edges * VALUES)
                }) && cell.slots.iter().all(|slot| slot.latest <= Time::END.fs())
            })
        })
    }
}

/// An envelope in a file: only what is there, in rising order.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Written {
    nets: usize,
    moments: usize,
    edges: usize,
    /// Moment and net as one number, number and value as one, samples, earliest, latest.
    seen: Vec<(u32, u16, u64, u64, u64)>,
    /// Moment and net, samples with more edges.
    more: Vec<(u32, u64)>,
}

impl From<Envelope> for Written {
    fn from(all: Envelope) -> Written {
        let cells = || (0u32..).zip(&all.cells);
        let seen = cells().flat_map(|(i, cell)| {
            let slots = (0u16..).zip(&cell.slots).filter(|(_, slot)| slot.count > 0);
            slots.map(move |(k, slot)| (i, k, slot.count, slot.earliest, slot.latest))
        });
        let more = cells().filter(|(_, cell)| cell.more > 0).map(|(i, cell)| (i, cell.more));
        let (seen, more) = (seen.collect(), more.collect());
        Written { nets: all.nets, moments: all.moments, edges: all.edges, seen, more }
    }
}

impl TryFrom<Written> for Envelope {
    type Error = &'static str;

    fn try_from(all: Written) -> Result<Envelope, &'static str> {
        const WRONG: &str = "an envelope that cannot be";
        let many = all.nets.checked_mul(all.moments).filter(|many| *many <= MOST).ok_or(WRONG)?;
        let fits = all.edges == 1 || many.saturating_mul(all.edges) <= MOST;
        if !(1..=MOST_EDGES).contains(&all.edges) || !fits {
            return Err(WRONG);
        }
        let mut cells = vec![Cell::default(); many];
        let rising = all.seen.windows(2).all(|it| (it[0].0, it[0].1) < (it[1].0, it[1].1))
            && all.more.windows(2).all(|it| it[0].0 < it[1].0);
        for (cell, slot, count, earliest, latest) in all.seen {
            let (slot, known) = (usize::from(slot), count > 0 && earliest <= latest);
            let cell = cells.get_mut(cell as usize).filter(|_| rising && known && slot < all.edges * VALUES);
            let slots = &mut cell.ok_or(WRONG)?.slots;
            if slots.len() <= slot {
                slots.resize((slot / VALUES + 1) * VALUES, Slot::default());
            }
            slots[slot] = Slot { count, earliest, latest };
        }
        for (cell, more) in all.more {
            cells.get_mut(cell as usize).filter(|_| more > 0).ok_or(WRONG)?.more = more;
        }
        Ok(Envelope { nets: all.nets, moments: all.moments, edges: all.edges, cells })
    }
}

/// Hears runs and adds their edges to an envelope.
#[derive(Clone, Debug)]
pub(super) struct Edges {
    pub envelope: Envelope,
    /// The first cell of the open window; `None` before the first window, and in windows that are not kept.
    from: Option<usize>,
    start: u64,
    /// Windows so far, in all runs.
    window: u64,
    /// For each net the window in which its last edge was, and the edges that it had there.
    edges: Vec<(u64, u64)>,
}

impl Edges {
    /// Nothing heard yet.
    pub fn new(scenario: &Scenario) -> Edges {
        let envelope = Envelope::new(scenario);
        let edges = vec![(0, 0); envelope.nets];
        Edges { envelope, from: None, start: 0, window: 0, edges }
    }
}

impl Observer for Edges {
    type Tag = ();

    fn start(&mut self, _state: &State) {
        self.from = None;
    }

    fn open(&mut self, opening: &Opening<'_>) {
        let moment = opening.moments[0] as usize;
        self.from = (moment < self.envelope.moments).then(|| moment * self.envelope.nets);
        self.start = opening.at.fs();
        self.window += 1;
    }

    #[inline]
    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        let Some(from) = self.from else { return };
        let seen = &mut self.edges[net.index()];
        if seen.0 != self.window {
            *seen = (self.window, 0);
        }
        let (number, most) = (seen.1, self.envelope.edges as u64);
        seen.1 += 1;
        let cell = &mut self.envelope.cells[from + net.index()];
        if number < most {
            let number = number as usize * VALUES;
            if cell.slots.len() <= number {
                cell.slots.resize(number + VALUES, Slot::default());
            }
            cell.slots[number + new as usize].add(at.fs() - self.start);
        } else if number == most {
            cell.more += 1;
        }
    }
}
