//! A slow judge without tricks, for comparison: it keeps the whole run as plain lists and answers every question by
//! looking through them, in the words of the semantics.

mod reference;
mod runs;
mod windows;

use std::collections::{BTreeMap, BTreeSet};

use stillgate::circuit::{GateId, NetId, NetSet, WireId};
use stillgate::engine::{Closing, End, Finish, Observer, Opening};
use stillgate::findings::{Asked, Kind, Measure, Reason, RuleKey, Subject};
use stillgate::logic::{State, Value};
use stillgate::scenario::{Alternative, Oscillation, Scenario, Step};
use stillgate::time::{Span, Time};

use crate::support::recorder::{RecordedWindow, Recorder};

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

    /// A line for each window and each batch.
    pub fn in_words(&self) -> String {
        let record = &self.recorder.record;
        let mut text = format!("start {:?}\nend {} {:?}", record.start, record.end, record.never_came);
        for (number, window) in record.windows.iter().enumerate() {
            text += &format!("\nwindow {number}: {window:?}");
            for batch in self.batches.iter().filter(|batch| batch.window == number) {
                text += &format!("\n  at {}: {:?}", batch.at, batch.changes);
            }
        }
        text
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
            RuleKey::NeverAtRest | RuleKey::GlitchFree | RuleKey::SettleWithin => {}
            RuleKey::Reference => slow.reference(number, question),
            RuleKey::CriticalRace => slow.critical_race(number, question),
            RuleKey::Oscillation if question.moment.is_none() => slow.oscillation_somewhere(number),
            RuleKey::Oscillation => slow.oscillation(number, question),
            RuleKey::Timing => slow.timing(number, question),
            RuleKey::MinPulse => slow.min_pulse(number, question),
            RuleKey::Swallowed => slow.swallowed_rule(number, question),
            RuleKey::BeforeRest => slow.before_rest(number, question),
            RuleKey::When => slow.when(number, question),
        }
    }
    slow.never_at_rest();
    slow.glitches();
    slow.settle_within();
    slow.listed();
    slow.said
}

pub fn shows(values: &[Value], pattern: &Alternative) -> Option<bool> {
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
        self.log.recorder.record.never_came.is_some()
    }

    fn step_of(&self, moment: u32) -> Option<&'a Step> {
        self.scenario.stimulus.step_of(&self.scenario.stimulus.moments[moment as usize])
    }

    /// The moments that say what is asked of oscillation in a window: those of steps that say it themselves, else the
    /// one that names it.
    fn say_of_oscillation(&self, window: &RecordedWindow) -> Vec<u32> {
        let own = |moment: &u32| self.step_of(*moment).is_some_and(|step| step.oscillation.is_some());
        let own: Vec<u32> = window.opening.moments.iter().copied().filter(own).collect();
        if own.is_empty() { vec![window.moment] } else { own }
    }

    fn permission(&self, moment: u32) -> Oscillation {
        self.step_of(moment).and_then(|step| step.oscillation).unwrap_or(self.scenario.rules.oscillation)
    }

    /// Where oscillation is allowed or required, an oscillating window is not asked for some things.
    fn spared(&self, window: &RecordedWindow) -> bool {
        let forbids = |moment: &u32| self.permission(*moment) == Oscillation::Forbidden;
        matches!(window.end, End::Oscillating { .. }) && !self.say_of_oscillation(window).iter().any(forbids)
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
    fn window_from(&self, from: Option<usize>, cone: &NetSet) -> NetWindow {
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
        let mut all = vec![self.window_from(power_up.then_some(0), cone)];
        while all.last().expect("one").to < self.windows.len() {
            all.push(self.window_from(Some(all.last().expect("one").to), cone));
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
