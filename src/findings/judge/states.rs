//! Judges of partial states: where nets must rest, where they must not, what must never show.

use super::sink::Sink;
use super::span::{NetWindow, Shut, reason_of};
use crate::engine::End;
use crate::findings::{Fact, Kind, Measure, Reason, Subject};
use crate::logic::{State, Value};
use crate::scenario::Alternative;
use crate::time::{Span, Time};

/// Does a state match a partial state?
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Match {
    /// Surely.
    Yes,
    /// Surely not.
    No,
    /// It depends on an X.
    Maybe,
}

/// Does `state` match all of `pattern`?
pub fn matches(pattern: &Alternative, state: &State) -> Match {
    let mut all = Match::Yes;
    for (net, wanted) in pattern {
        match state.get(net.index()).known() {
            Some(value) if value == *wanted => {}
            Some(_) => return Match::No,
            None => all = Match::Maybe,
        }
    }
    all
}

/// Does `state` match any of `alternatives`?
pub fn matches_any(alternatives: &[Alternative], state: &State) -> Match {
    let mut any = Match::No;
    for alternative in alternatives {
        match matches(alternative, state) {
            Match::Yes => return Match::Yes,
            Match::Maybe => any = Match::Maybe,
            Match::No => {}
        }
    }
    any
}

/// `expect` of one step.
#[derive(Clone, Debug)]
pub(super) struct Expect {
    pub alternatives: Vec<Alternative>,
    pub cone: u32,
    pub moment: u32,
    pub question: u32,
    pub window: Option<NetWindow>,
}

impl Expect {
    pub(super) fn close(&mut self, shut: &Shut<'_>, state: &State, sink: &mut impl Sink) {
        let Some(window) = self.window.take() else { return };
        if let Some(reason) = window.obstacle(self.cone, shut) {
            return sink.not_judged(self.question, reason);
        }
        match matches_any(&self.alternatives, state) {
            Match::Maybe => sink.not_judged(self.question, Reason::Unresolved),
            Match::Yes => sink.kept(self.question),
            Match::No => {
                sink.judged(self.question, true, None);
                sink.fact(plain_fact(Kind::Expect, self.question, Some(self.moment)));
            }
        }
    }
}

fn plain_fact(kind: Kind, question: u32, moment: Option<u32>) -> Fact {
    let subject = Subject { kind, shape: None, question: Some(question), net: None, moment };
    Fact { subject, breaks_rule: true, measure: None, place: None }
}

/// One `never_at_rest` pattern.
#[derive(Clone, Debug)]
pub(super) struct NotAtRest {
    pub pattern: Alternative,
    pub cone: u32,
    /// The question of the state at the start.
    pub at_start: u32,
    /// The question of each moment.
    pub questions: super::nets::ByMoment,
    pub window: Option<NetWindow>,
}

impl NotAtRest {
    /// The state at the start of a run that begins at rest.
    pub(super) fn start(&mut self, state: &State, sink: &mut impl Sink) {
        self.window = None;
        if self.at_start != super::nets::NONE {
            self.judge(self.at_start, None, state, sink);
        }
    }

    pub(super) fn close(&mut self, shut: &Shut<'_>, spared: bool, state: &State, sink: &mut impl Sink) {
        let Some(window) = self.window.take() else { return };
        let question = self.questions[window.moment as usize];
        if question == super::nets::NONE {
            return;
        }
        match window.obstacle(self.cone, shut) {
            Some(Reason::Oscillating) if spared => {}
            Some(reason) => sink.not_judged(question, reason),
            None => self.judge(question, Some(window.moment), state, sink),
        }
    }

    fn judge(&self, question: u32, moment: Option<u32>, state: &State, sink: &mut impl Sink) {
        match matches(&self.pattern, state) {
            Match::Maybe => sink.not_judged(question, Reason::Unresolved),
            found => {
                let broken = found == Match::Yes;
                sink.judged(question, broken, None);
                if broken {
                    sink.fact(plain_fact(Kind::NeverAtRest, question, moment));
                }
            }
        }
    }
}

/// One `never` pattern, followed change by change.
#[derive(Clone, Debug)]
pub(super) struct Never {
    pub pattern: Alternative,
    pub longer_than: Span,
    pub question: u32,
    wanted: u32,
    missing: u32,
    unknown: u32,
    since: Option<(Time, Option<u32>)>,
    longest: Option<Span>,
    broken: bool,
    unresolved: bool,
}

impl Never {
    pub(super) fn new(pattern: Alternative, longer_than: Span, question: u32) -> Never {
        let wanted = pattern.len() as u32;
        Never {
            pattern,
            longer_than,
            question,
            wanted,
            missing: 0,
            unknown: 0,
            since: None,
            longest: None,
            broken: false,
            unresolved: false,
        }
    }

    pub(super) fn start(&mut self, state: &State) {
        (self.missing, self.unknown, self.since, self.longest) = (0, 0, None, None);
        (self.broken, self.unresolved) = (false, false);
        for (net, wanted) in &self.pattern {
            match state.get(net.index()).known() {
                Some(value) => self.missing += u32::from(value != *wanted),
                None => self.unknown += 1,
            }
        }
    }

    /// One net of the pattern changes.
    pub(super) fn change(&mut self, entry: u32, old: Value, new: Value) {
        let wanted = Value::from(self.pattern[entry as usize].1);
        for (value, less) in [(old, true), (new, false)] {
            let tally = match value {
                Value::X => &mut self.unknown,
                value if value != wanted => &mut self.missing,
                _ => continue,
            };
            *tally = if less { *tally - 1 } else { *tally + 1 };
        }
        debug_assert!(self.missing + self.unknown <= self.wanted);
    }

    /// All changes of an instant are known.
    pub(super) fn batch(&mut self, at: Time, moment: Option<u32>, late: &mut impl FnMut(Fact)) {
        let holds = self.missing == 0 && self.unknown == 0;
        self.unresolved |= self.missing == 0 && self.unknown > 0;
        match (self.since, holds) {
            (None, true) => {
                self.since = Some((at, moment));
                if self.longer_than == Span::ZERO {
                    self.found(Measure::long(Span::ZERO), Span::ZERO, at, moment, late);
                }
            }
            (Some((since, moment)), false) => {
                self.since = None;
                self.ended(at.since(since), since, moment, late);
            }
            _ => {}
        }
    }

    fn ended(&mut self, lasted: Span, since: Time, moment: Option<u32>, late: &mut impl FnMut(Fact)) {
        self.longest = self.longest.max(Some(lasted));
        if self.longer_than == Span::ZERO || lasted > self.longer_than {
            self.found(Measure::long(lasted), lasted, since, moment, late);
        }
    }

    fn found(&mut self, measure: Measure, lasted: Span, since: Time, moment: Option<u32>, late: &mut impl FnMut(Fact)) {
        self.broken = true;
        let measure = Some(measure);
        let place = Some((since, since + lasted));
        late(Fact { measure, place, ..plain_fact(Kind::Never, self.question, moment) });
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
        if let Some((since, moment)) = self.since.take() {
            let lasted = at.since(since);
            if end == End::Settled && unseen.is_none() {
                // still true at rest: for ever, however short the rest of the run was
                self.longest = self.longest.max(Some(lasted));
                self.found(Measure::ENDLESS, lasted, since, moment, late);
            } else {
                self.ended(lasted, since, moment, late);
                if lasted <= self.longer_than {
                    open = open.or(Some(reason_of(end)));
                }
            }
        }
        if self.broken || (open.is_none() && !self.unresolved) {
            let bound = self.longer_than.fs() as i64;
            let slack = if bound > 0 { self.longest.map(|longest| bound - longest.fs() as i64) } else { None };
            sink.judged(self.question, self.broken, slack.map(|slack| if self.broken { slack.min(-1) } else { slack }));
        } else {
            sink.not_judged(self.question, open.unwrap_or(Reason::Unresolved));
        }
    }
}
