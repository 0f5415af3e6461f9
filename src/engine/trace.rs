//! The one list of transitions in the program; only single runs keep one.

use crate::circuit::{NetId, WireId};
use crate::engine::{Closing, End, Finish, Observer};
use crate::logic::{State, Value};
use crate::time::{Span, Time};

/// Everything that happened in one run.
#[derive(Clone, Debug, Default)]
pub struct Trace {
    /// The state at the start.
    pub start: State,
    /// Transitions of nets, in order; those of one instant form a batch.
    pub changes: Vec<Change>,
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
    /// The change that led to it, by index; `None` for inputs and for what a power-up state led to.
    pub cause: Option<u32>,
}

/// One window of a run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Window {
    /// The moment that names it.
    pub moment: u32,
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

/// The index of a change plus one; 0 for none.
#[derive(Clone, Copy, Debug, Default)]
pub struct Link(u32);

impl Observer for Trace {
    type Tag = Link;

    fn start(&mut self, state: &State) {
        *self = Trace { start: state.clone(), ..Trace::default() };
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, cause: Link) -> Link {
        self.changes.push(Change { at, net, new, cause: cause.0.checked_sub(1) });
        Link(self.changes.len() as u32)
    }

    fn arrival(&mut self, _at: Time, _wire: WireId, _new: Value, cause: Link) -> Link {
        cause
    }

    fn close(&mut self, closing: &Closing<'_>) {
        self.windows.push(Window {
            moment: closing.moment,
            start: closing.start,
            settle_from: closing.settle_from,
            stop: closing.at,
            began_at_rest: closing.began_at_rest,
            end: closing.end,
            settling: (closing.end == End::Settled).then(|| closing.settling_time()),
            state: closing.state.clone(),
            moving: closing.moving.to_vec(),
        });
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
