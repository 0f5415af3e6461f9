//! A record of all that an engine tells in one run, in plain numbers that can be compared and printed.

use stillgate::circuit::{GateId, NetId, WireId};
use stillgate::engine::{Closing, End, Finish, Observer, Opening};
use stillgate::logic::{State, Value};
use stillgate::time::{Span, Time};

/// One run. Times are in femtoseconds.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Record {
    /// Value of every net at the start.
    pub start: Vec<Value>,
    /// Transitions of nets: time, net, new value.
    pub changes: Vec<(u64, NetId, Value)>,
    /// Windows, in order.
    pub windows: Vec<RecordedWindow>,
    /// Swallowed pulses.
    pub swallowed: Vec<Swallow>,
    /// Transitions of nets and arrivals at wire ends.
    pub events: u64,
}

/// One window.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RecordedWindow {
    pub moment: u32,
    pub start: u64,
    pub settle_from: u64,
    pub stop: u64,
    pub began_at_rest: bool,
    pub end: End,
    /// Only if settled.
    pub settling: Option<u64>,
    /// Transitions of nets, inputs counted.
    pub transitions: u64,
    pub state: Vec<Value>,
}

/// An event cancelled `age` after it was scheduled with `delay`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Swallow {
    /// Index of the window in which that was.
    pub window: usize,
    pub at: u64,
    pub gate: usize,
    pub age: u64,
    pub delay: u64,
}

impl Record {
    /// Puts what happens at one instant, whose order means nothing, into net order and gate order.
    pub fn in_order(mut self) -> Record {
        self.changes.sort_by_key(|(at, net, _)| (*at, *net));
        self.swallowed.sort_unstable();
        self
    }

    /// The transitions of one net.
    pub fn of(&self, net: NetId) -> Vec<(u64, Value)> {
        self.changes.iter().filter(|change| change.1 == net).map(|change| (change.0, change.2)).collect()
    }
}

fn values(state: &State, nets: usize) -> Vec<Value> {
    (0..nets).map(|net| state.get(net)).collect()
}

/// Hears a run and keeps its [`Record`], with what else an observer hears kept consistent.
#[derive(Debug)]
pub struct Recorder {
    pub record: Record,
    nets: usize,
    arrivals: u64,
    now: u64,
}

impl Recorder {
    /// For a circuit of this many nets.
    pub fn new(nets: usize) -> Recorder {
        Recorder { record: Record::default(), nets, arrivals: 0, now: 0 }
    }
}

impl Observer for Recorder {
    type Tag = ();

    fn start(&mut self, state: &State) {
        *self = Recorder::new(self.nets);
        self.record.start = values(state, self.nets);
    }

    fn open(&mut self, opening: &Opening<'_>) {
        assert!(opening.at.fs() >= self.now, "time runs backwards");
        assert!(!opening.at_rest || opening.pending.is_empty(), "at rest with events pending: {opening:?}");
        assert!(opening.at_rest || !opening.pending.is_empty() || self.record.windows.is_empty(), "{opening:?}");
        self.now = opening.at.fs();
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        assert!(at.fs() >= self.now, "time runs backwards");
        self.now = at.fs();
        self.record.changes.push((at.fs(), net, new));
    }

    fn arrival(&mut self, _at: Time, _wire: WireId, _new: Value, _cause: ()) {
        self.arrivals += 1;
    }

    fn swallow(&mut self, at: Time, gate: GateId, age: Span, delay: Span) {
        let window = self.record.windows.len();
        let (age, delay) = (age.fs(), delay.fs());
        self.record.swallowed.push(Swallow { window, at: at.fs(), gate: gate.index(), age, delay });
    }

    fn close(&mut self, closing: &Closing<'_>) {
        self.record.windows.push(RecordedWindow {
            moment: closing.moment,
            start: closing.start.fs(),
            settle_from: closing.settle_from.fs(),
            stop: closing.at.fs(),
            began_at_rest: closing.began_at_rest,
            end: closing.end,
            settling: (closing.end == End::Settled).then(|| closing.settling_time().fs()),
            transitions: closing.transitions,
            state: values(closing.state, self.nets),
        });
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        assert_eq!(finish.events, self.record.changes.len() as u64 + self.arrivals, "events are what was told");
        self.record.events = finish.events;
    }
}
