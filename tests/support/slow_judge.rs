//! A slow judge without tricks, for comparison: it keeps the whole run as plain lists and answers every question by
//! looking through them, in the words of the semantics.

use std::collections::{BTreeMap, BTreeSet};

use stillgate::circuit::{GateId, NetId, NetSet, WireId};
use stillgate::engine::{Closing, End, Finish, Observer, Opening};
use stillgate::findings::{Asked, Kind, Measure, Pattern, Question, Reason, RuleKey, Shape, Subject};
use stillgate::logic::{State, Value};
use stillgate::scenario::{Alternative, EdgeSpec, Oscillation, Scenario, Step, Swallowed};
use stillgate::time::{Span, Time};

use super::recorder::{RecordedWindow, Recorder};

/// The changes of one instant that were applied together.
#[derive(Clone, Debug)]
pub struct Batch {
    /// The number of the window in which it was.
    pub window: usize,
    pub at: u64,
    pub changes: Vec<(NetId, Value)>,
}

/// One run, complete.
#[derive(Debug)]
pub struct Log {
    pub recorder: Recorder,
    pub batches: Vec<Batch>,
    opened: usize,
}

impl Log {
    pub fn new(nets: usize) -> Log {
        Log { recorder: Recorder::new(nets), batches: Vec::new(), opened: 0 }
    }
}

impl Observer for Log {
    type Tag = ();

    fn start(&mut self, state: &State) {
        (self.batches, self.opened) = (Vec::new(), 0);
        self.recorder.start(state);
    }

    fn open(&mut self, opening: &Opening<'_>) {
        self.opened += 1;
        self.recorder.open(opening);
        self.batches.push(Batch { window: self.opened - 1, at: opening.at.fs(), changes: Vec::new() });
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        let window = self.opened.checked_sub(1).expect("nothing changes before the first window");
        if self.batches.last().is_none_or(|batch| batch.at != at.fs()) {
            self.batches.push(Batch { window, at: at.fs(), changes: Vec::new() });
        }
        self.batches.last_mut().expect("just pushed").changes.push((net, new));
        self.recorder.change(at, net, new, ());
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, _cause: ()) {
        self.recorder.arrival(at, wire, new, ());
    }

    fn swallow(&mut self, at: Time, gate: GateId, age: Span, delay: Span) {
        self.recorder.swallow(at, gate, age, delay);
    }

    fn close(&mut self, closing: &Closing<'_>) {
        self.recorder.close(closing);
    }

    fn finish(&mut self, finish: &Finish<'_>) {
        self.recorder.finish(finish);
    }
}

/// How a question was answered in one run; one that is not in the list was not asked of it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Answer {
    Judged { broken: bool, slack: Option<i64> },
    Not(Reason),
}

/// What was found about one subject.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Found {
    pub breaks_rule: bool,
    /// The worst; several that are equally bad where there is a choice.
    pub worst: Vec<Measure>,
}

/// Everything that is said of one run.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Said {
    pub answers: BTreeMap<u32, Answer>,
    pub facts: BTreeMap<Subject, Found>,
}

/// The window of a few nets: from the window in which a step touched one of them to the one before the next that did.
struct NetWindow {
    /// Its first whole window; `None`: it begins at rest with the run.
    from: Option<usize>,
    /// The number of the whole window after its last.
    to: usize,
    began_at_rest: bool,
    /// No event was pending in the cone when it ended.
    ended_at_rest: bool,
    /// The state when it ended.
    state: Vec<Value>,
}

/// A transition of a net: number of its batch, time, new value.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Move {
    batch: usize,
    at: u64,
    new: Value,
}

struct Slow<'a> {
    scenario: &'a Scenario,
    asked: &'a Asked,
    log: &'a Log,
    windows: &'a [RecordedWindow],
    said: Said,
}

/// Judges one run.
pub fn judge(scenario: &Scenario, asked: &Asked, log: &Log) -> Said {
    let windows = &log.recorder.record.windows;
    let mut slow = Slow { scenario, asked, log, windows, said: Said::default() };
    slow.not_reached();
    for number in 0..asked.questions.len() as u32 {
        let question = &asked.questions[number as usize];
        match question.rule {
            RuleKey::Never => slow.never(number, question),
            RuleKey::Expect => slow.expect(number, question),
            RuleKey::Edges => slow.edges(number, question),
            RuleKey::NeverAtRest | RuleKey::GlitchFree | RuleKey::SettleWithin | RuleKey::Reference => {}
            RuleKey::CriticalRace => slow.critical_race(number, question),
            RuleKey::Oscillation if question.moment.is_none() => slow.oscillation_somewhere(number),
            RuleKey::Oscillation => slow.oscillation(number, question),
            RuleKey::Timing => slow.timing(number, question),
            RuleKey::MinPulse => slow.min_pulse(number, question),
            RuleKey::Swallowed => slow.swallowed_rule(number, question),
            RuleKey::BeforeRest => slow.before_rest(number, question),
        }
    }
    slow.never_at_rest();
    slow.glitches();
    slow.settle_within();
    slow.listed();
    slow.said
}

fn shows(values: &[Value], pattern: &Alternative) -> Option<bool> {
    let fits = |net: &NetId, bit: bool| values[net.index()].known().map(|value| value == bit);
    let all: Vec<Option<bool>> = pattern.iter().map(|(net, bit)| fits(net, *bit)).collect();
    if all.contains(&Some(false)) {
        Some(false)
    } else if all.contains(&None) {
        None
    } else {
        Some(true)
    }
}

fn short(bound: Span, width: u64) -> i64 {
    width as i64 - bound.fs() as i64
}

impl<'a> Slow<'a> {
    fn answer(&mut self, question: u32, answer: Answer) {
        let before = self.said.answers.insert(question, answer);
        assert_eq!(before, None, "question {question} answered twice by the slow judge");
    }

    fn fact(&mut self, subject: Subject, breaks_rule: bool, measure: Option<Measure>) {
        let found = self.said.facts.entry(subject).or_insert(Found { breaks_rule, worst: Vec::new() });
        let Some(measure) = measure else { return };
        if found.worst.first().is_some_and(|worst| worst.rank < measure.rank) {
            found.worst.clear();
        }
        if found.worst.first().is_none_or(|worst| worst.rank == measure.rank) {
            found.worst.push(measure);
        }
    }

    fn subject(kind: Kind, question: Option<u32>, net: Option<NetId>, moment: Option<u32>) -> Subject {
        Subject { kind, shape: None, question, net, moment }
    }

    // ---- windows ----

    fn start(&self) -> &'a [Value] {
        &self.log.recorder.record.start
    }

    /// How the run ended.
    fn end(&self) -> End {
        self.windows.last().map_or(End::Settled, |window| window.end)
    }

    fn stopped(&self) -> bool {
        self.log.recorder.record.stopped_before.is_some()
    }

    fn step_of(&self, moment: u32) -> Option<&'a Step> {
        self.scenario.stimulus.step_of(&self.scenario.stimulus.moments[moment as usize])
    }

    /// What is said of oscillation in a window.
    fn permission(&self, window: &RecordedWindow) -> Oscillation {
        self.step_of(window.moment).and_then(|step| step.oscillation).unwrap_or(self.scenario.rules.oscillation)
    }

    /// Where oscillation is allowed or required, an oscillating window is not asked for some things.
    fn spared(&self, window: &RecordedWindow) -> bool {
        matches!(window.end, End::Oscillating { .. }) && self.permission(window) != Oscillation::Forbidden
    }

    /// Why something was still going on when this window ended.
    fn why(&self, window: &RecordedWindow) -> Reason {
        match window.end {
            End::Oscillating { .. } => Reason::Oscillating,
            End::Unsettled(_) => Reason::Unsettled,
            End::Cut => Reason::Cut,
            End::Settled => panic!("something is pending at the end of a settled window"),
        }
    }

    fn opens(&self, window: usize, cone: &NetSet) -> bool {
        self.windows[window].opening.inputs.iter().any(|net| cone.contains(*net))
    }

    /// The window of these nets that begins with this whole window, whether it touches them or not.
    fn from_window(&self, from: Option<usize>, cone: &NetSet) -> NetWindow {
        let after = from.map_or(0, |from| from + 1);
        let to = (after..self.windows.len()).find(|w| self.opens(*w, cone)).unwrap_or(self.windows.len());
        let quiet = |pending: &[NetId]| !pending.iter().any(|net| cone.contains(*net));
        let (state, pending) = match (self.windows.get(to), self.windows.last()) {
            (Some(next), _) => (next.opening.state.clone(), &next.opening.pending[..]),
            (None, Some(last)) => (last.state.clone(), &last.pending[..]),
            (None, None) => (self.start().to_vec(), &[][..]),
        };
        let began_at_rest = from.is_none_or(|from| quiet(&self.windows[from].opening.pending));
        NetWindow { from, to, began_at_rest, ended_at_rest: quiet(pending), state }
    }

    /// All windows of these nets.
    fn net_windows(&self, cone: &NetSet) -> Vec<NetWindow> {
        // power-up is the first window of every net
        let power_up = self.scenario.begin_window().is_some();
        let mut all = vec![self.from_window(power_up.then_some(0), cone)];
        while all.last().expect("one").to < self.windows.len() {
            all.push(self.from_window(Some(all.last().expect("one").to), cone));
        }
        all
    }

    /// The whole window that ended last in it.
    fn last_of(&self, window: &NetWindow) -> Option<&'a RecordedWindow> {
        window.to.checked_sub(1).map(|last| &self.windows[last])
    }

    fn spares(&self, window: &NetWindow) -> bool {
        window.began_at_rest && !window.ended_at_rest && self.last_of(window).is_some_and(|last| self.spared(last))
    }

    /// Why a window of nets is not valid, if it is not.
    fn invalid(&self, window: &NetWindow) -> Option<Reason> {
        if !window.began_at_rest {
            return Some(Reason::BeganBeforeRest);
        }
        (!window.ended_at_rest).then(|| self.why(self.last_of(window).expect("at the start nothing is pending")))
    }

    /// The question of this rule and net that a window of the net answers: that of the first of its moments that asks.
    fn name(&self, window: &NetWindow, rule: RuleKey, index: u32, net: Option<NetId>) -> Option<u32> {
        match window.from {
            None => self.asked.find(rule, index, net, None),
            Some(from) => {
                let mut moments = self.windows[from].opening.moments.iter();
                moments.find_map(|moment| self.asked.find(rule, index, net, Some(*moment)))
            }
        }
    }

    /// The whole window at whose beginning this moment came.
    fn window_of(&self, moment: u32) -> Option<usize> {
        self.windows.iter().position(|window| window.opening.moments.contains(&moment))
    }

    /// Transitions of a net in whole windows `from .. to`.
    fn moves(&self, net: NetId, from: usize, to: usize) -> Vec<Move> {
        let mut all = Vec::new();
        for (number, batch) in self.log.batches.iter().enumerate() {
            if (from..to).contains(&batch.window) {
                let of_net = batch.changes.iter().filter(|change| change.0 == net);
                all.extend(of_net.map(|change| Move { batch: number, at: batch.at, new: change.1 }));
            }
        }
        all
    }

    fn moves_in(&self, net: NetId, window: &NetWindow) -> Vec<Move> {
        window.from.map_or(Vec::new(), |from| self.moves(net, from, window.to))
    }

    // ---- questions of windows ----

    fn not_reached(&mut self) {
        for (number, question) in self.asked.questions.iter().enumerate() {
            if question.rule == RuleKey::Reference {
                self.answer(number as u32, Answer::Not(Reason::NotAnalysedYet));
            } else if question.moment.is_some_and(|moment| self.window_of(moment).is_none()) {
                let reason = if self.stopped() { Reason::NotAnalysedYet } else { Reason::NotReached };
                self.answer(number as u32, Answer::Not(reason));
            }
        }
    }

    fn never_at_rest(&mut self) {
        for (index, rule) in self.scenario.rules.never_at_rest.iter().enumerate() {
            let nets: Vec<NetId> = rule.state.iter().map(|(net, _)| *net).collect();
            let cone = self.scenario.circuit.cone(&nets);
            for window in self.net_windows(&cone) {
                let Some(number) = self.name(&window, RuleKey::NeverAtRest, index as u32, None) else { continue };
                if window.from.is_some() && self.spares(&window) {
                    continue;
                }
                // the start is a state of rest, whatever comes
                let (reason, state) = match window.from {
                    Some(_) => (self.invalid(&window), &window.state[..]),
                    None => (None, self.start()),
                };
                let answer = match (reason, shows(state, &rule.state)) {
                    (Some(reason), _) => Answer::Not(reason),
                    (None, None) => Answer::Not(Reason::Unresolved),
                    (None, Some(broken)) => Answer::Judged { broken, slack: None },
                };
                if matches!(answer, Answer::Judged { broken: true, .. }) {
                    let moment = self.asked.questions[number as usize].moment;
                    self.fact(Self::subject(Kind::NeverAtRest, Some(number), None, moment), true, None);
                }
                self.answer(number, answer);
            }
        }
    }

    fn expect(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a step");
        let Some(Pattern::OneOf(expected)) = &question.pattern else { panic!("{question:?}") };
        let Some(window) = self.window_of(moment) else { return };
        let nets: Vec<NetId> = expected.alternatives.iter().flatten().map(|(net, _)| *net).collect();
        let window = self.from_window(Some(window), &self.scenario.circuit.cone(&nets));
        let fits: Vec<Option<bool>> = expected.alternatives.iter().map(|it| shows(&window.state, it)).collect();
        let answer = match self.invalid(&window) {
            Some(reason) => Answer::Not(reason),
            None if fits.contains(&Some(true)) => Answer::Judged { broken: false, slack: None },
            None if fits.contains(&None) => Answer::Not(Reason::Unresolved),
            None => Answer::Judged { broken: true, slack: None },
        };
        if matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Expect, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    fn edges(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a step");
        let Some(Pattern::Count(count)) = &question.pattern else { panic!("{question:?}") };
        let Some(from) = self.window_of(moment) else { return };
        let window = self.from_window(Some(from), &self.scenario.circuit.cone(&[count.net]));
        let moves = self.moves_in(count.net, &window);
        let before = self.windows[from].opening.state[count.net.index()];
        let answer = if let Some(reason) = self.invalid(&window) {
            Answer::Not(reason)
        } else if before == Value::X || moves.iter().any(|it| it.new == Value::X) {
            Answer::Not(Reason::Unresolved)
        } else {
            let broken = !(count.least as usize..=count.most as usize).contains(&moves.len());
            Answer::Judged { broken, slack: None }
        };
        if matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Edges, Some(number), Some(count.net), Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    fn glitches(&mut self) {
        for net in &self.scenario.watched {
            let rule = self.scenario.rules.glitch_free.iter().position(|rule| rule.net == *net);
            let bound = rule.map_or(Span::ZERO, |rule| self.scenario.rules.glitch_free[rule].shorter_than);
            let cone = self.scenario.circuit.cone(&[*net]);
            for window in self.net_windows(&cone) {
                let Some(from) = window.from.filter(|from| Some(*from as u32) != self.scenario.begin_window()) else {
                    continue;
                };
                if self.spares(&window) || self.counts_edges(from, *net) {
                    continue;
                }
                let question = rule.and_then(|rule| self.name(&window, RuleKey::GlitchFree, rule as u32, Some(*net)));
                let moment = match question {
                    Some(number) => self.asked.questions[number as usize].moment,
                    None => Some(self.windows[from].moment),
                };
                let before = self.windows[from].opening.state[net.index()];
                let moves = self.moves_in(*net, &window);
                let whole = moves.last().map_or(0, |it| it.at) - moves.first().map_or(0, |it| it.at);
                let mut unknown = before == Value::X || moves.iter().any(|it| it.new == Value::X);
                // whatever an X hides, if all of it is shorter than the bound, it is struck out
                let hidden = unknown && before != Value::X && moves.last().is_some_and(|it| it.new == before) && whole < bound.fs();
                unknown &= !hidden;
                let reason = self.invalid(&window).or(unknown.then_some(Reason::Unresolved));
                if let Some(reason) = reason {
                    if let Some(number) = question {
                        self.answer(number, Answer::Not(reason));
                    }
                    continue;
                }
                let (left, widest) = match hidden {
                    true => (Vec::new(), Some(whole)),
                    false => strike_out(before, &moves, bound.fs()),
                };
                let broken = is_glitch(before, &left);
                let slack = widest.filter(|_| bound.fs() > 0).map(|widest| -short(bound, widest));
                if let Some(number) = question {
                    self.answer(number, Answer::Judged { broken, slack });
                }
                if broken {
                    let shape = match (left.len() % 2 == 0, before) {
                        (true, Value::Zero) => Shape::Static0,
                        (true, _) => Shape::Static1,
                        (false, _) => Shape::Dynamic,
                    };
                    let narrowest = left.windows(2).map(|pair| pair[1].at - pair[0].at).min().expect("a pulse");
                    let subject = Self::subject(Kind::Glitch, question, Some(*net), moment);
                    let measure = Measure { rank: narrowest, value: narrowest };
                    self.fact(Subject { shape: Some(shape), ..subject }, question.is_some(), Some(measure));
                }
            }
        }
    }

    /// A step at a window's beginning says how often this net must move: that replaces the glitch test.
    fn counts_edges(&self, window: usize, net: NetId) -> bool {
        let mut steps = self.windows[window].opening.moments.iter().filter_map(|moment| self.step_of(*moment));
        steps.any(|step| step.edges.iter().any(|count| count.net == net))
    }

    fn settle_within(&mut self) {
        for net in &self.scenario.watched {
            let cone = self.scenario.circuit.cone(&[*net]);
            for window in self.net_windows(&cone) {
                let Some(from) = window.from.filter(|_| !self.spares(&window)) else { continue };
                // every step of that instant that has a bound of its own, and the first that has the rule's
                let moments = self.windows[from].opening.moments.iter();
                let asks = |it: &u32| self.asked.find(RuleKey::SettleWithin, 0, Some(*net), Some(*it));
                let own = |it: &&u32| self.step_of(**it).is_some_and(|step| step.settle_within.is_some());
                let mut numbers: Vec<u32> = moments.clone().filter(own).filter_map(asks).collect();
                numbers.extend(moments.filter(|it| !own(it)).find_map(asks));
                let last = self.moves_in(*net, &window).last().map_or(0, |it| it.at);
                let time = last.saturating_sub(self.windows[from].settle_from);
                for number in numbers {
                    let question = &self.asked.questions[number as usize];
                    let bound = question.bound.expect("a bound");
                    let broken = time > bound.fs();
                    let answer = match self.invalid(&window) {
                        Some(Reason::BeganBeforeRest) => Answer::Not(Reason::BeganBeforeRest),
                        Some(reason) if !broken => Answer::Not(reason),
                        _ => Answer::Judged { broken, slack: Some(-short(bound, time)) },
                    };
                    if matches!(answer, Answer::Judged { broken: true, .. }) {
                        let subject = Self::subject(Kind::SettleWithin, Some(number), Some(*net), question.moment);
                        self.fact(subject, true, Some(Measure::long(Span::from_fs(time))));
                    }
                    self.answer(number, answer);
                }
            }
        }
    }

    /// One run alone can only say that it went from rest to rest.
    fn critical_race(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        if window.moment != moment {
            return;
        }
        let power_up = self.scenario.begin_window() == Some(moment);
        let answer = if !window.began_at_rest && !power_up {
            Answer::Not(Reason::BeganBeforeRest)
        } else if window.end != End::Settled {
            if self.spared(window) {
                return;
            }
            Answer::Not(self.why(window))
        } else if window.state.contains(&Value::X) {
            Answer::Not(Reason::Unresolved)
        } else {
            Answer::Judged { broken: false, slack: None }
        };
        self.answer(number, answer);
    }

    fn oscillation(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        let own = self.step_of(moment).and_then(|step| step.oscillation);
        if window.moment != moment && own.is_none() {
            return;
        }
        let required = own == Some(Oscillation::Required);
        let power_up = self.scenario.begin_window() == Some(moment);
        let answer = match window.end {
            End::Oscillating { .. } => Answer::Judged { broken: !required, slack: None },
            _ if !window.began_at_rest && !power_up => Answer::Not(Reason::BeganBeforeRest),
            End::Settled => Answer::Judged { broken: required, slack: None },
            _ => Answer::Not(self.why(window)),
        };
        if required && matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Oscillation, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    fn before_rest(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        let broken = !window.began_at_rest;
        if broken {
            self.fact(Self::subject(Kind::BeforeRest, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, Answer::Judged { broken, slack: None });
    }

    // ---- questions of the whole run ----

    /// Why a run that broke nothing leaves a question of the whole run open.
    fn open(&self) -> Option<Reason> {
        match self.end() {
            End::Unsettled(_) => Some(Reason::Unsettled),
            _ => self.stopped().then_some(Reason::NotAnalysedYet),
        }
    }

    fn never(&mut self, number: u32, question: &Question) {
        let Some(Pattern::State(pattern)) = &question.pattern else { panic!("{question:?}") };
        let bound = question.bound.expect("a bound").fs();
        let mut values = self.start().to_vec();
        // (time, window, shown) at the start and after every batch
        let mut states = vec![(0, self.scenario.begin_window().map(|_| 0), shows(&values, pattern))];
        for batch in &self.log.batches {
            batch.changes.iter().for_each(|(net, new)| values[net.index()] = *new);
            states.push((batch.at, Some(batch.window), shows(&values, pattern)));
        }
        let stretches = |fits: &dyn Fn(Option<bool>) -> bool| {
            // (from, window, to); `to` none: to the end
            let mut all: Vec<(u64, Option<usize>, Option<u64>)> = Vec::new();
            let mut open = false;
            for (at, window, shown) in &states {
                match (open, fits(*shown)) {
                    (false, true) => all.push((*at, *window, None)),
                    (true, false) => all.last_mut().expect("open").2 = Some(*at),
                    _ => {}
                }
                open = fits(*shown);
            }
            all
        };
        let end = self.log.recorder.record.end;
        let forever = self.end() == End::Settled && !self.stopped();
        let length = |(from, _, to): &(u64, Option<usize>, Option<u64>)| to.unwrap_or(end) - from;
        // one that lasts for ever is too long however short the rest of the run was
        let bad = |it: &(u64, Option<usize>, Option<u64>)| length(it) > bound || bound == 0 || (it.2.is_none() && forever);
        let sure = stretches(&|shown| shown == Some(true));
        let mut slack = None;
        for stretch in &sure {
            let this = bound as i64 - length(stretch) as i64;
            if bound > 0 {
                let this = if bad(stretch) { this.min(-1) } else { this };
                slack = Some(slack.map_or(this, |slack: i64| slack.min(this)));
            }
            if bad(stretch) {
                let moment = stretch.1.map(|window| self.windows[window].moment);
                let measure = Some(Measure::long(Span::from_fs(length(stretch))));
                self.fact(Self::subject(Kind::Never, Some(number), None, moment), true, measure);
            }
        }
        let broken = sure.iter().any(bad);
        let answer = match self.open() {
            _ if broken => Answer::Judged { broken, slack },
            Some(reason) => Answer::Not(reason),
            // it may go on for ever
            None if self.end() != End::Settled && sure.last().is_some_and(|it| it.2.is_none()) => {
                Answer::Not(Reason::Oscillating)
            }
            None if states.iter().any(|it| it.2.is_none()) => Answer::Not(Reason::Unresolved),
            None => Answer::Judged { broken, slack },
        };
        self.answer(number, answer);
    }

    fn oscillation_somewhere(&mut self, number: u32) {
        let found = self.windows.iter().any(|window| matches!(window.end, End::Oscillating { .. }));
        let answer = match self.open() {
            Some(reason) if !found => Answer::Not(reason),
            _ => Answer::Judged { broken: !found, slack: None },
        };
        if answer == (Answer::Judged { broken: true, slack: None }) {
            self.fact(Self::subject(Kind::Oscillation, Some(number), None, None), true, None);
        }
        self.answer(number, answer);
    }

    fn edges_of(&self, spec: EdgeSpec) -> Vec<Move> {
        let moves = self.moves(spec.net, 0, self.windows.len());
        moves.into_iter().filter(|it| it.new.known().is_some_and(|bit| spec.edge.is(bit))).collect()
    }

    fn moment_of_batch(&self, batch: usize) -> Option<u32> {
        Some(self.windows[self.log.batches[batch].window].moment)
    }

    fn timing(&mut self, number: u32, question: &Question) {
        let rule = &self.scenario.rules.timing[question.index as usize];
        let (from, to) = (self.edges_of(rule.from), self.edges_of(rule.to));
        let same = |a: &Move, b: &Move| rule.from.net == rule.to.net && a.batch == b.batch;
        let end = self.log.recorder.record.end;
        // (distance, slack, moment) of each pair
        let mut seen: Vec<(u64, i64, Option<u32>)> = Vec::new();
        let (mut spoken_of, mut left) = (false, None);
        if let Some(min) = rule.min {
            for edge in &to {
                spoken_of = true;
                let before = from.iter().filter(|it| it.batch <= edge.batch && !same(it, edge)).map(|it| it.at).max();
                if let Some(before) = before {
                    let distance = edge.at - before;
                    seen.push((distance, short(min, distance), self.moment_of_batch(edge.batch)));
                }
            }
        }
        if let Some(max) = rule.max {
            for edge in &from {
                let next = to.iter().filter(|it| it.batch >= edge.batch && !same(it, edge)).map(|it| it.at).min();
                let waited = end - edge.at;
                let ended = self.end() == End::Settled && !self.stopped() && !self.scenario.circuit.is_input(rule.to.net);
                let (distance, slack) = match next {
                    Some(next) => (next - edge.at, -short(max, next - edge.at)),
                    None if waited > max.fs() || ended => (waited, (-short(max, waited)).min(-1)),
                    None => {
                        if !self.scenario.circuit.is_input(rule.to.net) {
                            left = Some(match self.end() {
                                End::Oscillating { .. } => Reason::Oscillating,
                                End::Unsettled(_) => Reason::Unsettled,
                                _ => Reason::NotAnalysedYet,
                            });
                        }
                        continue;
                    }
                };
                spoken_of = true;
                seen.push((distance, slack, self.moment_of_batch(edge.batch)));
            }
        }
        for (distance, slack, moment) in &seen {
            if *slack < 0 {
                let measure = Measure { rank: slack.unsigned_abs(), value: *distance };
                self.fact(Self::subject(Kind::Timing, Some(number), None, *moment), true, Some(measure));
            }
        }
        let slack = seen.iter().map(|it| it.1).min();
        let broken = slack.is_some_and(|slack| slack < 0);
        if broken {
            self.answer(number, Answer::Judged { broken, slack });
        } else if let Some(reason) = self.open().or(left) {
            self.answer(number, Answer::Not(reason));
        } else if spoken_of {
            self.answer(number, Answer::Judged { broken, slack });
        }
    }

    fn min_pulse(&mut self, number: u32, question: &Question) {
        let rule = &self.scenario.rules.min_pulse[question.index as usize];
        let moves = self.moves(rule.net, 0, self.windows.len());
        let mut slack = None;
        for pair in moves.windows(2) {
            let bound = match pair[0].new {
                Value::One => rule.high,
                Value::Zero => rule.low,
                Value::X => None,
            };
            let (Some(bound), width) = (bound, pair[1].at - pair[0].at) else { continue };
            let this = short(bound, width);
            slack = Some(slack.map_or(this, |slack: i64| slack.min(this)));
            if this < 0 {
                let moment = self.moment_of_batch(pair[1].batch);
                let measure = Measure { rank: this.unsigned_abs(), value: width };
                self.fact(Self::subject(Kind::MinPulse, Some(number), Some(rule.net), moment), true, Some(measure));
            }
        }
        let broken = slack.is_some_and(|slack| slack < 0);
        match self.open() {
            Some(reason) if !broken => self.answer(number, Answer::Not(reason)),
            None if !broken && moves.windows(2).any(|pair| pair[0].new == Value::X) => {
                self.answer(number, Answer::Not(Reason::Unresolved));
            }
            _ if slack.is_none() => {}
            _ => self.answer(number, Answer::Judged { broken, slack }),
        }
    }

    fn swallowed_rule(&mut self, number: u32, question: &Question) {
        let circuit = &self.scenario.circuit;
        let net_of = |gate: usize| circuit.net_of(GateId(gate as u32));
        let mut swallowed = self.log.recorder.record.swallowed.iter();
        let broken = swallowed.any(|it| question.net.is_none_or(|net| net == net_of(it.gate)));
        match self.open() {
            Some(reason) if !broken => self.answer(number, Answer::Not(reason)),
            _ => self.answer(number, Answer::Judged { broken, slack: None }),
        }
    }

    // ---- what is found, asked or not ----

    fn listed(&mut self) {
        for window in self.windows {
            let moment = Some(window.moment);
            match window.end {
                End::Oscillating { period, .. } => {
                    let question = self.asked.find(RuleKey::Oscillation, 0, None, moment);
                    let breaks = self.permission(window) == Oscillation::Forbidden;
                    let subject = Self::subject(Kind::Oscillation, question, None, moment);
                    self.fact(subject, breaks, Some(Measure::long(period)));
                }
                End::Unsettled(_) => self.fact(Self::subject(Kind::Unsettled, None, None, moment), false, None),
                End::Settled if window.state.contains(&Value::X) => {
                    self.fact(Self::subject(Kind::Unresolved, None, None, moment), false, None);
                }
                _ => {}
            }
        }
        for it in &self.log.recorder.record.swallowed {
            let net = self.scenario.circuit.net_of(GateId(it.gate as u32));
            let question = match &self.scenario.rules.swallowed {
                Swallowed::Listed => None,
                Swallowed::Forbidden => self.asked.find(RuleKey::Swallowed, 0, None, None),
                Swallowed::At(_) => self.asked.find(RuleKey::Swallowed, 0, Some(net), None),
            };
            let subject = Self::subject(Kind::Swallowed, question, Some(net), Some(self.windows[it.window].moment));
            let share = Measure::share(Span::from_fs(it.age), Span::from_fs(it.delay));
            self.fact(subject, question.is_some(), Some(share));
        }
    }
}

/// More than the one change, or none, that is wanted.
fn is_glitch(before: Value, moves: &[Move]) -> bool {
    let after = moves.last().map_or(before, |it| it.new);
    moves.len() > usize::from(after != before)
}

/// What is left of some transitions when pulses shorter than the bound are struck out, narrowest first, at equal width
/// the earlier; and the widest pulse that must go before it is no glitch.
fn strike_out(before: Value, moves: &[Move], bound: u64) -> (Vec<Move>, Option<u64>) {
    let mut left = moves.to_vec();
    let (mut kept, mut widest) = (None, None);
    while is_glitch(before, &left) {
        let width = |it: usize| left[it].at - left[it - 1].at;
        let narrowest = (1..left.len()).min_by_key(|it| (width(*it), *it)).expect("a glitch has a pulse");
        if width(narrowest) >= bound && kept.is_none() {
            kept = Some(left.clone());
        }
        widest = Some(width(narrowest));
        left.drain(narrowest - 1..=narrowest);
    }
    (kept.unwrap_or(left), widest)
}

/// The nets of loops that changed in a window, batch by batch.
pub fn order(scenario: &Scenario, log: &Log, window: usize) -> Vec<BTreeSet<NetId>> {
    let batches = log.batches.iter().filter(|batch| batch.window == window);
    let nets = |batch: &Batch| {
        let nets = batch.changes.iter().map(|change| change.0);
        nets.filter(|net| scenario.circuit.in_loop(*net)).collect::<BTreeSet<_>>()
    };
    batches.map(nets).filter(|nets| !nets.is_empty()).collect()
}
