//! What comes from outside: steps, skewed input changes, bounces, patterns that steps wait for, clock edges.

use super::plan::{From, Simple};
use crate::circuit::NetId;
use crate::instance::Instance;
use crate::logic::{State, Value};
use crate::scenario::{Place, Stimulus};
use crate::time::{Span, Time};

/// The outside events of one run that are still to come.
#[derive(Clone, Debug, Default)]
pub(super) struct Agenda {
    step: usize,
    /// Placed instant of the step before.
    last_step: Time,
    /// When the pattern that the next step waits for was true, once it was.
    came: Option<Time>,
    /// Does the next step wait for a pattern that has not come?
    waiting: bool,
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
    /// Input changes of this instant, by net: of several changes of one net the last.
    pub set: Vec<(NetId, bool)>,
    /// Inputs that bounce, and so move whatever they lead to.
    bouncing: Vec<NetId>,
    /// All values that the steps of this instant lead to, skewed ones included.
    becomes: Vec<(NetId, bool)>,
    /// The inputs among them that move.
    pub changed: Vec<NetId>,
    /// The last input change of the steps of this instant.
    pub settle_from: Time,
}

impl Due {
    /// Of several changes of one net the last; and which inputs move, from what they are in `state`.
    fn sum_up(&mut self, state: &State) {
        self.changed.clear();
        for (i, &(net, value)) in self.becomes.iter().enumerate() {
            let is_last = !self.becomes[i + 1..].iter().any(|later| later.0 == net);
            if is_last && (state.get(net.index()) != Value::from(value) || self.bouncing.contains(&net)) {
                self.changed.push(net);
            }
        }
        if self.set.len() > 1 {
            self.set.reverse();
            self.set.sort_by_key(|(net, _)| *net);
            self.set.dedup_by_key(|(net, _)| *net);
        }
    }
}

impl Agenda {
    pub(super) fn reset(&mut self, stimulus: &Stimulus, instance: &Instance) {
        self.step = 0;
        self.last_step = Time::ZERO;
        self.wait_for_pattern(stimulus);
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
        let wait = instance.places[self.step];
        match step.place {
            Place::At(_) => Some(Time::ZERO + wait),
            Place::After(_) => Some(self.last_step + wait),
            Place::Rest(_) => rest_since.map(|since| since + wait),
            Place::When { .. } => self.came.map(|came| came + wait),
        }
    }

    /// The next step begins to wait, if it is one that waits for a pattern.
    fn wait_for_pattern(&mut self, stimulus: &Stimulus) {
        self.came = None;
        self.waiting = stimulus.steps.get(self.step).is_some_and(|step| matches!(step.place, Place::When { .. }));
    }

    /// Does the next step wait for a pattern that has not come?
    #[inline]
    pub(super) fn is_waiting(&self) -> bool {
        self.waiting
    }

    /// The moment of the step that waits for a pattern.
    pub(super) fn waiting_for(&self, stimulus: &Stimulus) -> Option<u32> {
        self.waiting.then(|| stimulus.moment_of_step(self.step as u32))
    }

    /// When the step that waits for a pattern gives up.
    pub(super) fn deadline(&self, stimulus: &Stimulus) -> Option<Time> {
        match stimulus.steps.get(self.step).filter(|_| self.waiting)?.place {
            Place::When { timeout, .. } => timeout.map(|timeout| self.last_step + timeout),
            _ => None,
        }
    }

    /// Looks for the pattern that the next step waits for in the state after the batch at `now`. Returns whether it has
    /// come. It is looked for once all inputs of the step before have changed; an X is no match.
    pub(super) fn look(&mut self, stimulus: &Stimulus, now: Time, state: &State) -> bool {
        let Some(Place::When { pattern, .. }) = stimulus.steps.get(self.step).map(|step| &step.place) else {
            return false;
        };
        let matches = |(net, bit): &(NetId, bool)| state.get(net.index()) == Value::from(*bit);
        if self.is_moving() || !pattern.iter().all(matches) {
            return false;
        }
        self.came = Some(now);
        self.waiting = false;
        true
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

    /// Takes out the step that is due at `at`, at rest, if it is all that is due and is simple: its moment, the input and
    /// its value. Else nothing is done.
    #[inline(always)]
    pub(super) fn take_simple(
        &mut self,
        at: Time,
        steps: &[Simple],
        instance: &Instance,
    ) -> Option<(u32, NetId, bool)> {
        if !self.later.is_empty() || !self.clocks.is_empty() {
            return None;
        }
        let step = steps[self.step];
        let (net, value) = step.sets?;
        if let Some(next) = steps.get(self.step + 1) {
            let wait = instance.places[self.step + 1];
            match next.from {
                From::Start if Time::ZERO + wait <= at => return None,
                From::StepBefore if wait == Span::ZERO => return None,
                From::Pattern => {
                    self.came = None;
                    self.waiting = true;
                }
                _ => {}
            }
        }
        self.last_step = at;
        self.step += 1;
        Some((step.moment, net, value))
    }

    /// As [`Agenda::next`] away from rest, after [`Agenda::take_simple`] gave a step.
    #[inline(always)]
    pub(super) fn next_simple(&self, steps: &[Simple], instance: &Instance) -> Option<Time> {
        match steps.get(self.step)?.from {
            From::Start => Some(Time::ZERO + instance.places[self.step]),
            From::StepBefore => Some(self.last_step + instance.places[self.step]),
            From::Rest | From::Pattern => None,
        }
    }

    /// Takes out what is due at `at`. `quiet_since` as for [`Agenda::next`], `state` is that just before.
    pub(super) fn take(
        &mut self,
        at: Time,
        stimulus: &Stimulus,
        instance: &Instance,
        quiet_since: Option<Time>,
        state: &State,
        due: &mut Due,
    ) {
        let present = |net: NetId| state.get(net.index()) == Value::One;
        due.moments.clear();
        due.set.clear();
        due.becomes.clear();
        due.bouncing.clear();
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
                let toggles = instance.bounces.get(self.step).and_then(|of_step| of_step.get(i));
                // nothing to come where an input is set to what it has: settling does not wait for it
                let (mut held, mut next) = (before, value);
                let mut moves = std::iter::once(&Span::ZERO).chain(toggles.into_iter().flatten()).peekable();
                while let Some(since) = moves.next() {
                    let new = next;
                    next = !next;
                    // of moves at one instant only what is left in the end is one
                    if moves.peek() == Some(&since) || new == held {
                        continue;
                    }
                    held = new;
                    if toggles.is_some() && !due.bouncing.contains(&net) {
                        due.bouncing.push(net);
                    }
                    let when = at + delay + *since;
                    if when == at {
                        due.set.push((net, new));
                    } else {
                        due.settle_from = due.settle_from.max(when);
                        self.later.push((when, net, new));
                    }
                }
            }
            if self.later.len() > 1 {
                self.later.sort_by(|a, b| b.cmp(a));
            }
            self.step += 1;
            self.wait_for_pattern(stimulus);
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
        due.sum_up(state);
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
