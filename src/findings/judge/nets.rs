//! Judges of single nets in their own windows: glitches, settling, numbers of transitions.

use super::sink::Sink;
use super::span::{NetWindow, Shut};
use crate::circuit::NetId;
use crate::findings::pulses::Pulses;
use crate::findings::{Fact, Kind, Measure, Reason, Shape, Subject};
use crate::logic::{State, Value};
use crate::scenario::EdgeCount;
use crate::time::{Span, Time};

/// Questions by moment; `NONE` where nothing is asked.
pub(super) type ByMoment = Vec<u32>;
pub(super) const NONE: u32 = u32::MAX;

#[inline]
fn asked(by_moment: &ByMoment, moment: u32) -> Option<u32> {
    by_moment.get(moment as usize).copied().filter(|question| *question != NONE)
}

/// Glitches of one watched net.
#[derive(Clone, Debug)]
pub(super) struct Watch {
    pub net: NetId,
    pub cone: u32,
    /// Is the net under `glitch_free`?
    pub ruled: bool,
    pub bound: Span,
    /// The `glitch_free` question of each moment.
    pub questions: ByMoment,
    pub window: Option<NetWindow>,
    pub before: Value,
    pub pulses: Pulses,
    /// The same with no bound, for the margin; heard only where there is a bound.
    pub all: Pulses,
    /// The net was X at some time in the window.
    pub unknown: bool,
}

impl Watch {
    #[inline]
    pub(super) fn open(&mut self, window: NetWindow, state: &State) {
        self.window = Some(window);
        self.before = state.get(self.net.index());
        self.pulses.clear();
        self.all.clear();
        self.unknown = self.before == Value::X;
    }

    #[inline]
    pub(super) fn change(&mut self, at: Time, new: Value) {
        self.pulses.change(at);
        if self.bound > Span::ZERO {
            self.all.change(at);
        }
        self.unknown |= new == Value::X;
    }

    /// Whatever an X hides: if all that the net did is shorter than the bound, nothing of it counts.
    fn hidden(&self, after: Value) -> Option<Span> {
        let whole = self.pulses.whole().filter(|whole| *whole < self.bound);
        whole.filter(|_| self.unknown && self.before != Value::X && after != Value::X)
    }

    /// `spared`: an oscillation in this window is allowed, and nothing is asked of it.
    #[inline]
    pub(super) fn close(&mut self, shut: &Shut<'_>, spared: bool, state: &State, sink: &mut impl Sink) {
        let Some(window) = self.window.take() else { return };
        // most windows: all is known and there is no pulse to be wide or narrow
        if self.pulses.is_empty() && !self.unknown && window.obstacle(self.cone, shut).is_none() {
            if let Some(question) = asked(&self.questions, window.moment) {
                sink.kept(question);
            }
            return;
        }
        self.judge(window, shut, spared, state, sink);
    }

    fn judge(&mut self, window: NetWindow, shut: &Shut<'_>, spared: bool, state: &State, sink: &mut impl Sink) {
        let question = asked(&self.questions, window.moment);
        let after = state.get(self.net.index());
        let hidden = self.hidden(after);
        let unresolved = self.unknown && hidden.is_none();
        let obstacle = window.obstacle(self.cone, shut).or(unresolved.then_some(Reason::Unresolved));
        match obstacle {
            Some(Reason::Oscillating) if spared => return,
            Some(reason) => {
                if let Some(question) = question {
                    sink.not_judged(question, reason);
                }
                return;
            }
            None => {}
        }
        if let Some(whole) = hidden {
            if let Some(question) = question {
                sink.judged(question, false, Some(self.bound.fs() as i64 - whole.fs() as i64));
            }
            return;
        }
        let left = self.pulses.finish();
        let shape = match (self.before, after) {
            _ if left.pulses == 0 => None,
            (Value::Zero, Value::Zero) => Some(Shape::Static0),
            (Value::One, Value::One) => Some(Shape::Static1),
            _ if left.pulses >= 2 => Some(Shape::Dynamic),
            _ => None,
        };
        if let Some(question) = question {
            let slack = self.slack();
            // as wide as the bound is too wide
            let slack = if shape.is_some() { slack.map(|slack| slack.min(-1)) } else { slack };
            sink.judged(question, shape.is_some(), slack);
        }
        if let (Some(shape), Some(pulse)) = (shape, left.narrowest) {
            sink.fact(Fact {
                subject: Subject {
                    kind: Kind::Glitch,
                    shape: Some(shape),
                    question,
                    net: Some(self.net),
                    moment: Some(window.moment),
                },
                breaks_rule: self.ruled,
                measure: Some(Measure::long(pulse.width)),
                place: Some((pulse.start, pulse.start + pulse.width)),
            });
        }
    }

    /// How far the bound is above the widest pulse that it must strike out, where pulses are tolerated.
    fn slack(&mut self) -> Option<i64> {
        if self.bound == Span::ZERO {
            return None;
        }
        let left = self.all.finish();
        let widest = left.widest.max(self.all.widest_struck())?;
        Some(self.bound.fs() as i64 - widest.fs() as i64)
    }
}

/// The settling time of one watched net.
#[derive(Clone, Debug)]
pub(super) struct Settle {
    pub net: NetId,
    pub cone: u32,
    /// The question and the bound of each moment.
    pub questions: ByMoment,
    pub bounds: Vec<Span>,
    pub window: Option<NetWindow>,
    pub last: Option<Time>,
}

impl Settle {
    pub(super) fn asks(&self, moment: u32) -> bool {
        asked(&self.questions, moment).is_some()
    }

    pub(super) fn close(&mut self, shut: &Shut<'_>, spared: bool, sink: &mut impl Sink) {
        let Some(window) = self.window.take() else { return };
        let Some(question) = asked(&self.questions, window.moment) else { return };
        let bound = self.bounds[window.moment as usize];
        let took = self.last.map_or(Span::ZERO, |last| last.since(window.settle_from));
        let slack = bound.fs() as i64 - took.fs() as i64;
        match window.obstacle(self.cone, shut) {
            Some(Reason::Oscillating) if spared => return,
            Some(Reason::BeganBeforeRest) => return sink.not_judged(question, Reason::BeganBeforeRest),
            Some(reason) if slack >= 0 => return sink.not_judged(question, reason),
            _ => sink.judged(question, slack < 0, Some(slack)),
        }
        if slack < 0 {
            sink.fact(Fact {
                subject: Subject {
                    kind: Kind::SettleWithin,
                    shape: None,
                    question: Some(question),
                    net: Some(self.net),
                    moment: Some(window.moment),
                },
                breaks_rule: true,
                measure: Some(Measure::long(took)),
                place: Some((window.settle_from, window.settle_from + took)),
            });
        }
    }
}

/// The number of transitions of one net after one step.
#[derive(Clone, Debug)]
pub(super) struct Count {
    pub wanted: EdgeCount,
    pub cone: u32,
    pub moment: u32,
    pub question: u32,
    pub window: Option<NetWindow>,
    pub transitions: u64,
    /// The net was X at some time in the window.
    pub unknown: bool,
}

impl Count {
    pub(super) fn open(&mut self, window: NetWindow, state: &State) {
        self.window = Some(window);
        self.transitions = 0;
        self.unknown = state.get(self.wanted.net.index()) == Value::X;
    }

    #[inline]
    pub(super) fn change(&mut self, new: Value) {
        self.transitions += 1;
        self.unknown |= new == Value::X;
    }

    pub(super) fn close(&mut self, shut: &Shut<'_>, sink: &mut impl Sink) {
        let Some(window) = self.window.take() else { return };
        let unresolved = self.unknown.then_some(Reason::Unresolved);
        if let Some(reason) = window.obstacle(self.cone, shut).or(unresolved) {
            return sink.not_judged(self.question, reason);
        }
        let wanted = u64::from(self.wanted.least)..=u64::from(self.wanted.most);
        let broken = !wanted.contains(&self.transitions);
        sink.judged(self.question, broken, None);
        if broken {
            sink.fact(Fact {
                subject: Subject {
                    kind: Kind::Edges,
                    shape: None,
                    question: Some(self.question),
                    net: Some(self.wanted.net),
                    moment: Some(self.moment),
                },
                breaks_rule: true,
                measure: None,
                place: None,
            });
        }
    }
}
