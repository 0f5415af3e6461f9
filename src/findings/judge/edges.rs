//! Judges of edges over a whole run: distances between edges, widths of pulses.

use super::sink::Sink;
use super::span::reason_of;
use crate::circuit::NetId;
use crate::engine::End;
use crate::findings::{Fact, Kind, Measure, Reason, Subject};
use crate::logic::Value;
use crate::scenario::EdgeSpec;
use crate::time::{Span, Time};

/// The worst slack of a rule, and whether it was asked and broken in this run.
#[derive(Clone, Copy, Debug, Default)]
struct Score {
    asked: bool,
    broken: bool,
    slack: Option<i64>,
}

impl Score {
    /// Adds one measurement; is it a breach?
    fn add(&mut self, slack: i64) -> bool {
        self.asked = true;
        self.broken |= slack < 0;
        self.slack = Some(self.slack.map_or(slack, |worst| worst.min(slack)));
        slack < 0
    }
}

fn breach(kind: Kind, question: u32, net: NetId, moment: Option<u32>, slack: i64, from: Time, to: Time) -> Fact {
    let net = (kind == Kind::MinPulse).then_some(net);
    Fact {
        subject: Subject { kind, shape: None, question: Some(question), net, moment },
        breaks_rule: true,
        measure: Some(Measure { rank: slack.unsigned_abs(), value: to.since(from).fs() }),
        place: Some((from, to)),
    }
}

/// One `timing` rule.
#[derive(Clone, Debug)]
pub(super) struct Timing {
    pub from: EdgeSpec,
    pub to: EdgeSpec,
    pub min: Option<Span>,
    pub max: Option<Span>,
    pub to_is_input: bool,
    pub question: u32,
    last_from: Option<Time>,
    /// `from` edges without a `to` edge yet: the first of each moment.
    waiting: Vec<(Option<u32>, Time)>,
    from_now: bool,
    to_now: bool,
    score: Score,
}

impl Timing {
    pub(super) fn new(rule: &crate::scenario::Timing, to_is_input: bool, question: u32) -> Timing {
        Timing {
            from: rule.from,
            to: rule.to,
            min: rule.min,
            max: rule.max,
            to_is_input,
            question,
            last_from: None,
            waiting: Vec::new(),
            from_now: false,
            to_now: false,
            score: Score::default(),
        }
    }

    pub(super) fn start(&mut self) {
        (self.last_from, self.from_now, self.to_now, self.score) = (None, false, false, Score::default());
        self.waiting.clear();
    }

    /// A net of the rule changes.
    pub(super) fn change(&mut self, net: NetId, new: Value) {
        let Some(new) = new.known() else { return };
        self.from_now |= net == self.from.net && self.from.edge.is(new);
        self.to_now |= net == self.to.net && self.to.edge.is(new);
    }

    /// All changes of an instant are known.
    pub(super) fn batch(&mut self, at: Time, moment: Option<u32>, late: &mut impl FnMut(Fact)) {
        // one change of one net is one edge, and no edge is measured against itself
        let same_net = self.from.net == self.to.net;
        if self.from_now && !same_net {
            self.arm(at, moment);
        }
        if self.to_now {
            if let Some(min) = self.min {
                self.score.asked = true;
                if let Some(from) = self.last_from {
                    let slack = at.since(from).fs() as i64 - min.fs() as i64;
                    if self.score.add(slack) {
                        late(breach(Kind::Timing, self.question, self.to.net, moment, slack, from, at));
                    }
                }
            }
            if let Some(max) = self.max {
                for (moment, from) in self.waiting.drain(..) {
                    let slack = max.fs() as i64 - at.since(from).fs() as i64;
                    if self.score.add(slack) {
                        late(breach(Kind::Timing, self.question, self.to.net, moment, slack, from, at));
                    }
                }
            }
        }
        if self.from_now && same_net {
            self.arm(at, moment);
        }
        (self.from_now, self.to_now) = (false, false);
    }

    fn arm(&mut self, at: Time, moment: Option<u32>) {
        self.last_from = Some(at);
        if self.max.is_some() && self.waiting.last().is_none_or(|last| last.0 != moment) {
            self.waiting.push((moment, at));
        }
    }

    pub(super) fn finish(
        &mut self,
        at: Time,
        end: End,
        unseen: Option<Reason>,
        late: &mut impl FnMut(Fact),
        sink: &mut impl Sink,
    ) {
        let mut open = unseen;
        if let Some(max) = self.max {
            for (moment, from) in self.waiting.drain(..) {
                let slack = max.fs() as i64 - at.since(from).fs() as i64;
                let never_comes = end == End::Settled && unseen.is_none() && !self.to_is_input;
                if slack < 0 || never_comes {
                    let slack = slack.min(-1);
                    self.score.add(slack);
                    let mut fact = breach(Kind::Timing, self.question, self.to.net, moment, slack, from, at);
                    if never_comes {
                        fact.measure = Some(Measure::ENDLESS);
                    }
                    late(fact);
                } else if end != End::Settled && !self.to_is_input {
                    open = open.or(Some(reason_of(end)));
                }
            }
        }
        answer(self.question, self.score, open, sink);
    }
}

fn answer(question: u32, score: Score, open: Option<Reason>, sink: &mut impl Sink) {
    match open {
        Some(reason) if !score.broken => sink.not_judged(question, reason),
        _ if score.asked => sink.judged(question, score.broken, score.slack),
        _ => {}
    }
}

/// Shortest high and low of one net.
#[derive(Clone, Debug)]
pub(super) struct MinPulse {
    pub net: NetId,
    /// Bounds of `[low, high]`.
    pub bounds: [Option<Span>; 2],
    pub question: u32,
    last: Option<Time>,
    /// The present level came from X: it may be older than it looks.
    from_unknown: bool,
    unresolved: bool,
    score: Score,
}

impl MinPulse {
    pub(super) fn new(rule: &crate::scenario::MinPulse, question: u32) -> MinPulse {
        MinPulse {
            net: rule.net,
            bounds: [rule.low, rule.high],
            question,
            last: None,
            from_unknown: false,
            unresolved: false,
            score: Score::default(),
        }
    }

    pub(super) fn start(&mut self) {
        (self.last, self.from_unknown, self.unresolved, self.score) = (None, false, false, Score::default());
    }

    pub(super) fn change(
        &mut self,
        at: Time,
        old: Value,
        new: Value,
        moment: Option<u32>,
        late: &mut impl FnMut(Fact),
    ) {
        if let Some(from) = self.last.replace(at) {
            match old.known() {
                None => self.unresolved = true,
                Some(level) => {
                    if let Some(bound) = self.bounds[usize::from(level)] {
                        let slack = at.since(from).fs() as i64 - bound.fs() as i64;
                        if slack < 0 && (self.from_unknown || new == Value::X) {
                            // it may be longer than the part of it that is known
                            self.unresolved = true;
                        } else if self.score.add(slack) {
                            late(breach(Kind::MinPulse, self.question, self.net, moment, slack, from, at));
                        }
                    }
                }
            }
        }
        self.from_unknown = old == Value::X;
    }

    pub(super) fn finish(&mut self, unseen: Option<Reason>, sink: &mut impl Sink) {
        let open = unseen.or(self.unresolved.then_some(Reason::Unresolved));
        answer(self.question, self.score, open, sink);
    }
}
