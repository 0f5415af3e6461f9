//! What the engine tells, and to whom. The engine knows no rule: it reports changes and windows.

use crate::circuit::{GateId, NetId, WireId};
use crate::logic::{State, Value};
use crate::time::{Span, Time};

/// Hears what happens in one run, in order: `start`, then for each window `open`, changes and batches, `close`; last
/// `finish`. In the batch that begins a window `close` and `open` come before its changes.
pub trait Observer {
    /// What links an event to the change that caused it: `()` for no links.
    type Tag: Copy + Default;

    /// A run begins in this state, at time 0.
    fn start(&mut self, _state: &State) {}
    /// A window begins.
    fn open(&mut self, _opening: &Opening<'_>) {}
    /// A net takes a new value. `cause` is the tag of the change, in the batch that scheduled it, that led to it; for an
    /// input the default. The result is the tag of this change.
    fn change(&mut self, at: Time, net: NetId, new: Value, cause: Self::Tag) -> Self::Tag;
    /// A change arrives at the end of a wire. The result is handed on as the cause of what follows.
    fn arrival(&mut self, _at: Time, _wire: WireId, _new: Value, cause: Self::Tag) -> Self::Tag {
        cause
    }
    /// A gate with this delay cancelled an event this long after it was scheduled (0 < age < delay).
    fn swallow(&mut self, _at: Time, _gate: GateId, _age: Span, _delay: Span) {}
    /// A pending event of a gate or a wire is cancelled, for whatever reason and however old it is.
    fn cancel(&mut self, _cancelled: &Cancelled<Self::Tag>) {}
    /// All changes of one instant have been told.
    fn batch(&mut self, _at: Time) {}
    /// A window ends.
    fn close(&mut self, _closing: &Closing<'_>) {}
    /// The run ends.
    fn finish(&mut self, _finish: &Finish<'_>) {}
}

/// Where an event is pending.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Site {
    /// At a gate's output.
    Gate(GateId),
    /// At the end of a wire.
    Wire(WireId),
}

/// An event that was cancelled before it came. `T` links events to what led to them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Cancelled<T> {
    /// When it was cancelled.
    pub at: Time,
    /// Where it was pending.
    pub site: Site,
    /// The value that it would have brought.
    pub new: Value,
    /// When it was scheduled.
    pub since: Time,
    /// When it would have come.
    pub due: Time,
    /// What led to it: a change in the batch that scheduled it.
    pub cause: T,
    /// What led to its end: a change in the batch that cancelled it.
    pub by: T,
}

impl<T> Cancelled<T> {
    /// The same with other links.
    pub fn linked<U>(&self, link: impl Fn(&T) -> U) -> Cancelled<U> {
        let Cancelled { at, site, new, since, due, .. } = *self;
        Cancelled { at, site, new, since, due, cause: link(&self.cause), by: link(&self.by) }
    }
}

/// How a window begins.
#[derive(Debug)]
pub struct Opening<'a> {
    /// The instant of the step.
    pub at: Time,
    /// The moments that fall together here; the first names the window.
    pub moments: &'a [u32],
    /// Was the circuit at rest just before?
    pub at_rest: bool,
    /// The inputs that end up with another value or bounce, in no particular order.
    pub inputs: &'a [NetId],
    /// The last input change of this step; later than `at` only with skew and bounce.
    pub settle_from: Time,
    /// The nets whose gates (or whose wires' reading gates) had events pending, and inputs with changes to come.
    pub pending: &'a [NetId],
    /// The state just before.
    pub state: &'a State,
}

/// How a window ends.
#[derive(Debug)]
pub struct Closing<'a> {
    /// The moment that names the window.
    pub moment: u32,
    /// When it began.
    pub start: Time,
    /// The last input change of its step; settling counts from here.
    pub settle_from: Time,
    /// When it ended: the next step, or the end of the run.
    pub at: Time,
    /// The last transition of a gate's net or arrival at a wire's end.
    pub last: Option<Time>,
    /// Did it begin at rest?
    pub began_at_rest: bool,
    /// How it ended.
    pub end: End,
    /// The nets that move in an oscillation with their transitions a period, of the block that recurred first.
    pub moving: &'a [(NetId, u32)],
    /// Transitions of nets in it, inputs counted.
    pub transitions: u64,
    /// The state at its end.
    pub state: &'a State,
    /// As in [`Opening::pending`]; empty when settled.
    pub pending: &'a [NetId],
}

impl Closing<'_> {
    /// From the last input change of the step to the last event; 0 if nothing moved.
    pub fn settling_time(&self) -> Span {
        self.last.map_or(Span::ZERO, |last| last.since(self.settle_from))
    }
}

/// How a run ends.
#[derive(Debug)]
pub struct Finish<'a> {
    /// The last instant that was looked at.
    pub at: Time,
    /// How the last window ended; settled if there was none.
    pub end: End,
    /// The state at the end.
    pub state: &'a State,
    /// Transitions of nets and arrivals at wire ends, in the whole run.
    pub events: u64,
    /// The moment of the step whose pattern never came: at its timeout, or since the run ended at rest or in oscillation.
    pub never_came: Option<u32>,
}

/// How a window ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    /// No event pending.
    Settled,
    /// Every block at work has recurred.
    Oscillating {
        /// Period of the block that recurred first; the mean where it is not exactly periodic.
        period: Span,
        /// Least and greatest period, where it is not exactly periodic.
        range: Option<(Span, Span)>,
    },
    /// A limit was reached with events pending.
    Unsettled(Hit),
    /// The next step, or the timeout of one that waits for a pattern, came before rest.
    Cut,
}

/// The limit that ended a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Hit {
    /// `limits.transitions`.
    Transitions,
    /// `limits.time`.
    Time,
    /// 2^63 fs from the start.
    Longest,
}

impl Hit {
    /// All limits.
    pub const ALL: [Hit; 3] = [Hit::Transitions, Hit::Time, Hit::Longest];

    /// The limit in words.
    pub const fn words(self) -> &'static str {
        match self {
            Hit::Transitions => "limits.transitions",
            Hit::Time => "limits.time",
            Hit::Longest => "the longest run (2^63 fs)",
        }
    }
}

impl End {
    /// The word used in results.
    pub const fn word(self) -> &'static str {
        match self {
            End::Settled => "settled",
            End::Oscillating { .. } => "oscillating",
            End::Unsettled(_) => "unsettled",
            End::Cut => "cut",
        }
    }
}

/// Hears nothing; for timing the kernel alone.
#[derive(Clone, Copy, Debug, Default)]
pub struct Deaf;

impl Observer for Deaf {
    type Tag = ();
    fn change(&mut self, _at: Time, _net: NetId, _new: Value, _cause: ()) {}
}

/// An observer behind a pointer: a little slower at each event, and the kernel is not built anew for it.
impl<T: Copy + Default> Observer for &mut dyn Observer<Tag = T> {
    type Tag = T;

    fn start(&mut self, state: &State) {
        (**self).start(state);
    }

    fn open(&mut self, opening: &Opening<'_>) {
        (**self).open(opening);
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, cause: T) -> T {
        (**self).change(at, net, new, cause)
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, cause: T) -> T {
        (**self).arrival(at, wire, new, cause)
    }

    fn swallow(&mut self, at: Time, gate: GateId, age: Span, delay: Span) {
        (**self).swallow(at, gate, age, delay);
    }

    fn cancel(&mut self, cancelled: &Cancelled<T>) {
        (**self).cancel(cancelled);
    }

    fn batch(&mut self, at: Time) {
        (**self).batch(at);
    }

    fn close(&mut self, closing: &Closing<'_>) {
        (**self).close(closing);
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        (**self).finish(finish);
    }
}

/// Two observers at once; the tags are those of the first.
impl<A: Observer, B: Observer<Tag = ()>> Observer for (A, B) {
    type Tag = A::Tag;

    fn start(&mut self, state: &State) {
        self.0.start(state);
        self.1.start(state);
    }

    fn open(&mut self, opening: &Opening<'_>) {
        self.0.open(opening);
        self.1.open(opening);
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, cause: A::Tag) -> A::Tag {
        self.1.change(at, net, new, ());
        self.0.change(at, net, new, cause)
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, cause: A::Tag) -> A::Tag {
        self.1.arrival(at, wire, new, ());
        self.0.arrival(at, wire, new, cause)
    }

    fn swallow(&mut self, at: Time, gate: GateId, age: Span, delay: Span) {
        self.0.swallow(at, gate, age, delay);
        self.1.swallow(at, gate, age, delay);
    }

    fn cancel(&mut self, cancelled: &Cancelled<A::Tag>) {
        self.0.cancel(cancelled);
        self.1.cancel(&cancelled.linked(|_| ()));
    }

    fn batch(&mut self, at: Time) {
        self.0.batch(at);
        self.1.batch(at);
    }

    fn close(&mut self, closing: &Closing<'_>) {
        self.0.close(closing);
        self.1.close(closing);
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        self.0.finish(finish);
        self.1.finish(finish);
    }
}
