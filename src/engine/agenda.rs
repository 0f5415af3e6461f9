//! What comes from outside: steps, skewed input changes, clock edges.

use crate::circuit::NetId;
use crate::instance::Instance;
use crate::scenario::{Place, Stimulus};
use crate::time::{Span, Time};

/// The outside events of one run that are still to come.
#[derive(Clone, Debug, Default)]
pub(super) struct Agenda {
    step: usize,
    /// Placed instant of the step before.
    last_step: Time,
    /// Input changes still to come, latest first.
    later: Vec<(Time, NetId, bool)>,
    /// For each clock its next edge, and when.
    clocks: Vec<(u32, Time)>,
}

/// What is due at one instant.
#[derive(Clone, Debug, Default)]
pub(super) struct Due {
    /// The moments that begin here; empty if only skewed changes are due.
    pub moments: Vec<u32>,
    /// Input changes of this instant, in the order in which they are made.
    pub set: Vec<(NetId, bool)>,
    /// All values that the steps of this instant lead to, skewed ones included.
    pub becomes: Vec<(NetId, bool)>,
    /// The last input change of the steps of this instant.
    pub settle_from: Time,
}

impl Agenda {
    pub(super) fn reset(&mut self, stimulus: &Stimulus, instance: &Instance) {
        self.step = 0;
        self.last_step = Time::ZERO;
        self.later.clear();
        self.clocks.clear();
        for (clock, case) in stimulus.clocks.iter().zip(&instance.clocks) {
            let initial = stimulus.initial[clock.net.index()];
            self.clocks.push((0, Time::from_fs(case.edge(initial, 0))));
        }
    }

    /// When the next step comes, if that is known; `rest_since` is the last instant, given only at rest.
    fn next_step(&self, stimulus: &Stimulus, instance: &Instance, rest_since: Option<Time>) -> Option<Time> {
        let step = stimulus.steps.get(self.step)?;
        if step.bounce.is_some() {
            return None;
        }
        let wait = instance.places[self.step];
        match step.place {
            Place::At(_) => Some(Time::ZERO + wait),
            Place::After(_) => Some(self.last_step + wait),
            Place::Rest(_) => rest_since.map(|since| since + wait),
            Place::When { .. } => None,
        }
    }

    /// The next listed step, if it is one that cannot be placed yet.
    pub(super) fn cannot_place(&self, stimulus: &Stimulus) -> Option<u32> {
        let step = stimulus.steps.get(self.step)?;
        let unknown = step.bounce.is_some() || matches!(step.place, Place::When { .. });
        unknown.then(|| stimulus.moment_of_step(self.step as u32))
    }

    /// The next outside event. `quiet_since`: the last instant, given only if no event is pending in the circuit.
    #[inline]
    pub(super) fn next(&self, stimulus: &Stimulus, instance: &Instance, quiet_since: Option<Time>) -> Option<Time> {
        let mut next = self.later.last().map(|change| change.0);
        for (edge, at) in &self.clocks {
            if *edge != OVER && next.is_none_or(|time| *at < time) {
                next = Some(*at);
            }
        }
        let rest_since = if next.is_none() { quiet_since } else { None };
        match (next, self.next_step(stimulus, instance, rest_since)) {
            (Some(a), Some(b)) => Some(a.min(b)),
            (a, b) => a.or(b),
        }
    }

    /// Takes out what is due at `at`. `quiet_since` as for [`Agenda::next`], `present` gives the value of an input just
    /// before.
    pub(super) fn take(
        &mut self,
        at: Time,
        stimulus: &Stimulus,
        instance: &Instance,
        quiet_since: Option<Time>,
        present: impl Fn(NetId) -> bool,
        due: &mut Due,
    ) {
        due.moments.clear();
        due.set.clear();
        due.becomes.clear();
        due.settle_from = at;
        let clocks_over = self.clocks.iter().all(|(edge, _)| *edge == OVER);
        let mut rest_since = quiet_since.filter(|_| clocks_over && self.later.is_empty());
        while self.later.last().is_some_and(|change| change.0 <= at) {
            let (_, net, value) = self.later.pop().expect("there is a last one");
            due.set.push((net, value));
        }
        while self.next_step(stimulus, instance, rest_since).is_some_and(|time| time <= at) {
            // a step at rest that follows at the same instant is a batch of its own
            rest_since = None;
            let step = &stimulus.steps[self.step];
            due.moments.push(stimulus.moment_of_step(self.step as u32));
            self.last_step = at;
            let skews = &instance.skews[self.step];
            let earliest = skews.iter().min().copied().unwrap_or(Span::ZERO);
            for (i, &(net, value)) in step.set.iter().enumerate() {
                let delay = skews.get(i).map_or(Span::ZERO, |skew| *skew - earliest);
                due.becomes.push((net, value));
                let before = due.set.iter().rfind(|set| set.0 == net).map_or_else(|| present(net), |set| set.1);
                if before == value {
                    // nothing changes: nothing is to come, and settling does not wait for it
                } else if delay == Span::ZERO {
                    due.set.push((net, value));
                } else {
                    due.settle_from = due.settle_from.max(at + delay);
                    self.later.push((at + delay, net, value));
                }
            }
            if self.later.len() > 1 {
                self.later.sort_by(|a, b| b.cmp(a));
            }
            self.step += 1;
        }
        if self.clocks.is_empty() {
            return;
        }
        let edges: u32 = stimulus.clocks.iter().map(|clock| 2 * clock.count).sum();
        let mut base = stimulus.moments.len() as u32 - edges;
        for (c, clock) in stimulus.clocks.iter().enumerate() {
            let (edge, time) = self.clocks[c];
            if edge != OVER && time <= at {
                let initial = stimulus.initial[clock.net.index()];
                due.moments.push(base + edge);
                due.set.push((clock.net, initial ^ (edge % 2 == 0)));
                due.becomes.push((clock.net, initial ^ (edge % 2 == 0)));
                let next = edge + 1;
                self.clocks[c] = if next == 2 * clock.count {
                    (OVER, Time::END)
                } else {
                    // jitter cannot change the order of edges, but it can put the first ones at the start
                    (next, Time::from_fs(instance.clocks[c].edge(initial, next)).max(at))
                };
            }
            base += 2 * clock.count;
        }
    }

    /// Inputs with changes to come.
    pub(super) fn inputs_to_come(&self) -> impl Iterator<Item = NetId> + '_ {
        self.later.iter().map(|change| change.1)
    }

    /// Are input changes of a step still to come?
    pub(super) fn is_moving(&self) -> bool {
        !self.later.is_empty()
    }
}

/// The edge number of a clock that has ended.
const OVER: u32 = u32::MAX;
