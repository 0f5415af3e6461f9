//! The one list of transitions in the program; only single runs keep one.

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
        *self = Trace { start: state.clone(), ..Trace::default() };
    }

    fn open(&mut self, opening: &Opening<'_>) {
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
        let (cause, through) = match cause {
            Link::Start => (None, None),
            Link::Change(change) => (Some(change), None),
            Link::Arrival(arrival) => (self.arrivals[arrival as usize].cause, Some(arrival)),
        };
        self.changes.push(Change { at, net, new, cause, through, batch: self.batches });
        Link::Change(self.changes.len() as u32 - 1)
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, cause: Link) -> Link {
        let cause = match cause {
            Link::Change(change) => Some(change),
            // a wire reads a net, and carries nothing but its changes
            Link::Start | Link::Arrival(_) => None,
        };
        self.arrivals.push(Arrival { at, wire, new, cause, batch: self.batches });
        Link::Arrival(self.arrivals.len() as u32 - 1)
    }

    fn cancel(&mut self, cancelled: &Cancelled<Link>) {
        self.lost.push(Lost { event: *cancelled, batch: self.batches });
    }

    fn batch(&mut self, _at: Time) {
        self.batches += 1;
    }

    fn close(&mut self, closing: &Closing<'_>) {
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

impl Trace {
    /// For each net, its transitions as (time, new value), in order.
    pub fn by_net(&self, nets: usize) -> Vec<Vec<(Time, Value)>> {
        let mut all = vec![Vec::new(); nets];
        for change in &self.changes {
            all[change.net.index()].push((change.at, change.new));
        }
        all
    }
}
