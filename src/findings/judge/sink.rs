//! Where judges put their answers.

use crate::engine::End;
use crate::findings::{Departed, Departure, Fact, Reason};
use crate::logic::State;
use crate::time::Span;

/// Takes the answers of one run, in the order in which they are known.
pub trait Sink {
    /// A question was judged in this run. `slack` in fs, negative when broken; `None` where there is no number.
    fn judged(&mut self, question: u32, broken: bool, slack: Option<i64>);
    /// A question could not be judged in this run.
    fn not_judged(&mut self, question: u32, reason: Reason);
    /// A question was judged in this run, kept, and has no number: [`Sink::judged`] in the case that is met most.
    #[inline]
    fn kept(&mut self, question: u32) {
        self.judged(question, false, None);
    }
    /// Something was found; at most once a run for each subject.
    fn fact(&mut self, fact: Fact);
    /// A window ended in a state that the reference does not allow; told before [`Sink::window`], once for each window.
    fn departed(&mut self, _departed: &Departed<'_>) {}
    /// A moment came. `named` says whether the window is named after it.
    fn reached(&mut self, moment: u32, named: bool);
    /// A window ended.
    fn window(&mut self, window: &Seen<'_>);
    /// A window ended in which nothing but the usual happened; in its one call it tells all that the others would.
    #[inline]
    fn routine(&mut self, routine: &Routine<'_>) {
        self.reached(routine.moment, true);
        routine.questions.iter().for_each(|question| self.kept(*question));
        self.window(&Seen {
            moment: routine.moment,
            before: Some(routine.before),
            began_at_rest: true,
            end: End::Settled,
            state: routine.state,
            time: routine.time,
            order: routine.order,
        });
    }
}

/// A window of one moment alone, from rest to rest, with no X before or after, which keeps all that is asked of it.
#[derive(Debug)]
pub struct Routine<'a> {
    /// The moment.
    pub moment: u32,
    /// The questions that it keeps, none of which has a number: in each such window of a moment the same.
    pub questions: &'a [u32],
    /// The state before its step.
    pub before: &'a State,
    /// The state at its end.
    pub state: &'a State,
    /// From the last input change to the last event.
    pub time: Span,
    /// A hash of the order in which loop nets changed.
    pub order: u64,
}

/// A window that ended.
#[derive(Debug)]
pub struct Seen<'a> {
    /// The moment that names it.
    pub moment: u32,
    /// The state before its step, if it began at rest and without X.
    pub before: Option<&'a State>,
    /// Did it begin at rest?
    pub began_at_rest: bool,
    /// How it ended.
    pub end: End,
    /// The state at its end.
    pub state: &'a State,
    /// From the last input change to the last event; for a cut window to its end.
    pub time: Span,
    /// A hash of the order in which loop nets changed.
    pub order: u64,
}

/// Everything that was answered in a single run, in the order in which it was known.
#[derive(Clone, Debug, Default)]
pub struct Answers {
    /// What was found.
    pub facts: Vec<Fact>,
    /// Questions judged.
    pub judged: u64,
    /// Questions that could not be judged, and why.
    pub not_judged: Vec<(u32, Reason)>,
    /// Windows that ended where the reference does not allow it.
    pub departures: Vec<Departure>,
}

impl Sink for Answers {
    fn judged(&mut self, _question: u32, _broken: bool, _slack: Option<i64>) {
        self.judged += 1;
    }
    fn not_judged(&mut self, question: u32, reason: Reason) {
        self.not_judged.push((question, reason));
    }
    fn fact(&mut self, fact: Fact) {
        self.facts.push(fact);
    }
    fn departed(&mut self, departed: &Departed<'_>) {
        self.departures.push(departed.kept());
    }
    fn reached(&mut self, _moment: u32, _named: bool) {}
    fn window(&mut self, _window: &Seen<'_>) {}
}
