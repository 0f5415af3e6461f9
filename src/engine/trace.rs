//! The one list of transitions in the program; only single runs keep one.
//!
//! A trace may be bounded ([`Trace::at_most`]): then it keeps the beginning of a run whole, and counts the rest.

use crate::circuit::{NetId, WireId};
use crate::engine::{Cancelled, Closing, End, Finish, Observer, Opening};
use crate::logic::{State, Value};
use crate::time::{Span, Time};

/// Everything that happened in one run.
#[derive(Clone, Debug, Default)]
pub struct Trace {
    /// The state at the start.
    pub start: State,
    /// Transitions of nets, in order; those of one instant form a batch.
    pub changes: Vec<Change>,
    /// Changes that arrived at the ends of wires, in order.
    pub arrivals: Vec<Arrival>,
    /// Events that were cancelled, in order.
    pub lost: Vec<Lost>,
    /// Batches so far.
    pub batches: u32,
    /// The windows, in order.
    pub windows: Vec<Window>,
    /// The last instant that was looked at.
    pub end: Time,
    /// Transitions of nets and arrivals at wire ends.
    pub events: u64,
    /// The moment of the step whose pattern never came.
    pub never_came: Option<u32>,
    /// What a bound cut off; `None` if everything is there.
    pub cut: Option<Beyond>,
    /// Most entries.
    most: Option<u64>,
    /// Entries so far.
    entries: u64,
    /// The instant in which the bound was reached.
    full: Option<Time>,
    /// Is the window that is open now the last one of the list?
    open_is_kept: bool,
}

/// What a bounded trace left out.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Beyond {
    /// Everything up to and with this instant is kept. Of what came later there is only how the window that was open
    /// then ended, when the run ended, its number of events, and these counts.
    pub after: Time,
    /// Transitions of nets that are not kept.
    pub transitions: u64,
    /// Windows that are not kept.
    pub windows: u64,
}

/// One transition of a net.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Change {
    /// When.
    pub at: Time,
    /// Which net.
    pub net: NetId,
    /// Its new value.
    pub new: Value,
    /// The change that led to it, by index: in the batch that scheduled it, or, where it came over a wire, the change
    /// that the wire carried. `None` for inputs and for what a power-up state led to.
    pub cause: Option<u32>,
    /// The arrival, by index, if the change that led to it came over a wire.
    pub through: Option<u32>,
    /// The batch, counted from 0. There may be several at one instant.
    pub batch: u32,
}

/// A change that arrived at the end of a wire.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Arrival {
    /// When.
    pub at: Time,
    /// Which wire.
    pub wire: WireId,
    /// The value that arrived.
    pub new: Value,
    /// The change that it carried, by index.
    pub cause: Option<u32>,
    /// The batch, counted from 0.
    pub batch: u32,
}

/// An event that was cancelled, in this batch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Lost {
    /// What was cancelled, and what led to it and to its end.
    pub event: Cancelled<Link>,
    /// The batch in which it was cancelled, counted from 0.
    pub batch: u32,
}

/// One window of a run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Window {
    /// The moment that names it.
    pub moment: u32,
    /// All moments that fall together here, that one first.
    pub moments: Vec<u32>,
    /// The inputs that its steps lead to another value, or that bounce.
    pub inputs: Vec<NetId>,
    /// Its first batch.
    pub batch: u32,
    /// The state before it.
    pub before: State,
    /// When it began.
    pub start: Time,
    /// The last input change of its step.
    pub settle_from: Time,
    /// When it ended.
    pub stop: Time,
    /// Did it begin at rest?
    pub began_at_rest: bool,
    /// How it ended.
    pub end: End,
    /// Settling time; `None` unless settled.
    pub settling: Option<Span>,
    /// The state at its end; meaningful if settled.
    pub state: State,
    /// In an oscillation: nets that move, with their transitions a period.
    pub moving: Vec<(NetId, u32)>,
}

/// What led to an event, by its index in the trace.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Link {
    /// The state at power-up.
    #[default]
    Start,
    /// A change of a net.
    Change(u32),
    /// A change that arrived at the end of a wire.
    Arrival(u32),
}

impl Observer for Trace {
    type Tag = Link;

    fn start(&mut self, state: &State) {
        *self = Trace { start: state.clone(), most: self.most, ..Trace::default() };
    }

    fn open(&mut self, opening: &Opening<'_>) {
        self.open_is_kept = true;
        if let Some(beyond) = self.beyond(opening.at) {
            beyond.windows += 1;
            self.open_is_kept = false;
            return;
        }
        self.entries += WINDOW + opening.state.ones.words().len() as u64 * 4 * 8 / ENTRY;
        self.windows.push(Window {
            moment: opening.moments[0],
            moments: opening.moments.to_vec(),
            inputs: opening.inputs.to_vec(),
            batch: self.batches,
            before: opening.state.clone(),
            start: opening.at,
            settle_from: opening.settle_from,
            stop: opening.at,
            began_at_rest: opening.at_rest,
            end: End::Cut,
            settling: None,
            state: opening.state.clone(),
            moving: Vec::new(),
        });
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, cause: Link) -> Link {
        if let Some(beyond) = self.beyond(at) {
            beyond.transitions += 1;
            return Link::Start;
        }
        self.entries += 1;
        let (cause, through) = match cause {
            Link::Start => (None, None),
            Link::Change(change) => (Some(change), None),
            Link::Arrival(arrival) => (self.arrivals[arrival as usize].cause, Some(arrival)),
        };
        self.changes.push(Change { at, net, new, cause, through, batch: self.batches });
        Link::Change(self.changes.len() as u32 - 1)
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, cause: Link) -> Link {
        if self.beyond(at).is_some() {
            return Link::Start;
        }
        self.entries += 1;
        let cause = match cause {
            Link::Change(change) => Some(change),
            // a wire reads a net, and carries nothing but its changes
            Link::Start | Link::Arrival(_) => None,
        };
        self.arrivals.push(Arrival { at, wire, new, cause, batch: self.batches });
        Link::Arrival(self.arrivals.len() as u32 - 1)
    }

    fn cancel(&mut self, cancelled: &Cancelled<Link>) {
        if self.beyond(cancelled.at).is_some() {
            return;
        }
        self.entries += 1;
        self.lost.push(Lost { event: *cancelled, batch: self.batches });
    }

    fn batch(&mut self, at: Time) {
        if self.cut.is_none() {
            self.batches += 1;
            if self.full.is_none() && self.most.is_some_and(|most| self.entries >= most) {
                self.full = Some(at);
            }
        }
    }

    fn close(&mut self, closing: &Closing<'_>) {
        if !std::mem::take(&mut self.open_is_kept) {
            return;
        }
        if let Some(window) = self.windows.last_mut() {
            window.stop = closing.at;
            window.end = closing.end;
            window.settling = (closing.end == End::Settled).then(|| closing.settling_time());
            window.state.copy_from(closing.state);
            window.moving = closing.moving.to_vec();
        }
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        self.end = finish.at;
        self.events = finish.events;
        self.never_came = finish.never_came;
    }
}

/// Bytes of an entry, about.
const ENTRY: u64 = 40;
/// Entries of a window without its two states.
const WINDOW: u64 = 5;

impl Trace {
    /// A trace that ends with the first instant after which it has this many entries: a transition, an arrival or a
    /// cancelled event is one (about 40 bytes), a window as many as it takes memory. A single instant is never cut.
    pub fn at_most(entries: u64) -> Trace {
        Trace { most: Some(entries), ..Trace::default() }
    }

    /// Is everything kept up to and with this instant?
    pub fn reaches(&self, at: Time) -> bool {
        self.cut.is_none_or(|cut| at <= cut.after)
    }

    /// What is left out, if this instant is beyond the bound.
    fn beyond(&mut self, at: Time) -> Option<&mut Beyond> {
        let after = self.full.filter(|full| at > *full)?;
        Some(self.cut.get_or_insert(Beyond { after, transitions: 0, windows: 0 }))
    }

    /// For each net, its transitions as (time, new value), in order.
    pub fn by_net(&self, nets: usize) -> Vec<Vec<(Time, Value)>> {
        let mut all = vec![Vec::new(); nets];
        for change in &self.changes {
            all[change.net.index()].push((change.at, change.new));
        }
        all
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Function;
    use crate::control::Control;
    use crate::engine::Program;
    use crate::instance::{Instance, Which};
    use crate::scenario::{Builder, NewDelay, NewStep, Scenario};

    /// A ring that runs for 100 ns, stops, and runs again for 100 ns; a buffer beside it moves in the same instants.
    fn ring() -> Scenario {
        let mut b = Builder::new("a ring that is let go twice");
        b.input("go", false);
        let mut wire = NewDelay::default();
        wire.delay("0.5");
        b.gate("q", Function::Nand, ["go", "q"]).delay("1").wire("q", wire.clone());
        b.gate("beside", Function::Nand, ["go", "q"]).delay("1").wire("q", wire);
        for at in ["10", "110", "210", "310"] {
            b.step(NewStep::at(at).set("go", at == "10" || at == "210"));
        }
        b.finish().unwrap()
    }

    fn traced(scenario: &Scenario, mut trace: Trace) -> Trace {
        let program = Program::new(scenario, &Control::default()).unwrap();
        let instance = Instance::of(scenario, &Which::Typ);
        assert!(program.machine().run(&instance, &Control::default(), &mut trace));
        trace
    }

    #[test]
    fn a_bounded_trace_is_the_beginning_of_the_whole_one() {
        let scenario = ring();
        let whole = traced(&scenario, Trace::default());
        assert_eq!((whole.cut, whole.windows.len()), (None, 4));
        assert!(whole.changes.len() > 200 && whole.arrivals.len() > 200);
        let all = whole.entries;
        for most in (0..all + 3).step_by(7).chain([all - 1, all, all + 1]) {
            let part = traced(&scenario, Trace::at_most(most));
            assert_eq!((part.end, part.events, &part.start), (whole.end, whole.events, &whole.start), "{most}");
            let kept = part.changes.len();
            assert_eq!(part.changes, whole.changes[..kept], "{most}");
            assert_eq!(part.arrivals, whole.arrivals[..part.arrivals.len()], "{most}");
            assert_eq!(part.lost, whole.lost[..part.lost.len()], "{most}");
            assert_eq!(part.windows, whole.windows[..part.windows.len()], "how they end is kept, too; {most}");
            let all_there = part.arrivals == whole.arrivals && part.lost == whole.lost && part.changes == whole.changes;
            assert_eq!(part.cut.is_none(), all_there && part.windows == whole.windows, "{most}");
            let Some(cut) = part.cut else { continue };
            assert!(part.entries >= most && most < all, "{most}");
            assert_eq!(cut.transitions as usize + kept, whole.changes.len(), "{most}");
            assert_eq!(cut.windows as usize + part.windows.len(), whole.windows.len(), "{most}");
            // instants are whole
            assert!(part.changes.iter().all(|change| change.at <= cut.after), "{most}");
            assert!(whole.changes[kept..].iter().all(|change| change.at > cut.after), "{most}");
            assert!(whole.arrivals[part.arrivals.len()..].iter().all(|arrival| arrival.at > cut.after), "{most}");
            assert!(part.reaches(cut.after) && !part.reaches(whole.end), "{most}");
        }
    }

    #[test]
    fn a_bounded_trace_can_be_used_again() {
        let scenario = ring();
        let first = traced(&scenario, Trace::at_most(50));
        let again = traced(&scenario, first.clone());
        assert_eq!((&again.changes, again.cut), (&first.changes, first.cut));
    }
}
