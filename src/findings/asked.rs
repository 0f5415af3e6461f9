//! Everything that a scenario asks, as numbered questions: one for each rule pattern or net, and step.

use std::sync::Arc;

use rustc_hash::FxHashMap;

use crate::circuit::{Circuit, NetId, NetSet};
use crate::control::Control;
use crate::flow::Allowed;
use crate::scenario::{
    Alternative, Before, EdgeCount, EdgeSpec, Expectation, Oscillation, Permission, Place, Scenario, Stimulus,
    Swallowed,
};
use crate::time::Span;

/// Which rule a question belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum RuleKey {
    /// `[[rules.never]]`
    Never,
    /// `[[rules.never_at_rest]]`
    NeverAtRest,
    /// `expect` of a step
    Expect,
    /// `[reference]`
    Reference,
    /// `critical_race`
    CriticalRace,
    /// `oscillation`
    Oscillation,
    /// `glitch_free`
    GlitchFree,
    /// `edges` of a step
    Edges,
    /// `when` of a step: does its pattern come?
    When,
    /// `[[rules.timing]]`
    Timing,
    /// `min_pulse`
    MinPulse,
    /// `settle_within`
    SettleWithin,
    /// `swallowed`
    Swallowed,
    /// `before_rest`
    BeforeRest,
}

impl RuleKey {
    /// The key in the scenario file.
    pub const fn word(self) -> &'static str {
        match self {
            RuleKey::Never => "never",
            RuleKey::NeverAtRest => "never_at_rest",
            RuleKey::Expect => "expect",
            RuleKey::Reference => "reference",
            RuleKey::CriticalRace => "critical_race",
            RuleKey::Oscillation => "oscillation",
            RuleKey::GlitchFree => "glitch_free",
            RuleKey::Edges => "edges",
            RuleKey::When => "when",
            RuleKey::Timing => "timing",
            RuleKey::MinPulse => "min_pulse",
            RuleKey::SettleWithin => "settle_within",
            RuleKey::Swallowed => "swallowed",
            RuleKey::BeforeRest => "before_rest",
        }
    }
}

/// What a question is about.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Pattern {
    /// A partial state.
    State(Alternative),
    /// One of several partial states.
    OneOf(Expectation),
    /// From one edge to another.
    Edges(EdgeSpec, EdgeSpec),
    /// A number of transitions.
    Count(EdgeCount),
}

impl Pattern {
    /// The pattern as people read it: `open_upper=1 open_lower=1`, `open_upper fall → open_lower rise`, `2`.
    pub fn words(&self, circuit: &Circuit) -> String {
        let state = |state: &Alternative| {
            let each = state.iter().map(|(net, value)| format!("{}={}", circuit.name(*net), u8::from(*value)));
            each.collect::<Vec<_>>().join(" ")
        };
        match self {
            Pattern::State(it) => state(it),
            Pattern::OneOf(it) => it.alternatives.iter().map(state).collect::<Vec<_>>().join(" or "),
            Pattern::Edges(from, to) => {
                let edge = |spec: &EdgeSpec| format!("{} {}", circuit.name(spec.net), spec.edge.name());
                format!("{} → {}", edge(from), edge(to))
            }
            Pattern::Count(it) if it.least == it.most => it.least.to_string(),
            Pattern::Count(it) => format!("{} to {}", it.least, it.most),
        }
    }
}

/// One question: a row of the rules table.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Question {
    /// The rule it belongs to.
    pub rule: RuleKey,
    /// Which of several rules of that key, in the order of the file.
    pub index: u32,
    /// The user's name for the rule.
    pub name: Option<String>,
    /// The net, where it is about one.
    pub net: Option<NetId>,
    /// The pattern, where it has one.
    pub pattern: Option<Pattern>,
    /// The moment that begins its window; `None`: the whole run, or the state before the first step.
    pub moment: Option<u32>,
    /// Did the user write the rule, or is it a default?
    pub written: bool,
    /// Is it the absence of an oscillation that breaks it?
    pub wants_oscillation: bool,
    /// The bound, where it has just one: for `glitch_free` and `never` 0 means none is tolerated.
    pub bound: Option<Span>,
}

/// All questions of a scenario.
#[derive(Clone, Debug, Default)]
pub struct Asked {
    /// The questions, by number.
    pub questions: Vec<Question>,
    /// Who knows what the reference allows, if there is one; shared by all judges.
    pub allowed: Option<Arc<Allowed>>,
    /// The number of each question by what is asked.
    numbers: FxHashMap<Key, u32>,
}

/// What tells questions apart: rule, which of several, net, moment.
type Key = (RuleKey, u32, Option<NetId>, Option<u32>);

/// The moments that can touch a cone.
pub(super) fn touching<'a>(stimulus: &'a Stimulus, cone: &'a NetSet) -> impl Iterator<Item = u32> + 'a {
    let moments = stimulus.moments.iter().enumerate();
    moments.filter(|(_, m)| stimulus.inputs_of(m).iter().any(|net| cone.contains(*net))).map(|(i, _)| i as u32)
}

/// The one bound of two; `None` where both are given, since a margin could be that of either.
fn only(a: Option<Span>, b: Option<Span>) -> Option<Span> {
    a.xor(b)
}

impl Asked {
    /// The questions of a scenario.
    pub fn of(scenario: &Scenario) -> Asked {
        let (rules, stimulus, circuit) = (&*scenario.rules, &*scenario.stimulus, &*scenario.circuit);
        let power_up = scenario.begin_window();
        let mut questions = Vec::new();
        let plain = |rule: RuleKey| Question {
            rule,
            index: 0,
            name: None,
            net: None,
            pattern: None,
            moment: None,
            written: true,
            wants_oscillation: false,
            bound: None,
        };
        for (i, never) in rules.never.iter().enumerate() {
            questions.push(Question {
                index: i as u32,
                name: never.name.clone(),
                pattern: Some(Pattern::State(never.state.clone())),
                bound: Some(never.longer_than),
                ..plain(RuleKey::Never)
            });
        }
        for (i, rule) in rules.never_at_rest.iter().enumerate() {
            let nets: Vec<NetId> = rule.state.iter().map(|(net, _)| *net).collect();
            let cone = circuit.cone(&nets);
            // the state at the start, or the power-up window
            for moment in std::iter::once(power_up).chain(touching(stimulus, &cone).map(Some)) {
                questions.push(Question {
                    index: i as u32,
                    name: rule.name.clone(),
                    pattern: Some(Pattern::State(rule.state.clone())),
                    moment,
                    ..plain(RuleKey::NeverAtRest)
                });
            }
        }
        for (s, step) in stimulus.steps.iter().enumerate() {
            let moment = Some(stimulus.moment_of_step(s as u32));
            if let Some(expect) = &step.expect {
                let pattern = Some(Pattern::OneOf(expect.clone()));
                questions.push(Question { pattern, moment, ..plain(RuleKey::Expect) });
            }
            if let Place::When { pattern, timeout, .. } = &step.place {
                let (pattern, bound) = (Some(Pattern::State(pattern.clone())), *timeout);
                questions.push(Question { pattern, moment, bound, ..plain(RuleKey::When) });
            }
            for count in &step.edges {
                let (pattern, net) = (Some(Pattern::Count(*count)), Some(count.net));
                questions.push(Question { pattern, net, moment, ..plain(RuleKey::Edges) });
            }
        }
        if scenario.reference.is_some() {
            for moment in 0..stimulus.moments.len() as u32 {
                questions.push(Question { moment: Some(moment), ..plain(RuleKey::Reference) });
            }
        }
        if rules.critical_race == Permission::Forbidden {
            for moment in 0..stimulus.moments.len() as u32 {
                let (moment, written) = (Some(moment), rules.critical_race_written);
                questions.push(Question { moment, written, ..plain(RuleKey::CriticalRace) });
            }
        }
        if rules.oscillation == Oscillation::Required {
            questions.push(Question { wants_oscillation: true, ..plain(RuleKey::Oscillation) });
        }
        for (m, moment) in stimulus.moments.iter().enumerate() {
            let own = stimulus.step_of(moment).and_then(|step| step.oscillation);
            let asked = match own {
                Some(said) => said != Oscillation::Allowed,
                None => rules.oscillation == Oscillation::Forbidden,
            };
            if asked {
                let written = own.is_some() || rules.oscillation_written;
                let wants_oscillation = own == Some(Oscillation::Required);
                let moment = Some(m as u32);
                questions.push(Question { moment, written, wants_oscillation, ..plain(RuleKey::Oscillation) });
            }
        }
        for (i, rule) in rules.glitch_free.iter().enumerate() {
            let cone = circuit.cone(&[rule.net]);
            for moment in touching(stimulus, &cone) {
                let step = stimulus.step_of(&stimulus.moments[moment as usize]);
                if step.is_some_and(|step| step.edges.iter().any(|count| count.net == rule.net)) {
                    continue;
                }
                questions.push(Question {
                    index: i as u32,
                    net: Some(rule.net),
                    moment: Some(moment),
                    written: rules.glitch_free_written,
                    bound: Some(rule.shorter_than),
                    ..plain(RuleKey::GlitchFree)
                });
            }
        }
        for (i, rule) in rules.timing.iter().enumerate() {
            questions.push(Question {
                index: i as u32,
                name: rule.name.clone(),
                pattern: Some(Pattern::Edges(rule.from, rule.to)),
                bound: only(rule.min, rule.max),
                ..plain(RuleKey::Timing)
            });
        }
        for (i, rule) in rules.min_pulse.iter().enumerate() {
            let (index, net, bound) = (i as u32, Some(rule.net), only(rule.high, rule.low));
            questions.push(Question { index, net, bound, ..plain(RuleKey::MinPulse) });
        }
        for net in &scenario.watched {
            let cone = circuit.cone(&[*net]);
            for moment in power_up.into_iter().chain(touching(stimulus, &cone)) {
                let step = stimulus.step_of(&stimulus.moments[moment as usize]);
                if let Some(bound) = step.and_then(|step| step.settle_within).or(rules.settle_within) {
                    questions.push(Question {
                        net: Some(*net),
                        moment: Some(moment),
                        bound: Some(bound),
                        ..plain(RuleKey::SettleWithin)
                    });
                }
            }
        }
        match &rules.swallowed {
            Swallowed::Listed => {}
            Swallowed::Forbidden => questions.push(plain(RuleKey::Swallowed)),
            Swallowed::At(nets) => {
                questions.extend(nets.iter().map(|net| Question { net: Some(*net), ..plain(RuleKey::Swallowed) }));
            }
        }
        if rules.before_rest == Before::Forbidden {
            for moment in 0..stimulus.moments.len() as u32 {
                if Some(moment) != power_up {
                    questions.push(Question { moment: Some(moment), ..plain(RuleKey::BeforeRest) });
                }
            }
        }
        let key = |q: &Question| (q.rule, q.index, q.net, q.moment);
        let numbers = questions.iter().enumerate().map(|(i, q)| (key(q), i as u32)).collect();
        let allowed = |reference| Arc::new(Allowed::of(reference, &Control::default()));
        Asked { questions, allowed: scenario.reference.clone().map(allowed), numbers }
    }

    /// The number of the question with these marks.
    pub fn find(&self, rule: RuleKey, index: u32, net: Option<NetId>, moment: Option<u32>) -> Option<u32> {
        self.numbers.get(&(rule, index, net, moment)).copied()
    }
}
