//! One case tried: made of its numbers, run, judged, counted.

use std::collections::BTreeSet;

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use super::apart::{Apart, FromRest};
use super::heard::Heard;
use super::meetings::{Meeting, Meetings};
use super::{Breach, Stray};
use crate::circuit::{GateId, NetId, NetSet, WireId};
use crate::control::Control;
use crate::engine::{Closing, Machine, Observer, Opening, Program};
use crate::findings::{Answers, Asked, Judge, Kind, Pattern, Question, RuleKey, Subject};
use crate::instance::{Cases, Instance, Numbers, Target};
use crate::logic::{State, Value};
use crate::scenario::{Place, Scenario};
use crate::sweep::{SweepReport, race_breaks};
use crate::time::{Span, Time};

/// The stream of a search's own random numbers; no board and no sample has it.
const STREAM: u64 = u64::MAX - 2;
/// Room that each question has in it.
const ROOM: u128 = 1 << 40;

/// What all questions share.
pub(super) struct Shared<'a> {
    pub scenario: &'a Scenario,
    pub program: &'a Program,
    pub asked: &'a Asked,
    pub sweep: &'a SweepReport,
    pub control: &'a Control,
    /// Runs a question.
    pub budget: u64,
}

/// What a case showed of the question.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Shown {
    pub broken: bool,
    /// How bad a breach is, where that has a number.
    pub rank: Option<u64>,
    /// The slack of the rule, where it has one.
    pub slack: Option<i64>,
    /// The time by which the parts of a pattern miss each other.
    pub apart: Option<i64>,
    /// The time from rest to the step.
    pub from_rest: Option<i64>,
}

/// What tells whether one case is nearer than another.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Guide {
    Margin,
    Apart,
    FromRest,
    Meeting(Meeting),
}

/// How near a case is: less is nearer. A breach is nearer than all else.
pub(super) type Score = i128;
/// No guide says anything of this case.
pub(super) const BLIND: Score = i128::MAX;
const BREACH: Score = -(1 << 100);

/// All guides of one question, as one observer beside the judges.
#[derive(Clone, Debug)]
pub(super) struct Guides {
    meetings: Meetings,
    apart: Option<Apart>,
    from_rest: Option<FromRest>,
}

/// Everything to try cases of one question.
pub(super) struct Bench<'a> {
    pub shared: &'a Shared<'a>,
    pub question: &'a Question,
    pub number: u32,
    pub cases: Cases,
    /// The numbers that may have a say in the question.
    pub movable: Vec<usize>,
    pub has_rest: bool,
    pub rng: ChaCha8Rng,
    /// Runs taken so far, and the number of runs at which to stop.
    pub runs: u64,
    pub stop: u64,
    machine: Machine<()>,
    observers: (Judge<Heard>, Guides),
    /// Of a critical race: from which state the moment led to which.
    passages: Vec<(State, BTreeSet<State>)>,
    pub strays: Vec<Stray>,
}

/// The nets that a question is about; none: all of them.
fn nets_of(question: &Question) -> Vec<NetId> {
    let mut nets: Vec<NetId> = question.net.into_iter().collect();
    match &question.pattern {
        Some(Pattern::State(it)) => nets.extend(it.iter().map(|entry| entry.0)),
        Some(Pattern::OneOf(it)) => nets.extend(it.alternatives.iter().flatten().map(|entry| entry.0)),
        Some(Pattern::Edges(from, to)) => nets.extend([from.net, to.net]),
        Some(Pattern::Count(_)) | None => {}
    }
    nets
}

impl<'a> Bench<'a> {
    pub fn new(shared: &'a Shared<'a>, number: u32) -> Bench<'a> {
        let (scenario, asked) = (shared.scenario, shared.asked);
        let circuit = &scenario.circuit;
        let question = &asked.questions[number as usize];
        let mut nets = nets_of(question);
        if nets.is_empty() {
            nets = circuit.nets().collect();
        }
        let cone = circuit.cone(&nets);
        // what a step waits for has a say in when it comes
        for step in &scenario.stimulus.steps {
            if let Place::When { pattern, .. } = &step.place {
                nets.extend(pattern.iter().map(|entry| entry.0));
            }
        }
        let cases = Cases::new(scenario);
        let movable = movable(scenario, &cases, &circuit.cone(&nets));
        // a pattern that does not come is decided before its step
        let only = question.moment.filter(|_| question.rule != RuleKey::When);
        let race = question.moment.filter(|_| question.rule == RuleKey::CriticalRace);
        let apart = match &question.pattern {
            Some(Pattern::State(pattern)) if question.rule == RuleKey::Never => Some(Apart::new(pattern.clone())),
            _ => None,
        };
        let from_rest = question.moment.filter(|_| question.rule == RuleKey::BeforeRest).map(FromRest::new);
        let guides = Guides { meetings: Meetings::new(scenario, &cone, only), apart, from_rest };
        let mut rng = ChaCha8Rng::seed_from_u64(scenario.plan.seed);
        rng.set_stream(STREAM);
        rng.set_word_pos(ROOM * u128::from(number));
        Bench {
            shared,
            question,
            number,
            cases,
            movable,
            has_rest: Cases::has_rest(scenario),
            rng,
            runs: 0,
            stop: shared.budget,
            machine: shared.program.machine(),
            observers: (Judge::new(scenario, asked, Heard::new(number, race)), guides),
            passages: Vec::new(),
            strays: Vec::new(),
        }
    }

    /// Runs left.
    pub fn left(&self) -> u64 {
        if self.shared.control.cancelled() { 0 } else { self.stop.saturating_sub(self.runs) }
    }

    /// Tries the case of these numbers; `None` if no run is left.
    pub fn try_numbers(&mut self, numbers: &Numbers) -> Option<Shown> {
        if self.left() == 0 {
            return None;
        }
        let instance = self.cases.make(numbers);
        let shown = Bench::run(&mut self.machine, &mut self.observers, instance);
        self.runs += 1;
        let shown = Shown { broken: shown.broken | self.strays_from_its_like(), ..shown };
        self.note_strays(numbers);
        Some(shown)
    }

    /// Tries this very case.
    pub fn try_case(&mut self, instance: &Instance) -> Option<Shown> {
        if self.left() == 0 {
            return None;
        }
        let shown = Bench::run(&mut self.machine, &mut self.observers, instance);
        self.runs += 1;
        Some(Shown { broken: shown.broken | self.strays_from_its_like(), ..shown })
    }

    fn run(machine: &mut Machine<()>, observers: &mut (Judge<Heard>, Guides), instance: &Instance) -> Shown {
        observers.0.sink.clear();
        observers.1.meetings.with(&instance.delays);
        // a case is all or nothing: the caller's control stops between cases
        machine.run(instance, &Control::default(), observers);
        let (Judge { sink, .. }, guides) = observers;
        Shown {
            broken: sink.broken,
            rank: sink.rank,
            slack: sink.slack,
            apart: guides.apart.as_ref().and_then(Apart::least),
            from_rest: guides.from_rest.as_ref().and_then(|it| it.least),
        }
    }

    /// Of a race: did this case lead from a state elsewhere than another did, where that breaks the rule?
    fn strays_from_its_like(&mut self) -> bool {
        let Some((before, after)) = self.observers.0.sink.passage.take() else { return false };
        let Some((_, outcomes)) = self.passages.iter_mut().find(|it| it.0 == before) else {
            self.passages.push((before, BTreeSet::from([after])));
            return false;
        };
        if outcomes.contains(&after) {
            return false;
        }
        let all: BTreeSet<&State> = outcomes.iter().chain([&after]).collect();
        let breaks = race_breaks(self.shared.scenario, self.question.moment.unwrap_or(0), &all);
        // where it breaks the rule, another case that leads there strays as well
        if !breaks {
            outcomes.insert(after);
        }
        breaks
    }

    /// Notes what else this case breaks that no draw does.
    fn note_strays(&mut self, numbers: &Numbers) {
        for i in 0..self.observers.0.sink.others.len() {
            let question = self.observers.0.sink.others[i];
            let known = self.shared.sweep.rules[question as usize].broken > 0;
            if !known && !self.strays.iter().any(|stray| stray.question == question) {
                self.strays.push(Stray { question, numbers: numbers.clone() });
            }
        }
    }

    /// The meetings of the last case, nearest first.
    pub fn meetings(&self) -> Vec<Meeting> {
        self.observers.1.meetings.nearest()
    }

    /// How near the last case, which showed this, is by a guide.
    pub fn score(&mut self, shown: &Shown, guide: &Guide) -> Score {
        if shown.broken {
            return BREACH - Score::from(shown.rank.unwrap_or(0));
        }
        let value = match guide {
            Guide::Margin => shown.slack,
            // overlapping for a while that is tolerated is nearer than missing each other
            Guide::Apart => match (shown.slack, self.question.bound) {
                (Some(slack), Some(bound)) if bound > Span::ZERO => Some(slack),
                (_, bound) => shown.apart.map(|it| it.saturating_add(bound.map_or(0, |bound| bound.fs() as i64))),
            },
            Guide::FromRest => shown.from_rest,
            Guide::Meeting(meeting) => self.observers.1.meetings.away(meeting),
        };
        value.map_or(BLIND, Score::from)
    }

    /// The case of these numbers.
    pub fn case(&mut self, numbers: &Numbers) -> Instance {
        self.cases.make(numbers).clone()
    }

    /// The case of a sample of the sweep, as numbers.
    pub fn sample(&mut self, sample: u64) -> Numbers {
        self.cases.of_sample(sample)
    }
}

/// The numbers that may have a say in the nets of a cone: their gates and wires, the groups of these, all steps and clocks.
fn movable(scenario: &Scenario, cases: &Cases, cone: &NetSet) -> Vec<usize> {
    let circuit = &scenario.circuit;
    let gate = |gate: u32| cone.contains(circuit.net_of(GateId(gate)));
    let wire = |wire: u32| cone.contains(circuit.net_of(circuit.wires()[WireId(wire).index()].1));
    let quantities = cases.quantities();
    let has_say = |i: &usize| match quantities[*i].target {
        Target::Gate { gate: it, .. } | Target::GateBoth(it) => gate(it),
        Target::Wire { wire: it, .. } | Target::WireBoth(it) => wire(it),
        _ => true,
    };
    let own: Vec<usize> = (0..quantities.len()).filter(has_say).collect();
    let mut groups: Vec<usize> = own.iter().filter_map(|i| cases.group_of(*i)).collect();
    groups.sort_unstable();
    groups.dedup();
    own.into_iter().chain(groups.into_iter().map(|group| quantities.len() + group)).collect()
}

/// The whole report of one case about one question: what it breaks, worst first.
pub(super) fn breach(shared: &Shared<'_>, question: u32, instance: &Instance) -> Option<Breach> {
    let (scenario, asked) = (shared.scenario, shared.asked);
    let asked_of = &asked.questions[question as usize];
    if asked_of.rule == RuleKey::CriticalRace {
        let kind = Kind::CriticalRace;
        let subject = Subject { kind, shape: None, question: Some(question), net: None, moment: asked_of.moment };
        return Some(Breach { subject, measure: None, against: None });
    }
    let mut judge = Judge::new(scenario, asked, Answers::default());
    shared.program.machine::<()>().hear(instance, &Control::default(), &mut judge);
    let facts = judge.sink.facts.iter().filter(|fact| fact.breaks_rule && fact.subject.question == Some(question));
    let worst = facts.max_by_key(|fact| (fact.measure, std::cmp::Reverse(fact.subject)))?;
    let against = asked.allowed.as_ref().filter(|_| worst.subject.kind == Kind::NotInReference).and_then(|allowed| {
        let departure = judge.sink.departures.iter().find(|it| Some(it.moment) == worst.subject.moment)?;
        Some(departure.against(allowed))
    });
    Some(Breach { subject: worst.subject, measure: worst.measure, against })
}

/// The samples that a search of a question begins with: the worst of the rule, the first, and those in which a gate of its
/// cone swallowed most of a pulse.
pub(super) fn samples(shared: &Shared<'_>, question: &Question, number: u32) -> Vec<u64> {
    /// Swallowed pulses that are looked at.
    const SWALLOWED: usize = 4;
    let (scenario, sweep) = (shared.scenario, shared.sweep);
    if sweep.samples == 0 {
        return Vec::new();
    }
    let mut samples: Vec<u64> = sweep.rules[number as usize].margin_sample.into_iter().chain([0]).collect();
    let nets = nets_of(question);
    let cone = (!nets.is_empty()).then(|| scenario.circuit.cone(&nets));
    let near = |net: Option<NetId>| net.is_none_or(|net| cone.as_ref().is_none_or(|cone| cone.contains(net)));
    let swallowed = sweep.findings.iter().filter(|it| it.subject.kind == Kind::Swallowed);
    let here = |moment: Option<u32>| question.moment.is_none() || question.moment == moment;
    let mut swallowed: Vec<_> = swallowed.filter(|it| near(it.subject.net)).collect();
    swallowed.sort_by_key(|it| !here(it.subject.moment));
    samples.extend(swallowed.iter().filter_map(|it| it.worst_sample).take(SWALLOWED));
    let mut seen = Vec::new();
    samples.retain(|sample| !seen.contains(sample) && (seen.push(*sample), true).1);
    samples
}

impl Observer for Guides {
    type Tag = ();

    fn start(&mut self, state: &State) {
        self.meetings.start(state);
        self.apart.iter_mut().for_each(|it| it.start(state));
        self.from_rest.iter_mut().for_each(|it| it.start(state));
    }

    fn open(&mut self, opening: &Opening<'_>) {
        self.meetings.open(opening);
        self.from_rest.iter_mut().for_each(|it| it.open(opening));
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        self.meetings.change(at, net, new, ());
        self.apart.iter_mut().for_each(|it| it.change(at, net, new, ()));
        self.from_rest.iter_mut().for_each(|it| it.change(at, net, new, ()));
    }

    fn arrival(&mut self, at: Time, wire: WireId, new: Value, _cause: ()) {
        self.meetings.arrival(at, wire, new, ());
        self.from_rest.iter_mut().for_each(|it| it.arrival(at, wire, new, ()));
    }

    fn batch(&mut self, at: Time) {
        self.meetings.batch(at);
    }

    fn close(&mut self, closing: &Closing<'_>) {
        self.meetings.close(closing);
    }
}
