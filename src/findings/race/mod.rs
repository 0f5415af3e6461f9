//! Which two paths race, for each kind of finding: `docs/semantics.md` says what they are and why.

mod decided;
mod edges;
mod order;
mod round;

use super::asked::{Asked, Pattern};
use super::causes::Causes;
use super::paths::RacePair;
use super::words::{Fact, Kind, Subject};
use crate::circuit::NetId;
use crate::engine::Trace;
use crate::scenario::Scenario;

/// The two paths that race where `fact` was found.
///
/// `failing` is the trace of a run that shows the fact; `other` that of a run that does not, best one that differs in little:
/// it tells where a wrong state at rest was decided. A race shows in no single run: there the subject is enough, `failing`
/// ends in one state (or order) and `other` in another. `None` where there is no such pair, or it cannot be told.
pub fn race_pair(
    scenario: &Scenario,
    asked: &Asked,
    fact: &Fact,
    failing: &Trace,
    other: Option<&Trace>,
) -> Option<RacePair> {
    Races::new(scenario, asked, failing).pair(fact, other)
}

/// A run whose findings are looked into one after the other: what is needed to walk its trace is made once.
#[derive(Debug)]
pub struct Races<'a> {
    asked: &'a Asked,
    run: Causes<'a>,
}

impl<'a> Races<'a> {
    /// Makes a trace ready, in time linear in it.
    pub fn new(scenario: &'a Scenario, asked: &'a Asked, trace: &'a Trace) -> Races<'a> {
        Races { asked, run: Causes::new(scenario, trace) }
    }

    /// As [`race_pair`], for this run. `None` also where a bounded trace ends before the place of the fact.
    pub fn pair(&self, fact: &Fact, other: Option<&Trace>) -> Option<RacePair> {
        let other = other.filter(|other| other.cut.is_none());
        if self.run.trace.cut.is_some() && !fact.place.is_some_and(|(_, to)| self.run.trace.reaches(to)) {
            return None;
        }
        let other = other.map(|other| Causes::new(self.run.scenario, other));
        pair(&self.run, self.asked, fact, other)
    }
}

fn pair(run: &Causes<'_>, asked: &Asked, fact: &Fact, other: Option<Causes<'_>>) -> Option<RacePair> {
    let subject = &fact.subject;
    match subject.kind {
        Kind::Glitch | Kind::MinPulse => edges::pulse(run, subject.net?, fact.place?),
        Kind::Edges => edges::count(run, &pattern(asked, subject)?, subject),
        Kind::Never => edges::never(run, &pattern(asked, subject)?, fact.place?),
        Kind::Timing => edges::timing(run, &pattern(asked, subject)?, fact),
        Kind::SettleWithin => edges::settle(run, subject.net?, fact.place?),
        Kind::Swallowed => edges::swallowed(run, subject.net?, subject.moment?),
        Kind::Expect | Kind::NeverAtRest => {
            decided::decided(run, other.as_ref(), subject.moment?, Some(&nets_of(&pattern(asked, subject)?)))
        }
        Kind::CriticalRace | Kind::NotInReference => decided::decided(run, other.as_ref(), subject.moment?, None),
        Kind::NonCriticalRace => order::order(run, &other?, subject.moment?),
        Kind::Oscillation => round::once_round(run, subject.moment?),
        Kind::BeforeRest | Kind::NeverCame | Kind::Unsettled | Kind::Unresolved => None,
    }
}

/// The pattern of the question that a fact breaks.
fn pattern(asked: &Asked, subject: &Subject) -> Option<Pattern> {
    asked.questions.get(subject.question? as usize)?.pattern.clone()
}

/// The nets that a pattern speaks of.
fn nets_of(pattern: &Pattern) -> Vec<NetId> {
    match pattern {
        Pattern::State(state) => state.iter().map(|it| it.0).collect(),
        Pattern::OneOf(it) => it.alternatives.iter().flatten().map(|it| it.0).collect(),
        Pattern::Edges(from, to) => vec![from.net, to.net],
        Pattern::Count(count) => vec![count.net],
    }
}
