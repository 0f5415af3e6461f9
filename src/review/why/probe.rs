//! One question put to many cases: does this one show the finding?

use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::{End, Finish, Machine, Observer, Program};
use crate::findings::{Asked, Fact, Judge, Kind, Reason, Seen, Sink, Subject};
use crate::instance::Instance;
use crate::logic::Value;
use crate::scenario::Scenario;
use crate::sweep::{Fork, SweepReport};
use crate::time::Time;

/// What stopped a search early.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Cut {
    /// This many runs.
    Runs(u64),
    /// Runs with this many events together.
    Events(u64),
    /// The caller.
    Interrupted,
}

/// How much running is allowed.
#[derive(Clone, Copy, Debug)]
pub(super) struct Budget {
    pub runs: u64,
    /// Transitions and arrivals in all runs; the run that goes beyond it is the last.
    pub events: u64,
}

/// Runs cases and looks for one subject.
pub(super) struct Probe<'a> {
    machine: Machine<()>,
    hears: (Events, Judge<Shown<'a>>),
    control: &'a Control,
    runs: u64,
}

impl<'a> Probe<'a> {
    pub fn new(
        scenario: &Scenario,
        program: &Program,
        asked: &Asked,
        sweep: &'a SweepReport,
        subject: Subject,
        control: &'a Control,
    ) -> Probe<'a> {
        let race = subject.moment.filter(|_| subject.kind == Kind::CriticalRace);
        let forks = race.and_then(|moment| sweep.windows.get(moment as usize)).map_or(&[][..], |it| &it.forks);
        let shown = Shown { subject, forks, shown: false };
        let hears = (Events(0), Judge::new(scenario, asked, shown));
        Probe { machine: program.machine(), hears, control, runs: 0 }
    }

    /// Runs so far.
    pub fn runs(&self) -> u64 {
        self.runs
    }

    /// Does this case show it? For a race: does it go, from a state from which the sweep saw several ends, to another than
    /// the commonest of them?
    pub fn shows(&mut self, case: &Instance, budget: Budget) -> Result<bool, Cut> {
        if self.runs >= budget.runs {
            return Err(Cut::Runs(budget.runs));
        }
        if self.hears.0.0 >= budget.events {
            return Err(Cut::Events(budget.events));
        }
        self.runs += 1;
        self.hears.1.sink.shown = false;
        match self.machine.hear(case, self.control, &mut self.hears) && !self.control.cancelled() {
            true => Ok(self.hears.1.sink.shown),
            false => Err(Cut::Interrupted),
        }
    }
}

/// Counts events over all runs.
struct Events(u64);

impl Observer for Events {
    type Tag = ();
    fn change(&mut self, _at: Time, _net: NetId, _new: Value, _cause: ()) {}
    fn finish(&mut self, finish: &Finish<'_>) {
        // a run without any event costs something, too
        self.0 += finish.events + 1;
    }
}

/// Hears whether the subject comes.
struct Shown<'a> {
    subject: Subject,
    forks: &'a [Fork],
    shown: bool,
}

/// Does a window end elsewhere than where its state before mostly leads?
pub(super) fn strays(forks: &[Fork], seen: &Seen<'_>) -> bool {
    let (Some(before), End::Settled, false) = (seen.before, seen.end, seen.state.has_unknown()) else { return false };
    let fork = forks.binary_search_by(|fork| fork.before.cmp(before));
    fork.is_ok_and(|it| forks[it].commonest != *seen.state)
}

impl Sink for Shown<'_> {
    fn judged(&mut self, _question: u32, _broken: bool, _slack: Option<i64>) {}
    fn not_judged(&mut self, _question: u32, _reason: Reason) {}
    fn fact(&mut self, fact: Fact) {
        self.shown |= fact.subject == self.subject;
    }
    fn reached(&mut self, _moment: u32, _named: bool) {}
    fn window(&mut self, seen: &Seen<'_>) {
        self.shown |= Some(seen.moment) == self.subject.moment && strays(self.forks, seen);
    }
}
