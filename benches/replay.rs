//! What a run told its observer, kept and told again: what an observer costs by itself.

use stillgate::circuit::{GateId, NetId};
use stillgate::engine::{Closing, End, Finish, Observer, Opening};
use stillgate::logic::{State, Value};
use stillgate::time::{Span, Time};

/// One call.
enum Call {
    Start(State),
    Open {
        at: Time,
        moments: Vec<u32>,
        at_rest: bool,
        inputs: Vec<NetId>,
        settle_from: Time,
        pending: Vec<NetId>,
        state: State,
    },
    Change(Time, NetId, Value),
    Swallow(Time, GateId, Span, Span),
    Batch(Time),
    Close {
        moment: u32,
        start: Time,
        settle_from: Time,
        at: Time,
        last: Option<Time>,
        began_at_rest: bool,
        end: End,
        transitions: u64,
        state: State,
        pending: Vec<NetId>,
    },
    Finish {
        at: Time,
        end: End,
        state: State,
        events: u64,
        never_came: Option<u32>,
    },
}

/// Keeps the calls of one run, but for what no judge hears: arrivals and what was cancelled.
#[derive(Default)]
pub struct Record {
    calls: Vec<Call>,
    /// Changes of nets.
    pub changes: u64,
}

impl Observer for Record {
    type Tag = ();

    fn start(&mut self, state: &State) {
        self.calls.push(Call::Start(state.clone()));
    }

    fn open(&mut self, it: &Opening<'_>) {
        let (moments, inputs, pending) = (it.moments.to_vec(), it.inputs.to_vec(), it.pending.to_vec());
        let &Opening { at, at_rest, settle_from, .. } = it;
        self.calls.push(Call::Open { at, moments, at_rest, inputs, settle_from, pending, state: it.state.clone() });
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        self.changes += 1;
        self.calls.push(Call::Change(at, net, new));
    }

    fn swallow(&mut self, at: Time, gate: GateId, age: Span, delay: Span) {
        self.calls.push(Call::Swallow(at, gate, age, delay));
    }

    fn batch(&mut self, at: Time) {
        self.calls.push(Call::Batch(at));
    }

    fn close(&mut self, it: &Closing<'_>) {
        assert!(it.moving.is_empty(), "the circuits measured do not oscillate");
        let &Closing { moment, start, settle_from, at, last, began_at_rest, end, transitions, .. } = it;
        let (state, pending) = (it.state.clone(), it.pending.to_vec());
        self.calls.push(Call::Close {
            moment,
            start,
            settle_from,
            at,
            last,
            began_at_rest,
            end,
            transitions,
            state,
            pending,
        });
    }

    fn finish(&mut self, it: &Finish<'_>) {
        let &Finish { at, end, events, never_came, .. } = it;
        self.calls.push(Call::Finish { at, end, state: it.state.clone(), events, never_came });
    }
}

impl Record {
    /// Tells an observer the run.
    pub fn tell(&self, observer: &mut impl Observer<Tag = ()>) {
        for call in &self.calls {
            match call {
                Call::Start(state) => observer.start(state),
                Call::Open { at, moments, at_rest, inputs, settle_from, pending, state } => observer.open(&Opening {
                    at: *at,
                    moments,
                    at_rest: *at_rest,
                    inputs,
                    settle_from: *settle_from,
                    pending,
                    state,
                }),
                Call::Change(at, net, new) => observer.change(*at, *net, *new, ()),
                Call::Swallow(at, gate, age, delay) => observer.swallow(*at, *gate, *age, *delay),
                Call::Batch(at) => observer.batch(*at),
                Call::Close {
                    moment,
                    start,
                    settle_from,
                    at,
                    last,
                    began_at_rest,
                    end,
                    transitions,
                    state,
                    pending,
                } => observer.close(&Closing {
                    moment: *moment,
                    start: *start,
                    settle_from: *settle_from,
                    at: *at,
                    last: *last,
                    began_at_rest: *began_at_rest,
                    end: *end,
                    moving: &[],
                    transitions: *transitions,
                    state,
                    pending,
                }),
                Call::Finish { at, end, state, events, never_came } => {
                    observer.finish(&Finish { at: *at, end: *end, state, events: *events, never_came: *never_came })
                }
            }
        }
    }
}
