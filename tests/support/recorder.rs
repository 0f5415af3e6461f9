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
    /// The last instant that was looked at.
    pub end: u64,
    /// The moment of the step whose pattern never came.
    pub never_came: Option<u32>,
}

/// One window.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RecordedWindow {
    pub moment: u32,
    pub opening: RecordedOpening,
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
    /// Nets with events pending at the end, inputs with changes to come among them.
    pub pending: Vec<NetId>,
    /// In an exact oscillation: the nets that move, with their transitions a period.
    pub moving: Vec<(NetId, u32)>,
}

/// How it began, beyond what its end repeats.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct RecordedOpening {
    /// The moments that fall together.
    pub moments: Vec<u32>,
    /// The inputs that end up with another value.
    pub inputs: Vec<NetId>,
    /// Nets with events pending just before.
    pub pending: Vec<NetId>,
    /// The state just before.
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
        for window in &mut self.windows {
            window.opening.inputs.sort_unstable();
            for list in [&mut window.pending, &mut window.opening.pending] {
                list.sort_unstable();
                list.dedup();
            }
            window.moving.sort_unstable();
        }
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
    opening: Option<(u64, u64, bool, RecordedOpening)>,
}

impl Recorder {
    /// For a circuit of this many nets.
    pub fn new(nets: usize) -> Recorder {
        Recorder { record: Record::default(), nets, arrivals: 0, now: 0, opening: None }
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
        assert!(self.opening.is_none(), "a window opens within a window");
        self.now = opening.at.fs();
        let seen = RecordedOpening {
            moments: opening.moments.to_vec(),
            inputs: opening.inputs.to_vec(),
            pending: opening.pending.to_vec(),
            state: values(opening.state, self.nets),
        };
        self.opening = Some((self.now, opening.settle_from.fs(), opening.at_rest, seen));
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
        let (start, settle_from, at_rest, opening) = self.opening.take().expect("a window that closes was opened");
        assert_eq!((start, settle_from), (closing.start.fs(), closing.settle_from.fs()));
        assert_eq!((at_rest, opening.moments[0]), (closing.began_at_rest, closing.moment));
        self.record.windows.push(RecordedWindow {
            moment: closing.moment,
            opening,
            start: closing.start.fs(),
            settle_from: closing.settle_from.fs(),
            stop: closing.at.fs(),
            began_at_rest: closing.began_at_rest,
            end: closing.end,
            settling: (closing.end == End::Settled).then(|| closing.settling_time().fs()),
            transitions: closing.transitions,
            state: values(closing.state, self.nets),
            pending: closing.pending.to_vec(),
            moving: match closing.end {
                End::Oscillating { range: None, .. } => closing.moving.to_vec(),
                _ => Vec::new(),
            },
        });
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        assert_eq!(finish.events, self.record.changes.len() as u64 + self.arrivals, "events are what was told");
        assert!(self.opening.is_none(), "the last window is closed");
        if let Some(last) = self.record.windows.last() {
            assert_eq!((finish.end, finish.at.fs()), (last.end, last.stop), "the run ends with its last window");
            assert_eq!(values(finish.state, self.nets), last.state);
        }
        self.record.events = finish.events;
        self.record.end = finish.at.fs();
        self.record.never_came = finish.never_came;
    }
}
