//! The judges of one run, as one observer of a fixed number of words.

mod build;
mod edges;
mod nets;
mod reference;
mod sink;
mod span;
mod states;

use edges::{MinPulse, Timing};
use nets::{Count, NONE, Settle, Watch};
use reference::AgainstReference;
pub use sink::{Answers, Routine, Seen, Sink};
use span::{ConeSet, Cones, NetWindow, Shut, reason_of};
use states::{Expect, Never, NotAtRest};
pub use states::{Match, matches, matches_any};

use super::words::{Fact, Kind, Measure, Reason, Subject};
use crate::circuit::{GateId, NetId};
use crate::engine::{Closing, End, Finish, Observer, Opening};
use crate::logic::{State, Value};
use crate::scenario::Oscillation;
use crate::time::{Span, Time};

/// Who listens to a net.
#[derive(Clone, Copy, Debug)]
enum Ear {
    Watch(u32),
    Settle(u32),
    Count(u32),
    Never { test: u32, entry: u32 },
    MinPulse(u32),
    Timing(u32),
}

/// What a change of one net matters for: read at every change, so it fits in few words.
#[derive(Clone, Copy, Debug, Default)]
struct Heard {
    /// Its ears, by number.
    first: u32,
    last: u32,
    in_loop: bool,
}

/// What a window of one moment alone keeps if it leads from rest to rest, nothing is swallowed in it and no X shows.
#[derive(Clone, Debug, Default)]
struct Usual {
    /// Is that all there is to say of it?
    routine: bool,
    /// The questions of the whole window that it keeps.
    questions: Vec<u32>,
}

/// Something happened that must be dealt with at the end of the batch.
mod due {
    pub(super) const ORDER: u8 = 1;
    pub(super) const NEVER: u8 = 2;
    pub(super) const TIMING: u8 = 4;
}

/// All judges of a scenario. The answers go to the sink.
///
/// Most windows lead from rest to rest and keep all that is asked of them. What can be told of such a window beforehand is
/// laid up as `Usual`, and the sink is told in one call at its end ([`Sink::routine`]).
#[derive(Clone, Debug)]
pub struct Judge<S> {
    /// Where the answers go.
    pub sink: S,
    inputs: u32,
    at_rest: bool,
    /// What is said of oscillation at each moment.
    oscillation: Vec<Oscillation>,
    /// Moments whose step says it itself.
    own_oscillation: Vec<bool>,
    required: Option<u32>,
    race_questions: Vec<u32>,
    oscillation_questions: Vec<u32>,
    before_rest_questions: Vec<u32>,
    /// Moment and number of the questions whether a pattern comes.
    when_questions: Vec<(u32, u32)>,
    swallowed_questions: Vec<(Option<NetId>, u32)>,
    /// Questions of each moment that wait for it to be reached.
    by_moment: Vec<Vec<u32>>,

    heard: Vec<Heard>,
    ears: Vec<Ear>,
    /// Must the value before a change be known? Only where a rule is about whole runs of values.
    keeps_values: bool,
    /// By moment.
    usual: Vec<Usual>,

    cones: Cones,
    /// The cones that the step just opened touches, and those in which something was pending then.
    touched: ConeSet,
    unclean: ConeSet,

    watches: Vec<Watch>,
    /// Are there no tests of nets but these?
    only_watches: bool,
    settles: Vec<Settle>,
    counts: Vec<Count>,
    expects: Vec<Expect>,
    not_at_rest: Vec<NotAtRest>,
    nevers: Vec<Never>,
    timings: Vec<Timing>,
    min_pulses: Vec<MinPulse>,
    against_reference: Option<AgainstReference>,
    /// What awaits the end of the batch; see [`due`].
    due: u8,

    moment: Option<u32>,
    /// When the present window began.
    opened: Time,
    /// Is this window one of a moment alone that began at rest, and so far as [`Usual`] says? The sink has then not yet
    /// been told that its moment was reached.
    routine: bool,
    /// The moments that say what is asked of oscillation in this window: those of steps that say it themselves, else
    /// the one that names the window. Empty where that is the only moment.
    oscillation_of: Vec<u32>,
    /// This run, counted from 1.
    run: u64,
    /// For each moment the last run that reached it.
    reached: Vec<u64>,
    reached_count: usize,
    values: State,
    before: State,
    has_before: bool,
    order: u64,
    /// The cones in which something is pending as the last whole window ended.
    pending: ConeSet,
    shut: End,
    unsettled: bool,
    oscillated: bool,
    cut: bool,
    swallowed: Vec<u64>,
    swallowing: Vec<u32>,
    swallowed_broken: Vec<bool>,
    late: Vec<Fact>,
}

const MIX: u64 = 0x9E37_79B9_7F4A_7C15;

/// One more change in the order of loop nets. Quick, and never kept: only the hash in the tally has to last.
#[inline]
fn in_order(hash: u64, word: u64) -> u64 {
    (hash ^ word).wrapping_mul(MIX).rotate_left(29)
}

impl<S: Sink> Judge<S> {
    /// The moments that say what is asked of oscillation in this window.
    fn oscillation_of(&self) -> &[u32] {
        if self.oscillation_of.is_empty() { self.moment.as_slice() } else { &self.oscillation_of }
    }

    /// Is an oscillation in this window allowed or wanted, so that nothing else is asked of it?
    fn spares(&self) -> bool {
        self.oscillation_of().iter().all(|moment| self.oscillation[*moment as usize] != Oscillation::Forbidden)
    }

    /// Ends the windows of nets whose cones are `touched`, as things stood when the last whole window ended.
    #[inline]
    fn close_nets(&mut self, state: &State) {
        // nothing asks whether it is spared where nothing oscillates
        let spared = matches!(self.shut, End::Oscillating { .. }) && self.spares();
        let shut = Shut { end: self.shut, pending: &self.pending };
        let (sink, touched) = (&mut self.sink, &self.touched);
        for watch in self.watches.iter_mut().filter(|it| touched.has(it.cone)) {
            watch.close(&shut, spared, state, sink);
        }
        if self.only_watches {
            return;
        }
        for settle in self.settles.iter_mut().filter(|it| touched.has(it.cone)) {
            settle.close(&shut, spared, sink);
        }
        for count in self.counts.iter_mut().filter(|it| touched.has(it.cone)) {
            count.close(&shut, sink);
        }
        for expect in self.expects.iter_mut().filter(|it| touched.has(it.cone)) {
            expect.close(&shut, state, sink);
        }
        for rest in self.not_at_rest.iter_mut().filter(|it| touched.has(it.cone)) {
            rest.close(&shut, spared, state, sink);
        }
    }

    #[inline]
    fn open_nets(&mut self, opening: &Opening<'_>) {
        let power_up = !self.at_rest && opening.moments[0] == 0;
        let names = |questions: &Vec<u32>| match opening.moments {
            [moment] => *moment,
            all => all.iter().copied().find(|m| questions[*m as usize] != NONE).unwrap_or(all[0]),
        };
        let (touched, pending) = (&self.touched, &self.unclean);
        for watch in self.watches.iter_mut().filter(|it| touched.has(it.cone)) {
            let counted = |count: &Count| count.wanted.net == watch.net && opening.moments.contains(&count.moment);
            if self.counts.iter().any(counted) {
                watch.window = None;
            } else {
                let window = NetWindow::open(names(&watch.questions), watch.cone, opening, pending);
                watch.open(window, opening.state);
            }
        }
        if self.only_watches {
            return;
        }
        for settle in self.settles.iter_mut().filter(|it| power_up || touched.has(it.cone)) {
            let moment = names(&settle.questions);
            let window = || NetWindow::open(moment, settle.cone, opening, pending);
            settle.window = settle.asks(moment).then(window);
            settle.last = None;
        }
        for count in self.counts.iter_mut().filter(|count| opening.moments.contains(&count.moment)) {
            count.open(NetWindow::open(count.moment, count.cone, opening, pending), opening.state);
        }
        for expect in self.expects.iter_mut().filter(|expect| opening.moments.contains(&expect.moment)) {
            expect.window = Some(NetWindow::open(expect.moment, expect.cone, opening, pending));
        }
        for rest in self.not_at_rest.iter_mut().filter(|it| power_up || touched.has(it.cone)) {
            rest.window = Some(NetWindow::open(names(&rest.questions), rest.cone, opening, pending));
        }
    }

    /// A window begins of which more may have to be said.
    fn open_unusual(&mut self, opening: &Opening<'_>) {
        self.routine = false;
        for (i, moment) in opening.moments.iter().enumerate() {
            let m = *moment as usize;
            self.reached[m] = self.run;
            self.sink.reached(*moment, i == 0);
            let question = self.before_rest_questions[m];
            if question != NONE {
                self.sink.judged(question, !opening.at_rest, None);
                if !opening.at_rest {
                    let subject = Subject {
                        kind: Kind::BeforeRest,
                        shape: None,
                        question: Some(question),
                        net: None,
                        moment: Some(*moment),
                    };
                    let place = Some((opening.at, opening.at));
                    self.sink.fact(Fact { subject, breaks_rule: true, measure: None, place });
                }
            }
        }
        self.reached_count += opening.moments.len();
        self.oscillation_of.extend(opening.moments.iter().filter(|moment| self.own_oscillation[**moment as usize]));
        self.has_before = opening.at_rest && !opening.state.has_unknown();
        if self.has_before {
            self.before.copy_from(opening.state);
        }
    }

    /// A window that began as usual ends.
    #[inline]
    fn close_routine(&mut self, moment: u32, closing: &Closing<'_>) {
        if let Some(reference) = &mut self.against_reference {
            reference.close(closing, Some(&self.before), &mut self.sink);
        }
        self.sink.routine(&Routine {
            moment,
            questions: &self.usual[moment as usize].questions,
            before: &self.before,
            state: closing.state,
            time: closing.settling_time(),
            order: self.order,
        });
    }

    /// A window that began as usual does not end so: what was not yet told of its beginning.
    #[cold]
    fn catch_up(&mut self, moment: u32) {
        self.sink.reached(moment, true);
        let question = self.before_rest_questions[moment as usize];
        if question != NONE {
            self.sink.kept(question);
        }
    }

    /// The whole window that ends.
    fn judge_window(&mut self, closing: &Closing<'_>) {
        let moment = closing.moment;
        let m = moment as usize;
        let spared = self.spares();
        let said_by = if self.oscillation_of.is_empty() { self.moment.as_slice() } else { &self.oscillation_of };
        let sink = &mut self.sink;
        let unresolved = closing.end == End::Settled && closing.state.has_unknown();
        let subject = |kind: Kind, question: u32| Subject {
            kind,
            shape: None,
            question: Some(question).filter(|question| *question != NONE),
            net: None,
            moment: Some(moment),
        };
        let listed = |kind: Kind| Fact {
            subject: subject(kind, NONE),
            breaks_rule: false,
            measure: None,
            place: Some((closing.start, closing.at)),
        };

        let mut oscillates = matches!(closing.end, End::Oscillating { .. });
        for said_at in said_by {
            let question = self.oscillation_questions[*said_at as usize];
            let said = self.oscillation[*said_at as usize];
            // where one is required its absence is a fact of the question, and its presence is not
            let fact = |broken: bool, measure: Option<Measure>| Fact {
                subject: Subject {
                    moment: Some(*said_at),
                    ..subject(Kind::Oscillation, if broken { question } else { NONE })
                },
                breaks_rule: broken,
                measure,
                place: Some((closing.start, closing.at)),
            };
            match closing.end {
                End::Oscillating { period, .. } => {
                    let broken = said == Oscillation::Forbidden;
                    if question != NONE {
                        sink.judged(question, broken, None);
                    }
                    // one that breaks nothing is listed once
                    if broken || oscillates {
                        sink.fact(fact(broken, Some(Measure::long(period))));
                    }
                    oscillates = false;
                }
                _ if question == NONE => {}
                _ if !closing.began_at_rest => sink.not_judged(question, Reason::BeganBeforeRest),
                End::Settled => {
                    let broken = said == Oscillation::Required;
                    sink.judged(question, broken, None);
                    if broken {
                        sink.fact(fact(true, None));
                    }
                }
                end => sink.not_judged(question, reason_of(end)),
            }
        }
        if let End::Unsettled(_) = closing.end {
            sink.fact(listed(Kind::Unsettled));
        }
        if unresolved {
            sink.fact(listed(Kind::Unresolved));
        }

        let question = self.race_questions[m];
        if question != NONE {
            match closing.end {
                _ if !closing.began_at_rest => sink.not_judged(question, Reason::BeganBeforeRest),
                End::Oscillating { .. } if spared => {}
                End::Settled if unresolved => sink.not_judged(question, Reason::Unresolved),
                End::Settled => sink.judged(question, false, None),
                end => sink.not_judged(question, reason_of(end)),
            }
        }

        if let Some(reference) = &mut self.against_reference {
            reference.close(closing, self.has_before.then_some(&self.before), sink);
        }

        for gate in self.swallowing.drain(..) {
            let worst = std::mem::take(&mut self.swallowed[gate as usize]);
            let net = NetId(self.inputs + gate);
            let under = |(only, _): &&(Option<NetId>, u32)| only.is_none_or(|only| only == net);
            let question = self.swallowed_questions.iter().find(under).map(|(_, question)| *question);
            for (broken, rule) in self.swallowed_broken.iter_mut().zip(&self.swallowed_questions) {
                *broken |= under(&rule);
            }
            sink.fact(Fact {
                subject: Subject { kind: Kind::Swallowed, shape: None, question, net: Some(net), moment: Some(moment) },
                breaks_rule: question.is_some(),
                measure: Some(Measure { rank: worst, value: worst }),
                place: None,
            });
        }

        sink.window(&Seen {
            moment,
            before: (closing.began_at_rest && self.has_before).then_some(&self.before),
            began_at_rest: closing.began_at_rest,
            end: closing.end,
            state: closing.state,
            time: match closing.end {
                End::Settled => closing.settling_time(),
                _ => closing.at.since(closing.settle_from),
            },
            order: self.order,
        });
    }
}

/// Keeps one fact a subject: the worst.
fn keep_worst(late: &mut Vec<Fact>, fact: Fact) {
    match late.iter_mut().find(|kept| kept.subject == fact.subject) {
        Some(kept) if kept.measure < fact.measure => *kept = fact,
        Some(_) => {}
        None => late.push(fact),
    }
}

impl<S: Sink> Observer for Judge<S> {
    type Tag = ();

    fn start(&mut self, state: &State) {
        (self.moment, self.opened) = (None, Time::ZERO);
        self.routine = false;
        self.oscillation_of.clear();
        self.run += 1;
        self.reached_count = 0;
        if self.keeps_values {
            self.values.copy_from(state);
        }
        self.cones.holding(&[], &mut self.pending);
        self.shut = End::Settled;
        (self.unsettled, self.oscillated, self.cut) = (false, false, false);
        (self.order, self.due, self.has_before) = (0, 0, false);
        self.late.clear();
        self.swallowed_broken.fill(false);
        for gate in self.swallowing.drain(..) {
            self.swallowed[gate as usize] = 0;
        }
        for watch in &mut self.watches {
            watch.window = None;
        }
        for settle in &mut self.settles {
            settle.window = None;
        }
        for count in &mut self.counts {
            count.window = None;
        }
        for expect in &mut self.expects {
            expect.window = None;
        }
        for rest in &mut self.not_at_rest {
            rest.window = None;
            if self.at_rest {
                rest.start(state, &mut self.sink);
            }
        }
        let moment = if self.at_rest { None } else { Some(0) };
        for never in &mut self.nevers {
            never.start(state);
            never.batch(Time::ZERO, moment, &mut |fact| keep_worst(&mut self.late, fact));
        }
        for timing in &mut self.timings {
            timing.start();
        }
        for pulse in &mut self.min_pulses {
            pulse.start();
        }
    }

    #[inline]
    fn open(&mut self, opening: &Opening<'_>) {
        self.cones.holding(opening.inputs, &mut self.touched);
        self.cones.holding(opening.pending, &mut self.unclean);
        self.close_nets(opening.state);
        self.moment = opening.moments.first().copied();
        self.opened = opening.at;
        self.oscillation_of.clear();
        match *opening.moments {
            [moment] if opening.at_rest && self.usual[moment as usize].routine => {
                self.reached[moment as usize] = self.run;
                self.reached_count += 1;
                (self.routine, self.has_before) = (true, true);
                // without X before, as in every routine window
                self.before.ones.copy_from(&opening.state.ones);
            }
            _ => self.open_unusual(opening),
        }
        if let Some(reference) = &mut self.against_reference {
            reference.open(opening.moments);
        }
        self.order = 0;
        self.due &= !due::ORDER;
        self.open_nets(opening);
    }

    #[inline]
    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        let n = net.index();
        let Heard { first, last, in_loop } = self.heard[n];
        if in_loop {
            self.order = in_order(self.order, u64::from(net.0) + 1);
            self.due |= due::ORDER;
        }
        if first == last {
            return;
        }
        let mut old = Value::X;
        if self.keeps_values {
            old = self.values.get(n);
            self.values.set(n, new);
        }
        for ear in &self.ears[first as usize..last as usize] {
            match *ear {
                Ear::Watch(i) => self.watches[i as usize].change(at, new),
                Ear::Settle(i) => self.settles[i as usize].last = Some(at),
                Ear::Count(i) => self.counts[i as usize].change(new),
                Ear::Never { test, entry } => {
                    self.nevers[test as usize].change(entry, old, new);
                    self.due |= due::NEVER;
                }
                Ear::MinPulse(i) => {
                    let late = &mut self.late;
                    self.min_pulses[i as usize].change(at, old, new, self.moment, &mut |fact| keep_worst(late, fact));
                }
                Ear::Timing(i) => {
                    self.timings[i as usize].change(net, new);
                    self.due |= due::TIMING;
                }
            }
        }
    }

    fn swallow(&mut self, _at: Time, gate: GateId, age: Span, delay: Span) {
        if self.moment.is_none() {
            return;
        }
        let share = Measure::share(age, delay).value.max(1);
        let worst = &mut self.swallowed[gate.index()];
        if *worst == 0 {
            self.swallowing.push(gate.0);
        }
        *worst = share.max(*worst);
    }

    #[inline]
    fn batch(&mut self, at: Time) {
        let due = std::mem::take(&mut self.due);
        if due == 0 {
            return;
        }
        if due & due::ORDER != 0 {
            self.order = in_order(self.order, u64::MAX);
        }
        let late = &mut self.late;
        if due & due::NEVER != 0 {
            for never in &mut self.nevers {
                never.batch(at, self.moment, &mut |fact| keep_worst(late, fact));
            }
        }
        if due & due::TIMING != 0 {
            for timing in &mut self.timings {
                timing.batch(at, self.moment, &mut |fact| keep_worst(late, fact));
            }
        }
    }

    #[inline]
    fn close(&mut self, closing: &Closing<'_>) {
        self.shut = closing.end;
        self.cones.holding(closing.pending, &mut self.pending);
        if std::mem::take(&mut self.routine) {
            if closing.end == End::Settled && self.swallowing.is_empty() {
                return self.close_routine(closing.moment, closing);
            }
            self.catch_up(closing.moment);
        }
        self.unsettled |= matches!(closing.end, End::Unsettled(_));
        self.oscillated |= matches!(closing.end, End::Oscillating { .. });
        self.cut |= closing.end == End::Cut;
        self.judge_window(closing);
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        self.shut = finish.end;
        self.touched.fill();
        self.close_nets(finish.state);
        // what comes after a pattern that never came was not seen
        let unseen = match (finish.end, finish.never_came) {
            (End::Unsettled(_), _) => Some(Reason::Unsettled),
            (_, Some(_)) => Some(Reason::NotReached),
            _ => None,
        };
        let late = &mut self.late;
        for never in &mut self.nevers {
            never.finish(finish.at, finish.end, unseen, &mut |fact| keep_worst(late, fact), &mut self.sink);
        }
        for timing in &mut self.timings {
            timing.finish(finish.at, finish.end, unseen, &mut |fact| keep_worst(late, fact), &mut self.sink);
        }
        for pulse in &mut self.min_pulses {
            pulse.finish(unseen, &mut self.sink);
        }
        for fact in self.late.drain(..) {
            self.sink.fact(fact);
        }
        for ((_, question), broken) in self.swallowed_questions.iter().zip(&self.swallowed_broken) {
            match unseen {
                Some(reason) if !broken => self.sink.not_judged(*question, reason),
                _ => self.sink.judged(*question, *broken, None),
            }
        }
        if let Some(question) = self.required {
            match unseen {
                _ if self.oscillated => self.sink.judged(question, false, None),
                Some(reason) => self.sink.not_judged(question, reason),
                // a window that was cut may have been on its way to recur
                None if self.cut => self.sink.not_judged(question, Reason::Cut),
                None => {
                    self.sink.judged(question, true, None);
                    let kind = Kind::Oscillation;
                    let subject = Subject { kind, shape: None, question: Some(question), net: None, moment: None };
                    self.sink.fact(Fact { subject, breaks_rule: true, measure: None, place: None });
                }
            }
        }
        if self.reached_count < self.reached.len() {
            for (moment, _) in self.reached.iter().enumerate().filter(|(_, reached)| **reached != self.run) {
                for question in &self.by_moment[moment] {
                    self.sink.not_judged(*question, Reason::NotReached);
                }
            }
        }
        for (moment, question) in &self.when_questions {
            let never_came = finish.never_came == Some(*moment);
            if !never_came && self.reached[*moment as usize] != self.run {
                self.sink.not_judged(*question, Reason::NotReached);
                continue;
            }
            self.sink.judged(*question, never_came, None);
            if never_came {
                let (kind, question, moment) = (Kind::NeverCame, Some(*question), Some(*moment));
                let subject = Subject { kind, shape: None, question, net: None, moment };
                let place = Some((self.opened, finish.at));
                self.sink.fact(Fact { subject, breaks_rule: true, measure: None, place });
            }
        }
    }
}
